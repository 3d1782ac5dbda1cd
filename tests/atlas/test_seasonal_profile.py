"""Seasonal profiles of the packaged atlas at positions."""

from __future__ import annotations

import numpy as np
import pytest
import xarray as xr
from hypothesis import given, settings
from hypothesis import strategies as st

from profiles.atlas import monthly_temperature, seasonal_profile
from profiles.errors import DataError
from profiles.statistics import HARMONICS, harmonic_design

MIDDLES = 2 * np.pi * (np.arange(12) + 0.5) / 12  # the months stand at their middle


def fourier(monthly: np.ndarray) -> np.ndarray:
    """Harmonics of twelve even steps by their sums, shape (harmonic, depth), from (month, depth).

    The mean is the average; a coefficient is 2/12 of the sum of the values times its cosine or sine.
    """
    waves = [np.cos(MIDDLES), np.sin(MIDDLES), np.cos(2 * MIDDLES), np.sin(2 * MIDDLES)]
    return np.stack([monthly.mean(axis=0), *(wave @ monthly / 6.0 for wave in waves)])


def at(latitude: float, longitude: float) -> np.ndarray:
    point = monthly_temperature().sel(latitude=latitude, longitude=longitude)
    return point.transpose("month", "depth").values.astype(np.float64)


def wet_points(count: int) -> list[tuple[float, float]]:
    field = monthly_temperature()
    wet = field.notnull().all(("month", "depth"))
    rows, columns = np.nonzero(wet.transpose("latitude", "longitude").values)
    chosen = np.linspace(0, rows.size - 1, count).astype(int)
    return [(float(wet["latitude"][rows[i]]), float(wet["longitude"][columns[i]])) for i in chosen]


def test_the_profile_at_an_atlas_point_is_the_atlas_s_own_cycle() -> None:
    points = wet_points(8)
    latitude, longitude = zip(*points, strict=True)
    ours = seasonal_profile(latitude, longitude)
    assert ours.dims == ("position", "harmonic", "depth")
    assert ours["harmonic"].values.tolist() == list(HARMONICS)
    np.testing.assert_array_equal(ours["depth"], monthly_temperature()["depth"])
    for profile, (row, column) in zip(ours.values, points, strict=True):
        np.testing.assert_allclose(profile, fourier(at(row, column)), rtol=0, atol=1e-9)


def test_the_cycle_evaluated_at_the_months_comes_close_to_them() -> None:
    # Five terms cannot hold twelve months; what is left is the third and higher harmonics. Their size is the check on
    # the phase: a cycle put at the beginning of the months instead of their middle would leave half a month's change.
    row, column = 0.5, 250.5
    ours = seasonal_profile(row, column)[0].values
    monthly = at(row, column)
    left = monthly - harmonic_design((np.arange(12) + 0.5) / 12) @ ours
    late = monthly - harmonic_design(np.arange(12) / 12) @ ours
    assert np.abs(left).mean() < np.abs(late).mean() < np.abs(monthly - monthly.mean(axis=0)).mean()


def test_between_four_points_the_profile_is_bilinear() -> None:
    # A quarter of the way north and three quarters of the way east: weights 0.75 and 0.25 times 0.25 and 0.75.
    south, west = 0.5, 200.5
    corners = [at(south + north, west + east) for north in (0, 2) for east in (0, 2)]
    weights = [0.75 * 0.25, 0.75 * 0.75, 0.25 * 0.25, 0.25 * 0.75]
    expected = sum(weight * fourier(corner) for weight, corner in zip(weights, corners, strict=True))
    np.testing.assert_allclose(seasonal_profile(south + 0.5, west + 1.5)[0], expected, rtol=0, atol=1e-9)


