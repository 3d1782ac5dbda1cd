"""Exchanges and silences."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from profiles.drill import service
from profiles.drill.service import Deployment, Outage, delivered_values, deployments, numbers, outages, silent, visits

DAYS = np.arange(6 * 365.0)
DEPTHS = (1.0, 10.0, 40.0, 65.0, 90.0, 110.0, 130.0, 150.0, 170.0, 190.0, 210.0, 255.0, 300.0, 500.0)

#: Share of the values that a mooring should give, by cause: as the module's head states it, and how near.
STATED = {
    "line not visited": (0.05, 0.01),
    "upper sensors vandalised": (0.02, 0.005),
    "buoy lost": (0.015, 0.005),
    "sensor dead": (0.03, 0.005),
    "turn-around": (0.01, 0.003),
    "transmission": (0.03, 0.005),
}


def mooring(seed: int) -> tuple[tuple[Deployment, ...], tuple[Outage, ...]]:
    random = np.random.default_rng(seed)
    deployed = deployments(visits(DAYS[-1], random), 0, DEPTHS, random)
    return deployed, outages(deployed, random)


@settings(max_examples=50, deadline=None)
@given(days=st.floats(10.0, 20_000.0), seed=st.integers(0, 2**32 - 1), berth=st.integers(0, 4))
def test_deployments_cover_the_record_and_follow_one_another(days: float, seed: int, berth: int) -> None:
    random = np.random.default_rng(seed)
    visited = visits(days, random)
    assert visited[0] <= 0.0
    assert visited[-1] >= days
    deployed = deployments(visited, berth, DEPTHS, random)
    for deployment in deployed:
        assert deployment.start < deployment.end
        assert list(deployment.depths) == sorted(set(deployment.depths))
    for before, after in pairwise(deployed):
        assert 1.0 <= after.start - before.end <= 6.0


def test_deployments_last_about_a_year() -> None:
    lengths = [each.end - each.start for seed in range(100) for each in mooring(seed)[0]]
    assert np.median(lengths) == pytest.approx(361.0, abs=8.0)
    # One visit in fourteen does not happen: two years.
    assert np.mean(np.array(lengths) > 550.0) == pytest.approx(0.07, abs=0.03)


def test_moorings_of_a_line_share_its_visits() -> None:
    visited = visits(DAYS[-1], np.random.default_rng(1))
    ends = [
        np.array([each.end for each in deployments(visited, berth, DEPTHS, np.random.default_rng(berth))])
        for berth in range(3)
    ]
    np.testing.assert_allclose(ends[2] - ends[0], 2.0 * service.STEAMING_DAYS)


def test_depths_change_at_some_exchanges_by_one_sensor() -> None:
    pairs = [pair for seed in range(60) for pair in pairwise(mooring(seed)[0])]
    changes = [set(before.depths) ^ set(after.depths) for before, after in pairs]
    assert 0.05 < np.mean([bool(change) for change in changes]) < 0.2
    assert {len(change) for change in changes} == {0, 2}
    assert all(abs(np.subtract(*sorted(change))) in (5.0, 10.0) for change in changes if change)


def test_first_and_last_sensor_never_move() -> None:
    for seed in range(60):
        assert {(each.depths[0], each.depths[-1]) for each in mooring(seed)[0]} == {(1.0, 500.0)}


def test_chain_without_an_inner_sensor_stays_as_it_is() -> None:
    assert service.moved((1.0, 50.0), np.random.default_rng(2)) == (1.0, 50.0)


def test_each_cause_takes_its_stated_share_and_the_rest_is_delivered() -> None:
    taken = dict.fromkeys(STATED, 0)
    due = arrived = 0
    for seed in range(250):
        deployed, befallen = mooring(seed)
        depths = service.all_depths(deployed)
        hung = np.array([np.isin(depths, each.depths) for each in deployed])[numbers(DAYS, deployed)]
        due += int(hung.sum())
        for outage in befallen:
            taken[outage.cause] += int((silent(DAYS, depths, outage) & hung).sum())
        delivered = delivered_values(DAYS, depths, deployed, befallen, np.random.default_rng(seed))
        assert not (delivered & ~hung).any()
        arrived += int(delivered.sum())
    for cause, (share, near) in STATED.items():
        assert taken[cause] / due == pytest.approx(share, abs=near), cause
    assert arrived / due == pytest.approx(0.855, abs=0.015)


def test_every_cause_is_stated() -> None:
    assert {*service.CAUSES, "turn-around"} == set(STATED)


def test_nothing_is_delivered_in_an_outage() -> None:
    deployed, befallen = mooring(7)
    depths = service.all_depths(deployed)
    delivered = delivered_values(DAYS, depths, deployed, befallen, np.random.default_rng(7))
    assert befallen
    for outage in befallen:
        assert not delivered[silent(DAYS, depths, outage)].any()


def test_outage_holds_its_start_and_not_its_end() -> None:
    outage = Outage("transmission", 2.0, 4.0, (10.0, 30.0))
    expected = np.zeros((6, 3), dtype=bool)
    expected[2:4, [0, 2]] = True
    np.testing.assert_array_equal(silent(np.arange(6.0), (10.0, 20.0, 30.0), outage), expected)


def test_vandals_take_the_uppermost_sensors() -> None:
    taken = {each.depths for seed in range(80) for each in mooring(seed)[1] if each.cause == "upper sensors vandalised"}
    assert {len(depths) for depths in taken} == {2, 3, 4, 5}
    assert {depths[0] for depths in taken} == {1.0}


def test_turn_around_belongs_to_the_deployment_that_it_ends() -> None:
    deployed = (Deployment(-5.0, 3.0, (1.0,)), Deployment(5.0, 9.0, (1.0,)))
    np.testing.assert_array_equal(numbers(np.arange(8.0), deployed), [0, 0, 0, 0, 0, 1, 1, 1])
