"""The beginning and the end of a text file: enough of it to see how it is written."""

from __future__ import annotations

import codecs
import fnmatch
import glob
import zipfile
from collections import deque
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

from profiles.errors import DataError
from profiles.ingest.drafting.doubts import Doubt
from profiles.ingest.drafting.encodings import Bytes, marked
from profiles.ingest.source import GZIP_MAGIC, ZIP_MAGIC, check_file, internal_encoding, line_blocks, opened
from profiles.ingest.wording import listed

HEAD_LINES, TAIL_LINES = 2000, 200
LONGEST = 200_000  # characters of a line that are looked at (ours)
_WORKBOOK = "[Content_Types].xml"


@dataclass(frozen=True)
class Line:
    """A line by its number in the file, from 1, without its end."""

    number: int
    text: str


@dataclass(frozen=True)
class Sample:
    """What is looked at of a file.

    Attributes
    ----------
    path : Path
    packing : str
        ``"plain"``, ``"gzip"`` or ``"zip"``.
    encoding : str
        As a layout calls it.
    member : str
        The pattern of the file in a zip archive, ``"*"`` where it is alone.
    count : int
        Lines of the file.
    head, tail : tuple of Line
        The first and the last lines that are not blank; the tail has none of the head.
    doubts : tuple of Doubt
    """

    path: Path
    packing: str
    encoding: str
    member: str
    count: int
    head: tuple[Line, ...]
    tail: tuple[Line, ...]
    doubts: tuple[Doubt, ...] = ()

    @property
    def lines(self) -> tuple[Line, ...]:
        """Head and tail together."""
        return self.head + self.tail

    def text(self, number: int) -> str:
        """Return a line by its number, empty where it is not in the sample."""
        return next((line.text for line in self.lines if line.number == number), "")


def take_sample(path: Path) -> Sample:
    """Read a file once, keeping its beginning and its end.

    Raises
    ------
    RequestError, DataError, MachineError
        Where the file cannot be read or is no text.
    """
    head = check_file(path)
    packing = "gzip" if head.startswith(GZIP_MAGIC) else "zip" if head.startswith(ZIP_MAGIC) else "plain"
    member, doubts = _member(path) if packing == "zip" else ("*", [])
    with opened(path, member) as raw:
        encoding = marked(raw.read(4096))
    foreign = Bytes()
    first: list[tuple[int, bytes]] = []
    last: deque[tuple[int, bytes]] = deque(maxlen=TAIL_LINES)
    count = 0
    for block in line_blocks(path, encoding or "utf-8", member):
        foreign.add(block)
        lines = _split(block)
        for number, line in enumerate(lines, count + 1):
            if line.strip():
                (first if len(first) < HEAD_LINES else last).append((number, line))
        count += len(lines)
    if encoding is None:
        encoding, why = foreign.encoding()
        if why is not None:
            doubts.append(Doubt("encoding", encoding, why))
    bytes_are = internal_encoding(codecs.lookup(encoding).name)
    return Sample(
        path, packing, encoding, member, count, _decoded(first, bytes_are), _decoded(last, bytes_are), tuple(doubts)
    )


def _split(block: bytes) -> list[bytes]:
    """Cut a block at a feed, a return, or both."""
    lines = block.replace(b"\r\n", b"\n").replace(b"\r", b"\n").split(b"\n")
    return lines if lines[-1] else lines[:-1]


def _decoded(lines: Sequence[tuple[int, bytes]] | deque[tuple[int, bytes]], encoding: str) -> tuple[Line, ...]:
    return tuple(Line(number, text[:LONGEST].decode(encoding, "surrogateescape")) for number, text in lines)


def _member(path: Path) -> tuple[str, list[Doubt]]:
    """Return a pattern for the file of an archive that is most likely the delivery."""
    try:
        with zipfile.ZipFile(path) as archive:
            entries = [entry for entry in archive.infolist() if not entry.is_dir() and entry.file_size]
    except zipfile.BadZipFile as error:
        raise DataError(
            "the compressed file is damaged or locked", where=str(path), found=str(error), advice="fetch it again"
        ) from error
    names = [entry.filename for entry in entries]
    if _WORKBOOK in names:
        raise DataError(
            "is a workbook of a spreadsheet, or a document",
            where=str(path),
            expected="text",
            advice="save the sheet as text with separators and draft a layout for that",
        )
    if len(names) < 2:
        return "*", []
    chosen = max(entries, key=lambda entry: entry.file_size).filename
    patterns = [f"*{Path(chosen).suffix}", glob.escape(chosen)]
    pattern = next(each for each in patterns if sum(fnmatch.fnmatch(name, each) for name in names) == 1)
    return pattern, [Doubt("member", chosen, f"the largest of {len(names)} files in the archive: {listed(names)}")]
