"""Cells of text to numbers, strictly: a number, a missing token, or a problem."""

from __future__ import annotations

import re
from collections.abc import Collection, Mapping, Sequence
from dataclasses import dataclass
from enum import IntEnum
from functools import cached_property

import numba
import numpy as np
from numpy.typing import NDArray

from profiles.ingest.cells import Bytes

_SYNTAX = r"[+-]?(?:[0-9]+(?:{mark}[0-9]*)?|{mark}[0-9]+)(?:[eE][+-]?[0-9]+)?"
LARGEST = float(np.finfo(np.float32).max)  # chains are stored in float32

ZERO, NINE, PLUS, MINUS, EXPONENTS = 48, 57, 43, 45, (69, 101)
_MOST_DIGITS = 18  # of a whole number that fits into 64 bits whatever its digits
_EXACT = 2**53  # whole numbers up to it are float64, exactly
_EXACT_POWER = 22  # and so is ten to at most this power: their quotient is rounded once, as it must be
_HALVES = 134_217_729.0  # 2^27 + 1; cuts a float64 into two of 26 digits (Dekker 1971, Numerische Mathematik 18)
_QUOTIENT_ERROR = 2.0**-48  # relative, of the second part of a quotient; it is nearer 2^-51
_POWERS: NDArray[np.float64] = np.array([10.0**power for power in range(_EXACT_POWER + 1)])
_LARGEST_EXPONENT = 9999  # beyond any float64; more digits of an exponent change nothing


class Problem(IntEnum):
    """What is wrong with a cell."""

    NONE = 0
    NOT_A_NUMBER = 1
    NOT_FINITE = 2
    UNDECIDED = 3  # a number of more digits than the kernel rounds exactly

    def describe(self, cell: str) -> str:
        """Return the reason a row with this cell is quarantined."""
        if self is Problem.NOT_FINITE:
            return f"{cell[:40]!r} is beyond any number that can be stored"
        return f"{cell[:40]!r} is neither a number nor a missing token"


# --------------------------------------------------------------------------------------------------------------
# Kernels


@numba.njit(cache=True, inline="always")  # as a call it takes three times as long
def _mantissa(buffer: Bytes, place: int, end: int, mark: int) -> tuple[float, int, int, int, int, int]:
    """Return sign, digits as a whole number, how many, how many of them behind the mark and how many zeros before the
    others, and the place behind them."""
    sign = 1.0
    if place < end and (buffer[place] == PLUS or buffer[place] == MINUS):
        sign = -1.0 if buffer[place] == MINUS else 1.0
        place += 1
    whole, digits, zeros, point = 0, 0, 0, -1
    while place < end:
        digit = int(buffer[place]) - ZERO
        if 0 <= digit <= 9:
            whole = 10 * whole + digit
            digits += 1
            zeros += whole == 0
        elif buffer[place] == mark and point < 0:
            point = digits
        else:
            break
        place += 1
    return sign, whole, digits, (digits - point if point >= 0 else 0), zeros, place


@numba.njit(cache=True)
def _halves(number: float) -> tuple[float, float]:
    """Return two numbers of at most 26 binary digits that make a number together."""
    upper = _HALVES * number
    upper = upper - (upper - number)
    return upper, number - upper


@numba.njit(cache=True)
def _quotient(whole: int, divisor: float) -> tuple[float, bool]:
    """Return a whole number of up to 63 bits divided by an exact divisor, and whether it is surely rounded rightly.

    The quotient is found in two parts, the second from the exact rest that the first leaves; only where their sum is so
    near the middle between two numbers that the error of the second decides, it is left open.
    """
    upper = float(whole)
    lower = float(whole - int(upper))
    first = upper / divisor
    product = first * divisor
    (one, two), (three, four) = _halves(first), _halves(divisor)
    missing = ((one * three - product) + one * four + two * three) + two * four
    second = ((upper - product) - missing + lower) / divisor
    found = first + second * (1.0 + _QUOTIENT_ERROR)
    return found, found == first + second * (1.0 - _QUOTIENT_ERROR)


