"""Rows of a text file understood: stamps to times, cells to numbers and flags, the rest to quarantine."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from itertools import islice

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from profiles.errors import DataError
from profiles.ingest.cells import Cells, Damage
from profiles.ingest.clock import Times, Zone, clock_of_numbers, clock_of_parts, clock_of_texts, finished, in_utc
from profiles.ingest.layout import TextLayout
from profiles.ingest.lines import Lines
from profiles.ingest.numerals import Numerals, Problem, read_marks
from profiles.ingest.record import Tally
from profiles.ingest.stamps import compiled, gathered, read_stamps
from profiles.ingest.wording import listed, nearest

NO_MARK = -1  # stands for a quality mark that is in no table
_FEW_LABELS = 64  # that are looked for first, all together


@dataclass(frozen=True)
class Rows:
    """Rows in file order: line number, time, numbers (NaN missing), our flags for the delivered marks, a label."""

    line: NDArray[np.int64]
    time: Times
    values: NDArray[np.float64]
    flags: NDArray[np.int8]
    label: NDArray[np.int32]

    def where(self, chosen: NDArray[np.bool_]) -> Rows:
        """Return some of the rows."""
        return Rows(self.line[chosen], self.time[chosen], self.values[chosen], self.flags[chosen], self.label[chosen])

    def without(self, reasons: NDArray[np.object_], tally: Tally) -> Rows:
        """Return the rows that have no reason to be quarantined, and tell the tally of the others."""
        is_bad = pd.notna(reasons)
        tally.reject(self.line[is_bad], reasons[is_bad])
        return self.where(~is_bad) if is_bad.any() else self


@dataclass(frozen=True)
class Columns:
    """Which columns of a table are read as what.

    Attributes
    ----------
    where : str
        The file.
    names : sequence of str
        Of all columns.
    numbers : sequence of int
        Columns of numbers.
    marks : sequence of int
        Columns of quality marks; or one, ``per_character``, of which each character is a mark.
    tables : sequence of mapping
        What the marks mean, where that differs from column to column; else as :class:`Understanding` has it.
    label : int, optional
        Column of a text that is kept as a number, see :class:`Understanding`.
    """

    where: str
    names: Sequence[str]
    numbers: Sequence[int] = ()
    marks: Sequence[int] = ()
    per_character: bool = False
    tables: Sequence[Mapping[str, int]] = ()
    label: int | None = None

    def place(self, name: str, role: str) -> int:
        """Return the place of a column; raise DataError where it is missing or its name appears twice."""
        count = list(self.names).count(name)
        if count == 1:
            return list(self.names).index(name)
        raise DataError(
            f"the {role} column is missing" if count == 0 else f"there are {count} columns of this name",
            where=self.where,
            expected=f"a column {name!r}",
            found=listed(self.names),
            advice=f"give the column's name in the layout{nearest(name, self.names) if count == 0 else ''}",
        )

    @property
    def flags(self) -> int:
        """How many marks a row has."""
        return len(self.numbers) if self.per_character else len(self.marks)


@dataclass
class Understanding:
    """How the lines of one file are understood, and what was met on the way.

    Attributes
    ----------
    layout : TextLayout
    tally : Tally
        Counts the rows and takes those that cannot be understood, whole.
    encoding : str
        Of the bytes.
    marks : mapping
        Our flag by delivered mark.
    labels : dict
        Number of each label in the order of their coming.
    """

    layout: TextLayout
    tally: Tally
    encoding: str
    marks: Mapping[str, int]
    labels: dict[str, int] = field(default_factory=dict)

    def __post_init__(self) -> None:
        time = self.layout.time
        self._zone = Zone(time.zone, by_order=time.repeated_hour == "by_order")
        self._numerals = Numerals(self.layout.decimal, self.layout.missing, self.encoding)
        self._stamp_numerals = Numerals(self.layout.decimal, (), self.encoding)
        self._program = compiled(time.format)

    def rows(self, lines: Lines, columns: Columns, *, sensor: int | None = None, time: Times | None = None) -> Rows:
        """Return the rows of some lines; those that cannot be understood are rejected, whole.

        Parameters
        ----------
        lines : Lines
        columns : Columns
        sensor : int, optional
            Which of the numbers tells the readings of one time apart; without one, the label does, if there is one.
        time : ndarray of datetime64[ns], optional
            Of the lines, where they have no stamp themselves.
        """
        self.tally.rows_read += len(lines)
        cells = lines.cells(self.layout, len(columns.names))
        reasons = damage_reasons(lines, cells, len(columns.names), self.layout.encoding)
        values, problems = self._numerals.read(cells.buffer, *_spans(cells, columns.numbers))
        label = self._labels(cells, columns)
        if time is None:
            apart = (
                values[:, sensor] if sensor is not None else label.astype(float) if columns.label is not None else None
            )
            time = self._times(cells, columns, reasons, apart)
        if problems.any():
            self._name_problems(cells, columns, problems, reasons)
        flags = self._flags(cells, columns, reasons)
        is_bad = pd.notna(reasons)
        bad = lines.where(is_bad)
        self.tally.reject(bad.number, reasons[is_bad], bad.texts())
        rows = Rows(lines.number, time, values, flags, label)
        return rows.where(~is_bad) if is_bad.any() else rows

    def are_readings(self, lines: Lines, columns: Columns) -> tuple[NDArray[np.bool_], NDArray[np.float64]]:
        """Tell which lines have the columns and numbers of a reading, and return the numbers, (line, number)."""
        cells = lines.cells(self.layout, len(columns.names))
        values, problems = self._numerals.read(cells.buffer, *_spans(cells, columns.numbers))
        return _are_whole(cells, columns) & ~problems.any(axis=1), values

    def stamped(
        self, lines: Lines, columns: Columns
    ) -> tuple[NDArray[np.bool_], NDArray[np.float64], tuple[Times, NDArray[np.bool_]]]:
        """Tell which lines have the columns, the stamp and the numbers of a record; return numbers, and what the clock
        showed, for :meth:`utc`."""
        cells = lines.cells(self.layout, len(columns.names))
        values, problems = self._stamp_numerals.read(cells.buffer, *_spans(cells, columns.numbers))
        clock = self._clock(cells, columns)
        return _are_whole(cells, columns) & ~problems.any(axis=1) & ~np.isnat(clock[0]), values, clock

    def utc(
        self, clock: tuple[Times, NDArray[np.bool_]], sensor: NDArray[np.float64] | None = None
    ) -> tuple[Times, NDArray[np.object_]]:
        """Return what the clock showed, line by line in the order of the file, in UTC; why not, or None."""
        return in_utc(*clock, self._zone, self.layout.time.to_centre_hours, sensor)

    # ----------------------------------------------------------------------------------------------------------
    # Times

    def _times(
        self,
        cells: Cells,
        columns: Columns,
        reasons: NDArray[np.object_],
        sensor: NDArray[np.float64] | None,
    ) -> Times:
        time, problems = self.utc(self._clock(cells, columns), sensor)
        is_new = pd.isna(reasons) & pd.notna(problems)
        reasons[is_new] = problems[is_new]
        return time

    def _clock(self, cells: Cells, columns: Columns) -> tuple[Times, NDArray[np.bool_]]:
        layout = self.layout.time
        places = [columns.place(name, "time") for name in layout.names]
        spans = _spans(cells, places)
        if layout.parts or layout.units is not None:
            numbers, _ = self._stamp_numerals.read(cells.buffer, *spans)
            nowhere = np.zeros(len(numbers), bool)
            if layout.units is not None:
                return clock_of_numbers(numbers[:, 0], layout.units), nowhere
            return clock_of_parts(dict(zip(layout.parts, numbers.T, strict=True))), nowhere
        if self._program is None:
            return clock_of_texts(self._joined(cells, places, range(cells.count.size)), layout.format)
        clock, is_utc = read_stamps(gathered(cells.buffer, *spans), self._program)
        left = np.flatnonzero(np.isnat(clock.view("datetime64[ns]")))
        return finished(clock, is_utc, self._joined(cells, places, left), layout.format)

    def _joined(
        self, cells: Cells, places: Sequence[int], lines: Sequence[int] | NDArray[np.intp]
    ) -> NDArray[np.object_]:
        texts = [" ".join(cells.text(int(line), place, self.encoding) for place in places) for line in lines]
        return np.array(texts, dtype=object)

    # ----------------------------------------------------------------------------------------------------------
    # Numbers, marks, labels

    def _name_problems(
        self, cells: Cells, columns: Columns, problems: NDArray[np.int8], reasons: NDArray[np.object_]
    ) -> None:
        """Name the first wrong cell of each row that has no reason yet."""
        for row in np.flatnonzero(problems.any(axis=1) & pd.isna(reasons)):
            first = int(np.flatnonzero(problems[row])[0])
            column = columns.numbers[first]
            cell = cells.text(int(row), column, self.encoding)
            reasons[row] = f"column {columns.names[column]!r}: {Problem(problems[row, first]).describe(cell)}"

    def _flags(self, cells: Cells, columns: Columns, reasons: NDArray[np.object_]) -> NDArray[np.int8]:
        if not columns.flags:
            return np.zeros((cells.count.size, 0), np.int8)
        starts, ends = _spans(cells, columns.marks)
        if columns.per_character:
            self._check_lengths(ends - starts, columns, reasons)
            starts = np.minimum(starts + np.arange(columns.flags, dtype=np.int32), ends)
            ends = np.minimum(starts + 1, ends)
        tables = columns.tables or [self.marks] * starts.shape[1]
        if all(table is tables[0] for table in tables):
            flags = read_marks(cells.buffer, starts, ends, tables[0], self.encoding)
        else:
            parts = zip(_single(starts), _single(ends), tables, strict=True)
            flags = np.hstack([read_marks(cells.buffer, *part, self.encoding) for part in parts])
        for row in np.flatnonzero((flags == NO_MARK).any(axis=1) & pd.isna(reasons)):
            place = int(np.flatnonzero(flags[row] == NO_MARK)[0])
            mark = cells.buffer[starts[row, place] : ends[row, place]].tobytes().decode(self.encoding, "replace")
            reasons[row] = _no_such_mark(mark, columns.names[columns.marks[place]] if columns.tables else None)
        return flags.astype(np.int8)

    def _check_lengths(self, lengths: NDArray[np.int32], columns: Columns, reasons: NDArray[np.object_]) -> None:
        for row in np.flatnonzero((lengths[:, 0] != columns.flags) & pd.isna(reasons)):
            reasons[row] = f"{lengths[row, 0]} quality marks where there are {columns.flags} sensors"

    def _labels(self, cells: Cells, columns: Columns) -> NDArray[np.int32]:
        if columns.label is None:
            return np.zeros(cells.count.size, np.int32)
        known = dict(islice(self.labels.items(), _FEW_LABELS))
        labels = read_marks(cells.buffer, *_spans(cells, [columns.label]), known, self.encoding)[:, 0]
        for line in np.flatnonzero(labels == NO_MARK):
            text = cells.text(int(line), columns.label, self.encoding)
            labels[line] = self.labels.setdefault(text, len(self.labels))
        return labels


def _no_such_mark(mark: str, column: str | None) -> str:
    if column is None:
        return f"the quality mark {mark!r} is in no table; say in [quality] flags what it means"
    return f"column {column!r}: the mark {mark!r} is in no table; say in the layout what it means"


def _single(edges: NDArray[np.int32]) -> list[NDArray[np.int32]]:
    """Return the columns one by one, (line, 1)."""
    return [np.ascontiguousarray(edges[:, place : place + 1]) for place in range(edges.shape[1])]


def _are_whole(cells: Cells, columns: Columns) -> NDArray[np.bool_]:
    return (cells.damage == Damage.NONE) & (cells.count == len(columns.names))


def _spans(cells: Cells, columns: Sequence[int]) -> tuple[NDArray[np.int32], NDArray[np.int32]]:
    chosen = np.array(columns, np.intp)
    return np.take(cells.starts, chosen, axis=1), np.take(cells.ends, chosen, axis=1)


def damage_reasons(lines: Lines, cells: Cells, columns: int, encoding: str) -> NDArray[np.object_]:
    """Return why a line as a whole cannot be understood, or None."""
    reasons = np.full(len(lines), None, dtype=object)
    for line in np.flatnonzero(cells.damage):
        reasons[line] = Damage(cells.damage[line]).describe()
    for line in np.flatnonzero((cells.count != columns) & (cells.damage == Damage.NONE)):
        reasons[line] = f"{cells.count[line]} cells where there are {columns} columns"
    foreign = np.flatnonzero(~cells.is_ascii)
    for line in foreign[_undecodable(lines, foreign)]:
        reasons[line] = f"the row holds bytes that are not {encoding}"
    return reasons


def _undecodable(lines: Lines, candidates: NDArray[np.intp]) -> NDArray[np.bool_]:
    found = np.zeros(candidates.size, bool)
    for place, line in enumerate(candidates):
        try:
            lines.buffer[lines.starts[line] : lines.ends[line]].tobytes().decode(lines.encoding)
        except UnicodeDecodeError:
            found[place] = True
    return found
