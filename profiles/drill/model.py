"""A model of the simulated ocean with a planted error: monthly, coarse, in potential temperature and kelvin."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

import gsw
import numpy as np
import xarray as xr
from numpy.typing import NDArray

from profiles.atlas import annual_salinity, sea_share
from profiles.drill.demo import SEED, TRUTH_ATTRIBUTES, days
from profiles.drill.ocean import Ocean
from profiles.drill.sphere import METRES_PER_DEGREE
from profiles.drill.truth import LONGITUDE as CELL_LONGITUDE
from profiles.drill.truth import NORTH, SOUTH, TILT_WINDOW, equatorial_section, slope, volumes
from profiles.drill.water_column import BOTTOM
from profiles.errors import DataError
from profiles.store import make_folder, open_dataset, write_dataset
from profiles.vocabulary import describe

Floats = NDArray[np.float64]
Times = NDArray[np.datetime64]

# The planted error (ours): the thermocline lies deeper, and its tilt is flatter about the middle of the tilt's window.
DEEPER = 10.0  # m
FLATTER = 0.10  # share of the slope of the month
PIVOT = 0.5 * sum(TILT_WINDOW)  # degrees east

# The grid: centres of cells of 1 degree of latitude and 2 of longitude; levels closer where the thermocline is.
LATITUDE = np.arange(-5.5, 6.0)
LONGITUDE = np.arange(119.0, 282.0, 2.0)
DEPTH = np.array([5, 15, 25, 35, 45, 55, 65, 75, 90, 105, 120, 135, 150, 165, 180, 200, 225, 250, 300, 350, 420, 500.0])
CALENDAR, EPOCH = "noleap", "2031-01-01"

NAME = "simulated_model"
ATTRIBUTES = {
    "title": "A model of the simulated ocean, its thermocline 10 m too deep and its tilt 10 % too flat",
    "summary": "Monthly means on a coarse grid. The model, its ocean and its years are invented.",
    "institution": "none: simulated",
    "license": "BSD-3-Clause",
}

_KELVIN = 273.15
_STEP = 0.005  # K; a value is stored as a whole number of these above the offset
_OFFSET = 290.0  # K
_LAND = np.int16(-32768)  # what stands for a missing value


def make_model(
    folder: Path,
    *,
    seed: int = SEED,
    time: Times | None = None,
    grid: tuple[Floats, Floats] = (LATITUDE, LONGITUDE),
    progress: Callable[[str], None] = lambda line: None,
) -> None:
    """Make the model of the demo again, and its truth.

    Parameters
    ----------
    folder : Path
        A demo's, with ``truth/array.nc`` of the same seed. Gets ``model/`` and ``truth/model.nc``; files of the same
        names are replaced.
    seed : int, optional
        The same seed gives the same bytes.
    time : ndarray of datetime64, shape (time,), optional
        Middles of the days of whole months, UTC; by default the six years of the demo.
    grid : tuple of ndarray, optional
        Latitudes and longitudes of the model's points, two or more of each, regular; by default the whole grid.
    progress : callable, optional
        Told when it is finished.

    Raises
    ------
    MachineError
        Where the folder cannot be written.
    DataError
        Where the truth is not there.
    """
    with open_dataset(folder / "truth" / "array.nc") as stored:
        truth = stored.load()
    model = model_dataset(Ocean.simulate(days() if time is None else time, seed), truth, *grid)
    write_dataset(make_folder(folder / "model") / f"{NAME}.nc", model, ATTRIBUTES)
    write_dataset(folder / "truth" / "model.nc", model_truth(truth), TRUTH_ATTRIBUTES)
    progress("a model with a planted error")


def displacement(longitude: Floats, thermocline_slope: Floats) -> Floats:
    """Return by how much the model's thermocline lies deeper than the ocean's, m, (time, longitude).

    Parameters
    ----------
    longitude : ndarray, shape (longitude,)
        Degrees east.
    thermocline_slope : ndarray, shape (time,)
        Of the ocean, m per 1000 km.
    """
    distance = (longitude - PIVOT) * METRES_PER_DEGREE / 1e6
    return DEEPER - FLATTER * thermocline_slope[:, None] * distance


def model_dataset(
    ocean: Ocean, truth: xr.Dataset, latitude: Floats = LATITUDE, longitude: Floats = LONGITUDE
) -> xr.Dataset:
    """Return the model as its file holds it: packed integers, dates of a calendar without leap days.

    Parameters
    ----------
    ocean : Ocean
        Of daily values, whole months.
    truth : xarray.Dataset
        With ``thermocline_slope`` of the ocean's months, m per 1000 km.
    latitude, longitude : ndarray, optional
        Of the grid, regular, degrees north and degrees east.

    Raises
    ------
    DataError
        Where the truth lacks a month of the ocean.
    """
    kept = np.asarray(ocean.time.astype("datetime64[D]") != _leap_days(ocean.time))
    months = ocean.time.astype("datetime64[M]")
    shift = displacement(longitude, _slope_of(months, truth))
    values = np.empty((np.unique(months).size, DEPTH.size, latitude.size, longitude.size))
    for row, south_north in enumerate(latitude):
        values[:, :, row] = _row(ocean, float(south_north), longitude, shift, kept)
    values[:, :, _on_land(latitude, longitude)] = np.nan
    return _labelled(_packed(values), np.unique(months), latitude, longitude)


def model_truth(truth: xr.Dataset) -> xr.Dataset:
    """Return what the model's thermocline is, by month, from that of the ocean, as :func:`array_truth` returns it.

    An outcrop, 0 m in the ocean, is moved as all else is; the model's file differs a little where there is one.
    """
    share = sea_share(np.arange(SOUTH, NORTH + 1.0), np.append(CELL_LONGITUDE - 0.5, CELL_LONGITUDE[-1] + 0.5))
    shift = displacement(CELL_LONGITUDE, truth["thermocline_slope"].values)
    depth = truth["isotherm_depth"].values.astype(np.float64) + shift[:, None, :]
    section = equatorial_section(depth, share)
    regions = volumes(np.nan_to_num(depth), share)
    made = xr.Dataset(
        {
            "displacement": (("time", "longitude"), shift.round(3).astype(np.float32)),
            "equatorial_isotherm_depth": (("time", "longitude"), section.round(2)),
            "thermocline_slope": ("time", slope(section).round(6)),
            "warm_water_volume": (("time", "region"), np.stack([*regions.values()], axis=-1).round(-6)),
        },
        coords={"time": truth["time"].values, "longitude": CELL_LONGITUDE, "region": list(regions)},
    )
    made["displacement"].attrs = {
        "long_name": "depth of the isotherm in the model less that in the ocean",
        "units": "m",
        "positive": "down",
    }
    return describe(made)


def _leap_days(time: Times) -> Times:
    """Return 29 February of each time's year, NaT where there is none."""
    years = time.astype("datetime64[Y]")
    leap = (years + 1).astype("datetime64[D]") - years.astype("datetime64[D]") == np.timedelta64(366, "D")
    return np.where(leap, years.astype("datetime64[D]") + 59, np.datetime64("NaT", "D"))


