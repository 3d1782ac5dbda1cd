"""Where a position lies among the points of a model's grid: bilinear among wet points, else the nearest wet point."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.spatial import cKDTree

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]

EARTH_RADIUS_KM = 6371.0
_ON_POINT = 1e-9  # share of a weight that is rounding
_NEWTON_STEPS = 8
_CORNERS = ((0, 0), (0, 1), (1, 0), (1, 1))  # rows down, columns right


@dataclass(frozen=True)
class Stencil:
    """The points that stand for each position: ``row``, ``column`` and ``weight`` (position, corner).

    Weights add up to 1, or are all 0 where no wet point is near enough. ``distance`` (position,) is that to the nearest
    wet point, km, where it stands alone; 0 where the position is interpolated.
    """

    row: Integers
    column: Integers
    weight: Floats
    distance: Floats


def stencil(
    grid_latitude: Floats,
    grid_longitude: Floats,
    wet: NDArray[np.bool_],
    latitude: Floats,
    longitude: Floats,
    *,
    nearest_wet: float,
) -> Stencil:
    """Return what stands for positions on a grid.

    Parameters
    ----------
    grid_latitude, grid_longitude : ndarray
        (rows,) and (columns,) of a regular grid, monotonic; or both (rows, columns). Degrees; longitudes of a regular
        grid ascend, those of a curvilinear one may wrap.
    wet : ndarray of bool, shape (rows, columns)
    latitude, longitude : ndarray, shape (position,)
        Degrees north, degrees east.
    nearest_wet : float
        km; a wet point farther away does not stand for a position.
    """
    find = _in_curvilinear if grid_latitude.ndim == 2 else _in_regular
    row, column, north, east, inside = find(grid_latitude, grid_longitude, latitude, longitude)
    rows = np.stack([row + down for down, _ in _CORNERS], axis=-1)
    columns = np.stack([column + right for _, right in _CORNERS], axis=-1)
    shares = [np.abs(1 - down - north) * np.abs(1 - right - east) for down, right in _CORNERS]
    weight = np.where(inside[:, None] & wet[rows, columns], np.stack(shares, axis=-1), 0.0)
    weight[weight < _ON_POINT] = 0.0
    total = weight.sum(axis=1, keepdims=True)
    alone = total[:, 0] == 0.0
    weight = weight / np.where(total > 0.0, total, 1.0)
    distance = np.zeros(latitude.size)
    if alone.any() and wet.any():
        nearest = _nearest_wet(grid_latitude, grid_longitude, wet, latitude[alone], longitude[alone])
        rows[alone, 0], columns[alone, 0], distance[alone] = nearest
        weight[alone, 0] = (nearest[2] <= nearest_wet).astype(np.float64)
    elif alone.any():
        distance[alone] = np.inf
    return Stencil(rows, columns, weight, distance)


def spacing(grid_latitude: Floats, grid_longitude: Floats) -> tuple[float, float]:
    """Return the median distance of neighbouring points, degrees of latitude and of longitude."""
    if grid_latitude.ndim == 1:
        return _median_step(np.diff(grid_latitude)), _median_step(np.diff(grid_longitude))
    return (
        _median_step(np.diff(grid_latitude, axis=0)),
        _median_step(_wrapped(np.diff(grid_longitude, axis=1))),
    )


def _median_step(steps: Floats) -> float:
    return float(np.median(np.abs(steps))) if steps.size else 1.0


def _wrapped(degrees: Floats) -> Floats:
    return np.asarray((degrees + 180.0) % 360.0 - 180.0)


Place = tuple[Integers, Integers, Floats, Floats, NDArray[np.bool_]]


def _in_regular(rows: Floats, columns: Floats, latitude: Floats, longitude: Floats) -> Place:
    """Return the lower left corner of each position's cell, its place in the cell, 0 to 1, and whether it is in one."""
    row, north, in_rows = _in_axis(rows, latitude)
    column, east, in_columns = _in_axis(columns, longitude)
    return row, column, north, east, in_rows & in_columns


def _in_axis(axis: Floats, place: Floats) -> tuple[Integers, Floats, NDArray[np.bool_]]:
    if axis.size == 1:
        return np.zeros(place.size, np.int64), np.zeros(place.size), np.isclose(axis[0], place)
    sign = 1.0 if axis[-1] > axis[0] else -1.0
    cell = np.clip(np.searchsorted(sign * axis, sign * place, side="right") - 1, 0, axis.size - 2)
    share = (place - axis[cell]) / (axis[cell + 1] - axis[cell])
    inside = (share >= -_ON_POINT) & (share <= 1.0 + _ON_POINT)
    return cell.astype(np.int64), np.clip(share, 0.0, 1.0), inside


