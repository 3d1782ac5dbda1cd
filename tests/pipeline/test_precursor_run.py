"""The precursor analysis of a run or of files: what is read, what is written, what is withheld."""

from __future__ import annotations

import importlib
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
import xarray as xr

from profiles import store
from profiles.config import HindcastSettings, LeadLagSettings, PrecursorSettings
from profiles.errors import DataError, RequestError
from profiles.pipeline import Sources, precursor
from profiles.pipeline.paths import Folder
from profiles.pipeline.precursor_inputs import read_inputs
from profiles.vocabulary import CAUTION

QUICK = PrecursorSettings(
    lead_lag=LeadLagSettings(draws=100, longest_lead=9), hindcast=HindcastSettings(longest_lead=3)
)
YEARS = 24


@pytest.fixture
def undrawn(monkeypatch):
    """Leave out the figures and the page, which take the longest and have tests of their own."""
    module = importlib.import_module("profiles.pipeline.precursor")
    monkeypatch.setattr(module, "write_precursor_report", lambda *arguments: None)


@pytest.fixture(scope="module")
def swings():
    """Index and volume of a damped oscillation of 24 months: the volume comes first, by six months or less."""
    generator = np.random.default_rng(4)
    angle, decay = 2.0 * np.pi / 24.0, np.exp(-1.0 / 24.0)
    turn = decay * np.array([[np.cos(angle), np.sin(angle)], [-np.sin(angle), np.cos(angle)]])
    state, states = np.zeros(2), []
    for noise in 0.25 * generator.standard_normal((12 * YEARS + 120, 2)):
        state = turn @ state + noise
        states.append(state)
    return np.array(states[120:])


@pytest.fixture(scope="module")
def files(tmp_path_factory, swings):
    """A table of volume and tilt, and two of the index."""
    folder = tmp_path_factory.mktemp("series")
    months = np.arange("2031-01", f"{2031 + YEARS}-01", dtype="datetime64[M]")
    season = np.cos(2.0 * np.pi * np.arange(12 * YEARS) / 12.0)
    index, volume = swings.T
    table = pd.DataFrame(
        {
            "month": months.astype(str),
            "warm_water_volume_total": 2.3e15 + 1e14 * (volume + season),
            "warm_water_volume_west": 1.4e15 + 5e13 * (volume - index),
            "thermocline_slope": -11.0 + 2.0 * index,
        }
    )
    table.to_csv(folder / "series.csv", index=False)
    table.iloc[:72].to_csv(folder / "six_years.csv", index=False)
    temperature = 26.5 + index + 0.5 * season
    pd.DataFrame({"month": months.astype(str), "sst": temperature}).to_csv(folder / "sst.csv", index=False)
    rows = temperature.reshape(YEARS, 12)
    lines = [f"{2031 + n} " + " ".join(f"{value:.3f}" for value in row) for n, row in enumerate(rows)]
    (folder / "sst.txt").write_text("\n".join(lines), encoding="utf-8")
    return folder


@pytest.fixture(scope="module")
def done(files, tmp_path_factory):
    out = tmp_path_factory.mktemp("precursor") / "out"
    outcome = precursor(out, Sources(sst=files / "sst.csv", series=files / "series.csv"), settings=QUICK)
    return out, outcome


def test_volume_leads_and_the_tables_say_so(done):
    out, outcome = done
    volume = next(row for row in outcome.leads if row["predictor"] == "volume")
    assert 2.0 < volume["peak_lead"] < 7.0
    assert volume["peak_correlation"] > 0.5
    table = store.read_table(Folder(out).table("leads"))
    assert table["predictor"].tolist() == ["volume", "western_volume", "tilt"]
    assert table["peak_lead"][0] == pytest.approx(volume["peak_lead"], rel=1e-5)


def test_one_dataset_holds_series_lead_lag_and_events(done):
    out, outcome = done
    with store.open_dataset(Folder(out).precursor) as found:
        assert dict(found["correlation"].sizes) == {"predictor": 3, "lead": 19}
        assert found["correlation_by_month"].dims == ("predictor", "starting_month", "lead")
        assert found["correlation_in_window"].dims == ("predictor", "lead", "window")
        assert found.sizes["event"] == len(outcome.events) > 5
        assert found["before_onset"].dims == ("predictor", "event", "months_before")
        assert found["surface_temperature_index"].sizes["time"] == 12 * YEARS
        assert found.attrs["comment"] == CAUTION
        assert "series.csv" in found.attrs["source"]


