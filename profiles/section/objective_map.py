"""The objective map of anomalies at sites (Bretherton, Davis and Fandry 1976)."""

from __future__ import annotations

from typing import Any

import numpy as np
import xarray as xr
from numpy.typing import ArrayLike, NDArray

from profiles.errors import DataError, RequestError
from profiles.section.covariance import Gaussian, Solver, same_networks
from profiles.section.grid import check_longitude
from profiles.vocabulary import describe

Array = NDArray[np.float64]


def map_kernel(
    values: Array,
    noise: Array,
    site_correlation: Array,
    grid_correlation: Array,
    *,
    signal_sd: float,
    estimate_mean: bool,
) -> tuple[Array, Array]:
    """Map ``values`` (time, site) with ``noise`` (time, site), NaN where missing.

    Parameters
    ----------
    site_correlation, grid_correlation : ndarray, shapes (site, site), (site, point)
        Of the signal, 1 at no distance.
    signal_sd : float
        Standard deviation of the signal.
    estimate_mean : bool
        Whether the mean is unknown and estimated at each time; else it is 0.

    Returns
    -------
    tuple of ndarray, shape (time, point)
        The map and its standard error.
    """
    mapped = np.empty((values.shape[0], grid_correlation.shape[1]))
    error = np.empty_like(mapped)
    for network in same_networks(noise):
        sites, times = network.sites, network.times
        covariance = signal_sd**2 * grid_correlation[sites]
        solver = Solver.of(site_correlation[np.ix_(sites, sites)], signal_sd, network.noise)
        weights = solver.solve(covariance)
        variance = signal_sd**2 - np.einsum("sp,sp->p", covariance, weights)
        data = values[np.ix_(times, sites)]
        if estimate_mean:
            level, gain = _mean_level(solver, data)
            lacking = 1.0 - weights.sum(axis=0)
            mapped[times] = data @ weights + level[:, None] * lacking
            variance = variance + lacking**2 * gain
        else:
            mapped[times] = data @ weights
        error[times] = np.sqrt(np.maximum(variance, 0.0))
    return mapped, error


def _mean_level(solver: Solver, data: Array) -> tuple[Array, float]:
    """Return the estimated mean of each time and its error variance; NaN where there is no site."""
    if data.shape[1] == 0:
        return np.full(data.shape[0], np.nan), np.nan
    row_sums = solver.solve(np.ones(data.shape[1]))
    return data @ row_sums / row_sums.sum(), float(1.0 / row_sums.sum())