def _in_curvilinear(grid_latitude: Floats, grid_longitude: Floats, latitude: Floats, longitude: Floats) -> Place:
    """The same on a grid whose points have their own latitude and longitude: of the four cells about the nearest point,
    the one that the position is in, by the inverse of the bilinear map (Newton's method)."""
    known = np.isfinite(grid_latitude) & np.isfinite(grid_longitude)
    rows, columns = np.nonzero(known)
    tree = cKDTree(_on_sphere(grid_latitude[known], grid_longitude[known]))
    _, nearest = tree.query(_on_sphere(latitude, longitude))
    limits = np.array(grid_latitude.shape) - 2
    row, column = np.zeros((2, latitude.size), np.int64)
    north, east = np.zeros((2, latitude.size))
    inside = np.zeros(latitude.size, bool)
    for down, right in _CORNERS:
        corner_row = np.clip(rows[nearest] - down, 0, limits[0])
        corner_column = np.clip(columns[nearest] - right, 0, limits[1])
        v, u = _in_quadrangle(grid_latitude, grid_longitude, corner_row, corner_column, latitude, longitude)
        reach = 1e-6  # a position on an edge belongs to either cell
        here = (np.abs(u - 0.5) <= 0.5 + reach) & (np.abs(v - 0.5) <= 0.5 + reach) & ~inside
        row[here], column[here] = corner_row[here], corner_column[here]
        north[here], east[here] = np.clip(v[here], 0.0, 1.0), np.clip(u[here], 0.0, 1.0)
        inside |= here
    return row, column, north, east, inside


def _in_quadrangle(
    grid_latitude: Floats, grid_longitude: Floats, row: Integers, column: Integers, latitude: Floats, longitude: Floats
) -> tuple[Floats, Floats]:
    """Return the place of positions in cells, down the rows and along the columns."""
    across = np.cos(np.deg2rad(latitude))
    corners = []
    for down, right in _CORNERS:
        at = row + down, column + right
        corners.append((_wrapped(grid_longitude[at] - longitude) * across, grid_latitude[at] - latitude))
    (x00, y00), (x01, y01), (x10, y10), (x11, y11) = corners
    u, v = np.full((2, latitude.size), 0.5)
    with np.errstate(all="ignore"):
        for _ in range(_NEWTON_STEPS):
            x = (1 - v) * ((1 - u) * x00 + u * x01) + v * ((1 - u) * x10 + u * x11)
            y = (1 - v) * ((1 - u) * y00 + u * y01) + v * ((1 - u) * y10 + u * y11)
            xu, yu = (1 - v) * (x01 - x00) + v * (x11 - x10), (1 - v) * (y01 - y00) + v * (y11 - y10)
            xv, yv = (1 - u) * (x10 - x00) + u * (x11 - x01), (1 - u) * (y10 - y00) + u * (y11 - y01)
            determinant = xu * yv - xv * yu
            u = u - (x * yv - y * xv) / determinant
            v = v - (y * xu - x * yu) / determinant
    return v, u


def _nearest_wet(
    grid_latitude: Floats, grid_longitude: Floats, wet: NDArray[np.bool_], latitude: Floats, longitude: Floats
) -> tuple[Integers, Integers, Floats]:
    if grid_latitude.ndim == 1:
        grid_latitude, grid_longitude = np.meshgrid(grid_latitude, grid_longitude, indexing="ij")
    rows, columns = np.nonzero(wet & np.isfinite(grid_latitude) & np.isfinite(grid_longitude))
    tree = cKDTree(_on_sphere(grid_latitude[rows, columns], grid_longitude[rows, columns]))
    chord, place = tree.query(_on_sphere(latitude, longitude))
    distance = 2.0 * EARTH_RADIUS_KM * np.arcsin(np.minimum(0.5 * chord, 1.0))
    return rows[place], columns[place], distance


def _on_sphere(latitude: Floats, longitude: Floats) -> Floats:
    y, x = np.deg2rad(latitude), np.deg2rad(longitude)
    return np.stack([np.cos(y) * np.cos(x), np.cos(y) * np.sin(x), np.sin(y)], axis=-1)
