"""Small JSON records: what a task read, wrote and counted; and the lock on a run's folder."""

from __future__ import annotations

import fcntl
import json
from collections.abc import Iterable, Iterator, Mapping
from contextlib import contextmanager
from datetime import UTC, datetime
from pathlib import Path
from typing import IO, Any

from profiles.errors import RequestError
from profiles.store.atomic import replacing, translated


def write_text(path: Path, text: str) -> None:
    """Write ``text`` as UTF-8, whole or not at all."""
    with replacing(path) as temporary:
        temporary.write_text(text, encoding="utf-8", newline="\n")


def write_record(path: Path, record: Mapping[str, Any]) -> None:
    """Write a mapping as JSON with its keys in the order given."""
    write_text(path, json.dumps(record, indent=1, ensure_ascii=False, allow_nan=False) + "\n")


def read_record(path: Path) -> dict[str, Any] | None:
    """Read a record, or return None where there is none that can be read."""
    try:
        record = json.loads(path.read_text(encoding="utf-8"))
    except (OSError, UnicodeDecodeError, json.JSONDecodeError):
        return None
    return record if isinstance(record, dict) else None


def date_of(files: Iterable[Path]) -> str:
    """Return the time of the last change among ``files``, ISO 8601 in UTC.

    It stands for the version of the data and so for the creation date of what is made from it: the same inputs
    give the same bytes whenever the run is made.
    """
    newest = max(int(file.stat().st_mtime) for file in files)
    return datetime.fromtimestamp(newest, tz=UTC).strftime("%Y-%m-%dT%H:%M:%SZ")


@contextmanager
def folder_lock(folder: Path) -> Iterator[None]:
    """Hold a run's folder, so that no second run writes to it.

    Raises
    ------
    RequestError
        Where another run holds it.
    MachineError
        Where the lock cannot be written.
    """
    path = folder / "lock"
    with translated(path):
        stream = path.open("w", encoding="utf-8")
    with stream:
        with translated(path):
            _take(stream, folder)
        yield


def _take(stream: IO[str], folder: Path) -> None:
    try:
        fcntl.flock(stream, fcntl.LOCK_EX | fcntl.LOCK_NB)
    except BlockingIOError:
        raise RequestError(
            "another run is writing to this folder",
            where=str(folder.parent),
            advice="wait for it to end, or name another folder with --out",
        ) from None
