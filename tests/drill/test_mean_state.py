"""Mean and season of the simulated ocean."""

from __future__ import annotations

import numpy as np
import pytest

from profiles.atlas import seasonal_profile
from profiles.drill.mean_state import DIFFERENCE_SD, MeanState
from profiles.drill.water_column import FINE_DEPTH
from profiles.errors import DataError

LATITUDE, LONGITUDE = (
    grid.ravel() for grid in np.meshgrid(np.arange(-4.5, 5.0), np.arange(121.0, 280.0, 2.0), indexing="ij")
)


def seeds_mean(count: int) -> np.ndarray:
    """Mean isotherm depth of some seeds, (seed, position)."""
    return np.array([MeanState.at(LATITUDE, LONGITUDE, seed).isotherm[:, 0] for seed in range(count)])


def test_mean_depth_differs_from_seed_to_seed_by_what_two_errors_make() -> None:
    # Two independent fields of 7 m: 7 sqrt(2) = 9.90 m.
    depth = seeds_mean(6)
    differences = [depth[a] - depth[b] for a in range(6) for b in range(a)]
    assert np.sqrt(np.mean(np.square(differences))) == pytest.approx(9.90, rel=0.1)


def test_mean_depth_differs_from_the_atlas_by_7_m() -> None:
    # The atlas's own 20 °C depth, linear between its levels; smoothing and interpolation add 2 to 3 m.
    profiles = seasonal_profile(LATITUDE, LONGITUDE)
    levels = profiles["depth"].values
    atlas = np.array([np.interp(-20.0, -row, levels) for row in profiles.values[:, 0]])
    for depth in seeds_mean(4):
        assert np.sqrt(np.mean((depth - atlas) ** 2)) == pytest.approx(DIFFERENCE_SD, rel=0.2)


def test_difference_has_its_rms_in_every_seed() -> None:
    # The mean over many seeds is what they have in common; 24 seeds leave 1/24 of the variance in it: 2 per cent.
    depth = seeds_mean(24)
    rms = np.sqrt(np.mean((depth - depth.mean(axis=0)) ** 2, axis=1))
    np.testing.assert_allclose(rms, DIFFERENCE_SD, rtol=0.12)


def test_depth_is_smooth_between_neighbours() -> None:
    longitude = np.arange(120.0, 280.0, 0.1)
    depth = MeanState.at(np.zeros(longitude.size), longitude, 1).isotherm[:, 0]
    assert np.abs(np.diff(depth)).max() < 1.0


def test_deep_water_is_the_atlas() -> None:
    # 300 m and deeper, on the equator at 235E: the atlas has 11.7 °C at 300 m, 8.3 at 500 m.
    profile = seasonal_profile([0.0], [235.0])
    deep = MeanState.at(np.zeros(1), np.array([235.0]), 2).deep[0]
    for level in (300.0, 500.0):
        expected = float(profile.sel(depth=level)[0, 0])
        assert deep[np.searchsorted(FINE_DEPTH, level)] == pytest.approx(expected, abs=0.2)


def test_deep_water_cools_downward() -> None:
    assert np.diff(MeanState.at(LATITUDE, LONGITUDE, 1).deep, axis=1).max() < 0.05


def test_shapes_are_those_of_columns() -> None:
    state = MeanState.at(LATITUDE, LONGITUDE, 1)
    west, east = (LONGITUDE < 190.0) & (LONGITUDE > 145.0), LONGITUDE > 250.0
    assert state.mixed_layer[west].mean() > 2.0 * state.mixed_layer[east].mean()
    assert state.exponent.min() > 1.0
    assert np.all((state.decay > 15.0) & (state.decay <= 60.0))


def test_positions_outside_are_refused() -> None:
    with pytest.raises(DataError, match="outside the simulated ocean"):
        MeanState.at(np.array([0.0, 7.5]), np.array([200.0, 200.0]), 1)
