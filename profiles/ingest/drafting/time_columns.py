"""Which columns make the stamp, and in which form: candidates tried on the rows, the best chosen."""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from profiles.ingest.clock import ISO_8601, Times, clock_of_numbers, clock_of_parts, clock_of_texts
from profiles.ingest.drafting.content import Column
from profiles.ingest.drafting.doubts import Doubt
from profiles.ingest.drafting.time_forms import formats_of, is_clock
from profiles.ingest.drafting.words import roles_of, temperature_worth, words_of

FIRST_COLUMNS = 14  # stamps stand at the beginning of a row, or their columns have a name (ours)
_READABLE = 0.9  # share of the rows whose stamp a form must give
_EARLIEST, _LATEST = np.datetime64("1900-01-01"), np.datetime64("2150-01-01")  # of stamps that are believed (ours)
_LIKELY = (np.datetime64("1975-01-01"), np.datetime64("2060-01-01"))  # thermistor chains and some margin (ours)

#: Zeros of counted time, the commoner first (common practice, no source), and the words that name them.
_COUNTED: tuple[tuple[str, str, str], ...] = (
    ("seconds since 1970-01-01", "epoch|posix", "seconds since 1970"),
    ("milliseconds since 1970-01-01", "epoch|posix|ms", "milliseconds since 1970"),
    ("days since 1899-12-30", "serial", "the day numbers of spreadsheets"),
    ("days since 1950-01-01", "", "days since 1950"),
    ("days since 1970-01-01", "epoch|posix", "days since 1970"),
    ("days since -0001-01-02", "datenum", "days from the beginning of the year 0"),
    ("days since -4713-01-01 12:00", "julian|jd", "Julian days"),
    ("days since 1858-11-17", "mjd", "modified Julian days"),
    ("days since 1900-01-01", "", "days since 1900"),
    ("hours since 1970-01-01", "", "hours since 1970"),
    ("minutes since 1970-01-01", "", "minutes since 1970"),
    ("hours since 1900-01-01", "", "hours since 1900"),
    ("days since 2000-01-01", "", "days since 2000"),
    ("seconds since 2000-01-01", "", "seconds since 2000"),
    ("seconds since 1904-01-01", "", "seconds since 1904"),
)
_SINCE = re.compile(
    r"\b(milliseconds?|msecs?|seconds?|secs?|minutes?|mins?|hours?|hrs?|days?)\s+(?:since|after|from)\s+"
    r"(\d{4}-\d{1,2}-\d{1,2}(?:[T ]\d{1,2}:\d{2}(?::\d{2})?)?)", re.IGNORECASE,
)  # fmt: skip
_STATED = 4.0  # worth of units that the file states
_LEAST_COUNT = 5000  # of days, hours, seconds since some usual zero: a dozen years of days (ours)
_RIVAL_WORTH = 1.0  # less than that of the best, and a guess is no rival (ours)
_YEARS = re.compile(r"(?<!\d)(19[5-9]\d|20\d\d)(?!\d)")


@dataclass(frozen=True)
class TimeGuess:
    """A way to read the stamps.

    Attributes
    ----------
    settings : mapping
        Of the layout's [time]; columns by their place, see :func:`named`.
    places : tuple of int
        Columns that are used.
    clock : ndarray of datetime64[ns]
        What the clock showed, row by row; NaT where that cannot be read.
    worth : float
    doubts : tuple of Doubt
    says_zone : bool
        Whether each stamp itself says how far it is from UTC.
    rival : mapping, optional
        Settings that read the same columns as well, to other times.
    """

    settings: Mapping[str, Any]
    places: tuple[int, ...]
    clock: Times
    worth: float
    doubts: tuple[Doubt, ...] = field(default=())
    says_zone: bool = False
    rival: Mapping[str, Any] | None = None

    def named(self, names: Sequence[str]) -> dict[str, Any]:
        """Return the settings with the names of the columns in place of their places."""
        return named(self.settings, names)

    def named_rival(self, names: Sequence[str], keys: Mapping[str, Any]) -> dict[str, Any] | None:
        """Return the settings of the rival with further keys, or None where there is none."""
        return None if self.rival is None else named(self.rival, names) | dict(keys)

    @property
    def step(self) -> np.timedelta64 | None:
        """The commonest step between neighbouring times that differ."""
        steps = _steps(self.clock)
        if not steps.size:
            return None
        values, counts = np.unique(steps, return_counts=True)
        return values[counts.argmax()].astype("timedelta64[ns]")


