"""The east-west tilt of the thermocline: the slope of a line through the equatorial section."""

from __future__ import annotations

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from profiles.errors import DataError, RequestError
from profiles.section.functional import functional_error
from profiles.section.grid import KILOMETRES_PER_DEGREE, band_weights, check_longitude
from profiles.vocabulary import describe

Array = NDArray[np.float64]

TILT_WINDOW = (165.0, 265.0)  # degrees east


def slope_weights(longitude: Array, window: tuple[float, float]) -> Array:
    """Return the weights whose sum with depths at ``longitude`` is the slope of the unweighted line through them.

    With x the distance along the equator in 1000 km, w_j = (x_j - mean x) / sum (x_j - mean x)^2 within the window and
    0 outside.

    Raises
    ------
    DataError
        Where the window holds fewer than three longitudes.
    """
    inside = (longitude >= window[0]) & (longitude <= window[1])
    if inside.sum() < 3:
        raise DataError(
            "too few longitudes in the window of the tilt",
            where="window",
            expected=f"three or more between {window[0]:g} and {window[1]:g} degrees east",
            found=f"{int(inside.sum())}",
        )
    distance = longitude * KILOMETRES_PER_DEGREE / 1000.0
    departure = np.where(inside, distance - distance[inside].mean(), 0.0)
    return departure / (departure**2).sum()


def section_weights(field: xr.Dataset | xr.DataArray) -> Array:
    """Return the weights of the equatorial section of a mapped field, (longitude, latitude, longitude)."""
    band = band_weights(field["latitude"].values, field["longitude"].values)
    columns = band.shape[1]
    weights = np.zeros((columns, *band.shape))
    weights[np.arange(columns), :, np.arange(columns)] = np.nan_to_num(band).T
    return weights


def tilt_weights(latitude: Array, longitude: Array, window: tuple[float, float] = TILT_WINDOW) -> Array:
    """Return the weights whose sum with a map of depths is its slope along the equator, (latitude, longitude)."""
    band = band_weights(latitude, longitude)
    return np.nan_to_num(band) * _on_sea(longitude, np.isfinite(band[0]), window)


def thermocline_slope(field: xr.Dataset | xr.DataArray, *, window: tuple[float, float] = TILT_WINDOW) -> xr.Dataset:
    """Return the slope of the thermocline along the equator.

    Parameters
    ----------
    field : xarray.Dataset or xarray.DataArray
        What :func:`profiles.objective_map` returned (depths or anomalies, metres), whose mean over 2.5S-2.5N is taken;
        or an equatorial section, with a dimension ``longitude`` and any others but ``latitude``.
    window : tuple of float
        Degrees east, 0-360, western end first; both ends count.

    Returns
    -------
    xarray.Dataset
        ``thermocline_slope`` and ``thermocline_slope_error`` (standard error), metres of depth per 1000 km towards the
        east: negative where the thermocline shoals eastward, the usual state. The window stands in the attributes.
        The error follows from the covariance of the map; for a bare section it is NaN, and the attribute ``reason``
        says why. Longitudes that never have a value are left out; a time that lacks another has no slope.

    Raises
    ------
    RequestError
        Where the window is not western end first.
    DataError
        Where there is no longitude, or too few in the window.
    """
    if not 0.0 <= window[0] < window[1] <= 360.0:
        raise RequestError(
            "not a window", where="window", expected="western end first, degrees east, 0 to 360", found=f"{window}"
        )
    check_longitude(_longitude(field))
    if isinstance(field, xr.Dataset):
        cells = tilt_weights(field["latitude"].values, field["longitude"].values, window)
        slope = xr.dot(field["mean"], _like(cells, field), dim=("latitude", "longitude"))
        error = slope.copy(data=functional_error(field, cells[None])[:, 0])
        reason = None
    else:
        slope = _slope_of_section(field, window)
        error = xr.full_like(slope, np.nan)
        reason = "a bare section does not tell the covariance of its errors; pass what objective_map returned"
    stated = {"window": f"{window[0]:g} to {window[1]:g} degrees east", "window_degrees_east": list(window)}
    return describe(
        xr.Dataset({"thermocline_slope": slope, "thermocline_slope_error": error}),
        thermocline_slope=stated,
        thermocline_slope_error=stated | ({"reason": reason} if reason else {}),
    )


def _longitude(field: xr.Dataset | xr.DataArray) -> Array:
    if "longitude" not in field.coords or "longitude" not in field.dims:
        raise DataError(
            "the field has no longitude", expected="a dimension and coordinate 'longitude'", found=f"{field.dims}"
        )
    if isinstance(field, xr.DataArray) and "latitude" in field.dims:
        raise DataError(
            "the section still has latitudes",
            expected="dims (time, longitude)",
            found=f"{field.dims}",
            advice="average over the band first, or pass the dataset that objective_map returned",
        )
    return np.asarray(field["longitude"].values, dtype=np.float64)


def _slope_of_section(section: xr.DataArray, window: tuple[float, float]) -> xr.DataArray:
    others = [dim for dim in section.dims if dim != "longitude"]
    sea = np.asarray(section.notnull().any(others).values)
    weights = _on_sea(_longitude(section), sea, window)
    line = xr.DataArray(weights, dims="longitude", coords={"longitude": section["longitude"]})
    counted = section.where(line != 0.0, 0.0)
    return (counted * line).sum("longitude", skipna=False)


def _on_sea(longitude: Array, sea: NDArray[np.bool_], window: tuple[float, float]) -> Array:
    weights = np.zeros(longitude.size)
    weights[sea] = slope_weights(longitude[sea], window)
    return weights


def _like(weights: Array, field: xr.Dataset) -> xr.DataArray:
    return xr.DataArray(
        weights,
        dims=("latitude", "longitude"),
        coords={"latitude": field["latitude"], "longitude": field["longitude"]},
    )
