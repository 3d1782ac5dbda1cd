"""Stamps of text to UTC."""

from __future__ import annotations

import re
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field
from datetime import UTC, datetime, timedelta, timezone, tzinfo
from functools import lru_cache
from typing import Any
from zoneinfo import ZoneInfo, available_timezones

import cf_units
import numpy as np
import pandas as pd
from numpy.typing import NDArray

from profiles.ingest.stamps import NOT_DECIDED, as_matrix, compiled, read_stamps
from profiles.ingest.wording import nearest

ISO_8601 = "iso8601"
MOST_LETTERS = 100  # of a stamp (ours)

# A stamp that itself says how far it is from UTC: Z, or an offset after the time of day.
_WITH_OFFSET = re.compile(r"[Zz]$|[Tt ].*[+-][0-9]{2}(?::?[0-9]{2})?$")
# ISO 8601-1:2019 (from memory), calendar dates, with a blank allowed for the T: pandas also reads stamps cut short.
_ISO_STAMP = re.compile(
    r"(?:[0-9]{4}-[0-9]{2}-[0-9]{2}|[0-9]{8})"
    r"(?:[T ][0-9]{2}(?::[0-9]{2}(?::[0-9]{2}(?:\.[0-9]+)?)?|(?:[0-9]{2}){1,2}|[0-9]{4}\.[0-9]+)?"
    r" ?(?:Z|[+-][0-9]{2}(?::?[0-9]{2})?)?)?"
)
# Digits of each number of a strptime format; where two numbers touch, fewer could be read in more than one way.
_DIGITS = {"Y": "4", "y": "2", "m": "2", "d": "2", "H": "2", "I": "2", "M": "2", "S": "2", "j": "3", "f": "1,9"}
_DIRECTIVE = re.compile(r"%(.)")
_DIGIT = re.compile(r"[0-9]")
_CARRIED = re.compile(r"6[01]|366")  # stands in every stamp with a leap second or the last day of a leap year
_FIRST, _LAST = (
    np.datetime64("1678-01-01", "us"),
    np.datetime64("2262-01-01", "us"),
)  # what datetime64[ns] holds
_NAT = np.datetime64("NaT", "ns")
_SINCE_1970 = "seconds since 1970-01-01"
_LONGEST_SECONDS = 1e12  # from the zero of some units; in microseconds it fits into 64 bits

UNREADABLE = "the time cannot be read"
NOT_ON_THE_CLOCK = "this local time does not exist, or exists twice, in the layout's zone"

Times = NDArray[np.datetime64]


# --------------------------------------------------------------------------------------------------------------
# What a layout may name


@lru_cache(maxsize=64)  # the list of zones is read from disk
def parse_zone(name: str) -> tzinfo:
    """Return the zone of ``"UTC"``, an offset like ``"+10:00"`` or an IANA name; ValueError for others."""
    if name.upper() in {"UTC", "Z"}:
        return UTC
    if name[:1] in {"+", "-"}:
        return _offset_zone(name)
    if name in available_timezones():
        return ZoneInfo(name)
    raise ValueError(
        f"no such time zone: {name!r}; expected UTC, an offset like +10:00 or an IANA name"
        + nearest(name, available_timezones())
    )


def _offset_zone(name: str) -> tzinfo:
    try:
        offset = datetime.strptime(name, "%z").utcoffset()
    except ValueError:
        raise ValueError(f"no offset from UTC: {name!r}; expected hours and minutes like +10:00") from None
    return timezone(offset or timedelta(0))


def parse_units(units: str) -> tuple[float, np.datetime64]:
    """Return the seconds of one unit and the time of zero, for units like ``"seconds since 1970-01-01"``.

    Zero may lie before 1582-10-15, where dates are Julian (CF-1.11, section 4.4.1), and before Christ: year -4713 is
    4713 before. ValueError where they are no such units, or of a length that changes, as months and years do.
    """
    step = units.partition(" since ")[0].strip()
    try:
        known = cf_units.Unit(units, calendar=cf_units.CALENDAR_STANDARD)
        seconds = float(cf_units.Unit(step).convert(1.0, "second"))
        zero = float(known.convert(0.0, cf_units.Unit(_SINCE_1970, calendar=cf_units.CALENDAR_STANDARD)))
    except ValueError as error:
        raise ValueError(f"no units of time: {units!r}; expected for example 'seconds since 1970-01-01'") from error
    if "month" in step or "year" in step:
        raise ValueError(f"units of a length that changes: {units!r}; expected days, hours, minutes or seconds since")
    return seconds, np.datetime64(round(zero * 1e6), "us")


