"""The truth's section, slope and volume on fields whose answers are known."""

from __future__ import annotations

import numpy as np
import pytest

from profiles.drill.sphere import METRES_PER_DEGREE, cell_areas
from profiles.drill.truth import LATITUDE, LONGITUDE, equatorial_section, monthly_means, slope, volumes

ALL_SEA = np.ones((10, 160))


def uniform(depth: float) -> np.ndarray:
    return np.full((1, 10, 160), depth)


def test_cell_area_is_that_of_the_spherical_zone() -> None:
    # A quarter of the sphere, 2 pi R^2 over 180 degrees of longitude, R = 6371 km: 2.5503e14 m2.
    area = cell_areas(np.array([-90.0]), np.array([90.0]), 180.0)[0]
    assert area == pytest.approx(2.0 * np.pi * 6.371e6**2, rel=1e-12)


def test_cell_without_height_has_no_area() -> None:
    assert cell_areas(np.array([3.0]), np.array([2.5]), 1.0)[0] == 0.0


def test_volume_of_one_metre_is_the_area_of_the_box() -> None:
    # Computed for the sphere of 6371 km: box 1.9758e13 m2, west 1.0496e13, east 0.9261e13.
    volume = volumes(uniform(1.0), ALL_SEA)
    assert volume["total"][0] == pytest.approx(1.9758e13, rel=5e-5)
    assert volume["west"][0] == pytest.approx(1.0496e13, rel=5e-5)
    assert volume["east"][0] == pytest.approx(0.9261e13, rel=1e-4)


def test_halves_add_up_to_the_whole() -> None:
    depth = np.random.default_rng(1).uniform(30.0, 200.0, (3, 10, 160))
    share = np.random.default_rng(2).uniform(0.0, 1.0, (10, 160))
    volume = volumes(depth, share)
    np.testing.assert_allclose(volume["west"] + volume["east"], volume["total"], rtol=1e-12)


def test_land_holds_no_warm_water() -> None:
    share = ALL_SEA.copy()
    share[:, :80] = 0.0
    # Half the longitudes are left: half the volume.
    assert volumes(uniform(7.0), share)["total"][0] == pytest.approx(0.5 * 7.0 * 1.9758e13, rel=5e-5)


def test_section_is_the_mean_of_the_cells_within_2_5_degrees() -> None:
    # Depth equals |latitude| of the centre: cells 0.5 and 1.5 whole, half of 2.5: (0.5 + 1.5 + 2.5/2) / 2.5 = 1.3,
    # a little less by the area, which shrinks with latitude: by area 1.29980.
    depth = np.broadcast_to(np.abs(LATITUDE)[:, None], (1, 10, 160)).copy()
    edges = np.sin(np.radians([0.0, 1.0, 2.0, 2.5]))
    expected = np.dot(np.diff(edges), [0.5, 1.5, 2.5]) / edges[-1]
    assert expected == pytest.approx(1.29980, abs=1e-5)
    np.testing.assert_allclose(equatorial_section(depth, ALL_SEA), expected, rtol=1e-12)


def test_section_leaves_land_out_and_is_missing_where_there_is_no_sea() -> None:
    depth = np.broadcast_to(np.where(LATITUDE > 0.0, 100.0, 50.0)[:, None], (1, 10, 160)).copy()
    share = ALL_SEA.copy()
    share[:5, 10] = 0.0
    share[:, 11] = 0.0
    section = equatorial_section(depth, share)[0]
    assert section[9] == pytest.approx(75.0)
    assert section[10] == pytest.approx(100.0)
    assert np.isnan(section[11])


def test_slope_of_a_line_is_its_slope() -> None:
    # 1 m a degree is 1e6 / 111194.93 = 8.99320 m per 1000 km on the sphere of 6371 km.
    section = np.stack([-1.0 * LONGITUDE, 0.5 * LONGITUDE])
    np.testing.assert_allclose(slope(section), [-8.99320, 4.49660], rtol=0, atol=1e-4)
    assert pytest.approx(111194.93, abs=0.01) == METRES_PER_DEGREE


def test_slope_sees_its_window_alone() -> None:
    section = np.where((LONGITUDE > 165.0) & (LONGITUDE < 265.0), 80.0, 500.0)[None, :]
    assert slope(section)[0] == pytest.approx(0.0, abs=1e-9)


def test_monthly_mean_is_that_of_the_days_and_stands_in_the_middle() -> None:
    time = np.arange("2031-01-01", "2031-03-01", dtype="datetime64[D]").astype("datetime64[ns]")
    daily = np.concatenate([np.full(31, 10.0), np.arange(28.0)])[None, :]
    middle, means = monthly_means(time, daily)
    # January has 31 days: its middle is the 16th at noon; February, 28 days, the 15th at midnight.
    # The mean of 0 to 27 is 13.5.
    assert list(middle.astype("datetime64[h]").astype(str)) == ["2031-01-16T12", "2031-02-15T00"]
    np.testing.assert_allclose(means, [[10.0, 13.5]])
