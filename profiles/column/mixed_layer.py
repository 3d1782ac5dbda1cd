"""The depth of the mixed layer by a temperature threshold."""

from __future__ import annotations

from typing import Any

import numpy as np
import xarray as xr
from numba import njit, prange
from numpy.typing import NDArray

from profiles.column.labelled import check_profiles, over_profiles
from profiles.column.sensors import DISORDER, check_order, count_good
from profiles.errors import RequestError
from profiles.vocabulary import MixedLayerStatus, describe

_FOUND = int(MixedLayerStatus.FOUND)
_BELOW = int(MixedLayerStatus.BELOW_CHAIN)
_NO_REFERENCE = int(MixedLayerStatus.NO_REFERENCE)
_TOO_FEW = int(MixedLayerStatus.TOO_FEW_SENSORS)


@njit(cache=True)
def _mixed_layer(temperature: Any, depth: Any, threshold: float, reference_depth: float) -> tuple[float, int]:
    """Return the depth and the status of one profile."""
    good = count_good(temperature, depth)
    if good < 2:
        return np.nan, DISORDER if good < 0 else _TOO_FEW
    above, reference = -1, np.nan
    last_depth, last_departure = reference_depth, 0.0
    for sensor in range(temperature.size):
        value, place = np.float64(temperature[sensor]), np.float64(depth[sensor])
        if not (np.isfinite(value) and np.isfinite(place)):
            continue
        if place < reference_depth:
            above = sensor
            continue
        if np.isnan(reference):
            if place == reference_depth:
                reference = value
            elif above >= 0:
                share = (reference_depth - depth[above]) / (place - depth[above])
                reference = temperature[above] + share * (value - temperature[above])
            else:
                return np.nan, _NO_REFERENCE
        departure = value - reference
        if abs(departure) >= threshold:
            target = threshold if departure > 0.0 else -threshold
            share = (target - last_departure) / (departure - last_departure)
            return last_depth + share * (place - last_depth), _FOUND
        last_depth, last_departure = place, departure
    return np.nan, _NO_REFERENCE if np.isnan(reference) else _BELOW


@njit(cache=True, parallel=True)
def mixed_layer_kernel(temperature: Any, depth: Any, threshold: float, reference_depth: float) -> tuple[Any, Any]:
    """Return depth and status of each profile (profile, sensor); ``depth`` is (profile or 1, sensor)."""
    profiles = temperature.shape[0]
    shared = depth.shape[0] == 1
    result = np.empty(profiles, temperature.dtype)
    status = np.empty(profiles, np.int8)
    for profile in prange(profiles):
        place = depth[0] if shared else depth[profile]
        result[profile], status[profile] = _mixed_layer(temperature[profile], place, threshold, reference_depth)
    return result, status


def mixed_layer_depth(
    temperature: xr.DataArray,
    *,
    threshold: float = 0.2,
    reference_depth: float = 10.0,
    sensor_depth: xr.DataArray | None = None,
) -> xr.Dataset:
    """Return the first depth where the temperature differs by ``threshold`` from that at ``reference_depth``.

    Parameters
    ----------
    temperature : xarray.DataArray
        °C, with a dimension ``depth`` and any others; its coordinate ``depth`` in metres, positive down, ascending.
        NaN is missing.
    threshold : float
        °C, positive; warmer counts as much as colder.
    reference_depth : float
        Metres; the temperature there is linear between the sensors about it.
    sensor_depth : xarray.DataArray, optional
        Where the sensors really were, as for :func:`profiles.isotherm_depth`.

    Returns
    -------
    xarray.Dataset
        ``mixed_layer_depth`` (m, linear between sensors, never shallower than the reference) and
        ``mixed_layer_status`` (:class:`profiles.vocabulary.MixedLayerStatus`) on the temperature's dims less ``depth``.

    Raises
    ------
    RequestError
        Where the threshold is not positive.
    DataError
        Where the depths do not fit or do not increase.

    References
    ----------
    de Boyer Montegut et al. (2004), J. Geophys. Res. 109, C12003: 0.2 °C from 10 m.
    """
    if not threshold > 0.0:
        raise RequestError("not a threshold", where="threshold", expected="a positive number, °C", found=f"{threshold}")
    temperature, depth = check_profiles(temperature, sensor_depth)

    def kernel(values: NDArray[Any], places: NDArray[Any]) -> tuple[NDArray[Any], ...]:
        results: tuple[NDArray[Any], ...] = mixed_layer_kernel(values, places, float(threshold), float(reference_depth))
        check_order(results[1])
        return results

    found = over_profiles(
        kernel,
        temperature,
        depth,
        outputs=("mixed_layer_depth", "mixed_layer_status"),
        dtypes=(temperature.dtype, np.int8),
    )
    criterion = f"{threshold:g} degree_Celsius from the temperature at {reference_depth:g} m"
    return describe(found, mixed_layer_depth={"comment": criterion})