@numba.njit(cache=True)
def _scaled(whole: int, power: int, powers: NDArray[np.float64]) -> tuple[float, bool]:
    """Return a whole number times a power of ten, and whether it is surely rounded rightly."""
    if abs(power) > _EXACT_POWER:
        return np.nan, False
    if whole <= _EXACT:
        return (whole / powers[-power] if power < 0 else whole * powers[power]), True
    return _quotient(whole, powers[-power]) if power <= 0 else (np.nan, False)


@numba.njit(cache=True)
def _plain_numbers(
    buffer: Bytes,
    starts: NDArray[np.int32],
    ends: NDArray[np.int32],
    mark: int,
    powers: NDArray[np.float64],
) -> tuple[NDArray[np.float64], NDArray[np.int8]]:
    """Return the numbers that have no exponent and few digits; what is none of them is undecided."""
    values, problems = np.empty(starts.shape, np.float64), np.zeros(starts.shape, np.int8)
    for line in range(starts.shape[0]):
        for column in range(starts.shape[1]):
            end = int(ends[line, column])
            sign, whole, digits, behind, zeros, place = _mantissa(buffer, int(starts[line, column]), end, mark)
            values[line, column], problems[line, column] = np.nan, 3
            if place == end and digits and digits - zeros <= _MOST_DIGITS:
                if whole <= _EXACT and behind <= _EXACT_POWER:
                    values[line, column], problems[line, column] = sign * (whole / powers[behind]), 0
                else:
                    value, certain = _scaled(whole, -behind, powers)
                    if certain:
                        values[line, column], problems[line, column] = sign * value, 0
    return values, problems


@numba.njit(cache=True)
def _exponent(buffer: Bytes, place: int, end: int) -> tuple[int, bool]:
    """Return the exponent that begins at a place, and whether it is one up to the end of the cell."""
    if place == end or (buffer[place] != EXPONENTS[0] and buffer[place] != EXPONENTS[1]):
        return 0, place == end
    place += 1
    sign, exponent, digits = 1, 0, 0
    if place < end and (buffer[place] == PLUS or buffer[place] == MINUS):
        sign = -1 if buffer[place] == MINUS else 1
        place += 1
    while place < end and ZERO <= buffer[place] <= NINE:
        exponent = min(10 * exponent + (buffer[place] - ZERO), _LARGEST_EXPONENT)
        digits += 1
        place += 1
    return sign * exponent, digits > 0 and place == end


@numba.njit(cache=True)
def _number(buffer: Bytes, start: int, end: int, mark: int, powers: NDArray[np.float64]) -> tuple[float, int]:
    """Return the number that a cell is, and a :class:`Problem`."""
    sign, whole, digits, behind, zeros, place = _mantissa(buffer, int(start), int(end), mark)
    exponent, is_whole = _exponent(buffer, place, end)
    if digits == 0 or not is_whole:
        return np.nan, 1
    value, certain = _scaled(whole, exponent - behind, powers)
    if digits - zeros > _MOST_DIGITS or not certain:
        return np.nan, 3
    return sign * value, 0


@numba.njit(cache=True)
def _same_text(buffer: Bytes, start: int, end: int, texts: Bytes, edges: NDArray[np.int64]) -> int:
    """Return which of some texts, joined with their edges, a cell is; -1 for none."""
    for text in range(edges.size - 1):
        if edges[text + 1] - edges[text] == end - start:
            same = True
            for letter in range(end - start):
                if buffer[start + letter] != texts[edges[text] + letter]:
                    same = False
                    break
            if same:
                return text
    return -1


@numba.njit(cache=True)
def _decide(
    buffer: Bytes,
    starts: NDArray[np.int32],
    ends: NDArray[np.int32],
    mark: int,
    powers: NDArray[np.float64],
    texts: Bytes,
    edges: NDArray[np.int64],
    values: NDArray[np.float64],
    problems: NDArray[np.int8],
) -> None:
    """Read the cells that are undecided so far: numbers with exponents, and tokens that are no numbers."""
    for line in range(starts.shape[0]):
        for column in range(starts.shape[1]):
            if problems[line, column]:
                start, end = starts[line, column], ends[line, column]
                value, problem = _number(buffer, start, end, mark, powers)
                if problem and _same_text(buffer, start, end, texts, edges) >= 0:
                    problem = 0
                values[line, column], problems[line, column] = value, problem


