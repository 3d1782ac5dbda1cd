"""The recharge model of Jin (1997) with its published parameters, and its oscillation found again in a record.

Jin 1997, J. Atmos. Sci. 54, 811-829: dT/dt = R T + gamma h, dh/dt = -r h - alpha b T, R = gamma b - c, b = b0 mu, with
c = 1, gamma = 0.75, r = 0.25, alpha = 0.125, b0 = 2.5, and time in units of two months. At mu = 2/3 it neither grows
nor decays, and its period is 3.42 years; at 0.6 it is damped with 3.22, at 0.7 it grows with 3.59 years.
"""

from __future__ import annotations

import numpy as np
import pytest
from scipy.linalg import expm

from profiles.precursor.recharge import decay_and_frequency, fit_propagator, fit_recharge, simulate

MONTHS = 2.0  # in a unit of time


def monthly_propagator(coupling: float) -> np.ndarray:
    c, gamma, r, alpha, b = 1.0, 0.75, 0.25, 0.125, 2.5 * coupling
    rates = np.array([[gamma * b - c, gamma], [-alpha * b, -r]])
    return expm(rates / MONTHS)


@pytest.mark.parametrize(("coupling", "years"), [(0.6, 3.22), (2.0 / 3.0, 3.42), (0.7, 3.59)])
def test_period_is_the_published_one(coupling: float, years: float) -> None:
    _, frequency = decay_and_frequency(monthly_propagator(coupling))
    assert 2.0 * np.pi / frequency / 12.0 == pytest.approx(years, abs=0.005)


def test_growth_is_zero_at_the_critical_coupling_damped_below_and_growing_above() -> None:
    decay = {mu: float(decay_and_frequency(monthly_propagator(mu))[0]) for mu in (0.6, 2.0 / 3.0, 0.7)}
    assert decay[2.0 / 3.0] == pytest.approx(0.0, abs=1e-12)
    # Half the trace: (0.75 * 1.5 - 1 - 0.25) / 2 = -1/16 in two months.
    assert decay[0.6] == pytest.approx(1.0 / 32.0)
    assert decay[0.7] < 0.0


@pytest.mark.parametrize("step", [1, 6])
def test_a_fit_to_the_critical_oscillation_gives_its_period(step: int) -> None:
    state = np.empty((2, 480))
    state[:, 0] = [1.0, 0.0]
    for month in range(1, 480):
        state[:, month] = monthly_propagator(2.0 / 3.0) @ state[:, month - 1]
    decay, frequency = decay_and_frequency(fit_propagator(state, step=step).matrix, step)
    assert decay == pytest.approx(0.0, abs=1e-3)
    assert 2.0 * np.pi / frequency / 12.0 == pytest.approx(3.42, abs=0.02)


def test_the_damped_oscillation_is_found_in_forty_years_of_noise() -> None:
    records = simulate(monthly_propagator(0.6), np.diag([0.05, 0.01]), 480, 8, np.random.default_rng(5))
    fits = [fit_recharge(record, replicates=100, seed=1) for record in records]
    periods = [fit.period_interval[0] < 12.0 * 3.22 < fit.period_interval[1] for fit in fits]
    decays = [fit.decay_time_interval[0] < 32.0 < fit.decay_time_interval[1] for fit in fits]
    # Of eight right 95 % intervals fewer than six hold in 6 of 1000.
    assert min(sum(periods), sum(decays)) >= 6
