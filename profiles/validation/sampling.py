"""A model's temperature where the sensors of moorings are."""

from __future__ import annotations

from typing import Any

import numpy as np
from numba import njit, prange
from numpy.typing import NDArray

from profiles.validation.stencils import Stencil


@njit(cache=True)
def _at_depth(temperature: Any, depth: Any, place: float, top_reach: float) -> float:
    """Return the temperature of one column at a depth, linear between neighbouring levels, NaN where one is missing.

    The shallowest level stands for the water above it where it is no deeper than ``top_reach``.
    """
    levels = temperature.size
    first = 0
    while first < levels and not np.isfinite(depth[first]):
        first += 1
    if first == levels:
        return np.nan
    if place <= depth[first]:
        near = place == depth[first] or depth[first] <= top_reach
        return np.float64(temperature[first]) if near else np.nan
    for level in range(first, levels - 1):
        lower = depth[level + 1]
        if not np.isfinite(lower):
            return np.nan
        if place <= lower:
            if place == lower:
                return np.float64(temperature[level + 1])
            share = (place - depth[level]) / (lower - depth[level])
            return (1.0 - share) * np.float64(temperature[level]) + share * np.float64(temperature[level + 1])
    return np.nan


@njit(cache=True, parallel=True)
def sample_kernel(
    temperature: Any, depth: Any, row: Any, column: Any, weight: Any, sensor_depth: Any, top_reach: float
) -> Any:
    """Return temperature at sensors, (time, mooring, sensor).

    Parameters
    ----------
    temperature : ndarray, shape (time, row, column, level)
    depth : ndarray, shape (1 or time, 1 or row, 1 or column, level)
        m, positive down, ascending.
    row, column, weight : ndarray, shape (mooring, corner)
        Weights of 0 do not count; where the sensor's depth is land at a corner, the other corners' weights are scaled
        to 1.
    sensor_depth : ndarray, shape (time, mooring, sensor)
        m; NaN gives NaN.
    top_reach : float
        m.
    """
    times, moorings, sensors = sensor_depth.shape
    result = np.full((times, moorings, sensors), np.nan)
    for time in prange(times):
        at_time = np.int64(time) if depth.shape[0] > 1 else np.int64(0)
        for mooring in range(moorings):
            for sensor in range(sensors):
                place = sensor_depth[time, mooring, sensor]
                if not np.isfinite(place):
                    continue
                total, whole = 0.0, 0.0
                for corner in range(row.shape[1]):
                    share = weight[mooring, corner]
                    if share == 0.0:
                        continue
                    y, x = row[mooring, corner], column[mooring, corner]
                    at_row = y if depth.shape[1] > 1 else 0
                    at_column = x if depth.shape[2] > 1 else 0
                    value = _at_depth(temperature[time, y, x], depth[at_time, at_row, at_column], place, top_reach)
                    if np.isfinite(value):
                        total += share * value
                        whole += share
                if whole > 0.0:
                    result[time, mooring, sensor] = total / whole
    return result


def sample(
    temperature: NDArray[Any], depth: NDArray[Any], where: Stencil, sensor_depth: NDArray[Any], *, top_reach: float
) -> NDArray[np.float64]:
    """Return a model's temperature at sensors, °C, (time, mooring, sensor); see :func:`sample_kernel`."""
    sampled = sample_kernel(
        temperature, depth, where.row, where.column, where.weight, np.asarray(sensor_depth, np.float64), top_reach
    )
    return np.asarray(sampled, dtype=np.float64)
