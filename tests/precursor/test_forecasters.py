"""Forecasters as tables of coefficients."""

from __future__ import annotations

import numpy as np
import pytest

from profiles.config import HindcastSettings
from profiles.precursor.forecasters import (
    Training,
    annual_wave,
    by_target,
    climatology,
    damped_persistence,
    fit_all,
    forecasts,
    persistence,
    recharge,
    regression,
)

SETTINGS = HindcastSettings(longest_lead=3)


def training(state: np.ndarray, *, used: np.ndarray | None = None, scale: np.ndarray | None = None) -> Training:
    months = state.shape[1]
    used = np.ones(months, bool) if used is None else used
    scale = np.ones(12) if scale is None else scale
    return Training(state, np.arange(months) % 12, used, scale, 1 if len(state) > 1 else None)


@pytest.fixture(scope="module")
def noise() -> np.ndarray:
    return np.random.default_rng(1).standard_normal((2, 1200))


def test_climatology_is_no_anomaly(noise: np.ndarray) -> None:
    assert not climatology(training(noise), SETTINGS).any()


def test_persistence_keeps_the_anomaly_in_its_units(noise: np.ndarray) -> None:
    # A scale twice as large in December as in January: December's anomaly of 1 sd is one of 2 sd in January.
    scale = np.ones(12)
    scale[11] = 2.0
    coefficients = persistence(training(noise, scale=scale), SETTINGS)
    assert coefficients[0, 11, 0] == 2.0
    assert coefficients[0, 10, 0] == 0.5
    assert not coefficients[:, :, 1].any()


def test_damped_persistence_finds_the_memory_of_an_autoregression() -> None:
    series = np.zeros((1, 6000))
    random = np.random.default_rng(3).standard_normal(6000)
    for month in range(1, 6000):
        series[0, month] = 0.8 * series[0, month - 1] + 0.6 * random[month]
    coefficients = damped_persistence(training(series), SETTINGS)
    # phi^lead; 6000 months know it to some 0.01, each month's own to some 0.03.
    for lead in (1, 2, 3):
        np.testing.assert_allclose(coefficients[lead - 1, :, 0], 0.8**lead, atol=0.06)


def test_regression_finds_a_predictor_that_leads_by_two_months(noise: np.ndarray) -> None:
    state = noise.copy()
    state[0, 2:] = 0.9 * noise[1, :-2]
    coefficients = regression(training(state), SETTINGS)
    # 1188 months against a weight of 10: 0.9 * 0.99.
    np.testing.assert_allclose(coefficients[1, :, 1], 0.9, atol=0.03)
    assert np.abs(coefficients[0, :, 1]).max() < 0.1


def test_regression_finds_a_coefficient_with_a_season(noise: np.ndarray) -> None:
    state = noise.copy()
    month = np.arange(noise.shape[1]) % 12
    share = 0.5 + 0.4 * np.cos(2.0 * np.pi * month / 12.0)
    state[0, 1:] = (share * noise[1])[:-1]
    coefficients = regression(training(state), SETTINGS)
    # The season's coefficients are drawn to zero by 100 in 1300 months: 0.4 becomes 0.37.
    np.testing.assert_allclose(coefficients[0, :, 1], share[:12], atol=0.06)


def test_fits_do_not_see_months_that_are_not_theirs(noise: np.ndarray) -> None:
    used = np.ones(noise.shape[1], bool)
    used[300:360] = False
    spoilt = noise.copy()
    spoilt[:, 300:360] = 1e9
    for name, found in fit_all(training(spoilt, used=used), SETTINGS).items():
        np.testing.assert_array_equal(found, fit_all(training(noise, used=used), SETTINGS)[name], err_msg=name)
    assert not np.allclose(fit_all(training(spoilt), SETTINGS)["regression"], found)


def test_missing_values_are_left_out(noise: np.ndarray) -> None:
    state = noise.copy()
    state[1, 100:200] = np.nan
    coefficients = fit_all(training(state), SETTINGS)
    assert all(np.isfinite(found).all() for found in coefficients.values())


def test_recharge_follows_the_powers_of_its_propagator() -> None:
    angle = 2.0 * np.pi / 40.0
    turn = 0.97 * np.array([[np.cos(angle), np.sin(angle)], [-np.sin(angle), np.cos(angle)]])
    state = np.empty((2, 400))
    state[:, 0] = [2.0, 1.0]
    for month in range(1, 400):
        state[:, month] = turn @ state[:, month - 1]
    coefficients = recharge(training(state), SETTINGS)
    for lead in (1, 2, 3):
        np.testing.assert_allclose(
            coefficients[lead - 1], np.tile(np.linalg.matrix_power(turn, lead)[0], (12, 1)), atol=1e-8
        )


def test_without_a_volume_there_is_no_oscillator(noise: np.ndarray) -> None:
    assert set(fit_all(training(noise[:1]), SETTINGS)) == {
        "climatology",
        "persistence",
        "damped_persistence",
        "regression",
    }


def test_combined_is_the_mean_of_two(noise: np.ndarray) -> None:
    found = fit_all(training(noise), SETTINGS)
    np.testing.assert_allclose(found["combined"], 0.5 * (found["regression"] + found["recharge"]))


def test_annual_wave_has_unit_mean_square() -> None:
    wave = annual_wave(np.arange(12))
    np.testing.assert_allclose(wave @ wave.T / 12.0, np.eye(3), atol=1e-12)


def test_forecasts_sum_coefficients_times_state() -> None:
    coefficients = np.zeros((1, 12, 2))
    coefficients[0, :, 0], coefficients[0, 1, 1] = 0.5, 2.0
    state = np.array([[1.0, 2.0, np.nan], [np.nan, 3.0, 1.0]])
    # January: 0.5 * 1, the second variable does not count; February: 0.5 * 2 + 2 * 3; March: the first is missing.
    np.testing.assert_allclose(forecasts(coefficients, state, np.arange(3)), [[0.5, 7.0, np.nan]])


def test_by_target_shifts_by_the_lead() -> None:
    from_start = np.array([[1.0, 2.0, 3.0], [4.0, 5.0, 6.0], [7.0, 8.0, 9.0]])
    np.testing.assert_array_equal(
        by_target(from_start), [[np.nan, 1.0, 2.0], [np.nan, np.nan, 4.0], [np.nan, np.nan, np.nan]]
    )
