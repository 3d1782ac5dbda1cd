"""Random fields made of lines: plane waves whose state is known at any position and any time.

A mean over an interval is exact: each line is damped by the sinc of its own phase.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from profiles.drill.clock import Clock
from profiles.drill.sphere import METRES_PER_DEGREE

Floats = NDArray[np.float64]

DAY = 86_400.0  # s


def degrees_per_day(speed: float | Floats) -> Floats:
    """Return a ``speed``, m s-1, in degrees of longitude on the equator per day."""
    return np.asarray(speed * DAY / METRES_PER_DEGREE)


@dataclass(frozen=True)
class Lines:
    """Plane waves ``amplitude cos(eastward x + northward y - frequency t + phase)``, each array (line,).

    ``frequency`` in radians per day, ``eastward`` and ``northward`` in radians per degree. A line of positive
    ``eastward`` and ``frequency`` runs east.
    """

    frequency: Floats
    eastward: Floats
    northward: Floats
    phase: Floats
    amplitude: Floats

    @classmethod
    def running(cls, random: np.random.Generator, frequency: Floats, eastward: Floats, northward: Floats) -> Lines:
        """Give lines random phases and equal amplitudes whose variances sum to 1."""
        count = frequency.size
        phase = random.uniform(0.0, 2.0 * np.pi, count)
        return cls(frequency, eastward, northward, phase, np.full(count, np.sqrt(2.0 / count)))

    @classmethod
    def patches(
        cls,
        random: np.random.Generator,
        count: int,
        *,
        longitude: float,
        latitude: float,
        days: float,
        speed: float = 0.0,
        spread: float = 0.0,
    ) -> Lines:
        """Draw a field of unit variance whose patches fade in space and time and drift.

        Parameters
        ----------
        random : numpy.random.Generator
        count : int
            Lines.
        longitude, latitude, days : float
            Scales of the covariance ``exp(-(d / scale)**2)``, degrees and days. Infinite days: it stands.
        speed : float, optional
            m s-1 of the patches' drift, positive eastward.
        spread : float, optional
            Standard deviation of the logarithm of the scales in space: with 0 the covariance is a Gaussian,
            with more it is peaked and long-tailed.
        """
        stretch = np.exp(spread * random.standard_normal(count))
        eastward = np.sqrt(2.0) / (longitude * stretch) * random.standard_normal(count)
        northward = np.sqrt(2.0) / (latitude * stretch) * random.standard_normal(count)
        frequency = np.sqrt(2.0) / days * random.standard_normal(count) + eastward * degrees_per_day(speed)
        return cls.running(random, frequency, eastward, northward)

    def at(self, latitude: Floats, longitude: Floats, clock: Clock) -> Floats:
        """Return the field at positions, (position, time), averaged over the clock's interval."""
        place = np.outer(longitude, self.eastward) + np.outer(latitude, self.northward) + self.phase
        turn = np.outer(self.frequency, clock.day)
        kept = self.amplitude * np.sinc(self.frequency * clock.interval / (2.0 * np.pi))
        return np.asarray((np.cos(place) * kept) @ np.cos(turn) + (np.sin(place) * kept) @ np.sin(turn))
