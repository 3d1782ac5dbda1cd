"""The part of a model that is read: the array's waters, block by block of time, in degrees Celsius in situ."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import cf_units
import numpy as np
import xarray as xr
from numpy.typing import NDArray

from profiles.atlas import annual_salinity
from profiles.config import ValidationSettings
from profiles.errors import DataError
from profiles.ingest.units import CELSIUS, METRE, depth_of_pressure, is_pressure
from profiles.validation.conversion import ABSOLUTE, IN_SITU, PRACTICAL, absolute_salinity, in_situ, pressure_at
from profiles.validation.model import DIMS, Model
from profiles.validation.sources import UNREADABLE

Floats = NDArray[np.float64]

#: The waters that are compared, degrees: the box of the volume.
SOUTH_NORTH, WEST_EAST = (-5.0, 5.0), (120.0, 280.0)
ATLAS_LATITUDE, ATLAS_LONGITUDE = (-9.5, 9.5), (115.5, 291.5)  # of the packaged salinity
_MARGIN = 1.5  # spacings of the grid, so that every position in the waters lies between points


@dataclass(frozen=True)
class Box:
    """Which rows, columns and levels of a model are read.

    ``columns`` are one or two runs, joined in the order of longitude. ``latitude`` and ``longitude`` are those of what
    is read, longitudes of a regular grid 0-360 and ascending. ``flipped`` tells that the file's levels ascend.
    """

    rows: slice
    columns: tuple[slice, ...]
    levels: slice
    flipped: bool
    latitude: Floats
    longitude: Floats


@dataclass(frozen=True)
class Water:
    """What was read: ``temperature`` (time, row, column, level), °C in situ, NaN on land; ``depth``, m, positive down,
    (1 or time, 1 or row, 1 or column, level)."""

    temperature: NDArray[Any]
    depth: Floats


def box_of(model: Model, latitude: Floats, longitude: Floats, settings: ValidationSettings) -> Box:
    """Return the part of a model that holds the waters of the comparison and the positions of moorings.

    Raises
    ------
    DataError
        Where the model does not reach them.
    """
    south_north = min(SOUTH_NORTH[0], latitude.min()), max(SOUTH_NORTH[1], latitude.max())
    west_east = min(WEST_EAST[0], longitude.min()), max(WEST_EAST[1], longitude.max())
    find = _curvilinear_part if model.latitude.ndim == 2 else _regular_part
    rows, columns = find(model.latitude, model.longitude % 360.0, south_north, west_east)
    if rows.stop - rows.start < 2 or not columns:
        raise DataError(
            "the model does not reach the array",
            where=model.name,
            expected=f"points in {south_north[0]:g} to {south_north[1]:g} degrees north, "
            f"{west_east[0]:g} to {west_east[1]:g} degrees east",
            found=f"{np.nanmin(model.latitude):g} to {np.nanmax(model.latitude):g} degrees north, "
            f"{np.nanmin(model.longitude):g} to {np.nanmax(model.longitude):g} degrees east",
        )
    levels, flipped = _levels(model, settings)
    if model.latitude.ndim == 2:
        parts = [(model.latitude[rows, run], model.longitude[rows, run]) for run in columns]
        grid = tuple(np.concatenate(part, axis=1) for part in zip(*parts, strict=True))
    else:
        grid = model.latitude[rows], np.concatenate([model.longitude[run] % 360.0 for run in columns])
    return Box(rows, columns, levels, flipped, grid[0], grid[1])


def _regular_part(
    latitude: Floats, longitude: Floats, south_north: tuple[float, float], west_east: tuple[float, float]
) -> tuple[slice, tuple[slice, ...]]:
    rows = _run(_within(latitude, south_north))
    near = np.flatnonzero(_within(longitude, west_east))
    if near.size < 2:
        return rows, ()
    # Longitudes that wrap fall into two runs, of which the western comes first.
    breaks = np.flatnonzero(np.diff(near) > 1)
    breaks = np.union1d(breaks, np.flatnonzero(np.diff(longitude[near]) < 0.0))
    runs = [slice(int(part[0]), int(part[-1]) + 1) for part in np.split(near, breaks + 1)]
    runs.sort(key=lambda run: float(longitude[run.start]))
    return rows, tuple(runs)


def _within(axis: Floats, limits: tuple[float, float]) -> NDArray[np.bool_]:
    step = float(np.median(np.abs(np.diff(axis)))) if axis.size > 1 else 1.0
    return np.asarray((axis >= limits[0] - _MARGIN * step) & (axis <= limits[1] + _MARGIN * step))


def _run(chosen: NDArray[np.bool_]) -> slice:
    places = np.flatnonzero(chosen)
    return slice(int(places[0]), int(places[-1]) + 1) if places.size else slice(0, 0)


def _curvilinear_part(
    latitude: Floats, longitude: Floats, south_north: tuple[float, float], west_east: tuple[float, float]
) -> tuple[slice, tuple[slice, ...]]:
    step = float(np.nanmedian(np.abs(np.diff(latitude, axis=0))))
    margin = 2.0 * _MARGIN * max(step, float(np.nanmedian(np.abs(np.diff(longitude, axis=1)))))
    with np.errstate(invalid="ignore"):
        inside = (latitude >= south_north[0] - margin) & (latitude <= south_north[1] + margin)
        inside &= (longitude >= west_east[0] - margin) & (longitude <= west_east[1] + margin)
    columns = _run(np.atleast_1d(inside.any(axis=0)))
    return _run(np.atleast_1d(inside.any(axis=1))), (columns,) if columns.stop - columns.start > 1 else ()


def _levels(model: Model, settings: ValidationSettings) -> tuple[slice, bool]:
    """Return the levels down to the deepest that is needed, and whether they ascend in the file."""
    if model.depth.moving:
        along = model.depth.values.isel({dim: 0 for dim in model.depth.values.dims if dim != "level"})
        middle = np.asarray(along.values, dtype=np.float64) * model.depth.sign
        finite = middle[np.isfinite(middle)]
        return slice(0, middle.size), bool(finite.size > 1 and finite[-1] < finite[0])
    depth = metres(np.asarray(model.depth.values.values, dtype=np.float64), model, 0.0)
    flipped = bool(depth.size > 1 and depth[-1] < depth[0])
    used = depth <= settings.deepest
    # One level more, so that what lies at the limit has one on either side.
    used |= np.roll(used, -1 if flipped else 1) if used.any() and not used.all() else used
    return _run(used), flipped


def metres(values: Floats, model: Model, latitude: float) -> Floats:
    """Return a model's depths in metres, positive down; pressures become depths by the standard ocean."""
    if is_pressure(model.depth.units):
        return depth_of_pressure(np.asarray(cf_units.Unit(model.depth.units).convert(values, "dbar")), latitude)
    scaled = np.asarray(cf_units.Unit(model.depth.units).convert(np.array(values), METRE), dtype=np.float64)
    return np.asarray(model.depth.sign * scaled)


