"""What a comparison says of a model, in numbers and words that hold no more than it can tell."""

from __future__ import annotations

import json
from collections.abc import Callable, Mapping
from dataclasses import dataclass

import numpy as np
import xarray as xr

from profiles.report.style import HALF_WIDTH_95
from profiles.report.summary import VOLUME_UNIT

#: Verdicts that are no direction.
WITHIN, NOT_SCORED = "smaller than the observation can tell", "too few independent months to say"


@dataclass(frozen=True)
class Quantity:
    """A scored series that is told of: its label, unit, scale and decimals, and what more and less of it is called."""

    name: str
    place: str
    label: str
    unit: str
    more: str
    less: str
    scale: float = 1.0
    decimals: int = 1


_VOLUME = ("10^14 m3", "larger", "smaller", VOLUME_UNIT, 2)
QUANTITIES = (
    Quantity("thermocline_slope", "equator", "tilt", "m per 1000 km", "flatter", "steeper", 1.0, 2),
    Quantity("warm_water_volume", "total", "warm water volume", *_VOLUME),
    Quantity("warm_water_volume", "west", "volume west of 155W", *_VOLUME),
    Quantity("warm_water_volume", "east", "volume east of 155W", *_VOLUME),
    Quantity("isotherm_depth", "array", "isotherm depth", "m", "deeper", "shallower"),
    Quantity("steepest_gradient_depth", "array", "depth of the steepest gradient", "m", "deeper", "shallower"),
)


@dataclass(frozen=True)
class ModelFinding:
    """One quantity of one model; numbers in ``unit``, means over the months that both sides have, NaN where unknown.

    ``bias`` is the model as seen less the array, ``low`` to ``high`` its 95 % interval. ``difference`` is the full
    model less the array's map, with the half-width of its 95 % interval, ``hidden`` the model as seen less the full
    model: ``difference = bias - hidden``. ``share`` is the part of the difference that the array
    saw, bias over difference, where the difference itself is told from none; the rest is the model's or the map's error
    away from the moorings, which cannot be told apart. ``observed`` says that the interval is
    of the array's measurement; else it is of the months that happened to be sampled.
    """

    quantity: str
    place: str
    label: str
    unit: str
    months: int
    array: float
    bias: float
    low: float
    high: float
    observed: bool
    difference: float
    difference_half_width: float
    hidden: float
    share: float
    verdict: str
    decimals: int


def model_findings(one: xr.Dataset) -> list[ModelFinding]:
    """Return what is told of one model.

    Parameters
    ----------
    one : xarray.Dataset
        As :func:`profiles.compare_model` returns it, or one model of :func:`profiles.validation.side_by_side`.
    """
    return [_finding(one, quantity) for quantity in QUANTITIES]


def _finding(one: xr.Dataset, quantity: Quantity) -> ModelFinding:
    row = scores_of(one, quantity.name, quantity.place)
    names = ("bias", "bias_low", "bias_high", "mean_difference", "mean_difference_error", "mean_hidden")
    bias, low, high, difference, error, hidden = (row[name] / quantity.scale for name in names)
    half = HALF_WIDTH_95 * error
    array = _array_mean(one, quantity) / quantity.scale
    return ModelFinding(
        quantity=quantity.name,
        place=quantity.place,
        label=quantity.label,
        unit=quantity.unit,
        months=int(row["months"]),
        array=array,
        bias=bias,
        low=low,
        high=high,
        observed=bool(np.isfinite(row["observation_noise"])),
        difference=difference,
        difference_half_width=half,
        hidden=hidden,
        share=bias / difference if abs(difference) > half else np.nan,
        verdict=_verdict(quantity, array, low, high),
        decimals=quantity.decimals,
    )


def scores_of(one: xr.Dataset, quantity: str, place: str) -> Mapping[str, float]:
    """Return the scores of one series of one model by name."""
    here = (one["quantity"].values == quantity) & (one["place"].values == place)
    row = one.isel(series=int(np.flatnonzero(here)[0]))
    return {
        str(name): float(data) for name, data in row.data_vars.items() if data.ndim == 0 and data.dtype.kind in "fi"
    }


def _array_mean(one: xr.Dataset, quantity: Quantity) -> float:
    name = f"array_{quantity.name}"
    seen = one[f"seen_{quantity.name}"] if f"seen_{quantity.name}" in one else one[f"model_{quantity.name}"]
    values = one[name].where(seen.notnull())
    if "region" in values.dims:
        values = values.sel(region=quantity.place)
    if "mooring" in values.dims:
        values = values.mean("mooring")
    return float(values.mean())


def _verdict(quantity: Quantity, array: float, low: float, high: float) -> str:
    if not np.isfinite([low, high]).all():
        return NOT_SCORED
    if low <= 0.0 <= high:
        return WITHIN
    more = low > 0.0
    if quantity.name == "thermocline_slope" and array > 0.0:  # a thermocline that deepens eastward: more is steeper
        more = not more
    return quantity.more if more else quantity.less


def in_words(finding: ModelFinding) -> list[str]:
    """Return lines of plain text: the difference as seen with its interval and verdict, and what sampling hides."""
    if finding.verdict == NOT_SCORED:
        return [f"{finding.label}: {NOT_SCORED} ({finding.months} months)"]

    def number(value: float) -> str:
        return f"{round(value, finding.decimals) + 0.0:+.{finding.decimals}f}"  # no minus before a zero

    interval = f"{number(finding.low)} to {number(finding.high)}"
    basis = "" if finding.observed else ", of sampling"
    lines = [f"{finding.label}: {number(finding.bias)} {finding.unit} ({interval}{basis}): {_said(finding)}"]
    if np.isfinite(finding.difference):
        half = f"{finding.difference_half_width:.{finding.decimals}f}"
        lines.append(f"full model less map {number(finding.difference)} ± {half}: {_split(finding, number)}")
    return lines


def _said(finding: ModelFinding) -> str:
    if finding.verdict == WITHIN:
        return WITHIN
    return f"{finding.verdict} than {'the array' if finding.observed else 'the array in these months'}"


def _split(finding: ModelFinding, number: Callable[[float], str]) -> str:
    parts = f"{number(finding.bias)} where the array looked, {number(-finding.hidden)} hidden by the sampling"
    if np.isnan(finding.share):
        return f"{parts}; smaller than the map can tell"
    return f"{parts}; {100.0 * finding.share:.0f} % of it seen by the array"


def readings(one: xr.Dataset) -> str:
    """Say which months of a model were compared, and how its temperature was read."""
    months = one["time"].values[one["seen_thermocline_slope"].notnull().values]
    understood = json.loads(str(one["understood"].item()))
    span = f"{str(months[0])[:7]} to {str(months[-1])[:7]}" if months.size else "no month of the tilt"
    reading = understood["temperature"].split(": ", 1)[-1]
    salinity = "" if reading.startswith("in situ") else f", salinity {understood['salinity']}"
    return f"{span}; {reading}{salinity}; {understood['averaging']}"
