"""The Tropicbird Array, an invented mooring array in the equatorial Pacific, as data."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

#: Nominal sensor depths, m, by the longitude of the line, degrees east. The sensors stand 15 to 20 m apart in
#: the west and 10 m apart in the east around the isotherm's mean depth, with gaps of 40 to 60 m below it down
#: to 300 m.
CHAINS: Mapping[float, tuple[float, ...]] = {
    149.0: (1, 10, 40, 70, 100, 120, 140, 160, 180, 200, 220, 260, 300, 500),
    162.0: (1, 10, 40, 70, 100, 120, 140, 160, 180, 200, 220, 260, 300, 500),
    175.0: (1, 10, 40, 70, 100, 120, 140, 160, 180, 200, 220, 260, 300, 500),
    188.0: (1, 10, 40, 70, 95, 115, 135, 155, 175, 195, 215, 255, 300, 500),
    201.0: (1, 10, 40, 65, 90, 110, 130, 150, 170, 190, 210, 255, 300, 500),
    214.0: (1, 10, 35, 60, 80, 100, 115, 130, 145, 160, 200, 250, 300, 500),
    227.0: (1, 10, 30, 50, 70, 85, 100, 115, 130, 145, 190, 245, 300, 500),
    240.0: (1, 10, 30, 45, 55, 65, 75, 85, 100, 140, 190, 245, 300, 500),
    253.0: (1, 10, 20, 30, 40, 50, 60, 70, 85, 130, 185, 240, 300, 500),
    266.0: (1, 5, 10, 20, 30, 40, 50, 60, 80, 130, 185, 240, 300, 500),
}
_EVERY_LINE = (-2.5, 0.0, 2.5)
_WIDE_LINE = (-4.5, -2.5, 0.0, 2.5, 4.5)
_WIDE_LINES = (162.0, 188.0, 214.0, 240.0, 266.0)

#: The invented institutes that deliver, west to east, and how many moorings each looks after.
INSTITUTES: Mapping[str, int] = {"halcyon": 10, "marlin": 10, "frigate": 10, "shearwater": 10}


@dataclass(frozen=True)
class Site:
    """One mooring: degrees north, degrees east, nominal sensor depths in m, and who delivers its record."""

    id: str
    latitude: float
    longitude: float
    depths: tuple[float, ...]
    institute: str


def _sites() -> tuple[Site, ...]:
    places = [
        (latitude, longitude)
        for longitude in CHAINS
        for latitude in (_WIDE_LINE if longitude in _WIDE_LINES else _EVERY_LINE)
    ]
    institutes = [name for name, count in INSTITUTES.items() for _ in range(count)]
    return tuple(
        Site(f"TB-{number:02d}", latitude, longitude, CHAINS[longitude], institute)
        for number, ((latitude, longitude), institute) in enumerate(zip(places, institutes, strict=True), start=1)
    )


#: The 40 moorings, numbered west to east and, on a line, south to north.
SITES = _sites()


def positions(sites: tuple[Site, ...]) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Return the latitudes and the longitudes of ``sites``, shape (site,)."""
    return np.array([site.latitude for site in sites]), np.array([site.longitude for site in sites])
