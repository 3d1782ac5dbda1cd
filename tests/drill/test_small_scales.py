"""Internal waves and fine structure of the simulated ocean."""

from __future__ import annotations

import numpy as np
import pytest

from profiles.drill.clock import Clock
from profiles.drill.small_scales import FineStructure, InternalWaves

MINUTES = np.arange(0.0, 60.0, 1.0 / 144.0)
INSTANTS = Clock(MINUTES, np.zeros(MINUTES.size), 0.0)
DAYS = Clock(np.arange(0.5, 60.0), np.zeros(60), 1.0)
HERE = np.array([0.0]), np.array([201.0])


def test_internal_waves_have_their_sizes() -> None:
    # Independent parts: 2.5**2 + 2.5**2 + 3**2 = 21.5, its root 4.64.
    fields = [InternalWaves.draw(seed).displacement(*HERE, INSTANTS) for seed in range(12)]
    assert np.sqrt(np.mean(np.square(fields))) == pytest.approx(4.64, rel=0.08)


def test_a_day_keeps_the_slow_waves_and_loses_the_tide() -> None:
    waves = InternalWaves.draw(2)
    # sinc(1 / 0.5175) = sin(6.0707) / 6.0707 = -0.0348 for M2, 0 for S2.
    tide = waves.tide.at(*HERE, DAYS).std() / waves.tide.at(*HERE, INSTANTS).std()
    assert tide < 0.05
    assert waves.days.at(*HERE, DAYS).std() > 0.8 * waves.days.at(*HERE, INSTANTS).std()


def test_daily_displacement_is_the_mean_of_the_day_of_instants() -> None:
    waves = InternalWaves.draw(3)
    instants = waves.displacement(*HERE, INSTANTS).reshape(1, 60, 144)
    middle = waves.displacement(*HERE, DAYS)
    # Instants at the start of 144 ten-minute steps against a continuous mean: waves of half an hour alias a little.
    np.testing.assert_allclose(instants.mean(axis=-1), middle, atol=0.15)


def test_the_tide_has_its_line() -> None:
    # 60 days resolve 1/60 cycles a day: M2 at 1.9324, S2 at 2.
    power = np.abs(np.fft.rfft(InternalWaves.draw(4).displacement(*HERE, INSTANTS)[0])) ** 2
    frequency = np.fft.rfftfreq(MINUTES.size, 1.0 / 144.0)
    band = (frequency > 1.5) & (frequency < 2.5)
    peak = frequency[band][np.argmax(power[band])]
    assert min(abs(peak - 1.9324), abs(peak - 2.0)) < 0.02


def test_sites_two_and_a_half_degrees_apart_see_unrelated_waves() -> None:
    field = InternalWaves.draw(5).displacement(np.array([0.0, 2.5]), np.array([201.0, 201.0]), INSTANTS)
    assert abs(np.corrcoef(field)[0, 1]) < 0.6


def test_fine_structure_turns_no_column_over() -> None:
    # Each sine strains by height times number at most, faded by z^2 / (z^2 + 15^2), whose slope is
    # 450 z / (z^2 + 15^2)^2.
    steps = FineStructure.draw(np.zeros(50), np.linspace(140.0, 260.0, 50), 6)
    strain = (steps.height * steps.number).sum(axis=1)
    np.testing.assert_allclose(strain, FineStructure.STRAIN)
    depth = np.arange(0.0, 300.0)[:, None]
    fade, slope = depth**2 / (depth**2 + 225.0), 450.0 * depth / (depth**2 + 225.0) ** 2
    assert (fade * strain + slope * steps.height.sum(axis=1)).max() < 1.0


def test_steps_are_5_to_20_metres_thick_and_stay_for_days() -> None:
    steps = FineStructure.draw(np.zeros(50), np.linspace(140.0, 260.0, 50), 6)
    half = np.pi / steps.number
    assert half.min() >= 5.0
    assert half.max() <= 20.0
    assert (2.0 * np.pi / np.abs(steps.frequency)).min() >= 15.0


def test_steps_of_a_place_do_not_depend_on_its_company() -> None:
    latitude, longitude = np.array([0.0, 2.5]), np.array([149.0, 266.0])
    together, alone = FineStructure.draw(latitude, longitude, 1), FineStructure.draw(latitude[1:], longitude[1:], 1)
    np.testing.assert_array_equal(together.phase[1:], alone.phase)
    assert np.all(together.phase[0] != together.phase[1])
