"""A table of columns that somebody else computed: isotherm depths and the like, by mooring and time."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Annotated, Any, Literal, Self

from pydantic import AfterValidator, BeforeValidator, Field, model_validator

from profiles.config import Count, NotNegative, Number, Positive, Settings, Share
from profiles.ingest.clock import ISO_8601
from profiles.ingest.layout.parts import ColumnQuality, Scale, TemperatureUnits
from profiles.ingest.layout.text import TextLayout
from profiles.ingest.layout.time import TimeSettings, check_gives_day, check_gives_month
from profiles.ingest.units import CELSIUS, METRE, require_length_units

MOORING_MARK = "{mooring}"
DEEPEST = 500.0  # m; a deeper isotherm is no value of the tropical Pacific, where chains end there (ours)
MOST_DAYS = 31  # of a month

LengthUnits = Annotated[str, AfterValidator(require_length_units)]


def _column_or_number(given: Any) -> Any:
    is_number = isinstance(given, int | float) and not isinstance(given, bool) and 0.0 <= given < float("inf")
    if not (is_number or (isinstance(given, str) and given)):
        raise ValueError(f"expected the name of a column, or a number that is not negative; found {given!r}")
    return given


ColumnOrNumber = Annotated[str | float, BeforeValidator(_column_or_number)]


class SeriesTime(TimeSettings):
    """[time] of a series."""

    mean: Literal["month"] | None = Field(
        None,
        description='"month" where a value is the mean of the calendar month in which its stamp lies, which then need '
        "not name a day; in place of mean_hours",
    )
    format: str = Field(ISO_8601, description='strptime format or "iso8601"')

    @model_validator(mode="after")
    def _whole(self) -> Self:
        if self.mean is None:
            check_gives_day(self.format)
            return self
        if self.mean_hours is not None:
            raise ValueError('expected either mean = "month" or mean_hours')
        if self.zone.upper() not in {"UTC", "Z"}:
            raise ValueError("a month is that of the stamp as it stands: leave zone out")
        check_gives_month(self.format)
        return self


class SeriesMooring(Settings):
    """[mooring]: which mooring a row is of, where that is neither in the column names nor in the configuration."""

    column: str | None = Field(None, description="column with the mooring")
    ids: dict[str, str] = Field(default_factory=dict, description="the configuration's id by the name in the file")


class SeriesError(Settings):
    """Standard error of an isotherm depth, in its units: numbers, or the columns that have them.

    Either the two parts, or the whole and which share of its variance lasts.
    """

    independent: ColumnOrNumber | None = Field(None, description="part that the next value does not share")
    persistent: ColumnOrNumber | None = Field(None, description="part that lasts through a deployment")
    total: ColumnOrNumber | None = Field(None, description="or both together")
    persistent_share: Share | None = Field(None, description="of total: the share of its square that lasts")

    @model_validator(mode="after")
    def _split(self) -> Self:
        parts = self.independent is not None and self.persistent is not None
        whole = self.total is not None and self.persistent_share is not None
        some = [self.independent, self.persistent, self.total, self.persistent_share]
        if parts == whole or sum(part is not None for part in some) != 2:
            raise ValueError(
                "expected independent and persistent, or total and persistent_share: only the independent part "
                "averages out"
            )
        return self


StatusName = Literal["found", "outcropped", "above_chain", "below_chain", "gap", "several_crossings", "too_few_sensors"]


class SeriesStatus(Settings):
    """What marks say of an isotherm depth, or of why there is none."""

    column: str
    marks: dict[str, StatusName] = Field(min_length=1, description="our status by mark")


class SeriesValue(Settings):
    """One quantity and the column that has it."""

    column: str
    quality: ColumnQuality | None = None

    @property
    def columns(self) -> Iterator[str]:
        """The columns that it is read from."""
        yield self.column
        if self.quality is not None:
            yield self.quality.column


class SeriesDepth(SeriesValue):
    """A depth."""

    units: LengthUnits = METRE
    positive: Literal["down", "up"] = "down"
    deepest: Positive = Field(DEEPEST, description="m; a row with a deeper one is quarantined")


class SeriesIsotherm(SeriesDepth):
    """[values.isotherm_depth]."""

    isotherm: Number = Field(description="°C; of which isotherm")
    error: SeriesError | None = Field(None, description="where there is none, that of the run's settings is taken")
    status: SeriesStatus | None = None
    complete: bool = Field(False, strict=True, description="of months: no day of any is missing in its mean")
    days: str | Count | None = Field(None, description="or how many days a mean is of: a number, or their column")
    spread: ColumnOrNumber | None = Field(None, description="with days: standard deviation of the days in a month")

    @property
    def columns(self) -> Iterator[str]:
        """The columns that it is read from."""
        yield from super().columns
        if self.status is not None:
            yield self.status.column
        error = self.error
        given = [self.days, self.spread]
        given += [error.independent, error.persistent, error.total] if error is not None else []
        yield from (place for place in given if isinstance(place, str))


class SeriesMixedLayer(SeriesDepth):
    """[values.mixed_layer_depth]; the definition must be that of the run's [column] settings."""

    threshold: Positive = Field(description="°C below the reference")
    reference: NotNegative = Field(description="m")