def coast() -> tuple[float, float]:
    """A south-western corner of four atlas points at the surface of which some, not all, are wet."""
    field = monthly_temperature()
    wet = np.isfinite(field.isel(month=0, depth=0).transpose("latitude", "longitude").values)
    count = wet[:-1, :-1] + 0 + wet[1:, :-1] + wet[:-1, 1:] + wet[1:, 1:]
    row, column = np.argwhere((count > 0) & (count < 4))[0]
    return float(field["latitude"][row]), float(field["longitude"][column])


def test_between_wet_and_dry_points_the_wet_ones_share_the_weight() -> None:
    south, west = coast()
    corners = np.array([fourier(at(south + north, west + east))[:, 0] for north in (0, 2) for east in (0, 2)])
    # In the middle all four weigh the same, so the mean of the wet ones stands.
    np.testing.assert_allclose(
        seasonal_profile(south + 1.0, west + 1.0)[0, :, 0], np.nanmean(corners, axis=0), rtol=0, atol=1e-9
    )


def test_a_position_on_land_takes_the_nearest_wet_point() -> None:
    field = monthly_temperature().astype(np.float64)
    land_latitude, land_longitude = -5.0, 141.3  # New Guinea
    assert all(np.isnan(at(row, column)[0, 0]) for row in (-5.5, -3.5) for column in (140.5, 142.5))
    ours = seasonal_profile(land_latitude, land_longitude)[0].values
    for level, depth in enumerate(field["depth"].values):
        layer = field.sel(depth=depth).transpose("latitude", "longitude", "month").values
        distance = np.hypot(
            field["latitude"].values[:, None] - land_latitude, field["longitude"].values - land_longitude
        )
        distance[np.isnan(layer[..., 0])] = np.inf
        nearest = np.argwhere(np.isclose(distance, distance.min()))
        candidates = [fourier(layer[row, column][:, None])[:, 0] for row, column in nearest]
        assert any(np.allclose(ours[:, level], candidate, rtol=0, atol=1e-9) for candidate in candidates), depth


@settings(max_examples=30)
@given(st.floats(-9.0, 9.0), st.floats(117.0, 289.0))
def test_every_position_has_water_at_every_depth(latitude: float, longitude: float) -> None:
    assert np.isfinite(seasonal_profile(latitude, longitude)).all()


def test_positions_do_not_influence_each_other() -> None:
    together = seasonal_profile([0.3, -3.0, 4.5], [170.2, 141.0, 264.9])
    alone = xr.concat([seasonal_profile(*pair) for pair in [(0.3, 170.2), (-3.0, 141.0), (4.5, 264.9)]], "position")
    xr.testing.assert_equal(together, alone)


def test_the_edges_of_the_atlas_are_inside() -> None:
    field = monthly_temperature()
    corners = [(float(field["latitude"][i]), float(field["longitude"][j])) for i in (0, -1) for j in (0, -1)]
    assert np.isfinite(seasonal_profile(*zip(*corners, strict=True))).all()


@pytest.mark.parametrize(
    ("latitude", "longitude"),
    [(11.0, 200.0), (-11.0, 200.0), (0.0, 100.0), (0.0, 300.0), (0.0, -95.0), (np.nan, 200.0)],
)
def test_a_position_beyond_the_atlas_is_refused(latitude: float, longitude: float) -> None:
    found = f"found {latitude:g} degrees north, {longitude:g} degrees east"
    with pytest.raises(DataError, match=f"outside the packaged atlas; expected .*; {found}"):
        seasonal_profile([0.0, latitude], [200.0, longitude])


def test_the_western_pool_is_warm_and_the_thermocline_shoals_eastward() -> None:
    # Common practice, no source: the surface of the western pool is above 28 °C; at 100 m the west is warmer than the
    # east.
    mean = seasonal_profile([0.0, 0.0], [160.0, 260.0]).sel(harmonic="mean")
    assert mean.isel(position=0, depth=0) > 28.0
    at_100 = mean.sel(depth=100.0)
    assert at_100[0] > at_100[1] + 5.0
