"""Stamps of plain forms read from bytes; whatever is not plain is left undecided for a slower reader."""

from __future__ import annotations

from enum import IntEnum
from functools import lru_cache

import numba
import numpy as np
from numpy.typing import NDArray

from profiles.ingest.cells import Bytes

#: Stands for a stamp that is not of the plain form; also what ``datetime64`` has for NaT.
NOT_DECIDED = np.iinfo(np.int64).min
LONGEST = 40  # bytes of a plain stamp

Program = NDArray[np.int64]


class Step(IntEnum):
    """One piece of a form of stamp: a number of fixed length, a given byte, or one of the ends of ISO 8601."""

    YEAR = 0
    MONTH = 1
    DAY = 2
    HOUR = 3
    MINUTE = 4
    SECOND = 5
    FRACTION = 6  # at most nine digits, in ISO 8601 only
    DAY_OF_YEAR = 7
    BYTE = 8
    ISO_CLOCK = 9  # nothing, or [T ]HH:MM, or [T ]HH:MM:SS with or without a fraction; then Z or nothing


_DIRECTIVES = {
    "Y": (Step.YEAR, 4),
    "m": (Step.MONTH, 2),
    "d": (Step.DAY, 2),
    "H": (Step.HOUR, 2),
    "M": (Step.MINUTE, 2),
    "S": (Step.SECOND, 2),
    "j": (Step.DAY_OF_YEAR, 3),
}


@lru_cache(maxsize=32)
def _steps(time_format: str) -> tuple[tuple[int, int], ...] | None:
    if time_format == "iso8601":
        return (*_steps("%Y-%m-%d"), (Step.ISO_CLOCK, 0))  # type: ignore[misc]
    steps: list[tuple[int, int]] = []
    letters = iter(time_format)
    for letter in letters:
        if letter != "%":
            if not letter.isascii():
                return None
            steps.append((Step.BYTE, ord(letter)))
            continue
        directive = next(letters, "")
        if directive not in _DIRECTIVES:
            return None
        steps.append(_DIRECTIVES[directive])
    return tuple(steps)


def compiled(time_format: str) -> Program | None:
    """Return a strptime format or ``"iso8601"`` as steps, (step, 2); None where it is not of a plain form."""
    steps = _steps(time_format)
    return None if steps is None else np.array(steps, np.int64)


def as_matrix(texts: NDArray[np.object_]) -> tuple[Bytes, NDArray[np.int64]]:
    """Return texts as rows of bytes and their lengths; one that is too long or not ASCII has the length 0."""
    plain = [text.encode("ascii") if text.isascii() and len(text) <= LONGEST else b"" for text in texts]
    rows = np.zeros((len(plain), LONGEST), np.uint8)
    for row, text in zip(rows, plain, strict=True):
        row[: len(text)] = np.frombuffer(text, np.uint8)
    return rows, np.array([len(text) for text in plain], np.int64)


@numba.njit(cache=True)
def gathered(buffer: Bytes, starts: NDArray[np.int32], ends: NDArray[np.int32]) -> tuple[Bytes, NDArray[np.int64]]:
    """Return cells joined by one blank as rows of bytes and their lengths, 0 for one that is too long."""
    rows, lengths = np.zeros((starts.shape[0], LONGEST), np.uint8), np.zeros(starts.shape[0], np.int64)
    for row in range(starts.shape[0]):
        length = 0
        for column in range(starts.shape[1]):
            size = ends[row, column] - starts[row, column]
            if length + size + 1 > LONGEST:
                length = 0
                break
            if column:
                rows[row, length] = 32
                length += 1
            for letter in range(size):
                rows[row, length + letter] = buffer[starts[row, column] + letter]
            length += size
        lengths[row] = length
    return rows, lengths


@numba.njit(cache=True)
def _digits(row: Bytes, place: int, length: int, count: int) -> int:
    """Return a number of exactly ``count`` digits, or -1."""
    if place + count > length:
        return -1
    value = 0
    for letter in range(place, place + count):
        if not 48 <= row[letter] <= 57:
            return -1
        value = 10 * value + (row[letter] - 48)
    return value


@numba.njit(cache=True)
def _days_of_month(year: int, month: int) -> int:
    if month == 2:
        return 29 if (year % 4 == 0 and year % 100 != 0) or year % 400 == 0 else 28
    return 30 if month in (4, 6, 9, 11) else 31


