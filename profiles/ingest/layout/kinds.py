"""The kinds of delivery, and how a layout file becomes one of them."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated, Any, Literal, Self

from pydantic import Field, model_validator

from profiles.config import Count, Settings, read_toml, validated
from profiles.errors import ConfigError, RequestError
from profiles.ingest.layout.parts import (
    ColumnDepth,
    ColumnQuality,
    ColumnTemperature,
    DepthScale,
    OurFlag,
    Pattern,
    Scale,
    StringQuality,
    TextTemperature,
    WideDepth,
    WideQuality,
)
from profiles.ingest.layout.series import SeriesLayout
from profiles.ingest.layout.text import TextLayout
from profiles.ingest.layout.time import Meaning
from profiles.ingest.wording import nearest

# --------------------------------------------------------------------------------------------------------------
# Text


class WideLayout(TextLayout):
    """A row per time, a column per depth."""

    kind: Literal["wide"]
    depth: WideDepth
    temperature: TextTemperature = TextTemperature()
    quality: WideQuality | None = None

    @model_validator(mode="after")
    def _depths_in_header(self) -> Self:
        if self.depth.row is not None and self.depth.row > self.header_rows:
            raise ValueError("depth.row: expected one of the header_rows")
        return self


class LongLayout(TextLayout):
    """A row per reading."""

    kind: Literal["long"]
    depth: ColumnDepth
    temperature: ColumnTemperature
    quality: ColumnQuality | None = None
    station: str | None = Field(None, description="column with the station; rows of another are quarantined")


class BlockDepth(DepthScale):
    """[depth] of a blocked file: which header line of a block has the depths."""

    row: Count = Field(1, description="which line of the block's header holds the depths")
    skip: Annotated[int, Field(strict=True, ge=0)] = Field(1, description="cells of that line before the first depth")
    pattern: Pattern = Field("{depth}", description="how a depth is written there, {depth} for the number")
    between: str = Field("", description="characters that stand between the cells of that line, beside the delimiter")


class BlockHeader(Settings):
    """[block]: how the header of a block is told, and what its rows hold beside the readings."""

    begins: Annotated[str, Field(min_length=1)] = Field(description="text that the first line of a block begins with")
    header_rows: Count = Field(1, description="lines of a block's header, that one included")
    before: tuple[str, ...] = Field(min_length=1, description="names of the cells of a row before the readings")
    after: tuple[str, ...] = Field((), description="names of the cells behind them")


class BlockedLayout(TextLayout):
    """Blocks of a header with depths and the rows under it; the depths may change from block to block."""

    kind: Literal["blocked"]
    header_rows: Annotated[int, Field(strict=True, ge=0)] = Field(
        0, description="lines before the header of the first block, comment and blank lines not counted"
    )
    block: BlockHeader
    depth: BlockDepth = BlockDepth()
    temperature: TextTemperature = TextTemperature()
    quality: StringQuality | None = None

    @model_validator(mode="after")
    def _of_blocks(self) -> Self:
        if self.names or self.fixed:
            raise ValueError("names and fixed have no use here: block.before and block.after name the cells of a row")
        if self.depth.row > self.block.header_rows:
            raise ValueError("depth.row: expected one of the block.header_rows")
        return self

    @property
    def needs_names_row(self) -> bool:
        return False


class RecordLine(Settings):
    """[record]: the line before the readings of one profile."""

    names: tuple[str, ...] = Field(min_length=2, description="names of its cells; [time] refers to them")
    count: str = Field(description="which of them says how many lines of readings follow")
    begins: str = Field("", description="text that it begins with, where that tells it from a line of readings")

    @model_validator(mode="after")
    def _has_count(self) -> Self:
        if self.count not in self.names:
            raise ValueError(f"expected count among the names, found {self.count!r}{nearest(self.count, self.names)}")
        return self


class CountedLayout(TextLayout):
    """Profiles one after another: a line with stamp and count, then that many lines of depth and reading."""

    kind: Literal["counted"]
    header_rows: Annotated[int, Field(strict=True, ge=0)] = Field(
        0, description="lines before the first profile, comment and blank lines not counted"
    )
    record: RecordLine
    names: tuple[str, ...] = Field(min_length=2, description="names of the cells of a line of readings")
    depth: ColumnDepth
    temperature: ColumnTemperature
    quality: ColumnQuality | None = None

    @model_validator(mode="after")
    def _of_records(self) -> Self:
        if self.fixed:
            raise ValueError("fixed has no use here: the two sorts of line have other columns")
        return self


# --------------------------------------------------------------------------------------------------------------
# NetCDF


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


class NetcdfTime(Meaning):
    """[time] of a NetCDF file; units come from the file."""


class NetcdfLayout(Settings):
    """CF or OceanSITES NetCDF."""

    kind: Literal["netcdf"]
    variables: NetcdfVariables = NetcdfVariables()
    temperature: NetcdfTemperature = NetcdfTemperature()
    time: NetcdfTime = NetcdfTime()
    flags: dict[Annotated[str, Field(pattern=r"^-?[0-9]+$")], OurFlag] = Field(
        default_factory=dict,
        description="our flag by delivered flag, in place of or beside the published table",
    )


# --------------------------------------------------------------------------------------------------------------
# A layout file

Layout = WideLayout | LongLayout | BlockedLayout | CountedLayout | NetcdfLayout | SeriesLayout

#: The discriminator: which model reads a layout of which kind.
KINDS: dict[str, type[Layout]] = {
    "wide": WideLayout,
    "long": LongLayout,
    "blocked": BlockedLayout,
    "counted": CountedLayout,
    "netcdf": NetcdfLayout,
    "series": SeriesLayout,
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
