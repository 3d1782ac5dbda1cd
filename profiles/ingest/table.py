"""The header of a text file, and what its stamps stand for."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from profiles.errors import DataError
from profiles.ingest.cells import Cells, Damage
from profiles.ingest.layout import TextLayout
from profiles.ingest.layout.time import Meaning
from profiles.ingest.lines import Lines, as_bytes
from profiles.ingest.wording import printable

_MOST_CELLS = 4096  # of one line; more columns than a delivery has (ours)


def split_line(text: str, layout: TextLayout) -> list[str]:
    """Return the cells of one line of text; none where its quotes do not pair or it holds a NUL byte."""
    cells = _cut(text, layout)
    if cells.damage[0] in (Damage.NUL, Damage.QUOTES):
        return []
    return [cells.text(0, column, "utf-8") for column in range(min(int(cells.count[0]), _MOST_CELLS))]


def _cut(text: str, layout: TextLayout) -> Cells:
    buffer = as_bytes(text, "utf-8")
    line = Lines(buffer, np.zeros(1, np.int64), np.array([buffer.size]), np.ones(1, np.int64), "utf-8")
    return line.cells(layout, _MOST_CELLS)


def column_names(header: Sequence[str], layout: TextLayout) -> list[str]:
    """Return the names of a table's columns, from the layout or from the header.

    Raises
    ------
    DataError
        Where the row of names is damaged.
    """
    if layout.fixed:
        return list(layout.fixed)
    if layout.names:
        return list(layout.names)
    row = header[layout.names_row - 1]
    cells = _cut(row, layout)
    damage = Damage(cells.damage[0])
    if cells.count[0] > _MOST_CELLS:
        raise DataError(
            "there are more columns than a delivery has",
            where=f"header row {layout.names_row}",
            expected=f"at most {_MOST_CELLS}",
            found=str(cells.count[0]),
            advice="check delimiter and names_row in the layout",
        )
    if damage is not Damage.NONE:
        raise DataError(
            "the column names cannot be told apart",
            where=f"header row {layout.names_row}",
            expected="cells as the layout says",
            found=f"{damage.describe()}: {printable(row)}",
            advice="correct the row, or give the names in the layout",
        )
    return split_line(row, layout)


def cell_methods(time: Meaning) -> str | None:
    """Return what a reading stands for, in the words of CF-1.11, section 7.3; None where it is not known."""
    if time.mean_hours is None:
        return None
    return f"time: mean (interval: {time.mean_hours:g} hours)" if time.mean_hours else "time: point"
