"""A monthly series: what is accepted, what is refused and how it says so."""

from __future__ import annotations

import re

import numpy as np
import pytest
import xarray as xr

from profiles.errors import DataError
from profiles.precursor import monthly_series, overlap
from profiles.precursor.series import as_table, calendar_month, check_varies, middle_of, month_of

NAN = np.nan
MONTHS = np.arange("2031-01", "2033-01", dtype="datetime64[M]").astype("datetime64[ns]")


def later(months):
    return (MONTHS.astype("datetime64[M]") + months).astype("datetime64[ns]")


VALUES = 26.0 + np.sin(np.arange(24.0))


def test_stamp_is_the_middle_of_the_month():
    # January has 31 days: 16th at 12:00; February 2031 has 28: 15th at 0:00; February 2032 29: 15th at 12:00.
    stamps = middle_of(np.array(["2031-01", "2031-02", "2032-02"], dtype="datetime64[M]"))
    expected = np.array(["2031-01-16T12", "2031-02-15T00", "2032-02-15T12"], dtype="datetime64[ns]")
    assert (stamps == expected).all()


@pytest.mark.parametrize("day", [0, 14, 27])
def test_any_day_of_the_month_stands_for_it(day):
    series = monthly_series(VALUES, MONTHS + np.timedelta64(day, "D"), name="surface_temperature_index")
    assert (series["time"].values == middle_of(MONTHS)).all()
    assert series.attrs["units"] == "degree_Celsius"
    assert series.dtype == np.float64


def test_calendar_months_are_1_to_12_before_1970_too():
    times = np.array(["1949-12-31", "1969-12-01", "1970-01-01", "2031-07-15"], dtype="datetime64[ns]")
    assert calendar_month(times).tolist() == [12, 12, 1, 7]


def test_missing_ends_are_cut_off_and_missing_middles_stay():
    values = VALUES.copy()
    values[[0, 1, 10, 23]] = NAN
    series = monthly_series(values, MONTHS, name="x")
    assert series.size == 21
    assert month_of(series["time"])[0] == np.datetime64("2031-03")
    assert np.flatnonzero(np.isnan(series.values)).tolist() == [8]


def test_labelled_series_keep_their_name_units_and_attributes():
    given = xr.DataArray(
        VALUES, dims="time", coords={"time": MONTHS}, name="height", attrs={"units": "m", "source": "gauge"}
    )
    series = monthly_series(given)
    assert (series.name, series.attrs["units"], series.attrs["source"]) == ("height", "m", "gauge")


def test_a_series_of_a_series_is_the_same():
    once = monthly_series(VALUES, MONTHS, name="x")
    xr.testing.assert_identical(monthly_series(once), once)


def test_left_out_months_are_named():
    kept = np.delete(np.arange(24), [5, 6])
    with pytest.raises(DataError, match=r"sst\.csv: months are left out; expected 2031-06 .*; found 2031-08 after"):
        monthly_series(VALUES[kept], MONTHS[kept], name="x", where="sst.csv")


def test_repeated_and_disordered_months_are_named():
    order = np.array([0, 1, 1, *range(2, 23)])
    with pytest.raises(DataError, match=r"a month stands twice or out of order; .*found 2031-02 after 2031-02"):
        monthly_series(VALUES, MONTHS[order], name="x")
    order = np.array([0, 1, 3, 2, *range(4, 24)])
    with pytest.raises(DataError, match="found 2031-04 after 2031-02, and 2 more such steps"):
        monthly_series(VALUES, MONTHS[order], name="x")


@pytest.mark.parametrize(("step", "found"), [("D", "most steps are of 0 months"), ("Q", "most steps are of 3 months")])
def test_other_steps_are_not_monthly(step, found):
    days = np.datetime64("2031-01-01", "ns") + np.arange(24) * np.timedelta64(1, "D")
    times = days if step == "D" else MONTHS[0].astype("datetime64[M]") + 3 * np.arange(24)
    with pytest.raises(DataError, match=f"steps of the series are not monthly; .*{found}; average it to months"):
        monthly_series(VALUES, np.asarray(times).astype("datetime64[ns]"), name="x")


