"""A model's temperature, understood: which variable, which kind, where its points are, what its times stand for."""

from __future__ import annotations

from collections.abc import Hashable
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import cf_units
import numpy as np
import xarray as xr
from numpy.typing import NDArray

from profiles.config import ValidationSettings
from profiles.errors import DataError
from profiles.ingest.units import CELSIUS, DECIBAR, METRE, is_pressure, require_temperature_units
from profiles.validation.calendars import ModelTime, read_time
from profiles.validation.conversion import SALINITIES, TEMPERATURES
from profiles.validation.sources import Source, open_source

#: Names of the dimensions, in the order in which blocks hold them.
DIMS = ("time", "level", "row", "column")


@dataclass(frozen=True)
class Depths:
    """Depths of the levels: dims a subset of :data:`DIMS` with ``level`` among them, in ``units``, "m" or "dbar" alike.

    ``sign`` is 1 where they are positive down, -1 where they are positive up.
    """

    values: xr.DataArray
    units: str
    sign: float

    @property
    def moving(self) -> bool:
        """Whether the levels are elsewhere at other points or times."""
        return self.values.ndim > 1


@dataclass(frozen=True)
class Model:
    """A model's temperature, lazy, with dims among :data:`DIMS` in whatever order they stand in the file.

    ``latitude`` and ``longitude`` are (row,) and (column,), or both (row, column). ``kind`` is the kind of temperature,
    ``salinity_kind`` that of ``salinity``, where the model has it.
    """

    name: str
    temperature: xr.DataArray
    units: str
    kind: str
    depth: Depths
    latitude: NDArray[np.float64]
    longitude: NDArray[np.float64]
    time: ModelTime
    salinity: xr.DataArray | None
    salinity_kind: str

    @property
    def notes(self) -> dict[str, str]:
        """How the model was understood, by subject."""
        grid = "curvilinear" if self.latitude.ndim == 2 else "regular"
        sizes = "x".join(str(self.temperature.sizes[dim]) for dim in DIMS)
        return {
            "model_temperature": f"{self.temperature.name}: {self.kind} temperature, {self.units}",
            "model_salinity": f"{self.salinity.name}: {self.salinity_kind}" if self.salinity is not None else "atlas",
            "model_grid": f"{grid}, {sizes} (time, level, row, column)",
            "model_levels": "moving" if self.depth.moving else "fixed",
            "model_times": self.time.note,
        }


def open_model(source: Source, settings: ValidationSettings | None = None, *, name: str = "") -> Model:
    """Open a model and understand it by its CF metadata; no temperature is read.

    Parameters
    ----------
    source : str, Path, sequence of these, or xarray.Dataset
        See :func:`profiles.validation.sources.open_source`.
    settings : ValidationSettings, optional
        What the metadata does not say; default: the defaults.
    name : str, optional
        The model's name; default: that of its file.

    Raises
    ------
    RequestError
        Where nothing is there.
    DataError
        Where a file cannot be read, or its metadata does not say what is needed; the message says which.
    """
    import cf_xarray  # noqa: F401  (the accessor; imported here, for it brings a library of the terminal)

    settings = settings or ValidationSettings()
    dataset = open_source(source)
    called = name or _called(source, dataset)
    temperature = _temperature(dataset, settings, called)
    kind = _kind(temperature, settings, called)
    units = _units(temperature, called)
    time = _coordinate(dataset, temperature, "time", called)
    latitude = _coordinate(dataset, temperature, "latitude", called)
    longitude = _coordinate(dataset, temperature, "longitude", called)
    depth = _depth(dataset, temperature, settings, called)
    temperature, roles = _with_roles(temperature, time, latitude, longitude, depth, called)
    salinity = _salinity(dataset, temperature, settings)
    horizontal = [_horizontal(axis, roles, called) for axis in (latitude, longitude)]
    clock = time.rename(dict.fromkeys(time.dims, "time")) if time.dims else time.expand_dims("time")
    return Model(
        name=called,
        temperature=temperature.rename(roles),
        units=units,
        kind=kind,
        depth=_depths(depth, roles, settings, called),
        latitude=horizontal[0],
        longitude=horizontal[1],
        time=read_time(clock, _bounds(dataset, time), settings.averaging_days, called),
        salinity=None if salinity is None else salinity.rename(_present(roles, salinity)),
        salinity_kind="" if salinity is None else SALINITIES[str(salinity.attrs["standard_name"])],
    )


