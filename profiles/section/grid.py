"""The box, its regions, cells, areas and the band about the equator."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from profiles.atlas import sea_share
from profiles.errors import DataError

EARTH_RADIUS = 6.371e6  # m, sphere of the same volume as the Earth
KILOMETRES_PER_DEGREE = EARTH_RADIUS * np.pi / 180.0 / 1000.0  # along the equator

#: Warm water volume is that of 5S-5N, 120E-80W, halves meeting at 155W (definition of the published index).
BOX_LATITUDE = (-5.0, 5.0)
REGIONS = {"total": (120.0, 280.0), "west": (120.0, 205.0), "east": (205.0, 280.0)}

#: The equatorial section is the mean over this band, degrees north.
BAND = (-2.5, 2.5)


def array_grid() -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Return the centres of the 1-degree cells of the box: latitude (10,) and longitude (160,)."""
    return np.arange(-4.5, 5.0), np.arange(120.5, 280.0)


def cell_edges(centres: NDArray[np.float64], name: str) -> NDArray[np.float64]:
    """Return the edges of cells, half-way between centres, the end cells as wide as their neighbours.

    Raises
    ------
    DataError
        Where there are fewer than two centres, or they do not ascend.
    """
    if centres.size < 2 or not (np.diff(centres) > 0.0).all():
        raise DataError(
            "no grid",
            where=name,
            expected="two or more cell centres, ascending",
            found=np.array2string(centres, threshold=8),
        )
    middle = 0.5 * (centres[1:] + centres[:-1])
    return np.concatenate([[2 * centres[0] - middle[0]], middle, [2 * centres[-1] - middle[-1]]])


def sea_area(
    latitude: NDArray[np.float64],
    longitude: NDArray[np.float64],
    *,
    south_north: tuple[float, float] = BOX_LATITUDE,
    west_east: tuple[float, float] = REGIONS["total"],
) -> NDArray[np.float64]:
    """Return the sea's area in each cell, as far as the cell lies in a box, on the sphere.

    Parameters
    ----------
    latitude, longitude : ndarray, shapes (rows,), (columns,)
        Cell centres, ascending, degrees north and degrees east, 0-360.
    south_north, west_east : tuple of float
        The box; cells are cut at its edges.

    Returns
    -------
    ndarray, shape (rows, columns)
        m2; 0 outside the box and on land.
    """
    rows = np.clip(cell_edges(latitude, "latitude"), *south_north)
    columns = np.clip(cell_edges(longitude, "longitude"), *west_east)
    return cell_area(rows, columns) * np.nan_to_num(sea_share(rows, columns))


def cell_area(latitude_edges: NDArray[np.float64], longitude_edges: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return the area of each cell on the sphere, m2, (rows, columns)."""
    height = np.diff(np.sin(np.deg2rad(latitude_edges)))
    width = np.diff(np.deg2rad(longitude_edges))
    return EARTH_RADIUS**2 * np.outer(height, width)


def band_weights(latitude: NDArray[np.float64], longitude: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return the weight of each cell in the equatorial section of its longitude, summing to 1 where there is sea.

    Rows count by the sea area that they have within the band; a single row counts whole where it lies in the band.
    """
    if latitude.size == 1:
        inside = BAND[0] <= latitude[0] <= BAND[1]
        return np.full((1, longitude.size), 1.0 if inside else np.nan)
    area = sea_area(latitude, longitude, south_north=BAND, west_east=(0.0, 360.0))
    total = area.sum(axis=0)
    return area / np.where(total > 0.0, total, np.nan)


def check_longitude(longitude: NDArray[np.float64]) -> None:
    """Raise DataError where a longitude is not in degrees east, 0-360."""
    if longitude.size and not (np.min(longitude) >= 0.0 and np.max(longitude) <= 360.0):
        raise DataError(
            "a longitude is out of range",
            where="longitude",
            expected="degrees east, 0 to 360",
            found=f"{np.min(longitude):g} to {np.max(longitude):g}",
            advice="add 360 to longitudes west of Greenwich and sort",
        )
