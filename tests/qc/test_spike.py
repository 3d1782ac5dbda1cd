from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from hypothesis.extra.numpy import array_shapes, arrays

from profiles.qc.spike import spike_height, spike_outcome

THRESHOLDS = {"threshold_low": 3.0, "threshold_high": 8.0}


def unbroken(samples: int) -> np.ndarray:
    return np.arange(samples) > 0


# Halves: sums and halves of them are exact, so that properties hold to the last bit.
records = arrays(
    np.float64,
    array_shapes(min_dims=2, max_dims=2, max_side=12),
    elements=st.integers(-60, 60).map(lambda n: n / 2),
)


def test_spike_height_is_the_distance_from_the_mean_of_the_neighbours():
    temperature = np.array([[20.0, 10.0], [27.0, 11.0], [22.0, 12.0], [23.0, 3.0]])
    # Column 0: |27 - 21| = 6, |22 - 25| = 3. Column 1, a ramp, then a drop: |11 - 11| = 0, |12 - 7| = 5.
    expected = [[np.nan, np.nan], [6.0, 0.0], [3.0, 5.0], [np.nan, np.nan]]
    np.testing.assert_array_equal(spike_height(temperature, unbroken(4)), expected)


def test_spikes_are_flagged_above_each_threshold_and_not_at_it():
    # One spike of height h on a constant record: h at the spike, h/2 beside it.
    outcome = [
        spike_outcome(20.0 + height * (np.arange(5) == 2.0)[:, None], unbroken(5), **THRESHOLDS)[:, 0]
        for height in (3.0, 3.5, 8.0, -8.5, 17.0)
    ]
    expected = [[2, 1, 1, 1, 2], [2, 1, 3, 1, 2], [2, 3, 3, 3, 2], [2, 3, 4, 3, 2], [2, 4, 4, 4, 2]]
    np.testing.assert_array_equal(outcome, expected)


def test_spike_does_not_judge_beside_missing_values_gaps_and_ends():
    temperature = np.full((7, 3), 20.0)
    temperature[0, 0] = temperature[3, 1] = temperature[6, 2] = np.nan
    linked = np.array([False, True, True, True, True, False, True])  # a gap before sample 5
    outcome = spike_outcome(temperature, linked, **THRESHOLDS)
    np.testing.assert_array_equal(outcome[:, 0], [9, 2, 1, 1, 2, 2, 2])
    np.testing.assert_array_equal(outcome[:, 1], [2, 1, 2, 9, 2, 2, 2])
    np.testing.assert_array_equal(outcome[:, 2], [2, 1, 1, 1, 2, 2, 9])


@pytest.mark.parametrize("samples", [1, 2])
def test_spike_judges_nothing_in_a_record_too_short(samples):
    assert (spike_outcome(np.full((samples, 2), 20.0), unbroken(samples), **THRESHOLDS) == 2).all()


def test_spike_of_a_silent_sensor_is_missing_throughout():
    assert (spike_outcome(np.full((4, 2), np.nan), unbroken(4), **THRESHOLDS) == 9).all()


@given(records, st.integers(-40, 40))
def test_spike_does_not_change_with_a_constant_offset(temperature, offset):
    linked = unbroken(len(temperature))
    shifted = spike_outcome(temperature + offset, linked, **THRESHOLDS)
    np.testing.assert_array_equal(shifted, spike_outcome(temperature, linked, **THRESHOLDS))


@given(records, st.data())
def test_spike_runs_backwards_alike(temperature, data):
    steps = data.draw(st.lists(st.booleans(), min_size=len(temperature) - 1, max_size=len(temperature) - 1))
    forward = spike_outcome(temperature, np.array([False, *steps]), **THRESHOLDS)
    backward = spike_outcome(temperature[::-1], np.array([False, *steps[::-1]]), **THRESHOLDS)
    np.testing.assert_array_equal(backward[::-1], forward)
