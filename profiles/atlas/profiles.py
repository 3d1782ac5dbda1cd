"""Atlas profiles at any position and time of the year."""

from __future__ import annotations

import numpy as np
import xarray as xr
from numpy.typing import ArrayLike
from scipy.spatial import cKDTree

from profiles.atlas.fields import annual_mean, monthly_temperature
from profiles.errors import DataError
from profiles.statistics import HARMONICS, harmonic_design


def seasonal_profile(latitude: ArrayLike, longitude: ArrayLike) -> xr.DataArray:
    """Return the seasonal cycle of the atlas temperature at positions, as harmonics.

    Multiply by :func:`profiles.statistics.harmonic_design` and sum over ``harmonic`` for the profile at a time.

    Parameters
    ----------
    latitude, longitude : array_like, shape (position,)
        Degrees north and degrees east, 0-360.

    Returns
    -------
    xarray.DataArray
        Temperature, °C, dims (position, harmonic, depth) at the atlas's depths. Bilinear between the atlas's points
        where at least one of the four holds water at that depth, their weights rescaled; elsewhere the nearest point
        that does.

    Raises
    ------
    DataError
        Where a position lies outside the atlas.
    """
    return _at_positions(_coefficients().assign_coords(harmonic=list(HARMONICS)), latitude, longitude)


def annual_profile(latitude: ArrayLike, longitude: ArrayLike) -> xr.DataArray:
    """Return the annual-mean temperature of the 1-degree atlas at positions.

    Parameters
    ----------
    latitude, longitude : array_like, shape (position,)
        Degrees north and degrees east, 0-360.

    Returns
    -------
    xarray.DataArray
        Temperature, °C, dims (position, depth) at the atlas's depths, between and beyond the atlas's wet points
        as in :func:`seasonal_profile`.

    Raises
    ------
    DataError
        Where a position lies outside the atlas.
    """
    return _annual("temperature", latitude, longitude)


def annual_salinity(latitude: ArrayLike, longitude: ArrayLike) -> xr.DataArray:
    """Return the annual-mean practical salinity of the 1-degree atlas at positions, as :func:`annual_profile` does."""
    return _annual("salinity", latitude, longitude)


def _annual(name: str, latitude: ArrayLike, longitude: ArrayLike) -> xr.DataArray:
    field = annual_mean()[name].astype(np.float64).expand_dims("harmonic")
    return _at_positions(field, latitude, longitude).squeeze("harmonic")


def _at_positions(field: xr.DataArray, latitude: ArrayLike, longitude: ArrayLike) -> xr.DataArray:
    """Interpolate ``field`` (depth, latitude, longitude, harmonic) to positions, level by level."""
    latitude = np.atleast_1d(np.asarray(latitude, dtype=np.float64))
    longitude = np.atleast_1d(np.asarray(longitude, dtype=np.float64))
    _check_inside(field, latitude, longitude)
    values = field.transpose("depth", "latitude", "longitude", "harmonic").values
    profiles = np.stack([_interpolate(level, field, latitude, longitude) for level in values], axis=-1)
    kept = {name: field[name].values for name in ("harmonic", "depth") if name in field.coords}
    return xr.DataArray(profiles, dims=("position", "harmonic", "depth"), coords=kept)


def _coefficients() -> xr.DataArray:
    """Least-squares harmonics of the twelve months; months stand at their middle."""
    monthly = monthly_temperature().astype(np.float64)
    inverse = np.linalg.pinv(harmonic_design((np.arange(12) + 0.5) / 12.0))
    projection = xr.DataArray(inverse, dims=("harmonic", "month"), coords={"month": monthly["month"]})
    return xr.dot(projection, monthly, dim="month")


def _check_inside(field: xr.DataArray, latitude: np.ndarray, longitude: np.ndarray) -> None:
    south, north = field["latitude"].values[[0, -1]]
    west, east = field["longitude"].values[[0, -1]]
    inside = (latitude >= south) & (latitude <= north) & (longitude >= west) & (longitude <= east)
    if not inside.all():
        first = int(np.argmin(inside))
        raise DataError(
            "the position lies outside the packaged atlas",
            expected=f"{south:g} to {north:g} degrees north, {west:g} to {east:g} degrees east",
            found=f"{latitude[first]:g} degrees north, {longitude[first]:g} degrees east",
            advice="correct the position; the packaged atlas covers the equatorial Pacific only",
        )


def _interpolate(level: np.ndarray, field: xr.DataArray, latitude: np.ndarray, longitude: np.ndarray) -> np.ndarray:
    """Interpolate ``level`` (latitude, longitude, harmonic) to positions, over its wet points alone."""
    rows, columns = field["latitude"].values, field["longitude"].values
    row = np.clip(np.searchsorted(rows, latitude, side="right") - 1, 0, rows.size - 2)
    column = np.clip(np.searchsorted(columns, longitude, side="right") - 1, 0, columns.size - 2)
    north = (latitude - rows[row]) / (rows[row + 1] - rows[row])
    east = (longitude - columns[column]) / (columns[column + 1] - columns[column])
    total = np.zeros((latitude.size, level.shape[-1]))
    weight = np.zeros(latitude.size)
    for down, share_down in ((0, 1.0 - north), (1, north)):
        for right, share_right in ((0, 1.0 - east), (1, east)):
            corner = level[row + down, column + right]
            share = np.where(np.isfinite(corner[:, 0]), share_down * share_right, 0.0)
            total += share[:, None] * np.nan_to_num(corner)
            weight += share
    dry = weight < 1e-9
    result = total / np.where(dry, 1.0, weight)[:, None]
    if dry.any():
        result[dry] = _nearest(level, rows, columns, latitude[dry], longitude[dry])
    return result


def _nearest(
    level: np.ndarray, rows: np.ndarray, columns: np.ndarray, latitude: np.ndarray, longitude: np.ndarray
) -> np.ndarray:
    wet_row, wet_column = np.nonzero(np.isfinite(level[..., 0]))
    tree = cKDTree(np.column_stack([rows[wet_row], columns[wet_column]]))
    _, place = tree.query(np.column_stack([latitude, longitude]))
    return level[wet_row[place], wet_column[place]]
