"""When the ship serves each mooring, and the log that it keeps of what it deployed and recovered."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from profiles.drill.array import Site
from profiles.drill.service import Deployment, Outage, deployments, outages, visits
from profiles.drill.streams import stream


@dataclass(frozen=True)
class Berth:
    """A site, its place on its line from 0 in the order of the ship, and the days on which the ship comes."""

    site: Site
    place: int
    visited: NDArray[np.float64]


def berths(time: NDArray[np.datetime64], sites: tuple[Site, ...], seed: int) -> Iterator[Berth]:
    """Yield when each site is visited; days are since the first time."""
    length = float((time[-1] - time[0]) / np.timedelta64(1, "D"))
    lines: Counter[float] = Counter()
    for site in sites:
        yield Berth(site, lines[site.longitude], visits(length, stream(seed, "visits", f"{site.longitude:g}")))
        lines[site.longitude] += 1


#: What the log says of an outage, {depths} being those of the silent sensors. What is not here nobody wrote down.
REMARKS: Mapping[str, str] = {
    "line not visited": "visit cancelled, batteries ran out",
    "upper sensors vandalised": "line cut, sensors missing at {depths} m",
    "buoy lost": "buoy not found",
    "sensor dead": "nothing from {depths} m",
}
_MISSING_BUOY = "buoy lost"


def recovery_log(moored: Sequence[Berth], first: np.datetime64, seed: int) -> pd.DataFrame:
    """Return a row a deployment: mooring, deployment from 1, deployed, recovered (NaT: not yet, or lost), remarks."""
    rows = [row for berth in moored for row in _log_of(berth, seed)]
    log = pd.DataFrame(rows, columns=["mooring", "deployment", "deployed", "recovered", "remarks"])
    for name in ("deployed", "recovered"):
        log[name] = (pd.Timestamp(first) + pd.to_timedelta(log[name], unit="D")).dt.floor("min")
    return log


def _log_of(berth: Berth, seed: int) -> Iterator[tuple[str, int, float, float, str]]:
    name = berth.site.id
    deployed = deployments(berth.visited, berth.place, berth.site.depths, stream(seed, "deployments", name))
    befallen = outages(deployed, stream(seed, "outages", name))
    for number, deployment in enumerate(deployed):
        own = [outage for outage in befallen if deployment.start <= outage.start < deployment.end]
        gone = number == len(deployed) - 1 or any(outage.cause == _MISSING_BUOY for outage in own)
        before = deployed[number - 1] if number else deployment
        remarks = "; ".join([*_moved_sensors(before, deployment), *_remarks(own)])
        yield name, number + 1, deployment.start, np.nan if gone else deployment.end, remarks


def _moved_sensors(before: Deployment, after: Deployment) -> list[str]:
    return [
        f"sensor of {old:g} m now at {new:g} m"
        for old, new in zip(before.depths, after.depths, strict=True)
        if old != new
    ]


def _remarks(befallen: list[Outage]) -> list[str]:
    return [
        REMARKS[outage.cause].format(depths=", ".join(f"{depth:g}" for depth in outage.depths))
        for outage in befallen
        if outage.cause in REMARKS
    ]
