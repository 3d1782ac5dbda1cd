"""The mean temperature of a layer from the surface down."""

from __future__ import annotations

from typing import Any

import numpy as np
import xarray as xr
from numba import njit, prange
from numpy.typing import NDArray

from profiles.column.isotherm import SURFACE_REACH
from profiles.column.labelled import check_profiles, over_profiles
from profiles.column.sensors import DISORDER, check_order, count_good
from profiles.errors import RequestError
from profiles.vocabulary import LayerMeanStatus, describe

_FOUND = int(LayerMeanStatus.FOUND)
_OPEN_TOP = int(LayerMeanStatus.OPEN_TOP)
_OPEN_BOTTOM = int(LayerMeanStatus.OPEN_BOTTOM)
_GAP = int(LayerMeanStatus.GAP)
_TOO_FEW = int(LayerMeanStatus.TOO_FEW_SENSORS)


@njit(cache=True)
def _layer_mean(temperature: Any, depth: Any, bottom: float, surface_reach: float, max_gap: float) -> tuple[float, int]:
    """Return the mean and the status of one profile: trapezoids, the shallowest value up to the surface."""
    good = count_good(temperature, depth)
    if good < 2:
        return np.nan, DISORDER if good < 0 else _TOO_FEW
    integral, last, gap = 0.0, -1, False
    for sensor in range(temperature.size):
        value, place = np.float64(temperature[sensor]), np.float64(depth[sensor])
        if not (np.isfinite(value) and np.isfinite(place)):
            continue
        if last < 0:
            if place > surface_reach:
                return np.nan, _OPEN_TOP
            integral = value * min(place, bottom)
        elif depth[last] < bottom:
            distance = place - depth[last]
            gap = gap or distance > max_gap
            inside = min(place, bottom) - depth[last]
            middle = temperature[last] + 0.5 * inside / distance * (value - temperature[last])
            integral += inside * middle
        last = sensor
    if depth[last] < bottom:
        return np.nan, _OPEN_BOTTOM
    return (np.nan, _GAP) if gap else (integral / bottom, _FOUND)


@njit(cache=True, parallel=True)
def layer_mean_kernel(
    temperature: Any, depth: Any, bottom: float, surface_reach: float, max_gap: float
) -> tuple[Any, Any]:
    """Return mean and status of each profile (profile, sensor); ``depth`` is (profile or 1, sensor)."""
    profiles = temperature.shape[0]
    shared = depth.shape[0] == 1
    result = np.empty(profiles, temperature.dtype)
    status = np.empty(profiles, np.int8)
    for profile in prange(profiles):
        place = depth[0] if shared else depth[profile]
        result[profile], status[profile] = _layer_mean(temperature[profile], place, bottom, surface_reach, max_gap)
    return result, status


def layer_mean_temperature(
    temperature: xr.DataArray,
    *,
    bottom: float = 300.0,
    surface_reach: float = SURFACE_REACH,
    max_gap: float | None = None,
    sensor_depth: xr.DataArray | None = None,
) -> xr.Dataset:
    """Return the mean temperature from the surface to ``bottom``.

    Parameters
    ----------
    temperature : xarray.DataArray
        °C, with a dimension ``depth`` and any others; its coordinate ``depth`` in metres, positive down, ascending.
        NaN is missing.
    bottom : float
        Metres, positive.
    surface_reach : float
        Metres; the shallowest good sensor stands for the water above it if it is no deeper than this.
    max_gap : float, optional
        Metres; good sensors further apart within the layer leave it without a mean. Default: no limit.
    sensor_depth : xarray.DataArray, optional
        Where the sensors really were, as for :func:`profiles.isotherm_depth`.

    Returns
    -------
    xarray.Dataset
        ``mean_temperature`` (°C, linear between sensors) and ``mean_temperature_status``
        (:class:`profiles.vocabulary.LayerMeanStatus`) on the temperature's dims less ``depth``.

    Raises
    ------
    RequestError
        Where ``bottom`` is not positive.
    DataError
        Where the depths do not fit or do not increase.
    """
    if not bottom > 0.0:
        raise RequestError("no layer", where="bottom", expected="a positive depth, m", found=f"{bottom}")
    temperature, depth = check_profiles(temperature, sensor_depth)
    reach = np.inf if max_gap is None else float(max_gap)

    def kernel(values: NDArray[Any], places: NDArray[Any]) -> tuple[NDArray[Any], ...]:
        results: tuple[NDArray[Any], ...] = layer_mean_kernel(
            values, places, float(bottom), float(surface_reach), reach
        )
        check_order(results[1])
        return results

    found = over_profiles(
        kernel,
        temperature,
        depth,
        outputs=("mean_temperature", "mean_temperature_status"),
        dtypes=(temperature.dtype, np.int8),
    )
    return describe(
        found, mean_temperature={"comment": f"of the layer 0 to {bottom:g} m", "cell_methods": "depth: mean"}
    )
