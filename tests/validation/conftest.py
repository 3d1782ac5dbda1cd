"""A finished run without noise, faults and gaps over a simulated ocean, and models on grids that hold its sensors."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import xarray as xr

from profiles.drill.array import SITES, Site
from profiles.drill.demo import days
from profiles.drill.ocean import Ocean
from profiles.drill.truth import cells

PERFECT = tuple(site for site in SITES if site.longitude in (175.0, 201.0, 227.0) and abs(site.latitude) < 3.0)
MODEL_LATITUDE = np.array([-5.0, -2.5, 0.0, 2.5, 5.0])
MODEL_LONGITUDE = np.array([120.0, 134.0, 148.0, 162.0, 175.0, 188.0, 201.0, 214.0, 227.0, 240.0, 253.0, 266.0, 280.0])
MODEL_DEPTH = np.array(sorted({*(d for site in PERFECT for d in site.depths), *np.arange(0.0, 301.0, 20.0), 400.0}))
TIMES = days("2031-01-01", "2032-02-29")


@pytest.fixture(scope="session")
def ocean() -> Ocean:
    return Ocean.simulate(TIMES, 4)


def chain_of(ocean: Ocean, site: Site) -> xr.Dataset:
    """The flagged chain of perfect sensors."""
    columns = ocean.columns([site.latitude], [site.longitude], small_scales=True)
    depth = np.array(site.depths)
    temperature = columns.temperature(0, depth).astype(np.float32)
    both = ("time", "depth")
    return xr.Dataset(
        {
            "temperature": (both, temperature),
            "temperature_qc": (both, np.ones(temperature.shape, np.int8)),
            "temperature_uncertainty": ("depth", np.full(depth.size, 0.02, np.float32)),
            "deployment": ("time", np.ones(ocean.time.size, np.int16)),
        },
        coords={
            "time": ocean.time,
            "depth": depth.astype(np.float32),
            "mooring": site.id,
            "latitude": site.latitude,
            "longitude": site.longitude,
        },
    )


@pytest.fixture(scope="session")
def perfect_chains(ocean: Ocean) -> dict[str, xr.Dataset]:
    """The flagged chains of perfect moorings; not to be changed."""
    return {site.id: chain_of(ocean, site) for site in PERFECT}


@pytest.fixture(scope="session")
def perfect(
    perfect_chains: dict[str, xr.Dataset],
    write_run: Callable[[Path, dict[str, xr.Dataset]], Path],
    tmp_path_factory: pytest.TempPathFactory,
) -> Path:
    """The folder of a run over perfect moorings; not to be changed."""
    return write_run(tmp_path_factory.mktemp("perfect") / "out", perfect_chains)


@pytest.fixture(scope="session")
def truth(ocean: Ocean) -> xr.Dataset:
    """The ocean itself as a model, daily, in situ; every mooring and sensor lies on one of its points."""
    latitude, longitude = cells(MODEL_LATITUDE, MODEL_LONGITUDE)
    columns = ocean.columns(latitude, longitude, small_scales=True)
    values = np.stack([columns.temperature(place, MODEL_DEPTH) for place in range(latitude.size)], axis=-1)
    shape = (ocean.time.size, MODEL_DEPTH.size, MODEL_LATITUDE.size, MODEL_LONGITUDE.size)
    return model_dataset(values.reshape(shape).astype(np.float32), ocean.time)


def model_dataset(values: np.ndarray, time: Any) -> xr.Dataset:
    """A model with CF metadata on the grid of the tests."""
    return xr.Dataset(
        {
            "temp": (
                ("time", "lev", "lat", "lon"),
                values,
                {"standard_name": "sea_water_temperature", "units": "degree_Celsius"},
            )
        },
        coords={
            "time": ("time", time, {"standard_name": "time", "axis": "T"}),
            "lev": ("lev", MODEL_DEPTH, {"standard_name": "depth", "units": "m", "positive": "down"}),
            "lat": ("lat", MODEL_LATITUDE, {"standard_name": "latitude", "units": "degrees_north"}),
            "lon": ("lon", MODEL_LONGITUDE, {"standard_name": "longitude", "units": "degrees_east"}),
        },
        attrs={"title": "the ocean itself"},
    )


@pytest.fixture(scope="session")
def monthly_truth(truth: xr.Dataset) -> xr.Dataset:
    """The same as monthly means."""
    monthly = truth.resample(time="MS").mean(keep_attrs=True)
    middle = monthly["time"].values + np.timedelta64(14, "D")
    return monthly.assign_coords(time=("time", middle, truth["time"].attrs))


@pytest.fixture(scope="session")
def make_model() -> Callable[..., xr.Dataset]:
    return model_dataset
