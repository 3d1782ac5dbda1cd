"""The depth of the steepest fall of temperature: the thermocline without a choice of isotherm."""

from __future__ import annotations

from typing import Any

import numpy as np
import xarray as xr
from numba import njit, prange
from numpy.typing import NDArray

from profiles.column.labelled import check_profiles, over_profiles
from profiles.column.sensors import DISORDER, check_order, count_good
from profiles.vocabulary import describe


@njit(cache=True)
def _steepest(temperature: Any, depth: Any) -> tuple[float, int]:
    """Return the depth of one profile's steepest fall, and a status that only knows disorder."""
    good = count_good(temperature, depth)
    if good < 3:
        return np.nan, DISORDER if good < 0 else 1
    places, falls = np.empty(good - 1), np.empty(good - 1)
    pair, last = 0, -1
    for sensor in range(temperature.size):
        if not (np.isfinite(temperature[sensor]) and np.isfinite(depth[sensor])):
            continue
        if last >= 0:
            distance = np.float64(depth[sensor]) - depth[last]
            places[pair] = depth[last] + 0.5 * distance
            falls[pair] = (np.float64(temperature[last]) - temperature[sensor]) / distance
            pair += 1
        last = sensor
    steepest = int(np.argmax(falls))
    if falls[steepest] <= 0.0:
        return np.nan, 1
    if steepest == 0 or steepest == falls.size - 1:
        return places[steepest], 1
    before, after = places[steepest] - places[steepest - 1], places[steepest + 1] - places[steepest]
    rise = (falls[steepest] - falls[steepest - 1]) / before
    decline = (falls[steepest + 1] - falls[steepest]) / after
    bend = decline - rise
    if bend >= 0.0:
        return places[steepest], 1
    slope = (rise * after + decline * before) / (before + after)
    moved = -slope * 0.5 * (before + after) / bend
    return places[steepest] + min(max(moved, -0.5 * before), 0.5 * after), 1


@njit(cache=True, parallel=True)
def steepest_gradient_kernel(temperature: Any, depth: Any) -> tuple[Any, Any]:
    """Return the depth and the status of each profile (profile, sensor); ``depth`` is (profile or 1, sensor)."""
    profiles = temperature.shape[0]
    shared = depth.shape[0] == 1
    result = np.empty(profiles, temperature.dtype)
    status = np.empty(profiles, np.int8)
    for profile in prange(profiles):
        place = depth[0] if shared else depth[profile]
        result[profile], status[profile] = _steepest(temperature[profile], place)
    return result, status


def steepest_gradient_depth(temperature: xr.DataArray, *, sensor_depth: xr.DataArray | None = None) -> xr.Dataset:
    """Return the depth at which temperature falls most steeply with depth.

    Parameters
    ----------
    temperature : xarray.DataArray
        °C, with a dimension ``depth`` and any others; its coordinate ``depth`` in metres, positive down, ascending.
        NaN is missing.
    sensor_depth : xarray.DataArray, optional
        Where the sensors really were, as for :func:`profiles.isotherm_depth`.

    Returns
    -------
    xarray.Dataset
        ``steepest_gradient_depth`` (m) on the temperature's dims less ``depth``: the top of the parabola through the
        steepest gradient between neighbouring sensors and the gradients beside it, no farther than half-way to them.
        NaN with fewer than three good sensors, and where temperature never falls.

    Raises
    ------
    DataError
        Where the depths do not fit or do not increase.
    """
    temperature, depth = check_profiles(temperature, sensor_depth)

    def kernel(values: NDArray[Any], places: NDArray[Any]) -> tuple[NDArray[Any], ...]:
        result, status = steepest_gradient_kernel(values, places)
        check_order(status)
        return (result,)

    found = over_profiles(kernel, temperature, depth, outputs=("steepest_gradient_depth",), dtypes=(temperature.dtype,))
    return describe(found)
