"""The configuration file as typed, validated, frozen objects.

One TOML file describes an array: its moorings, their deliveries and every threshold. A threshold's default, unit
and source stand here, once; ``config/defaults.toml`` is this page as a file.
"""

from __future__ import annotations

import difflib
import json
import textwrap
import tomllib
from collections import Counter
from collections.abc import Sequence
from datetime import UTC, datetime
from pathlib import Path
from typing import Annotated, Any, Literal, Self, TypeVar

from pydantic import AfterValidator, BaseModel, ConfigDict, Field, ValidationError, model_validator

from profiles.errors import ConfigError, RequestError

# Strict: the text "20" and the truth value true are no numbers.
Number = Annotated[float, Field(strict=True)]
Longitude = Annotated[Number, Field(ge=0.0, lt=360.0, description="degrees east, 0-360")]
Latitude = Annotated[Number, Field(ge=-90.0, le=90.0, description="degrees north")]
Positive = Annotated[Number, Field(gt=0.0)]
NotNegative = Annotated[Number, Field(ge=0.0)]
Share = Annotated[Number, Field(ge=0.0, le=1.0)]
Count = Annotated[int, Field(strict=True, ge=1)]


class Settings(BaseModel):
    """Base of every table: frozen, and a key it does not know is an error."""

    model_config = ConfigDict(frozen=True, extra="forbid", allow_inf_nan=False)


# --------------------------------------------------------------------------------------------------------------
# [qc]


class GapSettings(Settings):
    """Timing: QARTOD test 1."""

    longest_interval: Positive = Field(
        1.5, description="a longer time since the sensor's last value is a gap, in nominal sampling intervals (ours)"
    )
    flag_after_gap: Literal[1, 3, 4] = Field(
        1, description="flag of the first value after a gap; the QARTOD manuals differ, 1 lets it stand"
    )


class GrossRangeSettings(Settings):
    """Gross range: QARTOD test 4."""

    sensor_min: Number = Field(-2.5, description="°C; below is bad (EuroGOOS DATA-MEQ EG10.19, global range)")
    sensor_max: Number = Field(40.0, description="°C; above is bad (EuroGOOS DATA-MEQ EG10.19, global range)")
    user_min: Number = Field(3.0, description="°C; below is questionable (tropical Pacific above 800 m, from memory)")
    user_max: Number = Field(33.0, description="°C; above is questionable (tropical Pacific surface, from memory)")

    @model_validator(mode="after")
    def _nested(self) -> Self:
        if not self.sensor_min <= self.user_min < self.user_max <= self.sensor_max:
            raise ValueError("expected sensor_min <= user_min < user_max <= sensor_max")
        return self


class ClimatologySettings(Settings):
    """Climatological range by depth: QARTOD test 5, never worse than questionable."""

    deviations: Positive = Field(
        4.0, description="half-width of the window, in standard deviations (3 to 4 is usual, from memory)"
    )
    displacement_sd: NotNegative = Field(
        15.0, description="m; standard deviation of the vertical displacement of the atlas profile (ours)"
    )
    floor_shallow: Positive = Field(
        1.25, description="°C; standard deviation at the surface, displacement aside (eastern Pacific, from memory)"
    )
    floor_deep: Positive = Field(0.3, description="°C; the same at 500 m and below, linear between (ours)")


class SpikeSettings(Settings):
    """Spike in time: QARTOD test 6, |V2 - (V1 + V3)/2|."""

    threshold_low: Positive = Field(3.0, description="°C; above is questionable (QARTOD T/S example, from memory)")
    threshold_high: Positive = Field(8.0, description="°C; above is bad (QARTOD T/S example, from memory)")

    @model_validator(mode="after")
    def _ordered(self) -> Self:
        if self.threshold_low >= self.threshold_high:
            raise ValueError("expected threshold_low < threshold_high")
        return self


class RateOfChangeSettings(Settings):
    """Rate of change: QARTOD test 7 in its two-sided form, never worse than questionable."""

    deviations: Positive = Field(
        6.0,
        description="limit on |V2-V1| + |V3-V2|, in twice the robust standard deviation of first differences of the "
        "sensor's record (the QARTOD example is 3; 6 suits the heavy tails of thermocline records, ours)",
    )
    floor: Positive = Field(0.5, description="°C; the standard deviation is taken to be at least this (ours)")


