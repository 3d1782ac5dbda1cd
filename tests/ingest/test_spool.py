"""Rows in memory or on disk, and in order."""

from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from profiles.ingest import spool
from profiles.ingest.spool import Spool, long_type, wide_type


def rows_at(seconds, first_line=0):
    """Return rows with a number each, which is also the line."""
    rows = np.zeros(len(seconds), long_type())
    rows["time"] = np.array(seconds, "M8[s]")
    rows["line"] = first_line + np.arange(len(seconds))
    return rows


def filled(seconds, pieces=3, **options):
    held = Spool(long_type(), **options)
    edges = np.linspace(0, len(seconds), pieces + 1).astype(int)
    for start, stop in pairwise(edges):
        held.append(rows_at(seconds[start:stop], start))
    return held


def together(parts):
    return np.concatenate(list(parts))


@pytest.fixture
def small(monkeypatch):
    """Pieces so small that few rows are sorted through files."""
    monkeypatch.setattr(spool, "CHUNK_ROWS", 7)
    monkeypatch.setattr(spool, "MOST_PARTS", 3)
    monkeypatch.setattr(spool, "_SAMPLE", 5)
    monkeypatch.setattr(spool, "IN_MEMORY", 64)


@pytest.mark.parametrize("in_memory", [1, 1 << 20])
def test_rows_come_back_in_pieces_from_memory_and_disk(in_memory):
    held = filled(range(100), in_memory=in_memory)
    assert held.count == 100
    np.testing.assert_array_equal(together(held.chunks(30))["line"], np.arange(100))
    assert [len(rows) for rows in held.chunks(30)] == [30, 30, 30, 10]
    np.testing.assert_array_equal(held.rows(98, 200)["line"], [98, 99])
    assert len(held.rows(100, 101)) == 0
    held.append(rows_at([200], 100))  # reading does not move where writing goes on
    np.testing.assert_array_equal(held.rows(99, 101)["line"], [99, 100])


@pytest.mark.parametrize(
    ("seconds", "ordered", "increasing", "reordered"),
    [
        ([1, 2, 3], True, True, 0),
        ([1, 1, 2], True, False, 0),
        ([3, 1, 2, 4, 4, 0], False, False, 3),
        ([5], True, True, 0),
    ],
)
@pytest.mark.parametrize("pieces", [1, 3])
def test_order_is_noted_over_pieces(seconds, ordered, increasing, reordered, pieces):
    held = filled(seconds, pieces)
    assert (held.is_ordered, held.is_increasing, held.reordered) == (ordered, increasing, reordered)


def test_a_time_is_found_by_halving():
    held = filled([10, 20, 20, 30])
    places = [held.place_of(np.datetime64(second, "s")) for second in (5, 10, 15, 20, 30, 31)]
    assert places == [0, 0, 1, 1, 3, 4]
    assert held.place_of(np.datetime64(5, "s"), first=2) == 2


@settings(deadline=None, max_examples=200)
@given(st.lists(st.integers(0, 40), min_size=1, max_size=120))
def test_rows_are_sorted_with_those_of_one_time_together_in_file_order(seconds):
    with pytest.MonkeyPatch.context() as patch:
        for name, value in (("CHUNK_ROWS", 7), ("MOST_PARTS", 3), ("_SAMPLE", 5), ("IN_MEMORY", 64)):
            patch.setattr(spool, name, value)
        parts = list(filled(seconds, 4).by_time())
    order = np.argsort(np.array(seconds), kind="stable")
    np.testing.assert_array_equal(together(parts)["line"], order)
    ends = [(part["time"][0], part["time"][-1]) for part in parts]
    assert all(earlier[1] < later[0] for earlier, later in pairwise(ends))


def test_rows_of_one_time_stay_in_file_order_when_sorted_in_memory():
    seconds = np.random.default_rng(1).integers(0, 9, 5_000)
    np.testing.assert_array_equal(together(filled(seconds).by_time())["line"], np.argsort(seconds, kind="stable"))


def test_sorting_needs_few_files_and_little_memory_at_a_time(small):
    seconds = np.random.default_rng(1).permutation(2_000)
    held = filled(seconds, 40)
    parts = list(held.by_time())
    np.testing.assert_array_equal(together(parts)["time"].astype(int), np.arange(2_000) * 10**9)
    # a sample of five tells the spans roughly: pieces stay near the wanted seven rows
    assert max(len(part) for part in parts) <= 2 * 7
    assert len(held._parted()) <= 3


def test_one_time_that_fills_a_file_is_kept_together(small):
    seconds = [5] * 50 + [1] + [5] * 50
    parts = list(filled(seconds).by_time())
    assert [len(part) for part in parts] in ([1, 100], [101])
    np.testing.assert_array_equal(together(parts)["line"], [50, *range(50), *range(51, 101)])


def test_types_have_a_value_and_a_flag_per_sensor():
    assert wide_type(3, flagged=True)["flags"].shape == wide_type(3, flagged=False)["values"].shape == (3,)
    assert wide_type(3, flagged=False)["flags"].shape == (0,)