@numba.njit(cache=True)
def _blank(values: NDArray[np.float64], problems: NDArray[np.int8], tokens: NDArray[np.float64]) -> None:
    """Put NaN for numbers that stand for no reading, and for those that cannot be stored, which is a problem."""
    for line in range(values.shape[0]):
        for column in range(values.shape[1]):
            for token in tokens:
                if values[line, column] == token:
                    values[line, column] = np.nan
            if abs(values[line, column]) > LARGEST:
                values[line, column], problems[line, column] = np.nan, 2


@numba.njit(cache=True)
def _marks(
    buffer: Bytes,
    starts: NDArray[np.int32],
    ends: NDArray[np.int32],
    texts: Bytes,
    edges: NDArray[np.int64],
    codes: NDArray[np.int32],
) -> NDArray[np.int32]:
    found = np.empty(starts.shape, np.int32)
    for line in range(starts.shape[0]):
        for column in range(starts.shape[1]):
            place = _same_text(buffer, starts[line, column], ends[line, column], texts, edges)
            found[line, column] = codes[place] if place >= 0 else -1
    return found


# --------------------------------------------------------------------------------------------------------------
# Over cells


def _joined(texts: Sequence[str], encoding: str) -> tuple[Bytes, NDArray[np.int64]]:
    encoded = [text.encode(encoding, "surrogateescape") for text in texts]
    edges = np.concatenate([[0], np.cumsum([len(text) for text in encoded])]).astype(np.int64)
    return np.frombuffer(b"".join(encoded), np.uint8), edges


@dataclass(frozen=True)
class Numerals:
    """How numbers are written in a file.

    Attributes
    ----------
    decimal : str
        The decimal mark.
    missing : collection of str
        Tokens that stand for no reading. A cell is one of them where the texts are equal or where both are
        numbers and these are equal.
    encoding : str
        Of the cells.
    """

    decimal: str
    missing: Collection[str]
    encoding: str = "utf-8"

    @cached_property
    def _tokens(self) -> NDArray[np.float64]:
        return np.array([number for token in self.missing for number in _numeric(token.strip(), self.decimal)], float)

    @cached_property
    def _texts(self) -> tuple[Bytes, NDArray[np.int64]]:
        return _joined([token.strip() for token in self.missing], self.encoding)

    def read(
        self, buffer: Bytes, starts: NDArray[np.int32], ends: NDArray[np.int32]
    ) -> tuple[NDArray[np.float64], NDArray[np.int8]]:
        """Read numbers.

        Parameters
        ----------
        buffer : ndarray of uint8
        starts, ends : ndarray of int32, (line, column)
            Where the cells are in it, without blanks at their ends.

        Returns
        -------
        values : ndarray of float64, (line, column)
            Rounded as Python rounds; NaN where missing or wrong.
        problems : ndarray of int8, (line, column)
            :class:`Problem` of each cell.
        """
        mark = ord(self.decimal)
        values, problems = _plain_numbers(buffer, starts, ends, mark, _POWERS)
        if problems.any():
            _decide(buffer, starts, ends, mark, _POWERS, *self._texts, values, problems)
        for line, column in zip(*np.nonzero(problems == Problem.UNDECIDED), strict=True):
            text = buffer[starts[line, column] : ends[line, column]].tobytes().decode("ascii")
            values[line, column] = float(text.replace(self.decimal, "."))
        problems[problems == Problem.UNDECIDED] = Problem.NONE
        _blank(values, problems, self._tokens)
        return values, problems


def read_marks(
    buffer: Bytes,
    starts: NDArray[np.int32],
    ends: NDArray[np.int32],
    codes: Mapping[str, int],
    encoding: str,
) -> NDArray[np.int32]:
    """Return the code of each cell by its text, (line, column); -1 where there is none for it."""
    ours = np.array(list(codes.values()), np.int32)
    return _marks(buffer, starts, ends, *_joined(list(codes), encoding), ours)


def _numeric(token: str, decimal: str) -> list[float]:
    """Return the token as a number, if it is one; a layout may write it with either decimal mark."""
    plain = token.replace(decimal, ".")
    return [float(plain)] if re.fullmatch(_SYNTAX.format(mark=r"\."), plain) else []
