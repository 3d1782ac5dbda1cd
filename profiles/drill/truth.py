"""The truth of a simulated ocean: sites, map, volume, tilt. Computed plainly, apart from what it judges."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from profiles.atlas import sea_share
from profiles.drill.array import Site, positions
from profiles.drill.ocean import Columns, Ocean
from profiles.drill.sphere import METRES_PER_DEGREE, cell_areas
from profiles.vocabulary import describe

Floats = NDArray[np.float64]

# The warm-water volume's box, 5S-5N, 120E-80W, halves meeting at 155W (the published index's own definition).
SOUTH, NORTH, WEST, EAST, MIDDLE = -5.0, 5.0, 120.0, 280.0, 205.0
SECTION_HALF_WIDTH = 2.5  # degrees of latitude; the equatorial section is the mean of 2.5S-2.5N
TILT_WINDOW = (165.0, 265.0)  # degrees east

LATITUDE = np.arange(SOUTH + 0.5, NORTH)
LONGITUDE = np.arange(WEST + 0.5, EAST)
_DEPTH_DECIMALS = 2
_PLACE = "latitude longitude"  # CF-1.11, section 5: what is no dimension is named


def site_columns(ocean: Ocean, sites: tuple[Site, ...]) -> tuple[Columns, Columns]:
    """Return the water columns at ``sites`` without and with small scales."""
    return ocean.columns(*positions(sites)), ocean.columns(*positions(sites), small_scales=True)


def site_truth(ocean: Ocean, sites: tuple[Site, ...], large: Columns, whole: Columns) -> xr.Dataset:
    """Return daily isotherm depths, m, at ``sites``, dims (mooring, time); 0 where the isotherm outcrops."""
    latitude, longitude = positions(sites)
    depth = whole.isotherm_depth()
    large_scale = large.isotherm_depth().round(_DEPTH_DECIMALS).astype(np.float32)
    truth = xr.Dataset(
        {
            "isotherm_depth": (("mooring", "time"), depth.round(_DEPTH_DECIMALS)),
            "isotherm_depth_large_scale": (("mooring", "time"), large_scale),
            "outcropped": (("mooring", "time"), (depth == 0.0).astype(np.int8)),
            "passages": (("mooring", "time"), whole.passages()),
        },
        coords={
            "mooring": [site.id for site in sites],
            "time": ocean.time,
            "latitude": ("mooring", latitude),
            "longitude": ("mooring", longitude),
        },
    )
    truth["isotherm_depth_large_scale"].attrs = {
        "long_name": "depth of the isotherm without small scales",
        "units": "m",
        "positive": "down",
        "coordinates": _PLACE,
    }
    truth["outcropped"].attrs = {
        "long_name": "whether the surface is colder than the isotherm",
        "flag_values": np.array([0, 1], dtype=np.int8),
        "flag_meanings": "found outcropped",
        "coordinates": _PLACE,
    }
    truth["passages"].attrs = {
        "long_name": "how often the temperature falls through that of the isotherm with depth",
        "units": "1",
        "coordinates": _PLACE,
    }
    return describe(truth, isotherm_depth={"coordinates": _PLACE})


def array_truth(ocean: Ocean) -> xr.Dataset:
    """Return monthly isotherm depth, equatorial section, its slope and the warm-water volume."""
    share = sea_share(np.arange(SOUTH, NORTH + 1.0), np.arange(WEST, EAST + 1.0))
    daily = ocean.isotherm_depth(*cells(LATITUDE, LONGITUDE))
    time, monthly = monthly_means(ocean.time, daily)
    depth = monthly.T.reshape(time.size, LATITUDE.size, LONGITUDE.size)
    section = equatorial_section(depth, share)
    truth = xr.Dataset(
        {
            "isotherm_depth": (
                ("time", "latitude", "longitude"),
                np.where(share > 0.0, depth, np.nan).round(_DEPTH_DECIMALS),
            ),
            "equatorial_isotherm_depth": (("time", "longitude"), section.round(_DEPTH_DECIMALS)),
            "thermocline_slope": ("time", slope(section).round(6)),
            "warm_water_volume": (
                ("time", "region"),
                np.stack([part.round(-6) for part in volumes(depth, share).values()], axis=-1),
            ),
        },
        coords={"time": time, "latitude": LATITUDE, "longitude": LONGITUDE, "region": list(_REGIONS)},
    )
    return describe(truth)


def cells(latitude: Floats, longitude: Floats) -> tuple[Floats, Floats]:
    """Return the positions of the cells of a grid, each (cell,), longitude changing fastest."""
    south_north, west_east = np.meshgrid(latitude, longitude, indexing="ij")
    return south_north.ravel(), west_east.ravel()


def monthly_means(time: NDArray[np.datetime64], daily: Floats) -> tuple[NDArray[np.datetime64], Floats]:
    """Return the middle of each calendar month and the mean, (..., month), of its days (..., time)."""
    month = time.astype("datetime64[M]")
    months, first, days = np.unique(month, return_index=True, return_counts=True)
    start, end = months.astype("datetime64[ns]"), (months + 1).astype("datetime64[ns]")
    return start + (end - start) // 2, np.add.reduceat(daily, first, axis=-1) / days


def equatorial_section(depth: Floats, share: Floats) -> Floats:
    """Return the mean of ``depth`` (time, latitude, longitude) over the sea of 2.5S-2.5N."""
    south = np.maximum(LATITUDE - 0.5, -SECTION_HALF_WIDTH)
    north = np.minimum(LATITUDE + 0.5, SECTION_HALF_WIDTH)
    weight = cell_areas(south, north, 1.0)[:, None] * share
    with np.errstate(invalid="ignore"):
        return np.asarray((depth * weight).sum(axis=1) / weight.sum(axis=0))


def slope(section: Floats) -> Floats:
    """Return the slope of an unweighted line through ``section``, m per 1000 km towards the east, (time,)."""
    inside = (TILT_WINDOW[0] < LONGITUDE) & (TILT_WINDOW[1] > LONGITUDE)
    distance = LONGITUDE[inside] * METRES_PER_DEGREE / 1e6
    return np.asarray(np.polynomial.polynomial.polyfit(distance, section[:, inside].T, 1)[1])


_REGIONS: Mapping[str, tuple[float, float]] = {
    "total": (WEST, EAST),
    "west": (WEST, MIDDLE),
    "east": (MIDDLE, EAST),
}


def volumes(depth: Floats, share: Floats) -> dict[str, Floats]:
    """Return the volume above the isotherm, m3, (time,), of each region: area, share of sea and depth."""
    area = cell_areas(LATITUDE - 0.5, LATITUDE + 0.5, 1.0)[:, None] * share
    columns = (depth * area).sum(axis=1)
    return {
        name: columns[:, (west < LONGITUDE) & (east > LONGITUDE)].sum(axis=1) for name, (west, east) in _REGIONS.items()
    }
