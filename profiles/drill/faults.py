"""Faults planted into records on purpose, each written down.

Planting leaves ``time`` alone: it stays the true time of each sample. What the clock made of it is
``delivered_time(time)``, which may repeat itself and run backwards; delivery writers use it, and :func:`as_delivered`
gives the chain that a careful reader would make of such a delivery. Where a mooring went, as reported, is
``delivered_latitude`` and ``delivered_longitude(time)``. Which event stands in which value is ``temperature_fault``
and ``pressure_fault(time, depth)`` and ``time_fault(time)``: the event's number, 0 where none does.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass

import numpy as np
import pandas as pd
import xarray as xr
from numpy.typing import NDArray

from profiles.drill.fault_catalogue import CATALOGUE, Draft, Extent, Fault, Touched
from profiles.errors import DataError, RequestError

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]
Mask = NDArray[np.bool_]
Times = NDArray[np.datetime64]

PRESSURE_DECIMALS = 2  # dbar, to which changed pressures are rounded
_ATTEMPTS = 1000
_CHAIN = ("time", "depth")
#: Variables of a chain that a fault in one of them changes alike.
_TWINS: Mapping[str, tuple[str, ...]] = {
    "temperature": ("temperature", "temperature_raw"),
    "pressure": ("pressure",),
}


@dataclass(frozen=True)
class Event:
    """One planted fault.

    ``number``, from 1, is unique within a mooring. ``name`` is the catalogue's, ``kind`` what a fault list should
    call it, ``variable`` what it is about: temperature, pressure or time. ``depth``, m, is that of the sensor, NaN
    where the event befell several; ``depths`` are always all of them, ascending. ``start`` and ``end`` are the true
    times of the first and the last value that it changed, and ``values`` how many it changed of the variable (of
    time: stamps). ``size`` and its ``unit`` are as the catalogue says; 0 where a size says nothing.
    """

    number: int
    mooring: str
    name: str
    kind: str
    variable: str
    depth: float
    depths: tuple[float, ...]
    start: pd.Timestamp
    end: pd.Timestamp
    size: float
    unit: str
    values: int


def event_table(events: Sequence[Event]) -> pd.DataFrame:
    """Return a row an event, columns as :class:`Event` has them, ``depths`` as text with blanks between."""
    columns = list(Event.__dataclass_fields__)
    rows = [{**vars(event), "depths": " ".join(f"{depth:g}" for depth in event.depths)} for event in events]
    return pd.DataFrame(rows, columns=columns)


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
        With ``temperature`` (time, depth), °C, NaN where missing, and a scalar coordinate ``mooring``. Used where
        there: ``pressure`` (time, depth), dbar; ``deployment`` (time), whose changes no event
        crosses; ``latitude`` and ``longitude``. ``temperature_raw`` becomes the same as ``temperature``.
        What was derived from temperature or pressure is left alone: plant before deriving it. May have been
        planted into before.
    names : sequence of str
        What to plant, one event each, from ``catalogue``.
    random : numpy.random.Generator
        Decides where, when and how large.
    catalogue : mapping, optional
        Faults by name.
    decimals : int, optional
        Resolution to which changed temperatures are rounded.

    Returns
    -------
    tuple
        The chain with the faults, a shallow copy, with the variables that the module's head names; and the events in
        the order of ``names``. Missing values stay missing, except that swapped sensors and repeated blocks move them
        and lost sensors add to them.

    Raises
    ------
    RequestError
        Where ``catalogue`` has no such name, or the chain lacks a temperature or a time.
    DataError
        Where the record has no room left for a fault, or no such sensor.
    """
    _check(chain, names, catalogue)
    draft = _draft(chain)
    last = max(int(mark.max(initial=0)) for mark in draft.marks.values())
    rounding = (decimals, chain["temperature"].dtype)
    events = tuple(
        _planted(draft, name, catalogue[name], number, random, rounding)
        for number, name in enumerate(names, start=last + 1)
    )
    return _written(chain, draft), events


def _check(chain: xr.Dataset, names: Sequence[str], catalogue: Mapping[str, Fault]) -> None:
    unknown = sorted({name for name in names if name not in catalogue})
    if unknown:
        raise RequestError(
            "there is no such fault",
            where="names",
            expected=f"some of {', '.join(catalogue)}",
            found=", ".join(unknown),
        )
    lacking = [name for name in ("temperature", "time", "depth", "mooring") if name not in chain.variables]
    if lacking or not chain["temperature"].size:
        raise RequestError(
            "this is no chain to plant faults into",
            where="chain",
            expected="temperature on (time, depth), at least one value, and a mooring's name",
            found=f"without {', '.join(lacking)}" if lacking else "no value",
        )


