"""The numbers of a series: units, what cannot be, and what the layout states in place of a column."""

from __future__ import annotations

from typing import Any

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from profiles.config import GrossRangeSettings
from profiles.ingest.layout import SeriesLayout
from profiles.ingest.layout.series import MOST_DAYS, SeriesDepth, SeriesIsotherm, SeriesMeanTemperature, SeriesValue
from profiles.ingest.units import to_celsius, to_downward, to_its90, to_metres

MOST_DEPLOYMENTS = 999  # numbers from 1000 on are given to series that do not say theirs
_METRES = ("independent", "persistent", "total", "spread")  # in the units of the isotherm's depth
_COLDEST, _WARMEST = GrossRangeSettings().sensor_min, GrossRangeSettings().sensor_max

Texts = NDArray[np.object_]
Fields = dict[str, NDArray[Any]]


def converted(fields: Fields, layout: SeriesLayout) -> Fields:
    """Return the numbers in m, positive down, and °C on ITS-90."""
    found = dict(fields)
    for name, value in layout.values.given.items():
        found[name] = _in_our_units(fields[name], value)
    isotherm = layout.values.isotherm_depth
    if isotherm is not None:
        found |= {name: to_metres(fields[name], isotherm.units) for name in _METRES if name in fields}
    return found


def _in_our_units(numbers: NDArray[np.float64], value: SeriesValue) -> NDArray[np.float64]:
    if isinstance(value, SeriesDepth):
        return to_downward(numbers, value.units, value.positive)
    if isinstance(value, SeriesMeanTemperature):
        return to_its90(to_celsius(numbers, value.units), value.scale)
    return numbers


def impossible(fields: Fields, converted_fields: Fields, layout: SeriesLayout) -> Texts:
    """Return why a row has a number that cannot be, or None.

    Parameters
    ----------
    fields, converted_fields : dict of ndarray, (row, mooring)
        As delivered, and as :func:`converted` returns them.
    """
    reasons = np.full(len(next(iter(fields.values()))), None, dtype=object)
    for name, value in layout.values.given.items():
        is_depth = isinstance(value, SeriesDepth)
        low, high = (0.0, value.deepest) if isinstance(value, SeriesDepth) else (_COLDEST, _WARMEST)
        numbers = converted_fields[name]
        said = f"{name} is not between {low:g} and {high:g} {'m' if is_depth else '°C'}"
        _say(reasons, (numbers < low) | (numbers > high), said)
    for name, said in _NOT_NEGATIVE.items():
        if name in fields:
            _say(reasons, fields[name] < 0.0, f"{said} is negative")
    for name, (said, least, most) in _WHOLE.items():
        if name in fields:
            numbers = fields[name]
            is_none = (numbers < least) | (numbers > most) | (numbers % 1.0 != 0.0)
            _say(reasons, is_none & ~np.isnan(numbers), f"{said} is no whole number from {least} to {most}")
    return reasons


_NOT_NEGATIVE = {
    "independent": "the independent error",
    "persistent": "the persistent error",
    "total": "the error",
    "spread": "the spread of the days",
}
_WHOLE = {"days": ("the number of days", 0, MOST_DAYS), "deployment": ("the deployment", 1, MOST_DEPLOYMENTS)}


def _say(reasons: Texts, wrong: NDArray[np.bool_], reason: str) -> None:
    reasons[wrong.any(axis=1) & pd.isna(reasons)] = reason


def with_stated(table: pd.DataFrame, isotherm: SeriesIsotherm, numbers: Fields) -> pd.DataFrame:
    """Return the values with the errors and the days that the layout states, or that follow from what it states."""
    error = isotherm.error
    if error is not None:
        stated = {
            name: float(to_metres(given, isotherm.units))
            for name, given in (
                ("independent", error.independent),
                ("persistent", error.persistent),
                ("total", error.total),
            )
            if name != "persistent_share" and isinstance(given, int | float)
        }
        for name in ("independent", "persistent"):
            if name in stated:
                table[name] = stated[name]
        if error.total is not None and error.persistent_share is not None:
            total = numbers.get("total", stated.get("total"))
            table["independent"] = total * np.sqrt(1.0 - error.persistent_share)
            table["persistent"] = total * np.sqrt(error.persistent_share)
    length = table["time"].dt.days_in_month.astype(float)
    if isotherm.complete:
        table["days"], table["spread"] = length, 0.0
    elif isotherm.days is not None:
        table["days"] = np.minimum(table["days"] if isinstance(isotherm.days, str) else float(isotherm.days), length)
        if isinstance(isotherm.spread, int | float):
            table["spread"] = float(to_metres(isotherm.spread, isotherm.units))
    return table
