"""Rows on their way from a file to a chain: in memory while they are few, on disk when they are many."""

from __future__ import annotations

import weakref
from collections.abc import Iterator
from tempfile import SpooledTemporaryFile
from typing import Any

import numpy as np
from numpy.typing import NDArray

IN_MEMORY = 32 << 20  # bytes that a spool keeps in memory
CHUNK_ROWS = 65_536
MOST_PARTS = 64  # that rows are sorted into at a time; each may be an open file
_SAMPLE = 65_536  # stamps from which the spans of the parts are taken

Table = NDArray[Any]  # structured, see wide_type and long_type


def wide_type(sensors: int, *, flagged: bool) -> np.dtype[Any]:
    """Return the type of a row with a reading of each sensor at one time."""
    return np.dtype(
        [
            ("line", np.int64),
            ("time", "datetime64[ns]"),
            ("label", np.int32),
            ("piece", np.int16),
            ("values", np.float32, (sensors,)),
            ("flags", np.int8, (sensors if flagged else 0,)),
        ]
    )


def long_type() -> np.dtype[Any]:
    """Return the type of a row with one reading."""
    return np.dtype(
        [
            ("line", np.int64),
            ("time", "datetime64[ns]"),
            ("label", np.int32),
            ("depth", np.float32),
            ("value", np.float32),
            ("flag", np.int8),
        ]
    )


class Spool:
    """A growing table of rows of one type."""

    def __init__(self, row_type: np.dtype[Any], in_memory: int = IN_MEMORY) -> None:
        self.row_type = row_type
        self.count = 0
        self.is_ordered = True  # no row is earlier than the one before it
        self.is_increasing = True  # each row is later than the one before it
        self.reordered = 0  # rows that are earlier than some row before them
        self._latest: np.datetime64 | None = None
        self._file: Any = SpooledTemporaryFile(max_size=in_memory)  # noqa: SIM115
        weakref.finalize(self, self._file.close)

    def append(self, rows: Table) -> None:
        """Add rows behind the others."""
        if not len(rows):
            return
        self._note_order(rows["time"])
        self._file.seek(self.count * self.row_type.itemsize)
        self._file.write(rows.tobytes())
        self.count += len(rows)

    def _note_order(self, time: NDArray[np.datetime64]) -> None:
        stamps = time if self._latest is None else np.concatenate([[self._latest], time])
        steps = np.diff(stamps).astype(np.int64)
        self.is_increasing &= bool((steps > 0).all())
        self.is_ordered &= bool((steps >= 0).all())
        latest = np.maximum.accumulate(stamps.astype(np.int64))
        self.reordered += int((stamps.astype(np.int64) < latest).sum())
        self._latest = latest[-1].astype("datetime64[ns]")

    def rows(self, start: int, stop: int) -> Table:
        """Return some rows."""
        self._file.seek(start * self.row_type.itemsize)
        held = self._file.read(max(min(stop, self.count) - start, 0) * self.row_type.itemsize)
        return np.frombuffer(held, self.row_type)

    def chunks(self, length: int = 0) -> Iterator[Table]:
        """Yield all rows in pieces, of :data:`CHUNK_ROWS` where no length is given."""
        length = length or CHUNK_ROWS
        for start in range(0, self.count, length):
            yield self.rows(start, start + length)

    def place_of(self, time: np.datetime64, first: int = 0) -> int:
        """Return the place of the first row from ``first`` on that is not earlier than a time, in an ordered spool."""
        low, high = first, self.count
        while low < high:
            middle = (low + high) // 2
            if self.rows(middle, middle + 1)["time"][0] < time:
                low = middle + 1
            else:
                high = middle
        return low

    def by_time(self) -> Iterator[Table]:
        """Yield all rows in order of time, those of one time together and in the order of the file."""
        parts = self._parted() if self.count > CHUNK_ROWS and not self.is_ordered else []
        if self.is_ordered:
            yield from _whole_times(self.chunks())
        elif len(parts) > 1:
            while parts:
                yield from parts.pop(0).by_time()
        else:
            rows = self.rows(0, self.count)
            yield rows[np.argsort(rows["time"], kind="stable")]

    def _parted(self) -> list[Spool]:
        """Return the rows in several spools, each of a span of time; one where they cannot be told apart."""
        number = min(-(-self.count // CHUNK_ROWS), MOST_PARTS)
        step = -(-self.count // _SAMPLE)
        sample = np.sort(np.concatenate([rows["time"][::step].copy() for rows in self.chunks()]))
        edges = np.unique(sample[(np.arange(1, number) * sample.size) // number])
        parts = [Spool(self.row_type, IN_MEMORY // number) for _ in range(edges.size + 1)]
        for rows in self.chunks():
            span = np.searchsorted(edges, rows["time"], side="right")
            for place in np.unique(span):
                parts[place].append(rows[span == place])
        return [part for part in parts if part.count]


def _whole_times(chunks: Iterator[Table]) -> Iterator[Table]:
    """Cut ordered rows so that those of one time stay together."""
    held: Table | None = None
    for rows in chunks:
        joined = rows if held is None else np.concatenate([held, rows])
        last = int(np.searchsorted(joined["time"], joined["time"][-1]))
        if last:
            yield joined[:last]
        held = joined[last:]
    if held is not None:
        yield held
