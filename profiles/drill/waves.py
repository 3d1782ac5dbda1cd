"""Weeks to a year: what runs through the simulated thermocline.

Each part gives the displacement of the isotherm, m, positive down, (position, time), at any position. Each is
drawn from its own stream of random numbers, so that changing one leaves the others alone.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import ClassVar

import numpy as np
from numpy.typing import NDArray

from profiles.drill.clock import Clock
from profiles.drill.lines import Lines, degrees_per_day
from profiles.drill.streams import stream

Floats = NDArray[np.float64]


def frequencies(random: np.random.Generator, periods: tuple[float, float], count: int) -> Floats:
    """Draw frequencies, radians per day, between those of two ``periods``, days, short before long."""
    short, long = periods
    return np.asarray(2.0 * np.pi * random.uniform(1.0 / long, 1.0 / short, count))


@dataclass(frozen=True)
class EastwardWaves:
    """Equatorial Kelvin waves: forced in the west, running east at the speed of the first vertical mode."""

    lines: Lines

    BAND, REST = (60.0, 75.0), (30.0, 180.0)  # days; peak (Kessler et al. 1995) and skirt (ours)
    SPEED, SPEED_SD = 2.4, 0.12  # m s-1 (the same; spread ours, altimetry gives 2.26 to 2.82)
    RADIUS = 2.9  # degrees of latitude (sqrt(c/beta), 324 km at 2.4 m s-1)
    FORCED = (145.0, 190.0)  # degrees east between which they grow (Kessler et al. 1995: west of the date line)
    BEFORE = 0.2  # share of the amplitude west of that (ours)
    SD = 7.5  # m where grown (ours)

    @classmethod
    def draw(cls, seed: int) -> EastwardWaves:
        """Draw lines: half of the variance in the band, half in the skirt."""
        random = stream(seed, "eastward waves")
        frequency = np.concatenate([frequencies(random, band, 24) for band in (cls.BAND, cls.REST)])
        speed = degrees_per_day(cls.SPEED + cls.SPEED_SD * random.uniform(-2.0, 2.0, frequency.size))
        return cls(Lines.running(random, frequency, frequency / speed, np.zeros(frequency.size)))

    def displacement(self, latitude: Floats, longitude: Floats, clock: Clock) -> Floats:
        """Return the displacement of the isotherm."""
        growth = np.interp(longitude, [*self.FORCED, 240.0, 280.0], [self.BEFORE, 1.0, 1.0, 0.8])
        shape = self.SD * growth * np.exp(-0.5 * (latitude / self.RADIUS) ** 2)
        return np.asarray(shape[:, None] * self.lines.at(latitude, longitude, clock))


@dataclass(frozen=True)
class WestwardWaves:
    """Long Rossby waves of the first meridional mode: slower, with maxima off the equator."""

    both: Lines
    opposite: Lines

    PERIODS = (100.0, 400.0)  # days (ours)
    SPEED = (0.75, 0.95)  # m s-1 (a third of the Kelvin speed, 0.8-0.9)
    MAXIMUM = 4.0  # degrees of latitude (theory: sqrt(3/2) radii and more)
    SD = 8.0  # m there (ours)

    @classmethod
    def draw(cls, seed: int) -> WestwardWaves:
        """Draw lines of equal sign, and of opposite sign, on both sides of the equator."""
        both, opposite = (cls._lines(seed, name) for name in ("westward waves", "opposite westward waves"))
        return cls(both, opposite)

    @classmethod
    def _lines(cls, seed: int, name: str) -> Lines:
        random = stream(seed, name)
        frequency = frequencies(random, cls.PERIODS, 24)
        speed = degrees_per_day(random.uniform(*cls.SPEED, frequency.size))
        return Lines.running(random, frequency, -frequency / speed, np.zeros(frequency.size))

    def displacement(self, latitude: Floats, longitude: Floats, clock: Clock) -> Floats:
        """Return the displacement of the isotherm."""
        lobe = (latitude / self.MAXIMUM) ** 2 * np.exp(1.0 - (latitude / self.MAXIMUM) ** 2)
        shape = self.SD * lobe * np.interp(longitude, [120.0, 150.0, 250.0, 280.0], [0.7, 1.0, 0.9, 0.4])
        both = self.both.at(latitude, longitude, clock)
        opposite = self.opposite.at(latitude, longitude, clock)
        return np.asarray(shape[:, None] * (0.8 * both + 0.6 * np.sign(latitude)[:, None] * opposite))


@dataclass(frozen=True)
class InstabilityWaves:
    """Tropical instability waves of the east, in the cold season, stronger in cold years.

    ``activity`` (time,), 0 to about 1.5. Common practice, no source: 20 to 40 days, 1000 to 2000 km, westward at
    about 0.5 m s-1, 1N to 5N, June to January.
    """

    lines: Lines
    activity: Floats

    PERIODS = (22.0, 38.0)  # days
    SPEED = (0.42, 0.58)  # m s-1
    SHORTEST = 9.0  # degrees, 1000 km
    NORTH, SOUTH = 2.5, -2.0  # degrees, centres
    WIDTH = 1.8  # degrees, e-folding of their Gaussians
    SOUTHERN_SHARE = 0.35
    SD = 9.0  # m at the northern centre at full activity

    @classmethod
    def draw(cls, clock: Clock, warmth: Floats, seed: int) -> InstabilityWaves:
        """Draw lines; their activity follows the season and the oscillator's ``warmth`` (time,)."""
        random = stream(seed, "instability waves")
        frequency = frequencies(random, cls.PERIODS, 24)
        wavelength = 2.0 * np.pi / frequency * degrees_per_day(random.uniform(*cls.SPEED, frequency.size))
        eastward = -2.0 * np.pi / np.maximum(wavelength, cls.SHORTEST)
        season = np.clip(0.4 + 0.9 * np.cos(2.0 * np.pi * (clock.fraction - 0.76)), 0.0, 1.0)
        lines = Lines.running(random, frequency, eastward, np.zeros(frequency.size))
        return cls(lines, season * (1.0 - 0.5 * np.tanh(warmth)))

    def displacement(self, latitude: Floats, longitude: Floats, clock: Clock) -> Floats:
        """Return the displacement of the isotherm."""
        north = np.exp(-(((latitude - self.NORTH) / self.WIDTH) ** 2))
        south = self.SOUTHERN_SHARE * np.exp(-(((latitude - self.SOUTH) / self.WIDTH) ** 2))
        shape = self.SD * (north + south) * np.interp(longitude, [195.0, 225.0, 255.0, 272.0], [0.0, 1.0, 1.0, 0.1])
        return np.asarray(shape[:, None] * self.activity * self.lines.at(latitude, longitude, clock))


