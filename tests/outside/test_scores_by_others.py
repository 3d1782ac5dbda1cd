"""Scores of a model against what scikit-learn and SciPy make of the same series, and a triangle worked by hand.

Sources: Taylor, K. E. (2001), J. Geophys. Res. 106, 7183-7192, equation 2; Fisher's interval of a correlation and
Student's of a mean as SciPy has them; the interval of a ratio of standard deviations by SciPy's bootstrap.
"""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats
from sklearn.linear_model import LinearRegression
from sklearn.metrics import mean_squared_error, r2_score

from profiles.statistics import lag_one
from profiles.validation.scores import Scores, score

TIME = np.arange("2031-01", "2037-01", dtype="datetime64[M]").astype("datetime64[ns]") + np.timedelta64(15, "D")
SEEDS = range(6)


def scored(model: np.ndarray, array: np.ndarray) -> Scores:
    return score(TIME[: model.size], model, array, bias_error=np.nan, least_months=6)


def pair(seed: int, count: int = 72) -> tuple[np.ndarray, np.ndarray]:
    """Two series without persistence that share a part; of the same seed the first whose effective number is all."""
    random = np.random.default_rng(seed)
    while True:
        array, other = random.standard_normal((2, count))
        model = 0.7 + 1.3 * (0.8 * array + 0.6 * other)
        alike = lag_one(model) * lag_one(array)
        if alike <= 0.0 and lag_one(model - array) <= 0.0:
            return model, array


@pytest.mark.parametrize("seed", SEEDS)
def test_differences_are_those_of_scikit_learn(seed: int) -> None:
    model, array = pair(seed)
    found = scored(model, array)
    whole = mean_squared_error(array, model)
    assert found.bias**2 + found.centred_rms**2 == pytest.approx(whole)
    assert found.centred_rms**2 == pytest.approx(mean_squared_error(array - array.mean(), model - model.mean()))
    # The share of variance explained, of scikit-learn: 1 - mean square difference / variance.
    assert 1.0 - whole / found.array_sd**2 == pytest.approx(r2_score(array, model))


@pytest.mark.parametrize("seed", SEEDS)
def test_correlation_and_its_interval_are_those_of_scipy(seed: int) -> None:
    model, array = pair(seed)
    found, published = scored(model, array), stats.pearsonr(model, array)
    assert found.effective_count == 72.0
    assert found.correlation == pytest.approx(published.statistic)
    interval = published.confidence_interval(0.95)
    # SciPy takes 1.959964 for the normal quantile, we 1.96.
    assert (found.correlation_low, found.correlation_high) == pytest.approx(tuple(interval), abs=1e-5)


@pytest.mark.parametrize("seed", SEEDS)
def test_the_interval_of_the_bias_is_that_of_a_paired_t_test(seed: int) -> None:
    model, array = pair(seed)
    found, interval = scored(model, array), stats.ttest_rel(model, array).confidence_interval(0.95)
    assert (found.bias_low, found.bias_high) == pytest.approx(tuple(interval))
    assert found.bias_sampling_error == pytest.approx(stats.sem(model - array))


@pytest.mark.parametrize("seed", SEEDS)
def test_the_interval_of_the_ratio_is_near_that_of_the_bootstrap(seed: int) -> None:
    """Both are of large samples; over 72 values the bootstrap's own ends scatter by a tenth of the width or so."""
    model, array = pair(seed)
    found = scored(model, array)
    assert found.sd_ratio == pytest.approx(model.std() / array.std())
    resampled = stats.bootstrap(
        (model, array),
        lambda one, other, axis: np.log(one.std(axis=axis) / other.std(axis=axis)),
        paired=True,
        vectorized=True,
        n_resamples=2000,
        method="percentile",
        rng=np.random.default_rng(seed),
    ).confidence_interval
    width = resampled.high - resampled.low
    ours = np.log([found.sd_ratio_low, found.sd_ratio_high])
    np.testing.assert_allclose(ours, [resampled.low, resampled.high], atol=0.2 * width)


def test_the_triangle_by_hand() -> None:
    """E'^2 = s1^2 + s2^2 - 2 s1 s2 R (Taylor 2001, equation 2).

    Array 2, 4, 4, 6, 6, 8: mean 5, departures -3, -1, -1, 1, 1, 3, squares 22, s1^2 = 22/6.
    Model 1, 1, 5, 5, 9, 9: mean 5, departures -4, -4, 0, 0, 4, 4, squares 64, s2^2 = 64/6.
    Products 12 + 4 + 0 + 0 + 4 + 12 = 32, over 6: s1 s2 R = 32/6. Hence E'^2 = (22 + 64 - 64) / 6 = 22/6.
    Directly: model less array -1, -3, 1, -1, 3, 1, squares 22, over 6.
    """
    found = scored(np.array([1.0, 1.0, 5.0, 5.0, 9.0, 9.0]), np.array([2.0, 4.0, 4.0, 6.0, 6.0, 8.0]))
    assert (found.array_sd**2, found.model_sd**2) == pytest.approx((22.0 / 6.0, 64.0 / 6.0))
    assert found.correlation == pytest.approx(32.0 / np.sqrt(22.0 * 64.0))
    assert found.centred_rms**2 == pytest.approx(22.0 / 6.0)
    assert found.bias == 0.0


@pytest.mark.parametrize("seed", SEEDS)
def test_the_triangle_closes_for_any_series(seed: int) -> None:
    model, array = np.random.default_rng(seed).standard_normal((2, 40)).cumsum(axis=1)
    found = scored(model, array)
    side = found.model_sd**2 + found.array_sd**2 - 2.0 * found.model_sd * found.array_sd * found.correlation
    assert found.centred_rms**2 == pytest.approx(side)


@pytest.mark.parametrize("seed", SEEDS)
def test_the_seasonal_cycle_is_that_of_a_linear_regression(seed: int) -> None:
    """On the cosine and sine of the year and of half of it; scikit-learn's least squares."""
    model, array = pair(seed)
    years = TIME.astype("datetime64[Y]")
    first, next_first = years.astype("datetime64[D]"), (years + 1).astype("datetime64[D]")
    angle = 2.0 * np.pi * ((TIME - first) / (next_first - first))
    waves = np.stack([np.cos(angle), np.sin(angle), np.cos(2.0 * angle), np.sin(2.0 * angle)], axis=-1)
    fits = [LinearRegression().fit(waves, series).coef_ for series in (array, model)]
    amplitudes = [np.hypot(*fit[:2]) for fit in fits]
    phases = [np.arctan2(fit[1], fit[0]) for fit in fits]
    found = scored(model, array)
    assert (found.array_annual_amplitude, found.model_annual_amplitude) == pytest.approx(tuple(amplitudes))
    late = np.angle(np.exp(1j * (phases[1] - phases[0]))) * 365.25 / (2.0 * np.pi)
    assert found.annual_phase_difference == pytest.approx(late, abs=1e-6)