# --------------------------------------------------------------------------------------------------------------
# Stamps to what the clock showed


def clock_of_texts(stamps: Sequence[str] | NDArray[np.object_], time_format: str) -> tuple[Times, NDArray[np.bool_]]:
    """Read stamps of a strptime format or ``"iso8601"``, which must name at least the day.

    Returns
    -------
    clock : ndarray of datetime64[ns]
        As the clock showed them, those with an offset of their own in UTC; NaT where one cannot be read.
    is_utc : ndarray of bool
        Which those are.
    """
    texts = np.array(stamps, dtype=object)
    program = compiled(time_format)
    if program is None or not texts.size:
        return _read_slowly(texts, time_format), _with_offset(texts, time_format)
    clock, is_utc = read_stamps(as_matrix(texts), program)
    return finished(clock, is_utc, texts, time_format)


def finished(
    clock: NDArray[np.int64], is_utc: NDArray[np.bool_], texts: NDArray[np.object_], time_format: str
) -> tuple[Times, NDArray[np.bool_]]:
    """Read what :func:`profiles.ingest.stamps.read_stamps` left undecided; ``texts`` are of those only, or of all."""
    left = np.flatnonzero(clock == NOT_DECIDED)
    times = clock.view("datetime64[ns]").copy()
    if left.size:
        undecided = texts if texts.size == left.size else texts[left]
        times[left] = _read_slowly(undecided, time_format)
        is_utc[left] = _with_offset(undecided, time_format)
    return times, is_utc


def _read_slowly(texts: NDArray[np.object_], time_format: str) -> Times:
    is_iso = time_format == ISO_8601
    plausible = _ISO_STAMP.fullmatch if is_iso else _plausible(time_format)
    guarded = [text if len(text) <= MOST_LETTERS and plausible(text) else None for text in texts]
    read = pd.to_datetime(
        pd.Series(guarded, dtype=object),
        format="ISO8601" if is_iso else time_format,
        errors="coerce",
        utc=True,
    )
    clock = read.dt.tz_localize(None).to_numpy().astype("datetime64[us]")
    for place in np.flatnonzero([text is not None and _CARRIED.search(text) is not None for text in guarded]):
        if not np.isnat(clock[place]) and _is_carried(texts[place], clock[place], time_format):
            clock[place] = np.datetime64("NaT")
    return _in_range(clock)


@lru_cache(maxsize=32)
def _plausible(time_format: str) -> Callable[[str], Any]:
    """Return what tells texts that may be stamps: pandas also reads words such as "now", whatever the format."""
    pieces = _DIRECTIVE.split(time_format)
    literals, directives = pieces[::2], pieces[1::2]
    between = zip(literals[1:-1], directives[:-1], directives[1:], strict=True)
    if not any(not literal and {*pair} <= {*_DIGITS} for literal, *pair in between):
        return _DIGIT.search
    texts = [rf"[0-9]{{{_DIGITS[name]}}}" if name in _DIGITS else ".+" for name in directives]
    return re.compile(
        "".join(re.escape(literal) + text for literal, text in zip(literals, [*texts, ""], strict=True))
    ).fullmatch


def _is_carried(text: str, read: np.datetime64, time_format: str) -> bool:
    """Tell whether pandas, as strptime does, made another time of a second 60 or 61 or of a day 366 that is none."""
    moment = read.astype(datetime)
    if "%j" in time_format and "366" in text and (moment.month, moment.day) == (1, 1):
        return moment.strftime("%Y" if "%Y" in time_format else "%y") not in text
    try:
        datetime.strptime(text, time_format)
    except ValueError as error:
        return "second must be in 0..59" in str(error)
    return False


def _in_range(clock: Times) -> Times:
    clock[~((clock >= _FIRST) & (clock < _LAST))] = _NAT
    return clock.astype("datetime64[ns]")


def _with_offset(texts: NDArray[np.object_], time_format: str) -> NDArray[np.bool_]:
    if time_format != ISO_8601:
        return np.full(texts.size, "%z" in time_format or "%Z" in time_format)
    # The search takes the square of the length.
    found = (len(text) <= MOST_LETTERS and _WITH_OFFSET.search(text) is not None for text in texts)
    return np.fromiter(found, bool, texts.size)


def clock_of_numbers(numbers: NDArray[np.float64], units: str) -> Times:
    """Return numbers in ``units`` as times, to the millisecond; NaT for NaN and beyond 1678 to 2261."""
    seconds, zero = parse_units(units)
    return _after(np.full(numbers.shape, zero), numbers * seconds)


