"""Lines cut into cells: where each cell's text starts and ends, without blanks and quotes around it."""

from __future__ import annotations

from dataclasses import dataclass
from enum import IntEnum

import numba
import numpy as np
from numpy.typing import NDArray

Bytes = NDArray[np.uint8]
Places = NDArray[np.int64]

SPACE, TAB, RETURN, QUOTE, ASCII_LAST = 32, 9, 13, 34, 127
_CONTINUES, _CONTINUES_MASK = 0x80, 0xC0  # a byte of UTF-8 that continues a character: 10xxxxxx


class Damage(IntEnum):
    """What is wrong with a line as a whole."""

    NONE = 0
    NUL = 1
    QUOTES = 2
    ENDS_INSIDE = 3

    def describe(self) -> str:
        """Return the reason a line with this damage is quarantined."""
        return {
            Damage.NUL: "the row holds a NUL byte",
            Damage.QUOTES: "the quotes do not pair",
            Damage.ENDS_INSIDE: "the row ends before its last column does",
        }[self]


@dataclass(frozen=True)
class Cells:
    """The cells of some lines, (line, column); those of a line that has too few are empty."""

    buffer: Bytes
    starts: NDArray[np.int32]
    ends: NDArray[np.int32]
    count: NDArray[np.int32]
    damage: NDArray[np.int8]
    is_ascii: NDArray[np.bool_]

    def text(self, line: int, column: int, encoding: str) -> str:
        """Return one cell as text, bytes that are not in the encoding escaped as surrogates."""
        held = self.buffer[self.starts[line, column] : self.ends[line, column]].tobytes()
        return held.decode(encoding, "surrogateescape").replace('""', '"')


@numba.njit(cache=True)
def _is_blank(byte: int, delimiter: int) -> bool:
    return (byte == SPACE or TAB <= byte <= RETURN) and byte != delimiter


@numba.njit(cache=True)
def _trimmed(buffer: Bytes, start: int, end: int, delimiter: int) -> tuple[int, int]:
    while start < end and _is_blank(buffer[start], delimiter):
        start += 1
    while end > start and _is_blank(buffer[end - 1], delimiter):
        end -= 1
    return start, end


@numba.njit(cache=True)
def _cell_end(buffer: Bytes, start: int, end: int, delimiter: int) -> int:
    """Return where an unquoted cell ends; the delimiter 0 stands for any blank."""
    place = start
    while place < end and not (buffer[place] == delimiter or (delimiter == 0 and _is_blank(buffer[place], 0))):
        place += 1
    return place


@numba.njit(cache=True)
def _quoted_end(buffer: Bytes, start: int, end: int) -> int:
    """Return where the quote that closes a cell stands, or -1; a doubled quote is one of the text."""
    place = start
    while place < end:
        if buffer[place] == QUOTE:
            if place + 1 < end and buffer[place + 1] == QUOTE:
                place += 1
            else:
                return place
        place += 1
    return -1


@numba.njit(cache=True)
def _look_over(buffer: Bytes, start: int, end: int) -> tuple[int, bool]:
    damage, is_ascii = 0, True
    for place in range(start, end):
        if buffer[place] == 0:
            damage = 1
        if buffer[place] > ASCII_LAST:
            is_ascii = False
    return damage, is_ascii


@numba.njit(cache=True)
def _delimited(
    buffer: Bytes, starts: Places, ends: Places, delimiter: int, columns: int, one_more: bool, is_plain: bool
) -> tuple[NDArray[np.int32], NDArray[np.int32], NDArray[np.int32], NDArray[np.int8], NDArray[np.bool_]]:
    lines = starts.size
    first, last = np.zeros((lines, columns), np.int32), np.zeros((lines, columns), np.int32)
    count, damage, is_ascii = np.zeros(lines, np.int32), np.zeros(lines, np.int8), np.ones(lines, np.bool_)
    for line in range(lines):
        place, end, column = starts[line], ends[line], 0
        if not is_plain:
            damage[line], is_ascii[line] = _look_over(buffer, place, end)
        while not damage[line]:
            while place < end and _is_blank(buffer[place], delimiter):
                place += 1
            if delimiter == 0 and place == end:
                break
            if place < end and buffer[place] == QUOTE:
                inside, closing = place + 1, _quoted_end(buffer, place + 1, end)
                stop = closing + 1
                while 0 < stop < end and _is_blank(buffer[stop], delimiter):
                    stop += 1
                at_edge = stop == end or buffer[stop] == delimiter or (delimiter == 0 and stop > closing + 1)
                if closing < 0 or not at_edge:
                    damage[line] = 2
                    break
            else:
                inside = place
                closing = stop = _cell_end(buffer, place, end, delimiter)
            if column < columns:
                first[line, column], last[line, column] = _trimmed(buffer, inside, closing, 0)
            column += 1
            if delimiter != 0 and stop >= end:
                break
            place = stop + (delimiter != 0)
        if one_more and column == columns + 1 and buffer[end - 1] == delimiter:
            column = columns
        count[line] = column
    return first, last, count, damage, is_ascii


