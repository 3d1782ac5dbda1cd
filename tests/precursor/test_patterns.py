"""Leading patterns of the equatorial isotherm depth."""

from __future__ import annotations

import numpy as np
import pytest
import xarray as xr

from profiles.errors import DataError
from profiles.precursor import fit_patterns

NAN = np.nan
LONGITUDE = np.arange(140.0, 280.0, 10.0)  # the first is land
BASIN, TILT = np.ones(13), np.linspace(-1.0, 1.0, 13)  # orthogonal, deeper in the east
MONTHS = np.arange("2001-01", "2021-01", dtype="datetime64[M]").astype("datetime64[ns]")


@pytest.fixture
def series():
    """Two uncorrelated series without a seasonal cycle, of unit mean square."""
    values = np.random.default_rng(1).standard_normal((20, 12, 2))
    values = (values - values.mean(axis=0)).reshape(240, 2)
    return np.linalg.qr(values)[0] * np.sqrt(240.0)


@pytest.fixture
def section(series):
    season = 100.0 + 10.0 * np.cos(2.0 * np.pi * np.arange(240) / 12.0)
    sea = season[:, None] + 6.0 * series[:, :1] * BASIN + 6.0 * series[:, 1:] * TILT
    values = np.column_stack([np.full(240, NAN), sea])
    return xr.DataArray(
        values, dims=("time", "longitude"), coords={"time": MONTHS, "longitude": LONGITUDE}, name="section"
    )


def test_planted_patterns_are_found(section, series):
    found = fit_patterns(section, 2)
    size = np.sqrt(240.0 / 239.0)  # loadings are of a standard deviation with n - 1
    np.testing.assert_allclose(found.loadings[0, 1:], 6.0 * size * BASIN, rtol=1e-9)
    np.testing.assert_allclose(found.loadings[1, 1:], 6.0 * size * TILT, atol=1e-9)
    assert np.isnan(found.loadings[:, 0]).all()
    applied = found.apply(section)
    for number in (0, 1):
        assert abs(np.corrcoef(applied.values[number], series[:, number])[0, 1]) == pytest.approx(1.0)


def test_variance_explained_by_hand(section):
    # 13 for the basin's pattern; sum of TILT^2 for the other.
    other = (TILT**2).sum()
    found = fit_patterns(section, 2)
    np.testing.assert_allclose(found.explained, [13.0 / (13.0 + other), other / (13.0 + other)])
    # White series: 240 effective months, sampling error sqrt(2 / 240) of the share; the memory is fitted.
    np.testing.assert_allclose(found.explained_error / found.explained, np.sqrt(2.0 / 240.0), rtol=0.1)


def test_signs_are_deeper_and_deeper_in_the_east(section):
    for turned in (section, -section):
        found = fit_patterns(turned, 2)
        assert found.loadings[0, 1:].sum() > 0.0
        assert found.loadings[1, -1] > 0.0 > found.loadings[1, 1]


def test_series_and_patterns_rebuild_the_anomalies(section, series):
    found = fit_patterns(section, 2)
    rebuilt = found.apply(section).values.T @ found.loadings[:, 1:]
    expected = 6.0 * series[:, :1] * BASIN + 6.0 * series[:, 1:] * TILT
    np.testing.assert_allclose(rebuilt, expected, atol=1e-8)


def test_years_withheld_do_not_enter(section):
    kept = np.r_[0:120, 132:240]
    other = section.copy()
    other[120:132] += 1000.0
    one, two = (fit_patterns(values.isel(time=kept), 2) for values in (section, other))
    np.testing.assert_array_equal(one.loadings, two.loadings)
    np.testing.assert_allclose(one.apply(section).values[:, :120], two.apply(other).values[:, :120])


def test_the_base_alone_is_fitted_on(section):
    other = section.copy()
    other[180:] += np.linspace(0.0, 50.0, 60)[:, None]
    other[:60] -= np.linspace(0.0, 50.0, 60)[:, None]
    one, two = (fit_patterns(values, 2, base=(2006, 2015)) for values in (section, other))
    np.testing.assert_array_equal(one.loadings, two.loadings)


def test_a_month_that_lacks_a_longitude_is_missing(section):
    section[5, 3] = NAN
    applied = fit_patterns(section, 2).apply(section)
    assert np.flatnonzero(np.isnan(applied.values[0])).tolist() == [5]


def test_too_little_is_refused(section):
    with pytest.raises(DataError, match=r"too little of the section .*found 240 months, 1 longitudes"):
        fit_patterns(section.isel(longitude=slice(0, 2)), 2)
    with pytest.raises(DataError, match="found 240 months, 0 longitudes"):
        fit_patterns(section * NAN, 2)
