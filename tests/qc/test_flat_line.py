from __future__ import annotations

import numpy as np
import pytest

from profiles.qc.flat_line import flat_line_outcome

SETTINGS = {"tolerance": 0.0005, "repeats_questionable": 3, "repeats_bad": 5}


def outcome_of(values, linked=None):
    record = np.array(values, dtype=np.float64)[:, None]
    linked = np.arange(len(record)) > 0 if linked is None else np.array(linked, dtype=bool)
    return flat_line_outcome(record, linked, **SETTINGS)[:, 0]


@pytest.mark.parametrize(
    ("length", "flags"),
    [
        (3, [1, 1, 1]),  # two repeats
        (4, [1, 3, 3, 3]),  # three repeats: all but the first
        (5, [1, 3, 3, 3, 3]),
        (6, [1, 4, 4, 4, 4, 4]),  # five repeats
        (9, [1, 4, 4, 4, 4, 4, 4, 4, 4]),
    ],
)
def test_a_flat_run_is_flagged_by_its_length(length, flags):
    record = [20.0, 20.5, 21.0] + [22.0] * length + [23.0, 23.5, 24.0]
    np.testing.assert_array_equal(outcome_of(record), [1, 1, 1, *flags, 1, 1, 1])


def test_values_a_stored_step_apart_are_not_the_same():
    assert (outcome_of(20.0 + 0.001 * np.arange(9)) == 1).all()


def test_values_within_the_tolerance_are_the_same():
    # 0.0001 apart: the newest of six lies 0.0004 from the fifth before it, the seventh would lie 0.0006 away.
    wobble = 20.0 + 0.0002 * np.array([0, 1, 2, 1, 0, 1])
    np.testing.assert_array_equal(outcome_of(wobble), [1, 4, 4, 4, 4, 4])


def test_a_slow_drift_past_the_tolerance_is_no_flat_line():
    # 0.0002 a step: two steps are 0.0004, three are 0.0006, so only two repeats lie within the tolerance.
    assert (outcome_of(20.0 + 0.0002 * np.arange(9)) == 1).all()


def test_a_missing_value_ends_a_run():
    # Six equal values, the third missing: three are left after it. Windows of four values exist nowhere.
    np.testing.assert_array_equal(outcome_of([20.0, 20.0, np.nan, 20.0, 20.0, 20.0]), [2, 2, 9, 2, 2, 2])


def test_a_gap_ends_a_run():
    # Three and four equal values on either side of a gap: the three fill no window, the four are flagged but
    # one.
    linked = [False, True, True, False, True, True, True]
    np.testing.assert_array_equal(outcome_of([20.0] * 7, linked), [2, 2, 2, 1, 3, 3, 3])


@pytest.mark.parametrize("samples", [1, 2, 3])
def test_a_record_too_short_is_not_judged(samples):
    assert (outcome_of([20.0] * samples) == 2).all()


def test_sensors_are_judged_apart():
    record = np.column_stack([np.full(6, 20.0), 20.0 + np.arange(6), np.full(6, np.nan)])
    outcome = flat_line_outcome(record, np.arange(6) > 0, **SETTINGS)
    np.testing.assert_array_equal(outcome.T, [[1, 4, 4, 4, 4, 4], [1] * 6, [9] * 6])
