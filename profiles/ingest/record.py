"""What the readers hand over: rows that were understood, rows that were not, and the count of both."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass, field

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from profiles.errors import DataError, ThermotiltError
from profiles.ingest.layout import GREATEST_DEPTH
from profiles.ingest.wording import printable

FIRST_REASONS = 3  # reasons that a message quotes


@dataclass(frozen=True)
class Rejected:
    """A row that goes to quarantine: line number from 1 (NetCDF: number of the time step), reason, text."""

    line: int
    reason: str
    text: str | None = None


@dataclass(frozen=True)
class Record:
    """One file, understood.

    Attributes
    ----------
    time : ndarray of datetime64[ns], (time,)
        UTC, strictly increasing.
    depth : ndarray of float64, (depth,)
        m, or dbar of sea pressure where ``depth_is_pressure``; positive down, ascending.
    temperature : ndarray of float32, (time, depth)
        °C on the scale it was delivered on, NaN missing.
    delivered_qc : ndarray of int8, (time, depth), or None
        Our flags for the delivered ones.
    scale : str
        ``"ITS-90"`` or ``"IPTS-68"``.
    rows : pandas.DataFrame
        Columns ``time`` and ``line`` of every row that was kept, in file order.
    rejected : tuple of Rejected
    rows_read : int
        Counted while reading, apart from the two above.
    mooring, latitude, longitude
        Where the file says so.
    """

    time: NDArray[np.datetime64]
    depth: NDArray[np.float64]
    temperature: NDArray[np.float32]
    scale: str
    rows: pd.DataFrame
    rejected: tuple[Rejected, ...]
    rows_read: int
    delivered_qc: NDArray[np.int8] | None = None
    depth_is_pressure: bool = False
    mooring: str | None = None
    latitude: float | None = None
    longitude: float | None = None


@dataclass
class Tally:
    """Running count of the data rows of one file, and those of them that were rejected."""

    rows_read: int = 0
    rejected: list[Rejected] = field(default_factory=list)

    def reject(self, lines: Iterable[int], reasons: Iterable[str], texts: Iterable[str] | None = None) -> None:
        """Add rows to the quarantine; without ``texts`` they are looked up later."""
        if texts is None:
            self.rejected += [Rejected(int(line), reason) for line, reason in zip(lines, reasons, strict=True)]
        else:
            self.rejected += [
                Rejected(int(line), reason, printable(text))
                for line, reason, text in zip(lines, reasons, texts, strict=True)
            ]

    def settle(self, kept: int, where: str) -> tuple[Rejected, ...]:
        """Return the rejected rows in file order, once the count is right and something was kept.

        Raises
        ------
        DataError
            Where there were no data rows, or none that could be understood.
        ThermotiltError
            Where rows were lost on the way, which is a fault of ours.
        """
        verify_count(self.rows_read, kept, len(self.rejected), where)
        ordered = tuple(sorted(self.rejected, key=lambda row: row.line))
        if self.rows_read == 0:
            raise DataError("there are no data rows", where=where, expected="at least one", found="only a header")
        if kept == 0:
            raise DataError(
                "no row could be understood",
                where=where,
                found="; ".join(f"line {row.line}: {row.reason}" for row in ordered[:FIRST_REASONS]),
                advice="check that the layout is the right one for this file",
            )
        return ordered


def verify_count(rows_read: int, rows_kept: int, rows_quarantined: int, where: str) -> None:
    """Raise ThermotiltError unless every row that was read is either kept or in quarantine."""
    if rows_read != rows_kept + rows_quarantined:
        raise ThermotiltError(
            "rows were lost while reading",
            where=where,
            expected=f"{rows_read} rows",
            found=f"{rows_kept} kept and {rows_quarantined} quarantined",
            advice="this is a fault of the program; please report it with the file",
        )


def repeats(keys: pd.DataFrame) -> tuple[NDArray[np.bool_], NDArray[np.intp]]:
    """Return which rows repeat the keys of an earlier one, and for each the first with its keys."""
    places = pd.Series(np.arange(len(keys)))
    first = places.groupby([keys[name].to_numpy() for name in keys], sort=False).transform("min").to_numpy()
    return first < places.to_numpy(), first


def reordered(times: NDArray[np.datetime64]) -> int:
    """Return how many rows are earlier than a row that stands before them."""
    stamps = times.astype("datetime64[ns]").astype(np.int64)
    return int((stamps < np.maximum.accumulate(stamps)).sum()) if stamps.size else 0


def checked_depths(depths: Sequence[float] | NDArray[np.float64], labels: Sequence[str], where: str) -> None:
    """Raise DataError where a sensor depth is impossible or appears twice.

    Parameters
    ----------
    depths : sequence of float
        m, positive down.
    labels : sequence of str
        How the file calls them.
    where : str
        The file.
    """
    seen: dict[float, str] = {}
    for depth, label in zip(depths, labels, strict=True):
        if not 0.0 <= depth <= GREATEST_DEPTH:
            raise DataError(
                "this is no depth below the surface",
                where=f"{where}, {label}",
                expected=f"0 to {GREATEST_DEPTH:g} m",
                found=f"{depth:g} m",
                advice="check the units and the sign (positive) in the layout's [depth]",
            )
        stored = float(np.float32(depth))
        if stored in seen:
            raise DataError(
                "a sensor depth appears twice",
                where=where,
                expected="each depth once",
                found=f"{depth:g} m in {seen[stored]} and in {label}",
                advice="rename or remove one of the two, or give the depths in the layout",
            )
        seen[stored] = label
