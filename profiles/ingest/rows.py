"""Rows of a text file understood: stamps to times, cells to numbers, the rest to quarantine."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from profiles.ingest.clock import parse_times
from profiles.ingest.layout import TextLayout
from profiles.ingest.lines import Block, Table
from profiles.ingest.numerals import Problem, parse_numbers
from profiles.ingest.record import Tally


@dataclass(frozen=True)
class Rows:
    """Rows in file order: line number, time, one number per column (NaN missing), one label."""

    line: NDArray[np.int64]
    time: NDArray[np.datetime64]
    values: NDArray[np.floating]
    label: NDArray[np.object_]

    def where(self, chosen: NDArray[np.bool_] | NDArray[np.intp]) -> Rows:
        """Return some of the rows, by mask or by place."""
        return Rows(self.line[chosen], self.time[chosen], self.values[chosen], self.label[chosen])


def understood(
    table: Table, tally: Tally, columns: Mapping[str, int], label_column: int | None = None
) -> Iterator[Rows]:
    """Yield the rows of a table in blocks; those that cannot be understood are rejected, whole.

    Parameters
    ----------
    table : Table
    tally : Tally
        Counts the rows and takes those that are rejected.
    columns : mapping
        Place of each column of numbers by name; the order is that of the values.
    label_column : int, optional
        Place of a column of text.
    """
    stamp_columns = [table.column(name, "time") for name in table.layout.time.names]
    for block in table.blocks(tally):
        yield _understand(block, table.layout, tally, stamp_columns, columns, label_column)


def _understand(
    block: Block,
    layout: TextLayout,
    tally: Tally,
    stamp_columns: Sequence[int],
    columns: Mapping[str, int],
    label_column: int | None,
) -> Rows:
    time, reasons = parse_times(
        [" ".join(row[place] for place in stamp_columns) for row in block.cells],
        time_format=layout.time.format,
        zone=layout.time.zone,
        offset_hours=layout.time.offset_hours,
    )
    cells = picked(block.cells, list(columns.values()))
    values, problems = parse_numbers(cells, decimal=layout.decimal, missing=layout.missing)
    _add_problems(reasons, cells, problems, list(columns))
    label = picked(block.cells, [label_column])[:, 0] if label_column is not None else np.full(len(reasons), "", object)
    rows = Rows(np.array(block.lines, dtype=np.int64), time, values, label)
    is_bad = pd.notna(reasons)
    tally.reject(rows.line[is_bad], reasons[is_bad], [block.texts[place] for place in np.flatnonzero(is_bad)])
    return rows.where(~is_bad)


def picked(cells: Sequence[Sequence[str]], places: Sequence[int]) -> NDArray[np.object_]:
    """Return some columns of split rows as an array of texts, (row, column)."""
    table = np.empty((len(cells), len(places)), dtype=object)
    for column, place in enumerate(places):
        table[:, column] = [row[place] for row in cells]
    return table


def _add_problems(
    reasons: NDArray[np.object_], cells: NDArray[np.object_], problems: NDArray[np.int8], names: Sequence[str]
) -> None:
    """Name the first wrong cell of each row that has no reason yet."""
    for row in np.flatnonzero(problems.any(axis=1)):
        column = int(np.flatnonzero(problems[row])[0])
        if reasons[row] is None:
            reasons[row] = f"column {names[column]!r}: {Problem(problems[row, column]).describe(cells[row, column])}"


def gathered(parts: Sequence[Rows], width: int) -> Rows:
    """Return blocks of rows as one, numbers in float32; ``width`` is the number of columns of numbers."""
    nothing = Rows(
        np.empty(0, np.int64),
        np.empty(0, "datetime64[ns]"),
        np.empty((0, width), np.float32),
        np.empty(0, object),
    )
    every = [nothing, *parts]
    return Rows(
        np.concatenate([part.line for part in every]),
        np.concatenate([part.time for part in every]),
        np.concatenate([part.values.astype(np.float32) for part in every]),
        np.concatenate([part.label for part in every]),
    )
