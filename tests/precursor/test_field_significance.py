"""Field significance."""

from __future__ import annotations

import numpy as np
import pytest

from profiles.precursor.field_significance import field_significance, simulated_pairs

NAN = np.nan
GENERATOR = np.random.default_rng(1)


def test_p_value_counts_the_fields_that_are_as_strong():
    # With 52 effective, |r| above 0.273 is significant at 5 % (t 2.009 with 50 degrees of freedom).
    simulated = np.array([[0.1, 0.2], [0.5, 0.1], [0.0, 0.28], [0.3, 0.3]])
    found = field_significance(np.array([0.4, 0.1]), simulated, np.full(2, 52.0), 0.05)
    assert found.significant == 1
    assert found.p_value == pytest.approx(2.0 / 5.0)  # the second alone reaches 0.4
    assert found.p_value_of_count == pytest.approx(4.0 / 5.0)  # all but the first have one or more


def test_correlations_of_many_and_few_months_are_made_comparable():
    # 0.4 of 100 is stronger than 0.5 of 10.
    simulated = np.array([[0.0, 0.5]])
    assert field_significance(np.array([0.4, 0.0]), simulated, np.array([100.0, 10.0]), 0.05).p_value == 0.5
    assert field_significance(np.array([0.0, 0.4]), simulated, np.array([100.0, 10.0]), 0.05).p_value == 1.0


def test_missing_correlations_are_left_out():
    found = field_significance(np.array([NAN, 0.4]), np.array([[0.9, 0.1]]), np.array([NAN, 52.0]), 0.05)
    assert found.p_value == 0.5
    nothing = field_significance(np.full(2, NAN), np.zeros((3, 2)), np.full(2, NAN), 0.05)
    assert (np.isnan(nothing.p_value), nothing.significant) == (True, 0)


def test_simulated_pairs_are_independent_and_keep_their_memory():
    one, other = simulated_pairs(np.array([0.8]), np.array([-0.5]), 3000, 40, GENERATOR)
    np.testing.assert_allclose(one.std(axis=1), 1.0)
    lag_one = [(values[:, 1:] * values[:, :-1]).mean() for values in (one, other)]
    np.testing.assert_allclose(lag_one, [0.8, -0.5], atol=0.03)
    assert abs((one * other).mean()) < 0.01
