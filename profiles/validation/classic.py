"""How long a file of NetCDF's older formats must be.

NetCDF's library reads zeros beyond the end of such a file, so that one which was cut off looks whole. Of the newer
format, which is HDF5, the library sees the end itself.
"""

from __future__ import annotations

import math
import struct
from dataclasses import dataclass
from pathlib import Path
from typing import BinaryIO

# The formats by their first bytes: bytes of a count, and of an offset.
_WIDTHS = {b"CDF\x01": (4, 4), b"CDF\x02": (4, 8), b"CDF\x05": (8, 8)}
_BYTES = {1: 1, 2: 1, 3: 2, 4: 4, 5: 4, 6: 8, 7: 1, 8: 2, 9: 4, 10: 8, 11: 8}  # of the types by their number
_NUMBERS = {4: ">I", 8: ">Q"}


@dataclass(frozen=True)
class _Variable:
    shape: tuple[int, ...]  # 0 first for one that has records
    size: int  # bytes of a value
    begin: int

    @property
    def in_records(self) -> bool:
        return bool(self.shape) and self.shape[0] == 0

    @property
    def bytes(self) -> int:
        """Bytes of all values, or of those of one record."""
        return self.size * math.prod(self.shape[1:] if self.in_records else self.shape)


class _Header:
    """Reads a header from its first byte on."""

    def __init__(self, stream: BinaryIO, count: int, offset: int) -> None:
        self._stream = stream
        self._count = count
        self._offset = offset

    def count(self, width: int = 0) -> int:
        width = width or self._count
        return int(struct.unpack(_NUMBERS[width], self._stream.read(width))[0])

    def skip(self, length: int) -> None:
        self._stream.seek(length + -length % 4, 1)  # all is padded to four bytes

    def list_length(self) -> int:
        self.count(4)  # the tag, which says what it is a list of
        return self.count()

    def dimensions(self) -> list[int]:
        lengths = []
        for _ in range(self.list_length()):
            self.skip(self.count())
            lengths.append(self.count())
        return lengths

    def skip_attributes(self) -> None:
        for _ in range(self.list_length()):
            self.skip(self.count())
            size = _BYTES[self.count(4)]
            self.skip(size * self.count())

    def variables(self, dimensions: list[int]) -> list[_Variable]:
        found = []
        for _ in range(self.list_length()):
            self.skip(self.count())
            shape = tuple(dimensions[self.count()] for _ in range(self.count()))
            self.skip_attributes()
            size = _BYTES[self.count(4)]
            self.count()  # bytes that it takes, which are not right for large ones
            found.append(_Variable(shape, size, self.count(self._offset)))
        return found


def least_length(path: Path) -> int:
    """Return how many bytes a file needs for its last value; 0 for a file that is not of these formats.

    Raises
    ------
    ValueError
        Where the header itself is not whole.

    References
    ----------
    The NetCDF classic format specification, with its 64-bit offset and 64-bit data variants (NetCDF User's Guide,
    appendix "File Format Specifications"; from memory).
    """
    with path.open("rb") as stream:
        widths = _WIDTHS.get(stream.read(4))
        if widths is None:
            return 0
        header = _Header(stream, *widths)
        try:
            records = header.count()
            dimensions = header.dimensions()
            header.skip_attributes()
            variables = header.variables(dimensions)
        except (struct.error, KeyError, IndexError) as error:
            raise ValueError("the header is not whole") from error
    if records == 256 ** widths[0] - 1:  # written as a stream: nobody knows how many there are
        records = 0
    return max([0, *_ends(variables, records)])


def _ends(variables: list[_Variable], records: int) -> list[int]:
    """Return where the last value of each variable ends."""
    of_record = [variable.bytes for variable in variables if variable.in_records]
    # One variable alone has its records without padding between them.
    step = of_record[0] if len(of_record) == 1 else sum(length + -length % 4 for length in of_record)
    ends = []
    for variable in variables:
        if not variable.in_records:
            ends.append(variable.begin + variable.bytes)
        elif records:
            ends.append(variable.begin + (records - 1) * step + variable.bytes)
    return ends
