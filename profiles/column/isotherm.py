"""The depth of an isotherm, why it is or is not given, and how wrong it may be."""

from __future__ import annotations

from typing import Any

import numpy as np
import xarray as xr
from numba import njit, prange
from numpy.typing import NDArray

from profiles.column.labelled import check_profiles, over_profiles
from profiles.column.sensors import DISORDER, check_order
from profiles.errors import RequestError
from profiles.vocabulary import IsothermStatus, describe

_FOUND = int(IsothermStatus.FOUND)
_OUTCROPPED = int(IsothermStatus.OUTCROPPED)
_ABOVE = int(IsothermStatus.ABOVE_CHAIN)
_BELOW = int(IsothermStatus.BELOW_CHAIN)
_GAP = int(IsothermStatus.GAP)
_SEVERAL = int(IsothermStatus.SEVERAL_CROSSINGS)
_TOO_FEW = int(IsothermStatus.TOO_FEW_SENSORS)

SURFACE_REACH = 5.0  # m; a sensor no deeper than this stands for the surface


@njit(cache=True)
def _locate(
    temperature: Any, depth: Any, isotherm: float, max_bracket: float, surface_reach: float, deepest: bool
) -> tuple[int, int, int]:
    """Return the sensors above and below the isotherm and the status; -1 for a sensor that there is not.

    The isotherm lies where water at least as warm stands over colder water. A passage the other way only counts as
    one more crossing.
    """
    upper, lower, crossings, good, top, last = -1, -1, 0, 0, -1, -1
    last_place, warm_above = -np.inf, False
    for sensor in range(temperature.size):
        value, place = temperature[sensor], depth[sensor]
        if not (np.isfinite(value) and np.isfinite(place)):
            continue
        if place <= last_place:
            return -1, -1, DISORDER
        warm = value >= isotherm
        if last < 0:
            top = sensor
        elif warm != warm_above:
            crossings += 1
            if warm_above and (upper < 0 or deepest):
                upper, lower = last, sensor
        last, last_place, warm_above = sensor, place, warm
        good += 1
    if good < 2:
        return -1, -1, _TOO_FEW
    if upper >= 0:
        if depth[lower] - depth[upper] > max_bracket:
            return -1, -1, _GAP
        return upper, lower, _FOUND if crossings == 1 else _SEVERAL
    if temperature[last] == isotherm:
        return last, last, _FOUND if crossings == 0 else _SEVERAL
    if warm_above:
        return -1, -1, _BELOW
    return -1, -1, _OUTCROPPED if depth[top] <= surface_reach else _ABOVE


@njit(cache=True, parallel=True)
def isotherm_kernel(
    temperature: Any, depth: Any, isotherm: float, max_bracket: float, surface_reach: float, deepest: bool
) -> tuple[Any, Any, Any]:
    """Return depth, status and bracket of each profile (profile, sensor); ``depth`` is (profile or 1, sensor)."""
    profiles = temperature.shape[0]
    shared = depth.shape[0] == 1
    result = np.empty(profiles, temperature.dtype)
    status = np.empty(profiles, np.int8)
    bracket = np.empty(profiles, temperature.dtype)
    for profile in prange(profiles):
        place = depth[0] if shared else depth[profile]
        upper, lower, found = _locate(temperature[profile], place, isotherm, max_bracket, surface_reach, deepest)
        status[profile] = found
        result[profile] = np.nan
        bracket[profile] = np.nan
        if upper >= 0:
            distance = place[lower] - place[upper]
            warm, cold = np.float64(temperature[profile, upper]), np.float64(temperature[profile, lower])
            share = (warm - isotherm) / (warm - cold) if warm > cold else 0.0
            result[profile] = place[upper] + share * distance
            bracket[profile] = distance
        elif found == _OUTCROPPED:
            result[profile] = 0.0
    return result, status, bracket


