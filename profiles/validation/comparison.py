"""A model against an array, like for like, and how much of the difference is only what the array could not see."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import Any

import numpy as np
import xarray as xr
from numpy.typing import NDArray
from threadpoolctl import threadpool_limits

from profiles import store
from profiles.config import ValidationSettings
from profiles.errors import DataError
from profiles.section import build_section, thermocline_slope, warm_water_volume
from profiles.section.grid import REGIONS, array_grid, band_weights, sea_area
from profiles.section.response import ErrorsOfValues, Response
from profiles.section.tilt import section_weights, tilt_weights
from profiles.validation.blocks import Job, blocks_of, run_blocks, wet_points
from profiles.validation.box import Reader, box_of
from profiles.validation.calendars import DAILY, ModelTime
from profiles.validation.full_model import QUANTITIES, ToCells, least_steps
from profiles.validation.model import Model, open_model
from profiles.validation.observed import LEAN, MEASURED, Array, Sensors, open_array, read_sensors
from profiles.validation.score_table import score_table
from profiles.validation.seen_months import COMPARED, BothSides, both_sides
from profiles.validation.sources import Source
from profiles.validation.stencils import Stencil, stencil
from profiles.validation.wording import worded
from profiles.vocabulary import CAUTION

Floats = NDArray[np.float64]

#: What is read off the map, of both sides, with the dims that follow time.
FUNCTIONALS: Mapping[str, tuple[str, ...]] = {
    "thermocline_slope": (),
    "warm_water_volume": ("region",),
    "equatorial_isotherm_depth": ("longitude",),
}


def compare_model(model: Source | Model, array: str | Path, settings: ValidationSettings | None = None) -> xr.Dataset:
    """Compare a model with an array, like for like.

    The model is read at the moorings' positions and the sensors' depths, averaged as the array is or the array as it
    is, and only where the array has good data; then both go through the same operators with the settings of the run.
    The model is also read off on its own grid, without sampling. For tilt, volume and equatorial section the difference
    of the full model from the array's map is split::

        full model - array  =  (model as seen - array)  -  (model as seen - full model)
        ``_difference``        ``_seen_difference``        ``_hidden``

    Parameters
    ----------
    model : str, Path, sequence of these, xarray.Dataset or Model
        NetCDF files, a pattern of them or a Zarr store with CF metadata; an open dataset; or what
        :func:`profiles.validation.open_model` returned. Blocks are computed on the dask client or scheduler that is
        set (``distributed.Client``, ``dask.config.set(scheduler="processes")``), else in this process.
    array : str or Path
        The folder of a finished run: ``chains/``, ``columns_monthly.nc`` and ``run.json`` are read.
    settings : ValidationSettings, optional
        How the model is read; default: ``[validation]`` of the run.

    Returns
    -------
    xarray.Dataset
        By month, on (mooring, time): ``array_`` and ``model_isotherm_depth`` (m), and the same of
        ``steepest_gradient_depth``, ``mixed_layer_depth`` (m) and ``mean_temperature`` (°C), NaN unless both sides have
        a mean; ``isotherm_depth_difference_error``, NaN where the isotherm outcrops; ``averaging_effect``.
        For each F of ``thermocline_slope`` (m per 1000 km, negative where the thermocline shoals eastward),
        ``warm_water_volume`` (m3, region) and ``equatorial_isotherm_depth`` (m, longitude): ``array_F`` with
        ``array_F_error``, ``seen_F``, ``full_F``, and the split ``F_difference``, ``F_seen_difference``, ``F_hidden``.
        ``F_seen_difference_error`` is that of the array's measurement alone, for at its own places and times the array
        only errs by that; ``F_difference_error`` is the array's stated error and counts what its map cannot know.
        ``full_isotherm_depth`` and ``full_steepest_gradient_depth`` (time, latitude, longitude).
        Scores on ``series``, each with its 95 % interval, see :class:`profiles.validation.scores.Scores`.
        Errors are standard errors. Attributes say how the model was understood.

    Raises
    ------
    RequestError
        Where the model or the array is not there.
    DataError
        Where the model cannot be understood or read, or does not overlap with the array in time or space.
    """
    import dask  # here, for it brings a library of templates
    from dask.base import get_scheduler

    with threadpool_limits(1):  # so that sums come out the same on every machine; small matrices are quicker so, too
        scheduler = get_scheduler()  # type: ignore[no-untyped-call]
        # Only blocks of the model are worth a worker; all else is small and stays here.
        with dask.config.set(scheduler="synchronous"):
            return _compare(model, open_array(array), settings, scheduler)


def _compare(model: Source | Model, finished: Array, settings: ValidationSettings | None, scheduler: Any) -> xr.Dataset:
    settings = settings or finished.validation
    opened = model if isinstance(model, Model) else open_model(model, settings)
    wanted = _overlap(opened, finished)
    sensors = read_sensors(finished, _part(opened.time, wanted))
    box = box_of(opened, sensors.latitude, sensors.longitude, settings)
    reader = Reader(opened, box)
    wet = wet_points(reader, int(np.flatnonzero(opened.time.step == wanted.start)[0]))
    where = stencil(
        box.latitude, box.longitude, wet, sensors.latitude, sensors.longitude, nearest_wet=settings.nearest_wet
    )
    _check_reached(opened, where, settings)
    least = least_steps(opened.time.days, finished.section.means)
    job = Job(reader, where, ToCells.of(box, wet), least, finished.column, settings)
    blocks = blocks_of(opened, box, wanted, settings.block_megabytes)
    seen, cells = run_blocks(job, blocks, sensors.sensor_depth, wanted.start, scheduler)
    sides = both_sides(finished, sensors, seen, sensors.time)
    full = _full_fields(cells, sides.array["time"].values)
    return _assemble(opened, finished, sensors, where, sides, full, settings)


def _overlap(model: Model, array: Array) -> slice:
    """Return the steps of the model that lie within the array's record."""
    first, last = _record(array)
    inside = np.flatnonzero((model.time.start >= first) & (model.time.stop <= last))
    if inside.size == 0:
        raise DataError(
            "the model and the array do not overlap in time",
            where=model.name,
            expected=f"a {model.time.averaging} value or more within {_day(first)} to {_day(last)}",
            found=f"{_day(model.time.start[0])} to {_day(model.time.stop[-1])}"
            if model.time.start.size
            else "no day that the array's calendar has",
        )
    return slice(int(inside[0]), int(inside[-1]) + 1)


