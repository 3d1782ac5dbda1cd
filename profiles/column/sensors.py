"""The good sensors of a profile, and the check that they stand in order."""

from __future__ import annotations

from typing import Any

import numpy as np
from numba import njit
from numpy.typing import NDArray

from profiles.errors import DataError

DISORDER = 0  # the status by which a kernel says that sensor depths do not increase; never given to a user


@njit(cache=True)
def count_good(temperature: Any, depth: Any) -> int:
    """Return how many sensors have a temperature and a depth, -1 where the depths of these do not increase."""
    good, last = 0, -np.inf
    for sensor in range(temperature.size):
        if np.isfinite(temperature[sensor]) and np.isfinite(depth[sensor]):
            if depth[sensor] <= last:
                return -1
            last = depth[sensor]
            good += 1
    return good


def check_order(status: NDArray[np.int8]) -> None:
    """Raise DataError where a kernel met sensor depths that do not increase."""
    disordered = int((status == DISORDER).sum())
    if disordered:
        raise DataError(
            "the sensor depths do not increase downwards",
            where="sensor_depth",
            expected="each sensor deeper than the one above it, in every profile",
            found=f"{disordered} profiles in which one is not",
            advice="set the depths of these sensors to NaN, or correct them",
        )
