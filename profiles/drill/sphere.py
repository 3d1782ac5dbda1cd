"""Lengths and areas on the sphere of the truth, apart from those of the rooms that it judges."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

EARTH_RADIUS = 6.371e6  # m; the sphere of the volume's check values
METRES_PER_DEGREE = EARTH_RADIUS * np.pi / 180.0  # of longitude, on the equator


def cell_areas(south: NDArray[np.float64], north: NDArray[np.float64], width: float) -> NDArray[np.float64]:
    """Return the areas, m2, (cell,), of cells between parallels.

    Parameters
    ----------
    south, north : ndarray, shape (cell,)
        Degrees north. A cell whose northern edge lies south of its southern one has no area.
    width : float
        Degrees.
    """
    height = np.sin(np.radians(north)) - np.sin(np.radians(south))
    return np.asarray(EARTH_RADIUS**2 * np.radians(width) * np.maximum(height, 0.0))
