"""What the readers hand over: rows that were understood, rows that were not, and the count of both."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass, field

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from profiles.errors import DataError, ThermotiltError
from profiles.ingest.layout import GREATEST_DEPTH
from profiles.ingest.spool import Spool
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
    read : Spool
        The rows that were understood, in file order; those that later went to quarantine are still there.
    table : Spool
        A row per time, strictly increasing in time; the readings are in the order of ``depth``, °C on the scale they
        were delivered on, NaN missing.
    depth : ndarray of float64, (depth,)
        m, or dbar of sea pressure where ``depth_is_pressure``; positive down, ascending.
    scale : str
        ``"ITS-90"`` or ``"IPTS-68"``.
    rejected : tuple of Rejected
    rows_read : int
        Counted while reading, apart from the rows kept and the rows rejected.
    cell_methods : str, optional
        What a reading stands for, in the words of CF, where that is known.
    mooring, latitude, longitude
        Where the file says so.
    """

    read: Spool
    table: Spool
    depth: NDArray[np.float64]
    scale: str
    rejected: tuple[Rejected, ...]
    rows_read: int
    depth_is_pressure: bool = False
    cell_methods: str | None = None
    mooring: str | None = None
    latitude: float | None = None
    longitude: float | None = None


@dataclass
class Tally:
    """Running count of the data rows of one file: read, kept, rejected."""

    rows_read: int = 0
    rows_kept: int = 0
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

    def take_back(self, lines: NDArray[np.int64], reasons: Sequence[str]) -> None:
        """Move rows that were kept to the quarantine."""
        self.rows_kept -= len(lines)
        self.reject(lines, reasons)

    def settle(self, where: str, times: int | None = None) -> tuple[Rejected, ...]:
        """Return the rejected rows in file order, once the count is right and something was kept.

        Parameters
        ----------
        where : str
            The file.
        times : int, optional
            Of the table that was made, where rows are also kept that have no reading, such as headers of blocks.

        Raises
        ------
        DataError
            Where there were no data rows, or none that could be understood.
        ThermotiltError
            Where rows were lost on the way, which is a fault of ours.
        """
        verify_count(self.rows_read, self.rows_kept, len(self.rejected), where)
        ordered = tuple(sorted(self.rejected, key=lambda row: row.line))
        if self.rows_read == 0:
            raise DataError("there are no data rows", where=where, expected="at least one", found="only a header")
        if self.rows_kept == 0 or times == 0:
            raise DataError(
                "no row could be understood",
                where=where,
                found="; ".join(f"line {row.line}: {row.reason}" for row in ordered[:FIRST_REASONS]) or "no reading",
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