class SeriesMeanTemperature(SeriesValue):
    """[values.mean_temperature] of the layer from the surface."""

    units: TemperatureUnits = CELSIUS
    scale: Scale = "ITS-90"
    bottom: Positive = Field(description="m; of the layer")


class SeriesValues(Settings):
    """[values]: which quantity is in which column."""

    isotherm_depth: SeriesIsotherm | None = None
    mixed_layer_depth: SeriesMixedLayer | None = None
    mean_temperature: SeriesMeanTemperature | None = None

    @model_validator(mode="after")
    def _some(self) -> Self:
        if not self.given:
            raise ValueError(f"expected one or more of {', '.join(type(self).model_fields)}")
        return self

    @property
    def given(self) -> dict[str, SeriesValue]:
        """The quantities that there are, by name."""
        values = {name: getattr(self, name) for name in type(self).model_fields}
        return {name: value for name, value in values.items() if value is not None}

    @property
    def definitions(self) -> dict[str, float]:
        """What the quantities are, by the names of the settings of [column] that have to agree."""
        found: dict[str, float] = {}
        if self.isotherm_depth is not None:
            found["isotherm"] = self.isotherm_depth.isotherm
        if self.mixed_layer_depth is not None:
            found["mixed_layer_threshold"] = self.mixed_layer_depth.threshold
            found["mixed_layer_reference"] = self.mixed_layer_depth.reference
        if self.mean_temperature is not None:
            found["mean_temperature_bottom"] = self.mean_temperature.bottom
        return found


class SeriesLayout(TextLayout):
    """A row per mooring and time, or a row per time and a column per mooring."""

    kind: Literal["series"]
    time: SeriesTime
    mooring: SeriesMooring = SeriesMooring()
    values: SeriesValues
    deployment: str | None = Field(None, description="column with the number of the deployment")

    @model_validator(mode="after")
    def _of_moorings(self) -> Self:
        marks = [column.count(MOORING_MARK) for value in self.values.given.values() for column in value.columns]
        if any(marks) and marks != [1] * len(marks):
            raise ValueError(f"expected {MOORING_MARK} once in the name of every column of [values], or in none")
        if any(marks) and self.mooring.column is not None:
            raise ValueError(f"[mooring] column has no use here: {MOORING_MARK} in the column names says it")
        return self

    @model_validator(mode="after")
    def _counted(self) -> Self:
        isotherm = self.values.isotherm_depth
        if isotherm is None:
            return self
        if self.time.mean is None and (isotherm.complete or isotherm.days is not None or isotherm.spread is not None):
            raise ValueError('complete, days and spread are about months: expected mean = "month" in [time]')
        if self.time.mean is not None and isotherm.complete == (isotherm.days is not None):
            raise ValueError(
                "values.isotherm_depth: expected either complete = true or days, how many the mean of a month is of"
            )
        if (isotherm.days is None) != (isotherm.spread is None):
            raise ValueError("values.isotherm_depth: expected days and spread together, or neither")
        if isinstance(isotherm.days, int) and isotherm.days > MOST_DAYS:
            raise ValueError(f"values.isotherm_depth: expected at most {MOST_DAYS} days, found {isotherm.days}")
        return self

    @property
    def is_wide(self) -> bool:
        """Tell whether the moorings stand in the names of the columns."""
        return any(MOORING_MARK in value.column for value in self.values.given.values())
