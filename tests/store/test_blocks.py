"""Blocks cover a record once, each with its halo."""

from __future__ import annotations

import numpy as np
from hypothesis import given
from hypothesis import strategies as st

from profiles.store import Block, padded_blocks

SIZES = {"samples": st.integers(0, 200), "length": st.integers(1, 60), "halo": st.integers(0, 80)}


def test_ten_samples_in_blocks_of_four_with_a_halo_of_one() -> None:
    assert list(padded_blocks(10, 4, 1)) == [Block(0, 4, 0, 5), Block(4, 8, 3, 9), Block(8, 10, 7, 10)]


def test_no_samples_make_no_block() -> None:
    assert list(padded_blocks(0, 4, 1)) == []


@given(**SIZES)
def test_blocks_cover_every_sample_once_and_in_order(samples: int, length: int, halo: int) -> None:
    covered = [place for block in padded_blocks(samples, length, halo) for place in range(block.start, block.stop)]
    assert covered == list(range(samples))


@given(**SIZES)
def test_the_inner_part_of_what_was_read_is_the_block(samples: int, length: int, halo: int) -> None:
    record = np.arange(samples)
    for block in padded_blocks(samples, length, halo):
        assert record[block.padded][block.inner].tolist() == list(range(block.start, block.stop))


@given(**SIZES)
def test_a_halo_is_whole_unless_the_record_ends(samples: int, length: int, halo: int) -> None:
    for block in padded_blocks(samples, length, halo):
        assert block.first == 0 or block.start - block.first == halo
        assert block.last == samples or block.last - block.stop == halo
        assert block.first >= 0
        assert block.last <= samples


@given(samples=st.integers(1, 200), length=st.integers(1, 60), halo=st.integers(1, 9))
def test_a_moving_mean_by_blocks_is_the_one_of_the_whole(samples: int, length: int, halo: int) -> None:
    # What the halo is for: a window of 2 halo + 1 samples gives the same wherever the record was cut.
    record = np.sin(np.arange(samples))

    def moving_mean(values: np.ndarray) -> np.ndarray:
        return np.array([values[max(place - halo, 0) : place + halo + 1].mean() for place in range(values.size)])

    parts = [moving_mean(record[block.padded])[block.inner] for block in padded_blocks(samples, length, halo)]
    np.testing.assert_array_equal(np.concatenate(parts), moving_mean(record))
