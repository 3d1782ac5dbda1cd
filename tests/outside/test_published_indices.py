"""Indices and events against published data sets of well-known ocean and atmosphere.

Sources: the OSTIA analysis of sea-surface temperature from satellites and in situ data (Donlon et al. 2012), monthly
means April 2006 to September 2010, and the southern-oscillation index of Trenberth (1984, Mon. Wea. Rev. 112, 326-332),
both as packed in iris-sample-data; the sea-surface temperature of 0-10S, 90-80W of 1950 to 2010 as packed in
statsmodels.
"""

from __future__ import annotations

from pathlib import Path

import iris_sample_data
import numpy as np
import pytest
import xarray as xr
from statsmodels.datasets import elnino

from profiles import lead_lag
from profiles.config import LeadLagSettings
from profiles.precursor import anomalies, find_events, monthly_series, read_series

FOLDER = Path(iris_sample_data.path)


@pytest.fixture(scope="module")
def satellite():
    return read_series(FOLDER / "ostia_monthly.nc", name="surface_temperature_index", box="nino34")


@pytest.fixture(scope="module")
def peru():
    table = elnino.load_pandas().data
    months = np.arange("1950-01", "2011-01", dtype="datetime64[M]").astype("datetime64[ns]")
    return monthly_series(
        table.drop(columns="YEAR").to_numpy().ravel(), months, name="surface_temperature_index", where="off Peru"
    )


@pytest.fixture(scope="module")
def oscillation():
    # The file states no units; it is no temperature.
    return read_series(FOLDER / "SOI_Darwin.nc", name="southern_oscillation")


def test_box_mean_agrees_with_a_plain_cosine_mean(satellite):
    field = xr.open_dataset(FOLDER / "ostia_monthly.nc")["surface_temperature"]
    part = field.sel(latitude=slice(-5, 5), longitude=slice(190, 240))
    plain = part.weighted(np.cos(np.deg2rad(part["latitude"]))).mean(("latitude", "longitude")) - 273.15
    # The plain mean takes whole cells, 5/9 by 5/6 degree, and so misses some of the edges.
    np.testing.assert_allclose(satellite.values, plain.values, atol=0.05)


def test_rule_gives_the_events_that_are_known(satellite):
    # Warm 2006/07 and 2009/10, cold 2007/08 by the published oceanic index.
    found = find_events(anomalies(satellite))
    peaks = found["peak"].values.astype("datetime64[M]")
    assert found["kind"].values.tolist() == ["warm", "cold", "warm"]
    for peak, first, last in zip(
        peaks, ("2006-10", "2007-10", "2009-10"), ("2007-01", "2008-02", "2010-02"), strict=True
    ):
        assert np.datetime64(first) <= peak <= np.datetime64(last)
    assert found["peak_value"].values[1] < -1.2
    assert found["peak_value"].values[2] > 1.2


def test_southern_oscillation_has_the_known_sign_and_size(oscillation, peru):
    # Low pressure at Darwin, and so a high index, goes with cold water off Peru; correlations of -0.5 to -0.8 by month
    # are common for the eastern Pacific (from memory).
    found = lead_lag(
        anomalies(oscillation), anomalies(peru, (1951, 1980)), [-1, 0, 1], settings=LeadLagSettings(draws=200)
    )
    at_once = found.sel(lead=0)
    assert -0.8 < at_once["correlation"] < -0.3
    assert at_once["correlation_upper"] < -0.2
    assert at_once["correlation_lower"] > -0.9
    assert at_once["significant"] == 1
    assert 60.0 < at_once["effective_size"] < 0.5 * at_once["pair_count"]


def test_known_years_stand_out(oscillation, peru):
    # 1982/83 and 1997/98 were the two strongest warm events of the record off Peru.
    found = find_events(anomalies(peru))
    warm = found.isel(event=np.flatnonzero(found["kind"].values == "warm"))
    strongest = warm.isel(event=np.argsort(warm["peak_value"].values)[-2:])
    years = sorted(int(str(peak)[:4]) for peak in strongest["peak"].values)
    assert years[0] in (1982, 1983)
    assert years[1] in (1997, 1998)
    index = anomalies(oscillation)
    for first, last in (("1982-11", "1983-03"), ("1997-11", "1998-03")):
        assert float(index.sel(time=slice(first, last)).mean()) < -1.0


def test_warm_and_cold_events_last_and_return_as_is_common(peru):
    # An event lasts most often about a year and returns every two to seven years (common practice, no source).
    found = find_events(anomalies(peru))
    whole = found.isel(event=np.flatnonzero(found["whole"].values))
    assert 5 <= np.median(whole["duration"]) <= 18
    for kind in ("warm", "cold"):
        onsets = whole["onset"].values[whole["kind"].values == kind].astype("datetime64[M]").astype(int)
        assert 2.0 <= np.median(np.diff(onsets)) / 12.0 <= 7.0