class Reader:
    """Reads blocks of a model's waters. What never changes is read once."""

    def __init__(self, model: Model, box: Box) -> None:
        self.model = model
        self.box = box
        self._still_depth: Floats | None = None
        self._still_salinity: Floats | None = None

    def read(self, times: slice) -> Water:
        """Read the values of some times.

        Raises
        ------
        DataError
            Where the file breaks off.
        """
        temperature = self._values(self.model.temperature, times)
        depth = self._depth(times)
        warm = _celsius(temperature, self.model.units)
        if self.model.kind != IN_SITU:
            self._convert(warm, depth, times)
        return Water(warm, depth)

    def _values(self, data: xr.DataArray, times: slice) -> NDArray[Any]:
        import dask

        chosen = {"time": times, "row": self.box.rows, "level": self.box.levels}
        parts = []
        for run in self.box.columns:
            index = {dim: part for dim, part in (chosen | {"column": run}).items() if dim in data.dims}
            try:
                with dask.config.set(scheduler="synchronous"):
                    loaded = data.isel(index).load()
            except UNREADABLE as error:
                raise DataError(
                    "the model's file breaks off",
                    where=f"{self.model.name}, {data.name}",
                    expected="a whole file",
                    found=str(error).splitlines()[0] if str(error) else type(error).__name__,
                    advice="fetch the file again",
                ) from error
            whole = loaded.expand_dims([dim for dim in DIMS if dim not in loaded.dims])
            parts.append(whole.transpose("time", "row", "column", "level").values)
        values = parts[0] if len(parts) == 1 or "column" not in data.dims else np.concatenate(parts, axis=2)
        return values[..., ::-1] if self.box.flipped else values

    def _depth(self, times: slice) -> Floats:
        data = self.model.depth.values
        if "time" not in data.dims and self._still_depth is not None:
            return self._still_depth
        values = np.asarray(self._values(data, times), dtype=np.float64)
        depth = metres(values, self.model, 0.0)
        self._still_depth = depth
        return depth

    def _convert(self, warm: NDArray[Any], depth: Floats, times: slice) -> None:
        """Turn ``warm`` into in situ temperature, time by time."""
        model = self.model
        own = None if model.salinity is None else self._values(model.salinity, times)
        latitude, longitude = self._positions()
        for number in range(warm.shape[0]):
            here = depth[number if depth.shape[0] > 1 else 0]
            pressure = pressure_at(here, latitude)
            if own is None:
                if self._still_salinity is None:
                    salinity = atlas_salinity(here, latitude[..., 0], longitude[..., 0])
                    self._still_salinity = absolute_salinity(salinity, PRACTICAL, pressure, longitude, latitude)
                salinity = self._still_salinity
            else:
                practical = np.asarray(own[number], dtype=np.float64)
                kind = model.salinity_kind
                salinity = (
                    practical if kind == ABSOLUTE else absolute_salinity(practical, kind, pressure, longitude, latitude)
                )
            warm[number] = in_situ(np.asarray(warm[number], dtype=np.float64), model.kind, salinity, pressure)

    def _positions(self) -> tuple[Floats, Floats]:
        """Return latitude and longitude, (row, column, 1)."""
        if self.box.latitude.ndim == 2:
            return self.box.latitude[..., None], self.box.longitude[..., None] % 360.0
        latitude, longitude = np.meshgrid(self.box.latitude, self.box.longitude, indexing="ij")
        return latitude[..., None], longitude[..., None]


