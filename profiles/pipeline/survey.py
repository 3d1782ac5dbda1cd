"""Everything that is wrong with a configuration and its files, before any work."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any, Literal

from profiles.config import Config, Delivery, Mooring
from profiles.pipeline.listed import join_listed, read_listed, read_log
from profiles.pipeline.paths import SERIES
from profiles.pipeline.series import NOTHING, read_listed_series
from profiles.vocabulary import Water

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
    """Read every delivery of a configuration once, join those of a mooring, and return what was found.

    Raises
    ------
    RequestError, DataError, MachineError
        Where the recovery log cannot be used.
    """
    log = read_log(config)
    findings = []
    for mooring in config.moorings:
        for finding in _of_mooring(config, mooring, log is None or mooring.id in log):
            findings.append(finding)
            if progress is not None:
                progress(finding)
    for finding in _of_series(config):
        findings.append(finding)
        if progress is not None:
            progress(finding)
    return findings


def _of_series(config: Config) -> Iterator[Finding]:
    """Read the series and put them together; say also which moorings have nothing at all."""
    from profiles.ingest import join_series

    read = {listed: read_listed_series(config, listed) for listed in config.series}
    usable = {listed: found for listed, found in read.items() if not isinstance(found, str)}
    kept = dict(zip(usable, join_series(list(usable.values()))[1], strict=True)) if usable else {}
    for listed, found in read.items():
        name = listed.mooring or SERIES
        if isinstance(found, str):
            yield Finding(name, listed.path, "not usable", 0, 0, found)
            continue
        series = kept[listed]
        notes = [*_notes(series), *series.notes]
        outcome: Any = (
            "rows quarantined" if series.rows_quarantined else "rows sorted" if series.rows_reordered else "clean"
        )
        yield Finding(name, listed.path, outcome, series.rows_read, series.rows_kept, "; ".join(notes))
    served = {name for series in kept.values() for name in series.moorings}
    for mooring in config.moorings:
        if not mooring.deliveries and mooring.id not in served:
            yield Finding(mooring.id, config.file, "not usable", 0, 0, NOTHING)


def _of_mooring(config: Config, mooring: Mooring, is_logged: bool) -> list[Finding]:
    read = {listed: read_listed(config, mooring, listed) for listed in mooring.by_precedence}
    usable = {listed: found for listed, found in read.items() if not isinstance(found, str)}
    joined = join_listed(config, mooring, list(usable.values())) if usable else ""
    findings = [_finding(mooring, listed, read[listed], joined) for listed in mooring.deliveries]
    if findings and not isinstance(joined, str):
        notes = [*_water_notes(joined), *([] if is_logged else ["the recovery log does not have this mooring"])]
        findings[-1] = _with_notes(findings[-1], notes)
    return findings


def _finding(mooring: Mooring, listed: Delivery, found: Any, joined: Any) -> Finding:
    if isinstance(found, str) or isinstance(joined, str):
        message = found if isinstance(found, str) else joined
        return Finding(mooring.id, listed.path, "not usable", 0, 0, message)
    lost = joined.lost_by(found)
    notes = _notes(found)
    if lost:
        notes.append(f"{lost} rows are of times that a delivery before it has; they go to quarantine")
    outcome: Any = "rows quarantined" if found.rows_quarantined + lost else "rows sorted" if notes else "clean"
    return Finding(mooring.id, listed.path, outcome, found.rows_read, found.rows_kept - lost, "; ".join(notes))


def _with_notes(finding: Finding, notes: list[str]) -> Finding:
    return replace(finding, message="; ".join(filter(None, [finding.message, *notes]))) if notes else finding


def _water_notes(joined: Any) -> list[str]:
    """Say how much of a record was not measured in the water."""
    counts = joined.water_counts()
    words = {
        Water.NOT_DEPLOYED: "are outside the deployments of the recovery log",
        Water.AIR_FOUND: "read the same from top to bottom, as on deck",
    }
    return [f"{counts[status]} times {said}; they are kept and flagged bad" for status, said in words.items()
            if counts.get(status)]  # fmt: skip


def _notes(found: Any) -> list[str]:
    """Say which rows were not understood, the first few of them by line, and how many stood out of order."""
    rows = found.quarantine.head(SHOWN)
    notes = [f"line {line}: {reason}" for line, reason in zip(rows["line"], rows["reason"], strict=True)]
    if found.rows_quarantined > SHOWN:
        notes.append(f"and {found.rows_quarantined - SHOWN} more")
    if found.rows_reordered:
        notes.append(f"{found.rows_reordered} rows are earlier than a row before them; they are sorted")
    return notes
