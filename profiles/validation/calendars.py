"""The times of a model in any calendar, as the days and months that an array knows.

A date is what its calendar calls it: the 14th of March of a 365-day calendar is the 14th of March. Where the days of
two calendars do not correspond (360 days), values are averaged over the model's own months, and months are compared.
"""

from __future__ import annotations

import itertools
from dataclasses import dataclass
from datetime import timedelta
from typing import Any

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from profiles.errors import DataError

Times = NDArray[np.datetime64]

DAILY, SEVERAL_DAYS, MONTHLY = "daily", "several days", "monthly"
_SAME_DATES = ("standard", "gregorian", "proleptic_gregorian")
_DATES_BY_NAME = ("noleap", "365_day", "all_leap", "366_day", "julian")
_YEARS = 1678, 2261
_LONGEST_DAY, _SHORTEST_MONTH, _LONGEST_MONTH = 1.5, 27.0, 32.0  # days


@dataclass(frozen=True)
class ModelTime:
    """What one value of the model stands for, and the steps at which it is compared.

    ``step`` (value,) is the number of the step that a value belongs to, -1 where it belongs to none; ``start`` and
    ``stop`` (step,) bound each step in the array's calendar. ``averaging`` is one of :data:`DAILY`,
    :data:`SEVERAL_DAYS` and :data:`MONTHLY`, ``days`` the length of a step; ``note`` says how dates were understood.
    """

    calendar: str
    averaging: str
    days: float
    step: NDArray[np.int64]
    start: Times
    stop: Times
    note: str

    @property
    def middle(self) -> Times:
        """The middle of each step."""
        return self.start + (self.stop - self.start) // 2

    @property
    def month(self) -> Times:
        """The month of each step's middle."""
        return self.middle.astype("datetime64[M]")


def read_time(time: xr.DataArray, bounds: xr.DataArray | None, averaging_days: float, where: str) -> ModelTime:
    """Understand a model's time coordinate.

    Parameters
    ----------
    time : xarray.DataArray, dims (time,)
        Decoded: datetime64 or cftime dates.
    bounds : xarray.DataArray, optional
        The start and the end of what each value is the mean of, dims (time, 2).
    averaging_days : float
        Days that a value is the mean of; 0 where bounds or the spacing tell.
    where : str
        Named in errors.

    Raises
    ------
    DataError
        Where there is no date, the times do not increase, the years are out of range, or a value is the mean of more
        than a month.
    """
    dates = time.values
    if dates.size == 0 or not (_is_date(dates.flat[0])):
        raise DataError(
            "the model's times are no dates",
            where=where,
            expected="CF time: units such as 'days since 2031-01-01' and, if need be, a calendar",
            found=f"{time.name}: {time.attrs.get('units', 'no units')}, {dates.dtype}",
        )
    calendar = str(time.dt.calendar)
    limits = _limits(dates, bounds, averaging_days, where)
    length = float(np.median([_days_between(first, last) for first, last in limits]))
    middle = [first + (last - first) / 2 for first, last in limits]
    _check_order(middle, where)
    if length > _LONGEST_MONTH:
        raise DataError(
            "a value of the model is the mean of more than a month",
            where=where,
            expected="means over a month or less",
            found=f"{length:g} days",
            advice="give monthly or daily output, or declare averaging_days in [validation]",
        )
    _check_years(limits, where)
    named = np.array([_named(date) for date in middle], dtype="datetime64[us]")
    if length >= _SHORTEST_MONTH or calendar not in (*_SAME_DATES, *_DATES_BY_NAME):
        return _by_month(calendar, middle, length)
    if length > _LONGEST_DAY:
        return _by_limits(calendar, limits, length)
    return _by_day(calendar, named, length)


def _is_date(value: Any) -> bool:
    return isinstance(value, np.datetime64) or hasattr(value, "timetuple")


def _limits(
    dates: NDArray[Any], bounds: xr.DataArray | None, averaging_days: float, where: str
) -> list[tuple[Any, Any]]:
    """Return the first and the last instant of what each value is the mean of, in the calendar's own dates."""
    if bounds is not None:
        return [(_date(first), _date(last)) for first, last in bounds.values]
    if averaging_days:
        length = averaging_days
    elif dates.size > 1:
        length = float(np.median([_days_between(_date(a), _date(b)) for a, b in itertools.pairwise(dates)]))
    else:
        raise DataError(
            "one time alone does not say what it is the mean of",
            where=where,
            expected="time bounds, or more than one time",
            found=str(dates[0]),
            advice="declare averaging_days in [validation]: 1, or 30 for a month",
        )
    if _SHORTEST_MONTH <= length <= _LONGEST_MONTH:
        # A month without bounds is the one that its stamp lies in, wherever in it that is.
        return [_whole_month(_date(date)) for date in dates]
    half = timedelta(days=0.5 * length)
    return [(_date(date) - half, _date(date) + half) for date in dates]


