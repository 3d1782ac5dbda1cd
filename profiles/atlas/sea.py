"""How much of a cell is sea."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from profiles.atlas.fields import relief


def sea_share(latitude_edges: NDArray[np.float64], longitude_edges: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return the share of sea in each cell of a regular grid.

    Parameters
    ----------
    latitude_edges, longitude_edges : ndarray, shapes (rows + 1,), (columns + 1,)
        Ascending, degrees north and degrees east, 0-360.

    Returns
    -------
    ndarray, shape (rows, columns)
        Share of the relief's 5-minute points in the cell that lie below the sea's level, NaN where the cell holds
        none. A point on an edge counts half on either side.
    """
    elevation = relief()
    sea = (elevation.values < 0.0).astype(np.float64)
    rows = _membership(elevation["latitude"].values, latitude_edges)
    columns = _membership(elevation["longitude"].values, longitude_edges)
    count = np.outer(rows.sum(axis=1), columns.sum(axis=1))
    with np.errstate(invalid="ignore"):
        return rows @ sea @ columns.T / count


def _membership(points: NDArray[np.float64], edges: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return which points each cell holds, (cell, point): 1 inside, 1/2 on an edge (to 0.2 of the 5-minute spacing)."""
    reach = 0.2 / 12.0
    low, high = edges[:-1, None], edges[1:, None]
    inside = (points > low + reach) & (points < high - reach)
    on_edge = (np.abs(points - low) <= reach) | (np.abs(points - high) <= reach)
    return inside + 0.5 * on_edge
