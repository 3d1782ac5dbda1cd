"""Long records in fixed blocks of time, each with a halo of samples from its neighbours."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass


@dataclass(frozen=True)
class Block:
    """Samples ``start:stop`` of a record, read with their halo as ``first:last``."""

    start: int
    stop: int
    first: int
    last: int

    @property
    def padded(self) -> slice:
        """The block with its halo, in the record."""
        return slice(self.first, self.last)

    @property
    def inner(self) -> slice:
        """The block without its halo, in what ``padded`` read."""
        return slice(self.start - self.first, self.stop - self.first)


def padded_blocks(samples: int, length: int, halo: int = 0) -> Iterator[Block]:
    """Cut ``samples`` into blocks of ``length`` with ``halo`` samples on either side, fewer at the ends."""
    for start in range(0, samples, length):
        stop = min(start + length, samples)
        yield Block(start, stop, max(start - halo, 0), min(stop + halo, samples))
