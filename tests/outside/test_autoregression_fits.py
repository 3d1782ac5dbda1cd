"""Autoregressive fits, effective sizes and trends against an independent package and hand-worked values.

Sources: statsmodels (Burg's method, autocorrelation of autoregressive models, regression); Bartlett (1946, J. R. Stat.
Soc. Suppl. 8, 27-41) for the effective size of two AR(1) series.
"""

from __future__ import annotations

import numpy as np
import pytest
import statsmodels.api as sm
from statsmodels.regression.linear_model import burg
from statsmodels.tsa.arima_process import ArmaProcess

from profiles.precursor import fit_anomaly, monthly_series
from profiles.statistics import autocorrelation_of, burg_reflection, coefficients_of, paired_statistics, simulate

SUNSPOTS = sm.datasets.sunspots.load_pandas().data["SUNACTIVITY"].to_numpy()


@pytest.mark.parametrize("order", [1, 2, 3, 9])
def test_burg_coefficients(order):
    expected, _ = burg(SUNSPOTS, order)
    np.testing.assert_allclose(coefficients_of(burg_reflection(SUNSPOTS, order)), expected, rtol=1e-9)


@pytest.mark.parametrize("order", [1, 2, 9])
def test_autocorrelation_of_the_model(order):
    reflection = burg_reflection(SUNSPOTS, order)
    expected = ArmaProcess(np.r_[1.0, -coefficients_of(reflection)], [1.0]).acf(101)
    np.testing.assert_allclose(autocorrelation_of(reflection, 100), expected, atol=1e-9)


def test_effective_size_of_two_red_series_by_hand():
    # Long series: N (1 - r1 r2) / (1 + r1 r2). With r 0.9 and 0.8: 0.28 / 1.72 = 0.1628 of the months.
    generator = np.random.default_rng(1)
    first, second = (simulate(np.array([memory]), 3000, 200, generator) for memory in (0.9, 0.8))
    found = paired_statistics(first, second, 0.9 ** np.arange(3000), 0.8 ** np.arange(3000))
    # The larger of two estimates of the variance counts more, which makes the size a few per cent smaller.
    assert 0.85 < np.mean(found.effective_size) / (3000.0 * 0.28 / 1.72) < 1.0


def test_variance_of_the_correlation_by_simulation():
    # What the size stands for: var(r) = 1 / (size - 1).
    generator = np.random.default_rng(2)
    reflection = np.array([0.985, -0.9])
    first, second = (simulate(reflection, 360, 4000, generator) for _ in range(2))
    memory = autocorrelation_of(reflection, 360)
    found = paired_statistics(first, second, memory, memory)
    assert 0.8 < np.mean(1.0 / (found.effective_size - 1.0)) ** -1 * np.var(found.correlation) < 1.0


def test_trend_and_seasonal_cycle_are_those_of_the_regression():
    generator = np.random.default_rng(3)
    values = generator.standard_normal(150) + 0.02 * np.arange(150)
    months = np.arange("2001-03", "2013-09", dtype="datetime64[M]").astype("datetime64[ns]")
    series = monthly_series(values, months, name="x")
    place = months.astype("datetime64[M]").astype(int)
    design = np.column_stack([np.eye(12)[place % 12], np.arange(150.0)])
    expected = sm.OLS(values, design).fit()
    fitted = fit_anomaly(series, detrend=True)
    assert fitted.slope == pytest.approx(expected.params[-1])
    np.testing.assert_allclose(fitted.apply(series).values, expected.resid, atol=1e-10)