@njit(cache=True, parallel=True)
def isotherm_error_kernel(
    temperature: Any,
    depth: Any,
    accuracy: Any,
    isotherm: float,
    max_bracket: float,
    surface_reach: float,
    deepest: bool,
    noise: float,
    depth_accuracy: float,
    motion: float,
) -> tuple[Any, Any]:
    """Return the independent and the persistent standard error of each profile's isotherm depth.

    With z = z1 + f (z2 - z1), f = (T1 - T) / (T1 - T2): dz/dT1 = (1 - f) dz/dT, dz/dT2 = f dz/dT, dz/dz1 = 1 - f and
    dz/dz2 = f. The error of the straight line between the sensors is half f (1 - f) (z2 - z1)^2 |T''| / |T'|, the
    remainder of linear interpolation, T'' the larger of the bends at the two sensors. A line that leans moves both
    sensors alike: dz/dT times ``motion``.
    """
    profiles = temperature.shape[0]
    shared, alike = depth.shape[0] == 1, accuracy.shape[0] == 1
    independent = np.full(profiles, np.nan, temperature.dtype)
    persistent = np.full(profiles, np.nan, temperature.dtype)
    for profile in prange(profiles):
        place = depth[0] if shared else depth[profile]
        sd = accuracy[0] if alike else accuracy[profile]
        values = temperature[profile]
        upper, lower, _ = _locate(values, place, isotherm, max_bracket, surface_reach, deepest)
        if upper < 0 or upper == lower:
            continue
        distance = np.float64(place[lower] - place[upper])
        drop = np.float64(values[upper]) - np.float64(values[lower])
        share = (values[upper] - isotherm) / drop
        metres = distance / drop
        weight = np.sqrt((1.0 - share) ** 2 + share**2)
        calibration = metres * np.sqrt(((1.0 - share) * sd[upper]) ** 2 + (share * sd[lower]) ** 2)
        bending = 0.5 * share * (1.0 - share) * distance**2 * _curvature(values, place, upper, lower) * metres
        lean = metres * motion
        independent[profile] = metres * weight * noise
        persistent[profile] = np.sqrt(calibration**2 + (weight * depth_accuracy) ** 2 + bending**2 + lean**2)
    return independent, persistent


@njit(cache=True)
def _curvature(values: Any, depth: Any, upper: int, lower: int) -> float:
    """Return the larger |T''| of the two bends at a bracket's ends, 0 where there is no other sensor."""
    above, below = upper - 1, lower + 1
    while above >= 0 and not (np.isfinite(values[above]) and np.isfinite(depth[above])):
        above -= 1
    while below < values.size and not (np.isfinite(values[below]) and np.isfinite(depth[below])):
        below += 1
    largest = 0.0
    if above >= 0:
        largest = abs(_second_difference(values, depth, above, upper, lower))
    if below < values.size:
        largest = max(largest, abs(_second_difference(values, depth, upper, lower, below)))
    return largest


@njit(cache=True)
def _second_difference(values: Any, depth: Any, first: int, middle: int, last: int) -> float:
    """Return T'' of the parabola through three sensors."""
    gradient_above = (values[middle] - values[first]) / (depth[middle] - depth[first])
    gradient_below = (values[last] - values[middle]) / (depth[last] - depth[middle])
    return 2.0 * (gradient_below - gradient_above) / (depth[last] - depth[first])


def isotherm_depth(
    temperature: xr.DataArray,
    *,
    isotherm: float = 20.0,
    method: str = "linear",
    sensor_depth: xr.DataArray | None = None,
    max_bracket: float | None = None,
    crossing: str = "shallowest",
    surface_reach: float = SURFACE_REACH,
) -> xr.Dataset:
    """Return the depth of an isotherm in every profile.

    Parameters
    ----------
    temperature : xarray.DataArray
        °C, with a dimension ``depth`` and any others; its coordinate ``depth`` in metres, positive down, ascending.
        NaN is missing and is bridged as far as ``max_bracket`` allows.
    isotherm : float
        °C.
    method : {"linear"}
        Depth against temperature between the two sensors that bracket the isotherm.
    sensor_depth : xarray.DataArray, optional
        Where the sensors really were, metres, dims a subset of the temperature's with ``depth`` among them; ascending
        in every profile. NaN makes its sensor missing. Default: the coordinate.
    max_bracket : float, optional
        Metres; sensors further apart do not bracket the isotherm. Default: no limit.
    crossing : {"shallowest", "deepest"}
        Which passage from warm down to cold is taken where there are several.
    surface_reach : float
        Metres; a colder sensor no deeper than this means that the isotherm has outcropped.

    Returns
    -------
    xarray.Dataset
        ``isotherm_depth`` (m, positive down, NaN where the status gives none, 0 where it outcrops),
        ``isotherm_status`` (:class:`profiles.vocabulary.IsothermStatus`) and ``bracket`` (m) on the temperature's dims
        less ``depth``. Floating types are those of the temperature.

    Raises
    ------
    RequestError
        For a method or a crossing that there is not.
    DataError
        Where the depths do not fit or do not increase.

    Notes
    -----
    Linear interpolation of depth against temperature is common practice for moored chains (no source). Of in situ
    temperature: at 150 m the isotherm of potential temperature lies 0.2 to 0.6 m shallower.
    """
    _check_choice("method", method, ("linear",))
    deepest = _is_deepest(crossing)
    temperature, depth = check_profiles(temperature, sensor_depth)
    reach = np.inf if max_bracket is None else float(max_bracket)

    def kernel(values: NDArray[Any], places: NDArray[Any]) -> tuple[NDArray[Any], ...]:
        results = isotherm_kernel(values, places, float(isotherm), reach, float(surface_reach), deepest)
        check_order(results[1])
        return results

    dtype = temperature.dtype
    found = over_profiles(
        kernel,
        temperature,
        depth,
        outputs=("isotherm_depth", "isotherm_status", "bracket"),
        dtypes=(dtype, np.int8, dtype),
    )
    return describe(found, isotherm_depth={"comment": _rule(isotherm, max_bracket, crossing)})