def _called(source: Source, dataset: xr.Dataset) -> str:
    if isinstance(source, str | Path):
        return Path(source).name.removesuffix(".nc").removesuffix(".zarr")
    if not isinstance(source, xr.Dataset) and len(source):
        return _called(source[0], dataset)
    return str(dataset.attrs.get("title", "model"))


# --------------------------------------------------------------------------------------------------------------
# Temperature and salinity


def _temperature(dataset: xr.Dataset, settings: ValidationSettings, where: str) -> xr.DataArray:
    if settings.temperature_variable:
        if settings.temperature_variable not in dataset.data_vars:
            raise DataError(
                "the model has no such variable",
                where=where,
                expected=f"{settings.temperature_variable!r}, as [validation] temperature_variable says",
                found=_listed(dataset.data_vars),
            )
        return _squeezed(dataset, settings.temperature_variable)
    found = [name for name, data in dataset.data_vars.items() if _standard_name(data) in TEMPERATURES]
    if len(found) != 1:
        raise DataError(
            "the model has two temperatures or more" if found else "no temperature was found in the model",
            where=where,
            expected=f"one variable with a standard_name among {', '.join(TEMPERATURES)}",
            found=_listed(found or dataset.data_vars),
            advice="name it: temperature_variable in [validation]",
        )
    return _squeezed(dataset, found[0])


def _listed(names: Any) -> str:
    return ", ".join(str(name) for name in list(names)[:12]) or "nothing"


def _standard_name(data: xr.DataArray) -> str:
    return str(data.attrs.get("standard_name", "")).split(" ")[0]


def _squeezed(dataset: xr.Dataset, name: Hashable) -> xr.DataArray:
    """Return a variable without dimensions of length 1 that no coordinate explains, such as that of a single member."""
    located = dataset[[name]].assign_coords(_auxiliary(dataset, dataset[name]))
    keys = ("time", "latitude", "longitude", "vertical")
    placed = {coordinate for key in keys for coordinate in located.cf.coordinates.get(key, [])}
    placed |= {coordinate for axis in "TZYX" for coordinate in located.cf.axes.get(axis, [])}
    placed |= {coordinate for coordinate in located.coords if _holds_dates(located[coordinate])}
    explained = placed.union(*(located[coordinate].dims for coordinate in placed))
    data = dataset[name]
    return data.squeeze([dim for dim, size in data.sizes.items() if size == 1 and dim not in explained])


def _kind(temperature: xr.DataArray, settings: ValidationSettings, where: str) -> str:
    if settings.temperature_kind != "by standard name":
        return settings.temperature_kind
    kind = TEMPERATURES.get(_standard_name(temperature))
    if kind is None:
        raise DataError(
            "the model does not say which temperature it carries",
            where=f"{where}, {temperature.name}",
            expected=f"a standard_name among {', '.join(TEMPERATURES)}",
            found=_standard_name(temperature) or "none",
            advice="declare temperature_kind in [validation]: in situ, potential or conservative",
        )
    return kind


def _units(temperature: xr.DataArray, where: str) -> str:
    units = str(temperature.attrs.get("units", ""))
    try:
        return require_temperature_units(_spelled(units))
    except ValueError:
        raise DataError(
            "the temperature's units cannot be converted",
            where=f"{where}, {temperature.name}",
            expected="units of temperature, such as degree_Celsius or K",
            found=repr(units) if units else "no units",
            advice="correct the attribute units of the file",
        ) from None


def _spelled(units: str) -> str:
    """Return units as the library of units spells them: many models write degC or deg C."""
    return {"degc": CELSIUS, "deg c": CELSIUS, "c": CELSIUS, "celsius": CELSIUS}.get(units.strip().lower(), units)


def _salinity(dataset: xr.Dataset, temperature: xr.DataArray, settings: ValidationSettings) -> xr.DataArray | None:
    """Return the model's salinity where it lies on the temperature's points."""
    if settings.salinity == "atlas":
        return None
    for name, data in dataset.data_vars.items():
        if _standard_name(data) in SALINITIES:
            salinity = _squeezed(dataset, name)
            if set(salinity.dims) == {*temperature.dims} and salinity.sizes == temperature.sizes:
                return salinity
    return None


# --------------------------------------------------------------------------------------------------------------
# Coordinates


