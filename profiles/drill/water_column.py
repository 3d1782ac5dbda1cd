"""A water column whose thermocline can be moved: temperature at any depth and the depth of its isotherm.

A base column is given by seasonal harmonics on a fine grid of depths. Moving its isotherm from the depth
``base`` to the depth ``moved`` stretches the column: the temperature at z is the base temperature at m(z),
where m is monotone, m(0) = 0, m(moved) = base, and m(z) = z from ``REACH`` below the deeper of the two.
Between these knots m is the monotone cubic of Fritsch and Carlson (1980, SIAM J. Numer. Anal. 17, 238-246).

An anomaly of the surface temperature fades towards the isotherm as the cube of the temperature above it:
nearly uniform in the mixed layer, where a faster decay with depth would turn a cold anomaly into an
inversion.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numba import njit, prange
from numpy.typing import NDArray

ISOTHERM = 20.0  # °C; the isotherm whose depth is the truth (WWV definition)
STEP = 2.0  # m; spacing of the fine grid
BOTTOM = 640.0  # m; end of the fine grid: the deepest sensor, 500 m, moved by the largest displacement, and some
REACH = 250.0  # m; the column is as it was from here below the isotherm (ours)
SHALLOWEST = 8.0  # m; a moved isotherm is never shallower (ours)
_BEND = 4.0  # m; width of the bend towards it (ours)

#: Depths of the fine grid, m.
FINE_DEPTH = np.arange(0.0, BOTTOM + STEP / 2.0, STEP)

# An anomaly colder than this share of the surface's height above the isotherm is held there: the cube fades
# fast enough for temperatures to fall with depth while the share is below 1/3.
_COLDEST_SHARE = 0.25


@njit(cache=True)
def _fill(column: Any, harmonics: Any, season: Any) -> None:
    """Put the base temperature on the fine grid into ``column``."""
    column[:] = 0.0
    for term in range(season.size):
        for level in range(column.size):
            column[level] += season[term] * harmonics[term, level]


@njit(cache=True)
def _base(column: Any, depth: Any) -> Any:
    """Base temperature at ``depth``, linear on the fine grid."""
    level = min(int(depth / STEP), column.size - 2)
    share = depth / STEP - level
    return (1.0 - share) * column[level] + share * column[level + 1]


@njit(cache=True)
def _hermite(place: Any, width: Any, left: Any, right: Any, slope_left: Any, slope_right: Any) -> Any:
    """Cubic from ``left`` to ``right`` over ``width`` with the given slopes, at ``place`` from the left."""
    t = place / width
    return (
        left * (1.0 + 2.0 * t) * (1.0 - t) ** 2
        + width * slope_left * t * (1.0 - t) ** 2
        + right * t * t * (3.0 - 2.0 * t)
        - width * slope_right * t * t * (1.0 - t)
    )


@njit(cache=True)
def _source_depth(depth: Any, base: Any, moved: Any) -> Any:
    """m(depth) of the module's head; ``moved`` is positive."""
    end = max(base, moved) + REACH
    if depth >= end:
        return depth
    above, below = base / moved, (end - base) / (end - moved)
    middle = 2.0 * above * below / (above + below)
    if depth <= moved:
        return _hermite(depth, moved, 0.0, base, above, middle)
    return _hermite(depth - moved, end - moved, base, end, middle, 1.0)


@njit(cache=True)
def _temperature(column: Any, base: Any, moved: Any, anomaly: Any, depth: Any) -> Any:
    value = _base(column, _source_depth(depth, base, moved))
    height = column[0] - ISOTHERM
    if value > ISOTHERM and height > 0.0:
        value += max(anomaly, -_COLDEST_SHARE * height) * ((value - ISOTHERM) / height) ** 3
    return value


@njit(cache=True)
def _isotherm_depth(column: Any, base: Any, moved: Any, anomaly: Any) -> Any:
    above = _temperature(column, base, moved, anomaly, 0.0)
    if above < ISOTHERM:
        return 0.0
    for level in range(1, column.size):
        below = _temperature(column, base, moved, anomaly, level * STEP)
        if below < ISOTHERM:
            return STEP * (level - 1 + (above - ISOTHERM) / (above - below))
        above = below
    return np.nan


@njit(cache=True, parallel=True)
def isotherm_depths(harmonics: Any, season: Any, base: Any, moved: Any, anomaly: Any) -> Any:
    """Depths, m, of the isotherm of moved columns, read off the final temperature on the fine grid.

    Parameters
    ----------
    harmonics : ndarray, shape (position, harmonic, level)
        °C on :data:`FINE_DEPTH`.
    season : ndarray, shape (time, harmonic)
        See :func:`profiles.statistics.harmonic_design`.
    base, moved : ndarray, shape (position, time)
        Depths of the isotherm before and after, m; ``moved`` positive. Any equal depths leave the columns
        alone.
    anomaly : ndarray, shape (position, time)
        Of the surface temperature, °C.

    Returns
    -------
    ndarray, shape (position, time)
        The shallowest crossing, linear on the fine grid; 0 where the surface is colder, NaN where nothing is
        or where ``base`` or ``moved`` is NaN.
    """
    result = np.full(base.shape, np.nan)
    for position in prange(base.shape[0]):
        column = np.empty(harmonics.shape[2])
        for time in range(base.shape[1]):
            here, there = base[position, time], moved[position, time]
            if not (np.isnan(here) or np.isnan(there)):
                _fill(column, harmonics[position], season[time])
                result[position, time] = _isotherm_depth(column, here, there, anomaly[position, time])
    return result


@njit(cache=True)
def temperatures(harmonics: Any, season: Any, base: Any, moved: Any, anomaly: Any, depth: Any) -> Any:
    """Temperature, °C, of one position's moved columns at given depths.

    Parameters
    ----------
    harmonics : ndarray, shape (harmonic, level)
    season : ndarray, shape (time, harmonic)
    base, moved, anomaly : ndarray, shape (time,)
        As in :func:`isotherm_depths`.
    depth : ndarray, shape (time, depth)
        m, from 0 to :data:`BOTTOM`.

    Returns
    -------
    ndarray, shape (time, depth)
        NaN where ``base`` or ``moved`` is.
    """
    result = np.full(depth.shape, np.nan)
    column = np.empty(harmonics.shape[1])
    for time in range(depth.shape[0]):
        if np.isnan(base[time]) or np.isnan(moved[time]):
            continue
        _fill(column, harmonics, season[time])
        for level in range(depth.shape[1]):
            result[time, level] = _temperature(column, base[time], moved[time], anomaly[time], depth[time, level])
    return result


def displaced(base: NDArray[np.float64], displacement: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return the depth of an isotherm, m, moved by ``displacement`` (positive down) and kept off the surface.

    ``SHALLOWEST + w log(1 + exp((base + displacement - SHALLOWEST) / w))``: the sum where it is deep,
    smoothly no less than :data:`SHALLOWEST`.
    """
    excess = (base + displacement - SHALLOWEST) / _BEND
    return np.asarray(SHALLOWEST + _BEND * np.logaddexp(0.0, excess), dtype=np.float64)
