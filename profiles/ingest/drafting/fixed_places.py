"""Where the columns of fixed-width text begin and end."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

_ONE_LENGTH = 0.6  # share of the lines (ours)
_MOST = 0.9  # share of the lines that tells how a column is aligned (ours)
_SIGN_SHARE = 0.9  # a sign that stands in nearly all lines separates the parts of a date, no columns


def find_places(texts: Sequence[str], decimal: str) -> list[tuple[int, int]]:
    """Return the first and last character of each column, from 1.

    Two neighbouring characters are of two columns where in no line both belong to one word; a sign between two
    numbers that stand close begins a word.
    """
    if any("\t" in text for text in texts) or len(texts) < 2:
        return []
    width, agreeing = Counter(map(len, texts)).most_common(1)[0]
    # Where most lines have one length, the others are damaged; where they do not, their ends were cut.
    usual = [text for text in texts if len(text) == width] if agreeing > _ONE_LENGTH * len(texts) else list(texts)
    width = max(map(len, usual))
    table = np.array([list(text[:width].ljust(width)) for text in usual])
    blank = table == " "
    joined = ~blank[:, :-1] & ~blank[:, 1:] & ~_signs(table, blank)
    is_border = ~joined.any(axis=0)
    edges = [0, *(np.flatnonzero(is_border) + 1).tolist(), width]
    spans = [(start, stop) for start, stop in pairwise(edges) if not blank[:, start:stop].all()]
    return _widened(spans, [_is_left_aligned(blank[:, start:stop]) for start, stop in spans])


def _signs(table: NDArray[np.str_], blank: NDArray[np.bool_]) -> NDArray[np.bool_]:
    """Tell before which characters a number begins with a sign right behind another number."""
    digit = np.char.isdigit(table)
    sign = np.isin(table, ["-", "+"])
    before = digit[:, :-1] & sign[:, 1:]
    follows = np.zeros_like(before)
    follows[:, :-1] = digit[:, 2:]
    everywhere = sign[:, 1:].mean(axis=0) > _SIGN_SHARE
    return before & follows & ~everywhere


def _is_left_aligned(blank: NDArray[np.bool_]) -> bool:
    """Tell whether the texts of a column begin at one place and end at several."""
    filled = ~blank[~blank.all(axis=1)]
    return bool(filled[:, 0].mean() > _MOST and filled[:, -1].mean() < _MOST)


def _widened(spans: list[tuple[int, int]], is_left: list[bool]) -> list[tuple[int, int]]:
    """Return columns, from 1, with the blanks between them: longer texts grow to the right or to the left."""
    places: list[tuple[int, int]] = []
    begin = 1
    for (_, stop), left, following in zip(spans, is_left, [*spans[1:], None], strict=True):
        end = following[0] if left and following is not None else stop
        places.append((begin, end))
        begin = end + 1
    return places