def _draft(chain: xr.Dataset) -> Draft:
    temperature = chain["temperature"].transpose(*_CHAIN).values.astype(np.float64)
    times = chain["time"].values
    deployment = chain["deployment"].values if "deployment" in chain else np.zeros(times.size)
    marks: dict[Touched, Integers] = {
        "temperature": _mark(chain, "temperature_fault", temperature.shape),
        "pressure": _mark(chain, "pressure_fault", temperature.shape),
        "time": np.repeat(_mark(chain, "time_fault", (times.size,))[:, None], chain.sizes["depth"], axis=1),
    }
    return Draft(
        mooring=str(chain["mooring"].item()),
        times=times,
        days=(times - times[0]) / np.timedelta64(1, "D"),
        deployment=deployment.astype(np.int64),
        depths=chain["depth"].values.astype(np.float64),
        temperature=temperature,
        pressure=_array(chain, "pressure", temperature.shape),
        stamps=delivered_time(chain).copy(),
        latitude=_reported(chain, "latitude"),
        longitude=_reported(chain, "longitude"),
        marks=marks,
        taken={touched: _lasting(mark) for touched, mark in marks.items()},
    )


def _lasting(mark: Integers) -> Mask:
    """Return where the events of a mark last, (time, depth): from their first to their last value at any sensor."""
    taken = np.zeros(mark.shape, dtype=np.bool_)
    for number in np.unique(mark[mark > 0]):
        rows, sensors = np.nonzero(mark == number)
        taken[rows.min() : rows.max() + 1, sensors] = True
    return taken


def _array(chain: xr.Dataset, name: str, shape: tuple[int, ...]) -> Floats:
    return chain[name].transpose(*_CHAIN).values.astype(np.float64) if name in chain else np.full(shape, np.nan)


def _mark(chain: xr.Dataset, name: str, shape: tuple[int, ...]) -> Integers:
    if name not in chain:
        return np.zeros(shape, dtype=np.int64)
    return chain[name].transpose(*_CHAIN[: len(shape)]).values.astype(np.int64)


def _reported(chain: xr.Dataset, name: str) -> Floats:
    """Return the delivered position, (time,): the nominal one where nothing else was reported, NaN if unknown."""
    held = next((key for key in (f"delivered_{name}", name) if key in chain.variables), None)
    value = np.nan if held is None else chain[held].values.astype(np.float64)
    return np.broadcast_to(value, (chain.sizes["time"],)).copy()


# ------------------------------------------------------------------------------------------------------------
# Where


def _span(draft: Draft, fault: Fault, start: int, random: np.random.Generator) -> int:
    """Return where a stretch from ``start`` stops; past the record's end where that is too soon."""
    if fault.samples is not None:
        return start + int(random.integers(fault.samples[0], fault.samples[1] + 1))
    end = draft.days[start] + random.integers(int(fault.days[0]), int(fault.days[1]) + 1)
    spacing = (draft.days[-1] - draft.days[0]) / max(draft.days.size - 1, 1)
    if end > draft.days[-1] + max(spacing, np.finfo(float).eps):
        return draft.days.size + 1
    return int(np.searchsorted(draft.days, end - 1e-9))


def _deployments(draft: Draft) -> list[tuple[int, int]]:
    """Return the rows, from and to before, of each deployment that has values, from its first to its last."""
    changes = np.flatnonzero(np.diff(draft.deployment)) + 1
    bounds = zip([0, *changes], [*changes, draft.days.size], strict=True)
    held = np.asarray(np.isfinite(draft.temperature).any(axis=1))
    filled = [start + np.flatnonzero(held[start:stop]) for start, stop in bounds]
    return [(int(rows[0]), int(rows[-1]) + 1) for rows in filled if rows.size]


def _stretch(draft: Draft, fault: Fault, bounds: tuple[int, int], random: np.random.Generator) -> slice:
    start = int(random.integers(*bounds))
    return slice(start, _span(draft, fault, start, random))


def _rest(draft: Draft, fault: Fault, bounds: tuple[int, int], random: np.random.Generator) -> slice:
    return slice(int(random.integers(*bounds)), bounds[1])


def _whole(draft: Draft, fault: Fault, bounds: tuple[int, int], random: np.random.Generator) -> slice:
    return slice(*bounds)


