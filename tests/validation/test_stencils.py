"""Positions among grid points: bilinear among wet points, the nearest wet one else."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from profiles.validation.stencils import spacing, stencil

ROWS, COLUMNS = np.array([-2.0, 0.0, 2.0, 4.0]), np.array([200.0, 201.0, 202.0, 203.0, 204.0])
WET = np.ones((4, 5), bool)


def weighted(found, values):
    return (values[found.row, found.column] * found.weight).sum(axis=1)


def at(latitude, longitude, wet=WET, grid=(ROWS, COLUMNS), nearest_wet=100.0):
    return stencil(*grid, wet, np.atleast_1d(latitude), np.atleast_1d(longitude), nearest_wet=nearest_wet)


def test_weights_are_those_of_the_opposite_areas():
    # A quarter of the way north in a cell 2 degrees high, six tenths east: (1 - .25)(1 - .6) = 0.3, 0.45, 0.1, 0.15.
    found = at(0.5, 201.6)
    assert found.row.tolist() == [[1, 1, 2, 2]]
    assert found.column.tolist() == [[1, 2, 1, 2]]
    np.testing.assert_allclose(found.weight, [[0.3, 0.45, 0.1, 0.15]])
    assert found.distance == 0.0


def test_dry_points_hand_their_weight_to_the_wet_ones():
    wet = WET.copy()
    wet[1, 2] = False  # of the weights above 0.45 is lost; 0.3, 0.1, 0.15 over 0.55
    np.testing.assert_allclose(at(0.5, 201.6, wet).weight, [[0.3 / 0.55, 0.0, 0.1 / 0.55, 0.15 / 0.55]])


def test_a_position_on_a_point_takes_that_point_alone():
    found = at(2.0, 203.0)
    assert found.weight.max() == 1.0
    assert (found.weight > 0.0).sum() == 1


def test_land_all_about_takes_the_nearest_wet_point_and_says_how_far_it_is():
    wet = np.zeros_like(WET)
    wet[3, 4] = True
    # From 4N 203E to 4N 204E: 6371 km times cos(4 degrees) times 1 degree in radians, 110.9 km.
    far = at(4.0, 203.0, wet, nearest_wet=120.0)
    np.testing.assert_allclose(far.distance, 6371.0 * np.cos(np.deg2rad(4.0)) * np.deg2rad(1.0), rtol=1e-4)
    assert (far.row[0, 0], far.column[0, 0], far.weight[0, 0]) == (3, 4, 1.0)
    assert at(4.0, 203.0, wet, nearest_wet=100.0).weight.sum() == 0.0


def test_no_water_at_all_gives_no_weight():
    found = at(0.0, 201.0, np.zeros_like(WET))
    assert found.weight.sum() == 0.0
    assert np.isinf(found.distance).all()


def test_descending_rows_give_the_same():
    up, down = at(0.5, 201.6), at(0.5, 201.6, grid=(ROWS[::-1].copy(), COLUMNS))
    values = np.arange(20.0).reshape(4, 5)
    np.testing.assert_allclose(weighted(up, values), weighted(down, values[::-1]))


@given(north=st.floats(-1.9, 3.9), east=st.floats(200.1, 203.9), turn=st.floats(-0.4, 0.4))
def test_a_turned_grid_gives_a_plane_back(north, east, turn):
    """Bilinear interpolation is exact for a + b lat + c lon, whatever the shape of the cells."""
    y, x = np.meshgrid(ROWS, COLUMNS, indexing="ij")
    latitude, longitude = y + turn * (x - 202.0), x - turn * (y - 1.0)
    place = north + turn * (east - 202.0), east - turn * (north - 1.0)
    found = at(*place, grid=(latitude, longitude))
    assert found.distance == 0.0
    np.testing.assert_allclose(weighted(found, latitude), place[0], atol=1e-6)
    np.testing.assert_allclose(weighted(found, longitude), place[1], atol=1e-6)


def test_a_curvilinear_grid_may_wrap_at_the_date_line():
    latitude, longitude = np.meshgrid(ROWS, np.array([178.0, 179.0, -180.0, -179.0, -178.0]), indexing="ij")
    found = at(1.0, 180.5, grid=(latitude, longitude))
    np.testing.assert_allclose(found.weight.sum(), 1.0)
    assert set(found.column[found.weight > 0]) == {2, 3}


@pytest.mark.parametrize("curvilinear", [False, True])
def test_spacing_is_that_of_the_points(curvilinear):
    grid = np.meshgrid(ROWS, COLUMNS, indexing="ij") if curvilinear else (ROWS, COLUMNS)
    assert spacing(*grid) == (2.0, 1.0)