class FlatLineSettings(Settings):
    """Flat line: QARTOD test 8."""

    tolerance: Positive = Field(
        0.0005, description="°C; values closer than this are the same; keep it below the stored resolution (ours)"
    )
    repeats_questionable: Count = Field(
        3, description="as many previous values the same: questionable (QARTOD example)"
    )
    repeats_bad: Count = Field(5, description="as many previous values the same: bad (QARTOD example)")

    @model_validator(mode="after")
    def _ordered(self) -> Self:
        if self.repeats_questionable >= self.repeats_bad:
            raise ValueError("expected repeats_questionable < repeats_bad")
        return self


class InversionSettings(Settings):
    """Temperature inversion: a sensor that for a while is warmer than one above it, never worse than questionable."""

    tolerance: Positive = Field(
        0.5,
        description="°C; the lower sensor is warmer by more than this (ours: inversions under rain-freshened water of "
        "the western Pacific are smaller as a rule, from memory)",
    )
    reach: Count = Field(
        2, description="so it is in more than this many of the samples from as many before to as many after (ours)"
    )


class RepeatedSettings(Settings):
    """Repeated profiles: a stretch of the record that stands in it once more; the later one is bad."""

    samples: Annotated[int, Field(strict=True, ge=2)] = Field(
        3, description="as many samples in a row, or more, are those of an earlier stretch (ours)"
    )
    sensors: Annotated[int, Field(strict=True, ge=2)] = Field(
        2, description="profiles of fewer sensors are not compared (ours)"
    )


class QualityControlSettings(Settings):
    """[qc]: thresholds of the tests. Formulas: QARTOD temperature and salinity manual v2.1 (2020)."""

    gap: GapSettings = GapSettings()
    gross_range: GrossRangeSettings = GrossRangeSettings()
    climatology: ClimatologySettings = ClimatologySettings()
    spike: SpikeSettings = SpikeSettings()
    rate_of_change: RateOfChangeSettings = RateOfChangeSettings()
    flat_line: FlatLineSettings = FlatLineSettings()
    inversion: InversionSettings = InversionSettings()
    repeated: RepeatedSettings = RepeatedSettings()


# --------------------------------------------------------------------------------------------------------------
# [column], [section]


class ColumnSettings(Settings):
    """[column]: what is read off one profile."""

    use_flags: tuple[Literal[1, 2, 3, 4], ...] = Field(
        (1, 2), min_length=1, description="quality flags of the values that are used (ours)"
    )
    isotherm: Number = Field(20.0, description="°C; the isotherm that stands for the thermocline (WWV definition)")
    max_bracket: Positive = Field(
        75.0, description="m; sensors further apart do not bracket the isotherm (common practice is 50 and less)"
    )
    crossing: Literal["shallowest", "deepest"] = Field(
        "shallowest", description="which crossing is taken where there are several"
    )
    surface_reach: NotNegative = Field(5.0, description="m; a sensor no deeper than this stands for the surface (ours)")
    mixed_layer_threshold: Positive = Field(0.2, description="°C (de Boyer Montegut et al. 2004)")
    mixed_layer_reference: NotNegative = Field(10.0, description="m (de Boyer Montegut et al. 2004)")
    mean_temperature_bottom: Positive = Field(
        300.0, description="m; bottom of the layer of the mean temperature (T300)"
    )
    sensor_accuracy: Positive = Field(
        0.02, description="°C, one standard deviation where a mooring states none (Freitag et al. 2005: 0.018)"
    )
    sensor_noise: NotNegative = Field(
        0.005, description="°C; noise of one value, independent of the next (from memory)"
    )
    depth_accuracy: NotNegative = Field(
        1.0, description="m, one standard deviation of a nominal sensor depth (from memory)"
    )
    motion_accuracy: NotNegative = Field(
        0.3,
        description="°C, one standard deviation from the leaning of the line, where a chain does not say how deep its "
        "sensors were (McCarty et al. 1997: 0.15 to 0.45 in the upper thermocline of taut-line moorings)",
    )
    series_error_independent: NotNegative = Field(
        1.0,
        description="m, one standard deviation of an isotherm depth from elsewhere that comes without its error, the "
        "part that the next value does not share: rounding, and what its method adds (ours)",
    )
    series_error_persistent: NotNegative = Field(
        4.0,
        description="m, the part that lasts through a deployment: 0.3 °C of a leaning line (McCarty et al. 1997) in "
        "0.1 °C per m make 3 m, a straight line across 50 m between sensors 2.2 m rms, a nominal depth 1 m (ours)",
    )