def named(settings: Mapping[str, Any], names: Sequence[str]) -> dict[str, Any]:
    """Return settings with the names of the columns in place of their places."""
    with_names = dict(settings)
    if "column" in with_names:
        with_names["column"] = names[with_names["column"]]
    if "columns" in with_names:
        with_names["columns"] = [names[place] for place in with_names["columns"]]
    if "parts" in with_names:
        with_names["parts"] = {part: names[place] for part, place in with_names["parts"].items()}
    return with_names


def time_guesses(columns: Sequence[Column], hints: str) -> list[TimeGuess]:
    """Return the ways to read the stamps of some rows, the best first.

    Parameters
    ----------
    columns : sequence of Column
    hints : str
        What stands in the header and in the comments, and the name of the file.
    """
    found = [
        *_of_texts(columns),
        *_of_parts(columns),
        *_of_short_years(columns),
        *_of_numbers(columns, hints),
        *_of_day_numbers(columns, hints),
    ]
    ranked = sorted(found, key=lambda guess: -guess.worth)
    return [_with_rivals(ranked[0], ranked[1:]), *ranked[1:]] if ranked else []


# --------------------------------------------------------------------------------------------------------------
# How good a guess is


def _steps(clock: Times) -> NDArray[np.int64]:
    steps = np.diff(clock[~np.isnat(clock)].astype(np.int64))
    return np.abs(steps[steps != 0])


