"""Everything that is wrong with a configuration and its files, before any work."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import Any, Literal

from profiles.config import Config, Delivery, Mooring
from profiles.pipeline.listed import read_listed

SHOWN = 3  # rows that a finding quotes


@dataclass(frozen=True)
class Finding:
    """What was found in one delivery: unusable, rows not understood or out of order, or nothing wrong."""

    mooring: str
    file: Path
    outcome: Literal["clean", "rows sorted", "rows quarantined", "not usable"]
    rows_read: int
    rows_kept: int
    message: str


def survey(config: Config, progress: Callable[[Finding], None] | None = None) -> list[Finding]:
    """Read every delivery of a configuration once and return what was found, in the order of the file."""
    findings = []
    for mooring in config.moorings:
        for delivery in mooring.deliveries:
            findings.append(_inspect(config, mooring, delivery))
            if progress is not None:
                progress(findings[-1])
    return findings


def _inspect(config: Config, mooring: Mooring, delivery: Delivery) -> Finding:
    found = read_listed(config, mooring, delivery)
    if isinstance(found, str):
        return Finding(mooring.id, delivery.path, "not usable", 0, 0, found)
    notes = _notes(found)
    outcome: Any = "rows quarantined" if found.rows_quarantined else "rows sorted" if notes else "clean"
    return Finding(mooring.id, delivery.path, outcome, found.rows_read, found.rows_kept, "; ".join(notes))


def _notes(found: Any) -> list[str]:
    """Say which rows were not understood, the first few of them by line, and how many stood out of order."""
    rows = found.quarantine.head(SHOWN)
    notes = [f"line {line}: {reason}" for line, reason in zip(rows["line"], rows["reason"], strict=True)]
    if found.rows_quarantined > SHOWN:
        notes.append(f"and {found.rows_quarantined - SHOWN} more")
    if found.rows_reordered:
        notes.append(f"{found.rows_reordered} rows are earlier than a row before them; they are sorted")
    return notes
