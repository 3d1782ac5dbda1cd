"""Chains sampled from a published field, through the whole line, against that field itself.

Source: Levitus, S. (1982), Climatological Atlas of the World Ocean, NOAA Professional Paper 13, annual-mean
temperature. The chains stand at the sites and sensor depths of the demo array, are written as wide text deliveries of
two years of constant daily values and go through ingest, quality control, columns, means and section. What they are
compared with is computed here from the field with NumPy alone.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
import xarray as xr

from profiles import quality_control, read_delivery
from profiles.column import columns_of
from profiles.config import QualityControlSettings
from profiles.drill.array import SITES
from profiles.section import build_section, daily_means, join_moorings, monthly_means
from profiles.vocabulary import IsothermStatus, MeanStatus

FIELD = Path(__file__).parents[1] / "reference" / "levitus_equatorial_pacific.nc"
RADIUS = 6.371e6
DAYS = np.datetime64("2031-01-01") + np.arange(730)
#: Constant values are a flat line to the quality control, rightly; here the test must not see them as one.
NO_FLAT_LINE = QualityControlSettings.model_validate(
    {"flat_line": {"repeats_questionable": 100_000, "repeats_bad": 200_000}}
)
LAYOUT = """
kind = "wide"
missing = [""]

[time]
column = "date"
format = "%Y-%m-%d"
offset_hours = 12

[depth]
pattern = "{depth} m"
"""


@pytest.fixture(scope="module")
def field():
    with xr.open_dataset(FIELD) as opened:
        return opened["temperature"].astype(np.float64).load()


def column_at(field, latitude, longitude):
    """Return the field's profile at a position: bilinear between the four points about it, all of them water."""
    profile = field.interp(latitude=latitude, longitude=longitude)
    assert np.isfinite(profile.values[:11]).all()
    return profile.values


def depth_of_20(levels, temperatures):
    """Return where the temperature passes 20 degrees on its way down, linear between the field's levels."""
    wet = np.isfinite(temperatures)
    levels, temperatures = levels[wet], temperatures[wet]
    first_cold = np.argmax(temperatures < 20.0)
    pair = slice(first_cold - 1, first_cold + 1)
    return np.interp(-20.0, -temperatures[pair], levels[pair])


@pytest.fixture(scope="module")
def profiles_at_sites(field):
    return {site.id: column_at(field, site.latitude, site.longitude) for site in SITES}


@pytest.fixture(scope="module")
def columns(field, profiles_at_sites, tmp_path_factory):
    """Deliver, read, flag and reduce every mooring."""
    folder = tmp_path_factory.mktemp("deliveries")
    layout = folder / "layout.toml"
    layout.write_text(LAYOUT)
    done = {}
    for site in SITES:
        depths = [depth for depth in site.depths if depth <= field["depth"].values[-1]]
        values = np.interp(depths, field["depth"].values, profiles_at_sites[site.id])
        cells = ",".join(f"{value:.4f}" for value in values)
        header = ",".join(["date", *(f"{depth:g} m" for depth in depths)])
        delivery = folder / f"{site.id}.csv"
        delivery.write_text("\n".join([header, *(f"{day},{cells}" for day in DAYS)]) + "\n")
        chain = read_delivery(delivery, layout)
        chain = chain.assign_coords(mooring=site.id, latitude=site.latitude, longitude=site.longitude)
        done[site.id] = columns_of(quality_control(chain, NO_FLAT_LINE))
    return done


@pytest.fixture(scope="module")
def monthly(columns):
    return join_moorings({name: monthly_means(daily_means(part)) for name, part in columns.items()})


@pytest.fixture(scope="module")
def built(monthly):
    return build_section(monthly)