class MeansSettings(Settings):
    """[section.means]: when a mean is given."""

    daily_share: Share = Field(0.5, description="least share of a day's nominal samples (ours)")
    monthly_days: Count = Field(15, description="least number of daily means in a month (ours)")
    censored_share: Share = Field(
        0.2, description="largest share of days on which the isotherm lay above or below the chain (ours)"
    )
    questionable_share: Share = Field(
        0.5, description="a mean with a larger share of questionable inputs is questionable (ours)"
    )


class ClimatologyPriorSettings(Settings):
    """[section.climatology]: harmonics of the record, shrunk towards the packaged atlas."""

    mean_sd: Positive = Field(
        7.5, description="m; mean isotherm depth about the atlas (two atlases differ by 7.3 m rms)"
    )
    annual_sd: Positive = Field(5.0, description="m; each annual coefficient about the atlas (ours)")
    semiannual_sd: Positive = Field(3.0, description="m; each semi-annual coefficient about the atlas (ours)")
    broad_share: Share = Field(
        0.57, description="broad part of the correction's variance, the rest is narrow (difference of two atlases)"
    )
    broad_longitude: Positive = Field(34.0, description="degrees; broad scale (difference of two published atlases)")
    broad_latitude: Positive = Field(14.0, description="degrees; broad scale (difference of two published atlases)")
    narrow_longitude: Positive = Field(6.0, description="degrees; narrow scale (difference of two published atlases)")
    narrow_latitude: Positive = Field(2.5, description="degrees; narrow scale (difference of two published atlases)")
    decorrelation_months: Positive = Field(
        4.0, description="months; e-folding time of interannual anomalies (Meyers et al. 1991: 2, without an event)"
    )


class SectionSettings(Settings):
    """[section]: climatology, map, tilt and volume."""

    means: MeansSettings = MeansSettings()
    climatology: ClimatologyPriorSettings = ClimatologyPriorSettings()
    signal_sd: Positive = Field(12.0, description="m; standard deviation of monthly isotherm-depth anomalies (ours)")
    small_scale_sd: NotNegative = Field(
        4.0, description="m; part of a monthly mean that the map's scales do not resolve (ours)"
    )
    length_longitude: Positive = Field(15.0, description="degrees (Meyers et al. 1991, median of the tropical Pacific)")
    length_latitude: Positive = Field(3.0, description="degrees (Meyers et al. 1991, median of the tropical Pacific)")
    tilt_window: tuple[Longitude, Longitude] = Field(
        (165.0, 265.0), description="degrees east; ends of the line through the equatorial section (ours)"
    )

    @model_validator(mode="after")
    def _eastward(self) -> Self:
        west, east = self.tilt_window
        if west >= east:
            raise ValueError("tilt_window: expected the western end first")
        return self


# --------------------------------------------------------------------------------------------------------------
# [validation]


class ValidationSettings(Settings):
    """[validation]: how a model is read and seen as the array saw the ocean."""

    temperature_variable: str = Field(
        "", description="the model's temperature; empty: the one variable whose standard name is of temperature (CF)"
    )
    temperature_kind: Literal["by standard name", "in situ", "potential", "conservative"] = Field(
        "by standard name",
        description="which temperature it is; declare it where the standard name is missing or wrong",
    )
    salinity: Literal["model, else atlas", "atlas"] = Field(
        "model, else atlas", description="salinity of the conversion to in situ temperature (TEOS-10)"
    )
    depth_positive: Literal["declared", "down", "up"] = Field(
        "declared", description="direction of the model's depths; declare it where their attribute positive is missing"
    )
    averaging_days: NotNegative = Field(
        0.0,
        description="days that a value of the model is the mean of; 0: from its time bounds, else from steps (ours)",
    )
    top_reach: NotNegative = Field(
        15.0, description="m; a model's shallowest level no deeper than this stands for the water above it (ours)"
    )
    nearest_wet: NotNegative = Field(
        100.0, description="km; a mooring without wet points about it takes the nearest one within this (ours)"
    )
    deepest: Positive = Field(650.0, description="m; levels of fixed depth below this are not read (ours)")
    block_megabytes: Positive = Field(
        12.0, description="MB of a model's temperature that a worker holds at a time (ours)"
    )
    shared_lean: Share = Field(
        0.3,
        description="part of the error from the leaning of lines (column.motion_accuracy) that all moorings have in "
        "common, for a line only leans one way; it does not average out over the array (ours, from simulated arrays)",
    )
    undetected_faults: NotNegative = Field(
        1.0,
        description="m; standard deviation of a mooring's depths from faults that the quality control does not find: "
        "rare and large, so that it counts in the error of sums over moorings, not in that of one (ours, from "
        "simulated arrays)",
    )
    least_months: Annotated[int, Field(strict=True, ge=3)] = Field(
        6, description="a score needs as many months at least (ours)"
    )


