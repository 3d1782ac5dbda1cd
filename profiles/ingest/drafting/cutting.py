"""How lines are cut into cells: which delimiter and which decimal mark make the cells look like readings."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np

from profiles.ingest.cells import Cells, delimited_cells, fixed_cells
from profiles.ingest.drafting.content import sort_of
from profiles.ingest.drafting.fixed_places import find_places
from profiles.ingest.layout import WHITESPACE
from profiles.ingest.lines import as_bytes, find_lines

DELIMITERS = ("\t", ";", ",", "|", WHITESPACE)
_LOOKED_AT = 300  # lines on which the ways of cutting are compared
_ODD_SHARE = 0.05  # of the cells that may look cut in the wrong place

#: Worth of a cell by its sort: numbers are what is looked for.
_WORTH = {"number": 1.0, "stamp": 0.5, "missing": 0.5, "word": 0.0, "odd": -2.0}


@dataclass(frozen=True)
class Cutting:
    """One way to cut lines.

    Attributes
    ----------
    delimiter : str
        As in a layout.
    decimal : str
    fixed : tuple of (int, int)
        First and last character of each column, from 1, where there is no delimiter.
    trimmed : bool
        Whether lines end early.
    """

    delimiter: str
    decimal: str
    fixed: tuple[tuple[int, int], ...] = ()
    trimmed: bool = field(default=False)

    def cut(self, texts: Sequence[str]) -> list[list[str]]:
        """Return the cells of lines, as the readers cut them; a line with quotes that do not pair has none."""
        if not texts:
            return []
        buffer = as_bytes("\n".join(text.replace("\n", " ").replace("\r", " ") or " " for text in texts), "utf-8")
        starts, ends = find_lines(buffer)
        if self.fixed:
            places = np.array(self.fixed, np.int64)
            cells = fixed_cells(buffer, starts, ends, places, True, True)
            count = np.array([len(self.fixed)] * len(texts))
        else:
            delimiter = 0 if self.delimiter == WHITESPACE else ord(self.delimiter)
            most = max(1, max(_at_most(text, self.delimiter) for text in texts))
            cells = delimited_cells(buffer, starts, ends, delimiter, most)
            count = cells.count
        return [_texts(cells, line, int(count[line])) for line in range(len(texts))]

    @property
    def in_words(self) -> str:
        """Say it."""
        if self.fixed:
            between = "columns of fixed width"
        else:
            names = {"\t": "tabs", ";": "semicolons", ",": "commas", "|": "bars", WHITESPACE: "blanks"}
            between = f"cells between {names[self.delimiter]}"
        return f"{between}, decimal {'point' if self.decimal == '.' else 'comma'}"


def _at_most(text: str, delimiter: str) -> int:
    return len(text.split()) if delimiter == WHITESPACE else text.count(delimiter) + 1


def _texts(cells: Cells, line: int, count: int) -> list[str]:
    return [] if cells.damage[line] else [cells.text(line, column, "utf-8") for column in range(count)]


@dataclass(frozen=True)
class _Judged:
    cutting: Cutting
    worth: float
    odd: float
    columns: int
    agreeing: float  # share of the lines that have this many columns
    several: float  # share of the lines that have more than one

    @property
    def is_clean(self) -> bool:
        return self.odd <= _ODD_SHARE and self.columns >= 2


def cuttings(texts: Sequence[str]) -> list[Cutting]:
    """Return the ways to cut the lines of a file that make sense, the likeliest first.

    Parameters
    ----------
    texts : sequence of str
        Lines that are mostly rows of data.
    """
    looked_at = _thinned(texts)
    judged = [_best_decimal(delimiter, looked_at) for delimiter in DELIMITERS]
    clean = [each for each in judged if each.is_clean]
    delimited = [each for each in clean if each.cutting.delimiter != WHITESPACE and each.several > 0.8]
    blanks = [each for each in clean if each.cutting.delimiter == WHITESPACE]
    delimited.sort(key=lambda each: (-round(each.worth, 1), DELIMITERS.index(each.cutting.delimiter)))
    # The one with more numbers: a comma may also be in a text, or the only comma of a line be a decimal one.
    chosen = [each.cutting for each in sorted(delimited + blanks, key=_rank, reverse=True)]
    return [*chosen, *_fixed(looked_at, judged)]


def _rank(judged: _Judged) -> tuple[bool, float]:
    """Order ways of cutting: blanks stand inside stamps and names, so a delimiter beside them is meant."""
    if judged.cutting.delimiter == WHITESPACE:
        return False, judged.worth
    return judged.columns > 2 or judged.worth >= 1.0, judged.worth


def _thinned(texts: Sequence[str]) -> list[str]:
    """Return some lines of the later part, where the header is past."""
    later = texts[len(texts) // 3 :] if len(texts) > 12 else texts
    step = max(1, len(later) // _LOOKED_AT)
    return list(later[::step])


def _best_decimal(delimiter: str, texts: Sequence[str]) -> _Judged:
    quoted = any('"' in text for text in texts)
    options = [_judged(Cutting(delimiter, decimal), texts) for decimal in ".," if decimal != delimiter or quoted]
    return max(options, key=lambda each: each.worth)


def _judged(cutting: Cutting, texts: Sequence[str]) -> _Judged:
    rows = [row for row in cutting.cut(texts) if row]
    if not rows:
        return _Judged(cutting, 0.0, 1.0, 0, 0.0, 0.0)
    sorts = [[sort_of(cell, cutting.decimal) for cell in row] for row in rows]
    cells = sum(map(len, sorts))
    columns, agreeing = Counter(map(len, rows)).most_common(1)[0]
    return _Judged(
        cutting,
        sum(_WORTH[sort] for row in sorts for sort in row) / len(rows),
        sum(row.count("odd") for row in sorts) / cells,
        columns,
        agreeing / len(rows),
        sum(len(row) > 1 for row in rows) / len(rows),
    )


def _fixed(texts: Sequence[str], judged: Sequence[_Judged]) -> list[Cutting]:
    if any(each.is_clean and each.cutting.delimiter != WHITESPACE and each.agreeing > 0.9 for each in judged):
        return []
    found: list[Cutting] = []
    for decimal in ".,":
        places = find_places(texts, decimal)
        if len(places) > 1:
            trimmed = sum(len(text) < places[-1][1] for text in texts) > 1
            cutting = Cutting(WHITESPACE, decimal, tuple(places), trimmed)
            candidate = _judged(cutting, texts)
            if candidate.is_clean:
                found.append(cutting)
    found.sort(key=lambda each: -_judged(each, texts).worth)
    return found[:1]