def test_lead_lag_in_the_file_is_that_of_the_function(done, files):
    from profiles import lead_lag
    from profiles.precursor import anomalies, read_series

    index = read_series(files / "sst.csv", name="surface_temperature_index")
    tilt = read_series(files / "series.csv", name="thermocline_slope", column="thermocline_slope")
    expected = lead_lag(anomalies(tilt), anomalies(index), range(-9, 10), settings=QUICK.lead_lag)
    with store.open_dataset(Folder(done[0]).precursor) as found:
        for name in ("correlation", "deciding_p_value", "correlation_by_month", "peak_lead"):
            np.testing.assert_allclose(found[name].sel(predictor="tilt").values, expected[name].values)


def test_every_table_is_written(done):
    out, _ = done
    names = {path.stem for path in (out / "tables").glob("*.csv")}
    expected = {"precursor_series", "lead_lag", "leads", "events", "hindcast", "reliability", "outlook"}
    assert names == expected
    lead_lag = store.read_table(Folder(out).table("lead_lag"))
    assert len(lead_lag) == 3 * 19
    events = store.read_table(Folder(out).table("events"))
    assert set(events["kind"]) == {"warm", "cold"}
    assert {"volume_6_months_before", "tilt_12_months_before"} <= set(events.columns)
    series = store.read_table(Folder(out).table("precursor_series"))
    assert series["month"].iloc[[0, -1]].tolist() == ["2031-01", f"{2030 + YEARS}-12"]
    assert series["volume_1e14_m3"].std() == pytest.approx(outcome_spread(out), rel=1e-4)


def outcome_spread(out):
    with store.open_dataset(Folder(out).precursor) as found:
        return float(found["predictor_anomaly"].sel(predictor="volume").std(ddof=1)) / 1e14


def test_hindcast_and_outlook_are_given_for_a_long_record(done):
    out, outcome = done
    assert [row["lead"] for row in outcome.scores] == [1, 2, 3]
    assert outcome.scores[0]["correlation"] > 0.7
    assert outcome.outlook[0]["month"] == f"{2031 + YEARS}-01"
    total = sum(outcome.outlook[0][f"probability_{kind}"] for kind in ("warm", "neutral", "cold"))
    assert total == pytest.approx(1.0)
    assert 20.0 < outcome.oscillator["period"] < 30.0
    assert all(path.is_file() for path in (Folder(out).hindcast, Folder(out).scores, Folder(out).outlook))


def test_an_index_of_another_form_is_the_same(files):
    folder = Folder(files)
    one, other = (
        read_inputs(folder, Sources(sst=files / name, series=files / "series.csv"), QUICK)
        for name in ("sst.csv", "sst.txt")
    )
    np.testing.assert_allclose(one.index, other.index, atol=6e-4)
    assert other.notes == ("volume and tilt: series.csv", "index: sst.txt, a series as it stands")
    assert other.inputs == (files / "series.csv", files / "sst.txt")


def test_the_same_inputs_give_the_same_bytes(done, files, tmp_path):
    precursor(tmp_path / "out", Sources(sst=files / "sst.csv", series=files / "series.csv"), settings=QUICK)
    written = sorted(path.relative_to(done[0]) for path in done[0].rglob("*.*") if path.suffix in (".nc", ".csv"))
    assert len(written) > 10
    assert [name for name in written if (done[0] / name).read_bytes() != (tmp_path / "out" / name).read_bytes()] == []


def test_six_years_are_too_short_for_an_outlook_and_leave_no_older_one(files, tmp_path):
    folder = Folder(tmp_path / "out")
    folder.table("").parent.mkdir(parents=True)
    older = [folder.hindcast, folder.scores, folder.reliability, folder.table("hindcast"), folder.table("reliability")]
    for path in older:
        path.write_text("of a longer record", encoding="utf-8")
    sources = Sources(sst=files / "sst.csv", series=files / "six_years.csv")
    outcome = precursor(folder.out, sources, settings=QUICK)
    assert "too short for a hindcast" in outcome.withheld
    assert "6.0 years" in outcome.withheld
    assert not [row for row in outcome.outlook if np.isfinite(row["forecast"])]
    assert [path for path in older if path.exists()] == []
    assert len(outcome.leads) == 3


