"""The demo data: six years of an invented array in a simulated ocean, delivered by invented institutes."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping
from pathlib import Path

import numpy as np
import pandas as pd
import xarray as xr
from numpy.typing import NDArray

from profiles.config import Config, load_config
from profiles.drill.array import SITES, Site
from profiles.drill.configuration import FORMS, configuration_text, delivery_path
from profiles.drill.deliveries import TEXTS, damage, write_netcdf_delivery, write_text_delivery
from profiles.drill.faults import event_table
from profiles.drill.instruments import moor
from profiles.drill.ocean import Columns, Ocean
from profiles.drill.planting import FAULTS, plant_over_array
from profiles.drill.recovery_log import berths, recovery_log
from profiles.drill.streams import stream
from profiles.drill.truth import array_truth, site_columns, site_truth
from profiles.store import make_folder, write_dataset, write_table, write_text

SEED = 2033
FIRST, LAST = "2031-01-01", "2036-12-31"
NOON = np.timedelta64(12, "h")  # a daily mean is stamped at the middle of its day
DAMAGED_DELIVERIES = 3  # of each institute that delivers text

CONFIGURATION, LOG = "array.toml", "recovery_log.csv"  # in the demo's folder
_HEAD = """\
# The deliveries in this folder as one array. Every threshold is left at its default.

"""
TRUTH_ATTRIBUTES = {
    "title": "Truth of the Tropicbird Array's simulated ocean",
    "summary": "What the simulated ocean did. The array, its ocean and its years are invented.",
    "institution": "none: simulated",
    "license": "BSD-3-Clause",
}


def days(first: str = FIRST, last: str = LAST) -> NDArray[np.datetime64]:
    """Return the middle of each day from ``first`` to ``last``, UTC, datetime64[ns]."""
    midnight = np.arange(first, np.datetime64(last) + 1, dtype="datetime64[D]")
    return np.asarray(midnight.astype("datetime64[ns]") + NOON, dtype="datetime64[ns]")


def make_demo(
    folder: Path,
    *,
    seed: int = SEED,
    time: NDArray[np.datetime64] | None = None,
    sites: tuple[Site, ...] = SITES,
    faults: Mapping[str, int] = FAULTS,
    progress: Callable[[str], None] = lambda line: None,
) -> None:
    """Make the daily deliveries, their configuration and their truth again.

    Parameters
    ----------
    folder : Path
        Gets ``deliveries/``, ``layouts/``, ``array.toml``, ``recovery_log.csv`` and ``truth/``; files of the same
        names are replaced.
    seed : int, optional
        The same seed gives the same bytes.
    time : ndarray of datetime64, shape (time,), optional
        Middles of days, UTC; by default the six years of the demo.
    sites : tuple of Site, optional
        By default the whole array.
    faults : mapping, optional
        How many faults of each name are planted.
    progress : callable, optional
        Told each finished step.

    Raises
    ------
    MachineError
        Where the folder cannot be written.
    DataError
        Where the record has no room for the faults.
    """
    make_folder(folder)
    ocean = Ocean.simulate(days() if time is None else time, seed)
    large, whole = site_columns(ocean, sites)
    progress(f"water columns of {len(sites)} sites")
    chains, events = plant_over_array(list(simulated_chains(ocean, sites, whole, seed)), sites, faults, seed)
    progress(f"chains with {len(events)} planted faults")
    damaged = write_deliveries(folder, sites, chains, seed)
    write_configuration(folder, CONFIGURATION, configuration_text(sites, head=_HEAD, log=LOG))
    write_table(folder / LOG, recovery_log(list(berths(ocean.time, sites, seed)), ocean.time[0], seed))
    progress(f"deliveries with {len(damaged)} damaged rows")
    truth = make_folder(folder / "truth")
    write_dataset(truth / "sites.nc", site_truth(ocean, sites, large, whole), TRUTH_ATTRIBUTES)
    write_table(truth / "faults.csv", event_table(events))
    write_table(truth / "damaged_rows.csv", damaged)
    write_dataset(truth / "array.nc", array_truth(ocean), TRUTH_ATTRIBUTES)
    progress("truth")


def demo_config(folder: Path) -> Config:
    """Return the configuration of a demo's folder, as :func:`make_demo` wrote it.

    Raises
    ------
    RequestError
        Where there is none.
    """
    return load_config(folder / CONFIGURATION)


def write_configuration(folder: Path, name: str, text: str) -> None:
    """Write a configuration, and the layouts of all institutes beside it."""
    write_text(folder / name, text)
    layouts = make_folder(folder / "layouts")
    for form in FORMS.values():
        write_text(layouts / form.layout, form.text)


def simulated_chains(ocean: Ocean, sites: tuple[Site, ...], columns: Columns, seed: int) -> Iterator[xr.Dataset]:
    """Yield what each site's sensors read, gaps included, dims (time, depth)."""
    for position, berth in enumerate(berths(ocean.time, sites, seed)):
        chain, _, _ = moor(columns, position, berth.site, ocean.time, berth.visited, seed=seed, berth=berth.place)
        yield chain


def write_deliveries(folder: Path, sites: tuple[Site, ...], chains: list[xr.Dataset], seed: int) -> pd.DataFrame:
    """Write every mooring's file; return the damaged rows: file, line from 1, kind."""
    careless = _careless(sites, seed)
    damaged = []
    for site, chain in zip(sites, chains, strict=True):
        path = folder / delivery_path(site)
        make_folder(path.parent)
        if site.institute not in TEXTS:
            write_netcdf_delivery(path, site, chain)
            continue
        head, rows = TEXTS[site.institute](site, chain)
        if site.id in careless:
            rows, places = damage(rows, stream(seed, "damage", site.id))
            damaged += [(delivery_path(site), len(head) + place + 1, kind) for place, kind in places]
        write_text_delivery(path, head, rows)
    return pd.DataFrame(damaged, columns=["file", "line", "kind"])


def _careless(sites: tuple[Site, ...], seed: int) -> set[str]:
    """Return the moorings whose text deliveries are damaged."""
    random = stream(seed, "careless deliveries")
    chosen: set[str] = set()
    for institute in TEXTS:
        own = [site.id for site in sites if site.institute == institute]
        chosen |= set(random.permutation(own)[:DAMAGED_DELIVERIES])
    return chosen
