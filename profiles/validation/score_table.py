"""The scores of every series: moorings, lines, the whole array, tilt and volume."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import asdict, dataclass
from typing import Any

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from profiles.section.response import ErrorsOfValues, Response
from profiles.validation.scores import NAMES, score
from profiles.validation.seen_months import COMPARED
from profiles.validation.wording import UNITS

Floats = NDArray[np.float64]

LEAST_PRESENT = 0.5  # share of a line's moorings, or of the array's, that a month needs (ours)


@dataclass(frozen=True)
class Series:
    """A pair of monthly series: of what, where, and ``kind``: mooring, line, array or map.

    ``error`` is the standard error of the mean difference from the array's measurement, NaN where none is stated;
    ``noise`` the rms of that of a month. ``hidden`` and ``unsampled`` are means over the same months: the model as seen
    less the full model, and the full model less the array's map with ``unsampled_error``; NaN where there is no map.
    """

    quantity: str
    place: str
    kind: str
    model: Floats
    array: Floats
    error: float = np.nan
    noise: float = np.nan
    hidden: float = np.nan
    unsampled: float = np.nan
    unsampled_error: float = np.nan


def score_table(
    dataset: xr.Dataset,
    response: Response,
    places: dict[str, slice],
    measured: ErrorsOfValues,
    of_sums: ErrorsOfValues,
    least_months: int,
) -> xr.Dataset:
    """Return the scores on ``series``.

    Parameters
    ----------
    dataset : xarray.Dataset
        Both sides by month, as :func:`profiles.validation.comparison.compare_model` puts them together.
    response, places : Response, dict
        The answer of the functionals to the array's values, and where each functional stands in it.
    measured, of_sums : ErrorsOfValues
        Of the array's monthly depths, from measurement alone: for one mooring, and for sums over several.
    least_months : int
        Fewer months are not scored.
    """
    series = [*_at_moorings(dataset, measured, of_sums), *_of_map(dataset, response, places, of_sums)]
    time = dataset["time"].values
    scores = [
        asdict(score(time, one.model, one.array, bias_error=one.error, least_months=least_months)) for one in series
    ]
    table: dict[str, Any] = {name: ("series", np.array([row[name] for row in scores])) for name in NAMES}
    for name in ("hidden", "unsampled", "unsampled_error", "noise"):
        table[_COLUMNS[name]] = ("series", np.array([getattr(one, name) for one in series]))
    table["verdict"] = ("series", np.array([_verdict(row) for row in scores], dtype=object))
    labels = {
        name: ("series", np.array([getattr(one, name) for one in series], dtype=object))
        for name in ("quantity", "place", "kind")
    }
    labels["units"] = ("series", np.array([UNITS[one.quantity] for one in series], dtype=object))
    return xr.Dataset(table, coords=labels)


_COLUMNS = {
    "hidden": "mean_hidden",
    "unsampled": "mean_difference",
    "unsampled_error": "mean_difference_error",
    "noise": "observation_noise",
}


def _verdict(row: dict[str, float]) -> str:
    """Say what the bias's interval says."""
    if not np.isfinite(row["bias_low"]):
        return "not scored"
    told = row["bias_low"] > 0.0 or row["bias_high"] < 0.0
    return "model differs" if told else "within the array's error"


def _at_moorings(dataset: xr.Dataset, measured: ErrorsOfValues, of_sums: ErrorsOfValues) -> Iterator[Series]:
    longitude = dataset["longitude_of_mooring"].values
    names = dataset["mooring"].values
    groups = [(str(name), "mooring", np.array([place])) for place, name in enumerate(names)]
    groups += [(f"{line:g}E", "line", np.flatnonzero(longitude == line)) for line in np.unique(longitude)]
    groups += [("array", "array", np.arange(names.size))]
    for quantity in COMPARED:
        sides = [dataset[f"{side}_{quantity}"].transpose("time", "mooring").values for side in ("model", "array")]
        for place, kind, members in groups:
            model, array = (_mean_of(values[:, members].astype(np.float64)) for values in sides)
            error, noise = np.nan, np.nan
            if quantity == "isotherm_depth":
                error, noise = _measurement(sides[1], members, measured if kind == "mooring" else of_sums)
            yield Series(quantity, place, kind, model, array, error, noise)


def _mean_of(values: Floats) -> Floats:
    """Return the mean over moorings of the months in which enough of them are there."""
    present = np.isfinite(values)
    enough = present.mean(axis=1) >= LEAST_PRESENT
    total = np.where(present, values, 0.0).sum(axis=1)
    return np.where(enough, total / np.maximum(present.sum(axis=1), 1), np.nan)


def _measurement(array: Floats, members: NDArray[np.intp], measured: ErrorsOfValues) -> tuple[float, float]:
    """Return the standard error of the mean over months and members from measurement, and the rms of a month's."""
    present = np.zeros(array.shape, dtype=bool)
    present[:, members] = np.isfinite(array[:, members])
    given = present[:, members].mean(axis=1) >= LEAST_PRESENT
    if not given.any():
        return np.nan, np.nan
    weight = np.where(given[:, None], present, 0.0) / np.maximum(present.sum(axis=1), 1)[:, None]
    of_mean = float(np.sqrt(measured.variance((weight / given.sum())[None])[0]))
    own = (weight * np.hypot(measured.independent, measured.persistent)) ** 2
    of_month = own.sum(axis=1) + (weight * measured.common).sum(axis=1) ** 2
    return of_mean, float(np.sqrt(of_month[given].mean()))


def _of_map(
    dataset: xr.Dataset, response: Response, places: dict[str, slice], measured: ErrorsOfValues
) -> Iterator[Series]:
    of_mean = response.mean_measurement_error(measured)
    whole = response.mean_error()
    for name, region, at in _scalars(dataset, places):
        pick = {"region": region} if region else {}
        part = {
            key: dataset[key].sel(pick).values
            for key in (f"seen_{name}", f"array_{name}", f"{name}_hidden", f"{name}_difference")
        }
        noise = dataset[f"{name}_seen_difference_error"].sel(pick).values
        hidden, unsampled = part[f"{name}_hidden"], part[f"{name}_difference"]
        yield Series(
            quantity=name,
            place=region or "equator",
            kind="map",
            model=part[f"seen_{name}"],
            array=part[f"array_{name}"],
            error=float(of_mean[at]),
            noise=float(np.sqrt(np.nanmean(noise**2))),
            hidden=_mean(hidden),
            unsampled=_mean(unsampled),
            unsampled_error=float(whole[at]) if np.isfinite(unsampled).any() else np.nan,
        )


def _mean(values: Floats) -> float:
    return float(np.nanmean(values)) if np.isfinite(values).any() else np.nan


def _scalars(dataset: xr.Dataset, places: dict[str, slice]) -> Iterator[tuple[str, str, int]]:
    yield "thermocline_slope", "", places["thermocline_slope"].start
    for number, region in enumerate(dataset["region"].values):
        yield "warm_water_volume", str(region), places["warm_water_volume"].start + number
