"""Everything that is wrong with a configuration and its files, before any work."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import Literal

from profiles.config import Config, Delivery, Mooring
from profiles.errors import DataError, MachineError, RequestError
from profiles.pipeline.stages import message_of


@dataclass(frozen=True)
class Finding:
    """What was found in one delivery: unusable, or usable with rows that were not understood, or nothing wrong."""

    mooring: str
    file: Path
    outcome: Literal["clean", "rows quarantined", "not usable"]
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
    from profiles.ingest import read

    try:
        found = read(
            config.resolve(delivery.path),
            config.resolve(delivery.layout),
            mooring=mooring.id,
            latitude=mooring.latitude,
            longitude=mooring.longitude,
        )
    except (RequestError, DataError, MachineError) as error:
        return Finding(mooring.id, delivery.path, "not usable", 0, 0, message_of(error, config, delivery))
    if not found.rows_quarantined:
        return Finding(mooring.id, delivery.path, "clean", found.rows_read, found.rows_kept, "")
    rows = found.quarantine
    shown = "; ".join(
        f"line {line}: {reason}" for line, reason in zip(rows["line"][:3], rows["reason"][:3], strict=True)
    )
    more = f"; and {len(rows) - 3} more" if len(rows) > 3 else ""
    return Finding(mooring.id, delivery.path, "rows quarantined", found.rows_read, found.rows_kept, shown + more)
