"""What faults do to numbers. Values in, delivered values out; no labels, no choice of place.

``since`` is days since a fault's first value, (time,); ``size`` is what the catalogue says of the kind.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Times = NDArray[np.datetime64]

FLOODING_DAYS = 4.0  # e-folding time of a flooding sensor's way to its extreme (ours)
FOULING_DAYS = 90.0  # e-folding time of the growth on a sensor (ours)
ADRIFT_DAYS = 10.0  # e-folding time of the change of water around a drifting mooring (ours)
ADRIFT_SPEED = 0.4  # degrees of longitude or latitude a day, about 0.5 m s-1: a surface current (ours)
AIR_SD, AIR_SENSOR_SD = 0.8, 0.1  # °C from one value to the next, all sensors alike, and each for itself (ours)
DIURNAL_BIAS, DIURNAL_DEPTH = 0.3, 5.0  # °C at the surface and its e-folding depth, m: hours of daylight (ours)
LEAN_DEPTH = 300.0  # m; where the rise of a knocked-down line is stated


# ------------------------------------------------------------------------------------------------------------
# One sensor: values (time,), none missing


def added(values: Floats, since: Floats, size: float) -> Floats:
    """Return the values with ``size`` added."""
    return values + size


def stuck(values: Floats, since: Floats, size: float) -> Floats:
    """Return the first value all along."""
    return np.full(values.shape, values[0])


def filled(values: Floats, since: Floats, size: float) -> Floats:
    """Return ``size`` instead of the values."""
    return np.full(values.shape, size)


def flooded(values: Floats, since: Floats, size: float) -> Floats:
    """Return values that near ``size``, e-folding in :data:`FLOODING_DAYS`."""
    return np.asarray(size + (values - size) * np.exp(-(since + 1.0) / FLOODING_DAYS))


def drifted(values: Floats, since: Floats, size: float) -> Floats:
    """Return values to which an evenly growing error is added that is ``size`` at the last."""
    return np.asarray(values + size * (since + 1.0) / (since[-1] + 1.0))


def fouled(values: Floats, since: Floats, size: float) -> Floats:
    """Return values to which an error is added that grows to ``size``, ever slower."""
    return np.asarray(values - size * np.expm1(-since / FOULING_DAYS))


def rolled_over(values: Floats, since: Floats, size: float) -> Floats:
    """Return values from a register that holds ``size`` and is full at their median: those above lack ``size``."""
    return np.where(values > np.median(values), values - size, values)


# ------------------------------------------------------------------------------------------------------------
# Several sensors: values (time, depth), NaN where missing


def swapped(values: Floats, since: Floats, depths: Floats, size: float, random: np.random.Generator) -> Floats:
    """Return the values with the order of the sensors turned round, what is missing with them."""
    return values[:, ::-1].copy()


def repeated(values: Floats, since: Floats, depths: Floats, size: float, random: np.random.Generator) -> Floats:
    """Return the first half of the values twice (an odd last one stays), what is missing with them."""
    half = len(values) // 2
    again = values.copy()
    again[half : 2 * half] = values[:half]
    return again


def lost(values: Floats, since: Floats, depths: Floats, size: float, random: np.random.Generator) -> Floats:
    """Return nothing."""
    return np.full(values.shape, np.nan)


def adrift(values: Floats, since: Floats, depths: Floats, size: float, random: np.random.Generator) -> Floats:
    """Return values that all warm or cool together by up to ``size``, ever slower."""
    return np.asarray(values - size * np.expm1(-(since[:, None] + 1.0) / ADRIFT_DAYS))


def in_air(values: Floats, since: Floats, depths: Floats, size: float, random: np.random.Generator) -> Floats:
    """Return air of about ``size`` °C at all sensors; missing stays missing."""
    air = size + AIR_SD * random.standard_normal((len(values), 1))
    return np.where(np.isnan(values), np.nan, air + AIR_SENSOR_SD * random.standard_normal(values.shape))


def part_of_day(values: Floats, since: Floats, depths: Floats, size: float, random: np.random.Generator) -> Floats:
    """Return means of a few hours of daylight instead of a day: heave is left in, and the surface is warm.

    Each day for itself the water at all depths is lifted by a normal deviate of ``size``, m.
    """
    day = np.floor(since).astype(np.int64)
    heave = size * random.standard_normal(day[-1] + 1)[day]
    warm = DIURNAL_BIAS * np.exp(-depths / DIURNAL_DEPTH)
    return at_depths(values, depths, depths + heave[:, None]) + warm


def at_depths(values: Floats, depths: Floats, wanted: Floats) -> Floats:
    """Return what the sensors would have read at other depths, linear between them.

    Parameters
    ----------
    values : ndarray, shape (time, depth)
        °C; NaN where missing, which stays missing.
    depths : ndarray, shape (depth,)
        m, ascending.
    wanted : ndarray, shape (time, depth)
        m. Beyond the shallowest and the deepest value of a time stands that value.
    """
    moved = values.copy()
    for row, (profile, place) in enumerate(zip(values, wanted, strict=True)):
        good = np.isfinite(profile)
        if good.any():
            moved[row, good] = np.interp(place[good], depths[good], profile[good])
    return moved


# ------------------------------------------------------------------------------------------------------------
# Where the sensors are: m deeper than stated, (time, depth)


def elsewhere(since: Floats, depths: Floats, size: float) -> Floats:
    """Return ``size`` all along."""
    return np.full((since.size, depths.size), size)


def knocked_down(since: Floats, depths: Floats, size: float) -> Floats:
    """Return a smooth pulse that lifts the line by ``size`` at :data:`LEAN_DEPTH`, in proportion to depth."""
    share = np.arange(1.0, since.size + 1.0) / (since.size + 1.0)
    return np.asarray(-size * (4.0 * share * (1.0 - share))[:, None] ** 2 * depths / LEAN_DEPTH)


# ------------------------------------------------------------------------------------------------------------
# The clock: stamps (time,) in, delivered stamps out; size in hours


def clock_wrong(stamps: Times, since: Floats, size: float) -> Times:
    """Return stamps that are late by ``size``."""
    return stamps + _to_seconds(np.full(since.shape, size))


def clock_drifted(stamps: Times, since: Floats, size: float) -> Times:
    """Return stamps ever later, by ``size`` at the last."""
    return stamps + _to_seconds(size * since / max(since[-1], np.finfo(float).tiny))


def stamp_repeated(stamps: Times, since: Floats, size: float) -> Times:
    """Return the first stamp all along."""
    return np.full(stamps.shape, stamps[0])


def _to_seconds(hours: Floats) -> NDArray[np.timedelta64]:
    return np.rint(hours * 3600.0).astype("timedelta64[s]")
