from __future__ import annotations

import numpy as np

from profiles.qc.gross_range import gross_range_outcome

LIMITS = {"sensor_min": -2.5, "sensor_max": 40.0, "user_min": 3.0, "user_max": 33.0}


def test_gross_range_flags_by_limit():
    values = [-2.6, -2.5, 2.9, 3.0, 20.0, 33.0, 33.1, 40.0, 40.1]
    outcome = gross_range_outcome(np.array(values), **LIMITS)
    # Below -2.5 bad; to 3 questionable; 3 to 33 good, limits included; to 40 questionable; above bad.
    np.testing.assert_array_equal(outcome, [4, 3, 3, 1, 1, 1, 3, 3, 4])


def test_gross_range_leaves_missing_values_missing_wherever_they_are():
    profile = np.array([[np.nan, 28.0, 99.9], [28.0, np.nan, 10.0], [28.0, 10.0, np.nan], [np.nan] * 3])
    expected = [[9, 1, 4], [1, 9, 1], [1, 1, 9], [9, 9, 9]]
    np.testing.assert_array_equal(gross_range_outcome(profile, **LIMITS), expected)


def test_an_infinite_value_is_bad_and_not_missing():
    np.testing.assert_array_equal(gross_range_outcome(np.array([np.inf, -np.inf]), **LIMITS), [4, 4])
