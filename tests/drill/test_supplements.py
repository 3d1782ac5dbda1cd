"""What lies beside the daily deliveries: log, casts, 10-minute and monthly values."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pandas as pd
import pytest
import xarray as xr

from profiles.drill.array import SITES
from profiles.drill.demo import SEED, days
from profiles.drill.ocean import Ocean
from profiles.drill.recovery_log import berths, recovery_log
from profiles.drill.supplements import cast, cast_stations

DEMO = Path(__file__).parents[2] / "data_demo"


@pytest.fixture(scope="module")
def log() -> pd.DataFrame:
    return pd.read_csv(DEMO / "recovery_log.csv", parse_dates=["deployed", "recovered"], keep_default_na=True)


def test_committed_log_is_the_one_that_the_code_makes(log: pd.DataFrame) -> None:
    time = days()
    ours = recovery_log(list(berths(time, SITES, SEED)), time[0], SEED)
    assert list(ours["remarks"]) == list(log["remarks"].fillna(""))
    pd.testing.assert_series_equal(ours["deployed"], log["deployed"].dt.tz_localize(None), check_dtype=False)


def test_log_has_every_mooring_out_one_deployment_after_the_other(log: pd.DataFrame) -> None:
    assert list(log["mooring"].unique()) == [site.id for site in SITES]
    for _, own in log.groupby("mooring"):
        assert list(own["deployment"]) == list(range(1, len(own) + 1))
        turn_around = (own["deployed"].shift(-1) - own["recovered"]).dropna() / pd.Timedelta(days=1)
        # A new mooring goes out 1 to 6 days after the old one came back; the log is to the minute.
        assert turn_around.between(0.99, 6.01).all()
        assert pd.isna(own["recovered"].iloc[-1])


def test_log_tells_of_lost_buoys_that_never_came_back(log: pd.DataFrame) -> None:
    lost = log[log["remarks"].fillna("").str.contains("buoy not found")]
    assert len(lost) > 0
    assert lost["recovered"].isna().all()


def test_casts_were_made_at_visits_to_moorings_on_the_equator(log: pd.DataFrame) -> None:
    stations = pd.read_csv(DEMO / "ctd" / "stations.csv")
    on_equator = [site.id for site in SITES if site.latitude == 0.0]
    assert list(stations["mooring"]) == on_equator
    places = {site.id: site.longitude for site in SITES}
    assert (np.abs(stations["longitude"] - stations["mooring"].map(places)) < 0.2).all()
    assert (np.abs(stations["latitude"]) < 0.2).all()


def test_a_cast_is_the_ocean_at_that_time_and_place_with_little_noise() -> None:
    time = days()
    station = cast_stations(list(berths(time, SITES, SEED)), time, SEED).iloc[0]
    read = pd.read_csv(DEMO / "ctd" / f"{station['cast']}.csv")
    instants = station["time"].to_datetime64().astype("datetime64[ns]") + np.arange(2) * np.timedelta64(10, "m")
    columns = Ocean.simulate(instants, SEED).columns([station["latitude"]], [station["longitude"]], small_scales=True)
    error = read["temperature"] - columns.temperature(0, read["depth"].to_numpy())[0]
    assert 0.001 < error.std() < 0.003
    ours = cast(station["time"], station["latitude"], station["longitude"], SEED)
    pd.testing.assert_frame_equal(ours, read, check_dtype=False)


def test_salinity_of_a_cast_is_oceanic() -> None:
    # Common practice, no source: 33.5 to 36.5 in the upper 500 m of the equatorial Pacific.
    for station in pd.read_csv(DEMO / "ctd" / "stations.csv")["cast"]:
        assert pd.read_csv(DEMO / "ctd" / f"{station}.csv")["salinity"].between(33.0, 36.7).all()


def test_fast_record_has_a_year_of_10_minute_values_with_pressure() -> None:
    with xr.open_dataset(DEMO / "deliveries" / "frigate_fast" / "TB-30F.nc") as delivered:
        assert delivered.sizes["TIME"] == 365 * 144
        spacing = np.diff(delivered["TIME"].values) / np.timedelta64(1, "s")
        # Stamps are float64 days, so to about a microsecond; the planted repeats are 2 to 5 stamps.
        assert np.median(spacing) == pytest.approx(600.0, abs=0.01)
        assert 1 <= (np.abs(spacing - 600.0) > 1.0).sum() <= 5
        pressure = delivered["PRES"].values
        depths = delivered["DEPTH"].values[np.isfinite(pressure).any(axis=0)]
    assert list(depths) == [100.0, 300.0, 500.0]


def test_monthly_companion_agrees_with_the_daily_truth_and_lasts_forty_years() -> None:
    with (
        xr.open_dataset(DEMO / "companion" / "monthly.nc") as monthly,
        xr.open_dataset(DEMO / "truth" / "sites.nc") as sites,
    ):
        assert monthly.sizes == {"mooring": 40, "time": 480}
        daily = sites["isotherm_depth"].resample(time="MS").mean("time").transpose("mooring", "time").values
        error = monthly["isotherm_depth"].values[:, :72] - daily
        index = monthly["surface_temperature_index"].values
    # 1.5 m of its own, and a month of 30.4 days for one of 28 to 31.
    assert 1.3 < error.std() < 2.5
    # Common practice, no source: about 27 °C on average, some degrees of range.
    assert index.mean() == pytest.approx(27.0, abs=1.0)
    assert 0.5 < index.std() < 1.5


def test_monthly_truth_continues_that_of_the_array() -> None:
    with xr.open_dataset(DEMO / "truth" / "monthly.nc") as monthly, xr.open_dataset(DEMO / "truth" / "array.nc") as six:
        assert monthly.sizes["time"] == 480
        ours = monthly["warm_water_volume"].sel(region="total").values[:72]
        theirs = six["warm_water_volume"].sel(region="total").values
    # One is computed with damped lines, one is the mean of days: what lasts days but is no line differs, by 1 % or so.
    np.testing.assert_allclose(ours, theirs, rtol=0.02)
