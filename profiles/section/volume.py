"""The volume of warm water: what lies above the isotherm in 5S-5N, 120E-80W."""

from __future__ import annotations

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from profiles.errors import DataError, RequestError
from profiles.section.functional import functional_error
from profiles.section.grid import REGIONS, check_longitude, sea_area
from profiles.vocabulary import describe

LEAST_COVERED = (
    0.95  # share of a region's sea that a bare field must cover (ours); the volume is then scaled to the whole
)


def warm_water_volume(field: xr.Dataset | xr.DataArray, *, region: str = "total") -> xr.Dataset:
    """Return the volume of water between the surface and the isotherm.

    Parameters
    ----------
    field : xarray.Dataset or xarray.DataArray
        What :func:`profiles.objective_map` returned (depths or anomalies, metres); or a bare field with dimensions
        ``latitude`` and ``longitude`` and any others, NaN on land.
    region : {"total", "west", "east"}
        5S-5N from 120E to 80W, its part west of 155W, its part east of it.

    Returns
    -------
    xarray.Dataset
        ``warm_water_volume`` (m3), ``warm_water_volume_error`` (standard error, m3) and ``covered_share``, the share of
        the region's sea on which the field has a value. Cells are cut at the region's edges and count by their area
        on the sphere and their share of sea (ETOPO5). Where less than the whole is covered the volume is that of the
        covered part, scaled; below a share of 0.95 it is NaN. The error follows from the covariance of the map; for a
        bare field it is NaN, and the attribute ``reason`` says why.

    Raises
    ------
    RequestError
        For a region that there is not.
    DataError
        Where the field has no latitude and longitude.

    References
    ----------
    Definition of the published warm water volume index; Meinen and McPhaden (2000), J. Climate 13, 3551-3559.
    """
    if region not in REGIONS:
        raise RequestError("no such region", where="region", expected=", ".join(REGIONS), found=repr(region))
    depth = field["mean"] if isinstance(field, xr.Dataset) else field
    area = _cell_areas(depth, region)
    present = depth.notnull()
    covered = (present * area).sum(("latitude", "longitude")) / area.sum()
    volume = (depth.fillna(0.0) * area).sum(("latitude", "longitude")) / covered.where(covered >= LEAST_COVERED)
    if isinstance(field, xr.Dataset):
        error = volume.copy(data=functional_error(field, area.values[None])[:, 0])
        reason = {}
    else:
        error = xr.full_like(volume, np.nan)
        reason = {"reason": "a bare field does not tell the covariance of its errors; pass what objective_map returned"}
    names = ("warm_water_volume", "warm_water_volume_error", "covered_share")
    result = xr.Dataset(dict(zip(names, (volume, error, covered), strict=True))).assign_coords(region=region)
    return describe(result, warm_water_volume_error=reason)


def _cell_areas(depth: xr.DataArray, region: str) -> xr.DataArray:
    missing = {"latitude", "longitude"} - set(depth.dims)
    if missing:
        raise DataError("the field is no map", expected="dims (time, latitude, longitude)", found=f"{depth.dims}")
    rows, columns = (_axis(depth, name) for name in ("latitude", "longitude"))
    check_longitude(columns)
    area = sea_area(rows, columns, west_east=REGIONS[region])
    if not area.sum() > 0.0:
        raise DataError(
            "the field does not reach the region",
            where=region,
            expected=f"5S-5N, {REGIONS[region][0]:g} to {REGIONS[region][1]:g} degrees east",
            found=f"{rows[0]:g} to {rows[-1]:g} degrees north, {columns[0]:g} to {columns[-1]:g} degrees east",
        )
    return xr.DataArray(
        area, dims=("latitude", "longitude"), coords={name: depth[name] for name in ("latitude", "longitude")}
    )


def _axis(depth: xr.DataArray, name: str) -> NDArray[np.float64]:
    return np.asarray(depth[name].values, dtype=np.float64)
