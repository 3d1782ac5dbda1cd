from __future__ import annotations

import numpy as np
import pytest

from profiles.config import QualityControlSettings
from profiles.qc import quality_control
from profiles.qc.gap import gap_outcome, last_value_times, silence

NAT = np.datetime64("NaT", "ns")
TIME = np.datetime64("2031-01-01", "ns") + np.array([0, 1, 2, 6]) * np.timedelta64(1, "h")
# Column 0 is always there, column 1 starts late, column 2 has a hole, column 3 never speaks.
PRESENT = np.array([[1, 0, 1, 0], [1, 1, 0, 0], [1, 1, 0, 0], [1, 1, 1, 0]], dtype=bool)
NEVER = np.full(4, NAT)


def test_last_value_times_look_back_to_before_the_segment():
    times = last_value_times(TIME, PRESENT, np.array([NAT, NAT, TIME[0] - np.timedelta64(9, "h"), NAT]))
    earlier = TIME[0] - np.timedelta64(9, "h")
    expected = [
        [NAT, NAT, earlier, NAT],
        [TIME[0], NAT, TIME[0], NAT],
        [TIME[1], TIME[1], TIME[0], NAT],
        [TIME[2], TIME[2], TIME[0], NAT],
        [TIME[3], TIME[3], TIME[3], NAT],
    ]
    np.testing.assert_array_equal(times, np.array(expected, dtype="datetime64[ns]"))


def test_silence_is_the_time_since_the_sensors_own_last_value():
    hours = silence(TIME, PRESENT, NEVER) / 3600
    # At sample 3 (06:00): columns 0 and 1 spoke at 02:00, column 2 at 00:00.
    np.testing.assert_array_equal(hours[3], [4, 4, 6, np.nan])
    np.testing.assert_array_equal(hours[0], [np.nan] * 4)


@pytest.mark.parametrize("flag", [1, 3, 4])
def test_the_first_value_after_a_gap_takes_the_flag_set_for_it(flag):
    outcome = gap_outcome(silence(TIME, PRESENT, NEVER), PRESENT, longest_silence=5 * 3600.0, flag_after_gap=flag)
    # Only column 2 was silent for more than 5 h. A sensor's first value follows no gap.
    expected = [[1, 9, 1, 9], [1, 1, 9, 9], [1, 1, 9, 9], [1, 1, flag, 9]]
    np.testing.assert_array_equal(outcome, expected)


def test_a_silence_as_long_as_allowed_is_no_gap():
    outcome = gap_outcome(np.array([[3600.0]]), np.array([[True]]), longest_silence=3600.0, flag_after_gap=4)
    assert outcome.item() == 1


def test_missing_values_and_missing_samples_are_gaps_alike(make_chain):
    temperature = 28 + 0.1 * np.arange(12.0)
    temperature[3:5] = np.nan
    chain = make_chain(temperature).isel(time=[0, 1, 2, 3, 4, 5, 6, 7, 10, 11])
    settings = QualityControlSettings.model_validate({"gap": {"flag_after_gap": 3}})
    flags = quality_control(chain, settings)["temperature_qc_questionable"].values[:, 0] & 1
    # Days 5 (after two missing values) and 10 (after two absent samples), places 5 and 8.
    np.testing.assert_array_equal(np.flatnonzero(flags), [5, 8])
