"""Temperature of a simulated water column, and the depth of its 20 °C isotherm.

A column is a mixed layer of the surface's temperature, an upper thermocline that steepens down to the isotherm, and
a lower one that fades into the deep water::

    20 + (surface - 20) (1 - u**exponent),  u = (z - mixed) / (h - mixed)         above h
    deep(m(z)) + (20 - deep(reference)) exp(-(z - h) / decay)                      below h

where h is the depth of the isotherm and the deep water is moved with it, less and less with depth:
``m(z) = z - (h - reference) exp(-(z - h) / FADE)``. Where h is negative, the lower formula reaches the surface: the
isotherm has outcropped. As h rises the surface cools towards 20 °C, by ``tanh(h / COOLED)``, so that an outcrop
comes without a jump.

To this are added a cooled layer, which may be colder than the water below it (a fresh layer over a barrier layer in
the west, an intrusion in the east), the warmth of the afternoon near the surface, and the strain of the fine
structure, which is applied to z.
"""

from __future__ import annotations

from typing import Any, NamedTuple

import numpy as np
from numba import njit, prange
from numpy.typing import NDArray

Floats = NDArray[np.float64]

ISOTHERM = 20.0  # °C; the isotherm whose depth is the truth (WWV definition)
STEP = 2.0  # m; spacing of the fine grid
BOTTOM = 640.0  # m; end of the fine grid: the deepest sensor and the deep water's largest movement
FADE = 150.0  # m below the isotherm in which the deep water's movement fades (ours)
COOLED = 25.0  # m; an isotherm shallower than about this cools the surface (ours)
FADE_OF_STEPS = 15.0  # m; the fine structure fades above about this depth (ours)
AFTERNOON = 4.0  # m; e-folding depth of the afternoon's warmth (ours; common practice: the upper 10 m)
CALM = 35.0  # m; an isotherm deeper than this is out of reach of what the layers near the surface do

#: Depths of the fine grid, m.
FINE_DEPTH = np.arange(0.0, BOTTOM + STEP / 2.0, STEP)

_SEARCH_STEP = 0.5  # m, when looking for crossings near the surface
_RESOLUTION = 1e-4  # m, of a depth
_SEARCH_BELOW = 12.0  # m below the isotherm


class State(NamedTuple):
    """What changes in a column: each array (position, time).

    ``isotherm`` and ``mixed``, m; ``surface``, °C; ``cooling``, °C, of the layer from ``top`` to ``base``, m, whose
    edges are ``edge`` m wide on either side; ``afternoon``, °C, warmth at the surface.
    """

    isotherm: Floats
    surface: Floats
    mixed: Floats
    cooling: Floats
    top: Floats
    base: Floats
    edge: Floats
    afternoon: Floats


class Shape(NamedTuple):
    """What does not change in a column: exponent, decay and reference (position,), deep (position, level), and sines.

    See the module's head and :class:`profiles.drill.small_scales.FineStructure`.
    """

    exponent: Floats
    decay: Floats
    reference: Floats
    deep: Floats
    height: Floats
    number: Floats
    phase: Floats
    frequency: Floats


@njit(cache=True)
def _read(column: Any, depth: Any) -> Any:
    """Value of ``column`` at ``depth``, linear on the fine grid, held at its ends."""
    place = min(max(depth / STEP, 0.0), column.size - 1.001)
    level = int(place)
    share = place - level
    return (1.0 - share) * column[level] + share * column[level + 1]


@njit(cache=True)
def _step(place: Any) -> Any:
    """Rise smoothly from 0 at -1 to 1 at 1."""
    t = min(max(0.5 * (place + 1.0), 0.0), 1.0)
    return t * t * (3.0 - 2.0 * t)


@njit(cache=True)
def _strained(depth: Any, day: Any, position: Any, shape: Any) -> Any:
    """``depth`` moved by the fine structure, which fades towards the surface."""
    moved = 0.0
    for sine in range(shape.height.shape[1]):
        angle = (
            shape.number[position, sine] * depth + shape.phase[position, sine] - shape.frequency[position, sine] * day
        )
        moved += shape.height[position, sine] * np.sin(angle)
    return depth + moved * depth * depth / (depth * depth + FADE_OF_STEPS**2)


@njit(cache=True)
def _smooth(depth: Any, position: Any, time: Any, state: Any, shape: Any) -> Any:
    """Temperature of the column without layers near the surface and fine structure."""
    isotherm = state.isotherm[position, time]
    if depth < isotherm:
        above = (state.surface[position, time] - ISOTHERM) * np.tanh(isotherm / COOLED)
        mixed = state.mixed[position, time]
        if depth <= mixed:
            return ISOTHERM + above
        return ISOTHERM + above * (1.0 - ((depth - mixed) / (isotherm - mixed)) ** shape.exponent[position])
    deep, reference, below = shape.deep[position], shape.reference[position], depth - isotherm
    water = _read(deep, depth - (isotherm - reference) * np.exp(-below / FADE))
    return water + (ISOTHERM - _read(deep, reference)) * np.exp(-below / shape.decay[position])


