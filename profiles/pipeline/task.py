"""One unit of work: its key, its record, and whether it has to be done again."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from importlib.metadata import version
from pathlib import Path
from typing import Any, Literal

from profiles import store

#: The stages in their order.
STAGES = ("ingest", "qc", "column", "section", "report")

#: Folder in the output folder for what later stages read and users need not see.
HIDDEN = ".stages"

Report = dict[str, Any]


@dataclass(frozen=True)
class Task:
    """A function of files and settings that writes files.

    ``key`` is the checksum of the stage, the version, the settings and the inputs' bytes: a task with the key of its
    last record, whose outputs still have the bytes that were recorded, need not be done again. ``work`` is a function
    of a module, so that it can be sent to another process; it gets ``arguments`` and returns a JSON-able report.
    """

    stage: str
    name: str
    work: Callable[..., Report]
    arguments: tuple[Any, ...]
    inputs: tuple[Path, ...]
    outputs: tuple[Path, ...]
    settings: Mapping[str, Any] = field(default_factory=dict)

    def key(self, checksums: Checksums) -> str:
        """Return the key; an input that does not exist counts as such."""
        content = {
            "stage": self.stage,
            "name": self.name,
            "version": version("thermotilt"),
            "settings": self.settings,
            "inputs": [[path.name, checksums.of(path)] for path in self.inputs],
        }
        return hashlib.sha256(json.dumps(content, sort_keys=True).encode()).hexdigest()


class Checksums:
    """Checksums of files, each read once in a run unless it was written in between."""

    def __init__(self) -> None:
        self._known: dict[Path, tuple[tuple[int, int], str]] = {}

    def of(self, path: Path) -> str:
        """Return the checksum of a file, or "missing"."""
        try:
            status = path.stat()
            state = (status.st_mtime_ns, status.st_size)
            if self._known.get(path, (None, ""))[0] != state:
                self._known[path] = (state, store.checksum(path))
        except OSError:
            return "missing"
        return self._known[path][1]


@dataclass(frozen=True)
class Event:
    """What the progress callback gets: task ``done`` of ``total`` of a stage has ended."""

    stage: str
    name: str
    done: int
    total: int
    outcome: Literal["computed", "kept", "failed"]


def record_path(out: Path, stage: str, name: str) -> Path:
    """Return where the record of a task lies."""
    return out / HIDDEN / "records" / f"{stage}.{name}.json"


def kept_report(task: Task, out: Path, key: str, checksums: Checksums) -> Report | None:
    """Return the report of the last time the task was done, if it need not be done again."""
    record = store.read_record(record_path(out, task.stage, task.name))
    if record is None or record.get("key") != key:
        return None
    expected = {str(path.relative_to(out)): checksums.of(path) for path in task.outputs}
    return dict(record["report"]) if record.get("outputs") == expected else None


def keep_report(task: Task, out: Path, key: str, report: Report, checksums: Checksums) -> None:
    """Record that the task was done."""
    outputs = {str(path.relative_to(out)): checksums.of(path) for path in task.outputs}
    store.write_record(record_path(out, task.stage, task.name), {"key": key, "outputs": outputs, "report": report})


def forget(out: Path, stage: str, name: str) -> None:
    """Remove a task's record and the outputs it names."""
    path = record_path(out, stage, name)
    record = store.read_record(path) or {}
    for output in record.get("outputs", {}):
        (out / output).unlink(missing_ok=True)
    path.unlink(missing_ok=True)


def recorded(out: Path) -> list[tuple[str, str]]:
    """Return stage and name of every task that has a record in the output folder."""
    paths = sorted((out / HIDDEN / "records").glob("*.json"))
    return [(path.stem.partition(".")[0], path.stem.partition(".")[2]) for path in paths]
