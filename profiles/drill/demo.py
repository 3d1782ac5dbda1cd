"""The demo data: six years of an invented array in a simulated ocean, delivered by invented institutes."""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable, Iterator, Mapping
from dataclasses import replace
from pathlib import Path

import numpy as np
import pandas as pd
import xarray as xr
from numpy.typing import NDArray

from profiles.drill.array import INSTITUTES, SITES, Site
from profiles.drill.deliveries import (
    WIDE_ABSENT,
    damage,
    long_lines,
    wide_lines,
    write_netcdf_delivery,
    write_text_delivery,
)
from profiles.drill.fault_catalogue import CATALOGUE, Fault
from profiles.drill.faults import Event, event_table, plant
from profiles.drill.instruments import moor
from profiles.drill.ocean import Columns, Ocean
from profiles.drill.service import visits
from profiles.drill.streams import stream
from profiles.drill.truth import array_truth, site_columns, site_truth
from profiles.store import make_folder, write_dataset, write_table

SEED = 2033
FIRST, LAST = "2031-01-01", "2036-12-31"
NOON = np.timedelta64(12, "h")  # a daily mean is stamped at the middle of its day

#: How many faults of each name are planted over the whole array.
FAULTS: Mapping[str, int] = {
    "spike": 20,
    "stuck value": 10,
    "fill value": 6,
    "flooded sensor": 5,
    "offset": 8,
    "drift": 6,
}
DAMAGED_DELIVERIES = 3  # of each institute that delivers text

_ATTRIBUTES = {
    "title": "Truth of the Tropicbird Array's simulated ocean",
    "summary": "What the simulated ocean did. The array, its ocean and its years are invented.",
    "institution": "none: simulated",
    "license": "BSD-3-Clause",
}


def days(first: str = FIRST, last: str = LAST) -> NDArray[np.datetime64]:
    """Return the middle of each day from ``first`` to ``last``, UTC, datetime64[ns]."""
    midnight = np.arange(first, np.datetime64(last) + 1, dtype="datetime64[D]")
    return np.asarray(midnight.astype("datetime64[ns]") + NOON, dtype="datetime64[ns]")


def delivery_path(site: Site) -> str:
    """Return where a mooring's delivery lies below the demo's folder."""
    ending = "nc" if site.institute == "frigate" else "csv.gz"
    return f"deliveries/{site.institute}/{site.id}.{ending}"


def make_demo(
    folder: Path,
    *,
    seed: int = SEED,
    time: NDArray[np.datetime64] | None = None,
    sites: tuple[Site, ...] = SITES,
    faults: Mapping[str, int] = FAULTS,
    progress: Callable[[str], None] = lambda line: None,
) -> None:
    """Make the deliveries and their truth again.

    Parameters
    ----------
    folder : Path
        Gets ``deliveries/`` and ``truth/``; files of the same names are replaced.
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
    """
    make_folder(folder)
    ocean = Ocean.simulate(days() if time is None else time, seed)
    large, whole = site_columns(ocean, sites)
    progress(f"water columns of {len(sites)} sites")
    chains, events = plant_over_array(list(simulated_chains(ocean, sites, whole, seed)), sites, faults, seed)
    progress(f"chains with {len(events)} planted faults")
    damaged = write_deliveries(folder, sites, chains, seed)
    progress(f"deliveries with {len(damaged)} damaged rows")
    truth = make_folder(folder / "truth")
    write_dataset(truth / "sites.nc", site_truth(ocean, sites, large, whole), _ATTRIBUTES)
    write_table(truth / "faults.csv", event_table(events))
    write_table(truth / "damaged_rows.csv", damaged)
    write_dataset(truth / "array.nc", array_truth(ocean), _ATTRIBUTES)
    progress("truth")


def simulated_chains(ocean: Ocean, sites: tuple[Site, ...], columns: Columns, seed: int) -> Iterator[xr.Dataset]:
    """Yield what each site's sensors read, gaps included, dims (time, depth)."""
    days = (ocean.time[-1] - ocean.time[0]) / np.timedelta64(1, "D")
    lines: Counter[float] = Counter()
    for position, site in enumerate(sites):
        visited = visits(days, stream(seed, "visits", f"{site.longitude:g}"))
        berth, lines[site.longitude] = lines[site.longitude], lines[site.longitude] + 1
        chain, _, _ = moor(columns, position, site, ocean.time, visited, seed=seed, berth=berth)
        yield chain


def plant_over_array(
    chains: list[xr.Dataset], sites: tuple[Site, ...], faults: Mapping[str, int], seed: int
) -> tuple[list[xr.Dataset], list[Event]]:
    """Plant ``faults`` into moorings drawn at random; return the chains and the events."""
    names = [name for name, count in faults.items() for _ in range(count)]
    homes = stream(seed, "faulty moorings").integers(len(sites), size=len(names))
    planted, events = [], []
    for place, (site, chain) in enumerate(zip(sites, chains, strict=True)):
        own = [name for name, home in zip(names, homes, strict=True) if home == place]
        random = stream(seed, "faults", site.id)
        faulty, happened = plant(chain, own, random, catalogue=_catalogue(site.institute))
        planted.append(faulty)
        events += sorted(happened, key=lambda event: (event.start, event.depths))
    return planted, events


def _catalogue(institute: str) -> dict[str, Fault]:
    """A wide delivery writes :data:`WIDE_ABSENT` where a value is missing: there it is no fault."""
    if institute != "halcyon":
        return dict(CATALOGUE)
    fill = CATALOGUE["fill value"]
    return {**CATALOGUE, "fill value": replace(fill, sizes=tuple(size for size in fill.sizes if size != WIDE_ABSENT))}


def write_deliveries(folder: Path, sites: tuple[Site, ...], chains: list[xr.Dataset], seed: int) -> pd.DataFrame:
    """Write every mooring's file; return the damaged rows: file, line from 1, kind."""
    for institute in INSTITUTES:
        make_folder(folder / "deliveries" / institute)
    careless = _careless(sites, seed)
    damaged = []
    for site, chain in zip(sites, chains, strict=True):
        path = folder / delivery_path(site)
        if site.institute == "frigate":
            write_netcdf_delivery(path, site, chain)
            continue
        head, rows = (wide_lines if site.institute == "halcyon" else long_lines)(site, chain)
        if site.id in careless:
            rows, places = damage(rows, stream(seed, "damage", site.id))
            damaged += [(delivery_path(site), len(head) + place + 1, kind) for place, kind in places]
        write_text_delivery(path, head, rows)
    return pd.DataFrame(damaged, columns=["file", "line", "kind"])


def _careless(sites: tuple[Site, ...], seed: int) -> set[str]:
    """Return the moorings whose text deliveries are damaged."""
    random = stream(seed, "careless deliveries")
    chosen: set[str] = set()
    for institute in ("halcyon", "marlin"):
        own = [site.id for site in sites if site.institute == institute]
        chosen |= set(random.permutation(own)[:DAMAGED_DELIVERIES])
    return chosen
