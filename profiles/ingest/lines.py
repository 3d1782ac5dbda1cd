"""Text files line by line: plain or gzip, split into cells, in blocks."""

from __future__ import annotations

import csv
import gzip
import io
import re
import zlib
from collections.abc import Collection, Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from itertools import islice
from pathlib import Path
from typing import IO

from profiles.errors import DataError, MachineError, RequestError
from profiles.ingest.layout import WHITESPACE, TextLayout
from profiles.ingest.record import Tally
from profiles.ingest.wording import listed, nearest, printable

BLOCK_LINES = 100_000
GZIP_MAGIC = b"\x1f\x8b"
_SAMPLE = 4096  # bytes looked at to tell text from other files
_BINARY_SHARE = 0.1  # of control characters and undecodable bytes in a sample; text has next to none (ours)
_BLANK = " \t\r\n\f\v"
_QUOTE = '"'
_UNDECODED = re.compile("[\udc80-\udcff]")  # what the error handler surrogateescape leaves for such bytes
_CONTROL = re.compile("[\x00-\x08\x0e-\x1f\udc80-\udcff]")


def check_file(path: Path) -> bytes:
    """Return the first bytes of a file that is there and not empty.

    Raises
    ------
    RequestError
        Where there is no such file, or it is a folder.
    DataError
        Where it is empty.
    MachineError
        Where it may not be read.
    """
    try:
        with path.open("rb") as handle:
            head = handle.read(_SAMPLE)
    except FileNotFoundError:
        near = nearest(path.name, [entry.name for entry in path.parent.glob("*")])
        raise RequestError(
            "no such file", where=str(path), expected="a delivery", advice=f"check the path{near}"
        ) from None
    except IsADirectoryError:
        raise RequestError("is a folder", where=str(path), expected="a file", advice="name the file in it") from None
    except OSError as error:
        raise MachineError(
            "cannot be read", where=str(path), found=error.strerror, advice="check its permissions"
        ) from error
    if not head:
        raise DataError(
            "the file is empty",
            where=str(path),
            expected="a delivery",
            found="0 bytes",
            advice="fetch it again",
        )
    return head


@contextmanager
def open_text(path: Path, encoding: str) -> Iterator[IO[str]]:
    """Open a text file, plain or gzip; what cannot be read on the way is reported as an error of the file."""
    opener = gzip.open if check_file(path).startswith(GZIP_MAGIC) else open
    try:
        with opener(path, "rb") as raw, io.TextIOWrapper(raw, encoding, errors="surrogateescape") as text:
            yield text
    except (EOFError, gzip.BadGzipFile, zlib.error) as error:
        raise DataError(
            "the compressed file is damaged", where=str(path), found=str(error), advice="fetch it again"
        ) from error
    except UnicodeError as error:
        raise DataError(
            "the file is not in the layout's encoding", where=str(path), expected=encoding, found=str(error)
        ) from error


def check_text(path: Path, encoding: str) -> None:
    """Raise DataError where a file is no text."""
    with open_text(path, encoding) as text:
        sample = text.read(_SAMPLE)
    if not sample:
        raise DataError("the file is empty", where=str(path), expected="text", found="nothing once unpacked")
    if len(_CONTROL.findall(sample)) > _BINARY_SHARE * len(sample):
        raise DataError(
            "is a binary file",
            where=str(path),
            expected="delimited text, as the layout says",
            found=f"it begins with {check_file(path)[:8]!r}",
            advice='give the layout that fits it, for NetCDF one of kind = "netcdf"',
        )


def numbered_lines(text: IO[str], comment: str) -> Iterator[tuple[int, str]]:
    """Yield lines with their number in the file, from 1, without blank and comment lines."""
    for number, line in enumerate(text, start=1):
        content = line.strip(_BLANK)
        if content and not (comment and content.startswith(comment)):
            yield number, line.rstrip("\n")


def split(line: str, delimiter: str) -> list[str] | None:
    """Return the cells of a line without blanks at their ends; None where its quotes do not pair."""
    if delimiter == WHITESPACE:
        return line.split()
    if _QUOTE not in line:
        return [cell.strip() for cell in line.split(delimiter)]
    try:
        return [cell.strip() for cell in next(csv.reader([line], delimiter=delimiter, strict=True))]
    except csv.Error:
        return None


@dataclass(frozen=True)
class Block:
    """Rows with the right number of cells: their line numbers, cells and texts."""

    lines: list[int]
    cells: list[list[str]]
    texts: list[str]


@dataclass(frozen=True)
class Table:
    """A text file past its header: the column names, and the rows still to be read."""

    where: str
    names: list[str]
    rows: Iterator[tuple[int, str]]
    layout: TextLayout

    def column(self, name: str, role: str) -> int:
        """Return the place of a column; raise DataError where it is missing or its name appears twice."""
        count = self.names.count(name)
        if count == 1:
            return self.names.index(name)
        raise DataError(
            f"the {role} column is missing" if count == 0 else f"there are {count} columns of this name",
            where=self.where,
            expected=f"a column {name!r}",
            found=listed(self.names),
            advice=f"give the column's name in the layout{nearest(name, self.names) if count == 0 else ''}",
        )

    def blocks(self, tally: Tally) -> Iterator[Block]:
        """Yield rows in blocks, counting each; those without a cell for every name are rejected."""
        while taken := list(islice(self.rows, BLOCK_LINES)):
            tally.rows_read += len(taken)
            yield self._split(taken, tally)

    def _split(self, taken: list[tuple[int, str]], tally: Tally) -> Block:
        block = Block([], [], [])
        for line, text in taken:
            cells = split(text, self.layout.delimiter)
            reason = self._problem(text, cells)
            if cells is not None and reason is None:
                block.lines.append(line)
                block.cells.append(cells)
                block.texts.append(text)
            else:
                tally.reject([line], [reason or "the quotes do not pair"], [text])
        return block

    def _problem(self, text: str, cells: list[str] | None) -> str | None:
        if "\x00" in text:
            return "the row holds a NUL byte"
        if not text.isascii() and _UNDECODED.search(text):
            return f"the row holds bytes that are not {self.layout.encoding}"
        if cells is not None and len(cells) != len(self.names):
            return f"{len(cells)} cells where there are {len(self.names)} columns"
        return None


@contextmanager
def open_table(path: Path, layout: TextLayout) -> Iterator[Table]:
    """Open a delimited text file and read its header.

    Raises
    ------
    RequestError, DataError, MachineError
        Where the file cannot be read, is no text, or ends before its header does.
    """
    check_text(path, layout.encoding)
    with open_text(path, layout.encoding) as text:
        rows = numbered_lines(text, layout.comment)
        header = [line for _, line in islice(rows, layout.header_rows)]
        if len(header) < layout.header_rows:
            raise DataError(
                "the file ends before its header does",
                where=str(path),
                expected=f"{layout.header_rows} header rows",
                found=str(len(header)),
                advice="check header_rows and comment in the layout",
            )
        names = list(layout.names) or split(header[layout.names_row - 1], layout.delimiter) or []
        yield Table(str(path), names, rows, layout)


def texts_of(path: Path, layout: TextLayout, lines: Collection[int]) -> dict[int, str]:
    """Return some lines by number, fit to print, reading the file once more."""
    wanted = set(lines)
    with open_text(path, layout.encoding) as text:
        return {number: printable(line.rstrip("\n")) for number, line in enumerate(text, start=1) if number in wanted}