@dataclass(frozen=True)
class Patches:
    """Everything else: eddies of some weeks, and broad patches of some months that no wave above accounts for.

    Covariances are peaked and long-tailed, and both drift west.
    """

    eddies: Lines
    broad: Lines

    # Ours: under two thirds, and over three halves, of the scales of Meyers et al. (1991), 15 and 3 degrees.
    EDDIES: ClassVar[Mapping[str, float]] = {
        "longitude": 7.0,
        "latitude": 1.6,
        "days": 45.0,
        "speed": -0.25,
        "spread": 0.4,
    }
    BROAD: ClassVar[Mapping[str, float]] = {
        "longitude": 26.0,
        "latitude": 5.0,
        "days": 150.0,
        "speed": -0.15,
        "spread": 0.3,
    }
    EDDIES_SD, BROAD_SD = 5.5, 5.0  # m (ours)
    COUNT = 128

    @classmethod
    def draw(cls, seed: int) -> Patches:
        """Draw lines."""
        scales = {"eddies": cls.EDDIES, "broad patches": cls.BROAD}
        return cls(*(Lines.patches(stream(seed, name), cls.COUNT, **numbers) for name, numbers in scales.items()))

    def displacement(self, latitude: Floats, longitude: Floats, clock: Clock) -> Floats:
        """Return the displacement of the isotherm."""
        eddies, broad = (lines.at(latitude, longitude, clock) for lines in (self.eddies, self.broad))
        return np.asarray(self.EDDIES_SD * eddies + self.BROAD_SD * broad)