def objective_map(
    values: xr.DataArray | ArrayLike,
    latitude: ArrayLike,
    longitude: ArrayLike,
    grid_latitude: ArrayLike,
    grid_longitude: ArrayLike,
    *,
    signal_sd: float,
    noise_sd: xr.DataArray | ArrayLike,
    length_longitude: float,
    length_latitude: float,
    mean: str = "known",
) -> xr.Dataset:
    """Map anomalies at sites onto a grid, with the error of the map.

    Parameters
    ----------
    values : xarray.DataArray or array_like, dims (time, site)
        Anomalies, NaN where a site has none.
    latitude, longitude : array_like, shape (site,)
        Degrees north; degrees east, 0-360.
    grid_latitude, grid_longitude : array_like, shapes (rows,), (columns,)
        Cell centres of the map.
    signal_sd : float
        Standard deviation of the signal, in the unit of the values.
    noise_sd : float or array_like, shape (site,) or (time, site)
        Standard deviation of the noise: instrument and what the map's scales do not resolve.
    length_longitude, length_latitude : float
        Degrees; the covariance is ``signal_sd**2 * exp(-(dlon/length_longitude)**2 - (dlat/length_latitude)**2)``.
    mean : {"known", "estimated"}
        "known": the mean of the signal is 0. "estimated": it is unknown and estimated at each time.

    Returns
    -------
    xarray.Dataset
        ``mean`` and ``error`` (standard deviation) on (time, latitude, longitude), and what the error of any linear
        functional needs: ``site_latitude``, ``site_longitude``, ``site_noise`` (time, site) and the covariance in the
        attributes. Where no site reports, a known mean gives 0 with the error ``signal_sd``, an estimated one NaN.

    Raises
    ------
    RequestError
        Where a standard deviation, a length or ``mean`` makes no sense.
    DataError
        Where shapes do not fit, a position or a noise is missing, or sites coincide without noise.

    References
    ----------
    Bretherton, Davis and Fandry (1976), Deep-Sea Res. 23, 559-582.
    """
    _check_scales(signal_sd=signal_sd, length_longitude=length_longitude, length_latitude=length_latitude)
    if mean not in ("known", "estimated"):
        raise RequestError("no such choice", where="mean", expected="'known' or 'estimated'", found=repr(mean))
    data = _labelled(values)
    places = _positions(latitude, data, "latitude"), _positions(longitude, data, "longitude")
    check_longitude(places[1])
    rows, columns = _axis(grid_latitude), _axis(grid_longitude)
    check_longitude(columns)
    noise = _noise(noise_sd, data)
    correlation = Gaussian(length_longitude, length_latitude)
    points = np.meshgrid(rows, columns, indexing="ij")
    mapped, error = map_kernel(
        data.values,
        noise,
        correlation.between(*places, *places),
        correlation.between(*places, points[0].ravel(), points[1].ravel()),
        signal_sd=float(signal_sd),
        estimate_mean=mean == "estimated",
    )
    shape = (data.shape[0], rows.size, columns.size)
    field = xr.Dataset(
        {
            "mean": (("time", "latitude", "longitude"), mapped.reshape(shape)),
            "error": (("time", "latitude", "longitude"), error.reshape(shape)),
            "site_noise": (("time", "site"), noise),
        }
        | {"site_latitude": ("site", places[0]), "site_longitude": ("site", places[1])},
        coords={"latitude": rows, "longitude": columns} | _time_of(data),
        attrs={
            "signal_sd": float(signal_sd),
            "length_longitude": float(length_longitude),
            "length_latitude": float(length_latitude),
            "mean_of_signal": mean,
        },
    )
    return describe(field)


def _check_scales(**scales: float) -> None:
    for name, scale in scales.items():
        if not scale > 0.0:
            raise RequestError("not a scale", where=name, expected="a positive number", found=repr(scale))


def _labelled(values: xr.DataArray | ArrayLike) -> xr.DataArray:
    data = values if isinstance(values, xr.DataArray) else xr.DataArray(np.asarray(values))
    if not isinstance(values, xr.DataArray) and data.ndim == 2:
        data = data.rename(dict(zip(data.dims, ("time", "site"), strict=True)))
    if set(data.dims) != {"time", "site"}:
        raise DataError("the values do not fit", where="values", expected="dims (time, site)", found=f"{data.dims}")
    return data.transpose("time", "site").astype(np.float64)


def _positions(positions: ArrayLike, data: xr.DataArray, name: str) -> Array:
    found = np.asarray(positions, dtype=np.float64)
    if found.shape != (data.sizes["site"],) or not np.isfinite(found).all():
        raise DataError(
            "the sites do not fit the values",
            where=name,
            expected=f"{data.sizes['site']} finite numbers",
            found=f"shape {found.shape}, {int((~np.isfinite(found)).sum())} missing",
        )
    return found


def _axis(centres: ArrayLike) -> Array:
    return np.atleast_1d(np.asarray(centres, dtype=np.float64))


def _noise(noise_sd: Any, data: xr.DataArray) -> Array:
    """Return the noise as (time, site), NaN where the value is missing."""
    if isinstance(noise_sd, xr.DataArray):
        noise_sd = noise_sd.transpose(*[dim for dim in ("time", "site") if dim in noise_sd.dims]).values
    try:
        noise = np.broadcast_to(np.asarray(noise_sd, dtype=np.float64), data.shape)
    except ValueError:
        raise DataError(
            "the noise does not fit the values",
            where="noise_sd",
            expected=f"a number, or shape ({data.shape[1]},) or {data.shape}",
            found=f"shape {np.shape(noise_sd)}",
        ) from None
    present = np.isfinite(data.values)
    if not (np.isfinite(noise[present]) & (noise[present] >= 0.0)).all():
        raise DataError("a value without its noise", where="noise_sd", expected="0 or more for every value")
    return np.where(present, noise, np.nan)


def _time_of(data: xr.DataArray) -> dict[str, Any]:
    return {"time": data["time"]} if "time" in data.coords else {}