def _edge(draft: Draft, fault: Fault, bounds: tuple[int, int], random: np.random.Generator) -> slice:
    length = random.integers(int(fault.days[0]), int(fault.days[1]) + 1)
    days = draft.days[slice(*bounds)]
    if random.random() < 0.5:
        return slice(bounds[0], bounds[0] + int(np.searchsorted(days, days[0] + length - 1e-9)))
    return slice(bounds[0] + int(np.searchsorted(days, days[-1] - length + 1e-9)), bounds[1])


_EXTENTS: Mapping[Extent, Callable[[Draft, Fault, tuple[int, int], np.random.Generator], slice]] = {
    "stretch": _stretch,
    "rest": _rest,
    "whole": _whole,
    "edge": _edge,
}


def _fits(draft: Draft, fault: Fault, rows: slice, sensors: Integers, bounds: tuple[int, int]) -> bool:
    """Return whether the rows are of one deployment, long enough, free, and hold enough values."""
    if not sensors.size or rows.stop > bounds[1] or rows.stop <= rows.start:
        return False
    if fault.samples is None and not fault.days[0] <= _length(draft, rows) <= fault.days[1]:
        return False
    # One sample on either side is kept free, so that two events never touch.
    around = slice(max(rows.start - 1, 0), rows.stop + 1)
    if any(draft.taken[touched][around, sensors].any() for touched in fault.touches):
        return False
    values = draft.pressure if fault.touches[0] == "pressure" else draft.temperature
    held = np.isfinite(values[rows, sensors])
    return bool(held[0].any() and held[-1].any() and held.mean() >= fault.least_share)


def _length(draft: Draft, rows: slice) -> float:
    """Return how many days the samples stand for."""
    spacing = (draft.days[-1] - draft.days[0]) / max(draft.days.size - 1, 1)
    return float(round(draft.days[rows.stop - 1] - draft.days[rows.start] + spacing, 6))


# ------------------------------------------------------------------------------------------------------------
# What


def _planted(
    draft: Draft,
    name: str,
    fault: Fault,
    number: int,
    random: np.random.Generator,
    rounding: tuple[int, np.dtype],
) -> Event:
    """Plant one fault where it fits and changes something; return what happened."""
    deployments = _deployments(draft)
    for _ in range(_ATTEMPTS if deployments else 0):
        bounds = deployments[int(random.integers(len(deployments)))]
        size = fault.draw_size(random)
        rows, sensors = _EXTENTS[fault.extent](draft, fault, bounds, random), fault.sensors(draft, size, random)
        if not _fits(draft, fault, rows, sensors, bounds):
            continue
        changed = _changed(draft, fault, rows, sensors, size, random, rounding)
        if changed[fault.touches[0]].any():
            for touched in fault.touches:
                draft.marks[touched][rows][changed[touched]] = number
                draft.taken[touched][rows, sensors] = True
            return _event(draft, name, fault, number, rows, size, changed)
    raise DataError(
        f"the record has no room for another fault: {name}",
        where=draft.mooring,
        expected=_expectation(fault),
        found=f"none in {_ATTEMPTS} attempts" if deployments else "no value at all",
        advice="plant fewer or shorter faults, or use a longer record",
    )


def _expectation(fault: Fault) -> str:
    if fault.samples is not None:
        length = f"{fault.samples[0]} to {fault.samples[1]} samples"
    else:
        length = (
            f"at least {fault.days[0]:g} days" if np.isinf(fault.days[1]) else "{:g} to {:g} days".format(*fault.days)
        )
    return f"{length} of one deployment, free of other faults, {fault.least_share:.0%} of it with {fault.touches[0]}"


def _changed(
    draft: Draft,
    fault: Fault,
    rows: slice,
    sensors: Integers,
    size: float,
    random: np.random.Generator,
    rounding: tuple[int, np.dtype],
) -> dict[Touched, Mask]:
    """Let the fault act on the draft; return which values within the rows it changed, (time, depth).

    Where it changes nothing of what it is about (a sensor moved past the end of its chain), nothing is changed at all.
    """
    decimals, dtype = rounding
    temperature, pressure, stamps = (
        draft.temperature[rows].copy(),
        draft.pressure[rows].copy(),
        draft.stamps[rows].copy(),
    )
    fault.act(draft, rows, sensors, size, random)
    draft.temperature[rows] = _rounded(temperature, draft.temperature[rows], decimals, dtype)
    draft.pressure[rows] = _rounded(pressure, draft.pressure[rows], PRESSURE_DECIMALS, dtype)
    late = np.repeat((draft.stamps[rows] != stamps)[:, None], draft.depths.size, axis=1)
    changed: dict[Touched, Mask] = {
        "temperature": ~_same(temperature, draft.temperature[rows]),
        "pressure": ~_same(pressure, draft.pressure[rows]),
        "time": late,
    }
    if not changed[fault.touches[0]].any():
        draft.temperature[rows], draft.pressure[rows], draft.stamps[rows] = temperature, pressure, stamps
    return changed