def _judged(guess: TimeGuess, least_order: float) -> TimeGuess | None:
    """Return a guess with its worth; None where it is no reading of these rows."""
    clock = guess.clock
    valid = clock[~np.isnat(clock)]
    if not valid.size or valid.size < _READABLE * clock.size:
        return None
    middle = np.sort(valid)[valid.size // 50 : valid.size - valid.size // 50]
    if middle[0] < _EARLIEST or middle[-1] > _LATEST:
        return None
    steps = np.diff(valid.astype(np.int64))
    order = float(max((steps >= 0).mean(), (steps <= 0).mean())) if steps.size else 1.0
    if order < least_order:
        return None
    sizes = _steps(clock)
    regular = Counter(sizes.tolist()).most_common(1)[0][1] / sizes.size if sizes.size else 0.0
    times = np.unique(valid)
    distinct = times.size / valid.size
    covered = _covered(times, sizes)
    likely = bool(middle[0] >= _LIKELY[0] and middle[-1] <= _LIKELY[1])
    readable = valid.size / clock.size
    worth = guess.worth + order + 0.5 * regular + 0.7 * distinct + 0.3 * likely + 0.3 * covered + 4.0 * (readable - 1.0)
    return replace(guess, worth=worth)


def _covered(times: Times, sizes: NDArray[np.int64]) -> float:
    """Return the share of the record's length that the commonest step accounts for; years that leap leave gaps."""
    if times.size < 2:
        return 1.0
    usual = Counter(sizes.tolist()).most_common(1)[0][0]
    length = int((times[-1] - times[0]).astype(np.int64))
    return min(1.0, float(usual) * (times.size - 1) / length)


def _name_worth(columns: Sequence[Column]) -> float:
    worth = 0.0
    for column in columns:
        roles = roles_of(column.name)
        worth += 0.4 if roles & {"time", "date"} else 0.0
        worth -= 0.6 if temperature_worth(column.name) > 0 and not roles & {"time", "date"} else 0.0
    return worth / len(columns)


# --------------------------------------------------------------------------------------------------------------
# Texts


def _of_texts(columns: Sequence[Column]) -> Iterator[TimeGuess]:
    usable = [column for column in columns if column.place < FIRST_COLUMNS or roles_of(column.name) & {"time", "date"}]
    for together in _sets(usable):
        texts = [" ".join(parts) for parts in zip(*(column.texts for column in together), strict=True)]
        middle = _typical(texts)
        for time_format in formats_of(middle):
            clock, is_utc = clock_of_texts(texts, time_format)
            places = tuple(column.place for column in together)
            settings: dict[str, Any] = {"column": places[0]} if len(places) == 1 else {"columns": list(places)}
            if time_format != ISO_8601:
                settings["format"] = time_format
            compact = middle.replace(" ", "").isdigit()
            base = (2.5 if compact else 3.2) + (0.1 if time_format == ISO_8601 else 0.0) + 0.3 * (len(places) - 1)
            guess = TimeGuess(settings, places, clock, base + _name_worth(together), says_zone=bool(is_utc.all()))
            if (judged := _judged(guess, 0.4)) is not None:
                yield replace(judged, doubts=tuple(_century(time_format)))


def _century(time_format: str) -> Iterator[Doubt]:
    if "%y" in time_format:
        yield Doubt("century", "69 to 99 as 1969 to 1999, 0 to 68 as 2000 to 2068", "the year has two digits")


def _typical(texts: Sequence[str]) -> str:
    """Return a text of the commonest length."""
    length = Counter(map(len, texts)).most_common(1)[0][0]
    fitting = [text for text in texts if len(text) == length]
    return fitting[len(fitting) // 2]


def _sets(columns: Sequence[Column]) -> Iterator[list[Column]]:
    """Yield columns that could make a stamp together: one, or a date and a clock, and what says the half of the day."""
    dates = [column for column in columns if formats_of(_typical(column.texts))]
    clocks = [column for column in columns if _holds_clocks(column)]
    halves = [column for column in columns if set(map(str.upper, column.texts)) <= {"AM", "PM"} and column.texts]
    for date in dates:
        yield [date]
        for clock in clocks:
            if clock is not date and (abs(clock.place - date.place) < 3 or roles_of(clock.name) & {"time"}):
                yield [date, clock]
                for half in halves:
                    yield [date, clock, half]
    yield from _named_months(columns, clocks)


def _named_months(columns: Sequence[Column], clocks: Sequence[Column]) -> Iterator[list[Column]]:
    """Yield day, named month and year in columns of their own."""
    for month in columns:
        if not _typical(month.texts)[:3].isalpha() or month.is_numeric:
            continue
        near = [column for column in columns if abs(column.place - month.place) == 1]
        if len(near) == 2:
            three = sorted([*near, month], key=lambda column: column.place)
            if formats_of(" ".join(_typical(column.texts) for column in three)):
                yield three
                yield from ([*three, clock] for clock in clocks if clock.place == three[-1].place + 1)


def _holds_clocks(column: Column) -> bool:
    looked_at = column.texts[:: max(1, len(column.texts) // 50)]
    if sum(is_clock(text) and ":" in text for text in looked_at) >= 0.9 * len(looked_at):
        return True
    lengths = {len(text) for text in looked_at}
    if _named_so(column, "hour") > 0 and all(text.isdigit() and int(text) <= 24 for text in looked_at):
        return True
    padded = lengths in ({4}, {6}, {2}) and all(text.isdigit() for text in looked_at)
    return padded and not (temperature_worth(column.name) > 0)


# --------------------------------------------------------------------------------------------------------------
# Parts

_PART_NAMES = {
    "year": "y|yy|yr|yyyy|year|jahr|ano|año|annee|année|anno|aar",
    "month": "mo|mon|month|monat|mes|mois|mm|mnd|mth",
    "day": "d|dd|day|tag|dia|día|jour|dom|dy",
    "day_of_year": "doy|yday|yd|yearday|jday|jd|julian|julianday|ddd|jul",
    "hour": "h|hh|hr|hour|hours|stunde|hora|heure|std|hrs",
    "minute": "mi|min|minute|minutes|mn|nn|mins|mm",
    "second": "s|ss|sec|second|seconds|seg|secs",
    "hour_minute": "hhmm|time|clock|hrmn|hm",
    "hour_minute_second": "hhmmss|time|clock|hms",
}
_PART_PATTERNS = {part: re.compile(words) for part, words in _PART_NAMES.items()}
_LIMITS = {
    "year": (1900, 2150), "month": (1, 12), "day": (1, 31.99), "day_of_year": (1, 366.9999), "hour": (0, 24),
    "minute": (0, 59.99), "second": (0, 59.9999), "hour_minute": (0, 2400), "hour_minute_second": (0, 240000),
    "year_month_day": (19000101, 21501231),
}  # fmt: skip
_CLOCKS = (
    (), ("hour",), ("hour", "minute"), ("hour", "minute", "second"), ("hour_minute",), ("hour_minute", "second"),
    ("hour_minute_second",),
)  # fmt: skip


def _of_short_years(columns: Sequence[Column]) -> Iterator[TimeGuess]:
    """Yield stamps in several columns of which one is a year of two digits, read as texts."""
    by_place = {column.place: column for column in columns if _is_filled(column) and column.is_whole}
    for column in by_place.values():
        if _named_so(column, "year") <= 0 or not all(re.fullmatch("[0-9]{2}", text) for text in column.texts):
            continue
        for codes, first in (("ymd", 0), ("dmy", -2), ("mdy", -2)):
            for clock in ("", "H", "HM", "HMS"):
                together = [by_place.get(column.place + first + step) for step in range(3 + len(clock))]
                chosen = [each for each in together if each is not None]
                if len(chosen) == len(together):
                    yield from _joined(chosen, " ".join(f"%{code}" for code in codes + clock))


def _joined(columns: Sequence[Column], time_format: str) -> Iterator[TimeGuess]:
    texts = [" ".join(parts) for parts in zip(*(column.texts for column in columns), strict=True)]
    clock, _ = clock_of_texts(texts, time_format)
    places = tuple(column.place for column in columns)
    settings = {"columns": list(places), "format": time_format}
    named = sum(_named_so(column, part) for column, part in zip(columns, _parts_of(time_format), strict=True))
    guess = TimeGuess(settings, places, clock, 2.2 + 0.25 * named + 0.08 * len(places))
    if (judged := _judged(guess, 0.6)) is not None:
        yield replace(judged, doubts=tuple(_century(time_format)))


def _parts_of(time_format: str) -> list[str]:
    parts = {"y": "year", "m": "month", "d": "day", "H": "hour", "M": "minute", "S": "second"}
    return [parts[letter] for letter in re.findall("%(.)", time_format)]


_DATE_ORDERS = (  # and how far each column is from that of the year
    (("year", "month", "day"), (0, 1, 2)),
    (("year", "month", "day"), (0, -1, -2)),
    (("year", "month", "day"), (0, -2, -1)),
    (("year", "day_of_year"), (0, 1)),
    (("year", "day_of_year"), (0, -1)),
)


def _of_parts(columns: Sequence[Column]) -> Iterator[TimeGuess]:
    numeric = [column for column in columns if _is_filled(column)]
    by_place = {column.place: column for column in numeric}
    for date in _date_parts(numeric, by_place):
        after = max(column.place for column in date.values()) + 1
        for clock in _CLOCKS:
            rest = [by_place.get(after + place) for place in range(len(clock))]
            parts = date | {name: column for name, column in zip(clock, rest, strict=True) if column is not None}
            if len(parts) == len(date) + len(clock) and all(_can_be(column, name) for name, column in parts.items()):
                guess = _from_parts(parts)
                if (judged := _judged(guess, 0.6)) is not None:
                    yield judged


def _is_filled(column: Column) -> bool:
    return column.is_numeric and column.values.size >= _READABLE * len(column.texts)


def _date_parts(numeric: Sequence[Column], by_place: Mapping[int, Column]) -> Iterator[dict[str, Column]]:
    for column in numeric:
        if _can_be(column, "year_month_day") and column.is_whole:
            yield {"year_month_day": column}
        if not (_can_be(column, "year") and column.is_whole):
            continue
        place = column.place
        for names, places in _DATE_ORDERS:
            found = {
                name: by_place[place + step]
                for name, step in zip(names, places, strict=True)
                if place + step in by_place
            }
            if len(found) == len(names):
                yield found


def _can_be(column: Column, part: str) -> bool:
    least, most = _LIMITS[part]
    good = (column.values >= least) & (column.values <= most)
    if good.mean() < _READABLE:
        return False
    least_most = {"hour_minute_second": 2400, "hour_minute": 60}.get(part, 0)
    if column.values.max() < least_most and _named_so(column, part) <= 0:
        return False
    if part in {"year", "month", "hour_minute", "hour_minute_second", "year_month_day"} and not column.is_whole:
        return bool((column.values % 1 == 0).mean() > _READABLE)
    return True


def _from_parts(parts: Mapping[str, Column]) -> TimeGuess:
    clock = clock_of_parts({name: column.numbers for name, column in parts.items()})
    named = [_named_so(column, name) for name, column in parts.items()]
    worth = 2.2 + 0.25 * sum(named) + 0.08 * len(parts)
    settings = {"parts": {name: column.place for name, column in parts.items()}}
    doubts = [] if min(named) > 0 or len(parts) < 3 else _by_content(parts)
    return TimeGuess(settings, tuple(column.place for column in parts.values()), clock, worth, tuple(doubts))


def _named_so(column: Column, part: str) -> float:
    """Return 1 where a name says that it is this part, -1 where it says something else, else 0."""
    words = [word for word in words_of(column.name) if word]
    if any(_PART_PATTERNS[part].fullmatch(word) for word in words if part in _PART_PATTERNS):
        return 1.0
    if part == "year_month_day" and roles_of(column.name) & {"date"}:
        return 1.0
    if any(pattern.fullmatch(word) for word in words for pattern in _PART_PATTERNS.values()):
        return -1.0
    return -1.5 if temperature_worth(column.name) > 0 or "depth" in roles_of(column.name) else 0.0


def _by_content(parts: Mapping[str, Column]) -> list[Doubt]:
    order = ", ".join(parts).replace("_", " ")
    return [Doubt("stamp", order, "the columns are told by their numbers, not by their names")]


# --------------------------------------------------------------------------------------------------------------
# Counted time


def _of_numbers(columns: Sequence[Column], hints: str) -> Iterator[TimeGuess]:
    for column in columns:
        roles = roles_of(column.name)
        if not (_is_filled(column) and (column.place < 4 or roles & {"time", "date"})):
            continue
        if "counter" in roles or (temperature_worth(column.name) > 0 and "time" not in roles):
            continue
        stated = [_stated_units(text) for text in (column.label, *hints.split("\n"))]
        written = next((units for units in stated if units is not None), None)
        if written is not None:
            yield from _counted(column, written, _STATED)
        if np.median(np.abs(column.values)) < _LEAST_COUNT:
            continue
        for order, (units, words, _) in enumerate(_COUNTED):
            is_named = any(re.fullmatch(words, word) for word in words_of(column.label)) if words else False
            yield from _counted(column, units, 0.8 + 1.5 * is_named + _name_worth([column]) - 0.04 * order)


def _counted(column: Column, units: str, worth: float) -> Iterator[TimeGuess]:
    clock = clock_of_numbers(column.numbers, units)
    middle = np.nanmedian(clock.astype("datetime64[s]").astype(float)) if not np.isnat(clock).all() else np.nan
    if worth < _STATED and not _LIKELY[0] <= np.datetime64(int(middle) if middle == middle else 0, "s") <= _LIKELY[1]:
        return
    guess = TimeGuess({"column": column.place, "units": units}, (column.place,), clock, worth)
    if (judged := _judged(guess, 0.8)) is not None and np.unique(clock[~np.isnat(clock)]).size > 1:
        yield judged


def _stated_units(text: str) -> str | None:
    match = _SINCE.search(text)
    if match is None:
        return None
    step = {"ms": "milliseconds", "mi": "minutes", "se": "seconds", "ho": "hours", "hr": "hours", "da": "days"}
    unit = "milliseconds" if match[1].lower().startswith("milli") else step[match[1].lower()[:2]]
    return f"{unit} since {match[2].replace('T', ' ')}"


def _of_day_numbers(columns: Sequence[Column], hints: str) -> Iterator[TimeGuess]:
    """Yield days of a year that stands in the header or in the name of the file only."""
    years = [int(year) for year in _YEARS.findall(hints)]
    for column in columns:
        if not (_is_filled(column) and years and column.place < FIRST_COLUMNS):
            continue
        named = any(_PART_PATTERNS["day_of_year"].fullmatch(word) for word in words_of(column.name))
        named |= bool(roles_of(column.name) & {"time", "date"})
        if named and column.values.min() >= 1.0 and column.values.max() < 1100 and column.values[0] < 367:
            year = Counter(years).most_common(1)[0][0]
            doubt = Doubt(
                "year", str(year), "the file has days of the year; the year is found in its header or name only"
            )
            for guess in _counted(column, f"days since {year - 1}-12-31", 1.4):
                yield replace(guess, doubts=(doubt,))


# --------------------------------------------------------------------------------------------------------------
# Rivals


def _with_rivals(best: TimeGuess, others: Sequence[TimeGuess]) -> TimeGuess:
    """Return the best guess with a doubt where another reads the same columns as well, to other times."""
    for other in others:
        same_columns = set(other.places) == set(best.places)
        if not same_columns or np.array_equal(other.clock, best.clock, equal_nan=True):
            continue
        if np.isnat(other.clock).sum() > np.isnat(best.clock).sum() or other.worth < best.worth - _RIVAL_WORTH:
            continue
        return replace(best, doubts=(*best.doubts, _rivalry(best, other)), rival=other.settings)
    return best


def _rivalry(best: TimeGuess, other: TimeGuess) -> Doubt:
    one, two = _form(best), _form(other)
    about = "day or month first" if _swaps_day_and_month(one, two) else "form of the stamps"
    other_order = np.diff(other.clock[~np.isnat(other.clock)].astype(np.int64))
    hint = "" if (other_order >= 0).all() else ", though then not in order"
    return Doubt(
        about,
        f"{one}, which gives {_ends(best.clock)}",
        f"all stamps that were looked at can also be read as {two}",
        f"{_ends(other.clock)}{hint}",
    )


def _form(guess: TimeGuess) -> str:
    if "units" in guess.settings:
        return next((f"{units} ({words})" for units, _, words in _COUNTED if units == guess.settings["units"]),
                    str(guess.settings["units"]))  # fmt: skip
    if "parts" in guess.settings:
        return ", ".join(guess.settings["parts"])
    return str(guess.settings.get("format", ISO_8601))


def _swaps_day_and_month(one: str, two: str) -> bool:
    letters = [re.findall("%([dmbB])", text) for text in (one, two)]
    return letters[0] == letters[1][::-1] and len(letters[0]) == 2


def _ends(clock: Times) -> str:
    valid = clock[~np.isnat(clock)]
    return " to ".join(str(np.datetime_as_string(each, unit="m")) for each in (valid[0], valid[-1]))
