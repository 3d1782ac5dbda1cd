"""A run on columns that somebody else computed: what it gives, what comes first, what is said of it."""

from __future__ import annotations

import json
import shutil
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
import xarray as xr

from profiles.config import load_config
from profiles.errors import DataError
from profiles.pipeline import Outcome, run, survey
from profiles.vocabulary import ColumnSource, IsothermStatus, MeanStatus

MOORINGS = ("TB-07", "TB-18", "TB-28")
STATUSES = {status.name.lower(): int(status) for status in IsothermStatus}
MARKS = ", ".join(f'"{STATUSES[name]}" = "{name}"' for name in list(STATUSES)[:7])

DAILY = f"""
kind = "series"
[mooring]
column = "mooring"
[time]
column = "time"
mean_hours = 24
[values.isotherm_depth]
column = "isotherm_depth"
isotherm = 20.0
error = {{ independent = "isotherm_depth_error_independent", persistent = "isotherm_depth_error_persistent" }}
status = {{ column = "isotherm_status", marks = {{ {MARKS} }} }}
[values.mixed_layer_depth]
column = "mixed_layer_depth"
threshold = 0.2
reference = 10.0
[values.mean_temperature]
column = "mean_temperature"
bottom = 300.0
"""

MONTHLY = """
kind = "series"
[mooring]
column = "mooring"
[time]
column = "month"
format = "%Y-%m"
mean = "month"
[values.isotherm_depth]
column = "isotherm_depth"
isotherm = 20.0
error = { independent = "isotherm_depth_error_independent", persistent = "isotherm_depth_error_persistent" }
days = "isotherm_day_count"
spread = "isotherm_day_spread"
"""

SERIES = '[[series]]\npath = "{name}.csv"\nlayout = "{name}.toml"\n'


def configuration(folder: Path, *series: str, chains: tuple[str, ...] = (), settings: str = "") -> Path:
    """Rewrite the small array's configuration: deliveries only for some moorings, and series."""
    blocks = (folder / "array.toml").read_text(encoding="utf-8").split("[[moorings]]")
    lines = [[line for line in block.splitlines() if any(f'"{name}"' in block for name in chains)
              or not line.startswith("deliveries")] for block in blocks[1:]]  # fmt: skip
    listed = "".join(SERIES.format(name=name) for name in series)
    text = "\n[[moorings]]".join([blocks[0], *("\n".join(block) for block in lines)])
    (folder / "array.toml").write_text(f"{text}\n{listed}{settings}", encoding="utf-8")
    return folder / "array.toml"


def columns_of(finished: Path, mooring: str) -> pd.DataFrame:
    """Return a mooring's columns as the finished run wrote them, in full digits."""
    with xr.open_dataset(finished / "columns" / f"{mooring}.nc") as columns:
        table = columns.drop_vars("mooring").to_dataframe().reset_index()
    return table.assign(mooring=mooring, time=table["time"].dt.strftime("%Y-%m-%dT%H:%M:%SZ"))


def monthly_of(finished: Path) -> pd.DataFrame:
    with xr.open_dataset(finished / "columns_monthly.nc") as monthly:
        table = monthly.to_dataframe().reset_index()
    return table[table["isotherm_mean_status"] == MeanStatus.GIVEN].assign(month=table["time"].dt.strftime("%Y-%m"))


@pytest.fixture
def folder(small_array: Path, finished: Path, tmp_path: Path) -> Path:
    """The small array with the columns of its run as daily and as monthly series beside it."""
    copy = shutil.copytree(small_array, tmp_path / "array")
    pd.concat([columns_of(finished, name) for name in MOORINGS]).to_csv(copy / "daily.csv", index=False)
    monthly_of(finished).to_csv(copy / "monthly.csv", index=False)
    for name, layout in (("daily", DAILY), ("monthly", MONTHLY)):
        (copy / f"{name}.toml").write_text(layout, encoding="utf-8")
    return copy


def ran(config: Path, until: str = "section") -> tuple[Outcome, Path]:
    out = config.parent / "out"
    return run(load_config(config), out, until=until, workers=1), out


