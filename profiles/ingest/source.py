"""The bytes of a text file: plain, gzip or zip, in blocks of whole lines, in an encoding that keeps ASCII as it is."""

from __future__ import annotations

import codecs
import fnmatch
import gzip
import lzma
import re
import struct
import zipfile
import zlib
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import IO, cast

from profiles.errors import DataError, MachineError, RequestError
from profiles.ingest.wording import listed, nearest

BLOCK_BYTES = 1 << 20  # what is made of so much fits into the caches of a processor (measured)
LONGEST_LINE = 64 << 20  # bytes; more than any row of a delivery (ours)
GZIP_MAGIC = b"\x1f\x8b"
ZIP_MAGIC = b"PK\x03\x04"
_SAMPLE = 4096  # bytes looked at to tell text from other files
_BINARY_SHARE = 0.1  # of control characters in a sample; text has next to none (ours)
_CONTROL = re.compile(rb"[\x00-\x08\x0e-\x1f]")
_DAMAGE = (EOFError, zlib.error, lzma.LZMAError, struct.error, zipfile.BadZipFile, NotImplementedError)
_BYTE_ORDER_MARK = codecs.BOM_UTF8
# Families of codecs with one byte a character, of which the first 128 are ASCII; utf-8 is as good.
_KEEPS_ASCII = re.compile(r"utf-8(-sig)?|ascii|iso8859-\d+|cp(125\d|437|7\d\d|8[0-7]\d)|koi8\S*|mac-(roman|latin2)")


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


def internal_encoding(encoding: str) -> str:
    """Return the encoding of the blocks: the file's own where that keeps ASCII as it is, else UTF-8."""
    return encoding.removesuffix("-sig") if _KEEPS_ASCII.fullmatch(encoding) else "utf-8"


def line_blocks(path: Path, encoding: str, member: str = "*") -> Iterator[bytes]:
    """Yield a text file in blocks of whole lines, without its byte order mark.

    Parameters
    ----------
    path : Path
    encoding : str
        Of the file; that of the blocks is :func:`internal_encoding`.
    member : str
        Which file of a zip archive, as a pattern; one must fit.

    Raises
    ------
    RequestError, DataError, MachineError
        Where the file cannot be read, is no text or is not in the layout's encoding.
    """
    with opened(path, member) as raw:
        text = _transcoded(raw, path, encoding)
        first = next((chunk for chunk in text if chunk), b"")
        _check_text(first, path)
        yield from _whole_lines(first.removeprefix(_BYTE_ORDER_MARK), text, path)


# --------------------------------------------------------------------------------------------------------------
# Unpacked


@contextmanager
def opened(path: Path, member: str = "*") -> Iterator[IO[bytes]]:
    """Open a file, plain or packed as its first bytes say; damage found on the way is an error of the file."""
    head = check_file(path)
    try:
        if head.startswith(ZIP_MAGIC):
            with zipfile.ZipFile(path) as archive, archive.open(_member(archive, path, member)) as raw:
                yield raw
        else:
            with open_binary(path, head) as raw:
                yield raw
    except _DAMAGE as error:
        raise _damaged(path, error) from error
    except OSError as error:
        if error.errno is None or head.startswith(
            ZIP_MAGIC
        ):  # gzip and bzip2 say so of data, zip of wrong places in it
            raise _damaged(path, error) from error
        raise MachineError("cannot be read", where=str(path), found=error.strerror) from error
    except RuntimeError as error:
        if "password" not in str(error) and "encrypt" not in str(error):
            raise
        raise _damaged(path, error) from error


def _damaged(path: Path, error: Exception) -> DataError:
    return DataError(
        "the compressed file is damaged or locked", where=str(path), found=str(error), advice="fetch it again"
    )


def open_binary(path: Path, head: bytes) -> IO[bytes]:
    """Open a plain or gzip file, which its first bytes tell."""
    if head.startswith(GZIP_MAGIC):
        return cast(IO[bytes], gzip.open(path, "rb"))
    return path.open("rb")


def _member(archive: zipfile.ZipFile, path: Path, pattern: str) -> zipfile.ZipInfo:
    files = [entry for entry in archive.infolist() if not entry.is_dir()]
    fitting = [entry for entry in files if fnmatch.fnmatch(entry.filename, pattern)]
    if len(fitting) == 1:
        return fitting[0]
    raise DataError(
        "it cannot be told which file of the archive is the delivery",
        where=str(path),
        expected=f"one file that fits {pattern!r}",
        found=listed(entry.filename for entry in (fitting or files)) or "an empty archive",
        advice='name it in the layout, member = "..."',
    )


# --------------------------------------------------------------------------------------------------------------
# Text


def _transcoded(raw: IO[bytes], path: Path, encoding: str) -> Iterator[bytes]:
    if _KEEPS_ASCII.fullmatch(encoding):
        while chunk := raw.read(BLOCK_BYTES):
            yield chunk
        return
    decoder = codecs.getincrementaldecoder(encoding)("surrogateescape")
    try:
        while chunk := raw.read(BLOCK_BYTES):
            yield decoder.decode(chunk).encode("utf-8", "surrogateescape")
        yield decoder.decode(b"", final=True).encode("utf-8", "surrogateescape")
    except UnicodeError as error:
        raise DataError(
            "the file is not in the layout's encoding", where=str(path), expected=encoding, found=str(error)
        ) from error


def _check_text(first: bytes, path: Path) -> None:
    sample = first[:_SAMPLE]
    if not sample:
        raise DataError("the file is empty", where=str(path), expected="text", found="nothing once unpacked")
    if len(_CONTROL.findall(sample)) > _BINARY_SHARE * len(sample):
        raise DataError(
            "is a binary file",
            where=str(path),
            expected="text, as the layout says",
            found=f"it begins with {sample[:8]!r}",
            advice='give the layout that fits it, for NetCDF one of kind = "netcdf"; '
            "where it is text in UTF-16, say so with encoding",
        )


def _whole_lines(first: bytes, rest: Iterator[bytes], path: Path) -> Iterator[bytes]:
    """Cut chunks at ends of line: a feed, a return, or both; a return at the end of a chunk may miss its feed."""
    held = first
    for chunk in rest:
        end = max(held.rfind(b"\n"), held.rfind(b"\r", 0, -1)) + 1
        if end:
            yield held[:end]
        elif len(held) > LONGEST_LINE:
            raise DataError(
                "a line is longer than any row",
                where=str(path),
                expected=f"at most {LONGEST_LINE >> 20} MiB",
                advice="check that this is the right file",
            )
        held = held[end:] + chunk
    if held:
        yield held
