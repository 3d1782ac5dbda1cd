"""When a chain was in the water: from the recovery log, and from readings that are alike at all depths.

On deck all sensors read the air. In the water the upper ones are warmer than the lower ones, as a rule by far.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from profiles.ingest.recovery_log import Service
from profiles.ingest.spool import Spool, Table
from profiles.vocabulary import Water

LEAST_SPREAD = 4.0  # °C; a chain whose readings differ less than this from top to bottom cannot tell air (ours)
AIR_SHARE = 0.25  # of the usual difference; on deck they differ less (ours)
LARGEST_AIR_SPREAD = 2.0  # °C; sensors on deck, in sun and shade, differ less (ours)
PARTLY_SHARE = 0.5  # of the usual difference; beside a reading on deck, less is a mean over deck and water (ours)
REACH_SHARE = 0.5  # of the chain's extent that the sensors with a reading must span to tell (ours)
LEAST_SENSORS = 3
_SAMPLE = 20_000  # rows from which the usual difference is taken


def spread(values: NDArray[np.floating], depth: NDArray[np.floating]) -> NDArray[np.float64]:
    """Return the difference of the largest and the smallest reading of each profile, °C.

    Parameters
    ----------
    values : ndarray, (time, depth)
        °C, NaN missing.
    depth : ndarray, (depth,)
        m, ascending.

    Returns
    -------
    ndarray, (time,)
        NaN where fewer than three sensors, or sensors over less than half of the chain's extent, have a reading.
    """
    present = np.isfinite(values)
    highest = np.where(present, values, -np.inf).max(axis=1, initial=-np.inf)
    lowest = np.where(present, values, np.inf).min(axis=1, initial=np.inf)
    deepest = np.where(present, depth, -np.inf).max(axis=1, initial=-np.inf)
    shallowest = np.where(present, depth, np.inf).min(axis=1, initial=np.inf)
    tells = (present.sum(axis=1) >= LEAST_SENSORS) & (deepest - shallowest >= REACH_SHARE * np.ptp(depth))
    difference = np.full(len(values), np.nan)
    difference[tells] = highest[tells] - lowest[tells]
    return difference


@dataclass(frozen=True)
class Immersion:
    """How it is told whether a chain was in the water.

    Attributes
    ----------
    usual_spread : float
        °C; median difference from top to bottom over the record, NaN where it does not tell air from water.
    depth : ndarray, (depth,)
        m, ascending.
    service : Service, optional
        What the recovery log says.
    """

    usual_spread: float
    depth: NDArray[np.float32]
    service: Service | None = None

    def status(self, rows: Table, before: Table, after: Table) -> NDArray[np.int8]:
        """Return a :class:`Water` status for each row; ``before`` and ``after`` hold a neighbour each, or none."""
        both = np.concatenate([before["values"], rows["values"], after["values"]])
        difference = spread(both, self.depth)
        in_air = difference < min(AIR_SHARE * self.usual_spread, LARGEST_AIR_SPREAD)
        beside = np.zeros(in_air.size, bool)
        beside[1:] |= in_air[:-1]
        beside[:-1] |= in_air[1:]
        partly = beside & (difference < PARTLY_SHARE * self.usual_spread)
        status = np.where(in_air | partly, Water.AIR_FOUND, Water.IN_WATER).astype(np.int8)
        status = status[len(before) : len(before) + len(rows)]
        if self.service is not None:
            status[~self.service.is_out(rows["time"])] = Water.NOT_DEPLOYED
        return status

    def deployment(self, rows: Table) -> NDArray[np.int16] | None:
        """Return the number of the deployment of each row as the log has it; None without a log."""
        return self.service.deployment_at(rows["time"]) if self.service is not None else None


def immersion(table: Spool, depth: NDArray[np.float32], service: Service | None) -> Immersion:
    """Look a record over for how much its readings usually differ with depth."""
    step = max(table.count // _SAMPLE, 1)
    differences = np.concatenate([spread(rows["values"][::step], depth) for rows in table.chunks()])
    known = differences[np.isfinite(differences)]
    usual = float(np.median(known)) if known.size else np.nan
    return Immersion(usual if usual >= LEAST_SPREAD else np.nan, depth, service)