# --------------------------------------------------------------------------------------------------------------
# [precursor]


class HindcastSettings(Settings):
    """[precursor.hindcast]: how forecasts are made, verified out of sample and, where they show skill, issued."""

    longest_lead: Annotated[int, Field(strict=True, ge=1, le=24)] = Field(
        12, description="months from the last month known to the month forecast"
    )
    scheme: Literal["years_out", "expanding"] = Field(
        "years_out",
        description="years_out: each year is forecast from all others but those within the longest lead of it; "
        "expanding: from earlier ones alone",
    )
    threshold: Positive = Field(
        0.5,
        description="units of the index; an anomaly beyond it is warm or cold (the published oceanic index: 0.5 °C)",
    )
    least_training_years: Annotated[int, Field(strict=True, ge=6)] = Field(
        8, description="years; with fewer left to fit on, there is no hindcast (ours)"
    )
    shortest_outlook_record: Annotated[int, Field(strict=True, ge=10)] = Field(
        15, description="years; a shorter record gives no outlook, whatever its hindcast says (ours)"
    )
    common_weight: Positive = Field(
        10.0, description="months of data that weigh as much as the belief that a predictor says nothing (ours)"
    )
    seasonal_weight: Positive = Field(
        100.0, description="months of data that weigh as much as the belief that its coefficient has no season (ours)"
    )
    propagator_months: Count = Field(
        6, description="months over which the recharge oscillator is fitted; more: less damped by noise (ours)"
    )
    spread_blocks: Annotated[int, Field(strict=True, ge=4)] = Field(
        10, description="parts of the training months that are left out in turn to learn the spread (ours)"
    )
    block_years: Count = Field(
        3,
        description="years that stay together where the error of a score is estimated; an event and its return (ours)",
    )


class LeadLagSettings(Settings):
    """[precursor.lead_lag]: correlation and regression at each lead, and their significance."""

    longest_lead: Annotated[int, Field(strict=True, ge=1, le=60)] = Field(
        24, description="months; leads from minus this to plus this are tried"
    )
    level: Annotated[Number, Field(gt=0.5, lt=1.0)] = Field(
        0.95, description="of every interval; what is significant is so at one minus this (common practice, no source)"
    )
    least_effective: Annotated[Number, Field(gt=3.0)] = Field(
        6.0, description="effective months without which there is no correlation (ours)"
    )
    least_months: Annotated[int, Field(strict=True, ge=12)] = Field(
        24, description="months in common without which there is no correlation (ours)"
    )
    least_years: Annotated[int, Field(strict=True, ge=4)] = Field(
        10, description="years without which a calendar month has no correlation of its own (ours)"
    )
    window_months: Annotated[int, Field(strict=True, ge=60)] = Field(
        180, description="months; length of the moving windows (15 years: three or four events, ours)"
    )
    window_step: Count = Field(12, description="months from one window to the next (ours)")
    draws: Annotated[int, Field(strict=True, ge=100)] = Field(
        1000, description="resampled records, and simulated pairs of independent series (common practice, no source)"
    )
    seed: Annotated[int, Field(strict=True, ge=0)] = Field(
        1997, description="of the random numbers: the same series give the same figures"
    )


class EventSettings(Settings):
    """[precursor.events]: what a warm or cold event is."""

    running_mean: Count = Field(3, description="months, centred (the published oceanic index: 3; Trenberth 1997: 5)")
    threshold: Positive = Field(
        0.5, description="units of the index (the published oceanic index: 0.5 °C; Trenberth 1997: 0.4 °C)"
    )
    persistence: Count = Field(
        5, description="months in a row beyond it (the published oceanic index: 5; Trenberth 1997: 6)"
    )


MonthName = Annotated[str, Field(pattern=r"^\d{4}-(0[1-9]|1[0-2])$")]