def isotherm_depth_error(
    temperature: xr.DataArray,
    uncertainty: xr.DataArray,
    *,
    isotherm: float = 20.0,
    sensor_depth: xr.DataArray | None = None,
    max_bracket: float | None = None,
    crossing: str = "shallowest",
    surface_reach: float = SURFACE_REACH,
    noise: float,
    depth_accuracy: float,
    motion: float = 0.0,
) -> xr.Dataset:
    """Return the standard error of the depth that :func:`isotherm_depth` gives, whole and in its two parts.

    Parameters
    ----------
    temperature, isotherm, sensor_depth, max_bracket, crossing, surface_reach
        As for :func:`isotherm_depth`.
    uncertainty : xarray.DataArray
        Standard uncertainty of temperature that persists through a deployment, °C, dims a subset of the temperature's
        with ``depth`` among them.
    noise : float
        Standard deviation of what is independent from value to value, °C.
    depth_accuracy : float
        Standard uncertainty of a sensor's depth, m.
    motion : float
        Standard error of temperature from the leaning of the line, °C, alike at neighbouring sensors; 0 where
        ``sensor_depth`` says where they were.

    Returns
    -------
    xarray.Dataset
        ``isotherm_depth_error`` and its parts ``_independent`` (noise) and ``_persistent`` (calibration, sensor depth,
        a leaning line, the straight line between sensors), m, NaN where no isotherm is bracketed. The size of the last
        is estimated from the curvature of the profile.
    """
    deepest = _is_deepest(crossing)
    temperature, depth = check_profiles(temperature, sensor_depth)
    reach = np.inf if max_bracket is None else float(max_bracket)

    def kernel(values: NDArray[Any], places: NDArray[Any], accuracy: NDArray[Any]) -> tuple[NDArray[Any], ...]:
        results: tuple[NDArray[Any], ...] = isotherm_error_kernel(
            values, places, accuracy, float(isotherm), reach, float(surface_reach), deepest, float(noise),
            float(depth_accuracy),
            float(motion),
        )  # fmt: skip
        return results

    names = ("isotherm_depth_error_independent", "isotherm_depth_error_persistent")
    parts = over_profiles(
        kernel, temperature, depth, uncertainty, outputs=names, dtypes=(temperature.dtype, temperature.dtype)
    )
    parts["isotherm_depth_error"] = np.hypot(parts[names[0]], parts[names[1]])
    return describe(parts)


def _is_deepest(crossing: str) -> bool:
    _check_choice("crossing", crossing, ("shallowest", "deepest"))
    return crossing == "deepest"


def _check_choice(argument: str, value: str, choices: tuple[str, ...]) -> None:
    if value not in choices:
        raise RequestError(
            "no such choice", where=argument, expected=" or ".join(map(repr, choices)), found=repr(value)
        )


def _rule(isotherm: float, max_bracket: float | None, crossing: str) -> str:
    limit = "any distance" if max_bracket is None else f"at most {max_bracket:g} m"
    return (
        f"{isotherm:g} degree_Celsius, linear between the bracketing sensors, {limit} apart; "
        f"{crossing} crossing where there are several; 0 where the isotherm outcrops"
    )
