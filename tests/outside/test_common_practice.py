"""What everybody in the field expects of such an array. Common practice, no source, unless stated."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pandas as pd
import pytest
import xarray as xr

from profiles import read_delivery
from profiles.drill.array import CHAINS, SITES
from profiles.drill.configuration import FORMS, delivery_path

ROOT = Path(__file__).parents[2]
TRUTH = ROOT / "data_demo" / "truth" / "array.nc"


@pytest.fixture(scope="module")
def truth():
    with xr.open_dataset(TRUTH) as opened:
        return opened.load()


def delivered(longitude):
    """Return the chain delivered for the equatorial mooring of a line."""
    site = next(site for site in SITES if (site.latitude, site.longitude) == (0.0, longitude))
    layout = ROOT / "config" / "layouts" / FORMS[site.institute].layout
    return read_delivery(ROOT / "data_demo" / delivery_path(site), layout, latitude=site.latitude)


@pytest.fixture(scope="module")
def western():
    return delivered(162.0)


def test_chains_reach_a_couple_of_hundred_metres_and_more():
    assert min(max(depths) for depths in CHAINS.values()) >= 200.0


def test_a_delivered_chain_reaches_a_couple_of_hundred_metres_and_more(western):
    assert float(western["depth"].max()) >= 200.0


def test_the_surface_of_the_western_pool_is_above_28_degrees(western):
    surface = western["temperature"].isel(depth=0)
    assert float(western["depth"][0]) <= 5.0
    assert float(surface.median()) > 28.0


def test_the_thermocline_is_deep_in_the_west_and_shallow_in_the_east(truth):
    line = truth["equatorial_isotherm_depth"].mean("time")
    assert float(line.sel(longitude=165.5)) > 140.0
    assert float(line.sel(longitude=264.5)) < 80.0
    assert float(truth["thermocline_slope"].mean()) < 0.0


def phases(truth):
    """Return steep and flat months: the fifth of them with the steepest and the fifth with the flattest tilt, the mean
    season taken off."""
    month = pd.DatetimeIndex(truth["time"].values).month
    slope = pd.Series(truth["thermocline_slope"].values)
    departure = slope - slope.groupby(month).transform("mean")
    steep = departure <= departure.quantile(0.2)
    flat = departure >= departure.quantile(0.8)
    return steep.to_numpy(), flat.to_numpy()


def test_a_steep_tilt_goes_with_a_deep_west_and_a_shallow_east_as_in_the_cold_phase(truth):
    """In the cold phase the east is shallow and the west deep; in the warm phase the east is deep, the tilt flat."""
    steep, flat = phases(truth)
    line = truth["equatorial_isotherm_depth"]
    west = line.sel(longitude=slice(150, 180)).mean("longitude").values
    east = line.sel(longitude=slice(230, 265)).mean("longitude").values
    assert west[steep].mean() > west[flat].mean()
    assert east[steep].mean() < east[flat].mean()
    # The difference is of some 10 m, not of chance.
    assert east[flat].mean() - east[steep].mean() > 10.0


def test_the_eastern_surface_is_colder_in_the_steep_phase(truth):
    """At the equatorial mooring at 94W, as it was delivered, the mean season taken off."""
    surface = delivered(266.0)["temperature"].isel(depth=0)
    assert float(surface["depth"]) <= 5.0
    monthly = surface.resample(time="MS").median()
    season = monthly.groupby("time.month") - monthly.groupby("time.month").median()
    steep, flat = phases(truth)
    assert np.nanmean(season.values[steep]) < np.nanmean(season.values[flat])
