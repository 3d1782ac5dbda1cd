"""What the labelled functions of this room share: the check of their input, and the call of a kernel over profiles."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import Any

import numpy as np
import xarray as xr

from profiles.errors import DataError, RequestError

Kernel = Callable[..., tuple[np.ndarray, ...]]


def check_profiles(
    temperature: xr.DataArray, sensor_depth: xr.DataArray | None = None
) -> tuple[xr.DataArray, xr.DataArray]:
    """Return the temperature and the depths of its sensors, checked.

    Raises
    ------
    RequestError
        Where ``temperature`` is no DataArray.
    DataError
        Where there is no dimension ``depth``, its coordinate is missing or not ascending, or ``sensor_depth`` has
        dimensions that the temperature has not.
    """
    if not isinstance(temperature, xr.DataArray):
        raise RequestError(
            "the temperature is not labelled", expected="an xarray.DataArray", found=type(temperature).__name__
        )
    if "depth" not in temperature.dims:
        raise DataError(
            "the temperature has no vertical dimension", expected="a dimension 'depth'", found=f"{temperature.dims}"
        )
    if sensor_depth is not None:
        return temperature, _check_sensor_depth(temperature, sensor_depth)
    if "depth" not in temperature.coords:
        raise DataError(
            "the temperature does not say how deep its sensors are",
            expected="a coordinate 'depth' in metres, positive down, or sensor_depth",
        )
    depth = temperature["depth"].astype(np.float64)
    if depth.size > 1 and not (np.diff(depth.values) > 0.0).all():
        raise DataError(
            "the sensor depths are not in order",
            where="depth",
            expected="metres, positive down, ascending, each once",
            found=np.array2string(depth.values, precision=1, threshold=20),
            advice="sort by depth",
        )
    return temperature, depth


def _check_sensor_depth(temperature: xr.DataArray, sensor_depth: xr.DataArray) -> xr.DataArray:
    extra = set(sensor_depth.dims) - set(temperature.dims)
    if extra or "depth" not in sensor_depth.dims:
        raise DataError(
            "sensor_depth does not fit the temperature",
            expected=f"'depth' and no other dimensions than {temperature.dims}",
            found=f"{sensor_depth.dims}",
        )
    return sensor_depth


def over_profiles(
    kernel: Kernel, temperature: xr.DataArray, *others: xr.DataArray, outputs: Sequence[str], dtypes: Sequence[Any]
) -> xr.Dataset:
    """Apply ``kernel`` to every profile and name its outputs.

    ``kernel`` gets the temperature as (profile, sensor) and each of ``others`` as (profile or 1, sensor), and returns
    one array of shape (profile,) per output. Dask arrays stay lazy.
    """

    def flat(temperature: np.ndarray, *others: np.ndarray) -> tuple[np.ndarray, ...] | np.ndarray:
        sensors = temperature.shape[-1]
        shared = [
            other.reshape(1, sensors) if other.size == sensors else _spread(other, temperature) for other in others
        ]
        results = kernel(temperature.reshape(-1, sensors), *shared)
        shaped = tuple(result.reshape(temperature.shape[:-1]) for result in results)
        return shaped if len(shaped) > 1 else shaped[0]

    if temperature.chunks is not None:
        temperature = temperature.chunk({"depth": -1})
    results = xr.apply_ufunc(
        flat,
        temperature,
        *others,
        input_core_dims=[["depth"]] * (1 + len(others)),
        output_core_dims=[[]] * len(outputs),
        dask="parallelized",
        output_dtypes=list(dtypes),
        keep_attrs=False,
    )
    named = results if isinstance(results, tuple) else (results,)
    return xr.Dataset(dict(zip(outputs, named, strict=True)))


def _spread(values: np.ndarray, like: np.ndarray) -> np.ndarray:
    return np.broadcast_to(values, like.shape).reshape(-1, like.shape[-1])