def _coordinate(dataset: xr.Dataset, temperature: xr.DataArray, key: str, where: str) -> xr.DataArray:
    """Return the temperature's coordinate of time, latitude or longitude, by standard name, units or axis."""
    located = dataset[[temperature.name]].assign_coords(_auxiliary(dataset, temperature))
    names = [*located.cf.coordinates.get(key, [])]
    if key == "time":  # units such as "days since ..." are CF's mark of time, and were decoded to dates
        names = [name for name in [*names, *located.coords] if _holds_dates(located[name])] or names
    fitting = [name for name in names if set(located[name].dims) <= set(temperature.dims)]
    if not fitting:
        raise DataError(
            f"the model's {key} was not found",
            where=f"{where}, {temperature.name}",
            expected=f"a coordinate with the CF standard_name or units of {key}",
            found=f"coordinates {_listed(located.coords)}",
            advice="add the attributes standard_name and units, and name it in the variable's attribute coordinates",
        )
    return located[fitting[0]]


def _auxiliary(dataset: xr.Dataset, temperature: xr.DataArray) -> dict[Hashable, xr.DataArray]:
    """Return the file's variables that can place the temperature, whether or not it names them."""
    return {
        name: dataset[name]
        for name, data in dataset.variables.items()
        if name != temperature.name
        and _standard_name(dataset[name]) in ("latitude", "longitude", "time", "depth")
        and set(data.dims) <= set(temperature.dims)
        and name not in dataset.dims
    }


def _holds_dates(coordinate: xr.DataArray) -> bool:
    if coordinate.dtype.kind == "M":
        return True
    return coordinate.dtype == object and coordinate.size > 0 and hasattr(coordinate.values.flat[0], "timetuple")


def _bounds(dataset: xr.Dataset, time: xr.DataArray) -> xr.DataArray | None:
    name = time.attrs.get("bounds") or time.encoding.get("bounds")
    if name not in dataset.variables:
        return None
    bounds = dataset[name]
    if not _holds_dates(bounds) or bounds.shape[-1] != 2:
        return None
    return bounds if time.dims else bounds.expand_dims("time")


def _depth(dataset: xr.Dataset, temperature: xr.DataArray, settings: ValidationSettings, where: str) -> xr.DataArray:
    """Return the depths of the levels: the coordinate in units of length or pressure, one of moving levels first."""
    names: dict[Hashable, None] = {}
    located = dataset[[temperature.name]].assign_coords(_auxiliary(dataset, temperature))
    pressures = [name for name, data in located.coords.items() if is_pressure(str(data.attrs.get("units", "")))]
    for name in [*located.cf.coordinates.get("vertical", []), *located.cf.axes.get("Z", []), *pressures]:
        names[name] = None
    measured = [located[name] for name in names if _measures_depth(located[name])]
    fitting = [data for data in measured if set(data.dims) <= set(temperature.dims)]
    if fitting:
        return max(fitting, key=lambda data: data.ndim)
    parametric = [name for name in names if "formula_terms" in (located[name].attrs | located[name].encoding)]
    if parametric:
        return _parametric(dataset, parametric[0], where)
    raise DataError(
        "the model's depth was not found",
        where=f"{where}, {temperature.name}",
        expected="a vertical coordinate in units of length or pressure, or one with formula_terms",
        found=f"vertical coordinates {_listed(names)}; coordinates {_listed(located.coords)}",
        advice="add standard_name = 'depth', units and positive to the levels",
    )


def _measures_depth(data: xr.DataArray) -> bool:
    try:
        units = cf_units.Unit(str(data.attrs.get("units", "")))
    except ValueError:
        return False
    return bool(units.is_convertible(METRE) or units.is_convertible(DECIBAR))


def _parametric(dataset: xr.Dataset, name: Hashable, where: str) -> xr.DataArray:
    """Return the heights of levels that follow the sea floor, from their formula (CF appendix D), positive up."""
    outname = "height_of_levels"
    lazy = dataset.chunk()
    try:
        lazy.cf.decode_vertical_coords(outnames={name: outname})  # adds the coordinate in place
        heights = lazy[outname]
    except (KeyError, ValueError, NotImplementedError) as error:
        raise DataError(
            "the formula of the model's levels cannot be used",
            where=f"{where}, {name}",
            expected="formula_terms of CF appendix D, every term in the file with its standard_name",
            found=str(error),
        ) from error
    heights.attrs = {"units": METRE, "positive": "up"}
    return heights


