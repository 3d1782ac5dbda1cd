"""Every kind of fault that can be planted: what it does, where and how long it may stand, how large it is."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from profiles.drill import fault_kernels as kernels

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]
Mask = NDArray[np.bool_]
Times = NDArray[np.datetime64]

DBAR_PER_METRE = 1.0064  # 300 dbar are 298.1 m at the equator (TEOS-10)
FOULING_DEPTH = 100.0  # m; things grow where there is light (from memory)

Touched = Literal["temperature", "pressure", "time"]
Extent = Literal["stretch", "rest", "whole", "edge"]


@dataclass
class Draft:
    """A chain's arrays, to be written into.

    ``times``, ``days``, ``deployment`` and the delivered ``stamps``, ``latitude``, ``longitude`` are (time,);
    ``depths`` (depth,); ``temperature``, °C, and ``pressure``, dbar, (time, depth), all NaN where there is none.
    ``marks`` holds the number of the event that stands in each value, 0 where none does; ``taken`` says where an
    event lasts, whether it changed the value or not.
    """

    mooring: str
    times: Times
    days: Floats
    deployment: Integers
    depths: Floats
    temperature: Floats
    pressure: Floats
    stamps: Times
    latitude: Floats
    longitude: Floats
    marks: dict[Touched, Integers]
    taken: dict[Touched, Mask]


#: Writes a fault into a draft: draft, rows, places of the sensors, size, random numbers.
Action = Callable[[Draft, slice, Integers, float, np.random.Generator], None]
#: Chooses sensors: draft, size, random numbers -> places, ascending; none where the mooring has no such sensor.
Picker = Callable[[Draft, float, np.random.Generator], Integers]

SensorKernel = Callable[[Floats, Floats, float], Floats]
ProfileKernel = Callable[[Floats, Floats, Floats, float, np.random.Generator], Floats]
DepthKernel = Callable[[Floats, Floats, float], Floats]
ClockKernel = Callable[[Times, Floats, float], Times]


# ------------------------------------------------------------------------------------------------------------
# From a kernel to an action


def _since(draft: Draft, rows: slice) -> Floats:
    return np.asarray(draft.days[rows] - draft.days[rows.start])


def _by_sensor(kernel: SensorKernel, values: Floats, since: Floats, sensors: Integers, size: float) -> None:
    for sensor in sensors:
        good = np.isfinite(values[:, sensor])
        if good.any():
            values[good, sensor] = kernel(values[good, sensor], since[good], size)


def on_temperature(kernel: SensorKernel) -> Action:
    """Return what changes the temperatures of each chosen sensor for itself."""

    def act(draft: Draft, rows: slice, sensors: Integers, size: float, random: np.random.Generator) -> None:
        _by_sensor(kernel, draft.temperature[rows], _since(draft, rows), sensors, size)

    return act


def on_pressure(kernel: SensorKernel) -> Action:
    """Return what changes the pressures of each chosen sensor for itself."""

    def act(draft: Draft, rows: slice, sensors: Integers, size: float, random: np.random.Generator) -> None:
        _by_sensor(kernel, draft.pressure[rows], _since(draft, rows), sensors, size)

    return act


def on_profile(kernel: ProfileKernel) -> Action:
    """Return what changes the temperatures of the chosen sensors together."""

    def act(draft: Draft, rows: slice, sensors: Integers, size: float, random: np.random.Generator) -> None:
        values, depths = draft.temperature[rows, sensors], draft.depths[sensors]
        draft.temperature[rows, sensors] = kernel(values, _since(draft, rows), depths, size, random)

    return act


def on_depth(kernel: DepthKernel) -> Action:
    """Return what moves the chosen sensors; they read what the chain has there, and their pressure follows."""

    def act(draft: Draft, rows: slice, sensors: Integers, size: float, random: np.random.Generator) -> None:
        deeper = kernel(_since(draft, rows), draft.depths, size)
        moved = kernels.at_depths(draft.temperature[rows], draft.depths, draft.depths + deeper)
        draft.temperature[rows, sensors] = moved[:, sensors]
        draft.pressure[rows, sensors] += DBAR_PER_METRE * deeper[:, sensors]

    return act


def on_clock(kernel: ClockKernel) -> Action:
    """Return what changes the stamps under which values are delivered."""

    def act(draft: Draft, rows: slice, sensors: Integers, size: float, random: np.random.Generator) -> None:
        draft.stamps[rows] = kernel(draft.stamps[rows], _since(draft, rows), size)

    return act


def _goes_adrift(draft: Draft, rows: slice, sensors: Integers, size: float, random: np.random.Generator) -> None:
    """All depths change together and the reported position leaves, on a straight course drawn at random."""
    on_profile(kernels.adrift)(draft, rows, sensors, size, random)
    course = random.uniform(0.0, 2.0 * np.pi)
    way = kernels.ADRIFT_SPEED * _since(draft, rows)
    draft.latitude[rows] += (way * np.sin(course)).round(4)
    draft.longitude[rows] += (way * np.cos(course)).round(4)


# ------------------------------------------------------------------------------------------------------------
# Which sensors


def one(draft: Draft, size: float, random: np.random.Generator) -> Integers:
    """Return any one."""
    return _one_of(np.arange(draft.depths.size), random)


def one_in_the_light(draft: Draft, size: float, random: np.random.Generator) -> Integers:
    """Return one no deeper than :data:`FOULING_DEPTH`."""
    return _one_of(np.flatnonzero(draft.depths <= FOULING_DEPTH), random)


def one_with_pressure(draft: Draft, size: float, random: np.random.Generator) -> Integers:
    """Return one that has pressure."""
    return _one_of(np.flatnonzero(np.isfinite(draft.pressure).any(axis=0)), random)


def neighbours(draft: Draft, size: float, random: np.random.Generator) -> Integers:
    """Return two that are ``size`` places apart."""
    first = _one_of(np.arange(draft.depths.size - int(size)), random)
    return np.concatenate([first, first + int(size)])


def uppermost(draft: Draft, size: float, random: np.random.Generator) -> Integers:
    """Return the ``size`` shallowest, at least one fewer than all."""
    return np.arange(min(int(size), draft.depths.size - 1))


def every(draft: Draft, size: float, random: np.random.Generator) -> Integers:
    """Return all."""
    return np.arange(draft.depths.size)


def _one_of(places: Integers, random: np.random.Generator) -> Integers:
    return random.choice(places, 1) if places.size else places


# ------------------------------------------------------------------------------------------------------------
# The catalogue


@dataclass(frozen=True)
class Fault:
    """One way to fail.

    Parameters
    ----------
    kind : str
        What a fault list should call it.
    act : callable
        What it does.
    days : tuple of float
        The least and the most that an event lasts.
    sizes : tuple of float
        What to choose a size from; or
    span : tuple of float
        the least and the most of a size, of either sign unless ``one_sided``.
    unit : str
        Of the size; "" where a size says nothing.
    sensors : callable
        Which it befalls.
    extent : str
        Where it stands within a deployment: a "stretch" of it, the "rest" from an onset to its end, the "whole", or
        the "edge", its first or its last days. A chain without ``deployment`` is one deployment.
    touches : tuple of str
        What it may change: temperature, pressure, time; the first is what it is about.
    samples : tuple of int, optional
        The least and the most that a stretch holds, instead of ``days``.
    least_share : float
        Of the values within an event that must be there.
    """

    kind: str
    act: Action
    days: tuple[float, float] = (0.0, np.inf)
    sizes: tuple[float, ...] = (0.0,)
    span: tuple[float, float] | None = None
    one_sided: bool = False
    unit: str = "degree_Celsius"
    sensors: Picker = one
    extent: Extent = "stretch"
    touches: tuple[Touched, ...] = ("temperature",)
    samples: tuple[int, int] | None = None
    least_share: float = 0.9

    def draw_size(self, random: np.random.Generator) -> float:
        """Return a size, to 0.001."""
        if self.span is None:
            return float(random.choice(self.sizes))
        sign = 1.0 if self.one_sided else random.choice([-1.0, 1.0])
        return round(float(sign * random.uniform(*self.span)), 3)


_SENSOR_AND_PRESSURE: tuple[Touched, ...] = ("temperature", "pressure")

#: What can be planted, by name. Durations and sizes are ours; the kinds are those that deliveries show (from memory).
CATALOGUE: Mapping[str, Fault] = {
    # One sensor's temperature
    "spike": Fault("spike", on_temperature(kernels.added), samples=(1, 1), span=(3.0, 12.0)),
    "stuck value": Fault("stuck", on_temperature(kernels.stuck), days=(8, 60), unit=""),
    "fill value": Fault(
        "out of range", on_temperature(kernels.filled), days=(1, 20), sizes=(-9.999, -99.0, 99.99, 1e35)
    ),
    # 2**13 and 2**14 counts of 0.001 °C
    "digit rollover": Fault("rollover", on_temperature(kernels.rolled_over), days=(5, 90), sizes=(8.192, 16.384)),
    "flooded sensor": Fault("out of range", on_temperature(kernels.flooded), days=(20, 90), sizes=(-5.0, 45.0)),
    "offset": Fault("offset", on_temperature(kernels.added), days=(60, 240), span=(0.5, 3.0)),
    "calibration error": Fault(
        "offset", on_temperature(kernels.added), days=(60, np.inf), span=(0.2, 1.5), extent="whole", least_share=0.5
    ),
    "drift": Fault("drift", on_temperature(kernels.drifted), days=(100, 350), span=(0.5, 3.0), extent="rest"),
    "bio-fouling": Fault(
        "drift",
        on_temperature(kernels.fouled),
        days=(100, 400),
        span=(0.02, 0.1),
        sensors=one_in_the_light,
        extent="rest",
    ),
    "wrong nominal depth": Fault(
        "wrong depth",
        on_depth(kernels.elsewhere),
        days=(60, np.inf),
        span=(5.0, 25.0),
        unit="m",
        extent="whole",
        touches=_SENSOR_AND_PRESSURE,
        least_share=0.5,
    ),
    # Pressure
    "pressure offset": Fault(
        "pressure offset",
        on_pressure(kernels.added),
        days=(30, 350),
        span=(2.0, 27.0),
        unit="dbar",
        sensors=one_with_pressure,
        extent="rest",
        touches=("pressure",),
    ),
    "pressure failure": Fault(
        "pressure failure",
        on_pressure(kernels.flooded),
        days=(20, 350),
        sizes=(-15.0, 1100.0),
        unit="dbar",
        sensors=one_with_pressure,
        extent="rest",
        touches=("pressure",),
    ),
    # Several sensors
    "swapped sensors": Fault(
        "swapped",
        on_profile(kernels.swapped),
        days=(60, np.inf),
        sizes=(1.0, 2.0),
        unit="places",
        sensors=neighbours,
        extent="whole",
        least_share=0.5,
    ),
    "lost upper sensors": Fault(
        "lost",
        on_profile(kernels.lost),
        days=(20, 300),
        sizes=(2.0, 3.0, 4.0, 5.0),
        unit="sensors",
        sensors=uppermost,
        extent="rest",
        least_share=0.5,
    ),
    "mooring adrift": Fault(
        "adrift", _goes_adrift, days=(10, 90), span=(1.0, 4.0), sensors=every, extent="rest", least_share=0.5
    ),
    "on deck": Fault(
        "in air",
        on_profile(kernels.in_air),
        days=(1, 4),
        span=(23.0, 31.0),
        one_sided=True,
        sensors=every,
        extent="edge",
        least_share=0.5,
    ),
    "knock-down": Fault(
        "knock-down",
        on_depth(kernels.knocked_down),
        days=(3, 20),
        span=(15.0, 60.0),
        one_sided=True,
        unit="m",
        sensors=every,
        touches=_SENSOR_AND_PRESSURE,
        least_share=0.5,
    ),
    "part of the day": Fault(
        "noisy",
        on_profile(kernels.part_of_day),
        days=(20, 120),
        span=(4.0, 10.0),
        one_sided=True,
        unit="m",
        sensors=every,
        least_share=0.5,
    ),
    "repeated block": Fault(
        "repeated", on_profile(kernels.repeated), days=(4, 20), unit="", sensors=every, least_share=0.5
    ),
    # The clock
    "clock offset": Fault(
        "clock offset",
        on_clock(kernels.clock_wrong),
        days=(30, np.inf),
        span=(1.0, 26.0),
        unit="hours",
        sensors=every,
        extent="whole",
        touches=("time",),
        least_share=0.3,
    ),
    "clock drift": Fault(
        "clock drift",
        on_clock(kernels.clock_drifted),
        days=(60, np.inf),
        span=(0.5, 6.0),
        unit="hours",
        sensors=every,
        extent="whole",
        touches=("time",),
        least_share=0.3,
    ),
    "duplicated timestamps": Fault(
        "repeated time",
        on_clock(kernels.stamp_repeated),
        samples=(2, 5),
        unit="",
        sensors=every,
        touches=("time",),
        least_share=0.5,
    ),
}
