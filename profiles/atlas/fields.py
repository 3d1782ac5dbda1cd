"""The packaged fields as they were published."""

from __future__ import annotations

from functools import cache
from importlib.resources import as_file, files

import xarray as xr


@cache
def _load(name: str) -> xr.Dataset:
    with as_file(files("profiles.atlas") / "data" / name) as path, xr.open_dataset(path, engine="netcdf4") as dataset:
        return dataset.load()


def monthly_temperature() -> xr.DataArray:
    """Return monthly climatological temperature, °C, (month, depth, latitude, longitude), 2 degrees, 0-1000 m.

    Levitus and Boyer (1994), World Ocean Atlas 1994, volume 4 (edition identified from memory).
    """
    return _load("monthly_temperature.nc")["temperature"]


def annual_mean() -> xr.Dataset:
    """Return annual-mean temperature, °C, and salinity, (depth, latitude, longitude), 1 degree, 0-1000 m.

    Levitus (1982), Climatological Atlas of the World Ocean, NOAA Professional Paper 13.
    """
    return _load("annual_mean.nc")


def relief() -> xr.DataArray:
    """Return the elevation, m, negative below the sea, (latitude, longitude), 5 arc minutes.

    ETOPO5, Data Announcement 88-MGG-02, NOAA National Geophysical Data Center (1988).
    """
    return _load("relief.nc")["elevation"]