class PrecursorSettings(Settings):
    """[precursor]: volume, western volume and tilt as precursors of an index."""

    base: tuple[MonthName, ...] = Field(
        (),
        description='first and last month of the base of anomalies, ["2031-01", "2060-12"]; empty: each record whole '
        "(ours)",
    )
    detrend: bool = Field(False, description="whether a straight line in time is taken off with the climatology (ours)")
    standardise: Literal["none", "whole", "month"] = Field(
        "none",
        description="whether anomalies are over their standard deviation, of all months or of each calendar month "
        "(ours)",
    )
    running_mean: Count = Field(
        1, description="months, trailing, over which volume, tilt and wind are averaged; 1: not at all (ours)"
    )
    box: str = Field(
        "nino34",
        description="of the index of surface temperature: nino12, nino3, nino34, nino4 (published boxes) or "
        '"south,north,west,east" in degrees north and east',
    )
    patterns: Annotated[int, Field(strict=True, ge=0, le=5)] = Field(
        2, description="leading patterns of the equatorial isotherm depth that are correlated besides (ours)"
    )
    lead_lag: LeadLagSettings = LeadLagSettings()
    events: EventSettings = EventSettings()
    hindcast: HindcastSettings = HindcastSettings()

    @model_validator(mode="after")
    def _two_months(self) -> Self:
        if self.base and (len(self.base) != 2 or self.base[0] >= self.base[1]):
            raise ValueError("base: expected the first month and the last, or none")
        return self


# --------------------------------------------------------------------------------------------------------------
# The array


def _with_zone(moment: datetime) -> datetime:
    if moment.tzinfo is None:
        raise ValueError(f"a time without its zone: {moment:%Y-%m-%dT%H:%M:%S}; add Z where it is UTC")
    return moment.astimezone(UTC)


Moment = Annotated[datetime, AfterValidator(_with_zone)]


class ClockError(Settings):
    """How far a logger's clock was ahead: all the time, or growing from when it was set to when it was checked."""

    fast_seconds: Number = Field(description="s; negative where the clock was behind")
    set: Moment | None = Field(None, description="when the clock was right")
    checked: Moment | None = Field(None, description="when it was fast_seconds ahead")

    @model_validator(mode="after")
    def _between(self) -> Self:
        if (self.set is None) != (self.checked is None):
            raise ValueError("expected set and checked, or neither")
        if self.set is not None and self.checked is not None:
            length = (self.checked - self.set).total_seconds()
            if length <= 0.0:
                raise ValueError("the clock was checked before it was set")
            if abs(self.fast_seconds) >= length:
                raise ValueError(f"a clock cannot be {self.fast_seconds:g} s out after {length:g} s")
        return self


class Delivery(Settings):
    """One file of a mooring and the layout it is written in; paths are relative to the configuration file.

    Where deliveries of one mooring have the same time and depth, delayed mode comes before real time, and of one mode
    the one listed first.
    """

    path: Path
    layout: Path
    mode: Literal["delayed", "real-time"] = "delayed"
    deployment: Count | None = Field(None, description="number; by default that of the place in the list")
    clock: ClockError | None = None


class Mooring(Settings):
    """One site and what was delivered for it."""

    id: Annotated[str, Field(pattern=r"^[A-Za-z0-9][A-Za-z0-9._-]*$", max_length=64)]
    latitude: Latitude
    longitude: Longitude
    deliveries: tuple[Delivery, ...] = Field((), description="may be none where a [[series]] has its columns")
    sensor_accuracy: Positive | None = Field(None, description="°C, one standard deviation")

    @property
    def by_precedence(self) -> tuple[Delivery, ...]:
        """The deliveries in the order in which they win."""
        return tuple(sorted(self.deliveries, key=lambda delivery: delivery.mode != "delayed"))


class SeriesFile(Settings):
    """[[series]]: one file of isotherm depths or other columns that somebody else computed, of one mooring or of many.

    Where a mooring's chain gives the mean of a month, that comes before any series; of two series with a value of one
    time, the one listed first.
    """

    path: Path
    layout: Path
    mooring: str | None = Field(None, description="id, where the file is of one mooring and does not name it")


class Description(Settings):
    """[array]: what the files say of their origin (ACDD-1.3)."""

    name: Annotated[str, Field(min_length=1)]
    summary: str = ""
    institution: str = ""
    creator_name: str = ""
    creator_email: str = ""
    creator_url: str = ""
    project: str = ""
    license: str = ""
    acknowledgement: str = ""
    naming_authority: str = ""