@pytest.mark.usefixtures("undrawn")
def test_wind_and_pressure_are_predictors_and_pressure_forecasts_nothing(files, swings, tmp_path):
    months = np.arange("2031-01", f"{2031 + YEARS}-01", dtype="datetime64[M]").astype(str)
    pd.DataFrame({"month": months, "u": -5.0 + swings[:, 0]}).to_csv(tmp_path / "wind.csv", index=False)
    generator = np.random.default_rng(5)
    east, west = (1010.0 + sign * swings[:, 0] + generator.standard_normal(len(months)) for sign in (-1.0, 1.0))
    pd.DataFrame({"month": months, "east": east, "west": west}).to_csv(tmp_path / "pressure.csv", index=False)
    sources = Sources(
        sst=files / "sst.csv",
        series=files / "series.csv",
        wind=tmp_path / "wind.csv",
        pressure=tmp_path / "pressure.csv",
    )
    outcome = precursor(tmp_path / "out", sources, settings=QUICK)
    rows = {row["predictor"]: row for row in outcome.leads}
    assert rows["wind"]["peak_correlation"] > 0.9
    assert rows["pressure"]["peak_correlation"] < -0.4  # eastern minus western pressure: negative in warm events
    with store.open_dataset(Folder(tmp_path / "out").hindcast) as found:
        assert found.attrs["predictors"].split() == ["index", "volume", "western_volume", "tilt", "wind"]


def test_trailing_means_begin_later_and_know_no_future(files):
    sources = Sources(sst=files / "sst.csv", series=files / "series.csv")
    plain, smooth = (
        read_inputs(Folder(files), sources, QUICK.model_copy(update={"running_mean": months})) for months in (1, 3)
    )
    volume = plain.predictors["volume"]
    assert smooth.predictors["volume"].size == volume.size - 2
    assert float(smooth.predictors["volume"][0]) == pytest.approx(float(volume[:3].mean()))
    assert smooth.predictors["volume"]["time"].values[0] == volume["time"].values[2]
    np.testing.assert_array_equal(smooth.index, plain.index)


@pytest.mark.usefixtures("undrawn")
def test_depths_of_moorings_are_mapped_to_volume_and_tilt(tmp_path, swings):
    months = np.arange("2031-01", "2046-01", dtype="datetime64[M]").astype("datetime64[ns]")
    longitude = np.repeat([150.0, 180.0, 205.0, 235.0, 260.0], 3)
    latitude = np.tile([-2.5, 0.0, 2.5], 5)
    index, volume = swings[: months.size].T
    shape = np.interp(longitude, [150.0, 260.0], [-1.0, 1.0])
    depth = np.interp(longitude, [150.0, 260.0], [170.0, 50.0])[:, None] + 8.0 * volume + 12.0 * shape[:, None] * index
    dataset = xr.Dataset(
        {
            "isotherm_depth": (("mooring", "time"), depth),
            "surface_temperature": (("mooring", "time"), 26.0 + np.tile(index, (15, 1))),
        },
        coords={
            "mooring": [f"M{n:02d}" for n in range(15)],
            "time": months,
            "latitude": ("mooring", latitude),
            "longitude": ("mooring", longitude),
        },
    )
    dataset.to_netcdf(tmp_path / "depths.nc")
    outcome = precursor(tmp_path / "out", Sources(series=tmp_path / "depths.nc"), settings=QUICK)
    rows = {row["predictor"]: row for row in outcome.leads}
    assert rows["volume"]["precursor_correlation"] > 0.5
    assert abs(rows["tilt"]["peak_lead"]) < 2.0
    assert {"pattern_1", "pattern_2"} <= set(rows)
    assert "6 moorings" in outcome.notes[1]
    with store.open_dataset(Folder(tmp_path / "out").precursor) as found:
        assert found["pattern_loading"].dims == ("pattern", "longitude")
        assert float(found["pattern_share"].sum()) > 0.9