def _whole_month(date: Any) -> tuple[Any, Any]:
    first = date.replace(day=1, hour=0, minute=0, second=0, microsecond=0)
    after = first.replace(year=first.year + (first.month == 12), month=first.month % 12 + 1)
    return first, after


def _date(value: Any) -> Any:
    """Return a date with year, month and day, of the value's own calendar."""
    return value.astype("datetime64[us]").astype(object) if isinstance(value, np.datetime64) else value


def _days_between(first: Any, last: Any) -> float:
    return float((last - first).total_seconds() / 86400.0)


def _check_order(middle: list[Any], where: str) -> None:
    for number, (before, after) in enumerate(itertools.pairwise(middle), start=2):
        if not before < after:
            raise DataError(
                "the model's times do not increase",
                where=where,
                expected="each time once, in order",
                found=f"{after} as number {number}, after {before}",
                advice="leave out the file that repeats a time",
            )


def _check_years(limits: list[tuple[Any, Any]], where: str) -> None:
    """Dates are held in nanoseconds, which wrap about outside these years."""
    first, last = limits[0][0].year, limits[-1][1].year
    if not (_YEARS[0] <= first and last <= _YEARS[1]):
        raise DataError(
            "the model's years are out of range",
            where=where,
            expected=f"years {_YEARS[0]} to {_YEARS[1]}, those of the array's record",
            found=f"{first} to {last}" if first != last else f"{first}",
            advice="leave out the others, or give the times the years that they stand for",
        )


def _named(date: Any) -> np.datetime64:
    """Return a date as the array's calendar names it, NaT where that calendar has no such day."""
    try:
        day = np.datetime64(f"{date.year:04d}-{date.month:02d}-{date.day:02d}", "us")
    except ValueError:
        return np.datetime64("NaT", "us")
    seconds = (date.hour * 60 + date.minute) * 60 + date.second
    return np.datetime64(day + np.timedelta64(seconds * 1_000_000 + date.microsecond, "us"))


def _by_month(calendar: str, middle: list[Any], length: float) -> ModelTime:
    months = np.array([f"{date.year:04d}-{date.month:02d}" for date in middle], dtype="datetime64[M]")
    steps, number = np.unique(months, return_inverse=True)
    note = (
        "monthly means" if length >= _SHORTEST_MONTH else f"means of {length:g} days averaged over the model's months"
    )
    return ModelTime(
        calendar=calendar,
        averaging=MONTHLY,
        days=30.4375,
        step=number.astype(np.int64),
        start=steps.astype("datetime64[ns]"),
        stop=(steps + 1).astype("datetime64[ns]"),
        note=f"{note}; calendar {calendar}, months by name",
    )


def _by_day(calendar: str, named: Times, length: float) -> ModelTime:
    known = ~np.isnat(named)
    days = named.astype("datetime64[D]")
    steps, number = np.unique(days[known], return_inverse=True)
    step = np.full(named.size, -1, dtype=np.int64)
    step[known] = number
    lost = int((~known).sum())
    kind = "daily means" if length > 0.75 else f"values every {length * 24.0:.3g} h averaged over days"
    dropped = f"; {lost} days that the array's calendar has not were left out" if lost else ""
    return ModelTime(
        calendar=calendar,
        averaging=DAILY,
        days=1.0,
        step=step,
        start=steps.astype("datetime64[ns]"),
        stop=(steps + 1).astype("datetime64[ns]"),
        note=f"{kind}; calendar {calendar}, days by name{dropped}",
    )


def _by_limits(calendar: str, limits: list[tuple[Any, Any]], length: float) -> ModelTime:
    edges = np.array([[_named(first), _named(last)] for first, last in limits], dtype="datetime64[ns]")
    known = ~np.isnat(edges).any(axis=1)
    step = np.where(known, np.cumsum(known) - 1, -1)
    return ModelTime(
        calendar=calendar,
        averaging=SEVERAL_DAYS,
        days=length,
        step=step.astype(np.int64),
        start=edges[known, 0],
        stop=edges[known, 1],
        note=f"means of {length:g} days; calendar {calendar}, days by name",
    )
