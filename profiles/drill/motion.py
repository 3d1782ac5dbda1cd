"""How a surface mooring leans: its sensors rise, one-sidedly, by nothing at the buoy and more with depth.

A line of fixed length that leans in the undercurrent draws every sensor on it upward. The rise at the reference
depth goes with the square of a speed: a mean flow that fades away from the undercurrent, red noise on it, and
pulses that add to it. Above and below, the rise goes with a power of the distance along the line: about 1 in the
west, less in the east, where the undercurrent is shallow and a line leans most near the surface. The power wanders,
so that one pressure sensor does not tell the whole line.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.signal import lfilter

from profiles.drill.ocean import Columns

Floats = NDArray[np.float64]

REFERENCE_DEPTH = 300.0  # m; where the rise is stated
RISE = (
    3.0  # m at the reference depth, in the undercurrent's mean flow (ours: 0 to 10 m, rms error as McCarty et al. 1997)
)
CORE_LONGITUDE = 225.0  # degrees east; where the undercurrent is strongest, about 140W to 130W (from memory)
CORE_WIDTH_WEST, CORE_WIDTH_EAST = 50.0, 60.0  # degrees of longitude, e-folding of the Gaussian (ours)
CORE_HALF_WIDTH = 1.8  # degrees of latitude, e-folding of the Gaussian (from memory: confined to within 2 degrees)
BACKGROUND_SPEED = 0.6  # of the core's: surface currents and what is left far from the core (ours)
SPEED_SD = 0.35  # of the local mean speed (ours)
SPEED_DAYS = (5.0, 25.0)  # e-folding times of the two parts of the red noise: days and weeks (ours)
SHAPE_WEST, SHAPE_EAST = 1.0, 0.5  # mean power at and beyond the two ends of SHAPE_SPAN (ours)
SHAPE_SPAN = (165.0, 265.0)  # degrees east
SHAPE_SD = 0.1  # of the power (ours)
SHAPE_DAYS = 15.0  # e-folding time of the power's wandering (ours)
LEAST_SHAPE, GREATEST_SHAPE = 0.3, 1.4  # of the power; positive, so the rise grows with depth everywhere
PULSES_PER_YEAR = 3.0  # (ours)
PULSE_DAYS = (4.0, 15.0)  # whole length (ours)
PULSE_RISE = (4.0, 12.0)  # m at the reference depth, in the core (ours)


def red_noise(days: Floats, memory: float, random: np.random.Generator) -> Floats:
    """Return red noise of unit variance.

    Parameters
    ----------
    days : ndarray, shape (time,)
        Evenly spaced.
    memory : float
        Its e-folding time, days.
    random : numpy.random.Generator

    Returns
    -------
    ndarray, shape (time,)
    """
    noise = random.standard_normal(days.size)
    spacing = (days[-1] - days[0]) / max(days.size - 1, 1)
    kept = np.exp(-spacing / memory)
    noise[1:] *= np.sqrt(1.0 - kept**2)
    return np.asarray(lfilter([1.0], [1.0, -kept], noise))


def flow(latitude: ArrayLike, longitude: ArrayLike) -> Floats:
    """Return the mean speed past a line as a share of that in the undercurrent's core.

    Parameters
    ----------
    latitude, longitude : array_like
        Degrees north and degrees east, 0-360; shapes that broadcast.
    """
    away = np.asarray(longitude, dtype=np.float64) - CORE_LONGITUDE
    width = np.where(away < 0.0, CORE_WIDTH_WEST, CORE_WIDTH_EAST)
    core = np.exp(-((away / width) ** 2) - (np.asarray(latitude, dtype=np.float64) / CORE_HALF_WIDTH) ** 2)
    return np.asarray(BACKGROUND_SPEED + (1.0 - BACKGROUND_SPEED) * core)


def pulses(days: Floats, random: np.random.Generator) -> Floats:
    """Return the rise, m at the reference depth in the core, of pulses: smooth humps, 0 between them.

    Parameters
    ----------
    days : ndarray, shape (time,)
        Ascending.
    random : numpy.random.Generator

    Returns
    -------
    ndarray, shape (time,)
    """
    count = random.poisson(PULSES_PER_YEAR * (days[-1] - days[0]) / 365.25)
    starts = random.uniform(days[0], days[-1], count)
    lengths = random.uniform(*PULSE_DAYS, count)
    heights = random.uniform(*PULSE_RISE, count)
    share = np.clip((days - starts[:, None]) / lengths[:, None], 0.0, 1.0)
    return np.asarray((heights[:, None] * (4.0 * share * (1.0 - share)) ** 2).sum(axis=0))


def rise(days: Floats, depths: ArrayLike, latitude: float, longitude: float, random: np.random.Generator) -> Floats:
    """Return how much shallower than on a straight line the sensors of one mooring are.

    Parameters
    ----------
    days : ndarray, shape (time,)
        Evenly spaced, ascending.
    depths : array_like, shape (depth,)
        Distance along the line from the buoy, m.
    latitude, longitude : float
        Degrees north and degrees east, 0-360.
    random : numpy.random.Generator

    Returns
    -------
    ndarray, shape (time, depth)
        m, nowhere negative, 0 at the buoy, growing with depth.
    """
    mean = float(flow(latitude, longitude))
    wander = sum((red_noise(days, memory, random) for memory in SPEED_DAYS), start=np.zeros(days.size))
    speed = 1.0 + SPEED_SD * wander / np.sqrt(len(SPEED_DAYS))
    reference = mean**2 * (RISE * speed**2 + pulses(days, random))
    middle = np.interp(longitude, SHAPE_SPAN, (SHAPE_WEST, SHAPE_EAST))
    power = np.clip(middle + SHAPE_SD * red_noise(days, SHAPE_DAYS, random), LEAST_SHAPE, GREATEST_SHAPE)
    share = np.asarray(depths, dtype=np.float64) / REFERENCE_DEPTH
    return np.asarray(reference[:, None] * share ** power[:, None])


def temperature_error(columns: Columns, position: int, depths: ArrayLike, rise: Floats) -> Floats:
    """Return the rms temperature error, °C, (depth,), of taking risen sensors to be at their nominal depths.

    Parameters
    ----------
    columns : Columns
        Of the same times as ``rise``.
    position : int
    depths : array_like, shape (depth,)
        Nominal, m.
    rise : ndarray, shape (time, depth)
        m, as :func:`rise` gives.
    """
    nominal = np.asarray(depths, dtype=np.float64)
    error = columns.temperature(position, np.maximum(nominal - rise, 0.0)) - columns.temperature(position, nominal)
    return np.asarray(np.sqrt((error**2).mean(axis=0)))