def _celsius(values: NDArray[Any], units: str) -> NDArray[Any]:
    """Return a writable copy in °C, of the values' own precision if that is of floating point."""
    dtype = values.dtype if values.dtype.kind == "f" and values.dtype.itemsize >= 4 else np.dtype(np.float64)
    copied = np.array(values, dtype=dtype, order="C")
    unit = cf_units.Unit(units)
    if unit == cf_units.Unit(CELSIUS):
        return copied
    zero, one = (float(unit.convert(value, CELSIUS)) for value in (0.0, 1.0))
    copied *= one - zero
    copied += zero
    return copied


def atlas_salinity(depth: Floats, latitude: Floats, longitude: Floats) -> Floats:
    """Return the packaged annual-mean salinity at ``depth`` (1 or row, 1 or column, level), as (row, column, level)."""
    profiles = annual_salinity(np.clip(latitude.ravel(), *ATLAS_LATITUDE), np.clip(longitude.ravel(), *ATLAS_LONGITUDE))
    levels = profiles["depth"].values.astype(np.float64)
    shape = (*latitude.shape, depth.shape[-1])
    places = np.broadcast_to(depth, shape).reshape(-1, shape[-1])
    rows = [
        np.interp(place, levels, profile) for place, profile in zip(np.nan_to_num(places), profiles.values, strict=True)
    ]
    return np.array(rows).reshape(shape)
