"""Which faults are planted over the whole array, and in which moorings."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace

import numpy as np
import xarray as xr

from profiles.drill.array import Site
from profiles.drill.deliveries import ABSENT_HALCYON, KELVIN, TOLD
from profiles.drill.fault_catalogue import CATALOGUE, Fault
from profiles.drill.faults import Event, plant
from profiles.drill.streams import stream
from profiles.errors import DataError

#: How many faults of each name are planted over the whole array: each several times, 120 in all (ours).
FAULTS: Mapping[str, int] = {
    "spike": 18,
    "stuck value": 8,
    "fill value": 6,
    "digit rollover": 4,
    "flooded sensor": 5,
    "offset": 6,
    "calibration error": 4,
    "drift": 5,
    "bio-fouling": 4,
    "wrong nominal depth": 5,
    "pressure offset": 5,
    "pressure failure": 4,
    "swapped sensors": 4,
    "lost upper sensors": 3,
    "mooring adrift": 3,
    "on deck": 6,
    "knock-down": 6,
    "part of the day": 4,
    "repeated block": 6,
    "clock offset": 4,
    "clock drift": 4,
    "duplicated timestamps": 6,
}


def plant_over_array(
    chains: Sequence[xr.Dataset], sites: tuple[Site, ...], faults: Mapping[str, int], seed: int
) -> tuple[list[xr.Dataset], list[Event]]:
    """Plant ``faults`` into moorings drawn at random.

    Parameters
    ----------
    chains : sequence of xarray.Dataset
        One a site, without faults.
    sites : tuple of Site
    faults : mapping
        How many of each name. Each goes to a mooring whose deliveries tell of what it changes.
    seed : int

    Returns
    -------
    tuple
        The chains, and the events by mooring and start.

    Raises
    ------
    DataError
        Where no mooring has room for a fault.
    """
    random = stream(seed, "faults")
    planted, events = list(chains), []
    for name in (name for name, count in faults.items() for _ in range(count)):
        place, chain, event = _planted(planted, sites, name, random)
        planted[place] = chain
        events.append(event)
    return planted, sorted(events, key=lambda event: (event.mooring, event.start, event.number))


def _planted(
    chains: Sequence[xr.Dataset], sites: tuple[Site, ...], name: str, random: np.random.Generator
) -> tuple[int, xr.Dataset, Event]:
    """Plant one fault into the first mooring, in random order, that has room for it."""
    about = CATALOGUE[name].touches[0]
    places = [place for place, site in enumerate(sites) if about in TOLD[site.institute]]
    for place in random.permutation(places):
        try:
            chain, (event,) = plant(chains[place], [name], random, catalogue=catalogue_of(sites[place].institute))
        except DataError:
            continue
        return int(place), chain, event
    raise DataError(
        f"no mooring has room for another fault: {name}",
        expected=f"one whose deliveries tell of {about}, long enough and free of other faults",
        found=f"{len(places)} that tell of {about}",
        advice="plant fewer faults, or use a longer record",
    )


def catalogue_of(institute: str) -> Mapping[str, Fault]:
    """Return the catalogue for an institute.

    What it writes where a value is missing is no fault in its deliveries. Fill values are left as they are in a
    delivery in kelvin, where -99 stands for -372.15 °C.
    """
    fill = CATALOGUE["fill value"]
    if institute == "halcyon":
        sizes = tuple(size for size in fill.sizes if size != float(ABSENT_HALCYON))
    elif institute == "shearwater":
        sizes = tuple(round(size - KELVIN, 3) for size in fill.sizes)
    else:
        return CATALOGUE
    return {**CATALOGUE, "fill value": replace(fill, sizes=sizes)}