@numba.njit(cache=True)
def _days_since_1970(year: int, month: int, day: int) -> int:
    """Return the day number in the Gregorian calendar: years of March to February, 400 of them have 146,097 days."""
    shifted = year - (month <= 2)
    era = shifted // 400
    of_era = shifted - 400 * era
    of_year = (153 * (month + (-3 if month > 2 else 9)) + 2) // 5 + day - 1
    return era * 146_097 + 365 * of_era + of_era // 4 - of_era // 100 + of_year - 719_468


@numba.njit(cache=True)
def _fraction(row: Bytes, place: int, length: int) -> tuple[int, int]:
    """Return nanoseconds of a fraction of at most nine digits and the place behind it, or -1."""
    value, digits = 0, 0
    while place < length and 48 <= row[place] <= 57 and digits < 9:
        value, digits, place = 10 * value + (row[place] - 48), digits + 1, place + 1
    return (value * 10 ** (9 - digits), place) if digits else (-1, place)


@numba.njit(cache=True)
def _iso_clock(row: Bytes, place: int, length: int, fields: NDArray[np.int64]) -> tuple[int, bool]:
    """Fill hour to fraction from the end of an ISO 8601 stamp; return the place behind, or -1, and whether it has Z."""
    if place == length:
        return place, False
    if row[place] != 84 and row[place] != 32:
        return -1, False
    has_seconds = False
    for step in (Step.HOUR.value, Step.MINUTE.value, Step.SECOND.value):
        if step == Step.SECOND.value and (place == length or row[place] != 58):
            break
        if step == Step.MINUTE.value and (place >= length or row[place] != 58):
            return -1, False
        fields[step] = _digits(row, place + 1, length, 2)
        has_seconds = step == Step.SECOND.value
        place += 3
    if has_seconds and place < length and row[place] == 46:
        fields[Step.FRACTION.value], place = _fraction(row, place + 1, length)
    is_utc = place < length and row[place] == 90
    return place + is_utc, is_utc


@numba.njit(cache=True)
def _nanoseconds(fields: NDArray[np.int64]) -> int:
    """Return fields as nanoseconds since 1970, or :data:`NOT_DECIDED` where they name no time."""
    year, month, day = fields[0], fields[1], fields[2]
    if not 1678 <= year < 2262 or fields[6] < 0:
        return NOT_DECIDED
    if not (0 <= fields[3] < 24 and 0 <= fields[4] < 60 and 0 <= fields[5] < 60):
        return NOT_DECIDED
    if fields[7] >= 0:
        if not 1 <= fields[7] <= 365 + (_days_of_month(year, 2) == 29):
            return NOT_DECIDED
        days = _days_since_1970(year, 1, 1) + fields[7] - 1
    else:
        if not 1 <= month <= 12 or not 1 <= day <= _days_of_month(year, month):
            return NOT_DECIDED
        days = _days_since_1970(year, month, day)
    return (((days * 24 + fields[3]) * 60 + fields[4]) * 60 + fields[5]) * 1_000_000_000 + fields[6]


@numba.njit(cache=True)
def _read(rows: Bytes, lengths: NDArray[np.int64], program: Program) -> tuple[NDArray[np.int64], NDArray[np.bool_]]:
    clock, is_utc = np.full(lengths.size, NOT_DECIDED, np.int64), np.zeros(lengths.size, np.bool_)
    fields = np.empty(8, np.int64)
    for row in range(lengths.size):
        fields[:] = 0
        fields[7] = -1
        place = 0
        for step in range(program.shape[0]):
            kind, size = program[step, 0], program[step, 1]
            if kind == Step.BYTE.value:
                place = place + 1 if place < lengths[row] and rows[row, place] == size else -1
            elif kind == Step.ISO_CLOCK.value:
                place, is_utc[row] = _iso_clock(rows[row], place, lengths[row], fields)
            else:
                fields[kind] = _digits(rows[row], place, lengths[row], size)
                place = place + size if fields[kind] >= 0 else -1
            if place < 0:
                break
        if place == lengths[row] and lengths[row]:
            clock[row] = _nanoseconds(fields)
    return clock, is_utc


def read_stamps(
    stamps: tuple[Bytes, NDArray[np.int64]], program: Program
) -> tuple[NDArray[np.int64], NDArray[np.bool_]]:
    """Read stamps.

    Parameters
    ----------
    stamps : tuple
        Rows of bytes and their lengths, as :func:`gathered` and :func:`as_matrix` return them.
    program : ndarray of int64, (step, 2)
        See :func:`compiled`.

    Returns
    -------
    clock : ndarray of int64
        Nanoseconds since 1970 as the clock showed them; :data:`NOT_DECIDED` where a stamp is not of the plain form.
    is_utc : ndarray of bool
        Which stamps say themselves that they are UTC.
    """
    return _read(*stamps, program)
