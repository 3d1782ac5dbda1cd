"""The simulated ocean as a whole."""

from __future__ import annotations

import numpy as np
import pytest

from profiles.atlas import annual_mean
from profiles.drill.demo import days
from profiles.drill.ocean import Columns, Ocean, mean_and_season
from profiles.drill.water_column import FINE_DEPTH
from profiles.errors import DataError

TIME = days("2031-01-01", "2031-12-31")
LATITUDE, LONGITUDE = np.array([-2.5, 0.0, 4.5, -2.5]), np.array([149.0, 201.0, 240.0, 266.0])


@pytest.fixture(scope="module")
def columns() -> Columns:
    return Ocean.simulate(TIME, 5).columns(LATITUDE, LONGITUDE)


def crossing(temperature: np.ndarray) -> float:
    """Shallowest depth of 20 °C on the fine grid, by numpy.interp on the two levels around it."""
    if temperature[0] < 20.0:
        return 0.0
    below = int(np.argmax(temperature < 20.0))
    pair = slice(below - 1, below + 1)
    return float(np.interp(20.0, temperature[pair][::-1], FINE_DEPTH[pair][::-1]))


@pytest.mark.parametrize("position", range(4))
def test_true_isotherm_depth_is_the_crossing_of_the_true_temperature(columns: Columns, position: int) -> None:
    temperature = columns.temperature(position, FINE_DEPTH)
    expected = [crossing(profile) for profile in temperature]
    np.testing.assert_allclose(columns.isotherm_depth()[position], expected, rtol=0, atol=1e-9)


def test_isotherm_moves_by_its_displacement_where_it_is_deep(columns: Columns) -> None:
    # Centimetres remain: the profile is read off a 2 m grid.
    moved = columns.isotherm_depth()[0] - columns.base[0]
    np.testing.assert_allclose(moved, columns.displacement[0], rtol=0, atol=0.1)


def test_far_east_outcrops_in_its_cold_season_alone(columns: Columns) -> None:
    # Common practice, no source: the cold tongue is coldest about September.
    outcropped = columns.isotherm_depth()[3] == 0.0
    months = TIME[outcropped].astype("datetime64[M]").astype(int) % 12 + 1
    assert 0 < outcropped.sum() < 120
    assert set(months) <= {7, 8, 9, 10, 11}


def test_surface_of_the_western_pool_is_above_28_degrees() -> None:
    # Common practice, no source.
    ocean = Ocean.simulate(TIME, 8)
    surface = ocean.columns([0.0, 2.5, -2.5], [149.0, 149.0, 162.0])
    for position in range(3):
        assert surface.temperature(position, [0.0]).min() > 28.0


def test_annual_mean_of_the_base_column_is_the_atlas() -> None:
    # Levitus (1982), NOAA Professional Paper 13, at one of its own points, on its own levels.
    mean = annual_mean()["temperature"].sel(latitude=0.5, longitude=200.5)
    mean = mean.sel(depth=(mean["depth"] <= 600.0) & (mean["depth"] % 2.0 == 0.0))  # the levels of the 2 m grid
    levels = np.searchsorted(FINE_DEPTH, mean["depth"].values)
    base = mean_and_season(np.array([0.5]), np.array([200.5]))[0, 0]
    np.testing.assert_allclose(base[levels], mean.values, rtol=0, atol=1e-4)


def test_small_scales_leave_the_large_scale_alone(columns: Columns) -> None:
    before = columns.isotherm_depth()
    after = columns.displaced_by(np.full(columns.base.shape, 5.0))
    np.testing.assert_allclose(after.isotherm_depth()[0], before[0] + 5.0, rtol=0, atol=0.1)
    np.testing.assert_array_equal(columns.isotherm_depth(), before)


def test_same_seed_gives_the_same_ocean_and_another_seed_another() -> None:
    first, again, other = (
        Ocean.simulate(TIME[:30], seed).columns(LATITUDE, LONGITUDE).isotherm_depth() for seed in (1, 1, 2)
    )
    np.testing.assert_array_equal(first, again)
    assert np.abs(first - other)[0].max() > 1.0


def test_columns_beyond_the_atlas_are_refused() -> None:
    with pytest.raises(DataError, match="outside the packaged atlas"):
        Ocean.simulate(TIME[:2], 1).columns([0.0], [20.0])