def _after(start: Times, seconds: NDArray[np.float64]) -> Times:
    """Return times so many seconds after others, to the millisecond; NaT where the sum is none."""
    possible = np.isfinite(seconds) & (np.abs(seconds) < _LONGEST_SECONDS)
    whole = np.where(possible, np.round(np.where(possible, seconds, 0.0) * 1e3), 0.0).astype("timedelta64[ms]")
    clock = start.astype("datetime64[us]") + whole.astype("timedelta64[us]")
    clock[~possible] = np.datetime64("NaT")
    return _in_range(clock)


_DAY_SECONDS = 86_400.0

#: Smallest and largest value of a number that makes part of a stamp, and the seconds of one unit of it.
_PARTS: Mapping[str, tuple[int, int, float]] = {
    "year_month_day": (1678_01_01, 2261_12_31, 0.0),
    "year": (1678, 2261, 0.0),
    "month": (1, 12, 0.0),
    "day": (1, 31, _DAY_SECONDS),
    "day_of_year": (1, 366, _DAY_SECONDS),
    "hour": (0, 24, 3_600.0),
    "hour_minute": (0, 2400, 0.0),
    "hour_minute_second": (0, 24_00_00, 0.0),
    "minute": (0, 59, 60.0),
    "second": (0, 59, 1.0),
}


def clock_of_parts(parts: Mapping[str, NDArray[np.float64]]) -> Times:
    """Return the times that numbers make together.

    Parameters
    ----------
    parts : mapping
        ``year`` with ``month`` and ``day``, or with ``day_of_year`` (from 1), or ``year_month_day`` (20310723); then
        ``hour``, ``minute``, ``second``, or ``hour_minute`` (1330 is half past one in the afternoon), or
        ``hour_minute_second`` (133000). Only the finest may have a fraction, and only where it is a number of its own.
        The hour 24 is midnight at the end of the day.

    Returns
    -------
    ndarray of datetime64[ns]
        To the millisecond; NaT where a part is missing, or they name no time that exists.
    """
    parts = {name: parts[name] for name in _PARTS if name in parts}
    wrong = np.zeros(next(iter(parts.values())).shape, bool)
    finest = [name for name in [*parts][-1:] if _PARTS[name][2]]
    for name, values in parts.items():
        least, most, _ = _PARTS[name]
        whole = np.floor(values)
        wrong |= ~((whole >= least) & (whole <= most)) | ((values != whole) & (name not in finest))
        parts[name] = np.where(wrong, np.maximum(least, 1), values)
    wrong |= _taken_apart(parts)
    day, is_date = _day(parts)
    seconds = parts["day_of_year" if "day_of_year" in parts else "day"] % 1.0 * _DAY_SECONDS
    for name in ("hour", "minute", "second"):
        if name in parts:
            seconds = seconds + parts[name] * _PARTS[name][2]
    wrong |= ~is_date | (seconds > _DAY_SECONDS)
    return np.where(wrong, _NAT, _after(day, seconds))


def _taken_apart(parts: dict[str, NDArray[np.float64]]) -> NDArray[np.bool_]:
    """Put numbers that hold several parts as those; return where that gives none."""
    wrong = np.zeros(next(iter(parts.values())).shape, bool)
    for together in ("year_month_day", "hour_minute", "hour_minute_second"):
        if together in parts:
            rest = parts.pop(together)
            for name in reversed(together.split("_")[1:]):
                rest, parts[name] = rest // 100, rest % 100
                wrong |= (parts[name] < _PARTS[name][0]) | (parts[name] > _PARTS[name][1])
                parts[name] = np.where(wrong, np.maximum(_PARTS[name][0], 1), parts[name])
            parts[together.partition("_")[0]] = rest
    return wrong


def _day(parts: Mapping[str, NDArray[np.float64]]) -> tuple[Times, NDArray[np.bool_]]:
    """Return the day that parts name, and whether there is one."""
    year = (parts["year"].astype(np.int64) - 1970).astype("datetime64[Y]")
    if "day_of_year" in parts:
        first, length_end = year.astype("datetime64[D]"), (year + 1).astype("datetime64[D]")
        day = first + (np.floor(parts["day_of_year"]).astype(np.int64) - 1)
    else:
        month = year.astype("datetime64[M]") + (parts["month"].astype(np.int64) - 1)
        length_end = (month + 1).astype("datetime64[D]")
        day = month.astype("datetime64[D]") + (np.floor(parts["day"]).astype(np.int64) - 1)
    return day.astype("datetime64[ns]"), day < length_end


