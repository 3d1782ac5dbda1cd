"""The volume: constant depths, regions, coverage, cut cells, and its error."""

from __future__ import annotations

import numpy as np
import pytest
import xarray as xr

from profiles import objective_map, warm_water_volume
from profiles.errors import DataError, RequestError
from profiles.section.functional import functional_error
from profiles.section.grid import REGIONS, array_grid, sea_area

ROWS, COLUMNS = array_grid()


def field(depth, rows=ROWS, columns=COLUMNS, times=1):
    values = np.broadcast_to(depth, (times, rows.size, columns.size)).astype(float)
    return xr.DataArray(
        values.copy(), dims=("time", "latitude", "longitude"), coords={"latitude": rows, "longitude": columns}
    )


def volume(depth_field, region="total"):
    return warm_water_volume(depth_field, region=region)["warm_water_volume"].values


def mapped(values):
    latitude, longitude = np.array([-2.5, 0.0, 2.5] * 4), np.repeat([150.0, 185.0, 220.0, 262.0], 3)
    scales = {"signal_sd": 12.0, "noise_sd": 4.0, "length_longitude": 15.0, "length_latitude": 3.0}
    return objective_map(values, latitude, longitude, ROWS, COLUMNS, **scales)


@pytest.mark.parametrize("region", list(REGIONS))
def test_a_constant_depth_gives_depth_times_sea_area(region):
    area = sea_area(ROWS, COLUMNS, west_east=REGIONS[region]).sum()
    np.testing.assert_allclose(volume(field(120.0), region), [120.0 * area])


def test_west_and_east_add_up_to_the_total():
    depth = field(np.random.default_rng(1).uniform(20, 180, (ROWS.size, COLUMNS.size)), times=3)
    np.testing.assert_allclose(volume(depth, "west") + volume(depth, "east"), volume(depth))


def test_volume_is_linear_in_depth():
    random = np.random.default_rng(2)
    one, other = (field(random.uniform(20, 180, (ROWS.size, COLUMNS.size))) for _ in range(2))
    np.testing.assert_allclose(volume(2.0 * one - 3.0 * other), 2.0 * volume(one) - 3.0 * volume(other))


def test_depth_on_land_does_not_count():
    area = sea_area(ROWS, COLUMNS)
    assert (area == 0.0).any()
    np.testing.assert_allclose(volume(field(np.where(area > 0.0, 100.0, 1e6))), volume(field(100.0)))


def test_missing_land_is_no_lack_of_cover():
    masked = field(np.where(sea_area(ROWS, COLUMNS) > 0.0, 100.0, np.nan))
    found = warm_water_volume(masked)
    assert found["covered_share"].item() == pytest.approx(1.0)
    np.testing.assert_allclose(found["warm_water_volume"], volume(field(100.0)))


def test_a_small_hole_is_made_up_for_and_stated():
    depth = field(100.0)
    depth[0, :, 60:64] = np.nan  # 4 of 160 columns, all of them sea: about 2.6 % of the sea
    found = warm_water_volume(depth)
    area = sea_area(ROWS, COLUMNS)
    assert found["covered_share"].item() == pytest.approx(1.0 - area[:, 60:64].sum() / area.sum())
    np.testing.assert_allclose(found["warm_water_volume"], volume(field(100.0)))


def test_a_large_hole_leaves_no_volume():
    depth = field(100.0, times=2)
    depth[0, :, 60:70] = np.nan
    found = warm_water_volume(depth)
    assert found["covered_share"].values[0] < 0.95
    np.testing.assert_array_equal(found["warm_water_volume"].isnull(), [True, False])
    # The hole lies in the west: the east does not suffer.
    assert not warm_water_volume(depth, region="east")["warm_water_volume"].isnull().any()


def test_a_field_that_covers_half_the_box_covers_half_of_it():
    east = field(100.0, columns=np.arange(205.5, 280.0))
    assert warm_water_volume(east, region="east")["covered_share"].item() == pytest.approx(1.0)
    np.testing.assert_allclose(volume(east, "east"), volume(field(100.0), "east"))


@pytest.mark.parametrize("region", list(REGIONS))
def test_a_grid_whose_cells_straddle_the_edges_has_the_same_volume(region):
    # Centres on whole degrees: cells half outside at 5S, 5N, 120E, 80W and across 155W are cut there.
    whole = field(100.0, rows=np.arange(-6.0, 7.0), columns=np.arange(118.0, 283.0))
    np.testing.assert_allclose(volume(whole, region), volume(field(100.0), region), rtol=2e-4)


def test_a_bare_field_has_no_error_and_says_why():
    error = warm_water_volume(field(100.0))["warm_water_volume_error"]
    assert error.isnull().all()
    assert "does not tell the covariance" in error.attrs["reason"]
    assert error.attrs["units"] == "m3"


@pytest.mark.parametrize("region", list(REGIONS))
def test_the_error_of_a_map_is_that_of_the_area_sum(region):
    values = np.random.default_rng(3).normal(0, 12, (2, 12))
    values[1, :5] = np.nan
    mapped_field = mapped(values)
    area = sea_area(ROWS, COLUMNS, west_east=REGIONS[region])
    found = warm_water_volume(mapped_field, region=region)
    np.testing.assert_allclose(found["warm_water_volume_error"], functional_error(mapped_field, area[None])[:, 0])
    np.testing.assert_allclose(found["warm_water_volume"], (mapped_field["mean"] * area).sum(("latitude", "longitude")))
    assert found["warm_water_volume_error"][0] < found["warm_water_volume_error"][1]
    assert found["region"].item() == region


def test_a_region_that_there_is_not_is_refused():
    with pytest.raises(RequestError, match=r"region: no such region.*total, west, east.*'north'"):
        warm_water_volume(field(100.0), region="north")


def test_a_field_that_is_no_map_or_lies_elsewhere_is_refused():
    with pytest.raises(DataError, match="the field is no map"):
        warm_water_volume(field(100.0).isel(latitude=0))
    with pytest.raises(DataError, match="does not reach the region"):
        warm_water_volume(field(100.0, columns=np.arange(125.5, 190.0)), region="east")
    with pytest.raises(DataError, match="out of range"):
        warm_water_volume(field(100.0, columns=COLUMNS - 200.0))
