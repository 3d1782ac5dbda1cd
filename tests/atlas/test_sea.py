"""The share of sea in cells, from the packaged relief."""

from __future__ import annotations

import numpy as np
import pytest

from profiles.atlas import relief, sea_share


def one_cell(south: float, north: float, west: float, east: float) -> float:
    return float(sea_share(np.array([south, north]), np.array([west, east]))[0, 0])


def test_the_open_ocean_is_all_sea_and_the_inland_none() -> None:
    assert one_cell(-0.5, 0.5, 199.5, 200.5) == 1.0  # 0N 160W
    assert one_cell(-6.0, -5.0, 142.0, 143.0) == 0.0  # New Guinea
    assert one_cell(-3.0, -2.0, 285.0, 286.0) == 0.0  # South America


def test_the_galapagos_take_part_of_their_cell() -> None:
    # Isabela, the largest island of the Galapagos, lies in 1S-0, 91.5W-90.7W (any map).
    assert 0.3 < one_cell(-1.0, 0.0, 268.0, 270.0) < 0.95
    assert one_cell(-1.0, 0.0, 262.0, 264.0) == 1.0  # as far again to the west there is no island


def test_the_ocean_share_of_the_equatorial_box_is_the_published_relief_s() -> None:
    # ETOPO5, Data Announcement 88-MGG-02, NOAA National Geophysical Data Center (1988): the ocean share of 5S-5N,
    # 120E-80W by area is 0.970 in it (tests/reference/README.md).
    latitude, longitude = np.arange(-5.0, 5.1), np.arange(120.0, 280.1)
    area = np.diff(np.sin(np.radians(latitude)))[:, None] * np.ones(longitude.size - 1)
    share = sea_share(latitude, longitude)
    assert np.sum(share * area) / np.sum(area) == pytest.approx(0.970, abs=5e-4)


def test_a_cell_counts_its_points_by_hand() -> None:
    # Two cells by a quarter degree: 5-minute points at whole twelfths, so each cell holds two points inside and one on
    # either edge that counts half, in both directions: weights 1/2, 1, 1, 1/2 out of 3.
    field = relief().sel(latitude=slice(-0.51, -0.24), longitude=slice(268.49, 268.76))
    assert field.shape == (4, 4)
    weights = np.array([0.5, 1.0, 1.0, 0.5]) / 3.0
    expected = weights @ (field.values < 0.0) @ weights
    assert one_cell(-0.5, -0.25, 268.5, 268.75) == pytest.approx(expected, abs=1e-12)
    assert 0.0 < expected < 1.0


def test_halves_of_a_cell_average_to_the_cell() -> None:
    # An edge point counts half on either side, so what is cut in two keeps its sum.
    edges = np.array([-1.0, -0.5, 0.0])
    parts = sea_share(edges, np.array([268.0, 269.0, 270.0]))
    assert parts.shape == (2, 2)
    assert parts.mean() == pytest.approx(one_cell(-1.0, 0.0, 268.0, 270.0), abs=1e-12)


def test_rows_are_latitudes_and_columns_longitudes() -> None:
    # Of the four cells, only the one in the south-west holds New Guinea.
    share = sea_share(np.array([-6.0, -5.0, 6.0]), np.array([142.0, 143.0, 200.0]))
    assert share[0, 0] == 0.0
    assert share[0, 1] > 0.5
    assert share[1, 0] > 0.5


def test_a_cell_without_a_point_is_nan() -> None:
    assert np.isnan(one_cell(-0.5, 0.5, 300.0, 301.0))
