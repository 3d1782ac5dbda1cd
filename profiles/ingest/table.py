"""The header of a text file, and what its stamps stand for."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from profiles.ingest.layout import TextLayout
from profiles.ingest.layout.time import Meaning
from profiles.ingest.lines import Lines, as_bytes

_MOST_CELLS = 4096  # of one line; more columns than a delivery has (ours)


def split_line(text: str, layout: TextLayout) -> list[str]:
    """Return the cells of one line of text."""
    buffer = as_bytes(text, "utf-8")
    line = Lines(buffer, np.zeros(1, np.int64), np.array([buffer.size]), np.ones(1, np.int64), "utf-8")
    cells = line.cells(layout, _MOST_CELLS)
    return [cells.text(0, column, "utf-8") for column in range(min(int(cells.count[0]), _MOST_CELLS))]


def column_names(header: Sequence[str], layout: TextLayout) -> list[str]:
    """Return the names of a table's columns, from the layout or from the header."""
    if layout.fixed:
        return list(layout.fixed)
    if layout.names:
        return list(layout.names)
    return split_line(header[layout.names_row - 1], layout)


def cell_methods(time: Meaning) -> str | None:
    """Return what a reading stands for, in the words of CF-1.11, section 7.3; None where it is not known."""
    if time.mean_hours is None:
        return None
    return f"time: mean (interval: {time.mean_hours:g} hours)" if time.mean_hours else "time: point"
