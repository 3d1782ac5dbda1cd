"""[time]: where the stamps are, how they are written and what they stand for."""

from __future__ import annotations

from datetime import UTC, datetime
from typing import Annotated, Literal, Self

from pydantic import AfterValidator, Field, model_validator

from profiles.config import Number, Settings
from profiles.ingest.clock import ISO_8601, parse_units, parse_zone

HOURS_PER_HALF = 0.5

#: Numbers that together make a stamp; ``year_month_day`` is 20310723, ``hour_minute`` is 1330 for half past one in the
#: afternoon.
Part = Literal[
    "year", "month", "day", "day_of_year", "year_month_day",
    "hour", "minute", "second", "hour_minute", "hour_minute_second",
]  # fmt: skip
_DATES: tuple[frozenset[Part], ...] = (
    frozenset({"year", "month", "day"}),
    frozenset({"year", "day_of_year"}),
    frozenset({"year_month_day"}),
)
_CLOCKS: tuple[frozenset[Part], ...] = (
    frozenset(),
    frozenset({"hour"}),
    frozenset({"hour", "minute"}),
    frozenset({"hour", "minute", "second"}),
    frozenset({"hour_minute"}),
    frozenset({"hour_minute", "second"}),
    frozenset({"hour_minute_second"}),
)


def _known_zone(name: str) -> str:
    parse_zone(name)
    return name


_SAMPLE = datetime(2031, 7, 23, 13, 45, 56, tzinfo=UTC)


def _read_back(time_format: str) -> datetime:
    """Return what a strptime format reads of the date it wrote."""
    if time_format == ISO_8601:
        return _SAMPLE
    try:
        return datetime.strptime(_SAMPLE.strftime(time_format), time_format)
    except ValueError as error:
        raise ValueError(f"no strptime format: {error}") from None


def check_gives_day(time_format: str) -> str:
    """Return a format that gives back the date it wrote, else raise ValueError."""
    if _read_back(time_format).date() != _SAMPLE.date():
        raise ValueError(f"this format does not give year, month and day: {time_format!r}")
    return time_format


def check_gives_month(time_format: str) -> str:
    """Return a format that gives back year and month, else raise ValueError."""
    read = _read_back(time_format)
    if (read.year, read.month) != (_SAMPLE.year, _SAMPLE.month):
        raise ValueError(f"this format does not give year and month: {time_format!r}")
    return time_format


def _known_units(units: str | None) -> str | None:
    if units is not None:
        parse_units(units)
    return units


class Meaning(Settings):
    """What a stamp stands for; a chain's time is the centre of it."""

    offset_hours: Number = Field(0.0, description="hours added to every stamp")
    mean_hours: Annotated[float, Field(ge=0.0, allow_inf_nan=False)] | None = Field(
        None, description="hours that a reading is the mean of; 0 for one taken in an instant; unset where not known"
    )
    stamp: Literal["start", "centre", "end"] = Field("centre", description="which part of that mean the stamp names")

    @model_validator(mode="after")
    def _of_something(self) -> Self:
        if self.stamp != "centre" and not self.mean_hours:
            raise ValueError(f"stamp = {self.stamp!r} needs mean_hours, the length of what the stamp stands for")
        return self

    @property
    def to_centre_hours(self) -> float:
        """Hours from the stamp to the centre of what it stands for."""
        half = HOURS_PER_HALF * (self.mean_hours or 0.0)
        return self.offset_hours + {"start": half, "centre": 0.0, "end": -half}[self.stamp]


class TimeSettings(Meaning):
    """[time] of a text file."""

    column: str | None = Field(None, description="name of the column")
    columns: tuple[str, ...] = Field((), description="or names of several, read as one text joined by a blank")
    parts: dict[Part, str] = Field(default_factory=dict, description="or a column of numbers for year, day_of_year ...")
    format: Annotated[str, AfterValidator(check_gives_day)] = Field(
        ISO_8601, description='strptime format or "iso8601"'
    )
    units: Annotated[str | None, AfterValidator(_known_units)] = Field(
        None, description='"seconds since 1970-01-01" and the like, where the column holds such numbers'
    )
    zone: Annotated[str, AfterValidator(_known_zone)] = Field(
        "UTC",
        description="UTC, an offset like +10:00 or an IANA name; an offset in the stamp itself comes first",
    )
    repeated_hour: Literal["quarantine", "by_order"] = Field(
        "quarantine",
        description="local times that the end of summer time repeats: quarantine them, or take them by their order",
    )

    @model_validator(mode="after")
    def _one_way(self) -> Self:
        if [self.column is not None, bool(self.columns), bool(self.parts)].count(True) != 1:
            raise ValueError("expected either column or columns or parts")
        if self.units is not None and (self.column is None or self.format != ISO_8601):
            raise ValueError("units go with a single column of numbers, and with no format")
        if self.parts:
            self._check_parts(frozenset(self.parts))
        return self

    def _check_parts(self, given: frozenset[Part]) -> None:
        if not any(given == date | clock for date in _DATES for clock in _CLOCKS):
            raise ValueError(
                "parts make no stamp: expected year with month and day or with day_of_year, or year_month_day, then "
                "none of, or hour, minute, second in that order, or hour_minute, or hour_minute_second; "
                f"found {', '.join(self.parts)}"
            )

    @property
    def names(self) -> tuple[str, ...]:
        """Names of the columns that make a stamp."""
        return tuple(self.parts.values()) or self.columns or ((self.column,) if self.column is not None else ())