@pytest.mark.parametrize("fill", [-99.99, -9.99, -999.0, 1e20, 99.9])
def test_a_fill_value_left_among_the_data_is_named(fill):
    values = VALUES - 26.0
    values[[7, 9]] = fill
    with pytest.raises(
        DataError,
        match=f"'missing' was left among the data; .*found {re.escape(format(fill, 'g'))} in 2031-08 and 1 more",
    ):
        monthly_series(values, MONTHS, name="x")


def test_values_that_only_look_like_a_fill_value_stand():
    # A pressure index on the larger scale reaches -9.9.
    values = 10.0 * (VALUES - 26.0)
    values[3] = -9.9
    assert monthly_series(values, MONTHS, name="pressure_difference_index").values[3] == -9.9


@pytest.mark.parametrize("shift", [273.15, -273.15])
def test_kelvin_taken_for_celsius_is_refused(shift):
    looks = "which looks like kelvin" if shift > 0 else "a median of -2"
    with pytest.raises(DataError, match=f"temperatures are not in °C; .*{looks}.*subtract 273.15"):
        monthly_series(VALUES + shift, MONTHS, name="surface_temperature_index")


def test_kelvin_without_a_name_or_units_is_refused_too():
    with pytest.raises(DataError, match=r"looks like kelvin; subtract 273.15, or state the units"):
        monthly_series(VALUES + 273.15, MONTHS, name="x")
    assert monthly_series(VALUES + 273.15, MONTHS, name="x", units="m").size == 24


def test_other_quantities_may_be_large():
    assert monthly_series(1e15 * VALUES, MONTHS, name="warm_water_volume_total").attrs["units"] == "m3"


@pytest.mark.parametrize(
    ("values", "times", "message"),
    [
        (VALUES, None, "the series has no time"),
        (VALUES, np.arange(24), "the times are no dates; expected datetime64; found int64"),
        (VALUES[:-1], MONTHS, r"this is no series; .*shape \(23,\) at 24 times"),
        (VALUES.reshape(2, 12), MONTHS, r"shape \(2, 12\)"),
        (
            VALUES,
            np.where(np.arange(24) == 3, np.datetime64("NaT"), MONTHS),
            "a time is missing; found none at value 4",
        ),
        (np.full(24, NAN), MONTHS, "too few values; expected two or more; found 0"),
        (np.where(np.arange(24) == 4, 1.0, NAN), MONTHS, "found 1"),
        (np.where(np.arange(24) == 4, np.inf, VALUES), MONTHS, "a value is infinite; found 2031-05"),
    ],
)
def test_what_is_no_series_is_refused(values, times, message):
    with pytest.raises(DataError, match=message):
        monthly_series(values, times, name="x")


@pytest.mark.parametrize("value", [0.0, 0.1, 1e15])
def test_a_constant_is_refused(value):
    with pytest.raises(DataError, match=r"target x: the series is constant; .*in all of 24 months"):
        check_varies(monthly_series(np.full(24, value), MONTHS, name="x"), "target x")


def test_small_variations_of_a_large_number_are_no_constant():
    check_varies(monthly_series(1e15 + 1e12 * VALUES, MONTHS, name="x"), "x")


def test_overlap_is_what_all_span():
    one = monthly_series(VALUES, MONTHS, name="a")
    other = monthly_series(VALUES, later(6), name="b")
    parts = overlap(one, other)
    assert [part.size for part in parts] == [18, 18]
    assert (parts[0]["time"].values == parts[1]["time"].values).all()


def test_series_apart_are_refused_with_both_spans():
    one = monthly_series(VALUES, MONTHS, name="a")
    other = monthly_series(VALUES, later(98), name="b")
    with pytest.raises(DataError, match=r"do not overlap; .*found a 2031-01 to 2032-12, b 2039-03 to 2041-02"):
        overlap(one, other)


def test_table_has_a_row_for_every_month_of_either():
    one = monthly_series(VALUES[:3], MONTHS[:3], name="a")
    other = monthly_series(VALUES[1:5], MONTHS[1:5], name="b")
    table = as_table(first=one, second=other)
    assert table.shape == (5, 2)
    assert table["first"].isna().tolist() == [False, False, False, True, True]
