"""What a cell is, seen alone: a number, a stamp, a missing token, a word, or something cut in the wrong place."""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import Literal

import numpy as np
from numpy.typing import NDArray

Sort = Literal["number", "stamp", "missing", "word", "odd"]

_NUMBERS = {
    mark: re.compile(rf"[+-]?(?:[0-9]+(?:{re.escape(mark)}[0-9]*)?|{re.escape(mark)}[0-9]+)(?:[eE][+-]?[0-9]+)?")
    for mark in ".,"
}
_MONTH = r"[A-Za-zÀ-ÿ]{3,9}\.?"
_DATE = (
    r"(?:[0-9]{1,4}[-/._ ][0-9]{1,2}[-/._ ][0-9]{1,4}\.?"
    rf"|[0-9]{{1,4}}[-/._ ]?{_MONTH}[-/._ ,]*[0-9]{{1,4}}|{_MONTH}[-/._ ]*[0-9]{{1,2}}[-/._ ,]+[0-9]{{2,4}}"
    r"|[0-9]{4}[-/. ]?[0-9]{3}|[0-9]{6,14})"
)
_CLOCK = r"[0-9]{1,2}(?:[:h][0-9]{2}){1,2}(?:[.,][0-9]+)?(?: ?[AaPp]\.?[Mm]\.?)?"
_ZONE = r"(?: ?(?:Z|[+-][0-9]{2}:?[0-9]{2}|[A-Z]{3,4}|\(?[A-Z]{3}[+-]?[0-9]*\)?))?"
_STAMP = re.compile(rf"(?:{_DATE}(?:[T ,_/:-]{{0,2}}(?:{_CLOCK}|[0-9]{{4,6}}))?|{_CLOCK}){_ZONE}")
_TWO_CELLS = re.compile(r"[0-9][\s\"]*[;,|\t][\s\"]*[-+.]?[0-9]|[0-9]\s+[-+.]?[0-9]|[;|\t]")
#: Words for "no reading" (common practice, no source).
_MISSING_WORDS = frozenset(
    """nan -nan +nan na n/a n.a. n.a n/d nd n.d. #n/a #na #nv #value! null none nil missing miss void nodata no_data
    nodat no-data mv inf -inf +inf 1.#qnan 1.#ind -1.#ind bad err error out open short fault fail""".split()  # noqa: SIM905
)
_RULE = re.compile(r"[-*_.?xX/#]+")


def is_number(text: str, decimal: str) -> bool:
    """Tell whether a cell is a number as the readers take it."""
    return _NUMBERS[decimal].fullmatch(text) is not None


def is_missing(text: str) -> bool:
    """Tell whether a cell is a common token for no reading, or empty."""
    return not text or text.casefold() in _MISSING_WORDS or _RULE.fullmatch(text) is not None


def sort_of(text: str, decimal: str) -> Sort:
    """Return what a cell is."""
    if is_number(text, decimal):
        return "number"
    if is_missing(text):
        return "missing"
    if _STAMP.fullmatch(text) and any(letter.isdigit() for letter in text):
        return "stamp"
    return "odd" if _TWO_CELLS.search(text) else "word"


def to_number(text: str, decimal: str) -> float:
    """Return a cell as a number, NaN where it is none."""
    return float(text.replace(decimal, ".")) if is_number(text, decimal) else np.nan


@dataclass(frozen=True)
class Column:
    """A column of the rows that were looked at.

    Attributes
    ----------
    place : int
        From 0.
    name : str
        As the reader calls it.
    notes : tuple of str
        What the other rows of the header have above it.
    texts : tuple of str
        Its cells.
    decimal : str
    """

    place: int
    name: str
    notes: tuple[str, ...]
    texts: tuple[str, ...]
    decimal: str

    @property
    def label(self) -> str:
        """Name and notes together."""
        return " ".join(text for text in (self.name, *self.notes) if text)

    @cached_property
    def numbers(self) -> NDArray[np.float64]:
        """The cells as numbers, NaN where they are none."""
        return np.array([to_number(text, self.decimal) for text in self.texts], float)

    @cached_property
    def others(self) -> Counter[str]:
        """The cells that are no numbers."""
        return Counter(text for text in self.texts if not is_number(text, self.decimal))

    @cached_property
    def is_numeric(self) -> bool:
        """Tell whether it holds numbers and missing tokens, and some numbers."""
        found = int(np.isfinite(self.numbers).sum())
        tokens = sum(count for text, count in self.others.items() if is_missing(text))
        often = sum(count for text, count in self.others.items() if not is_missing(text) and count > 2)
        enough = 0.9 * len(self.texts)
        return found > 0 and (found + tokens >= enough or (found + tokens + often >= enough and 3 * found >= enough))

    @cached_property
    def is_empty(self) -> bool:
        """Tell whether it holds nothing but missing tokens."""
        return all(is_missing(text) for text in self.others) and not np.isfinite(self.numbers).any()

    @cached_property
    def is_whole(self) -> bool:
        """Tell whether its numbers are whole, without a decimal mark."""
        return self.is_numeric and all(self.decimal not in text for text in self.texts if is_number(text, self.decimal))

    @cached_property
    def values(self) -> NDArray[np.float64]:
        """The numbers alone."""
        return self.numbers[np.isfinite(self.numbers)]


def share_of(cells: Iterable[str], decimal: str, sorts: Sequence[Sort]) -> float:
    """Return the share of cells that are of some sorts; 0 where there are none."""
    found = [sort_of(cell, decimal) in sorts for cell in cells]
    return sum(found) / len(found) if found else 0.0