def delimited_cells(
    buffer: Bytes, starts: Places, ends: Places, delimiter: int, columns: int, one_more: bool = False
) -> Cells:
    """Cut lines at a delimiter.

    Parameters
    ----------
    buffer : ndarray of uint8
    starts, ends : ndarray of int64, (line,)
        Where the lines are in it.
    delimiter : int
        ASCII code, or 0 for any run of blanks. One inside double quotes is text.
    columns : int
        Cells wanted of each line; ``count`` says how many there were.
    one_more : bool
        Whether a line may end with one delimiter more.
    """
    is_plain = _is_plain(buffer, starts, ends)
    return Cells(buffer, *_delimited(buffer, starts, ends, delimiter, columns, one_more, is_plain))


def _is_plain(buffer: Bytes, starts: Places, ends: Places) -> bool:
    """Tell whether lines hold nothing but ASCII, and no NUL."""
    held = buffer[starts[0] : ends[-1]] if starts.size else buffer[:0]
    return bool(held.size) and bool(held.min() > 0) and bool(held.max() <= ASCII_LAST)


@numba.njit(cache=True)
def _fixed(
    buffer: Bytes, starts: Places, ends: Places, places: Places, is_utf8: bool, trimmed: bool
) -> tuple[NDArray[np.int32], NDArray[np.int32], NDArray[np.int32], NDArray[np.int8], NDArray[np.bool_]]:
    lines, columns = starts.size, places.shape[0]
    first, last = np.zeros((lines, columns), np.int32), np.zeros((lines, columns), np.int32)
    damage, is_ascii = np.zeros(lines, np.int8), np.ones(lines, np.bool_)
    furthest = places[:, 1].max()
    at = np.empty(furthest + 1, np.int64)  # where the character of each place starts
    for line in range(lines):
        damage[line], is_ascii[line] = _look_over(buffer, starts[line], ends[line])
        characters = 0
        for place in range(starts[line], ends[line]):
            if is_utf8 and (buffer[place] & _CONTINUES_MASK) == _CONTINUES:
                continue
            if characters <= furthest:
                at[characters] = place
            characters += 1
        for character in range(min(characters, furthest + 1), furthest + 1):
            at[character] = ends[line]
        if characters < furthest and not trimmed and not damage[line]:
            damage[line] = 3
        for column in range(columns):
            first[line, column], last[line, column] = _trimmed(
                buffer, at[places[column, 0] - 1], at[places[column, 1]], 0
            )
    return first, last, np.full(lines, columns, np.int32), damage, is_ascii


def fixed_cells(
    buffer: Bytes, starts: Places, ends: Places, places: Places, is_utf8: bool, trimmed: bool = False
) -> Cells:
    """Cut lines at fixed places.

    A line that ends before its last column does is damaged: what is left of a number is another number.

    Parameters
    ----------
    buffer : ndarray of uint8
    starts, ends : ndarray of int64, (line,)
        Where the lines are in it.
    places : ndarray of int64, (column, 2)
        First and last character of each column, from 1.
    is_utf8 : bool
        Whether a character may be several bytes.
    trimmed : bool
        Whether blanks at the ends of lines were cut, so that a line may end early.
    """
    return Cells(buffer, *_fixed(buffer, starts, ends, places, is_utf8, trimmed))
