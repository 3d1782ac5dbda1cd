"""Series from elsewhere: what is read of each form of file, what goes to quarantine, who wins."""

from __future__ import annotations

import csv
import gzip
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from profiles.errors import ConfigError, DataError, RequestError
from profiles.ingest import join_series, load_layout, read, read_series
from profiles.vocabulary import Flag, IsothermStatus

KNOWN = ["TB-01", "TB-02", "TB-30"]
EXAMPLE = Path(__file__).parents[2] / "config" / "layouts" / "gannet_series.toml"

LONG = """
kind = "series"
missing = ["", "-99"]
[mooring]
column = "site"
[time]
column = "day"
[values.isotherm_depth]
column = "z20"
isotherm = 20.0
"""

MONTHS = """
kind = "series"
[time]
columns = ["year", "month"]
format = "%Y %m"
mean = "month"
[values.isotherm_depth]
column = "{mooring}"
isotherm = 20.0
complete = true
error = { independent = 2.0, persistent = "{mooring}_error" }
"""


@pytest.fixture
def read_text(write, layout_of):
    """Return a function that reads a series from its text."""

    def read_written(text, layout=LONG, mooring=None, name="series.csv"):
        return read_series(write(text, name), layout_of(layout), moorings=KNOWN, mooring=mooring)

    return read_written


def reasons(series):
    return dict(series.quarantine[["line", "reason"]].itertuples(index=False))


# --------------------------------------------------------------------------------------------------------------
# Forms


def test_a_long_file_gives_values_by_mooring_and_time(read_text):
    series = read_text("site,day,z20\nTB-02,2031-01-02,60.5\nTB-01,2031-01-01,150\nTB-02,2031-01-01,-99\n")
    assert (series.rows_read, series.rows_kept, series.rows_reordered) == (3, 3, 1)
    found = series.values[["mooring", "line", "isotherm_depth"]].to_numpy().tolist()
    assert found == [["TB-01", 3, 150.0], ["TB-02", 4, pytest.approx(np.nan, nan_ok=True)], ["TB-02", 2, 60.5]]
    assert series.values["time"].tolist() == list(pd.to_datetime(["2031-01-01", "2031-01-01", "2031-01-02"]))
    assert not series.values["is_month"].any()


def test_the_example_reads_what_stands_in_it(write):
    lines = EXAMPLE.read_text(encoding="utf-8").splitlines()
    shown = [
        line.removeprefix("#   ") for line in lines if line.startswith("#   ") and ("Gannet" in line or ";" in line)
    ]
    series = read_series(write("\n".join(shown)), EXAMPLE, moorings=["TB-18"])
    assert (series.rows_read, series.rows_quarantined, series.notes) == (2, 0, ())
    first, second = (series.values.iloc[place] for place in (0, 1))
    assert first["time"] == pd.Timestamp("2031-01-01T12:00")
    assert first["isotherm_depth"] == pytest.approx(152.4)
    # 4.5 m, 0.9 of the variance of which persists
    assert first["independent"] == pytest.approx(4.5 * 0.1**0.5)
    assert first["persistent"] == pytest.approx(4.5 * 0.9**0.5)
    assert second[["isotherm_status", "mixed_layer_depth"]].tolist() == [IsothermStatus.BELOW_CHAIN, 61.5]


def test_moorings_in_the_names_of_the_columns(read_text):
    text = "year,month,TB-01,TB-01_error,TB-30,TB-30_error,XX,XX_error\n2031,1,150,3,60,4,1,1\n2031,02,155,3,,,1,1\n"
    series = read_text(text, MONTHS)
    assert series.moorings == ["TB-01", "TB-30"]
    assert series.values["isotherm_depth"].tolist()[:3] == [150.0, 155.0, 60.0]
    assert series.values["persistent"].tolist()[:3] == [3.0, 3.0, 4.0]
    assert (series.values["independent"] == 2.0).all()
    # calendar months in their middle, complete: 31 and 28 days
    assert series.values["time"].tolist() == [pd.Timestamp("2031-01-16T12"), pd.Timestamp("2031-02-15")] * 2
    assert series.values["days"].tolist() == [31.0, 28.0] * 2
    assert series.notes == ("columns of moorings that the configuration does not have are not used: 'XX'",)