def _with_roles(
    temperature: xr.DataArray,
    time: xr.DataArray,
    latitude: xr.DataArray,
    longitude: xr.DataArray,
    depth: xr.DataArray,
    where: str,
) -> tuple[xr.DataArray, dict[Hashable, str]]:
    """Return the temperature with all four dimensions, and what each stands for."""
    roles: dict[Hashable, str] = dict.fromkeys(time.dims, "time")
    horizontal = [dim for dim in temperature.dims if dim in {*latitude.dims, *longitude.dims}]
    roles |= dict(zip(horizontal, _horizontal_roles(horizontal, latitude), strict=True))
    left = [dim for dim in temperature.dims if dim not in roles]
    if len(left) > 1:
        raise DataError(
            "the model's temperature has a dimension too many",
            where=f"{where}, {temperature.name}",
            expected="time, level and two horizontal dimensions",
            found=f"{temperature.dims}, of which {_listed(left)} are not explained by time, latitude or longitude",
            advice="choose one member first: dataset.isel(...) from Python, or a tool for NetCDF files",
        )
    roles |= dict.fromkeys(left, "level")
    if not left and depth.ndim == 0:
        temperature = temperature.expand_dims("level")
        roles["level"] = "level"
    if not time.dims:
        temperature = temperature.expand_dims("time")
        roles["time"] = "time"
    missing = sorted(set(DIMS) - set(roles.values()))
    if missing:
        raise DataError(
            "the model's temperature lacks a dimension",
            where=f"{where}, {temperature.name}",
            expected="time, level and two horizontal dimensions",
            found=f"{temperature.dims}: no {_listed(missing)}",
            advice="a field of one level or of the surface has no thermocline",
        )
    coordinates = [name for name in temperature.coords if name in temperature.dims or temperature[name].ndim]
    return temperature.drop_vars(coordinates), roles


def _horizontal_roles(horizontal: list[Hashable], latitude: xr.DataArray) -> list[str]:
    """Return which of the horizontal dimensions are rows and columns."""
    return ["row" if dim in latitude.dims[:1] else "column" for dim in horizontal]


def _horizontal(axis: xr.DataArray, roles: dict[Hashable, str], where: str) -> NDArray[np.float64]:
    named = axis.rename(_present(roles, axis))
    order = [dim for dim in DIMS if dim in named.dims]
    values = np.asarray(named.transpose(*order).values, dtype=np.float64)
    steps = np.diff(values)
    if values.ndim == 1 and not ((steps > 0).all() or (steps < 0).all()):
        raise DataError(
            "an axis of the model's grid is not in order",
            where=f"{where}, {axis.name}",
            expected="finite, all ascending or all descending",
            found=np.array2string(values, precision=2, threshold=10),
        )
    return values


def _present(roles: dict[Hashable, str], data: xr.DataArray) -> dict[Hashable, str]:
    return {dim: role for dim, role in roles.items() if dim in data.dims}


def _depths(depth: xr.DataArray, roles: dict[Hashable, str], settings: ValidationSettings, where: str) -> Depths:
    units = str(depth.attrs["units"])
    pressure = is_pressure(units)
    declared = settings.depth_positive
    positive = declared if declared != "declared" else str(depth.attrs.get("positive", "down" if pressure else ""))
    if positive.lower() not in ("up", "down"):
        raise DataError(
            "the model's depth is not declared as positive up or down",
            where=f"{where}, {depth.name}",
            expected="the attribute positive = 'down' or 'up'",
            found=repr(positive) if positive else "none",
            advice="declare depth_positive in [validation]",
        )
    values = depth.rename(_present(roles, depth)) if depth.ndim else depth.expand_dims("level")
    values = values.drop_vars([name for name in values.coords])
    if values.ndim == 1:
        _check_levels(np.asarray(values.values, dtype=np.float64), f"{where}, {depth.name}")
    return Depths(values, units, 1.0 if positive.lower() == "down" else -1.0)


def _check_levels(levels: NDArray[np.float64], where: str) -> None:
    steps = np.diff(levels)
    if not np.isfinite(levels).all() or not ((steps > 0).all() or (steps < 0).all()):
        raise DataError(
            "the model's levels are not in order, or one is missing",
            where=where,
            expected="finite depths, all ascending or all descending",
            found=np.array2string(levels, precision=1, threshold=20),
        )
