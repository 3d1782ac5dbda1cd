"""Text files line by line: numbered from 1, without blank and comment lines, cut into cells."""

from __future__ import annotations

from collections.abc import Collection, Iterator
from dataclasses import dataclass
from pathlib import Path

import numba
import numpy as np
from numpy.typing import NDArray

from profiles.errors import DataError
from profiles.ingest.cells import Cells, delimited_cells, fixed_cells
from profiles.ingest.layout import WHITESPACE, TextLayout
from profiles.ingest.source import internal_encoding, line_blocks
from profiles.ingest.wording import printable

Bytes = NDArray[np.uint8]
Places = NDArray[np.int64]
Mask = NDArray[np.bool_]

FEED, RETURN, SPACE, TAB, FORM_FEED = 10, 13, 32, 9, 12


# --------------------------------------------------------------------------------------------------------------
# Kernels


def find_lines(buffer: Bytes) -> tuple[Places, Places]:
    """Return where lines start and end; a feed, a return, or both in this order end a line."""
    is_feed = buffer == FEED
    is_return = buffer == RETURN
    if is_return.any():
        is_return[:-1] &= ~is_feed[1:]  # of both, the feed
        ends = np.flatnonzero(is_feed | is_return)
    else:
        ends = np.flatnonzero(is_feed)
    starts = np.concatenate([[0], ends + 1])
    if starts[-1] == buffer.size:
        starts = starts[:-1]
    else:
        ends = np.append(ends, buffer.size)
    # The return of both is no part of the line either.
    behind = ends[ends < buffer.size]
    is_both = (buffer[behind] == FEED) & (behind > 0)
    is_both &= buffer[np.maximum(behind - 1, 0)] == RETURN
    ends[: behind.size] -= is_both
    return starts, ends


@numba.njit(cache=True)
def begin_with(buffer: Bytes, starts: Places, ends: Places, text: Bytes) -> Mask:
    """Tell which lines begin with a text, after blanks; with an empty text, which are blank."""
    found = np.zeros(starts.size, np.bool_)
    for line in range(starts.size):
        place = starts[line]
        while place < ends[line] and (buffer[place] == SPACE or TAB <= buffer[place] <= RETURN):
            place += 1
        if text.size == 0:
            found[line] = place == ends[line]
        elif place + text.size <= ends[line]:
            found[line] = True
            for letter in range(text.size):
                if buffer[place + letter] != text[letter]:
                    found[line] = False
                    break
    return found


# --------------------------------------------------------------------------------------------------------------
# Lines


@dataclass(frozen=True)
class Lines:
    """Some lines of a file: the bytes, where each starts and ends in them, and its number in the file."""

    buffer: Bytes
    starts: Places
    ends: Places
    number: Places
    encoding: str

    def where(self, chosen: Mask | Places | slice) -> Lines:
        """Return some of the lines, by mask or by place."""
        return Lines(self.buffer, self.starts[chosen], self.ends[chosen], self.number[chosen], self.encoding)

    def __len__(self) -> int:
        return self.number.size

    def behind(self, earlier: Lines) -> Lines:
        """Return these lines behind those that stand before them in the file."""
        shift = earlier.buffer.size
        return Lines(
            np.concatenate([earlier.buffer, self.buffer]),
            np.concatenate([earlier.starts, self.starts + shift]),
            np.concatenate([earlier.ends, self.ends + shift]),
            np.concatenate([earlier.number, self.number]),
            self.encoding,
        )

    def cut_loose(self) -> Lines:
        """Return the lines without the bytes before them, for keeping."""
        first = int(self.starts[0]) if len(self) else self.buffer.size
        return Lines(self.buffer[first:].copy(), self.starts - first, self.ends - first, self.number, self.encoding)

    def begin_with(self, text: str) -> Mask:
        """Tell which lines begin with a text, after blanks."""
        return begin_with(self.buffer, self.starts, self.ends, as_bytes(text, self.encoding))

    def texts(self) -> list[str]:
        """Return the lines as text, bytes that are not in the encoding escaped as surrogates."""
        return [
            self.buffer[start:end].tobytes().decode(self.encoding, "surrogateescape")
            for start, end in zip(self.starts, self.ends, strict=True)
        ]

    def cells(self, layout: TextLayout, columns: int) -> Cells:
        """Cut the lines into ``columns`` cells each, as the layout says."""
        if layout.fixed:
            places = np.array(list(layout.fixed.values()), np.int64).reshape(-1, 2)
            return fixed_cells(self.buffer, self.starts, self.ends, places, self.encoding == "utf-8", layout.trimmed)
        delimiter = 0 if layout.delimiter == WHITESPACE else ord(layout.delimiter)
        return delimited_cells(self.buffer, self.starts, self.ends, delimiter, columns, layout.ends_with_delimiter)


def as_bytes(text: str, encoding: str) -> Bytes:
    """Return a text as the bytes that it has in a file."""
    return np.frombuffer(text.encode(encoding, "surrogateescape"), np.uint8)


def data_lines(path: Path, layout: TextLayout) -> Iterator[Lines]:
    """Yield the lines of a file that are neither blank nor comment, in blocks, the header among them.

    Raises
    ------
    RequestError, DataError, MachineError
        Where the file cannot be read or is no text.
    """
    encoding = internal_encoding(layout.encoding)
    passed = 0
    for block in line_blocks(path, layout.encoding, layout.member):
        buffer = np.frombuffer(block, np.uint8)
        starts, ends = find_lines(buffer)
        lines = Lines(buffer, starts, ends, np.arange(passed + 1, passed + starts.size + 1), encoding)
        passed += starts.size
        skipped = lines.begin_with("")
        if layout.comment:
            skipped |= lines.begin_with(layout.comment)
        yield lines.where(~skipped)


def past_header(path: Path, layout: TextLayout) -> tuple[list[str], Iterator[Lines]]:
    """Return the header rows of a file, and the lines behind them in blocks.

    Raises
    ------
    DataError
        Where the file ends before its header does; also what :func:`data_lines` raises.
    """
    blocks = data_lines(path, layout)
    header: list[str] = []
    rest: list[Lines] = []
    for lines in blocks:
        wanted = layout.header_rows - len(header)
        header += lines.where(slice(None, wanted)).texts()
        rest = [lines.where(slice(wanted, None))]
        if len(header) == layout.header_rows:
            break
    if len(header) < layout.header_rows:
        raise DataError(
            "the file ends before its header does",
            where=str(path),
            expected=f"{layout.header_rows} header rows",
            found=str(len(header)),
            advice="check header_rows and comment in the layout",
        )
    return header, _chained(rest, blocks)


def _chained(first: list[Lines], rest: Iterator[Lines]) -> Iterator[Lines]:
    yield from first
    yield from rest


def texts_of(path: Path, layout: TextLayout, numbers: Collection[int]) -> dict[int, str]:
    """Return some lines by number, fit to print, reading the file once more."""
    wanted = np.array(sorted(numbers), np.int64)
    found: dict[int, str] = {}
    for lines in data_lines(path, layout):
        chosen = lines.where(np.isin(lines.number, wanted))
        texts = map(printable, chosen.texts())
        found |= dict(zip(chosen.number.tolist(), texts, strict=True))
    return found