def test_a_file_of_one_mooring_that_the_configuration_names(read_text):
    layout = LONG.replace('[mooring]\ncolumn = "site"\n', "")
    series = read_text("day,z20\n2031-01-01,150\n", layout, mooring="TB-01")
    assert series.moorings == ["TB-01"]


def test_the_ids_of_the_configuration_by_the_names_in_the_file(read_text):
    layout = LONG.replace('column = "site"', 'column = "site"\nids = { "140W" = "TB-30" }')
    assert read_text("site,day,z20\n140W,2031-01-01,60\n", layout).moorings == ["TB-30"]


def test_compressed_text_in_another_encoding_with_decimal_commas(write, layout_of):
    layout = layout_of('encoding = "latin-1"\ndelimiter = ";"\ndecimal = ","\n' + LONG)
    path = write(gzip.compress("site;day;z20\nTB-01;2031-01-01;150,5\n# µ\n".encode("latin-1")), "series.csv.gz")
    series = read_series(path, layout, moorings=KNOWN)
    assert series.values["isotherm_depth"].tolist() == [150.5]
    assert series.rows_quarantined == 1


@pytest.mark.parametrize(
    ("units", "positive", "cell", "metres"),
    [
        ("m", "down", "150", 150.0),
        ("cm", "up", "-15000", 150.0),
        ("km", "down", "0.15", 150.0),
        ("ft", "down", "100", 30.48),
    ],
)
def test_depths_and_their_errors_are_converted_to_metres(read_text, units, positive, cell, metres):
    layout = LONG + f'units = "{units}"\npositive = "{positive}"\nerror = {{ total = "e", persistent_share = 0.0 }}\n'
    size = cell.lstrip("-")
    found = read_text(f"site,day,z20,e\nTB-01,2031-01-01,{cell},{size}\n", layout).values.iloc[0]
    assert found["isotherm_depth"] == pytest.approx(metres, rel=1e-6)
    assert (found["independent"], found["persistent"]) == (pytest.approx(metres, rel=1e-6), 0.0)


def test_mean_temperatures_are_converted_to_its90(read_text):
    layout = LONG.replace("[values.isotherm_depth]", "[values.mean_temperature]").replace(
        "isotherm = 20.0", "bottom = 300.0"
    )
    found = read_text("site,day,z20\nTB-01,2031-01-01,293.15\n", layout + 'units = "kelvin"\nscale = "IPTS-68"\n')
    # 293.15 K = 20 °C; t90 = 0.99976 t68
    assert found.values["mean_temperature"].item() == pytest.approx(19.9952, abs=1e-4)
    assert found.values["isotherm_depth"].isna().all()


def test_marks_of_quality_and_of_status_have_tables_of_their_own(read_text):
    layout = LONG + (
        'quality = { column = "q", flags = { "1" = 1, "2" = 3 } }\n'
        'status = { column = "s", marks = { "1" = "found", "2" = "below_chain" } }\n'
    )
    series = read_text("site,day,z20,q,s\nTB-01,2031-01-01,150,2,1\nTB-01,2031-01-02,,1,2\n", layout)
    assert series.values["isotherm_depth_flag"].tolist() == [Flag.QUESTIONABLE, Flag.GOOD]
    assert series.values["isotherm_status"].tolist() == [IsothermStatus.FOUND, IsothermStatus.BELOW_CHAIN]


def test_stamps_of_months_may_lie_anywhere_in_them(read_text):
    layout = LONG.replace('column = "day"', 'column = "day"\nmean = "month"') + 'days = "n"\nspread = 6.0\n'
    series = read_text("site,day,z20,n\nTB-01,2031-01-31,150,30\nTB-01,2031-02-01,150,30\n", layout)
    assert series.values["time"].tolist() == [pd.Timestamp("2031-01-16T12"), pd.Timestamp("2031-02-15")]
    # no month has more days than there are
    assert series.values["days"].tolist() == [30.0, 28.0]
    assert series.values["spread"].tolist() == [6.0, 6.0]


