"""What faults do to numbers, worked by hand."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays

from profiles.drill import fault_kernels as kernels

DAILY = np.arange(5.0)
VALUES = np.array([20.0, 21.0, 22.0, 23.0, 24.0])
DEPTHS = np.array([0.0, 100.0, 200.0])
PROFILE = np.array([[28.0, 20.0, 12.0], [27.0, np.nan, 11.0]])
STAMPS = np.datetime64("2031-01-01T12:00", "ns") + np.arange(5) * np.timedelta64(1, "D")


def random() -> np.random.Generator:
    return np.random.default_rng(1)


def test_added_adds() -> None:
    np.testing.assert_array_equal(kernels.added(VALUES, DAILY, -1.5), VALUES - 1.5)


def test_stuck_repeats_the_first() -> None:
    np.testing.assert_array_equal(kernels.stuck(VALUES, DAILY, 0.0), 20.0)


def test_filled_is_the_size() -> None:
    np.testing.assert_array_equal(kernels.filled(VALUES, DAILY, 1e35), 1e35)


def test_flooded_keeps_one_part_in_e_of_its_distance_after_four_days() -> None:
    assert kernels.FLOODING_DAYS == 4.0
    kept = (kernels.flooded(VALUES, DAILY, 45.0) - 45.0) / (VALUES - 45.0)
    assert kept[3] == pytest.approx(np.exp(-1.0))


def test_drifted_ends_with_its_size() -> None:
    # Five days: a fifth more each day.
    np.testing.assert_allclose(kernels.drifted(VALUES, DAILY, 2.0) - VALUES, [0.4, 0.8, 1.2, 1.6, 2.0])


def test_fouled_starts_from_nothing_and_never_passes_its_size() -> None:
    since = np.array([0.0, 90.0, 3000.0])
    grown = kernels.fouled(np.zeros(3), since, 0.05)
    # 1 - 1/e after one e-folding time of 90 days.
    np.testing.assert_allclose(grown, [0.0, 0.05 * (1.0 - np.exp(-1.0)), 0.05], atol=1e-12)


def test_rolled_over_lacks_its_size_above_the_median() -> None:
    np.testing.assert_allclose(kernels.rolled_over(VALUES, DAILY, 8.192), [20.0, 21.0, 22.0, 14.808, 15.808])


def test_swapped_turns_the_order_round_with_what_is_missing() -> None:
    found = kernels.swapped(PROFILE[:, 1:], DAILY[:2], DEPTHS[1:], 1.0, random())
    np.testing.assert_array_equal(found, [[12.0, 20.0], [11.0, np.nan]])


def test_repeated_gives_the_first_half_twice() -> None:
    found = kernels.repeated(np.arange(5.0)[:, None], DAILY, DEPTHS[:1], 0.0, random())
    np.testing.assert_array_equal(found[:, 0], [0.0, 1.0, 0.0, 1.0, 4.0])


def test_lost_leaves_nothing() -> None:
    assert np.isnan(kernels.lost(PROFILE, DAILY[:2], DEPTHS, 3.0, random())).all()


def test_adrift_changes_all_depths_alike() -> None:
    change = kernels.adrift(PROFILE, np.array([0.0, 9.0]), DEPTHS, 3.0, random()) - PROFILE
    # 1 - exp(-1/10) of 3 °C on the first day, 1 - 1/e ten days on.
    assert kernels.ADRIFT_DAYS == 10.0
    np.testing.assert_allclose(change[0], 3.0 * (1.0 - np.exp(-0.1)))
    np.testing.assert_allclose(change[1, [0, 2]], 3.0 * (1.0 - np.exp(-1.0)))
    assert np.isnan(change[1, 1])


def test_in_air_all_sensors_read_about_the_same() -> None:
    found = kernels.in_air(np.full((200, 3), 12.0), np.arange(200.0), DEPTHS, 27.0, random())
    assert found.mean() == pytest.approx(27.0, abs=0.3)
    assert np.ptp(found, axis=1).max() < 1.0
    assert found.mean(axis=1).std() == pytest.approx(kernels.AIR_SD, rel=0.2)
    assert np.isnan(kernels.in_air(PROFILE, DAILY[:2], DEPTHS, 27.0, random())[1, 1])


def test_part_of_day_lifts_all_depths_together_once_a_day() -> None:
    # 10-minute steps would share their day's heave: here two samples a day. 0.08 °C per metre below the surface layer.
    since = np.repeat(np.arange(400.0), 2) + np.tile([0.0, 0.5], 400)
    values = np.broadcast_to(28.0 - 0.08 * np.linspace(0.0, 200.0, 5), (800, 5))
    depths = np.linspace(0.0, 200.0, 5)
    change = kernels.part_of_day(values, since, depths, 5.0, random()) - values
    np.testing.assert_allclose(change[::2], change[1::2], atol=1e-12)
    np.testing.assert_allclose(change[:, 1] - kernels.DIURNAL_BIAS * np.exp(-10.0), change[:, 2], atol=1e-4)
    assert change[::2, 2].std() == pytest.approx(5.0 * 0.08, rel=0.1)
    assert change[:, 0].mean() > 0.1


def test_at_depths_reads_between_the_sensors_and_leaves_the_missing_missing() -> None:
    wanted = np.array([[0.0, 150.0, 250.0], [50.0, 100.0, 200.0]])
    found = kernels.at_depths(PROFILE, DEPTHS, wanted)
    # 150 m: half way from 20 to 12; beyond the deepest its value. 50 m: a quarter of the way from 27 at 0 to 11 at 200.
    np.testing.assert_allclose(found, [[28.0, 16.0, 12.0], [23.0, np.nan, 11.0]])


@settings(max_examples=50, deadline=None)
@given(
    values=arrays(np.float64, (4, 6), elements=st.one_of(st.floats(-3.0, 35.0), st.just(np.nan))),
    shift=st.floats(-300.0, 300.0),
)
def test_at_depths_keeps_within_the_profile_and_is_exact_at_the_sensors(values: np.ndarray, shift: float) -> None:
    depths = np.array([1.0, 20.0, 60.0, 100.0, 250.0, 500.0])
    same = kernels.at_depths(values, depths, np.broadcast_to(depths, values.shape))
    np.testing.assert_array_equal(same, values)
    moved = kernels.at_depths(values, depths, np.broadcast_to(depths + shift, values.shape))
    np.testing.assert_array_equal(np.isnan(moved), np.isnan(values))
    for before, after in zip(values, moved, strict=True):
        good = np.isfinite(before)
        if good.any():
            assert before[good].min() - 1e-9 <= after[good].min()
            assert after[good].max() <= before[good].max() + 1e-9


def test_knocked_down_lifts_in_proportion_to_depth_and_returns() -> None:
    deeper = kernels.knocked_down(DAILY, np.array([0.0, 150.0, 300.0]), 40.0)
    # Five days: the third is the middle of the pulse.
    np.testing.assert_allclose(deeper[2], [0.0, -20.0, -40.0])
    np.testing.assert_allclose(deeper, deeper[::-1])
    assert (np.abs(deeper[0]) < np.abs(deeper[1]))[1:].all()


def test_elsewhere_is_the_size_everywhere() -> None:
    np.testing.assert_array_equal(kernels.elsewhere(DAILY, DEPTHS, -7.5), np.full((5, 3), -7.5))


def test_clock_wrong_is_late_by_its_hours() -> None:
    late = kernels.clock_wrong(STAMPS, DAILY, 1.5) - STAMPS
    np.testing.assert_array_equal(late, np.timedelta64(90, "m"))


def test_clock_drifted_ends_late_by_its_hours() -> None:
    late = kernels.clock_drifted(STAMPS, DAILY, -2.0) - STAMPS
    np.testing.assert_array_equal(late, np.array([0, -30, -60, -90, -120]) * np.timedelta64(1, "m"))


def test_stamp_repeated_is_the_first() -> None:
    np.testing.assert_array_equal(kernels.stamp_repeated(STAMPS, DAILY, 0.0), STAMPS[0])
