"""Dates of any calendar as days and months: by name, or by month where days do not correspond."""

from __future__ import annotations

import cftime
import numpy as np
import pytest
import xarray as xr

from profiles.errors import DataError
from profiles.validation.calendars import DAILY, MONTHLY, SEVERAL_DAYS, read_time


def read(dates, bounds=None, averaging_days=0.0):
    time = xr.DataArray(np.asarray(dates), dims="time", name="time")
    limits = None if bounds is None else xr.DataArray(np.asarray(bounds), dims=("time", "bnds"))
    return read_time(time, limits, averaging_days, "model")


def noons(calendar, first, count):
    start = cftime.datetime(*first, 12, calendar=calendar)
    return [start + np.timedelta64(day, "D").astype(object) for day in range(count)]


@pytest.mark.parametrize("calendar", ["noleap", "365_day", "julian", "standard", "proleptic_gregorian", "all_leap"])
def test_days_are_compared_by_name(calendar):
    found = read(noons(calendar, (2031, 3, 14), 5))
    assert found.averaging == DAILY
    assert list(found.start.astype("datetime64[D]").astype(str)) == [f"2031-03-{day}" for day in range(14, 19)]
    assert (found.stop - found.start == np.timedelta64(1, "D")).all()


def test_a_year_without_leap_days_names_the_first_of_march_after_the_28th():
    found = read(noons("noleap", (2032, 2, 27), 4))
    assert list(found.start.astype("datetime64[D]").astype(str)) == [
        "2032-02-27",
        "2032-02-28",
        "2032-03-01",
        "2032-03-02",
    ]


def test_a_day_that_the_array_does_not_know_is_left_out():
    # 2031 is no leap year; the all-leap calendar has a 29th of February in it.
    found = read(noons("all_leap", (2031, 2, 28), 3))
    assert list(found.step) == [0, -1, 1]
    assert "1 days that the array's calendar has not were left out" in found.note


def test_days_of_a_360_day_year_are_averaged_over_its_months():
    found = read(noons("360_day", (2031, 1, 1), 90))
    assert found.averaging == MONTHLY
    assert list(np.bincount(found.step)) == [30, 30, 30]
    assert list(found.month.astype(str)) == ["2031-01", "2031-02", "2031-03"]
    assert (found.stop[1] - found.start[1]) == np.timedelta64(28, "D")  # the array's own February


def test_bounds_say_which_month_a_stamp_at_its_end_means():
    ends = [cftime.datetime(2031, month + 1, 1, calendar="noleap") for month in (1, 2, 3)]
    starts = [cftime.datetime(2031, month, 1, calendar="noleap") for month in (1, 2, 3)]
    with_bounds = read(ends, np.stack([starts, ends], axis=1))
    assert list(with_bounds.month.astype(str)) == ["2031-01", "2031-02", "2031-03"]
    # Without bounds a month is the one that its stamp lies in.
    assert list(read(ends).month.astype(str)) == ["2031-02", "2031-03", "2031-04"]


def test_five_days_are_the_five_days_about_their_stamp():
    found = read(np.array(["2031-01-03T12", "2031-01-08T12", "2031-01-13T12"], dtype="datetime64[ns]"))
    assert found.averaging == SEVERAL_DAYS
    assert found.days == 5.0
    assert list(found.start.astype(str)) == [f"2031-01-{day}T00:00:00.000000000" for day in ("01", "06", "11")]


def test_values_through_the_day_are_averaged_over_it():
    stamps = np.datetime64("2031-01-01T03", "ns") + np.arange(8) * np.timedelta64(6, "h")
    found = read(stamps)
    assert found.averaging == DAILY
    assert list(found.step) == [0, 0, 0, 0, 1, 1, 1, 1]
    assert found.note.startswith("values every 6 h averaged over days")


def test_one_time_alone_needs_its_length():
    alone = np.array(["2031-01-16"], dtype="datetime64[ns]")
    with pytest.raises(DataError, match=r"one time alone does not say.*declare averaging_days"):
        read(alone)
    assert read(alone, averaging_days=30.0).month.astype(str) == ["2031-01"]


def test_means_over_years_are_refused():
    with pytest.raises(DataError, match=r"mean of more than a month.*found 365 days"):
        read(np.array(["2031-07-01", "2032-06-30", "2033-06-30"], dtype="datetime64[ns]"))


def test_a_repeated_time_is_refused():
    twice = np.array(["2031-01-01T12", "2031-01-02T12", "2031-01-02T12", "2031-01-03T12"], dtype="datetime64[ns]")
    with pytest.raises(DataError, match=r"do not increase.*2031-01-02 12:00:00 as number 3"):
        read(twice)


def test_numbers_are_no_dates():
    with pytest.raises(DataError, match=r"the model's times are no dates.*no units, float64"):
        read(np.arange(3.0))


@pytest.mark.parametrize(("year", "found"), [(1, "found 1;"), (862, "found 862;"), (2300, "found 2300;")])
def test_years_that_nanoseconds_cannot_hold_are_refused(year, found):
    """They wrap about every 584.6 years: the year 862 would be 2031."""
    with pytest.raises(DataError, match=rf"the model's years are out of range; expected years 1678 to 2261.*{found}"):
        read(noons("noleap", (year, 3, 1), 3))
