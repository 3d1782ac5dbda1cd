"""The tilt: lines of known slope, the window, what is missing, and its error."""

from __future__ import annotations

import numpy as np
import pytest
import xarray as xr

from profiles import objective_map, thermocline_slope
from profiles.errors import DataError, RequestError
from profiles.section.functional import functional_error
from profiles.section.grid import array_grid
from profiles.section.tilt import section_weights

# One degree of the equator on a sphere of 6371 km: 2 pi 6371 / 360 = 111.1949 km.
PER_DEGREE = 0.1111949
LONGITUDE = np.arange(120.5, 280.0)


def section(*slopes, level=150.0):
    """Return straight sections of the given slopes, m per 1000 km."""
    lines = [level + slope * PER_DEGREE * (LONGITUDE - 120.5) for slope in slopes]
    return xr.DataArray(np.array(lines), dims=("time", "longitude"), coords={"longitude": LONGITUDE})


def mapped(values=None, **settings):
    rows, columns = array_grid()
    latitude = np.array([-2.5, 0.0, 2.5] * 6)
    longitude = np.repeat([150.0, 170.0, 190.0, 210.0, 230.0, 262.0], 3)
    values = np.zeros((1, 18)) if values is None else values
    scales = {"signal_sd": 12.0, "noise_sd": 4.0, "length_longitude": 15.0, "length_latitude": 3.0}
    return objective_map(values, latitude, longitude, rows, columns, **(scales | settings))


def test_a_straight_line_has_its_slope_and_shoaling_eastward_is_negative():
    found = thermocline_slope(section(-11.0, 0.0, 4.0))["thermocline_slope"]
    np.testing.assert_allclose(found, [-11.0, 0.0, 4.0], rtol=1e-6, atol=1e-12)
    assert found.attrs["units"] == "m (1000 km)-1"


@pytest.mark.parametrize("window", [(165.0, 265.0), (140.0, 180.0), (160.5, 162.5)])
def test_only_the_window_counts_and_it_is_stated(window):
    bent = section(-11.0)
    inside = (bent["longitude"] >= window[0]) & (bent["longitude"] <= window[1])
    found = thermocline_slope(bent.where(inside, 999.0), window=window)
    assert found["thermocline_slope"].item() == pytest.approx(-11.0, rel=1e-6)
    for name in ("thermocline_slope", "thermocline_slope_error"):
        assert found[name].attrs["window"] == f"{window[0]:g} to {window[1]:g} degrees east"
        assert found[name].attrs["window_degrees_east"] == list(window)


def test_both_ends_of_the_window_count():
    # Three points at 170, 180, 190E: the slope is (last - first) / 20 degrees; without an end there would be two.
    three = xr.DataArray([[140.0, 0.0, 100.0]], dims=("time", "longitude"), coords={"longitude": [170.0, 180.0, 190.0]})
    found = thermocline_slope(three, window=(170.0, 190.0))["thermocline_slope"].item()
    assert found == pytest.approx(-40.0 / (20 * PER_DEGREE), rel=1e-6)


def test_the_line_is_unweighted_least_squares():
    noisy = section(-11.0)
    noisy += np.random.default_rng(4).normal(0, 20, noisy.shape)
    inside = (LONGITUDE >= 165.0) & (LONGITUDE <= 265.0)
    expected = np.polyfit(LONGITUDE[inside] * PER_DEGREE, noisy.values[0, inside], 1)[0]
    assert thermocline_slope(noisy)["thermocline_slope"].item() == pytest.approx(expected, rel=1e-6)


def test_a_longitude_that_never_has_a_value_is_left_out():
    holed = section(-11.0, -6.0).where(np.abs(LONGITUDE - 200.5) > 3.0)
    np.testing.assert_allclose(thermocline_slope(holed)["thermocline_slope"], [-11.0, -6.0], rtol=1e-6)


def test_a_time_that_lacks_a_longitude_others_have_has_no_slope():
    holed = section(-11.0, -6.0)
    holed[1, 80] = np.nan
    found = thermocline_slope(holed)["thermocline_slope"]
    assert found.values[0] == pytest.approx(-11.0, rel=1e-6)
    assert np.isnan(found.values[1])


def test_a_missing_longitude_outside_the_window_does_not_matter():
    holed = section(-11.0, -6.0)
    holed[1, 2] = np.nan
    np.testing.assert_allclose(thermocline_slope(holed)["thermocline_slope"], [-11.0, -6.0], rtol=1e-6)


def test_a_bare_section_has_no_error_and_says_why():
    error = thermocline_slope(section(-11.0))["thermocline_slope_error"]
    assert error.isnull().all()
    assert "does not tell the covariance" in error.attrs["reason"]


def test_other_dimensions_are_kept():
    both = xr.concat([section(-11.0, -6.0), section(-3.0, 2.0)], dim="model")
    found = thermocline_slope(both)["thermocline_slope"]
    assert set(found.dims) == {"model", "time"}
    np.testing.assert_allclose(found.transpose("model", "time"), [[-11, -6], [-3, 2]], rtol=1e-6)


def test_the_slope_of_a_map_is_that_of_its_mean_over_the_band():
    values = np.random.default_rng(5).normal(0, 12, (3, 18))
    field = mapped(values)
    line = np.einsum("trc,xrc->tx", field["mean"].values, section_weights(field))
    bare = xr.DataArray(line, dims=("time", "longitude"), coords={"longitude": field["longitude"]})
    np.testing.assert_allclose(
        thermocline_slope(field)["thermocline_slope"], thermocline_slope(bare)["thermocline_slope"], rtol=1e-9
    )


def test_the_error_of_a_map_is_that_of_slope_times_section():
    field = mapped(mean="estimated")
    inside = (LONGITUDE >= 165.0) & (LONGITUDE <= 265.0)
    distance = np.where(inside, LONGITUDE - LONGITUDE[inside].mean(), 0.0) * PER_DEGREE
    weights = np.einsum("x,xrc->rc", distance / (distance**2).sum(), section_weights(field))
    found = thermocline_slope(field)["thermocline_slope_error"]
    np.testing.assert_allclose(found, functional_error(field, weights[None])[:, 0], rtol=1e-6)
    assert "reason" not in found.attrs


def test_more_sites_make_the_error_smaller_and_no_site_the_largest():
    values = np.zeros((3, 18))
    values[1, ::2] = np.nan
    values[2] = np.nan
    error = thermocline_slope(mapped(values))["thermocline_slope_error"].values
    assert error[0] < error[1] < error[2]


@pytest.mark.parametrize("window", [(265.0, 165.0), (165.0, 165.0), (-10.0, 200.0), (165.0, 400.0)])
def test_a_window_that_is_none_is_refused(window):
    with pytest.raises(RequestError, match="window: not a window"):
        thermocline_slope(section(-11.0), window=window)


def test_a_window_with_fewer_than_three_longitudes_is_refused():
    with pytest.raises(DataError, match=r"too few longitudes in the window.*found 2"):
        thermocline_slope(section(-11.0), window=(170.0, 172.0))


def test_a_section_without_longitude_or_with_latitude_is_refused():
    with pytest.raises(DataError, match="no longitude"):
        thermocline_slope(section(-11.0).rename(longitude="x"))
    with pytest.raises(DataError, match="still has latitudes"):
        thermocline_slope(section(-11.0).expand_dims(latitude=2))
    with pytest.raises(DataError, match="out of range"):
        thermocline_slope(section(-11.0).assign_coords(longitude=LONGITUDE - 200.0))
