"""The recharge oscillator: fit, correction, intervals, and what happens where nothing oscillates."""

from __future__ import annotations

import numpy as np
import pytest
import xarray as xr
from scipy.linalg import expm

from profiles.errors import DataError, RequestError
from profiles.precursor import monthly_series, recharge_oscillator
from profiles.precursor.recharge import (
    corrected,
    decay_and_frequency,
    fit_propagator,
    fit_recharge,
    real_power,
    simulate,
    small_sample_bias,
    stationary_covariance,
)


def turning(period: float, decay: float) -> np.ndarray:
    angle = 2.0 * np.pi / period
    return np.exp(-1.0 / decay) * np.array([[np.cos(angle), np.sin(angle)], [-np.sin(angle), np.cos(angle)]])


def test_a_record_without_noise_gives_back_its_propagator() -> None:
    matrix = turning(40.0, 30.0)
    state = np.empty((2, 120))
    state[:, 0] = [1.0, 0.3]
    for month in range(1, 120):
        state[:, month] = matrix @ state[:, month - 1]
    for step in (1, 4):
        np.testing.assert_allclose(fit_propagator(state, step=step).matrix, np.linalg.matrix_power(matrix, step))


def test_pairs_that_lack_a_value_or_may_not_be_seen_are_left_out() -> None:
    state = simulate(turning(40.0, 30.0), 0.1 * np.eye(2), 200, 1, np.random.default_rng(1))[0]
    spoilt = state.copy()
    spoilt[0, 50] = np.nan
    # The pairs (49, 50) and (50, 51) go: 199 - 2.
    assert fit_propagator(spoilt).pairs == 197
    used = np.ones(200, bool)
    used[120:150] = False
    spoilt[:, 120:150] = 1e6
    # 30 months withheld: pairs (119, 120) to (149, 150) go, 31 of them.
    assert fit_propagator(spoilt, used=used).pairs == 197 - 31
    assert np.abs(fit_propagator(spoilt, used=used).matrix).max() < 1.2


def test_decay_and_frequency_are_those_of_the_eigenvalues() -> None:
    decay, frequency = decay_and_frequency(np.linalg.matrix_power(turning(36.0, 18.0), 3), step=3)
    assert decay == pytest.approx(1.0 / 18.0)
    assert frequency == pytest.approx(2.0 * np.pi / 36.0)


def test_real_eigenvalues_have_no_frequency_and_the_slower_decay() -> None:
    decay, frequency = decay_and_frequency(np.diag([0.9, 0.5]))
    assert frequency == 0.0
    assert decay == pytest.approx(-np.log(0.9))


def test_stationary_covariance_solves_its_equation() -> None:
    matrix, noise = np.array([[0.9, 0.2], [-0.1, 0.7]]), np.array([[1.0, 0.3], [0.3, 2.0]])
    covariance = stationary_covariance(matrix, noise)
    np.testing.assert_allclose(matrix @ covariance @ matrix.T + noise, covariance, rtol=1e-12)


def test_bias_of_one_variable_is_that_of_kendall() -> None:
    # Kendall (1954): -(1 + 3 phi) / n, here -(1 + 2.4) / 100.
    np.testing.assert_allclose(small_sample_bias(np.array([[0.8]]), np.array([[1.0]]), 100.0), [[-0.034]])


def test_bias_is_what_simulated_fits_show() -> None:
    matrix = turning(39.0, 20.0)
    noise = np.eye(2) - matrix @ matrix.T
    records = simulate(matrix, noise, 240, 4000, np.random.default_rng(3))
    fits = np.array([fit_propagator(one).matrix for one in records])
    error = fits.std(axis=0) / np.sqrt(len(fits))
    # First order in 1/n: what it leaves is of the order of its square, far below 10 % of the bias on the diagonal.
    np.testing.assert_allclose(
        fits.mean(axis=0) - matrix, small_sample_bias(matrix, noise, 239.0), atol=4.0 * error.max()
    )
    assert fits[:, 0, 0].mean() - matrix[0, 0] < -5.0 * error[0, 0]


def test_correction_never_makes_the_state_grow() -> None:
    matrix = turning(39.0, 2000.0)
    better = corrected(matrix, 0.01 * np.eye(2), 120.0)
    assert np.abs(np.linalg.eigvals(better)).max() <= 0.999 + 1e-12
    growing = corrected(1.1 * matrix, 0.01 * np.eye(2), 120.0)
    assert np.abs(np.linalg.eigvals(growing)).max() <= 0.999 + 1e-12


