"""Areas and distances against figures worked out beforehand and against geodesics on the ellipsoid."""

from __future__ import annotations

import numpy as np
import pytest
import xarray as xr
from geographiclib.geodesic import Geodesic

from profiles import thermocline_slope, warm_water_volume
from profiles.section.grid import KILOMETRES_PER_DEGREE, REGIONS, array_grid, cell_area, sea_area


def box(region):
    """Return the area of a region on the sphere, land and all, m2."""
    west, east = REGIONS[region]
    return cell_area(np.array([-5.0, 5.0]), np.array([west, east])).item()


def test_the_box_has_its_area_on_the_sphere():
    """Sphere of 6371 km: 1.9758e13 m2, west 1.0496e13, east 0.9261e13 (worked out for the design)."""
    assert box("total") == pytest.approx(1.9758e13, rel=5e-5)
    assert box("west") == pytest.approx(1.0496e13, rel=5e-5)
    assert box("east") == pytest.approx(0.9261e13, rel=5e-4)
    assert box("west") / box("total") == pytest.approx(0.53, abs=0.005)


def test_the_box_on_the_ellipsoid_differs_by_less_than_a_percent():
    """Karney (2013), J. Geodesy 87, 43-55, geodesic polygons on WGS 84; the parallels in steps of a degree, since
    between two points of a parallel the geodesic is not that parallel."""
    polygon = Geodesic.WGS84.Polygon()
    for longitude in np.arange(120.0, 281.0):
        polygon.AddPoint(-5.0, longitude)
    for longitude in np.arange(280.0, 119.0, -1.0):
        polygon.AddPoint(5.0, longitude)
    area = abs(polygon.Compute()[2])
    assert box("total") == pytest.approx(area, rel=0.007)
    assert box("total") != pytest.approx(area, rel=0.001)  # the sphere is not the ellipsoid


def test_a_metre_of_depth_over_the_whole_box_is_a_fifth_of_1e14_cubic_metres():
    """1 m is 0.198e14 m3 over the box; land takes about a twentieth of it. Mean depths of 110 and 130 m: 21.7 and 25.7
    (worked out for the design)."""
    assert box("total") / 1e14 == pytest.approx(0.198, abs=0.0005)
    assert 110 * box("total") / 1e14 == pytest.approx(21.7, abs=0.05)
    assert 130 * box("total") / 1e14 == pytest.approx(25.7, abs=0.05)
    rows, columns = array_grid()
    metre = xr.DataArray(
        np.ones((1, rows.size, columns.size)),
        dims=("time", "latitude", "longitude"),
        coords={"latitude": rows, "longitude": columns},
    )
    volume = warm_water_volume(metre)["warm_water_volume"].item()
    assert volume == pytest.approx(sea_area(rows, columns).sum())
    assert 0.93 < volume / box("total") < 1.0


def test_distances_along_the_equator():
    """165E to 110W is 9452 km, 165E to 95W 11 119 km on the sphere (worked out for the design)."""
    shorter, longer = np.array([85.0, 100.0]) * KILOMETRES_PER_DEGREE
    assert shorter == pytest.approx(9452, abs=1)
    assert longer == pytest.approx(11119.5, abs=1)
    steps = np.arange(165.0, 250.0, 5.0)
    ellipsoid = sum(Geodesic.WGS84.Inverse(0.0, west, 0.0, west + 5.0)["s12"] for west in steps)
    assert shorter == pytest.approx(ellipsoid / 1000.0, rel=0.002)


def test_a_drop_of_110_m_from_165e_to_110w_is_11_6_m_per_1000_km():
    """Worked out for the design from a drop quoted from memory."""
    longitude = np.arange(165.0, 251.0)
    line = xr.DataArray(
        [160.0 - 110.0 * (longitude - 165.0) / 85.0], dims=("time", "longitude"), coords={"longitude": longitude}
    )
    slope = thermocline_slope(line, window=(165.0, 250.0))["thermocline_slope"].item()
    assert slope == pytest.approx(-11.6, abs=0.05)
