"""Statistics of what moves the simulated thermocline."""

from __future__ import annotations

import numpy as np
import pytest

from profiles.drill.variability import (
    SMALL_SCALE_SD,
    EastwardWaves,
    Oscillator,
    RedField,
    autoregressive,
    small_scale_displacement,
)

YEAR = 365


def over_seeds(part: type, latitude: np.ndarray, longitude: np.ndarray, days: int, seeds: int) -> np.ndarray:
    """Displacements of many realisations, (position, all times)."""
    fields = [part.draw(days, seed).displacement(latitude, longitude) for seed in range(seeds)]
    return np.concatenate(fields, axis=1)


def test_autoregressive_noise_has_unit_variance_and_the_memory_asked_for() -> None:
    series = autoregressive(np.random.default_rng(1).standard_normal((400, 2000)), 40.0)
    assert series.var() == pytest.approx(1.0, abs=0.02)
    # exp(-20/40) = 0.6065 at 20 days.
    assert np.mean(series[:-20] * series[20:]) == pytest.approx(0.6065, abs=0.02)


def test_oscillator_has_its_standard_deviations() -> None:
    position = np.zeros(1)
    series = np.concatenate(
        [Oscillator.draw(1, seed).displacement(position, np.array([Oscillator.NODE])) for seed in range(3000)],
        axis=1,
    )
    # No tilt at the node: the recharge alone.
    assert series.std() == pytest.approx(Oscillator.RECHARGE_SD, rel=0.04)


def test_recharge_leads_warmth_by_a_quarter_of_the_period() -> None:
    # A damped rotation: the correlation of recharge(t) with warmth(t + lag) is exp(-lag/damping) sin(2 pi lag/period).
    lag = round(Oscillator.PERIOD / 4.0)
    runs = [Oscillator.draw(2 * lag, seed) for seed in range(800)]
    ahead = np.mean([np.mean(run.recharge[:lag] * run.warmth[lag:]) for run in runs])
    behind = np.mean([np.mean(run.warmth[:lag] * run.recharge[lag:]) for run in runs])
    expected = np.exp(-lag / Oscillator.DAMPING)
    assert ahead == pytest.approx(expected, abs=0.07)
    assert behind == pytest.approx(-expected, abs=0.07)


def test_warm_phase_is_flat_and_cold_phase_steep() -> None:
    # Common practice, no source: a steep tilt, deep in the west and shallow in the east, goes with the cold phase.
    run = Oscillator.draw(20 * YEAR, 3)
    west, east = run.displacement(np.zeros(2), np.array([150.0, 262.0]))
    warm_surface = run.surface_anomaly(np.zeros(1), np.array([262.0]))[0]
    assert np.corrcoef(east - west, run.warmth)[0, 1] > 0.99
    assert np.corrcoef(east - west, warm_surface)[0, 1] > 0.99


def test_tilt_has_opposite_signs_on_both_sides_of_its_node() -> None:
    run = Oscillator(recharge=np.zeros(1), warmth=np.ones(1))
    longitude = np.array([145.0, Oscillator.NODE, 270.0])
    np.testing.assert_allclose(run.displacement(np.zeros(3), longitude)[:, 0], [-10.0, 0.0, 10.0], rtol=0, atol=1e-12)


def test_waves_run_east_at_their_speed() -> None:
    run = EastwardWaves.draw(400, 5)
    # 2.4 m/s for 10 days is 2073.6 km, on a sphere of 6371 km 18.6485 degrees of longitude.
    west, east = run.displacement(np.zeros(2), np.array([160.0, 160.0 + 18.6485]))
    np.testing.assert_allclose(west[:-10], east[10:], rtol=0, atol=1e-3)


def test_waves_have_their_band_their_size_and_their_width() -> None:
    series = over_seeds(EastwardWaves, np.array([0.0, 3.0]), np.array([200.0, 200.0]), 100, 400)
    assert series[0].std() == pytest.approx(EastwardWaves.SD, rel=0.06)
    # A Gaussian of 3 degrees is down to 1/e at 3 degrees.
    assert series[1].std() / series[0].std() == pytest.approx(np.exp(-1.0), rel=1e-9)
    periods = 2.0 * np.pi / EastwardWaves.draw(10, 0).frequency
    assert periods.min() >= 60.0
    assert periods.max() <= 75.0


def test_red_field_has_its_covariance() -> None:
    # exp(-(5/10)**2) = 0.7788 five degrees east, exp(-(2.5/2.5)**2) = 0.3679 two and a half north.
    latitude, longitude = np.array([0.0, 0.0, 2.5, 0.0]), np.array([200.0, 205.0, 200.0, 240.0])
    field = over_seeds(RedField, latitude, longitude, 1, 4000)
    covariance = np.cov(field) / RedField.SD**2
    np.testing.assert_allclose(np.diag(covariance), 1.0, rtol=0, atol=0.08)
    np.testing.assert_allclose(covariance[0, 1:], [0.7788, 0.3679, 0.0], rtol=0, atol=0.06)


def test_parts_do_not_depend_on_which_positions_are_read_together() -> None:
    latitude, longitude = np.array([-2.5, 0.0, 4.5]), np.array([149.0, 201.0, 266.0])
    for part in (Oscillator, EastwardWaves, RedField):
        state = part.draw(20, 7)
        together = state.displacement(latitude, longitude)
        alone = state.displacement(latitude[2:], longitude[2:])
        np.testing.assert_allclose(together[2:], alone, rtol=0, atol=1e-12)


def test_parts_are_unrelated_to_each_other() -> None:
    # 1000 independent realisations: correlations have a standard deviation of 0.03.
    position = (np.zeros(1), np.array([220.0]))
    series = np.stack([over_seeds(part, *position, 1, 1000)[0] for part in (Oscillator, EastwardWaves, RedField)])
    assert np.abs(np.corrcoef(series)[np.triu_indices(3, 1)]).max() < 0.12


def test_small_scales_are_independent_between_sites_and_days() -> None:
    field = small_scale_displacement(4, 5000, 11)
    assert field.std() == pytest.approx(SMALL_SCALE_SD, rel=0.03)
    assert abs(np.corrcoef(field[0, :-1], field[0, 1:])[0, 1]) < 0.05
    assert np.abs(np.corrcoef(field)[np.triu_indices(4, 1)]).max() < 0.05
