"""What happens near the surface of the simulated ocean."""

from __future__ import annotations

import numpy as np
import pytest

from profiles.drill.clock import Clock
from profiles.drill.near_surface import NearSurface

YEARS = Clock(np.arange(0.5, 3000.0), np.zeros(3000), 1.0)
MINUTES = np.arange(0.0, 30.0, 1.0 / 144.0)
INSTANTS = Clock(MINUTES, np.zeros(MINUTES.size), 0.0)


@pytest.fixture(scope="module")
def fields() -> NearSurface:
    return NearSurface.draw(3)


def test_fresh_layers_lie_in_the_west_for_some_weeks_and_are_tenths_of_a_degree_colder(fields: NearSurface) -> None:
    cooling = fields.fresh_cooling(np.zeros(2), np.array([155.0, 200.0]), YEARS)
    assert np.all(cooling[1] == 0.0)
    # A unit of rain is above 0.7 for 24 per cent of the time.
    assert 0.1 < np.mean(cooling[0] > 0.0) < 0.4
    assert 0.1 < cooling[0][cooling[0] > 0.0].mean() < 0.5
    assert cooling[0].max() <= NearSurface.FRESHEST
    spells = np.diff(np.flatnonzero(np.diff((cooling[0] > 0.1).astype(int))))
    assert 5.0 < np.mean(spells) < 100.0


def test_intrusions_lie_in_the_far_east_where_the_isotherm_is_shallow(fields: NearSurface) -> None:
    isotherm = np.full((3, 3000), 15.0)
    isotherm[1] = 40.0
    share = fields.intrusion_share(np.zeros(3), np.array([266.0, 266.0, 230.0]), YEARS, isotherm)
    assert 0.1 < np.mean(share[0] > 0.0) < 0.8
    assert share[0].max() <= NearSurface.INTRUSION
    assert np.all(share[1:] == 0.0)


def test_the_surface_is_warmest_early_in_the_afternoon(fields: NearSurface) -> None:
    # At 150E the sun is 10 hours ahead: 14:30 there is 4:30 UTC.
    warmth = fields.afternoon(np.zeros(1), np.array([150.0]), INSTANTS)[0].reshape(30, 144)
    hours = np.argmax(warmth, axis=1) / 6.0
    np.testing.assert_allclose(hours, 4.5, atol=1.0)
    assert warmth.max() <= NearSurface.STRONGEST_AFTERNOON
    # ((1 + cos) / 2)**2 is 0 at half past two at night.
    assert warmth[:, 99].max() == pytest.approx(0.0, abs=1e-3)


def test_a_day_keeps_three_eighths_of_the_afternoon(fields: NearSurface) -> None:
    where = np.zeros(1), np.array([150.0])
    instants = fields.afternoon(*where, INSTANTS)[0].reshape(30, 144).mean()
    daily = fields.afternoon(*where, Clock(np.arange(0.5, 30.0), np.zeros(30), 1.0))[0].mean()
    assert daily == pytest.approx(instants, rel=0.1)


def test_weather_and_mixing_have_their_sizes(fields: NearSurface) -> None:
    where = np.zeros(3), np.array([150.0, 200.0, 250.0])
    assert fields.weather_anomaly(*where, YEARS).std() == pytest.approx(NearSurface.WEATHER_SD, rel=0.15)
    assert np.log(fields.mixing_factor(*where, YEARS)).std() == pytest.approx(NearSurface.MIXING_SD, rel=0.15)