def _day(time: np.datetime64) -> str:
    return str(time.astype("datetime64[D]"))


def _record(array: Array) -> tuple[np.datetime64, np.datetime64]:
    """Return the start of the first month and the end of the last of the array's record."""
    with store.open_dataset(array.folder / "columns_monthly.nc") as monthly:
        months = monthly["time"].values.astype("datetime64[M]")
    return months.min().astype("datetime64[ns]"), (months.max() + 1).astype("datetime64[ns]")


def _part(time: ModelTime, wanted: slice) -> ModelTime:
    inside = (time.step >= wanted.start) & (time.step < wanted.stop)
    step = np.where(inside, time.step - wanted.start, -1)
    return ModelTime(time.calendar, time.averaging, time.days, step, time.start[wanted], time.stop[wanted], time.note)


def _check_reached(model: Model, where: Stencil, settings: ValidationSettings) -> None:
    if not where.weight.any():
        raise DataError(
            "every mooring lies on the model's land or outside it",
            where=model.name,
            expected=f"wet points within {settings.nearest_wet:g} km of a mooring",
            found=f"the nearest is {np.min(where.distance):.0f} km away",
            advice="raise nearest_wet in [validation] if points so far away may stand for a mooring",
        )


def _full_fields(cells: Mapping[np.datetime64, Mapping[str, Floats]], times: NDArray[np.datetime64]) -> xr.Dataset:
    """Return the monthly means of what was read off the model's own columns, on the cells of the array's map."""
    rows, columns = array_grid()
    missing = np.full((rows.size, columns.size), np.nan)
    months = times.astype("datetime64[M]")
    fields = {name: np.stack([cells.get(month, {}).get(name, missing) for month in months]) for name in QUANTITIES}
    dims = ("time", "latitude", "longitude")
    return xr.Dataset(
        {name: (dims, values) for name, values in fields.items()},
        coords={"time": times, "latitude": rows, "longitude": columns},
    )