# --------------------------------------------------------------------------------------------------------------
# A run


def test_a_short_run_is_too_short_for_a_climatology(out):
    # The small array has a year and a half.
    with pytest.raises(DataError, match="too short for a climatology; expected 3 or more"):
        precursor(out, Sources())


def test_a_run_lengthened_to_four_years_is_read_with_its_own_sensors(out):
    folder = Folder(out)
    for path in [*out.glob("chains/*.nc"), folder.volume, folder.section]:
        lengthen(path)
    outcome = precursor(out, Sources(), box="-5,5,140,290", settings=QUICK)
    assert outcome.notes[0] == "volume and tilt: this run"
    assert "shallowest sensors of" in outcome.notes[1]
    assert outcome.record.startswith("2031-0")
    assert [row["predictor"] for row in outcome.leads][:3] == ["volume", "western_volume", "tilt"]
    assert "too short" in outcome.withheld


def lengthen(path: Path, times: int = 3) -> None:
    """Repeat a file's year and a half with noise, each time 18 months later."""
    generator = np.random.default_rng(6)
    with xr.open_dataset(path) as dataset:
        whole = dataset.load()
    parts = []
    for turn in range(times):
        later = pd.DatetimeIndex(whole["time"].values) + pd.DateOffset(months=18 * turn)
        part = whole.assign_coords(time=later.to_numpy())
        for name in ("temperature", "warm_water_volume", "thermocline_slope", "equatorial_isotherm_depth"):
            if name in part:
                spread = 0.05 * float(np.nanstd(part[name]))
                part[name] = part[name] + spread * generator.standard_normal(part[name].shape)
        parts.append(part)
    joined = xr.concat(parts, dim="time", data_vars="minimal", coords="minimal", compat="override", join="override")
    kept = joined.isel(time=np.unique(joined["time"].values, return_index=True)[1])
    path.unlink()
    kept.to_netcdf(path)


@pytest.mark.parametrize(
    ("sources", "message"),
    [
        (Sources(), "there is no run with a section in this folder; expected volume.nc and section.nc"),
        (Sources(series=Path("nothing.csv")), "nothing.csv: no such file; expected NetCDF or CSV"),
    ],
)
def test_nothing_to_read_is_a_wrong_request(tmp_path, sources, message):
    with pytest.raises(RequestError, match=message):
        precursor(tmp_path, sources)


def test_files_without_surface_temperature_want_one(files, tmp_path):
    with pytest.raises(RequestError, match="--sst: there is no surface temperature"):
        precursor(tmp_path / "out", Sources(series=files / "series.csv"))
    assert not (tmp_path / "out").exists()


def test_a_file_of_something_else_is_refused(tmp_path, files):
    path = tmp_path / "other.nc"
    xr.Dataset({"wind": ("time", np.arange(3.0))}, coords={"time": np.arange(3)}).to_netcdf(path)
    with pytest.raises(DataError, match=r"neither volume and tilt nor isotherm depths of moorings; .*found wind"):
        precursor(tmp_path / "out", Sources(series=path, sst=files / "sst.csv"))


def test_series_that_do_not_overlap_are_refused(files, tmp_path):
    months = np.arange("1990-01", "2000-01", dtype="datetime64[M]").astype(str)
    pd.DataFrame({"month": months, "sst": np.sin(np.arange(120.0))}).to_csv(tmp_path / "old.csv", index=False)
    with pytest.raises(DataError, match=r"do not overlap; .*1990-01 to 1999-12"):
        precursor(tmp_path / "out", Sources(sst=tmp_path / "old.csv", series=files / "series.csv"), settings=QUICK)


def test_a_base_outside_the_record_is_refused(files, tmp_path):
    settings = QUICK.model_copy(update={"base": ("1991-01", "2020-12")})
    sources = Sources(sst=files / "sst.csv", series=files / "series.csv")
    with pytest.raises(DataError, match="base period reaches outside the record; expected within 2031-01"):
        precursor(tmp_path / "out", sources, settings=settings)
