"""Text with a profile per record: a line with stamp and count, then that many lines of depth and reading."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path
from typing import Any

import numba
import numpy as np
import pandas as pd
from numpy.typing import NDArray

from profiles.errors import DataError
from profiles.ingest.layout import GREATEST_DEPTH, CountedLayout
from profiles.ingest.lines import Lines, past_header
from profiles.ingest.long import DEPTH, Readings, reading_columns
from profiles.ingest.record import Record, Tally
from profiles.ingest.rows import Columns, Understanding
from profiles.ingest.source import internal_encoding
from profiles.ingest.units import to_downward

Mask = NDArray[np.bool_]
RECORD, READING, NEITHER = 0, 1, 2


def read_counted(path: Path, layout: CountedLayout) -> Record:
    """Read a text file of profiles one after another.

    A profile stays where as many lines follow its first as that says, up to the first line of the next profile. Where
    it is otherwise, a line was lost or came twice, it cannot be told which readings are of which profile, and all of
    them go to quarantine.

    Raises
    ------
    RequestError, DataError, MachineError
        Where the file cannot be read or is not what the layout says.
    """
    where = str(path)
    record = Columns(where, layout.record.names)
    record = Columns(where, layout.record.names, numbers=(record.place(layout.record.count, "count"),))
    reading = reading_columns(Columns(where, layout.names), layout)
    tally = Tally()
    marks = layout.quality.flags if layout.quality is not None else {}
    profiles = _Profiles(Understanding(layout, tally, internal_encoding(layout.encoding), marks), record, reading)
    readings = Readings(layout, tally, where)
    found = 0
    for lines in _whole_profiles(path, profiles):
        found += profiles.take(lines, readings)
    if not found:
        raise DataError(
            "no line begins a profile",
            where=where,
            expected=f"lines of {len(layout.record.names)} cells with a stamp and a count",
            advice="check [record] and [time] in the layout",
        )
    return readings.record([])


@numba.njit(cache=True)
def tell_apart(can_be_record: Mask, can_be_reading: Mask, counts: NDArray[np.int64]) -> NDArray[np.int8]:
    """Return what each line is; one that could be both is a reading while readings are owed."""
    role = np.empty(counts.size, np.int8)
    owed = 0
    for line in range(counts.size):
        if can_be_record[line] and not (can_be_reading[line] and owed > 0):
            role[line], owed = RECORD, counts[line]
        else:
            role[line] = READING if can_be_reading[line] else NEITHER
            owed -= 1
    return role


class _Profiles:
    """The lines of a file told apart, and the profiles that they make."""

    def __init__(self, understanding: Understanding, record: Columns, reading: Columns) -> None:
        self._understanding = understanding
        self._layout: CountedLayout = understanding.layout  # type: ignore[assignment]
        self._record, self._reading = record, reading

    def roles(self, lines: Lines) -> tuple[NDArray[np.int8], NDArray[np.int64], Any]:
        """Return what each line is, and count and clock of those that begin a profile."""
        layout = self._layout
        is_record, numbers, clock = self._understanding.stamped(lines, self._record)
        count = numbers[:, 0]
        is_record &= (count >= 0) & (count == np.floor(count)) & (count < np.iinfo(np.int32).max)
        is_reading, values = self._understanding.are_readings(lines, self._reading)
        depth = to_downward(values[:, DEPTH], layout.depth.units, layout.depth.positive)
        is_reading &= ~((depth < 0.0) | (depth > GREATEST_DEPTH))
        if layout.record.begins:
            begins = lines.begin_with(layout.record.begins)
            is_record, is_reading = is_record & begins, is_reading & ~begins
        counts = np.where(is_record, count, 0.0).astype(np.int64)
        return tell_apart(is_record, is_reading, counts), counts, clock

    def take(self, lines: Lines, readings: Readings) -> int:
        """Hand over the readings of whole profiles, reject those of others; return the number of profiles."""
        role, counts, (clock, is_utc) = self.roles(lines)
        first = np.flatnonzero(role == RECORD)
        time, problems = self._understanding.utc((clock[first], is_utc[first]))
        found = np.diff(np.append(first, len(lines))) - 1
        for profile in np.flatnonzero(found != counts[first]):
            problems[profile] = f"it has {found[profile]} lines of readings where it counts {counts[first[profile]]}"
        owner = np.cumsum(role == RECORD) - 1  # -1 before the first profile
        reasons = np.full(len(lines), "no line that begins a profile stands before this one", dtype=object)
        of_any = owner >= 0
        reasons[of_any] = self._named(lines.number[first], problems)[owner[of_any]]
        is_whole = pd.isna(reasons)
        self._reject(lines.where(~is_whole), reasons[~is_whole])
        heads, inside = is_whole & (role == RECORD), is_whole & (role != RECORD)
        self._understanding.tally.rows_read += int(heads.sum())
        self._understanding.tally.rows_kept += int(heads.sum())
        rows = self._understanding.rows(lines.where(inside), self._reading, sensor=DEPTH, time=time[owner[inside]])
        readings.add(rows)
        return first.size

    @staticmethod
    def _named(numbers: NDArray[np.int64], problems: NDArray[np.object_]) -> NDArray[np.object_]:
        named = [
            None if problem is None else f"the profile of line {number}: {problem}"
            for number, problem in zip(numbers, problems, strict=True)
        ]
        return np.array(named, dtype=object)

    def _reject(self, lines: Lines, reasons: NDArray[np.object_]) -> None:
        self._understanding.tally.rows_read += len(lines)
        self._understanding.tally.reject(lines.number, reasons, lines.texts())


def _whole_profiles(path: Path, profiles: _Profiles) -> Iterator[Lines]:
    """Yield the lines of a file so that those of one profile stay together."""
    _, blocks = past_header(path, profiles._layout)
    held: Lines | None = None
    for block in blocks:
        lines = block if held is None else block.behind(held)
        role, _, _ = profiles.roles(lines)
        first = np.flatnonzero(role == RECORD)
        last = int(first[-1]) if first.size else len(lines)
        yield lines.where(slice(None, last))
        held = lines.where(slice(last, None)).cut_loose() if last < len(lines) else None
    if held is not None:
        yield held
