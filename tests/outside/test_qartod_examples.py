"""The tests against the manual's example numbers and a plain reading of its rules.

Source: U.S. Integrated Ocean Observing System, 2020: Manual for Real-Time Quality Control of In-situ
Temperature and Salinity Data, Version 2.1, doi:10.25923/x02m-m555. Example numbers that are quoted from
memory say so. The rules were read in the sister manuals for gliders (2016), wind and pH, which share their
wording.
"""

from __future__ import annotations

import numpy as np

from profiles.qc.climatology import climatology_outcome
from profiles.qc.flat_line import flat_line_outcome
from profiles.qc.gap import gap_outcome
from profiles.qc.gross_range import gross_range_outcome
from profiles.qc.rate_of_change import rate_of_change_outcome
from profiles.qc.spike import spike_outcome


def record() -> np.ndarray:
    """A rough record in steps of 1/64 °C (sums are exact), with stuck stretches and spikes."""
    draw = np.random.default_rng(11)
    values = np.cumsum(draw.integers(-20, 21, 400)) / 64 + 20.0
    values[draw.integers(0, 400, 25)] += draw.choice([-10.0, -4.0, 4.0, 10.0], 25)
    for start in range(30, 380, 35):
        values[start : start + start % 9] = values[start]
    return values


def every_sample_linked(samples: int) -> np.ndarray:
    return np.arange(samples) > 0


def test_gap_example_of_one_hour():
    # Test 1, TIM_INC = 1 h: NOW - TIM_STMP > TIM_INC fails; the wind manual sets 9, the pH manual 4.
    silence = np.array([[3599.0], [3600.0], [3601.0]])
    outcome = gap_outcome(silence, np.full((3, 1), True), longest_silence=3600.0, flag_after_gap=4)
    np.testing.assert_array_equal(outcome[:, 0], [1, 1, 4])


def test_gross_range_example_spans():
    # Test 4, global span of temperature -2.5 to 40 °C (from memory); the same in EuroGOOS DATA-MEQ, EG10.19
    # (2010).
    outcome = gross_range_outcome(
        np.array([-2.51, -2.5, 40.0, 40.01]), sensor_min=-2.5, sensor_max=40.0, user_min=-2.5, user_max=40.0
    )
    np.testing.assert_array_equal(outcome, [4, 1, 1, 4])


def test_climatology_example_of_spring():
    # Test 5, T_SPRING_MIN = 12 °C, T_SPRING_MAX = 18 °C, no fail flag.
    outcome = climatology_outcome(np.array([11.9, 12.0, 18.0, 18.1, -50.0]), np.array(12.0), np.array(18.0))
    np.testing.assert_array_equal(outcome, [3, 1, 1, 3, 3])


def test_spike_rule_with_the_example_thresholds():
    # Test 6, THRSHLD_LOW = 3 °C, THRSHLD_HIGH = 8 °C (from memory), read literally, one point at a time.
    values = record()
    expected = []
    for n in range(2, values.size):
        departure = abs(values[n - 1] - (values[n - 2] + values[n]) / 2)
        expected.append(4 if departure > 8.0 else 3 if departure > 3.0 else 1)
    outcome = spike_outcome(values[:, None], every_sample_linked(values.size), threshold_low=3.0, threshold_high=8.0)
    assert {1, 3, 4} <= set(expected)
    np.testing.assert_array_equal(outcome[:, 0], [2, *expected, 2])


def test_rate_of_change_rule_in_its_two_sided_form():
    # Test 7, the alternative |T[n-1]-T[n-2]| + |T[n-1]-T[n]| <= 2 N_DEV SD with N_DEV = 3, read literally.
    values, sd = record(), 0.5
    expected = []
    for n in range(2, values.size):
        both = abs(values[n - 1] - values[n - 2]) + abs(values[n - 1] - values[n])
        expected.append(1 if both <= 2 * 3 * sd else 3)
    outcome = rate_of_change_outcome(
        values[:, None], every_sample_linked(values.size), np.array([sd]), deviations=3.0, floor=0.01
    )
    assert {1, 3} == set(expected)
    np.testing.assert_array_equal(outcome[:, 0], [2, *expected, 2])


def test_flat_line_rule_flags_what_the_manual_flags_and_the_members_of_its_windows():
    # Test 8, REP_CNT_FAIL = 5, REP_CNT_SUSPECT = 3, EPS = 0.05 °C (from memory), read literally: flag of the
    # newest value.
    values = record()
    expected = np.ones(values.size, dtype=int)
    for count, flag in ((3, 3), (5, 4)):
        for n in range(count, values.size):
            if all(abs(values[n] - values[n - i]) < 0.05 for i in range(1, count + 1)):
                window = expected[n - count + 1 : n + 1]  # in delayed mode all of the window but its first
                window[:] = np.maximum(window, flag)
    outcome = flat_line_outcome(
        values[:, None],
        every_sample_linked(values.size),
        tolerance=0.05,
        repeats_questionable=3,
        repeats_bad=5,
    )
    assert set(expected) == {1, 3, 4}
    np.testing.assert_array_equal(outcome[:, 0], expected)
