"""How a delivery is written: the layout file as typed, validated, frozen objects."""

from __future__ import annotations

import codecs
from datetime import UTC, datetime
from pathlib import Path
from typing import Annotated, Any, Literal, Self

from pydantic import AfterValidator, Field, model_validator

from profiles.config import Count, Number, Settings, read_toml, validated
from profiles.errors import ConfigError, RequestError
from profiles.ingest.clock import ISO_8601, parse_zone
from profiles.ingest.units import require_depth_units, require_temperature_units
from profiles.ingest.wording import nearest

WHITESPACE = "whitespace"
DEPTH_MARK = "{depth}"
GREATEST_DEPTH = 12_000.0  # m; valid_max of DEPTH in the OceanSITES Data Format Reference Manual 1.4

Scale = Literal["ITS-90", "IPTS-68"]


def _known_encoding(name: str) -> str:
    try:
        return "utf-8-sig" if codecs.lookup(name).name == "utf-8" else codecs.lookup(name).name
    except LookupError:
        raise ValueError(f"no such encoding: {name!r}; expected for example utf-8 or latin-1") from None


def _known_zone(name: str) -> str:
    parse_zone(name)
    return name


def _whole_date(time_format: str) -> str:
    """Accept a strptime format that gives back the date it wrote."""
    if time_format == ISO_8601:
        return time_format
    sample = datetime(2031, 7, 23, 13, 45, 56, tzinfo=UTC)
    try:
        read = datetime.strptime(sample.strftime(time_format), time_format)
    except ValueError as error:
        raise ValueError(f"no strptime format: {error}") from None
    if read.date() != sample.date():
        raise ValueError(f"this format does not give year, month and day: {time_format!r}")
    return time_format


DepthUnits = Annotated[str, AfterValidator(require_depth_units)]


class TimeColumns(Settings):
    """[time]: where the stamps are and how they are written."""

    column: str | None = Field(None, description="name of the column")
    columns: tuple[str, ...] = Field((), description="or names of several, read as one text joined by a blank")
    format: Annotated[str, AfterValidator(_whole_date)] = Field(ISO_8601, description='strptime format or "iso8601"')
    zone: Annotated[str, AfterValidator(_known_zone)] = Field(
        "UTC",
        description="UTC, an offset like +10:00 or an IANA name; an offset in the stamp itself comes first",
    )
    offset_hours: Number = Field(0.0, description="hours added to every stamp, 12 where it names only the day")

    @model_validator(mode="after")
    def _one_way(self) -> Self:
        if (self.column is None) == (not self.columns):
            raise ValueError("expected either column or columns")
        return self

    @property
    def names(self) -> tuple[str, ...]:
        """Names of the columns that make a stamp."""
        return (self.column,) if self.column is not None else self.columns


class TextTemperature(Settings):
    """[temperature] of a text file."""

    units: Annotated[str, AfterValidator(require_temperature_units)] = "degree_Celsius"
    scale: Scale = "ITS-90"


class LongTemperature(TextTemperature):
    """[temperature] of a long text file."""

    column: str


class WideDepth(Settings):
    """[depth] of a wide text file: which columns are sensors, and how deep."""

    pattern: str | None = Field(None, description="column name with {depth} where the number stands")
    columns: dict[str, Number] = Field(default_factory=dict, description="or depth by column name")
    units: DepthUnits = "m"
    positive: Literal["down", "up"] = "down"

    @model_validator(mode="after")
    def _one_way(self) -> Self:
        if (self.pattern is None) == (not self.columns):
            raise ValueError("expected either pattern or columns")
        if self.pattern is not None and self.pattern.count(DEPTH_MARK) != 1:
            raise ValueError(f"expected {DEPTH_MARK} once in pattern, found {self.pattern!r}")
        _require_distinct(self.columns.values())
        return self


class LongDepth(Settings):
    """[depth] of a long text file."""

    column: str
    units: DepthUnits = "m"
    positive: Literal["down", "up"] = "down"
    values: tuple[Number, ...] = Field((), description="depths of the sensors; rows with another are quarantined")

    @model_validator(mode="after")
    def _distinct(self) -> Self:
        _require_distinct(self.values)
        return self


