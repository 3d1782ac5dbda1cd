"""When moorings are exchanged and when they are silent: visits of a ship to each line, and what goes wrong between.

Shares below are of the values that a mooring should give, and are what the constants lead to over many years
(the tests hold them): line not visited 5 %, upper sensors vandalised 2 %, buoy lost 1.5 %,
sensor dead 3 %, turn-around 1 %, transmission 3 %, single values 1 %.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]
Mask = NDArray[np.bool_]

YEAR = 365.25  # days

VISIT_SPACING, VISIT_SPACING_SD = 365.0, 25.0  # days between visits to a line (ours; common practice: once a year)
LEAST_SPACING = 200.0  # days
MISSED_VISITS = 0.07  # share of the visits to a line that do not happen (ours)
BATTERY_DAYS = (390.0, 450.0)  # a deployment that is not exchanged falls silent (ours)
STEAMING_DAYS = 1.5  # between neighbouring moorings of a line (ours)
TURN_AROUND_DAYS = (1.0, 6.0)  # from recovery to the next first value (ours)
MOVED_SENSORS = 0.15  # share of the exchanges after which one inner sensor hangs at another depth (ours)
MOVED_STEP = 5.0  # m; a sensor moves by one or two of these (ours)

VANDALISED = 0.13  # share of the deployments; from a random day to the exchange (ours)
VANDALISED_SENSORS = (2, 5)  # how many of the uppermost
LOST_BUOYS = 0.03  # share of the deployments; from a random day to the exchange (ours)
DEAD_SENSORS = 0.06  # share of the sensors of a deployment; from a random day to the exchange (ours)
TRANSMISSION_GAPS = 2.0  # per year, of a whole mooring (ours)
TRANSMISSION_GAP_DAYS = 5.0  # mean of their exponential lengths (ours)
SINGLE_VALUES = 0.01  # share of all values, each for itself (ours)


@dataclass(frozen=True)
class Deployment:
    """From when to when, days, one set of sensors was in the water, and at which nominal depths, m, ascending."""

    start: float
    end: float
    depths: tuple[float, ...]


@dataclass(frozen=True)
class Outage:
    """``cause``; ``start`` and ``end``, days; ``depths``, m, of the silent sensors of that deployment."""

    cause: str
    start: float
    end: float
    depths: tuple[float, ...]


def visits(days: float, random: np.random.Generator) -> Floats:
    """Return the days on which a ship comes to a line, from before the record to past its end.

    Parameters
    ----------
    days : float
        Length of the record.
    random : numpy.random.Generator
        Of the line, so that its moorings share the visits.
    """
    count = int(days / LEAST_SPACING) + 2
    spacing = np.maximum(random.normal(VISIT_SPACING, VISIT_SPACING_SD, count), LEAST_SPACING)
    planned = random.uniform(0.0, VISIT_SPACING) - VISIT_SPACING + np.concatenate([[0.0], np.cumsum(spacing)])
    made = random.random(planned.size) >= MISSED_VISITS
    made[0] = True
    last = int(np.searchsorted(planned, days))
    made[last] = True
    return np.asarray(planned[: last + 1][made[: last + 1]])


def deployments(
    visited: Floats, berth: int, depths: tuple[float, ...], random: np.random.Generator
) -> tuple[Deployment, ...]:
    """Return the deployments of one mooring.

    Parameters
    ----------
    visited : ndarray, shape (visit,)
        Days, as :func:`visits` gives.
    berth : int
        Place of the mooring on its line, from 0 in the order of the ship.
    depths : tuple of float
        Nominal, m, of the first deployment.
    random : numpy.random.Generator
        Of the mooring.
    """
    arrivals = visited + STEAMING_DAYS * berth
    found = []
    for number, (start, end) in enumerate(pairwise(arrivals)):
        if number > 0 and random.random() < MOVED_SENSORS:
            depths = moved(depths, random)
        found.append(Deployment(float(start + random.uniform(*TURN_AROUND_DAYS)), float(end), depths))
    return tuple(found)


def moved(depths: tuple[float, ...], random: np.random.Generator) -> tuple[float, ...]:
    """Return ``depths`` with one inner sensor moved, if there is one with room to its neighbours on that side."""
    if len(depths) < 3:
        return depths
    sensor = int(random.integers(1, len(depths) - 1))
    depth = depths[sensor] + float(random.choice([-2.0, -1.0, 1.0, 2.0])) * MOVED_STEP
    if not depths[sensor - 1] < depth < depths[sensor + 1]:
        return depths
    return (*depths[:sensor], depth, *depths[sensor + 1 :])


def all_depths(deployed: tuple[Deployment, ...]) -> tuple[float, ...]:
    """Return every depth at which any deployment has a sensor, m, ascending."""
    return tuple(sorted({depth for deployment in deployed for depth in deployment.depths}))


def numbers(days: Floats, deployed: tuple[Deployment, ...]) -> Integers:
    """Return the place in ``deployed`` of each of ``days``, (time,); a turn-around belongs to what it ends."""
    starts = [deployment.start for deployment in deployed[1:]]
    return np.asarray(np.searchsorted(starts, days, side="right"), dtype=np.int64)


# ------------------------------------------------------------------------------------------------------------
# Silence


def _unvisited(deployment: Deployment, random: np.random.Generator) -> list[Outage]:
    """The battery ends before the ship comes."""
    start = deployment.start + random.uniform(*BATTERY_DAYS)
    return [Outage("line not visited", start, deployment.end, deployment.depths)] if start < deployment.end else []


def _vandalised(deployment: Deployment, random: np.random.Generator) -> list[Outage]:
    start = random.uniform(deployment.start, deployment.end)
    lost = int(random.integers(VANDALISED_SENSORS[0], VANDALISED_SENSORS[1] + 1))
    if random.random() >= VANDALISED:
        return []
    return [Outage("upper sensors vandalised", start, deployment.end, deployment.depths[:lost])]


def _buoy_lost(deployment: Deployment, random: np.random.Generator) -> list[Outage]:
    start = random.uniform(deployment.start, deployment.end)
    if random.random() >= LOST_BUOYS:
        return []
    return [Outage("buoy lost", start, deployment.end, deployment.depths)]


def _dead(deployment: Deployment, random: np.random.Generator) -> list[Outage]:
    starts = random.uniform(deployment.start, deployment.end, len(deployment.depths))
    dies = random.random(len(deployment.depths)) < DEAD_SENSORS
    return [
        Outage("sensor dead", float(start), deployment.end, (depth,))
        for start, depth, dead in zip(starts, deployment.depths, dies, strict=True)
        if dead
    ]


def _transmission(deployment: Deployment, random: np.random.Generator) -> list[Outage]:
    length = deployment.end - deployment.start
    count = int(random.poisson(TRANSMISSION_GAPS * length / YEAR))
    starts = random.uniform(deployment.start, deployment.end, count)
    ends = np.minimum(starts + random.exponential(TRANSMISSION_GAP_DAYS, count), deployment.end)
    return [
        Outage("transmission", float(start), float(end), deployment.depths)
        for start, end in zip(starts, ends, strict=True)
    ]


#: What may befall a deployment, by cause.
CAUSES: Mapping[str, Callable[[Deployment, np.random.Generator], list[Outage]]] = {
    "line not visited": _unvisited,
    "upper sensors vandalised": _vandalised,
    "buoy lost": _buoy_lost,
    "sensor dead": _dead,
    "transmission": _transmission,
}


def outages(deployed: tuple[Deployment, ...], random: np.random.Generator) -> tuple[Outage, ...]:
    """Return what befalls each deployment, and the turn-arounds between them, in the order of their starts."""
    found = [outage for deployment in deployed for befall in CAUSES.values() for outage in befall(deployment, random)]
    found += [
        Outage("turn-around", before.end, after.start, tuple(sorted({*before.depths, *after.depths})))
        for before, after in pairwise(deployed)
    ]
    return tuple(sorted(found, key=lambda outage: (outage.start, outage.depths)))


def silent(days: Floats, depths: tuple[float, ...], outage: Outage) -> Mask:
    """Return which values an outage takes, (time, depth); its start is inside, its end is not."""
    when = (days >= outage.start) & (days < outage.end)
    return np.asarray(when[:, None] & np.isin(depths, outage.depths))


def delivered_values(
    days: Floats,
    depths: tuple[float, ...],
    deployed: tuple[Deployment, ...],
    befallen: tuple[Outage, ...],
    random: np.random.Generator,
) -> Mask:
    """Return which values are delivered, (time, depth): of a sensor that hung there, in no outage, not lost singly.

    Parameters
    ----------
    days : ndarray, shape (time,)
    depths : tuple of float
        m, as :func:`all_depths` gives.
    deployed : tuple of Deployment
    befallen : tuple of Outage
    random : numpy.random.Generator
        Decides on single values.
    """
    hung = np.array([np.isin(depths, deployment.depths) for deployment in deployed])[numbers(days, deployed)]
    delivered = hung & (random.random(hung.shape) >= SINGLE_VALUES)
    for outage in befallen:
        delivered &= ~silent(days, depths, outage)
    return np.asarray(delivered)
