"""Waves and patches of the simulated thermocline."""

from __future__ import annotations

import numpy as np
import pytest

from profiles.drill.clock import Clock
from profiles.drill.waves import EastwardWaves, InstabilityWaves, Patches, WestwardWaves

YEARS = np.arange(0.0, 12.0 * 365.0)
CLOCK = Clock(YEARS, (YEARS / 365.0) % 1.0, 0.0)


def spread(field: np.ndarray) -> np.ndarray:
    return np.sqrt(np.mean(field**2, axis=-1))


def test_eastward_waves_grow_where_they_are_forced_and_are_trapped() -> None:
    # exp(-(2.9/2.9)**2/2) = 0.6065 one radius off the equator.
    latitude, longitude = np.array([0.0, 0.0, 2.9]), np.array([140.0, 215.0, 215.0])
    fields = [EastwardWaves.draw(seed).displacement(latitude, longitude, CLOCK) for seed in range(6)]
    west, east, off = np.mean([spread(field) for field in fields], axis=0)
    assert east == pytest.approx(EastwardWaves.SD, rel=0.1)
    assert west == pytest.approx(EastwardWaves.BEFORE * EastwardWaves.SD, rel=0.1)
    assert off / east == pytest.approx(0.6065, abs=0.01)


def test_westward_waves_are_largest_off_the_equator_and_none_on_it() -> None:
    latitude = np.array([0.0, 2.0, 4.0, -4.0])
    field = WestwardWaves.draw(3).displacement(latitude, np.full(4, 200.0), CLOCK)
    sizes = spread(field)
    assert sizes[0] == 0.0
    assert sizes[2] > sizes[1] > 1.0


def test_westward_waves_of_both_hemispheres_are_related_in_part() -> None:
    # 0.8 of one field and 0.6 of another with opposite signs: correlation 0.8**2 - 0.6**2 = 0.28.
    latitude, longitude = np.array([4.0, -4.0]), np.full(2, 200.0)
    fields = [WestwardWaves.draw(seed).displacement(latitude, longitude, CLOCK) for seed in range(10)]
    assert np.mean([np.corrcoef(field)[0, 1] for field in fields]) == pytest.approx(0.28, abs=0.1)


def test_lines_run_the_way_of_their_kind() -> None:
    assert np.all(EastwardWaves.draw(1).lines.eastward > 0.0)
    assert np.all(WestwardWaves.draw(1).both.eastward < 0.0)
    assert np.all(WestwardWaves.draw(1).opposite.eastward < 0.0)
    assert np.all(InstabilityWaves.draw(CLOCK, np.zeros(CLOCK.day.size), 1).lines.eastward < 0.0)


def test_instability_waves_have_their_periods_and_lengths() -> None:
    lines = InstabilityWaves.draw(CLOCK, np.zeros(CLOCK.day.size), 2).lines
    periods, lengths = 2.0 * np.pi / lines.frequency, -2.0 * np.pi / lines.eastward * 111.195
    assert periods.min() >= 20.0
    assert periods.max() <= 40.0
    assert lengths.min() >= 990.0
    assert lengths.max() <= 2000.0


def test_instability_waves_belong_to_the_east_the_cold_season_and_cold_years() -> None:
    where = np.array([2.5, 2.5]), np.array([180.0, 240.0])
    cold, warm = (InstabilityWaves.draw(CLOCK, np.full(CLOCK.day.size, warmth), 2) for warmth in (-1.0, 1.0))
    field = cold.displacement(*where, CLOCK)
    assert np.all(field[0] == 0.0)
    spring = (CLOCK.fraction > 0.2) & (CLOCK.fraction < 0.33)
    autumn = (CLOCK.fraction > 0.65) & (CLOCK.fraction < 0.85)
    assert spread(field[1, autumn]) > 5.0 * spread(field[1, spring])
    # (1 + tanh(1)/2) / (1 - tanh(1)/2) = 1.3808 / 0.6192 = 2.230.
    assert spread(field[1]) / spread(warm.displacement(*where, CLOCK)[1]) == pytest.approx(2.230, abs=0.001)


def test_patches_have_their_size() -> None:
    # Two independent parts: sqrt(5.5**2 + 5**2) = 7.43.
    field = [Patches.draw(seed).displacement(np.zeros(3), np.array([150.0, 200.0, 250.0]), CLOCK) for seed in range(8)]
    assert np.sqrt(np.mean(np.square(field))) == pytest.approx(7.43, rel=0.1)


def test_scales_of_patches_differ_from_the_default_covariance_of_the_map() -> None:
    # Meyers et al. (1991): 15 degrees of longitude, 3 of latitude.
    for name, scale in (("longitude", 15.0), ("latitude", 3.0)):
        assert scale / Patches.EDDIES[name] >= 1.5
        assert Patches.BROAD[name] / scale >= 1.5


def test_parts_do_not_depend_on_what_is_read_together() -> None:
    latitude, longitude = np.array([-2.5, 0.0, 4.5]), np.array([149.0, 201.0, 266.0])
    days = Clock(YEARS[:40], CLOCK.fraction[:40], 0.0)
    for part in (EastwardWaves.draw(7), WestwardWaves.draw(7), Patches.draw(7)):
        together = part.displacement(latitude, longitude, days)
        np.testing.assert_allclose(part.displacement(latitude[2:], longitude[2:], days), together[2:], atol=1e-9)
