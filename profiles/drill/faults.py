"""Faults planted into records on purpose, each written down."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass

import numpy as np
import pandas as pd
import xarray as xr
from numpy.typing import NDArray

from profiles.errors import DataError

Floats = NDArray[np.float64]

#: A fault's kernel: good values (value,), days since its start (value,), its size -> what is delivered
#: instead.
Kernel = Callable[[Floats, Floats, float], Floats]

FLOODING_DAYS = 4.0  # e-folding time of a flooding sensor's way to its extreme (ours)
_ATTEMPTS = 500
_LEAST_SHARE = 0.9  # of an event's samples hold a value


def _added(values: Floats, since: Floats, size: float) -> Floats:
    return values + size


def _stuck(values: Floats, since: Floats, size: float) -> Floats:
    return np.full(values.shape, values[0])


def _filled(values: Floats, since: Floats, size: float) -> Floats:
    return np.full(values.shape, size)


def _flooded(values: Floats, since: Floats, size: float) -> Floats:
    return np.asarray(size + (values - size) * np.exp(-(since + 1.0) / FLOODING_DAYS))


def _drifted(values: Floats, since: Floats, size: float) -> Floats:
    return np.asarray(values + size * (since + 1.0) / (since[-1] + 1.0))


@dataclass(frozen=True)
class Fault:
    """One way to fail.

    ``kind`` is what a fault list should call it; ``days`` the least and the most that an event lasts;
    ``sizes`` the values to choose from, or ``span`` the least and the most of a size of either sign. What
    size means: °C added (spike, offset), °C reached at the end (drift), the value that stands instead or is
    neared (out of range), none (stuck value).
    """

    kind: str
    kernel: Kernel
    days: tuple[int, int]
    sizes: tuple[float, ...] = ()
    span: tuple[float, float] | None = None

    def draw_size(self, random: np.random.Generator) -> float:
        """Return a size, °C, to 0.001."""
        if self.span is None:
            return float(random.choice(self.sizes))
        return round(float(random.choice([-1.0, 1.0]) * random.uniform(*self.span)), 3)

    def draw_days(self, random: np.random.Generator) -> int:
        """Return how many days an event lasts."""
        return int(random.integers(self.days[0], self.days[1] + 1))


#: What can be planted, by name (durations and sizes are ours).
CATALOGUE: Mapping[str, Fault] = {
    "spike": Fault("spike", _added, (1, 1), span=(3.0, 12.0)),
    "stuck value": Fault("stuck_value", _stuck, (8, 60), sizes=(0.0,)),
    "fill value": Fault("out_of_range", _filled, (1, 20), sizes=(-9.999, 99.99)),
    "flooded sensor": Fault("out_of_range", _flooded, (20, 90), sizes=(-5.0, 45.0)),
    "offset": Fault("offset", _added, (60, 240), span=(0.5, 3.0)),
    "drift": Fault("drift", _drifted, (150, 350), span=(0.5, 3.0)),
}


@dataclass(frozen=True)
class Event:
    """One planted fault: ``size`` as in :class:`Fault`, ``values`` how many values stand in it.

    The event of a stuck value starts with the genuine value that is then repeated.
    """

    mooring: str
    depth: float
    kind: str
    start: pd.Timestamp
    end: pd.Timestamp
    size: float
    values: int


def plant(
    chain: xr.Dataset,
    names: Sequence[str],
    random: np.random.Generator,
    *,
    catalogue: Mapping[str, Fault] = CATALOGUE,
    decimals: int = 3,
) -> tuple[xr.Dataset, tuple[Event, ...]]:
    """Plant faults into a chain, no two within a sensor's same days.

    Parameters
    ----------
    chain : xarray.Dataset
        With ``temperature`` (time, depth), °C, NaN where missing, and a scalar coordinate ``mooring``.
        ``temperature_raw``, where there is one, becomes the same.
    names : sequence of str
        What to plant, one event each, from ``catalogue``.
    random : numpy.random.Generator
        Decides where, when and how large.
    catalogue : mapping, optional
        Faults by name.
    decimals : int, optional
        Resolution to which changed values are rounded.

    Returns
    -------
    tuple
        The chain with the faults, a shallow copy, and the events in the order of ``names``. Missing values
        stay missing; an event starts and ends on a value.

    Raises
    ------
    DataError
        Where the record has no room left for a fault.
    """
    temperature = chain["temperature"].transpose("time", "depth")
    values = temperature.values.astype(np.float64)
    days = (chain["time"].values - chain["time"].values[0]) / np.timedelta64(1, "D")
    good, taken = np.isfinite(values), np.zeros(values.shape, dtype=np.bool_)
    events = []
    for name in names:
        fault = catalogue[name]
        places, sensor = _find_room(good, taken, days, fault, random, str(chain["mooring"].item()))
        size = fault.draw_size(random)
        since = days[places] - days[places[0]]
        values[places, sensor] = fault.kernel(values[places, sensor], since, size).round(decimals)
        # One sample on either side is kept free, so that two events never touch.
        taken[max(places[0] - 1, 0) : places[-1] + 2, sensor] = True
        events.append(_event(chain, fault, places, sensor, size))
    planted = temperature.copy(data=values.astype(temperature.dtype))
    changed = {name: planted for name in ("temperature", "temperature_raw") if name in chain}
    return chain.assign(changed), tuple(events)


def _find_room(
    good: NDArray[np.bool_],
    taken: NDArray[np.bool_],
    days: Floats,
    fault: Fault,
    random: np.random.Generator,
    mooring: str,
) -> tuple[NDArray[np.intp], int]:
    """Return the samples, each with a value, and the sensor of an event that fits."""
    for _ in range(_ATTEMPTS):
        sensor, start = int(random.integers(good.shape[1])), int(random.integers(good.shape[0]))
        end = days[start] + fault.draw_days(random)
        stop = int(np.searchsorted(days, end))
        inside = good[start:stop, sensor]
        whole = end <= days[-1] + 1.0 and inside[0] and inside[-1] and not taken[start:stop, sensor].any()
        if whole and inside.mean() >= _LEAST_SHARE:
            return start + np.flatnonzero(inside), sensor
    raise DataError(
        "the record has no room for another fault",
        where=mooring,
        expected=f"a stretch of {fault.days[0]} to {fault.days[1]} days, nine tenths of it with good values",
        found=f"none in {_ATTEMPTS} attempts",
        advice="plant fewer or shorter faults, or use a longer record",
    )


def _event(chain: xr.Dataset, fault: Fault, places: NDArray[np.intp], sensor: int, size: float) -> Event:
    time = pd.DatetimeIndex(chain["time"].values)
    return Event(
        mooring=str(chain["mooring"].item()),
        depth=float(chain["depth"].values[sensor]),
        kind=fault.kind,
        start=time[places[0]],
        end=time[places[-1]],
        size=size,
        values=places.size,
    )
