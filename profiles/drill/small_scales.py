"""Hours to days: internal waves, the internal tide and the fine structure of one water column."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from profiles.drill.clock import Clock
from profiles.drill.lines import Lines
from profiles.drill.streams import stream

Floats = NDArray[np.float64]

TIDES = (0.5175, 0.5)  # days, M2 and S2 (12.4206 and 12 h)


@dataclass(frozen=True)
class InternalWaves:
    """Displacements of the isotherm by waves of days, by the internal tide and by the continuum above it.

    A daily mean keeps nearly all of the first and a few per cent of the others.
    """

    days: Lines
    tide: Lines
    continuum: Lines

    DAYS_SD, TIDE_SD, CONTINUUM_SD = 2.5, 2.5, 3.0  # m (ours; a daily mean keeps 2 m)
    PERIODS = (3.0, 15.0)  # days (common practice, no source: inertia-gravity waves of 3 to 5 days and more)
    CONTINUUM = (0.02, 1.0)  # days; spectrum falling with the square of the frequency (Garrett and Munk, from memory)
    WAVELENGTHS = ((2.0, 8.0), (1.2, 1.4), (0.1, 1.0))  # degrees, of the three (ours; tide: mode 1, from memory)

    @classmethod
    def draw(cls, seed: int) -> InternalWaves:
        """Draw lines running in all directions."""
        random = stream(seed, "internal waves")
        short, long = cls.PERIODS
        days = 2.0 * np.pi / np.exp(random.uniform(np.log(short), np.log(long), 32))
        fast, slow = (2.0 * np.pi / period for period in cls.CONTINUUM)
        share = random.uniform(0.0, 1.0, 96)
        # Equal amplitudes: the density of lines is the spectrum.
        continuum = 1.0 / ((1.0 - share) / slow + share / fast)
        tide = 2.0 * np.pi / np.repeat(TIDES, (6, 3))
        groups = zip((days, tide, continuum), cls.WAVELENGTHS, strict=True)
        return cls(*(_in_all_directions(random, frequency, wavelengths) for frequency, wavelengths in groups))

    def displacement(self, latitude: Floats, longitude: Floats, clock: Clock) -> Floats:
        """Return the displacement, m, positive down, (position, time)."""
        parts = ((self.days, self.DAYS_SD), (self.tide, self.TIDE_SD), (self.continuum, self.CONTINUUM_SD))
        return np.asarray(sum(size * lines.at(latitude, longitude, clock) for lines, size in parts))


def _in_all_directions(random: np.random.Generator, frequency: Floats, wavelengths: tuple[float, float]) -> Lines:
    direction = random.uniform(0.0, 2.0 * np.pi, frequency.size)
    number = 2.0 * np.pi / random.uniform(*wavelengths, frequency.size)
    return Lines.running(random, frequency, number * np.cos(direction), number * np.sin(direction))


@dataclass(frozen=True)
class FineStructure:
    """Steps in a column: it is strained by sines of depth, each array (position, sine).

    The displacement at z is ``sum height sin(number z + phase - frequency t)``. ``height`` times ``number`` sums
    to less than 1, so that no column is turned over.
    """

    height: Floats  # m
    number: Floats  # radians per m
    phase: Floats
    frequency: Floats  # radians per day

    WAVELENGTHS = (10.0, 40.0)  # m: steps of 5 to 20 m
    STRAIN = 0.85  # the largest; its rms is 0.85 / sqrt(2 * SINES) = 0.35
    SINES = 3
    DAYS = (15.0, 60.0)  # days in which a sine runs through its wavelength: a step stays for days (ours)

    @classmethod
    def draw(cls, latitude: Floats, longitude: Floats, seed: int) -> FineStructure:
        """Draw the sines of each position from its own stream."""
        rows = [
            _sines(stream(seed, "fine structure", f"{y:.3f} {x:.3f}")) for y, x in zip(latitude, longitude, strict=True)
        ]
        return cls(*(np.ascontiguousarray(part) for part in np.stack(rows, axis=1)))

    @classmethod
    def none(cls, positions: int) -> FineStructure:
        """Return columns without steps."""
        return cls(*np.zeros((4, positions, 0)))


def _sines(random: np.random.Generator) -> Floats:
    """Return height, number, phase and frequency, (4, sine)."""
    short, long = FineStructure.WAVELENGTHS
    count = FineStructure.SINES
    number = 2.0 * np.pi / np.exp(random.uniform(np.log(short), np.log(long), count))
    phase = random.uniform(0.0, 2.0 * np.pi, count)
    fast, slow = FineStructure.DAYS
    frequency = 2.0 * np.pi / random.uniform(fast, slow, count) * random.choice([-1.0, 1.0], count)
    return np.stack([FineStructure.STRAIN / count / number, number, phase, frequency])
