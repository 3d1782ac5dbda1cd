from __future__ import annotations

import numpy as np
import pytest

from profiles.config import QualityControlSettings
from profiles.qc import quality_control
from profiles.qc.inversion import inversion_outcome

COLUMN = np.array([28.0, 26.0, 22.0, 17.0, 12.0])
SAMPLES = 7
LINKED = np.arange(SAMPLES) > 0


def record(*columns: list[float]) -> np.ndarray:
    """The same column at every sample, or one each."""
    return np.tile(columns[0], (SAMPLES, 1)) if len(columns) == 1 else np.array(columns)


def flagged(temperature: np.ndarray, linked: np.ndarray = LINKED) -> np.ndarray:
    return inversion_outcome(temperature, linked, tolerance=0.5, reach=2)


def test_sensors_in_order_are_good():
    assert (flagged(record(COLUMN)) == 1).all()


def test_both_of_two_swapped_sensors_are_questionable():
    # 28 22 26 17 12: the third is warmer than the second, and neither is out of order with any other.
    # Whole windows end two samples from the ends of the record; at its ends three of three samples are enough.
    outcome = flagged(record(COLUMN[[0, 2, 1, 3, 4]]))
    np.testing.assert_array_equal(outcome, np.tile([1, 3, 3, 1, 1], (SAMPLES, 1)))


def test_a_sensor_out_of_order_with_two_is_questionable_alone():
    # 28 26 22 29 12: the fourth is warmer than the three above, each of which is out of order with it alone.
    np.testing.assert_array_equal(flagged(record([28.0, 26.0, 22.0, 29.0, 12.0]))[3], [1, 1, 1, 3, 1])
    # 28 10 22 17 12: the second is colder than the three below.
    np.testing.assert_array_equal(flagged(record([28.0, 10.0, 22.0, 17.0, 12.0]))[3], [1, 3, 1, 1, 1])


def test_an_inversion_at_the_tolerance_is_good():
    # 26.5 - 26 is the tolerance exactly.
    assert (flagged(record([26.0, 26.5, 17.0])) == 1).all()
    np.testing.assert_array_equal(flagged(record([26.0, 26.501, 17.0]))[3], [3, 3, 1])


def test_an_inversion_that_is_soon_gone_is_good():
    warm, usual = [26.0, 28.0, 17.0], [26.0, 25.0, 17.0]
    # In two of seven samples: no window of five has three.
    assert (flagged(record(usual, usual, warm, warm, usual, usual, usual)) == 1).all()
    # In samples 2 to 4: windows about 2, 3 and 4 have three.
    three = flagged(record(usual, usual, warm, warm, warm, usual, usual))
    np.testing.assert_array_equal(three[:, 0], [1, 1, 3, 3, 3, 1, 1])
    np.testing.assert_array_equal(three[:, 0], three[:, 1])


def test_windows_end_at_gaps():
    warm, usual = [26.0, 28.0, 17.0], [26.0, 25.0, 17.0]
    samples = record(usual, usual, warm, warm, warm, usual, usual)
    # A gap before sample 4: two of the three lie on one side of it.
    assert (flagged(samples, LINKED & (np.arange(SAMPLES) != 4)) == 1).all()


@pytest.mark.parametrize("missing", [0, 1, 2])
def test_a_missing_sensor_is_stepped_over(missing: int):
    """28 22 26 17: without the first the swapped pair still is one; without either of it there is none."""
    column = np.array([28.0, 22.0, 26.0, 17.0])
    column[missing] = np.nan
    expected = {0: [9, 3, 3, 1], 1: [1, 9, 1, 1], 2: [1, 1, 9, 1]}[missing]
    np.testing.assert_array_equal(flagged(record(column))[3], expected)


def test_a_sensor_that_is_missing_for_a_sample_casts_no_doubt_there():
    swapped = record([28.0, 22.0, 26.0, 17.0])
    swapped[3, 2] = np.nan
    np.testing.assert_array_equal(flagged(swapped)[2:5, 1:3], [[3, 3], [1, 9], [3, 3]])


def test_a_value_alone_in_its_profile_is_not_judged():
    outcome = flagged(record([np.nan, 20.0, np.nan]))
    np.testing.assert_array_equal(outcome[3], [9, 2, 9])
    np.testing.assert_array_equal(flagged(np.full((SAMPLES, 1), 20.0)), np.full((SAMPLES, 1), 2))
    np.testing.assert_array_equal(flagged(np.full((SAMPLES, 2), np.nan)), np.full((SAMPLES, 2), 9))


def test_a_constant_added_to_all_changes_nothing():
    random = np.random.default_rng(5)
    temperature = np.sort(random.uniform(8.0, 29.0, (SAMPLES, 6)), axis=1)[:, ::-1] + random.normal(0.0, 2.0, 6)
    expected = flagged(temperature)
    assert (expected == 3).any()
    np.testing.assert_array_equal(flagged(temperature + 273.15), expected)


def test_a_sensor_that_another_test_condemns_casts_no_doubt_on_those_above_it(make_chain):
    # 99 °C at the third sensor is out of range; the two above it, colder, are good. All rise, for nothing sticks.
    chain = make_chain(np.array([27.0, 25.0, 99.0, 15.0]) + 0.01 * np.arange(40)[:, None])
    flags = quality_control(chain, QualityControlSettings())
    inversion = 1 << 8
    assert (flags["temperature_qc"].values[:, 2] == 4).all()
    assert not (flags["temperature_qc_questionable"].values & inversion).any()
    ran = flags["temperature_qc_ran"].values & inversion
    np.testing.assert_array_equal(ran[5] > 0, [True, True, False, True])