def test_the_hour_that_the_end_of_summer_time_repeats_is_told_mooring_by_mooring(read_text):
    zone = 'column = "day"\nzone = "America/Los_Angeles"\nrepeated_hour = "by_order"'
    stamps = ("2031-11-02 01:30", "2031-11-02 01:30")
    rows = [f"{site},{stamp},150" for stamp in stamps for site in ("TB-01", "TB-02")]
    series = read_text("site,day,z20\n" + "\n".join(rows), LONG.replace('column = "day"', zone))
    assert series.rows_quarantined == 0
    # first in summer time, UTC-7, then UTC-8
    assert series.values["time"].tolist() == list(pd.to_datetime(["2031-11-02 08:30", "2031-11-02 09:30"] * 2))


# --------------------------------------------------------------------------------------------------------------
# Quarantine


def test_each_row_that_cannot_be_used_goes_to_quarantine_with_its_reason(read_text):
    layout = LONG + 'error = { total = "e", persistent_share = 0.5 }\nquality = { column = "q", flags = { "A" = 1 } }\n'
    rows = {
        "TB-01,2031-01-01,150,4,A": None,
        "TB-01,2031-01-01,151,4,A": "mooring and time are those of line 2",
        "TB-31,2031-01-01,150,4,A": "the configuration has no mooring 'TB-31'; did you mean 'TB-30'?",
        ",2031-01-01,150,4,A": "the mooring is missing",
        "TB-01,2031-01-02,-3,4,A": "isotherm_depth is not between 0 and 500 m",
        "TB-01,2031-01-03,999.9,4,A": "isotherm_depth is not between 0 and 500 m",
        "TB-01,2031-01-04,150,-4,A": "the error is negative",
        "TB-01,2031-01-05,deep,4,A": "column 'z20': 'deep' is neither a number nor a missing token",
        "TB-01,2031-13-05,150,4,A": "the time cannot be read",
        "TB-01,2031-01-06,150,4,B": "column 'q': the mark 'B' is in no table; say in the layout what it means",
        "TB-01,2031-01-07,150,4": "4 cells where there are 5 columns",
        "TB-01,2031-01-08,,,A": None,
    }
    series = read_text("\n".join(["site,day,z20,e,q", *rows]), layout)
    assert reasons(series) == {line: reason for line, reason in enumerate(rows.values(), start=2) if reason is not None}
    assert (series.rows_read, series.rows_kept, series.rows_quarantined) == (12, 2, 10)
    assert series.quarantine["text"].tolist() == [row for row, reason in rows.items() if reason is not None]


def test_counts_and_deployments_are_whole_numbers(read_text):
    layout = LONG.replace('column = "day"', 'column = "day"\nmean = "month"') + 'days = "n"\nspread = "sd"\n'
    layout = layout.replace("[mooring]", 'deployment = "d"\n[mooring]')
    rows = ("TB-01,2031-01-01,150,30,5,1", "TB-01,2031-02-01,150,2.5,5,1", "TB-01,2031-03-01,150,32,5,1",
            "TB-01,2031-04-01,150,30,-1,1", "TB-01,2031-05-01,150,30,5,0", "TB-01,2031-06-01,150,30,5,-99")  # fmt: skip
    series = read_text("\n".join(["site,day,z20,n,sd,d", *rows]), layout)
    assert reasons(series) == {
        3: "the number of days is no whole number from 0 to 31",
        4: "the number of days is no whole number from 0 to 31",
        5: "the spread of the days is negative",
        6: "the deployment is no whole number from 1 to 999",
    }
    assert series.values["deployment"].tolist() == [1.0, pytest.approx(np.nan, nan_ok=True)]


def test_a_file_of_unknown_moorings_alone_is_refused_with_the_reason(read_text):
    with pytest.raises(DataError, match=r"no row could be understood.*line 2: the configuration has no mooring 'A'"):
        read_text("site,day,z20\nA,2031-01-01,150\n")


def test_a_wide_file_of_unknown_moorings_alone_is_refused(read_text):
    with pytest.raises(DataError, match=r"no column is of a mooring of the configuration.*found 'A'"):
        read_text("year,month,A,A_error\n2031,1,150,3\n", MONTHS)


@pytest.mark.parametrize(
    ("text", "match"),
    [
        ("site,day,depth\nTB-01,2031-01-01,150\n", "the series column is missing.*expected a column 'z20'"),
        ("site,day,z20\n", "there are no data rows"),
        ("site,day,z20\nTB-01,2031-01-01,-99\n", "no row has a value.*check missing"),
        ("", "the file is empty"),
    ],
)
def test_a_file_that_is_not_what_the_layout_says_is_refused(read_text, text, match):
    with pytest.raises(DataError, match=match):
        read_text(text)


