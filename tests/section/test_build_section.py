"""The section of an array: what it holds, that its parts agree, and that its errors hold the truth."""

from __future__ import annotations

import runpy
from pathlib import Path

import numpy as np
import pytest

from profiles import thermocline_slope, warm_water_volume
from profiles.config import SectionSettings
from profiles.drill.array import SITES
from profiles.errors import DataError
from profiles.section import build_section
from profiles.section.array import SMALL_SCALE_DAYS
from profiles.section.grid import array_grid, sea_area
from profiles.section.tilt import section_weights

BENCH = runpy.run_path(str(Path(__file__).parents[1] / "bench" / "section_coverage.py"))
EVERY_OTHER_LINE = tuple(site for site in SITES if site.longitude in (149.0, 175.0, 201.0, 227.0, 253.0))
MONTHS = 14


@pytest.fixture(scope="module")
def oceans():
    return BENCH["Oceans"](EVERY_OTHER_LINE, MONTHS)


@pytest.fixture(scope="module")
def monthly(oceans):
    """Fourteen monthly means at fifteen sites of one drawn ocean."""
    random = np.random.default_rng(21)
    whole, _ = oceans.draw(random)
    return oceans.monthly(whole, random)


@pytest.fixture(scope="module")
def built(monthly):
    return build_section(monthly)


def test_the_stated_errors_hold_the_truth(oceans):
    """Six oceans drawn from the assumptions of the map: z = (estimate - truth) / error has an rms about 1.

    The months of one ocean share its climatology, so six oceans leave the rms uncertain by a fifth.
    """
    drawn = list(BENCH["draws"](oceans, 6, seed=5))
    for name in BENCH["QUANTITIES"]:
        departures = np.array([draw.departures[name] for draw in drawn])
        assert 0.8 < np.sqrt((departures**2).mean()) < 1.25, name
    assert np.mean([draw.leave_one_out for draw in drawn]) == pytest.approx(1.0, abs=0.15)


def test_whole_is_climatology_plus_anomaly(built):
    section = built.section
    seasonal = BENCH["harmonic_design"](BENCH["year_fraction"](section["time"].values))
    climatology = np.einsum("th,hrc->trc", seasonal, section["isotherm_depth_climatology"].values)
    weights = section_weights(section)
    line = np.einsum("trc,xrc->tx", np.nan_to_num(climatology), weights)
    wet = weights.sum(axis=(1, 2)) > 0.0
    difference = section["equatorial_isotherm_depth"] - section["equatorial_isotherm_depth_anomaly"]
    np.testing.assert_allclose(difference.values[:, wet], line[:, wet], atol=1e-6)
    assert difference[:, ~wet].isnull().all()


def test_tilt_is_the_slope_of_the_section_it_stands_beside(built):
    for suffix in ("", "_anomaly"):
        line = built.section[f"equatorial_isotherm_depth{suffix}"]
        found = built.section[f"thermocline_slope{suffix}"]
        np.testing.assert_allclose(found, thermocline_slope(line)["thermocline_slope"], rtol=1e-6, atol=1e-9)
        assert found.attrs["window"] == "165 to 265 degrees east"


def test_volume_is_that_of_the_mapped_anomaly_it_stands_beside(built):
    for region in ("total", "west", "east"):
        bare = warm_water_volume(built.section["isotherm_depth_anomaly"], region=region)["warm_water_volume"]
        np.testing.assert_allclose(
            built.volume["warm_water_volume_anomaly"].sel(region=region), bare, rtol=1e-6, atol=1e6
        )


def test_parts_of_the_volume_add_up(built):
    for name in ("warm_water_volume", "warm_water_volume_anomaly"):
        volume = built.volume[name]
        np.testing.assert_allclose(
            volume.sel(region="west") + volume.sel(region="east"), volume.sel(region="total"), rtol=1e-9
        )


def test_land_holds_no_isotherm(built):
    land = sea_area(*array_grid()) == 0.0
    assert land.any()
    for name in ("isotherm_depth_anomaly", "isotherm_depth_anomaly_error", "isotherm_depth_climatology"):
        missing = np.isnan(built.section[name].values)
        assert (missing == land).all()


def test_the_error_of_an_anomaly_counts_the_climatology_that_was_taken_off(built):
    """It is above the error of the map alone, which knows nothing of a climatology."""
    section = built.section
    anomaly = section["thermocline_slope_anomaly_error"].values
    without = section.rename(isotherm_depth_anomaly="mean").drop_vars("climatology_information")
    assert (anomaly > thermocline_slope(without)["thermocline_slope_error"].values).all()


def test_a_month_without_a_mooring_has_larger_errors(monthly, built):
    fewer = monthly.copy(deep=True)
    fewer["isotherm_depth"][6:, 7] = np.nan
    here, there = built, build_section(fewer)
    worse = there.section["thermocline_slope_error"] > here.section["thermocline_slope_error"]
    assert bool(worse[7])
    ratio = there.volume["warm_water_volume_error"] / here.volume["warm_water_volume_error"]
    assert float(ratio.sel(region="total")[7]) > 1.1


def test_missing_days_add_noise_to_a_monthly_mean(monthly):
    # Spread 5 m, 16 of 31 days in January: 5^2 / (16 / 5) (1 - 16 / 31) = 3.780 m2 beside 4 m of small scales and the
    # 2 m that persist; with 31 of 31 days nothing is added.
    fewer = monthly.copy(deep=True)
    fewer["isotherm_depth"][:] = np.nan_to_num(monthly["isotherm_depth"], nan=150.0)
    fewer["isotherm_day_count"][3, 0] = 16
    noise = build_section(fewer).section["site_noise"].values[0]
    assert SMALL_SCALE_DAYS == 5.0
    assert noise[2] == pytest.approx(np.sqrt(16.0 + 4.0))
    assert noise[3] == pytest.approx(np.sqrt(16.0 + 4.0 + 25.0 / 3.2 * 15.0 / 31.0))


def test_settings_reach_the_map(monthly, built):
    window = build_section(monthly, SectionSettings(tilt_window=(180.0, 250.0))).section
    assert window["thermocline_slope"].attrs["window"] == "180 to 250 degrees east"
    quiet = build_section(monthly, SectionSettings(signal_sd=3.0)).section
    usual = built.section
    assert (quiet["isotherm_depth_anomaly_error"].max() < usual["isotherm_depth_anomaly_error"].max()).item()


def test_a_site_alone_has_nothing_to_be_left_out_against(monthly):
    assert np.isnan(build_section(monthly.isel(mooring=[7])).leave_one_out)


def test_an_array_without_a_monthly_mean_is_refused(monthly):
    empty = monthly.assign(isotherm_depth=monthly["isotherm_depth"] * np.nan)
    with pytest.raises(DataError, match=r"no mooring has a monthly mean.*15 moorings, 14 months"):
        build_section(empty)
