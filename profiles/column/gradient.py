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

#: Falls that differ by less than this share of the steepest are one layer: float32 temperatures that were interpolated
#: along a straight line differ by 1e-6 or so (ours).
ALIKE = 1e-4


@njit(cache=True)
def _steepest(temperature: Any, depth: Any) -> tuple[float, int]:
    """Return the depth of one profile's steepest fall, and a status that only knows disorder."""
    good = count_good(temperature, depth)
    if good < 3:
        return np.nan, DISORDER if good < 0 else 1
    edges, falls = np.empty(good), np.empty(good - 1)
    found, last = 0, -1
    for sensor in range(temperature.size):
        if not (np.isfinite(temperature[sensor]) and np.isfinite(depth[sensor])):
            continue
        edges[found] = depth[sensor]
        if last >= 0:
            fall = np.float64(temperature[last]) - temperature[sensor]
            falls[found - 1] = fall / (edges[found] - edges[found - 1])
        found += 1
        last = sensor
    first = int(np.argmax(falls))
    steepest = falls[first]
    if steepest <= 0.0:
        return np.nan, 1
    stop = first + 1
    while stop < falls.size and falls[stop] >= (1.0 - ALIKE) * steepest:
        stop += 1
    while first > 0 and falls[first - 1] >= (1.0 - ALIKE) * steepest:
        first -= 1
    middle = 0.5 * (edges[first] + edges[stop])
    if stop - first > 1 or first == 0 or stop == falls.size:
        return middle, 1
    return middle + _top(edges[first - 1 : stop + 2], falls[first - 1 : stop + 1]), 1


@njit(cache=True)
def _top(edges: Any, falls: Any) -> float:
    """Return how far the top of the parabola through three falls lies below the middle one, which is the largest."""
    before, after = 0.5 * (edges[2] - edges[0]), 0.5 * (edges[3] - edges[1])
    rise, decline = (falls[1] - falls[0]) / before, (falls[2] - falls[1]) / after
    slope = (rise * after + decline * before) / (before + after)
    return np.float64(-0.5 * slope * (before + after) / (decline - rise))


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
        steepest gradient between neighbouring sensors and the gradients beside it, never farther than half-way to them;
        the middle of the layer where neighbouring gradients are alike, as between a model's levels.
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