def compare(one: Path, other: Path, name: str, *, variables: tuple[str, ...], relative: float) -> None:
    with xr.open_dataset(one / name) as first, xr.open_dataset(other / name) as second:
        for variable in variables:
            np.testing.assert_allclose(first[variable], second[variable], rtol=relative, atol=1e-3, err_msg=variable)


SECTION = (
    "thermocline_slope",
    "thermocline_slope_error",
    "equatorial_isotherm_depth",
    "equatorial_isotherm_depth_error",
    "isotherm_depth_anomaly",
    "isotherm_depth_anomaly_error",
)
VOLUME = ("warm_water_volume", "warm_water_volume_error", "warm_water_volume_anomaly")
DAYS = ("isotherm_depth", "isotherm_depth_error", "isotherm_mean_status", "mixed_layer_depth", "mean_temperature")


# --------------------------------------------------------------------------------------------------------------
# The same numbers on another way


def test_daily_series_give_the_section_that_their_chains_gave(folder: Path, finished: Path) -> None:
    outcome, out = ran(configuration(folder, "daily"), until="report")
    assert (outcome.exit_code, outcome.moorings) == (0, MOORINGS)
    # a line that reads a float32 back in full gives the same float32; the rest is rounding in the last digits
    compare(out, finished, "columns.nc", variables=DAYS, relative=1e-6)
    compare(out, finished, "section.nc", variables=SECTION, relative=1e-5)
    compare(out, finished, "volume.nc", variables=VOLUME, relative=1e-5)
    assert (out / "report.html").exists()
    assert not (out / "chains" / "TB-07.nc").exists()


def test_monthly_series_give_it_too(folder: Path, finished: Path) -> None:
    outcome, out = ran(configuration(folder, "monthly"))
    assert outcome.exit_code == 0
    compare(out, finished, "section.nc", variables=SECTION, relative=1e-5)
    compare(out, finished, "volume.nc", variables=VOLUME, relative=1e-5)
    # months have no days
    assert not (out / "columns.nc").exists()


def test_a_mooring_of_a_series_stands_beside_those_with_chains(folder: Path, finished: Path) -> None:
    outcome, out = ran(configuration(folder, "monthly", chains=("TB-07", "TB-18")), until="report")
    compare(out, finished, "section.nc", variables=SECTION, relative=1e-5)
    months = monthly_of(finished)["mooring"].value_counts()
    assert outcome.months["TB-28"] == {"chain": 0, "series": months["TB-28"]}
    # TB-07 and TB-18 are in the series too: their chains come first
    assert outcome.months["TB-18"] == {"chain": months["TB-18"], "series": 0}
    with xr.open_dataset(out / "columns.nc") as daily:
        assert not daily["isotherm_depth"].sel(mooring="TB-28").notnull().any()


# --------------------------------------------------------------------------------------------------------------
# What comes first


def test_the_chain_comes_before_the_series_where_it_gives_a_month(folder: Path, finished: Path) -> None:
    table = pd.read_csv(folder / "daily.csv")
    months = monthly_of(finished).query("mooring == 'TB-18'")["month"].tolist()
    every_day = pd.date_range("2031-01-01", "2032-06-30").strftime("%Y-%m-%dT12:00:00Z")
    other = pd.DataFrame({"mooring": "TB-18", "time": every_day, "isotherm_depth": 77.0}).reindex(columns=table.columns)
    other.assign(isotherm_status=1).to_csv(folder / "daily.csv", index=False)
    outcome, out = ran(configuration(folder, "daily", chains=MOORINGS))
    with xr.open_dataset(out / "columns_monthly.nc") as monthly:
        ours = monthly.sel(mooring="TB-18").load()
    is_chain = np.isin(ours["time"].dt.strftime("%Y-%m"), months)
    assert 0 < is_chain.sum() < is_chain.size == 18
    np.testing.assert_array_equal(ours["column_source"], np.where(is_chain, ColumnSource.CHAIN, ColumnSource.SERIES))
    np.testing.assert_array_equal(ours["isotherm_depth"].values[~is_chain], 77.0)
    assert not (ours["isotherm_depth"].values[is_chain] == 77.0).any()
    assert outcome.months["TB-18"] == {"chain": is_chain.sum(), "series": 18 - is_chain.sum()}
    # both are kept: nothing that was delivered is lost
    with xr.open_dataset(out / "columns" / "series" / "TB-18.days.nc") as series:
        assert series.sizes["time"] == len(every_day)
    # the two do not share what lasts of their errors
    assert len(set(ours["deployment"].values[is_chain]) & set(ours["deployment"].values[~is_chain])) == 0


