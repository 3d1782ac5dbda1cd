"""What lies beside the daily deliveries: casts, a year of 10-minute values, 40 years of monthly ones."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import numpy as np
import pandas as pd
import xarray as xr
from numpy.typing import NDArray

from profiles.atlas import annual_mean
from profiles.drill.array import SITES, Site, positions
from profiles.drill.configuration import configuration_text, delivery_path
from profiles.drill.deliveries import write_netcdf_delivery
from profiles.drill.demo import SEED, TRUTH_ATTRIBUTES, days, write_configuration
from profiles.drill.faults import event_table, plant
from profiles.drill.instruments import moor
from profiles.drill.ocean import Ocean
from profiles.drill.recovery_log import Berth, berths
from profiles.drill.streams import stream
from profiles.drill.truth import LATITUDE, array_truth, cells, site_truth
from profiles.store import make_folder, write_dataset, write_table
from profiles.vocabulary import describe

Times = NDArray[np.datetime64]

_DAY = np.timedelta64(1, "D")
_MINUTES = 10


def make_supplements(
    folder: Path,
    *,
    seed: int = SEED,
    sites: tuple[Site, ...] = SITES,
    progress: Callable[[str], None] = lambda line: None,
) -> None:
    """Make what lies beside the daily deliveries of the same seed again.

    Parameters
    ----------
    folder : Path
        Gets ``ctd/``, ``deliveries/frigate_fast/``, ``fast.toml``, ``companion/`` and their
        truth in ``truth/``; files of the same names are replaced.
    seed : int, optional
        The same seed gives the same bytes.
    sites : tuple of Site, optional
        Of the log, the casts and the monthly companion; by default the whole array.
    progress : callable, optional
        Told each finished step.

    Raises
    ------
    MachineError
        Where the folder cannot be written.
    """
    time = days()
    moored = list(berths(time, sites, seed))
    make_folder(folder / "truth")
    casts = make_folder(folder / "ctd")
    stations = cast_stations(moored, time, seed)
    write_table(casts / "stations.csv", stations)
    for name, _, when, latitude, longitude in stations.itertuples(index=False):
        write_table(casts / f"{name}.csv", cast(when, latitude, longitude, seed))
    progress(f"{len(stations)} casts")
    _make_fast_record(folder, seed)
    progress("a year of 10-minute values")
    _make_companion(folder, sites, seed)
    progress("40 years of monthly values")


# --------------------------------------------------------------------------------------------------------------
# Casts

CAST_DEPTHS = np.arange(2.0, 501.0, 4.0)  # m
CAST_AWAY = 0.03  # degrees, standard deviation of a station's distance from the mooring (ours)
CAST_TEMPERATURE_SD, CAST_SALINITY_SD = 0.002, 0.003  # °C and practical salinity (from memory)


def cast_stations(moored: list[Berth], time: Times, seed: int) -> pd.DataFrame:
    """Return where and when a cast was made: one at each mooring on the equator, at one of the visits."""
    rows = []
    for berth in moored:
        if berth.site.latitude != 0.0:
            continue
        random = stream(seed, "casts", berth.site.id)
        within = berth.visited[(berth.visited > 0.0) & (berth.visited < (time[-1] - time[0]) / _DAY)]
        when = pd.Timestamp(time[0]) + pd.Timedelta(days=float(random.choice(within)))
        latitude, longitude = random.normal((0.0, berth.site.longitude), CAST_AWAY).round(3)
        cast_name = f"{berth.site.id}_{when:%Y-%m-%d}"
        rows.append((cast_name, berth.site.id, when.floor("min"), latitude, longitude))
    return pd.DataFrame(rows, columns=["cast", "mooring", "time", "latitude", "longitude"])


def cast(when: pd.Timestamp, latitude: float, longitude: float, seed: int) -> pd.DataFrame:
    """Return one cast, a row a depth: depth, m; temperature, °C; salinity, practical, that of the packaged atlas.

    Parameters
    ----------
    when : pandas.Timestamp
        UTC.
    latitude, longitude : float
        Degrees north and degrees east, 0-360.
    seed : int
    """
    # Two times make it instants; the first is that of the cast.
    time = when.to_datetime64().astype("datetime64[ns]") + np.arange(2) * np.timedelta64(_MINUTES, "m")
    columns = Ocean.simulate(time, seed).columns([latitude], [longitude], small_scales=True)
    noise = stream(seed, "cast", f"{when:%Y-%m-%dT%H:%M}").standard_normal((2, CAST_DEPTHS.size))
    atlas = annual_mean()["salinity"].sel(latitude=latitude, longitude=longitude, method="nearest")
    salinity = np.interp(CAST_DEPTHS, atlas["depth"].values, atlas.values)
    return pd.DataFrame(
        {
            "depth": CAST_DEPTHS,
            "temperature": (columns.temperature(0, CAST_DEPTHS)[0] + CAST_TEMPERATURE_SD * noise[0]).round(3),
            "salinity": (salinity + CAST_SALINITY_SD * noise[1]).round(3),
        }
    )


# --------------------------------------------------------------------------------------------------------------
# 10-minute values

#: A second mooring beside TB-30, for one deployment.
FAST_SITE = replace(next(site for site in SITES if site.id == "TB-30"), id="TB-30F", institute="frigate_fast")
FAST_FIRST, FAST_LAST = "2034-01-01", "2034-12-31"
FAST_VISITS = (-6.0, 363.0)  # days since the first value, of the ship
FAST_FAULTS = (
    *("spike",) * 8,
    *("stuck value",) * 2,
    "fill value",
    "on deck",
    "knock-down",
    "repeated block",
    "pressure offset",
    "duplicated timestamps",
)


def _make_fast_record(folder: Path, seed: int) -> None:
    ocean = Ocean.simulate(_fast_times(), seed)
    columns = ocean.columns(*positions((FAST_SITE,)), small_scales=True)
    chain, _, _ = moor(columns, 0, FAST_SITE, ocean.time, np.array(FAST_VISITS), seed=seed)
    planted, events = plant(chain, FAST_FAULTS, stream(seed, "faults", FAST_SITE.id))
    path = folder / delivery_path(FAST_SITE)
    make_folder(path.parent)
    write_netcdf_delivery(path, FAST_SITE, planted, means=False)
    write_configuration(folder, "fast.toml", configuration_text((FAST_SITE,), head=_FAST_HEAD))
    large = ocean.columns(*positions((FAST_SITE,)))
    truth = site_truth(ocean, (FAST_SITE,), large, columns)
    write_dataset(folder / "truth" / "fast_site.nc", truth, TRUTH_ATTRIBUTES)
    write_table(folder / "truth" / "fast_faults.csv", event_table(events))


_FAST_HEAD = """\
# One mooring with a value every 10 minutes. Every threshold is left at its default.