def test_correction_of_many_is_that_of_each() -> None:
    matrices = np.array([turning(39.0, 20.0), turning(39.0, 5000.0), turning(20.0, 8.0)])
    noises = np.array([0.1 * np.eye(2)] * 3)
    together = corrected(matrices, noises, 200.0)
    each = [corrected(one, noise, 200.0) for one, noise in zip(matrices, noises, strict=True)]
    np.testing.assert_allclose(together, each)


def test_powers_of_a_propagator_are_those_of_its_logarithm() -> None:
    rates = np.array([[-0.05, 0.16], [-0.15, -0.02]])
    np.testing.assert_allclose(real_power(expm(6.0 * rates), 0.5), expm(3.0 * rates), atol=1e-12)


def test_simulated_records_have_the_stated_covariance() -> None:
    matrix, noise = np.array([[0.8, 0.3], [-0.2, 0.7]]), np.array([[1.0, 0.2], [0.2, 0.5]])
    records = simulate(matrix, noise, 400, 100, np.random.default_rng(2))
    covariance = np.einsum("rit,rjt->ij", records, records) / records[:, 0].size
    # 40 000 months of some 5 months' memory: to about 2 per cent.
    np.testing.assert_allclose(covariance, stationary_covariance(matrix, noise), rtol=0.08, atol=0.05)


def test_intervals_hold_period_and_damping(make_record: object) -> None:
    # 24 records of 40 years; of right 95 % intervals, fewer than 19 would hold in 1 of 1000 such tests.
    held = []
    for seed in range(24):
        matrix = turning(39.0, 20.0)
        state = simulate(matrix, np.eye(2) - matrix @ matrix.T, 480, 1, np.random.default_rng(seed))[0]
        fit = fit_recharge(state, replicates=100, seed=seed)
        held.append(
            (
                fit.period_interval[0] < 39.0 < fit.period_interval[1],
                fit.decay_time_interval[0] < 20.0 < fit.decay_time_interval[1],
            )
        )
    assert np.sum(held, axis=0).min() >= 19


def test_a_state_that_does_not_oscillate_says_so() -> None:
    noise = np.random.default_rng(1).standard_normal((2, 480))
    state = np.empty((2, 480))
    state[:, 0] = 0.0
    for month in range(1, 480):
        state[:, month] = np.diag([0.95, 0.8]) @ state[:, month - 1] + noise[:, month]
    fit = fit_recharge(state, step=1, replicates=100)
    assert fit.oscillating_share < 0.9
    assert fit.period_interval[1] == np.inf
    assert fit.decay_time_interval[0] < -1.0 / np.log(0.95) < fit.decay_time_interval[1]


def test_a_short_record_does_not_tell_slow_damping_from_none() -> None:
    # Six years are less than two periods, and a tenth of the e-folding time.
    matrix = turning(39.0, 700.0)
    state = simulate(matrix, np.eye(2) - matrix @ matrix.T, 72, 1, np.random.default_rng(3))[0]
    assert fit_recharge(state, step=1, replicates=100).decay_time_interval[1] == np.inf


def test_labelled_oscillator_gives_rates_in_the_units_of_the_series(record: tuple) -> None:
    index, predictors = record
    found = recharge_oscillator(index, predictors["volume"], replicates=50)
    assert float(found["period_low"]) < 39.0 < float(found["period_high"])
    assert found["period"].attrs["units"] == "month"
    # In the units of the series T = 0.9 w and h = 1e14 v, where dw/dt = sin(...) v: 2 pi/39 * 0.9 / 1e14 = 1.45e-15
    # °C per month and m3; the fit knows it to some 20 %.
    assert float(found["rates"].sel(equation="index", term="volume")) == pytest.approx(1.45e-15, rel=0.35)
    assert float(found["rates"].sel(equation="volume", term="index")) < 0.0


def test_the_same_seed_gives_the_same_intervals(record: tuple) -> None:
    index, predictors = record
    once, twice = (recharge_oscillator(index, predictors["volume"], replicates=50, seed=3) for _ in range(2))
    xr.testing.assert_identical(once, twice)


def test_too_short_a_record_is_refused(make_record: object) -> None:
    index, predictors = make_record(5, 1)  # type: ignore[operator]
    with pytest.raises(DataError, match="too few months for a recharge oscillator; expected 60 or more"):
        recharge_oscillator(index, predictors["volume"])


def test_a_constant_volume_is_refused(record: tuple) -> None:
    index, _ = record
    flat = monthly_series(xr.full_like(index, 3.0), name="volume")
    with pytest.raises(DataError, match="the series is constant"):
        recharge_oscillator(index, flat)


def test_a_step_below_a_month_is_refused(record: tuple) -> None:
    index, predictors = record
    with pytest.raises(RequestError, match="not a number of months"):
        recharge_oscillator(index, predictors["volume"], step=0)