@njit(cache=True)
def _layers(depth: Any, position: Any, time: Any, state: Any) -> Any:
    """Temperature that the layers near the surface add."""
    result = state.afternoon[position, time] * np.exp(-depth / AFTERNOON)
    cooling, edge = state.cooling[position, time], state.edge[position, time]
    if cooling > 0.0:
        above = _step((depth - state.top[position, time]) / edge)
        result -= cooling * (above - _step((depth - state.base[position, time]) / edge))
    return result


@njit(cache=True)
def _temperature(depth: Any, day: Any, position: Any, time: Any, state: Any, shape: Any) -> Any:
    strained = _strained(depth, day, position, shape)
    return _smooth(strained, position, time, state, shape) + _layers(depth, position, time, state)


@njit(cache=True)
def _calm_depth(day: Any, position: Any, time: Any, state: Any, shape: Any) -> Any:
    """Depth of the only crossing of a column without layers: where the strained depth is the isotherm's."""
    isotherm = state.isotherm[position, time]
    if shape.height.shape[1] == 0:
        return isotherm
    reach = shape.height[position].sum()
    low, high = isotherm - reach, isotherm + reach
    while high - low > _RESOLUTION:
        middle = 0.5 * (low + high)
        if _strained(middle, day, position, shape) < isotherm:
            low = middle
        else:
            high = middle
    return 0.5 * (low + high)


@njit(cache=True)
def _search(day: Any, position: Any, time: Any, state: Any, shape: Any) -> Any:
    """First depth at which the column passes the isotherm downward, 0 where the surface is colder, and how often."""
    above = _temperature(0.0, day, position, time, state, shape)
    first, passages = (0.0, 0) if above < ISOTHERM else (np.nan, 0)
    depth, end = 0.0, max(state.isotherm[position, time], 0.0) + _SEARCH_BELOW
    while depth < end:
        depth += _SEARCH_STEP
        below = _temperature(depth, day, position, time, state, shape)
        if below < ISOTHERM <= above:
            passages += 1
            if np.isnan(first):
                first = _passage(depth - _SEARCH_STEP, depth, day, position, time, state, shape)
        above = below
    return first, passages


@njit(cache=True)
def _passage(low: Any, high: Any, day: Any, position: Any, time: Any, state: Any, shape: Any) -> Any:
    """Depth between two at which the column passes the isotherm."""
    while high - low > _RESOLUTION:
        middle = 0.5 * (low + high)
        if _temperature(middle, day, position, time, state, shape) < ISOTHERM:
            high = middle
        else:
            low = middle
    return 0.5 * (low + high)


@njit(cache=True, parallel=True)
def isotherm_depths(day: Any, state: Any, shape: Any) -> Any:
    """Return the depth of the isotherm and how often the columns pass it downward.

    Parameters
    ----------
    day : ndarray, shape (time,)
        Days since the epoch.
    state : State
    shape : Shape

    Returns
    -------
    tuple of ndarray, shape (position, time)
        The shallowest downward passage, m, 0 where the surface is colder; the number of passages, int8. The depth
        is exact to 0.1 mm; above :data:`CALM`, passages less than 0.5 m apart are not told apart.
    """
    depth = np.empty(state.isotherm.shape)
    passages = np.ones(state.isotherm.shape, dtype=np.int8)
    for position in prange(depth.shape[0]):
        for time in range(depth.shape[1]):
            if state.isotherm[position, time] >= CALM:
                depth[position, time] = _calm_depth(day[time], position, time, state, shape)
            else:
                found = _search(day[time], position, time, state, shape)
                depth[position, time], passages[position, time] = found
    return depth, passages


@njit(cache=True)
def temperatures(depth: Any, day: Any, position: Any, state: Any, shape: Any) -> Any:
    """Return temperature, °C, (time, depth), of one position's columns.

    Parameters
    ----------
    depth : ndarray, shape (time, depth)
        m, from 0 to :data:`BOTTOM`.
    day : ndarray, shape (time,)
        Days since the epoch.
    position : int
    state : State
    shape : Shape
    """
    result = np.empty(depth.shape)
    for time in range(depth.shape[0]):
        for level in range(depth.shape[1]):
            result[time, level] = _temperature(depth[time, level], day[time], position, time, state, shape)
    return result


def kept_above(values: Floats, floor: float, bend: float) -> Floats:
    """Return ``values`` where they are some ``bend`` above ``floor``, below that smoothly no less than the floor."""
    return np.asarray(floor + bend * np.logaddexp(0.0, (values - floor) / bend))