# --------------------------------------------------------------------------------------------------------------
# Tilt, volume and section of either side


def _mapped(monthly: xr.Dataset, array: Array) -> dict[str, xr.DataArray]:
    """Return tilt, volume and section of one side with the array's own errors."""
    built = build_section(monthly, array.section, isotherm=array.column.isotherm)
    found: dict[str, xr.DataArray] = {}
    for name in FUNCTIONALS:
        source = built.volume if name in built.volume else built.section
        found |= {name: source[name], f"{name}_error": source[f"{name}_error"]}
    return found


def _of_full(field: xr.DataArray, array: Array) -> dict[str, xr.DataArray]:
    """Return tilt, volume and section of a model's isotherm depth on the cells."""
    rows, columns = field["latitude"].values, field["longitude"].values
    section = equatorial_mean(field)
    slope = thermocline_slope(section, window=array.section.tilt_window)["thermocline_slope"]
    depth = field.where(xr.DataArray(sea_area(rows, columns) > 0.0, dims=("latitude", "longitude")))
    volumes = [warm_water_volume(depth, region=region)["warm_water_volume"] for region in REGIONS]
    volume = xr.concat(volumes, dim="region", coords="minimal", compat="override")
    return {
        "thermocline_slope": slope,
        "warm_water_volume": volume.transpose("time", "region"),
        "equatorial_isotherm_depth": section,
    }


def equatorial_mean(field: xr.DataArray) -> xr.DataArray:
    """Return the mean over the sea of 2.5S-2.5N of a field on the cells, where half of it or more has a value."""
    band = band_weights(field["latitude"].values, field["longitude"].values)
    weights = xr.DataArray(np.nan_to_num(band), dims=("latitude", "longitude"))
    share = (field.notnull() * weights).sum("latitude")
    return (field.fillna(0.0) * weights).sum("latitude") / share.where(share >= 0.5)


def _weights(field: xr.Dataset, array: Array) -> tuple[Floats, dict[str, slice]]:
    """Return the weights of all functionals over the map, and where each stands among them."""
    rows, columns = array_grid()
    parts = {
        "thermocline_slope": tilt_weights(rows, columns, array.section.tilt_window)[None],
        "warm_water_volume": np.stack([sea_area(rows, columns, west_east=edges) for edges in REGIONS.values()]),
        "equatorial_isotherm_depth": section_weights(field),
    }
    places, start = {}, 0
    for name, part in parts.items():
        places[name] = slice(start, start + len(part))
        start += len(part)
    return np.concatenate(list(parts.values())), places


# --------------------------------------------------------------------------------------------------------------
# Putting it together


def _assemble(
    model: Model,
    array: Array,
    sensors: Sensors,
    where: Stencil,
    sides: BothSides,
    full: xr.Dataset,
    settings: ValidationSettings,
) -> xr.Dataset:
    result: dict[str, Any] = {}
    mapped = [_mapped(side, array) for side in (sides.array, sides.model)]
    unsampled = _of_full(full["isotherm_depth"], array)
    weights, places = _weights(full, array)
    response = Response.of(sides.array, weights, array.section, isotherm=array.column.isotherm)
    measured = measured_errors(sides.array, response, settings, daily=model.time.averaging == DAILY)
    result |= _at_moorings(sides, where, measured)
    of_sums = measured.with_persistent(settings.undetected_faults)
    month_errors = response.measurement_error(of_sums)
    for name, dims in FUNCTIONALS.items():
        part = month_errors[:, places[name]]
        error = xr.DataArray(part if dims else part[:, 0], dims=("time", *dims))
        result |= _split(name, mapped, unsampled, error)
    for name in ("isotherm_depth", "steepest_gradient_depth"):
        result[f"full_{name}"] = full[name].astype(np.float32)
    result["full_equatorial_steepest_gradient_depth"] = equatorial_mean(full["steepest_gradient_depth"])
    dataset = xr.Dataset(result)
    dataset = dataset.merge(score_table(dataset, response, places, measured, of_sums, settings.least_months))
    dataset = dataset.assign_coords(model=model.name)
    dataset.attrs = _attributes(model, array, sensors, settings)
    return worded(dataset)


