"""Cells, areas and the band: edges by hand, areas that add up, land that does not count."""

from __future__ import annotations

import numpy as np
import pytest

from profiles.errors import DataError
from profiles.section.grid import (
    EARTH_RADIUS,
    KILOMETRES_PER_DEGREE,
    array_grid,
    band_weights,
    cell_area,
    cell_edges,
    check_longitude,
    sea_area,
)


def test_the_grid_fills_the_box_with_cells_of_a_degree():
    rows, columns = array_grid()
    np.testing.assert_array_equal(cell_edges(rows, "latitude"), np.arange(-5.0, 6.0))
    np.testing.assert_array_equal(cell_edges(columns, "longitude"), np.arange(120.0, 281.0))


def test_edges_lie_half_way_and_end_cells_are_as_wide_as_their_neighbours():
    np.testing.assert_array_equal(cell_edges(np.array([0.0, 2.0, 6.0]), "latitude"), [-1.0, 1.0, 4.0, 8.0])


@pytest.mark.parametrize("centres", [[1.0], [], [2.0, 1.0], [1.0, 1.0], [1.0, np.nan]])
def test_what_is_no_axis_is_refused(centres):
    with pytest.raises(DataError, match="latitude: no grid"):
        cell_edges(np.array(centres), "latitude")


def test_a_cell_has_the_area_of_the_sphere_between_its_edges():
    # A hemisphere's quarter: 4 pi R^2 / 8.
    octant = cell_area(np.array([0.0, 90.0]), np.array([0.0, 90.0]))
    np.testing.assert_allclose(octant, [[np.pi * EARTH_RADIUS**2 / 2]])
    # A degree square at the equator: (111.19 km)^2, its height 2 R sin(0.5 degrees).
    side = EARTH_RADIUS * np.pi / 180.0
    square = cell_area(np.array([-0.5, 0.5]), np.array([0.0, 1.0]))
    np.testing.assert_allclose(square, [[side * 2 * EARTH_RADIUS * np.sin(np.deg2rad(0.5))]])
    assert pytest.approx(side / 1000.0) == KILOMETRES_PER_DEGREE


def test_cells_are_cut_at_the_edges_of_the_box():
    # Centres on whole degrees about 170W, open sea: half of the end cells lies within 188E to 192E.
    columns = np.arange(188.0, 193.0)
    area = sea_area(np.array([0.0, 1.0, 2.0]), columns, south_north=(-5.0, 5.0), west_east=(188.0, 192.0))
    np.testing.assert_allclose(area[0] / area[0, 2], [0.5, 1.0, 1.0, 1.0, 0.5])


def test_regions_add_up_to_the_box():
    rows, columns = array_grid()
    west, east = (sea_area(rows, columns, west_east=edges) for edges in ((120.0, 205.0), (205.0, 280.0)))
    np.testing.assert_allclose(west + east, sea_area(rows, columns))


def test_land_has_no_sea_area():
    rows, columns = array_grid()
    share = sea_area(rows, columns) / cell_area(np.arange(-5.0, 6.0), np.arange(120.0, 281.0))
    assert share[:, 55].min() == 1.0  # 175.5E, open ocean
    assert share[1, 19] == 0.0  # 3.5S 139.5E, inside New Guinea
    assert 0.0 < share[4, 159] < 1.0  # 0.5S 279.5E, the coast of Ecuador
    assert share.min() >= 0.0
    assert share.max() <= 1.0


def test_band_weights_are_a_mean_over_the_rows_in_the_band():
    # Rows at -4.5 ... 4.5: the band 2.5S-2.5N holds the rows at -1.5 to 1.5 whole and half of those at 2.5.
    rows, columns = array_grid()
    weights = band_weights(rows, columns)[:, 60]
    np.testing.assert_allclose(weights, [0, 0, 0.1, 0.2, 0.2, 0.2, 0.2, 0.1, 0, 0], atol=2e-4)
    assert weights.sum() == pytest.approx(1.0)


def test_a_single_row_counts_whole_in_the_band_and_not_at_all_outside():
    np.testing.assert_array_equal(band_weights(np.array([0.0]), np.array([180.0, 190.0])), [[1.0, 1.0]])
    assert np.isnan(band_weights(np.array([4.0]), np.array([180.0]))).all()


@pytest.mark.parametrize("longitude", [[-170.0, 170.0], [170.0, 361.0], [np.nan]])
def test_longitudes_that_are_not_degrees_east_are_refused(longitude):
    with pytest.raises(DataError, match=r"longitude is out of range.*0 to 360"):
        check_longitude(np.array(longitude))