@settings(max_examples=60, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(
    rows=st.lists(
        st.tuples(
            st.sampled_from(["TB-01", "TB-02", "TB-9", ""]),
            st.dates(min_value=pd.Timestamp("2031-01-01").date(), max_value=pd.Timestamp("2031-01-06").date()),
            st.sampled_from(["150", "0", "-1", "x", "", "1e3", "12.5"]),
        ),
        max_size=25,
    )
)
def test_what_is_kept_is_what_an_independent_reader_keeps(write, layout_of, rows):
    text = "site,day,z20\n" + "".join(f"{site},{day},{depth}\n" for site, day, depth in rows)
    kept = {}
    for row in csv.DictReader(text.splitlines()):
        depth = {"150": 150.0, "0": 0.0, "": np.nan, "12.5": 12.5}.get(row["z20"])
        if row["site"] in KNOWN and depth is not None:
            kept.setdefault((row["site"], row["day"]), depth)
    path = write(text)
    if not any(np.isfinite(depth) for depth in kept.values()):
        with pytest.raises(DataError, match=r"no row|no data rows"):
            read_series(path, layout_of(LONG), moorings=KNOWN)
        return
    series = read_series(path, layout_of(LONG), moorings=KNOWN)
    assert (
        series.rows_read
        == len(rows)
        == series.rows_kept + series.rows_quarantined
        == series.rows_kept + len(series.rejected)
    )
    moorings = {site for (site, _), depth in kept.items() if np.isfinite(depth)}
    expected = {key: depth for key, depth in kept.items() if key[0] in moorings}
    found = series.values
    assert [*zip(found["mooring"], found["time"].dt.strftime("%Y-%m-%d"), strict=True)] == sorted(expected)
    np.testing.assert_array_equal(found["isotherm_depth"], [expected[key] for key in sorted(expected)])
    assert series.rows_kept == len(kept)


# --------------------------------------------------------------------------------------------------------------
# Notes


def test_depths_without_an_error_are_counted_and_told(read_text):
    layout = LONG + 'error = { independent = "e", persistent = 3.0 }\n'
    series = read_text("site,day,z20,e\nTB-01,2031-01-01,150,2\nTB-01,2031-01-02,150,\nTB-01,2031-01-03,,\n", layout)
    assert series.notes == (
        "1 of 2 isotherm depths have no error; "
        "[column] series_error_independent and series_error_persistent are taken",
    )  # fmt: skip


# --------------------------------------------------------------------------------------------------------------
# Several files


def test_of_two_files_the_first_wins_and_what_only_the_second_has_completes_it(read_text):
    mixed = LONG + '[values.mixed_layer_depth]\ncolumn = "mld"\nthreshold = 0.2\nreference = 10.0\n'
    first = read_text("site,day,z20\nTB-01,2031-01-01,150\nTB-01,2031-01-02,\n", name="first.csv")
    second = read_text("site,day,z20,mld\nTB-01,2031-01-01,1,40\nTB-01,2031-01-02,2,\nTB-01,2031-01-03,3,\n"
                       "TB-02,2031-01-01,4,\n", mixed, name="second.csv")  # fmt: skip
    third = read_text("site,day,z20\nTB-01,2031-01-03,9\nTB-02,2031-01-05,5\n", name="third.csv")
    values, files = join_series([first, second, third])
    assert values["mooring"].tolist() == ["TB-01"] * 3 + ["TB-02"] * 2
    assert values["isotherm_depth"].tolist() == [150.0, 2.0, 3.0, 4.0, 5.0]
    assert values["mixed_layer_depth"].tolist()[0] == 40.0
    # of the second, line 2 lost its depth but not its mixed layer; of the third, line 2 has nothing left
    assert [file.rows_quarantined for file in files] == [0, 0, 1]
    reason = "a series that is listed before has this mooring and time, and comes first"
    assert reasons(files[2]) == {2: reason}
    assert files[2].quarantine["text"].tolist() == ["TB-01,2031-01-03,9"]


def test_days_and_months_of_one_mooring_do_not_meet(read_text):
    months = LONG.replace('column = "day"', 'column = "day"\nmean = "month"') + "complete = true\n"
    daily = read_text("site,day,z20\nTB-01,2031-01-16T12:00,150\n")
    monthly = read_text("site,day,z20\nTB-01,2031-01-16,140\n", months)
    values, files = join_series([daily, monthly])
    assert values[["is_month", "isotherm_depth"]].to_numpy().tolist() == [[False, 150.0], [True, 140.0]]
    assert [file.rows_kept for file in files] == [1, 1]


# --------------------------------------------------------------------------------------------------------------
# Layouts


@pytest.mark.parametrize(
    ("layout", "match"),
    [
        (LONG.replace("isotherm_depth", "isothermal_depth"),
         r"values.isothermal_depth: this key is not known; did you mean 'isotherm_depth'\?"),
        (LONG.replace("isotherm = 20.0", ""), r"values.isotherm_depth.isotherm: this key is missing"),
        (LONG + 'units = "degree_Celsius"\n', r"units: unknown units: 'degree_Celsius'; .* m or cm"),
        (LONG + 'units = "dbar"\n', r"unknown units: 'dbar'"),
        (LONG + "error = { total = 5.0 }\n", r"depth.error: expected independent and persistent, or total"),
        (LONG + 'error = { independent = 1.0, persistent = 2.0, total = "e" }\n', "expected independent and"),
        (LONG + "error = { independent = -1.0, persistent = 2.0 }\n", "a number that is not negative; found -1.0"),
        (LONG + "error = { independent = true, persistent = 2.0 }\n", "name of a column, or a number.*found True"),
        (LONG + 'quality = { column = "{mooring}", flags = { "1" = 1 } }\n', "in the name of every column"),
        (LONG.replace('"z20"', '"{mooring}"'), "column has no use here"),
        (LONG.replace('column = "day"', 'column = "day"\nmean = "month"'), "expected either complete = true or days"),
        (LONG + "complete = true\n", 'complete, days and spread are about months: expected mean = "month"'),
        (MONTHS.replace("complete = true", "days = 20"), "expected days and spread together"),
        (MONTHS.replace("complete = true", "days = 40\nspread = 5.0"), "expected at most 31 days, found 40"),
        (MONTHS.replace('mean = "month"', 'mean = "month"\nmean_hours = 24'), "expected either mean = "),
        (MONTHS.replace('mean = "month"', 'mean = "month"\nzone = "+10:00"'), "leave zone out"),
        (MONTHS.replace('"%Y %m"', '"%Y"'), "does not give year and month"),
        (LONG.replace('column = "day"', 'column = "day"\nformat = "%Y-%m"'), "does not give year, month and day"),
        (LONG[: LONG.index("[values")] + "[values]\n", "values: expected one or more of isotherm_depth"),
    ],
)  # fmt: skip
def test_layouts_that_cannot_be_meant_are_refused_with_their_place(layout_of, layout, match):
    with pytest.raises(ConfigError, match=match):
        layout_of(layout)


@pytest.mark.parametrize(
    ("layout", "mooring", "match"),
    [
        (LONG.replace('[mooring]\ncolumn = "site"\n', ""), None, "it is not said which mooring the series is of"),
        (LONG, "TB-01", "the mooring is said twice"),
        (MONTHS, "TB-01", "the mooring is said twice"),
    ],
)
def test_the_mooring_is_said_once(read_text, layout, mooring, match):
    with pytest.raises(RequestError, match=match):
        read_text("site,day,z20\nTB-01,2031-01-01,150\n", layout, mooring)


def test_layouts_of_chains_and_of_series_do_not_stand_for_one_another(write, wide, layout_of):
    path = write("date,T_1m\n2031-01-01,29\n")
    with pytest.raises(RequestError, match=r'layout of a chain, not of a series.*found kind = "wide"'):
        read_series(path, wide, moorings=KNOWN)
    with pytest.raises(RequestError, match=r"layout of a series, not of a chain.*list the file under \[\[series\]\]"):
        read(path, layout_of(LONG))


def test_the_example_is_a_layout_of_series():
    assert load_layout(EXAMPLE).values.definitions == {
        "isotherm": 20.0,
        "mixed_layer_threshold": 0.2,
        "mixed_layer_reference": 10.0,
    }