class Config(Settings):
    """A whole configuration file. ``file`` is where it was read from."""

    file: Path
    array: Description
    recovery_log: Path | None = Field(None, description="CSV: mooring, deployment, deployed, recovered")
    moorings: tuple[Mooring, ...] = Field(min_length=1)
    series: tuple[SeriesFile, ...] = ()
    qc: QualityControlSettings = QualityControlSettings()
    column: ColumnSettings = ColumnSettings()
    section: SectionSettings = SectionSettings()
    validation: ValidationSettings = ValidationSettings()
    precursor: PrecursorSettings = PrecursorSettings()

    def resolve(self, path: Path) -> Path:
        """Return ``path`` as seen from the configuration file's folder."""
        return (self.file.parent / path).resolve()


_HEADER = """\
All settings with their defaults. A run does not read this file: copy the lines that you want to change, with the
[table] above them, into your configuration. "Ours" marks a choice that rests on no published source.
"""
_COMMENT_WIDTH = 110


def defaults_text() -> str:
    """Return ``config/defaults.toml``: every setting that has a default, its description as a comment above it."""
    tables = {
        name: Config.model_fields[name].default for name in ("qc", "column", "section", "validation", "precursor")
    }
    return "\n".join([_comment(_HEADER), *(_table_text(name, table) for name, table in tables.items())])


def _table_text(name: str, settings: Settings) -> str:
    """Write a table with what it says of itself, its keys, and then the tables in it."""
    fields = type(settings).model_fields
    values = {key: getattr(settings, key) for key in fields}
    tables = [_table_text(f"{name}.{key}", value) for key, value in values.items() if isinstance(value, Settings)]
    keys = [
        f"{_comment(fields[key].description or '')}{key} = {_toml(value)}\n"
        for key, value in values.items()
        if not isinstance(value, Settings)
    ]
    return "\n".join([f"{_comment(type(settings).__doc__ or '')}[{name}]\n" + "".join(keys), *tables])


def _comment(text: str) -> str:
    return "".join(f"# {line}\n" for line in textwrap.wrap(text, _COMMENT_WIDTH))


def _toml(value: Any) -> str:
    return json.dumps(list(value) if isinstance(value, tuple) else value, ensure_ascii=False)


def load_config(file: str | Path) -> Config:
    """Read and validate a configuration file.

    Raises
    ------
    RequestError
        Where the file is missing or no text.
    ConfigError
        With every problem in it.
    """
    path = Path(file)
    content = read_toml(path)
    if "file" in content:
        raise ConfigError(str(path), [RequestError("this key is not known", where="file", advice="remove it")])
    also = [*_repeated_ids(content), *_without_delivery(content), *_unknown_moorings(content)]
    return validated(Config, content | {"file": path}, path, also=also)


def _tables(content: dict[str, Any], name: str) -> list[dict[str, Any]]:
    """Return the tables of a list as far as they are some; what is none is an empty one."""
    tables = content.get(name)
    return [table if isinstance(table, dict) else {} for table in tables] if isinstance(tables, list) else []


def _ids(content: dict[str, Any]) -> list[str]:
    return [str(table["id"]) for table in _tables(content, "moorings") if "id" in table]


def _without_delivery(content: dict[str, Any]) -> list[RequestError]:
    if content.get("series"):
        return []
    return [
        RequestError(
            "this mooring has no delivery",
            where=f"moorings #{place}.deliveries",
            expected="at least 1 item, or a [[series]] that has the mooring's columns",
            advice="add it",
        )
        for place, table in enumerate(_tables(content, "moorings"), start=1)
        if table.get("deliveries", []) == []
    ]


def _unknown_moorings(content: dict[str, Any]) -> list[RequestError]:
    known = _ids(content)
    return [
        RequestError(
            "no such mooring",
            where=f"series #{place}.mooring",
            expected="the id of one of [[moorings]]",
            found=repr(name),
            advice=f"did you mean {near[0]!r}?" if near else None,
        )
        for place, name in enumerate((table.get("mooring") for table in _tables(content, "series")), start=1)
        if isinstance(name, str) and name not in known
        for near in [difflib.get_close_matches(name, known, n=1, cutoff=0.5)]
    ]