def _slope_of(months: Times, truth: xr.Dataset) -> Floats:
    """Return the ocean's slope of each time's month."""
    known = truth["time"].values.astype("datetime64[M]")
    place = np.minimum(np.searchsorted(known, months), known.size - 1)
    if (known[place] != months).any():
        raise DataError("the truth lacks a month of the ocean", expected="the same months", found=f"{known.size}")
    return np.asarray(truth["thermocline_slope"].values[place], dtype=np.float64)


def _row(
    ocean: Ocean, latitude: float, longitude: Floats, shift: Floats, kept: NDArray[np.bool_]
) -> NDArray[np.float64]:
    """Return monthly potential temperature, K, (month, depth, longitude), along a parallel."""
    where = np.full(longitude.size, latitude), longitude
    columns = ocean.columns(*where)
    months = ocean.time[kept].astype("datetime64[M]")
    first, count = np.unique(months, return_index=True, return_counts=True)[1:]
    atlas = annual_salinity(*where)
    pressure = gsw.p_from_z(-DEPTH, latitude)
    means = np.empty((first.size, DEPTH.size, longitude.size))
    for place in range(longitude.size):
        depth = np.clip(DEPTH - shift[:, place, None], 0.0, BOTTOM)
        daily = columns.temperature(place, depth)[kept]
        salinity = np.interp(DEPTH, atlas["depth"].values, atlas.values[place])
        absolute = gsw.SA_from_SP(salinity, pressure, longitude[place], latitude)
        potential = gsw.pt0_from_t(absolute, daily, pressure)
        means[:, :, place] = np.add.reduceat(potential, first, axis=0) / count[:, None]
    return means + _KELVIN


def _on_land(latitude: Floats, longitude: Floats) -> NDArray[np.bool_]:
    """Return the cells less than half of which is sea, (latitude, longitude)."""
    return np.asarray(sea_share(_edges(latitude), _edges(longitude)) < 0.5)


def _edges(centres: Floats) -> Floats:
    half = 0.5 * (centres[1] - centres[0])
    return np.append(centres - half, centres[-1] + half)


def _packed(values: Floats) -> NDArray[np.int16]:
    """Return whole numbers of steps above the offset (CF-1.11, section 8.1)."""
    return np.where(np.isfinite(values), np.round((np.nan_to_num(values) - _OFFSET) / _STEP), _LAND).astype(np.int16)


def _labelled(values: NDArray[np.int16], months: Times, latitude: Floats, longitude: Floats) -> xr.Dataset:
    packed: dict[str, Any] = {"scale_factor": _STEP, "add_offset": _OFFSET, "missing_value": _LAND}
    bounds = np.stack([_since_epoch(months), _since_epoch(months + 1)], axis=-1)
    clock = {"units": f"days since {EPOCH}", "calendar": CALENDAR}
    dims = ("time", "depth", "latitude", "longitude")
    named = {
        "standard_name": "sea_water_potential_temperature",
        "long_name": "potential temperature, reference 0 dbar",
        "units": "K",
        "units_metadata": "temperature: on_scale",
        "cell_methods": "time: mean",
    }
    return xr.Dataset(
        {"potential_temperature": (dims, values, named | packed), "time_bounds": (("time", "bounds"), bounds)},
        coords={
            "time": ("time", bounds.mean(axis=1), clock | {"standard_name": "time", "bounds": "time_bounds"}),
            "depth": ("depth", DEPTH, {"standard_name": "depth", "units": "m", "positive": "down"}),
            "latitude": ("latitude", latitude, {"standard_name": "latitude", "units": "degrees_north"}),
            "longitude": ("longitude", longitude, {"standard_name": "longitude", "units": "degrees_east"}),
        },
    )


def _since_epoch(months: Times) -> Floats:
    """Return days to the first of each month in years of 365 days."""
    number = months.astype(np.int64) - np.datetime64(EPOCH, "M").astype(np.int64)
    before = np.array([0, 31, 59, 90, 120, 151, 181, 212, 243, 273, 304, 334])  # days of the year before each month
    return np.asarray(365.0 * (number // 12) + before[number % 12])
