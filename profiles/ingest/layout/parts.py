"""[depth], [temperature] and [quality] of text files."""

from __future__ import annotations

from collections.abc import Iterable
from typing import Annotated, Literal, Self

from pydantic import AfterValidator, Field, model_validator

from profiles.config import Count, Number, Settings
from profiles.ingest.units import require_depth_units, require_temperature_units

WHITESPACE = "whitespace"
DEPTH_MARK = "{depth}"
GREATEST_DEPTH = 12_000.0  # m; valid_max of DEPTH in the OceanSITES Data Format Reference Manual 1.4

Scale = Literal["ITS-90", "IPTS-68"]
DepthUnits = Annotated[str, AfterValidator(require_depth_units)]
TemperatureUnits = Annotated[str, AfterValidator(require_temperature_units)]
OurFlag = Literal[1, 2, 3, 4, 9]


def _one_mark(pattern: str | None) -> str | None:
    if pattern is not None and pattern.count(DEPTH_MARK) != 1:
        raise ValueError(f"expected {DEPTH_MARK} once in pattern, found {pattern!r}")
    return pattern


Pattern = Annotated[str | None, AfterValidator(_one_mark)]


def _require_distinct(depths: Iterable[float]) -> None:
    stated = list(depths)
    twice = sorted({depth for depth in stated if stated.count(depth) > 1})
    if twice:
        raise ValueError(f"a sensor depth that appears twice: {twice[0]:g}")


class TextTemperature(Settings):
    """[temperature] of a text file."""

    units: TemperatureUnits = "degree_Celsius"
    scale: Scale = "ITS-90"


class ColumnTemperature(TextTemperature):
    """[temperature] of a text file that has it in one column."""

    column: str


class DepthScale(Settings):
    """Units and sign of depths."""

    units: DepthUnits = "m"
    positive: Literal["down", "up"] = "down"


class WideDepth(DepthScale):
    """[depth] of a wide text file: which columns are sensors, and how deep."""

    pattern: Pattern = Field(None, description="column name with {depth} where the number stands")
    columns: dict[str, Number] = Field(default_factory=dict, description="or depth by column name")
    row: Count | None = Field(None, description="or which of the header rows holds the depths, above their columns")
    values: tuple[Number, ...] = Field((), description="or the depths in the order of the columns from first on")
    first: str | None = Field(None, description="name of the column that the first of values belongs to")

    @model_validator(mode="after")
    def _one_way(self) -> Self:
        ways = [self.pattern is not None, bool(self.columns), self.row is not None, bool(self.values)]
        if ways.count(True) != 1:
            raise ValueError("expected either pattern or columns or row or values")
        if bool(self.values) != (self.first is not None):
            raise ValueError("expected first, the column of the first depth, with values")
        _require_distinct([*self.columns.values(), *self.values])
        return self


class ColumnDepth(DepthScale):
    """[depth] of a text file that has it in a column."""

    column: str
    values: tuple[Number, ...] = Field((), description="depths of the sensors; rows with another are quarantined")
    tolerance: Annotated[float, Field(ge=0.0, allow_inf_nan=False)] = Field(
        0.0, description="units of the depth; a row this near to one of values is of that sensor"
    )

    @model_validator(mode="after")
    def _distinct(self) -> Self:
        _require_distinct(self.values)
        if self.tolerance and not self.values:
            raise ValueError("tolerance needs values, the depths that it is about")
        return self


class Quality(Settings):
    """What delivered quality marks mean here."""

    flags: dict[str, OurFlag] = Field(
        min_length=1, description="our flag (1 good, 2 not evaluated, 3 questionable, 4 bad, 9 missing) by mark"
    )


class WideQuality(Quality):
    """[quality] of a file with a row per time: a mark for each depth."""

    pattern: Pattern = Field(None, description="name of the mark's column, with {depth} as in the names of [depth]")
    columns: dict[str, str] = Field(default_factory=dict, description="or the mark's column by that of the temperature")
    column: str | None = Field(None, description="or the one column that has a character per sensor, in their order")

    @model_validator(mode="after")
    def _one_way(self) -> Self:
        if [self.pattern is not None, bool(self.columns), self.column is not None].count(True) != 1:
            raise ValueError("expected either pattern or columns or column")
        if self.column is not None and any(len(mark) != 1 for mark in self.flags):
            raise ValueError("marks that share one column are one character each")
        return self


class StringQuality(Quality):
    """[quality] of a blocked file: one column with a character per sensor, in their order."""

    column: str

    @model_validator(mode="after")
    def _single(self) -> Self:
        if any(len(mark) != 1 for mark in self.flags):
            raise ValueError("marks that share one column are one character each")
        return self


class ColumnQuality(Quality):
    """[quality] of a file with a row per reading."""

    column: str