def _repeated_ids(content: dict[str, Any]) -> list[RequestError]:
    ids = _ids(content)
    counts = Counter(name.casefold() for name in ids)
    twice = sorted({name for name in ids if counts[name.casefold()] > 1})
    return [
        RequestError(
            "this id is given to more than one mooring",
            where="moorings",
            expected="each id once, upper and lower case alike",
            found=name,
            advice="rename one, or list its files under one mooring",
        )
        for name in twice
    ]


def read_toml(path: Path) -> dict[str, Any]:
    """Read a TOML file; raise RequestError or ConfigError where that is not possible."""
    try:
        text = path.read_bytes().decode("utf-8-sig")
    except FileNotFoundError:
        raise RequestError("no such file", where=str(path), expected="a TOML file", advice=_neighbours(path)) from None
    except IsADirectoryError:
        raise RequestError("is a folder", where=str(path), expected="a TOML file", advice=_inside(path)) from None
    except OSError as error:
        raise RequestError(
            "cannot be read", where=str(path), found=error.strerror, advice="check the path and the permission"
        ) from None
    except UnicodeDecodeError as error:
        raise RequestError(
            "is no UTF-8 text", where=str(path), expected="a TOML file", found=f"byte {error.start} is not UTF-8"
        ) from None
    try:
        return tomllib.loads(text.replace("\r\n", "\n"))
    except tomllib.TOMLDecodeError as error:
        raise ConfigError(str(path), [RequestError("not TOML", found=str(error))]) from None


def _neighbours(path: Path) -> str:
    folder = path.parent
    names = [entry.name for entry in folder.glob("*.toml")] if folder.is_dir() else []
    near = difflib.get_close_matches(path.name, names, n=1, cutoff=0.5)
    return f"did you mean {folder / near[0]}?" if near else "check the path"


def _inside(path: Path) -> str:
    files = sorted(path.glob("*.toml"))
    return f"did you mean {files[0]}?" if files else "name the file in it"


Model = TypeVar("Model", bound=Settings)


def validated(model: type[Model], content: dict[str, Any], path: Path, *, also: Sequence[RequestError] = ()) -> Model:
    """Build ``model`` from parsed TOML, or raise ConfigError with everything that is wrong, ``also`` included."""
    problems = list(also)
    try:
        checked = model.model_validate(content)
    except ValidationError as error:
        details = error.errors()
        problems += [_problem(model, detail) for detail in details if not _is_consequence(detail, details)]
    if problems:
        raise ConfigError(str(path), problems)
    return checked


def _is_consequence(detail: Any, details: Sequence[Any]) -> bool:
    """Tell whether a list is called too short only because its items are wrong, which is reported for itself."""
    place = detail["loc"]
    return detail["type"] == "too_short" and any(
        len(other["loc"]) > len(place) and other["loc"][: len(place)] == place for other in details
    )


def _problem(model: type[Settings], detail: Any) -> RequestError:
    where = _place(detail["loc"])
    if detail["type"] == "extra_forbidden":
        known = _keys_beside(model, detail["loc"])
        near = difflib.get_close_matches(str(detail["loc"][-1]), known, n=1, cutoff=0.5)
        advice = f"did you mean {near[0]!r}?" if near else f"known here: {', '.join(known)}"
        return RequestError("this key is not known", where=where, advice=advice)
    if detail["type"] == "missing":
        return RequestError("this key is missing", where=where, advice="add it")
    if detail["type"] == "value_error":
        return RequestError(detail["msg"].removeprefix("Value error, "), where=where or None)
    return RequestError(detail["msg"], where=where, found=repr(detail["input"])[:80])


def _place(location: tuple[str | int, ...]) -> str:
    place = ""
    for part in location:
        place += f" #{part + 1}" if isinstance(part, int) else f".{part}" if place else str(part)
    return place


def _keys_beside(model: type[Settings], location: tuple[str | int, ...]) -> list[str]:
    """Return the keys that the table at ``location`` knows, by walking the models along the path."""
    here: Any = model
    for part in location[:-1]:
        if isinstance(part, int) or not hasattr(here, "model_fields"):
            continue
        annotation = here.model_fields[part].annotation if part in here.model_fields else None
        here = _innermost_model(annotation)
    return sorted(set(here.model_fields) - {"file"}) if hasattr(here, "model_fields") else []


def _innermost_model(annotation: Any) -> Any:
    if isinstance(annotation, type) and issubclass(annotation, BaseModel):
        return annotation
    for argument in getattr(annotation, "__args__", ()):
        found = _innermost_model(argument)
        if found is not None:
            return found
    return None
