"""Dates of every CF calendar against cftime, which knows their lengths of months and years.

Source: CF conventions, section 4.4.1, as the library cftime has them.
"""

from __future__ import annotations

from collections import Counter
from pathlib import Path

import cftime
import numpy as np
import pytest
import xarray as xr

from profiles.errors import DataError
from profiles.validation import open_model
from profiles.validation.calendars import DAILY, MONTHLY, ModelTime, read_time
from profiles.validation.sources import open_source

BY_NAME = ["standard", "gregorian", "proleptic_gregorian", "noleap", "365_day", "all_leap", "366_day", "julian"]
YEARS = 3


def dates_of(calendar: str, step: float = 1.0, offset: float = 0.5) -> np.ndarray:
    """Return cftime's dates of three years from 2031 on, 2032 among them, which is a leap year."""
    units = "days since 2031-01-01"
    last = float(cftime.date2num(cftime.datetime(2031 + YEARS, 1, 1, calendar=calendar), units, calendar))
    numbers = np.arange(offset, last, step)
    return np.asarray(cftime.num2date(numbers, units, calendar, only_use_cftime_datetimes=True))


def read(dates: np.ndarray, days: float = 0.0) -> ModelTime:
    return read_time(xr.DataArray(dates, dims="time", name="time"), None, days, "model")


def exists(date: cftime.datetime) -> bool:
    """Tell by cftime whether the array's calendar has a day of this name."""
    try:
        cftime.datetime(date.year, date.month, date.day, calendar="proleptic_gregorian")
    except ValueError:
        return False
    return True


@pytest.mark.parametrize("calendar", BY_NAME)
@pytest.mark.parametrize("offset", [0.0, 0.5, 0.99])
def test_each_day_is_the_day_of_its_name(calendar: str, offset: float) -> None:
    dates = dates_of(calendar, offset=offset)
    found = read(dates)
    assert found.averaging == DAILY
    kept = np.array([exists(date) for date in dates])
    np.testing.assert_array_equal(found.step >= 0, kept)
    names = [date.strftime("%Y-%m-%d") for date in dates[kept]]
    assert found.start[found.step[kept]].astype("datetime64[D]").astype(str).tolist() == names
    assert found.month[found.step[kept]].astype(str).tolist() == [name[:7] for name in names]


def test_calendars_have_the_days_that_cftime_gives_them() -> None:
    """Of 2031 to 2033 the array knows 1096; without leap days 1095 of them, and a calendar of leap years has 2 more."""
    counts = {calendar: int((read(dates_of(calendar)).step >= 0).sum()) for calendar in BY_NAME}
    assert counts == dict.fromkeys(BY_NAME, 1096) | {"noleap": 1095, "365_day": 1095}
    assert dates_of("all_leap").size == 1098


@pytest.mark.parametrize("step", [1.0, 5.0, 10.0])
def test_days_of_a_year_of_360_are_averaged_over_their_own_months(step: float) -> None:
    dates = dates_of("360_day", step, 0.5 * step)
    found = read(dates)
    assert found.averaging == MONTHLY
    expected = Counter(f"{date.year:04d}-{date.month:02d}" for date in dates)
    assert Counter(found.month[found.step].astype(str).tolist()) == expected
    assert set(expected.values()) == {int(30 / step)}


@pytest.mark.parametrize("calendar", [*BY_NAME, "360_day"])
def test_months_are_the_months_of_their_names(calendar: str) -> None:
    months = [cftime.datetime(2031 + n // 12, n % 12 + 1, 15, calendar=calendar) for n in range(36)]
    found = read(np.array(months))
    assert found.averaging == MONTHLY
    assert found.month.astype(str).tolist() == [date.strftime("%Y-%m") for date in months]
    np.testing.assert_array_equal(found.stop[:-1], found.start[1:])


@pytest.mark.parametrize("calendar", ["standard", "noleap", "360_day", "julian", "all_leap"])
def test_a_file_in_a_calendar_is_read_in_it(tmp_path: Path, calendar: str) -> None:
    """The numbers of the file are cftime's own, decoded on the way in."""
    units = "hours since 1950-01-01 06:00"
    months = [cftime.datetime(2031, month, 16, calendar=calendar) for month in range(1, 13)]
    warm = {"standard_name": "sea_water_temperature", "units": "degree_Celsius"}
    xr.Dataset(
        {"warm": (("time", "lev", "lat", "lon"), np.zeros((12, 2, 3, 3)), warm)},
        coords={
            "time": ("time", cftime.date2num(months, units, calendar), {"units": units, "calendar": calendar}),
            "lev": ("lev", [5.0, 100.0], {"units": "m", "positive": "down"}),
            "lat": ("lat", [-5.0, 0.0, 5.0], {"units": "degrees_north"}),
            "lon": ("lon", [150.0, 200.0, 250.0], {"units": "degrees_east"}),
        },
    ).to_netcdf(tmp_path / "model.nc")
    found = open_model(open_source(tmp_path / "model.nc")).time
    assert found.month.astype(str).tolist() == [f"2031-{month:02d}" for month in range(1, 13)]
    assert found.calendar in (calendar, "proleptic_gregorian")  # what decodes to NumPy's dates has NumPy's calendar


def test_a_calendar_that_cftime_does_not_know_is_told(tmp_path: Path) -> None:
    path = tmp_path / "model.nc"
    odd = {"units": "days since 2031-01-01", "calendar": "lunar"}
    xr.Dataset(coords={"time": ("time", np.arange(3.0), odd)}).to_netcdf(path)
    with pytest.raises(DataError, match=r"model\.nc: the model's file cannot be read.*with CF times"):
        open_source(path)