def test_the_series_listed_first_comes_first(folder: Path) -> None:
    table = pd.read_csv(folder / "daily.csv").query("mooring == 'TB-07'")
    second = table.assign(isotherm_depth=55.0).iloc[: len(table) // 2]
    second.to_csv(folder / "second.csv", index=False)
    (folder / "second.toml").write_text(DAILY, encoding="utf-8")
    outcome, out = ran(configuration(folder, "daily", "second"), until="column")
    with xr.open_dataset(out / "columns" / "TB-07.nc") as columns:
        assert not (columns["isotherm_depth"] == 55.0).any()
    quarantine = pd.read_csv(out / "tables" / "quarantine.csv").query("file == 'second.csv'")
    # a row of the second goes as soon as the first has one of its values, which leaves those that neither has
    assert (
        len(quarantine) == second[["isotherm_depth", "mixed_layer_depth", "mean_temperature"]].notna().any(axis=1).sum()
    )
    assert quarantine["reason"].str.contains("listed before has this mooring and time").all()
    assert outcome.rows["rows_read"] == outcome.rows["rows_kept"] + outcome.rows["rows_quarantined"]


# --------------------------------------------------------------------------------------------------------------
# Errors


def test_depths_without_an_error_take_that_of_the_settings_and_the_run_says_so(folder: Path) -> None:
    bare = "\n".join(line for line in DAILY.splitlines() if not line.startswith("error"))
    (folder / "daily.toml").write_text(bare, encoding="utf-8")
    settings = "[column]\nseries_error_independent = 2.0\nseries_error_persistent = 6.0\n"
    outcome, out = ran(configuration(folder, "daily", settings=settings), until="column")
    with xr.open_dataset(out / "columns" / "TB-07.nc") as columns:
        given = columns["isotherm_depth"].notnull().values
        # sqrt(2^2 + 6^2) = 6.3246
        np.testing.assert_allclose(columns["isotherm_depth_error"].values[given], 6.3246, atol=1e-4)
        assert "came without it: 2 m, independent, and 6 m, persistent" in columns["isotherm_depth_error"].comment
    (note,) = outcome.notes["daily.csv"]
    assert "isotherm depths have no error; [column] series_error_independent" in note
    account = json.loads((out / "run.json").read_text(encoding="utf-8"))
    assert account["series_notes"] == {"daily.csv": [note]}


def test_a_stated_error_is_split_as_declared_and_only_one_part_averages_out(folder: Path) -> None:
    split = "error = { total = 5.0, persistent_share = 0.64 }"
    layout = "\n".join(split if line.startswith("error") else line for line in DAILY.splitlines())
    (folder / "daily.toml").write_text(layout, encoding="utf-8")
    _, out = ran(configuration(folder, "daily"))
    with xr.open_dataset(out / "columns_monthly.nc") as monthly:
        given = monthly["isotherm_depth"].notnull()
        days = monthly["isotherm_day_count"].where(given)
        # 5 m with 0.64 of the variance lasting: 4 m and 3 m, the latter over the square root of the days
        np.testing.assert_allclose(monthly["isotherm_depth_error_persistent"].where(given, 4.0), 4.0, rtol=1e-6)
        np.testing.assert_allclose(monthly["isotherm_depth_error_independent"].where(given), 3.0 / days**0.5, rtol=1e-5)


# --------------------------------------------------------------------------------------------------------------
# Steps


def pentads(folder: Path) -> np.ndarray:
    """Write means of five days of TB-07 as the only series; return their depths."""
    time = pd.date_range("2031-01-03T12:00", periods=72, freq="5D")
    depth = 150.0 + 10.0 * np.sin(np.arange(72))
    table = pd.DataFrame({"mooring": "TB-07", "time": time.strftime("%Y-%m-%dT%H:%M:%SZ"), "isotherm_depth": depth})
    table.assign(isotherm_status=1, isotherm_depth_error_independent=2.0, isotherm_depth_error_persistent=3.0,
                 mixed_layer_depth=50.0, mean_temperature=20.0).to_csv(folder / "daily.csv", index=False)  # fmt: skip
    return depth


def test_means_of_five_days_count_for_each_of_them(folder: Path) -> None:
    depth = pentads(folder)
    (folder / "daily.toml").write_text(DAILY.replace("mean_hours = 24", "mean_hours = 120"), encoding="utf-8")
    outcome, out = ran(configuration(folder, "daily"))
    assert {problem.mooring for problem in outcome.problems} == {"TB-18", "TB-28"}
    with xr.open_dataset(out / "columns_monthly.nc") as monthly:
        january = monthly.isel(mooring=0, time=0).load()
    # the 31 days of January 2031: six means of five days and the first day of the seventh
    assert int(january["isotherm_day_count"]) == 31
    assert float(january["isotherm_depth"]) == pytest.approx((5.0 * depth[:6].sum() + depth[6]) / 31.0, rel=1e-6)
    # 2 m each, of about 31 / 5 of them
    assert float(january["isotherm_depth_error_independent"]) == pytest.approx(2.0 / (31.0 / 5.0) ** 0.5, rel=1e-5)


def test_values_days_apart_that_nobody_calls_means_are_pointed_out(folder: Path) -> None:
    pentads(folder)
    (folder / "daily.toml").write_text(DAILY.replace("mean_hours = 24\n", ""), encoding="utf-8")
    finding = survey(load_config(configuration(folder, "daily")))[0]
    assert "values are 5 days apart and the layout does not say what they are means of" in finding.message
    with pytest.raises(DataError, match="no mooring has a monthly mean"):
        ran(folder / "array.toml")


def test_months_of_too_few_days_have_no_mean(folder: Path) -> None:
    table = pd.read_csv(folder / "monthly.csv")
    table.loc[table["mooring"] == "TB-07", "isotherm_day_count"] = 14
    table.to_csv(folder / "monthly.csv", index=False)
    _, out = ran(configuration(folder, "monthly"))
    with xr.open_dataset(out / "columns_monthly.nc") as monthly:
        ours = monthly.sel(mooring="TB-07")
        assert (ours["isotherm_mean_status"] == MeanStatus.TOO_FEW_VALUES).all()
        assert ours["isotherm_depth"].isnull().all()


def test_missing_days_widen_the_errors_of_complete_months_alike(folder: Path) -> None:
    complete = MONTHLY.replace('days = "isotherm_day_count"\nspread = "isotherm_day_spread"\n', "complete = true\n")
    stated = MONTHLY.replace('"isotherm_day_count"', "20").replace('"isotherm_day_spread"', "15.0")
    errors = {}
    for name, layout in (("complete", complete), ("stated", stated)):
        copy = shutil.copytree(folder, folder.parent / name)
        (copy / "monthly.toml").write_text(layout, encoding="utf-8")
        _, out = ran(configuration(copy, "monthly"))
        with xr.open_dataset(out / "section.nc") as section:
            errors[name] = section["site_noise"].load()
    # of 31 days 20: 15^2 / (20 / 5) (1 - 20 / 31) = 19.96 m2 more, in January
    january = {name: float(noise.isel(time=0, site=0)) ** 2 for name, noise in errors.items()}
    assert january["stated"] - january["complete"] == pytest.approx(19.96, abs=0.01)


# --------------------------------------------------------------------------------------------------------------
# What is wrong, and what is done again


def test_rows_of_unknown_moorings_are_accounted_for(folder: Path) -> None:
    table = pd.read_csv(folder / "daily.csv")
    pd.concat([table, table.iloc[:4].assign(mooring="TB-81")]).to_csv(folder / "daily.csv", index=False)
    outcome, out = ran(configuration(folder, "daily"), until="ingest")
    assert outcome.rows == {
        "rows_read": len(table) + 4,
        "rows_kept": len(table),
        "rows_quarantined": 4,
        "rows_reordered": 0,
    }
    quarantine = pd.read_csv(out / "tables" / "quarantine.csv")
    assert set(quarantine["reason"]) == {"the configuration has no mooring 'TB-81'; did you mean 'TB-28'?"}
    deliveries = pd.read_csv(out / "tables" / "deliveries.csv")
    assert deliveries[["mooring", "file", "rows_quarantined"]].to_numpy().tolist() == [["(series)", "daily.csv", 4]]
    assert list(json.loads((out / "run.json").read_text(encoding="utf-8"))["inputs"]) == ["daily.csv"]


def test_check_reports_series_as_deliveries(folder: Path) -> None:
    text = (folder / "daily.csv").read_text(encoding="utf-8").splitlines()
    (folder / "daily.csv").write_text("\n".join([*text, text[1], text[2].replace("TB-07", "X")]), encoding="utf-8")
    (folder / "monthly.csv").unlink()
    daily, monthly = survey(load_config(configuration(folder, "daily", "monthly")))
    assert (daily.mooring, daily.outcome) == ("(series)", "rows quarantined")
    assert daily.rows_read - daily.rows_kept == 2
    assert f"line {len(text) + 1}: mooring and time are those of line 2" in daily.message
    assert (monthly.outcome, monthly.message.partition(";")[0]) == ("not usable", "monthly.csv: no such file")


def test_another_isotherm_than_the_run_seeks_is_refused(folder: Path) -> None:
    config = configuration(folder, "daily", "monthly", settings="[column]\nisotherm = 22.0\n")
    with pytest.raises(DataError, match=r"another quantity.*expected isotherm = 22, as in \[column\]; found 20"):
        ran(config)


def test_a_mooring_that_no_series_has_is_told_and_the_others_go_on(folder: Path) -> None:
    pd.read_csv(folder / "daily.csv").query("mooring != 'TB-28'").to_csv(folder / "daily.csv", index=False)
    config = configuration(folder, "daily")
    outcome, _ = ran(config)
    (problem,) = outcome.problems
    assert (outcome.exit_code, outcome.moorings, problem.mooring) == (5, ("TB-07", "TB-18"), "TB-28")
    assert problem.message == "it has no delivery, and no series has a value of it"
    assert [finding.outcome for finding in survey(load_config(config))] == ["clean", "not usable"]


def test_a_series_that_cannot_be_used_leaves_the_chains_alone(folder: Path, finished: Path) -> None:
    (folder / "daily.csv").write_text("mooring,time\n", encoding="utf-8")
    outcome, out = ran(configuration(folder, "daily", chains=MOORINGS))
    assert outcome.exit_code == 5
    assert [(problem.mooring, problem.stage) for problem in outcome.problems] == [("(series)", "ingest")]
    assert "column is missing" in outcome.problems[0].message
    compare(out, finished, "section.nc", variables=SECTION, relative=1e-6)


def test_second_run_computes_nothing_and_a_changed_series_is_followed_through(
    folder: Path, contents: Callable[[Path], dict[str, bytes]]
) -> None:
    config = configuration(folder, "daily", chains=("TB-07",))
    _, out = ran(config)
    before = contents(out)
    assert ran(config)[0].computed == 0
    table = pd.read_csv(folder / "daily.csv")
    table[table["mooring"] != "TB-28"].to_csv(folder / "daily.csv", index=False)
    outcome, _ = ran(config)
    assert outcome.moorings == ("TB-07", "TB-18")
    assert not [path for path in out.rglob("*TB-28*") if path.is_file()]
    table.to_csv(folder / "daily.csv", index=False)
    fresh = shutil.copytree(folder, folder.parent / "fresh", ignore=shutil.ignore_patterns("out"))
    ran(config)
    ran(fresh / "array.toml")
    assert contents(out) == contents(fresh / "out")
    assert contents(out).keys() == before.keys()
