"""What the sensors make of the water: calibration, noise, wrong nominal depths, gaps."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from profiles.drill.ocean import Columns

Floats = NDArray[np.float64]

YEAR = 365  # days; a mooring is exchanged once a year

CALIBRATION_SD = 0.02  # °C per sensor and deployment (Freitag et al. 2005: 0.018, drift included)
NOISE_SD = 0.005  # °C, one daily value (from memory)
DEPTH_SD = 1.0  # m, sensor against nominal depth, per sensor and deployment (ours)
SHALLOWEST_SENSOR = 0.2  # m; a sensor never leaves the water
DECIMALS = 3  # resolution 0.001 °C

SINGLE_DAY_SHARE = 0.01  # of all values, each for itself
OUTAGES_PER_YEAR = 0.12  # of a whole mooring
OUTAGE_DAYS = (30, 150)
LOST_YEARS_PER_YEAR = 0.017  # outages that last a year: a tenth of the moorings have one in six years
DEATHS_PER_YEAR = 0.12  # of a sensor, which is then silent until the mooring is exchanged


def deployment_numbers(days: int, random: np.random.Generator) -> NDArray[np.int64]:
    """Return the number of the deployment on each day, (time,), from 0, changed on a random day each year."""
    return (np.arange(days) + int(random.integers(0, YEAR))) // YEAR


def measure(
    columns: Columns,
    position: int,
    depths: tuple[float, ...],
    deployment: NDArray[np.int64],
    random: np.random.Generator,
) -> Floats:
    """Return what sensors at nominal ``depths`` read, °C, (time, depth), without gaps, to the resolution."""
    shape = (int(deployment.max()) + 1, len(depths))
    depth_error = DEPTH_SD * random.standard_normal(shape)
    calibration = CALIBRATION_SD * random.standard_normal(shape)
    depth = np.maximum(np.asarray(depths) + depth_error[deployment], SHALLOWEST_SENSOR)
    noise = NOISE_SD * random.standard_normal(depth.shape)
    return np.asarray(columns.temperature(position, depth) + calibration[deployment] + noise).round(DECIMALS)


def missing(sensors: int, deployment: NDArray[np.int64], random: np.random.Generator) -> NDArray[np.bool_]:
    """Return which values were never delivered, (time, depth)."""
    days = deployment.size
    gone = random.random((days, sensors)) < SINGLE_DAY_SHARE
    for start, stop in _outages(days, random):
        gone[start:stop] = True
    for sensor in range(sensors):
        gone[:, sensor] |= _dead(deployment, random)
    return gone


def _outages(days: int, random: np.random.Generator) -> list[tuple[int, int]]:
    lengths = [
        int(length) for length in random.integers(*OUTAGE_DAYS, size=random.poisson(OUTAGES_PER_YEAR * days / YEAR))
    ]
    lengths += [YEAR] * int(random.poisson(LOST_YEARS_PER_YEAR * days / YEAR))
    starts = [int(random.integers(0, max(days - length, 1))) for length in lengths]
    return [(start, start + length) for start, length in zip(starts, lengths, strict=True)]


def _dead(deployment: NDArray[np.int64], random: np.random.Generator) -> NDArray[np.bool_]:
    """A sensor dies on a random day of some deployments and stays silent to their end."""
    dies = random.random(int(deployment.max()) + 1) < DEATHS_PER_YEAR
    day = random.integers(0, YEAR, size=dies.size)
    first = np.searchsorted(deployment, np.arange(dies.size))
    since = np.arange(deployment.size) - first[deployment]
    return np.asarray(dies[deployment] & (since >= day[deployment]))
