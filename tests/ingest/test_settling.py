"""Repeats told apart, in files longer than what is sorted at a time."""

import numpy as np
import pytest

from profiles.ingest import join, joining, read, spool
from profiles.ingest.layout import LongLayout, WideLayout

WIDE = WideLayout.model_validate(
    {"kind": "wide", "time": {"column": "t"}, "depth": {"pattern": "T{depth}"}, "missing": ["NA"]}
)
LONG = LongLayout.model_validate(
    {"kind": "long", "time": {"column": "t"}, "depth": {"column": "z"}, "temperature": {"column": "v"}, "station": "s"}
)


@pytest.fixture
def small(monkeypatch):
    """Pieces so small that short files take every way that long ones take."""
    for module in (spool, joining):
        monkeypatch.setattr(module, "CHUNK_ROWS", 5)
    monkeypatch.setattr(spool, "IN_MEMORY", 100)
    monkeypatch.setattr(spool, "MOST_PARTS", 3)


def stamp(step):
    return str(np.datetime64("2031-01-01T00:00") + np.timedelta64(int(step), "h"))


def disorder(count, seed=1):
    """Return steps in no order, some of them twice."""
    random = np.random.default_rng(seed)
    return random.permutation(np.concatenate([np.arange(count), random.integers(0, count, count // 4)]))


def first_places(keys):
    """Return the place of the first of each key, by key."""
    found = {}
    for place, key in enumerate(keys):
        found.setdefault(key, place)
    return found


def test_a_disordered_wide_file_keeps_the_first_of_each_time(small, write):
    steps = disorder(80).tolist()
    content = "t,T1,T25\n" + "".join(f"{stamp(step)},{place},NA\n" for place, step in enumerate(steps))
    delivery = read(write(content), WIDE)
    first = first_places(steps)
    np.testing.assert_array_equal(delivery.chain["temperature"][:, 0], [first[step] for step in range(80)])
    lost = {place + 2: f"the time is that of line {first[step] + 2}"
            for place, step in enumerate(steps) if first[step] != place}  # fmt: skip
    assert dict(zip(delivery.quarantine["line"], delivery.quarantine["reason"], strict=True)) == lost
    assert delivery.rows_read == len(steps) == delivery.rows_kept + len(lost)


def test_a_disordered_long_file_keeps_the_first_of_each_time_and_depth(small, write):
    random = np.random.default_rng(2)
    keys = [(int(step), int(depth)) for step, depth in zip(disorder(60), random.choice([1, 10, 25], 75), strict=True)]
    content = "t,z,v,s\n" + "".join(f"{stamp(t)},{z},{place},A\n" for place, (t, z) in enumerate(keys))
    delivery = read(write(content), LONG)
    found = delivery.chain["temperature"].to_series().dropna()
    first = {(np.datetime64(stamp(t), "ns"), float(z)): place for (t, z), place in first_places(keys).items()}
    assert {(np.datetime64(time), depth): int(value) for (time, depth), value in found.items()} == first
    assert delivery.rows_kept == len(first)


def test_rows_of_the_lesser_station_go_to_quarantine(small, write):
    rows = [f"{stamp(place)},1,{place},{'B' if place in (0, 7) else 'A'}\n" for place in range(20)]
    delivery = read(write("t,z,v,s\n" + "".join(rows)), LONG)
    assert delivery.quarantine["line"].tolist() == [2, 9]
    assert set(delivery.quarantine["reason"]) == {"the station is not 'A', of which this file has most rows"}
    assert delivery.mooring == "A"
    np.testing.assert_array_equal(delivery.chain["temperature"][:, 0], [*range(1, 7), *range(8, 20)])


def test_depths_of_the_lesser_station_leave_no_column(write):
    rows = [f"{stamp(0)},1,29,A\n", f"{stamp(1)},1,28,A\n", f"{stamp(0)},300,9,B\n"]
    assert read(write("t,z,v,s\n" + "".join(rows)), LONG).chain["depth"].values.tolist() == [1]


def test_where_stations_have_as_many_rows_the_first_in_the_file_is_kept(write):
    rows = [f"{stamp(0)},1,29,B\n", f"{stamp(1)},1,28,A\n"]
    assert read(write("t,z,v,s\n" + "".join(rows)), LONG).mooring == "B"


@pytest.mark.parametrize("sizes", [(23, 31), (4, 31), (30, 6)])
def test_deliveries_join_over_the_edges_of_windows(small, write, sizes):
    steps = [np.sort(np.random.default_rng(seed).choice(60, size, replace=False)) for seed, size in enumerate(sizes)]
    parts = [
        read(write("t,T1\n" + "".join(f"{stamp(s)},{100 * n + s}\n" for s in chosen), f"{n}.csv"), WIDE, mooring="M")
        for n, chosen in enumerate(steps)
    ]
    joined = join(parts)
    expected = {int(step): 100 + int(step) for step in steps[1]} | {int(step): int(step) for step in steps[0]}
    np.testing.assert_array_equal(joined.chain["temperature"][:, 0], [expected[step] for step in sorted(expected)])
    both = np.intersect1d(*steps)
    assert joined.rows_quarantined == both.size > 0
    assert joined.quarantine["text"].tolist() == [f"{stamp(step)},{100 + step}" for step in both]
    assert joined.rows_read == joined.rows_kept + joined.rows_quarantined


def test_blocks_of_a_chain_are_the_chain_whatever_their_length(small, write):
    delivery = read(write("t,T1\n" + "".join(f"{stamp(step)},{step}\n" for step in disorder(40))), WIDE)
    for length in (1, 7, 1000):
        parts = [block["temperature"].values for block in delivery.blocks(length)]
        np.testing.assert_array_equal(np.concatenate(parts), delivery.chain["temperature"])