def _same(before: Floats, after: Floats) -> Mask:
    return np.asarray((before == after) | (np.isnan(before) & np.isnan(after)))


def _rounded(before: Floats, after: Floats, decimals: int, dtype: np.dtype) -> Floats:
    """Return ``after`` with what differs rounded, and as it will be stored."""
    stored = after.round(decimals).astype(dtype).astype(np.float64)
    return np.where(_same(before, after), before, stored)


def _event(
    draft: Draft, name: str, fault: Fault, number: int, rows: slice, size: float, changed: Mapping[Touched, Mask]
) -> Event:
    anywhere = np.logical_or.reduce(list(changed.values()))
    when = rows.start + np.flatnonzero(anywhere.any(axis=1))
    depths = tuple(float(depth) for depth in draft.depths[anywhere.any(axis=0)])
    about = fault.touches[0]
    counted = changed[about][:, 0] if about == "time" else changed[about]
    return Event(
        number=number,
        mooring=draft.mooring,
        name=name,
        kind=fault.kind,
        variable=about,
        depth=depths[0] if len(depths) == 1 else np.nan,
        depths=depths,
        start=pd.Timestamp(draft.times[when[0]]),
        end=pd.Timestamp(draft.times[when[-1]]),
        size=size,
        unit=fault.unit,
        values=int(counted.sum()),
    )


# ------------------------------------------------------------------------------------------------------------
# Back to a chain


def _written(chain: xr.Dataset, draft: Draft) -> xr.Dataset:
    planted = chain.copy(deep=False)
    for name, values in (("temperature", draft.temperature), ("pressure", draft.pressure)):
        for twin in _TWINS[name]:
            if twin in chain:
                held = chain[name].transpose(*_CHAIN)
                planted[twin] = held.copy(data=values.astype(held.dtype))
    planted["temperature_fault"] = _marked(draft.marks["temperature"], "temperature")
    if "pressure" in chain:
        planted["pressure_fault"] = _marked(draft.marks["pressure"], "pressure")
    if (draft.stamps != draft.times).any():
        planted["delivered_time"] = ("time", draft.stamps, {"long_name": "time as delivered, UTC"})
        planted["time_fault"] = _marked(draft.marks["time"][:, 0], "time")
    for name, reported in (("latitude", draft.latitude), ("longitude", draft.longitude)):
        if name in chain.variables and (reported != chain[name].values).any():
            attributes = {"long_name": f"{name} as reported", "units": chain[name].attrs.get("units", "degrees")}
            planted[f"delivered_{name}"] = ("time", reported, attributes)
    return planted


def _marked(mark: Integers, about: str) -> xr.DataArray:
    attributes = {"long_name": f"number of the planted event that stands in {about}, 0 where none does"}
    return xr.DataArray(mark.astype(np.int16), dims=_CHAIN[: mark.ndim], attrs=attributes)


def delivered_time(chain: xr.Dataset) -> Times:
    """Return the stamps under which a chain's values are delivered, (time,)."""
    return np.asarray(chain["delivered_time" if "delivered_time" in chain else "time"].values)


def as_delivered(chain: xr.Dataset) -> xr.Dataset:
    """Return the chain that a careful reader would make of a planted chain's delivery.

    Parameters
    ----------
    chain : xarray.Dataset
        As :func:`plant` returns it.

    Returns
    -------
    xarray.Dataset
        ``time`` is the delivered one, strictly increasing: values are put in its order, and of those of one stamp the
        first is kept. ``true_time`` (time) says when they were measured. Without a clock fault the chain as it is.
    """
    if "delivered_time" not in chain:
        return chain
    _, first = np.unique(chain["delivered_time"].values, return_index=True)
    kept = chain.isel(time=first)
    truth = ("time", kept["time"].values, {"long_name": "true time of the sample, UTC"})
    return (
        kept.assign_coords(time=("time", kept["delivered_time"].values, chain["time"].attrs))
        .assign(true_time=truth)
        .drop_vars("delivered_time")
    )
