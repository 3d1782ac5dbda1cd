"""The part of a model that is read: the array's waters, block by block of time, in degrees Celsius in situ."""

from __future__ import annotations

from collections.abc import Callable
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
from profiles.validation.conversion import IN_SITU, PRACTICAL, absolute_salinity, in_situ, pressure_at
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
    """Reads blocks of a model's waters. What is the same at all times is read and computed once."""

    def __init__(self, model: Model, box: Box) -> None:
        self.model = model
        self.box = box
        self._still: dict[str, Floats] = {}
        self._held: dict[str, NDArray[Any]] = {}

    def read(self, times: slice) -> Water:
        """Read the values of some times.

        Raises
        ------
        DataError
            Where the file breaks off.
        """
        temperature = self._values("temperature", times)
        depth = self._depth(times)
        warm = _celsius(temperature, self.model.units)
        if self.model.kind != IN_SITU:
            self._convert(warm, depth, times)
        return Water(warm, depth)

    def loaded(self, times: slice) -> Reader:
        """Return a reader of some times alone, which are held in memory as the file has them and count from 0."""
        part = Reader(self.model, self.box)
        part._still = self._still
        part._held = {role: self._values(role, times) for role in self._changing()}
        return part

    def _changing(self) -> list[str]:
        """Return what has to be read at every time."""
        model = self.model
        salinity = ["salinity"] if model.salinity is not None and model.kind != IN_SITU else []
        return ["temperature", *salinity, *(["depth"] if "time" in model.depth.values.dims else [])]

    def _values(self, role: str, times: slice) -> NDArray[Any]:
        """Return a variable of the box, (time, row, column, level), of length 1 along what it does not depend on."""
        if role in self._held:
            return self._held[role][times]
        model = self.model
        data = model.depth.values if role == "depth" else model.salinity if role == "salinity" else model.temperature
        if data is None:
            raise ValueError(f"the model has no {role}")
        chosen = {"time": times, "row": self.box.rows, "level": self.box.levels}
        parts = []
        for run in self.box.columns:
            index = {dim: part for dim, part in (chosen | {"column": run}).items() if dim in data.dims}
            whole = self._load(data.isel(index))
            whole = whole.expand_dims([dim for dim in DIMS if dim not in whole.dims])
            parts.append(whole.transpose("time", "row", "column", "level").values)
        values = parts[0] if len(parts) == 1 or "column" not in data.dims else np.concatenate(parts, axis=2)
        return values[..., ::-1] if self.box.flipped else values

    def _load(self, data: xr.DataArray) -> xr.DataArray:
        import dask

        try:
            with dask.config.set(scheduler="synchronous"):
                return data.load()
        except UNREADABLE as error:
            raise DataError(
                "the model's file breaks off",
                where=f"{self.model.name}, {data.name}",
                expected="a whole file",
                found=str(error).splitlines()[0] if str(error) else type(error).__name__,
                advice="fetch the file again",
            ) from error

    def _depth(self, times: slice) -> Floats:
        if "time" in self.model.depth.values.dims:
            return metres(np.asarray(self._values("depth", times), dtype=np.float64), self.model, 0.0)
        return self._once(
            "depth", lambda: metres(np.asarray(self._values("depth", times), np.float64), self.model, 0.0)
        )

    def _once(self, name: str, make: Callable[[], Floats]) -> Floats:
        if name not in self._still:
            self._still[name] = make()
        return self._still[name]

    def _convert(self, warm: NDArray[Any], depth: Floats, times: slice) -> None:
        """Turn ``warm`` into in situ temperature, time by time."""
        own = None if self.model.salinity is None else self._values("salinity", times)
        for number in range(warm.shape[0]):
            here = depth[number if depth.shape[0] > 1 else 0]
            salinity, pressure = self._surroundings(here, None if own is None else own[number])
            warm[number] = in_situ(np.asarray(warm[number], dtype=np.float64), self.model.kind, salinity, pressure)

    def _surroundings(self, depth: Floats, salinity: NDArray[Any] | None) -> tuple[Floats, Floats]:
        """Return absolute salinity and pressure, (row, column, level), at one time."""
        latitude, longitude = self._positions()
        still = "time" not in self.model.depth.values.dims
        kept = self._once if still else _anew
        pressure = kept("pressure", lambda: pressure_at(depth, latitude))
        if salinity is not None:
            given = np.asarray(salinity, dtype=np.float64)
            return absolute_salinity(given, self.model.salinity_kind, pressure, longitude, latitude), pressure

        def from_atlas() -> Floats:
            practical = atlas_salinity(depth, latitude[..., 0], longitude[..., 0])
            return absolute_salinity(practical, PRACTICAL, pressure, longitude, latitude)

        return kept("salinity", from_atlas), pressure

    def _positions(self) -> tuple[Floats, Floats]:
        """Return latitude and longitude, (row, column, 1)."""
        if self.box.latitude.ndim == 2:
            return self.box.latitude[..., None], self.box.longitude[..., None] % 360.0
        latitude, longitude = np.meshgrid(self.box.latitude, self.box.longitude, indexing="ij")
        return latitude[..., None], longitude[..., None]


def _anew(name: str, make: Callable[[], Floats]) -> Floats:
    return make()


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
