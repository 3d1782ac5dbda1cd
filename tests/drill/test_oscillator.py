"""The oscillator of the simulated ocean."""

from __future__ import annotations

import numpy as np
import pytest

from profiles.drill.clock import Clock
from profiles.drill.oscillator import Oscillator

CENTURIES = Clock(np.arange(0.0, 600.0 * 365.0, 30.0), np.zeros(7300), 30.0)


@pytest.fixture(scope="module")
def run() -> Oscillator:
    return Oscillator.draw(CENTURIES, 4)


def test_states_have_unit_variance(run: Oscillator) -> None:
    # 600 years hold some 180 periods: the standard deviation is known to some 10 per cent.
    assert run.recharge.std() == pytest.approx(1.0, abs=0.12)
    assert run.warmth.std() == pytest.approx(1.0, abs=0.15)
    assert run.warmth.mean() == pytest.approx(0.0, abs=0.12)


def test_recharge_leads_the_warmth(run: Oscillator) -> None:
    # A damped rotation: the correlation at a lag is exp(-lag/damping) sin(2 pi lag/period), largest where
    # tan(2 pi lag/period) = 2 pi damping/period: 2 pi 20/39 = 3.222, lag 39 atan(3.222) / 2 pi = 7.9 months.
    lags = np.arange(1, 16)
    correlation = [np.corrcoef(run.recharge[:-lag], run.warmth[lag:])[0, 1] for lag in lags]
    assert lags[np.argmax(correlation)] == pytest.approx(7.9, abs=2.0)
    # exp(-7.9/20) sin(72.8 degrees) = 0.644, a little less by the exponential.
    assert max(correlation) == pytest.approx(0.63, abs=0.08)


def test_warm_events_are_stronger_and_cold_ones_longer(run: Oscillator) -> None:
    skewness = np.mean((run.warmth - run.warmth.mean()) ** 3) / run.warmth.std() ** 3
    # (exp(g^2) + 2) sqrt(exp(g^2) - 1) with g = 0.34: 3.1225 * 0.3501 = 1.093.
    assert skewness == pytest.approx(1.093, abs=0.3)
    # exp(g n) lies below its mean exp(g^2/2) where n < g/2: the normal integral of 0.17 is 0.5675.
    assert np.mean(run.warmth < 0.0) == pytest.approx(0.5675, abs=0.03)


def test_longer_and_finer_clocks_see_the_same_states() -> None:
    short = Oscillator.draw(Clock(np.arange(100.0), np.zeros(100), 1.0), 9)
    fine = Oscillator.draw(Clock(np.arange(0.0, 300.0, 0.25), np.zeros(1200), 0.0), 9)
    np.testing.assert_allclose(fine.warmth[:400:4], short.warmth, atol=1e-9)
    np.testing.assert_allclose(fine.recharge[:400:4], short.recharge, atol=1e-9)


def state(recharge: float, warmth: float, fraction: float = 0.2) -> Oscillator:
    return Oscillator(Clock(np.zeros(1), np.array([fraction]), 1.0), np.array([recharge]), np.array([warmth]))


def test_a_warm_phase_is_deep_in_the_east_and_shallow_in_the_west() -> None:
    # Common practice, no source. At its extremes the tilt has its standard deviations.
    longitude = np.array([Oscillator.WEST_EXTREME, Oscillator.NODE, Oscillator.EAST_EXTREME])
    moved = state(0.0, 1.0).displacement(np.zeros(3), longitude)[:, 0]
    np.testing.assert_allclose(moved, [-Oscillator.WEST_SD, 0.0, Oscillator.EAST_SD], atol=1e-9)


def test_recharge_deepens_the_whole_basin() -> None:
    latitude, longitude = (grid.ravel() for grid in np.meshgrid([-5.0, 0.0, 5.0], np.arange(120.0, 281.0, 10.0)))
    assert state(1.0, 0.0).displacement(latitude, longitude).min() > 3.0


def test_surface_answers_more_in_december_and_in_the_east() -> None:
    where = np.zeros(2), np.array([150.0, 245.0])
    winter, summer = (state(0.0, 1.0, fraction).surface_anomaly(*where)[:, 0] for fraction in (0.96, 0.46))
    assert winter[1] == pytest.approx(1.3 * Oscillator.SURFACE_SD)
    assert summer[1] == pytest.approx(0.7 * Oscillator.SURFACE_SD)
    assert winter[0] < 0.2 * winter[1]