def measured_errors(
    monthly: xr.Dataset, response: Response, settings: ValidationSettings, *, daily: bool
) -> ErrorsOfValues:
    """Return the errors of the array's monthly depths from measurement alone.

    Where both sides are compared day by day what changes from month to month is the noise of the sensors; else what
    missing days cost the array's mean comes to it. The small scales of the map's noise do not: a model seen at the same
    place should have them too. A part of the leaning is common to the array, the other persistent errors are a
    mooring's own.
    """
    small = response.settings.small_scale_sd
    sensors, persistent, lean = (
        monthly[name].transpose("time", "mooring").values.astype(np.float64)
        for name in ("isotherm_depth_error_independent", MEASURED, LEAN)
    )
    with_days = np.sqrt(np.maximum(response.records.independent**2 - small**2, 0.0))
    present = np.isfinite(response.records.values)
    common = settings.shared_lean * lean
    own = np.sqrt(np.maximum(persistent**2 - common**2, 0.0))
    parts = (np.where(present, part, np.nan) for part in (sensors if daily else with_days, own, common))
    independent, own, common = parts
    return ErrorsOfValues(independent, own, response.records.deployment, common)


def _at_moorings(sides: BothSides, where: Stencil, measured: ErrorsOfValues) -> dict[str, Any]:
    """Return both sides at the moorings; a mooring's position is no coordinate here, the map's latitudes are."""
    found: dict[str, Any] = {}
    for name in COMPARED:
        for side, months in (("array", sides.array), ("model", sides.model)):
            found[f"{side}_{name}"] = months[name].astype(np.float32).drop_vars(["latitude", "longitude"])
    # Nothing says how well the depth of an isotherm that has outcropped is known.
    stated = (sides.array["isotherm_depth"].notnull() & sides.array[MEASURED].notnull()).transpose("time", "mooring")
    found["isotherm_depth_difference_error"] = (
        ("time", "mooring"),
        np.where(stated.values, measured.of_values, np.nan),
    )
    found["averaging_effect"] = sides.averaging_effect.drop_vars(["latitude", "longitude"])
    found["nearest_wet_distance"] = ("mooring", where.distance)
    for name in ("latitude", "longitude"):
        found[f"{name}_of_mooring"] = ("mooring", sides.array[name].values)
    return found


def _split(
    name: str, mapped: list[dict[str, xr.DataArray]], full: dict[str, xr.DataArray], error: xr.DataArray
) -> dict[str, xr.DataArray]:
    ours, seen = mapped
    return {
        f"array_{name}": ours[name],
        f"array_{name}_error": ours[f"{name}_error"],
        f"seen_{name}": seen[name],
        f"full_{name}": full[name],
        f"{name}_difference": full[name] - ours[name],
        f"{name}_difference_error": ours[f"{name}_error"],
        f"{name}_seen_difference": seen[name] - ours[name],
        f"{name}_seen_difference_error": error.where(ours[name].notnull()),
        f"{name}_hidden": seen[name] - full[name],
    }


def _attributes(model: Model, array: Array, sensors: Sensors, settings: ValidationSettings) -> dict[str, Any]:
    return {
        "title": f"{model.name} against {array.name}, like for like",
        "comment": CAUTION,
        **model.notes,
        "calendar": model.time.calendar,
        "averaging": f"both sides averaged over {model.time.averaging} steps before the isotherm was found"
        if model.time.averaging != DAILY
        else "both sides averaged over days",
        "isotherm": array.column.isotherm,
        "moorings_with_sensor_depth": int(sensors.moved.sum()),
        "settings": settings.model_dump_json(),
    }