@pytest.fixture(scope="module")
def full_field(field):
    """Return the isotherm depth of the field itself in 5S-5N, 120E-80W, NaN where it has no water above it."""
    box = field.sel(latitude=slice(-5, 5), longitude=slice(120, 280))
    depths = np.full(box.shape[1:], np.nan)
    for row, column in np.ndindex(*depths.shape):
        profile = box.values[:, row, column]
        if np.isfinite(profile[:9]).all():
            depths[row, column] = depth_of_20(box["depth"].values, profile)
    return box[0].copy(data=depths)


def test_the_isotherm_of_each_chain_is_that_of_the_field(field, profiles_at_sites, columns):
    """The field's profile is straight between its levels, so a chain must find its isotherm to the delivered decimals,
    0.01 m, unless a level lies between the sensors of the bracket. There the chord may miss the knee by a quarter of
    the bracket, 20 m, times the relative change of the gradient: 1.5 m for a change of 30 %."""
    levels, errors = field["depth"].values, []
    for site in SITES:
        part = columns[site.id]
        found, bracket = part["isotherm_depth"].values, float(part["bracket"][0])
        assert (part["isotherm_status"] == IsothermStatus.FOUND).all()
        assert np.ptp(found) < 1e-3
        errors.append(abs(found[0] - depth_of_20(levels, profiles_at_sites[site.id])))
        lower = min(depth for depth in site.depths if depth >= found[0])
        knee = ((levels > lower - bracket) & (levels < lower)).any()
        assert errors[-1] < (1.5 if knee else 0.01), site.id
        assert errors[-1] < 1.96 * float(part["isotherm_depth_error"][0]), site.id
    assert np.sqrt(np.mean(np.square(errors))) < 0.5


def test_every_month_of_every_site_has_its_mean(monthly):
    assert monthly.sizes == {"mooring": 40, "time": 24}
    assert (monthly["isotherm_mean_status"] == MeanStatus.GIVEN).all()


def area_of(field):
    """Return the area of each 1-degree cell on the sphere, m2."""
    south, north = (np.deg2rad(field["latitude"].values + half) for half in (-0.5, 0.5))
    height = np.sin(north) - np.sin(south)
    return RADIUS**2 * np.deg2rad(1.0) * np.broadcast_to(height[:, None], field.shape)


@pytest.mark.parametrize(("region", "west", "east"), [("total", 120, 280), ("west", 120, 205), ("east", 205, 280)])
def test_the_mapped_volume_is_that_of_the_whole_field(full_field, built, region, west, east):
    part = full_field.sel(longitude=slice(west, east))
    expected = np.nansum(part.values * area_of(part))
    volume, error = (
        built.volume[name].sel(region=region).values for name in ("warm_water_volume", "warm_water_volume_error")
    )
    assert np.abs(volume / expected - 1.0).max() < 0.03
    assert (np.abs(volume - expected) < 1.96 * error).all()
    assert (1.96 * error < 0.05 * volume).all()


def test_the_tilt_is_that_of_the_whole_field(full_field, built):
    """An unweighted line through the field's mean over 2.5S-2.5N: rows at 1.5 and 0.5 whole, half of those at 2.5.

    The field has no season, the atlas that the climatology is shrunk towards has one, of which a constant record of two
    years leaves a few percent in single months: the mean of the years is held to 3 %, each month to its interval."""
    rows = full_field["latitude"].values
    weights = np.select([np.abs(rows) < 2.0, np.abs(rows) < 3.0], [1.0, 0.5], 0.0)
    line = (full_field.values * weights[:, None])[weights > 0].sum(axis=0) / weights.sum()
    longitude = full_field["longitude"].values
    inside = (longitude >= 165.0) & (longitude <= 265.0) & np.isfinite(line)
    distance = longitude[inside] * 2 * np.pi * RADIUS / 360.0 / 1e6
    expected = np.polyfit(distance, line[inside], 1)[0]
    slope, error = (built.section[name].values for name in ("thermocline_slope", "thermocline_slope_error"))
    assert slope.mean() == pytest.approx(expected, rel=0.03)
    assert (np.abs(slope - expected) < 1.96 * error).all()
    assert (1.96 * error < 0.06 * np.abs(slope)).all()