"""


def _fast_times() -> Times:
    first, stop = np.datetime64(FAST_FIRST, "ns"), np.datetime64(FAST_LAST, "ns") + _DAY
    return np.asarray(np.arange(first, stop, np.timedelta64(_MINUTES, "m")))


# --------------------------------------------------------------------------------------------------------------
# Monthly values

COMPANION_MONTHS = ("2031-01", "2071-01")  # the first, and the one after the last
COMPANION_DEPTH_SD, COMPANION_SURFACE_SD = 1.5, 0.03  # m and °C, of a monthly mean at a mooring (ours)
INDEX_LONGITUDE = np.arange(190.5, 240.0)  # 170W-120W, with 5S-5N the box of Nino-3.4
_SURFACE = {
    "standard_name": "sea_surface_temperature",
    "units": "degree_Celsius",
    "cell_methods": "time: mean",
}


def _make_companion(folder: Path, sites: tuple[Site, ...], seed: int) -> None:
    ocean = Ocean.simulate(_months(), seed)
    attributes = {**TRUTH_ATTRIBUTES, "title": "Forty years of monthly means of the Tropicbird Array"}
    write_dataset(make_folder(folder / "companion") / "monthly.nc", companion(ocean, sites, seed), attributes)
    truth = array_truth(ocean)[["equatorial_isotherm_depth", "thermocline_slope", "warm_water_volume"]]
    write_dataset(folder / "truth" / "monthly.nc", truth, TRUTH_ATTRIBUTES)


def _months() -> Times:
    starts = np.arange(*COMPANION_MONTHS, dtype="datetime64[M]")
    first, stop = starts.astype("datetime64[ns]"), (starts + 1).astype("datetime64[ns]")
    return np.asarray(first + (stop - first) // 2)


def companion(ocean: Ocean, sites: tuple[Site, ...], seed: int) -> xr.Dataset:
    """Return isotherm depth and surface temperature at ``sites``, with errors, and the mean of the index's box."""
    columns = ocean.columns(*positions(sites), small_scales=True)
    random = stream(seed, "companion")
    depth, surface = columns.isotherm_depth(), columns.surface_temperature()
    depth = np.maximum(depth + COMPANION_DEPTH_SD * random.standard_normal(depth.shape), 0.0)
    surface = surface + COMPANION_SURFACE_SD * random.standard_normal(surface.shape)
    latitude, longitude = cells(LATITUDE, INDEX_LONGITUDE)
    box = ocean.surface_temperature(latitude, longitude)
    index = np.average(box, axis=0, weights=np.cos(np.radians(latitude)))
    at_sites = positions(sites)
    dataset = xr.Dataset(
        {
            "isotherm_depth": (("mooring", "time"), depth.round(2)),
            "surface_temperature": (("mooring", "time"), surface.round(3).astype(np.float32), _SURFACE),
            "surface_temperature_index": ("time", index.round(4), _SURFACE),
        },
        coords={
            "mooring": [site.id for site in sites],
            "time": ocean.time,
            "latitude": ("mooring", at_sites[0]),
            "longitude": ("mooring", at_sites[1]),
        },
    )
    dataset["surface_temperature"].attrs["long_name"] = "temperature at the surface"
    dataset["surface_temperature_index"].attrs["long_name"] = "mean temperature at the surface over 5S-5N, 170W-120W"
    return describe(dataset)