# --------------------------------------------------------------------------------------------------------------
# What the clock showed to UTC


@dataclass
class Zone:
    """From local time to UTC, in the order of a file.

    Attributes
    ----------
    name : str
        As :func:`parse_zone` takes it.
    by_order : bool
        Whether local times that the end of summer time repeats are told by their order: the first time round is
        summer time, until a sensor's reading is not later than the one before it, or comes, no earlier, right behind
        one of the second round. Else they stay NaT.
    """

    name: str
    by_order: bool = False
    _last: dict[tuple[int, float], np.datetime64] = field(default_factory=dict)
    _second_round: set[tuple[int, float]] = field(default_factory=set)
    _before: tuple[int, tuple[int, float]] | None = None  # place and key of the latest such time
    _rows: int = 0

    def to_utc(self, clock: Times, sensor: NDArray[np.float64] | None = None) -> Times:
        """Return UTC, NaT where the local time does not exist, or exists twice; ``sensor`` tells readings apart."""
        local = pd.DatetimeIndex(clock)
        zone = parse_zone(self.name)
        times = local.tz_localize(zone, ambiguous="NaT", nonexistent="NaT")
        utc: Times = times.tz_convert("UTC").tz_localize(None).to_numpy().astype("datetime64[ns]")
        if self.by_order and isinstance(zone, ZoneInfo):
            open_cases = np.flatnonzero(np.isnat(utc) & ~np.isnat(clock))
            self._by_order(clock, utc, open_cases, sensor, zone)
        self._rows += len(clock)
        return utc

    def _by_order(
        self, clock: Times, utc: Times, cases: NDArray[np.intp], sensor: NDArray[np.float64] | None, zone: ZoneInfo
    ) -> None:
        for case in cases:
            stamp = clock[case]
            local = stamp.astype("datetime64[us]").astype(datetime)
            offsets = [local.replace(tzinfo=zone, fold=fold).utcoffset() or timedelta(0) for fold in (0, 1)]
            if offsets[0] <= offsets[1]:  # a time that the clock skipped
                continue
            night = int(stamp.astype("datetime64[D]").astype(np.int64))
            key = (night, float(sensor[case]) if sensor is not None else 0.0)
            place = self._rows + int(case)
            if (key in self._last and stamp <= self._last[key]) or self._follows(place, stamp):
                self._second_round.add(key)
            self._last[key], self._before = stamp, (place, key)
            utc[case] = np.datetime64(local - offsets[key in self._second_round], "ns")

    def _follows(self, place: int, stamp: np.datetime64) -> bool:
        """Tell whether the row right before is of the second round and no later."""
        if self._before is None or self._before[0] != place - 1:
            return False
        return bool(self._before[1] in self._second_round and stamp >= self._last[self._before[1]])


def hours(length: float) -> np.timedelta64:
    """Return so many hours, to the nanosecond."""
    return np.timedelta64(round(length * 3_600e9), "ns")


def parse_times(
    stamps: Sequence[str], *, time_format: str, zone: str, offset_hours: float = 0.0
) -> tuple[Times, NDArray[np.object_]]:
    """Read stamps of text.

    Parameters
    ----------
    stamps : sequence of str
    time_format : str
        strptime format or ``"iso8601"``, which must name at least the day.
    zone : str
        Where the clock stood; an offset in the stamp itself comes first.
    offset_hours : float
        Added to every stamp.

    Returns
    -------
    times : ndarray of datetime64[ns]
        UTC; NaT where a stamp cannot be read.
    reasons : ndarray of object
        Why not, or None.
    """
    clock, is_utc = clock_of_texts(stamps, time_format)
    return in_utc(clock, is_utc, Zone(zone), offset_hours)


def in_utc(
    clock: Times,
    is_utc: NDArray[np.bool_],
    zone: Zone,
    offset_hours: float = 0.0,
    sensor: NDArray[np.float64] | None = None,
) -> tuple[Times, NDArray[np.object_]]:
    """Return what a clock showed in UTC, and why not, or None; ``is_utc`` marks the stamps that need no zone."""
    reasons = np.full(clock.size, None, dtype=object)
    reasons[np.isnat(clock)] = UNREADABLE
    times = clock.copy()
    local = np.flatnonzero(~is_utc)
    if local.size and zone.name.upper() not in {"UTC", "Z"}:
        times[local] = zone.to_utc(clock[local], sensor[local] if sensor is not None else None)
    reasons[np.isnat(times) & ~np.isnat(clock)] = NOT_ON_THE_CLOCK
    return times + hours(offset_hours), reasons
