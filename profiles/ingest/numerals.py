"""Cells of text to numbers, strictly: a number, a missing token, or a problem."""

from __future__ import annotations

import re
from collections.abc import Collection
from enum import IntEnum

import numpy as np
from numpy.typing import NDArray

_SYNTAX = r"[+-]?(?:[0-9]+(?:{mark}[0-9]*)?|{mark}[0-9]+)(?:[eE][+-]?[0-9]+)?"
_LARGEST = float(np.finfo(np.float32).max)  # chains are stored in float32


class Problem(IntEnum):
    """What is wrong with a cell."""

    NONE = 0
    NOT_A_NUMBER = 1
    NOT_FINITE = 2

    def describe(self, cell: str) -> str:
        """Return the reason a row with this cell is quarantined."""
        if self is Problem.NOT_FINITE:
            return f"{cell[:40]!r} is beyond any number that can be stored"
        return f"{cell[:40]!r} is neither a number nor a missing token"


def parse_numbers(
    cells: NDArray[np.object_], *, decimal: str, missing: Collection[str]
) -> tuple[NDArray[np.float64], NDArray[np.int8]]:
    """Read numbers.

    Parameters
    ----------
    cells : ndarray of str, any shape
        Without blanks at the ends.
    decimal : str
        The decimal mark.
    missing : collection of str
        Tokens that stand for no reading. A cell is one of them where the texts are equal or where both are
        numbers and these are equal.

    Returns
    -------
    values : ndarray of float64
        NaN where missing or wrong.
    problems : ndarray of int8
        :class:`Problem` of each cell.
    """
    syntax = re.compile(_SYNTAX.format(mark=re.escape(decimal)))
    flat = cells.ravel()
    is_number = np.fromiter((syntax.fullmatch(cell) is not None for cell in flat), bool, flat.size)
    values = np.full(flat.size, np.nan)
    values[is_number] = _floats(flat[is_number], decimal)
    is_token = _are_tokens(flat, values, missing, decimal)
    values[is_token] = np.nan
    problems = np.where(is_number | is_token, Problem.NONE, Problem.NOT_A_NUMBER).astype(np.int8)
    overflow = np.abs(values) > _LARGEST
    problems[overflow] = Problem.NOT_FINITE
    values[overflow] = np.nan
    return values.reshape(cells.shape), problems.reshape(cells.shape)


def _floats(cells: NDArray[np.object_], decimal: str) -> NDArray[np.float64]:
    texts = cells if decimal == "." else [cell.replace(decimal, ".") for cell in cells]
    return np.asarray(texts, dtype=object).astype(np.float64)


def _are_tokens(
    cells: NDArray[np.object_], values: NDArray[np.float64], missing: Collection[str], decimal: str
) -> NDArray[np.bool_]:
    tokens = frozenset(token.strip() for token in missing)
    same_text = np.fromiter((cell in tokens for cell in cells), bool, cells.size)
    return same_text | np.isin(values, [number for token in tokens for number in _numeric(token, decimal)])


def _numeric(token: str, decimal: str) -> list[float]:
    """Return the token as a number, if it is one; a layout may write it with either decimal mark."""
    plain = token.replace(decimal, ".")
    return [float(plain)] if re.fullmatch(_SYNTAX.format(mark=r"\."), plain) else []