def _require_distinct(depths: Any) -> None:
    stated = list(depths)
    twice = sorted({depth for depth in stated if stated.count(depth) > 1})
    if twice:
        raise ValueError(f"a sensor depth that appears twice: {twice[0]:g}")


class TextLayout(Settings):
    """What delimited text files have in common."""

    delimiter: str = Field(",", description='one character, or "whitespace" for any run of blanks')
    comment: str = Field("", description="lines that begin with this are no data; empty for none")
    header_rows: Annotated[int, Field(strict=True, ge=0)] = Field(
        1, description="lines before the first data row, comment and blank lines not counted"
    )
    names_row: Count = Field(1, description="which of them holds the column names")
    names: tuple[str, ...] = Field((), description="column names where the file has none")
    encoding: Annotated[str, AfterValidator(_known_encoding)] = Field("utf-8", validate_default=True)
    decimal: Literal[".", ","] = "."
    missing: tuple[str, ...] = Field(("",), description="cells without a reading, compared as text and as number")
    time: TimeColumns

    @model_validator(mode="after")
    def _consistent(self) -> Self:
        if self.delimiter != WHITESPACE and (len(self.delimiter) != 1 or self.delimiter in '"\r\n'):
            raise ValueError(f'delimiter: expected one character or "{WHITESPACE}", found {self.delimiter!r}')
        if self.delimiter == self.decimal:
            raise ValueError(f"delimiter and decimal are the same: {self.decimal!r}")
        if not self.names and self.names_row > self.header_rows:
            raise ValueError("expected names_row among the header_rows, or the column names in names")
        return self


class WideLayout(TextLayout):
    """A row per time, a column per depth."""

    kind: Literal["wide"]
    depth: WideDepth
    temperature: TextTemperature = TextTemperature()


class LongLayout(TextLayout):
    """A row per reading."""

    kind: Literal["long"]
    depth: LongDepth
    temperature: LongTemperature
    station: str | None = Field(None, description="column with the station; rows of another are quarantined")


class NetcdfVariables(Settings):
    """[variables]: names where the standard names in the file do not settle them."""

    temperature: str | None = None
    temperature_qc: str | None = None
    time: str | None = None
    depth: str | None = None
    latitude: str | None = None
    longitude: str | None = None


class NetcdfTemperature(Settings):
    """[temperature] of a NetCDF file; units come from the file."""

    scale: Scale | None = Field(None, description="where the file has no reference_scale; ITS-90 where neither says")


class NetcdfTime(Settings):
    """[time] of a NetCDF file; units come from the file."""

    offset_hours: Number = Field(0.0, description="hours added to every stamp")


class NetcdfLayout(Settings):
    """CF or OceanSITES NetCDF."""

    kind: Literal["netcdf"]
    variables: NetcdfVariables = NetcdfVariables()
    temperature: NetcdfTemperature = NetcdfTemperature()
    time: NetcdfTime = NetcdfTime()
    flags: dict[Annotated[str, Field(pattern=r"^-?[0-9]+$")], Literal[1, 2, 3, 4, 9]] = Field(
        default_factory=dict,
        description="our flag by delivered flag, in place of or beside the published table",
    )


Layout = WideLayout | LongLayout | NetcdfLayout

#: The discriminator: which model reads a layout of which kind.
KINDS: dict[str, type[WideLayout] | type[LongLayout] | type[NetcdfLayout]] = {
    "wide": WideLayout,
    "long": LongLayout,
    "netcdf": NetcdfLayout,
}


def load_layout(path: str | Path) -> Layout:
    """Read and validate a layout file.

    Parameters
    ----------
    path : str or Path
        A TOML file; ``config/layouts`` holds commented examples.

    Raises
    ------
    RequestError
        Where the file is missing or no text.
    ConfigError
        With every problem in it.
    """
    file = Path(path)
    content = read_toml(file)
    kind = content.get("kind")
    if kind not in KINDS:
        raise ConfigError(str(file), [_no_kind(kind)])
    return validated(KINDS[kind], content, file)


def _no_kind(kind: Any) -> RequestError:
    return RequestError(
        "no known kind of delivery" if kind is not None else "this key is missing",
        where="kind",
        expected=", ".join(KINDS),
        found=repr(kind) if kind is not None else None,
        advice="say how the delivery is written" + nearest(str(kind), KINDS),
    )
