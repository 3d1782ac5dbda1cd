"""Persistence of a series, and how many independent values it is worth."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from profiles.statistics import effective_count, lag_one


def persistent(random: np.random.Generator, count: int, lag: float) -> np.ndarray:
    """A series of variance 1 whose lag-one autocorrelation is ``lag``."""
    series = np.empty(count)
    series[0] = random.standard_normal()
    for place in range(1, count):
        series[place] = lag * series[place - 1] + np.sqrt(1.0 - lag**2) * random.standard_normal()
    return series


def test_the_autocorrelation_by_hand():
    # 0, 1, 2, 3, 4: departures -2 to 2, products 2, 0, 0, 2, their mean 1; variance 2; r = 0.5 over four pairs.
    # Added for the shortness: (1 + 4 x 0.5) / 4 = 0.75. That is beyond 0.95, where it ends.
    assert lag_one(np.arange(5.0)) == 0.95
    # 1, -1, 1, -1, 1, -1, 1, -1: r = -1 over seven pairs, and (1 - 4) / 7 on top of it: beyond -0.95.
    assert lag_one([1.0, -1.0] * 4) == -0.95
    # 1, 1, -1, -1 five times over: mean 0, variance 1, of 19 pairs ten are +1 and nine -1.
    assert lag_one([1.0, 1.0, -1.0, -1.0] * 5) == pytest.approx(1 / 19 + (1 + 4 / 19) / 19)


def test_pairs_with_a_missing_value_do_not_count():
    # The mean is that of five values, 0; variance 4/5. Pairs (1, -1), (-1, 1), (1, -1): their mean product is -1.
    series = [1.0, -1.0, 1.0, -1.0, np.nan, 0.0]
    raw = -1.0 / 0.8
    assert lag_one(series) == pytest.approx(max(raw + (1 + 4 * raw) / 3, -0.95))
    holed = persistent(np.random.default_rng(1), 4000, 0.6)
    holed[::7] = np.nan
    assert lag_one(holed) == pytest.approx(0.6, abs=0.04)


@pytest.mark.parametrize(
    "series", [[], [1.0], [1.0, 2.0, 3.0], [2.0] * 9, [np.nan] * 9, [1.0, np.nan, 2.0, np.nan, 5.0]]
)
def test_what_tells_nothing_has_no_persistence(series):
    assert lag_one(series) == 0.0


@given(st.lists(st.floats(-1e3, 1e3), min_size=4, max_size=40), st.floats(0.1, 10.0), st.floats(-100.0, 100.0))
def test_scale_and_shift_do_not_matter(series, scale, shift):
    values = np.round(np.array(series), 3)
    first, second = lag_one(values), lag_one(scale * values + shift)
    if np.ptp(values) > 1e-2:
        assert second == pytest.approx(first, abs=1e-6)


@pytest.mark.parametrize("lag", [0.0, 0.5, 0.8])
def test_the_estimate_of_a_short_series_is_not_biased_much(lag):
    """Without what is added, 72 months of 0.8 would give 0.74 on average."""
    random = np.random.default_rng(11)
    found = np.mean([lag_one(persistent(random, 72, lag)) for _ in range(600)])
    assert found == pytest.approx(lag, abs=0.025)


def test_the_effective_number_by_hand():
    assert effective_count(72.0, 0.0) == 72.0
    assert effective_count(72.0, 0.5) == pytest.approx(24.0)  # (1 - 0.5) / (1 + 0.5) = 1/3
    assert effective_count(72.0, -0.5) == 72.0  # never more than there are


@pytest.mark.parametrize("lag", [0.3, 0.7])
def test_the_effective_number_gives_the_error_of_a_mean(lag):
    """The variance of the mean of n values is that of one over the effective number; 2000 series of 200 values."""
    random = np.random.default_rng(5)
    means = [persistent(random, 200, lag).mean() for _ in range(2000)]
    np.testing.assert_allclose(np.var(means), 1.0 / effective_count(200.0, lag), rtol=0.1)


def test_the_effective_number_of_a_variance_is_that_of_the_square():
    """Bretherton et al. (1999): the variance of a sample variance of normal values is 2 / n effective."""
    random, lag = np.random.default_rng(6), 0.7
    variances = [persistent(random, 400, lag).var() for _ in range(1500)]
    np.testing.assert_allclose(np.var(variances), 2.0 / effective_count(400.0, lag**2), rtol=0.15)
