"""Years: recharge and tilt of the simulated ocean."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.signal import lfilter

from profiles.drill.clock import Clock
from profiles.drill.streams import stream

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Oscillator:
    """A recharge oscillator, damped and driven by noise, whose warm events are stronger and cold ones longer.

    ``recharge`` and ``warmth`` (time,) have unit variance. The recharge leads the warmth, and a warm phase is
    one of flat tilt (Jin 1997, J. Atmos. Sci. 54, 811-829, in its linear form; amplitudes and shapes are ours).
    The warmth is the exponential of the linear one, less its mean: skewed, so that it is more often below zero
    than above.
    """

    clock: Clock
    recharge: Floats
    warmth: Floats

    PERIOD = 39.0 * 30.4  # days (fits to observations give 37-41 months, from memory)
    DAMPING = 20.0 * 30.4  # days, e-folding (the same fits: 24-25 months; a little less for a lead of 6-7 months)
    SKEW = 0.34  # of the exponential: skewness 1.09, of which weather and waves leave 0.5 to 0.8 (0.8 from memory)
    RECHARGE_SD = 6.5  # m on the equator at 180E
    EAST_SD, WEST_SD = 14.5, 9.5  # m at the eastern and western extremes of the tilt
    NODE = 192.0  # degrees east (date line to 160W, from memory)
    WEST_EXTREME, EAST_EXTREME = 150.0, 258.0  # degrees east
    EAST_WIDTH, WEST_WIDTH, RECHARGE_WIDTH = 4.5, 10.0, 11.0  # degrees of latitude, e-folding of Gaussians
    SURFACE_SD = 1.05  # °C at the eastern extreme, boreal winter and summer together (from memory: 0.9 in Nino-3)
    LOCKING = 0.3  # the surface's answer is larger by this share in December, smaller in June (from memory)

    @classmethod
    def draw(cls, clock: Clock, seed: int) -> Oscillator:
        """Draw the states at the clock's times; longer and finer clocks see the same states."""
        days = int(np.ceil(clock.day.max())) + 1
        noise = stream(seed, "oscillator").standard_normal((days + 1, 2)) @ np.array([1.0, 1.0j])
        step = np.exp(-1.0 / cls.DAMPING + 2.0j * np.pi / cls.PERIOD)
        noise[1:] *= np.sqrt(1.0 - abs(step) ** 2)
        state = lfilter([1.0], [1.0, -step], noise)
        recharge = np.interp(clock.day, np.arange(days + 1.0), state.real)
        warmth = np.interp(clock.day, np.arange(days + 1.0), state.imag)
        return cls(clock, recharge, _skewed(warmth, cls.SKEW))

    def displacement(self, latitude: Floats, longitude: Floats) -> Floats:
        """Return the displacement of the isotherm, m, positive down, (position, time)."""
        return np.asarray(
            np.outer(self._recharge_pattern(latitude, longitude), self.recharge)
            + np.outer(self._tilt_pattern(latitude, longitude), self.warmth)
        )

    def surface_anomaly(self, latitude: Floats, longitude: Floats) -> Floats:
        """Return the anomaly of the surface temperature, °C, (position, time); it grows from west to east."""
        trapped = np.exp(-((latitude / self.WEST_WIDTH) ** 2))
        share = np.interp(longitude, [140.0, 170.0, 205.0, 245.0, 280.0], [0.05, 0.3, 0.9, 1.0, 0.9])
        locked = 1.0 + self.LOCKING * np.cos(2.0 * np.pi * (self.clock.fraction - 0.96))
        return np.asarray(np.outer(self.SURFACE_SD * share * trapped, locked * self.warmth))

    def _recharge_pattern(self, latitude: Floats, longitude: Floats) -> Floats:
        zonal = np.interp(longitude, [120.0, 150.0, 190.0, 240.0, 280.0], [0.8, 1.1, 1.0, 0.9, 0.8])
        return np.asarray(self.RECHARGE_SD * zonal * np.exp(-((latitude / self.RECHARGE_WIDTH) ** 2)))

    def _tilt_pattern(self, latitude: Floats, longitude: Floats) -> Floats:
        """Shape of the tilt, m: negative in the west, positive and narrower in the east."""
        nodes = [self.NODE - 2.0 * (self.NODE - self.WEST_EXTREME), self.NODE, 2.0 * self.EAST_EXTREME - self.NODE]
        angle = np.interp(longitude, nodes, [-np.pi, 0.0, np.pi])
        east = np.maximum(np.sin(angle), 0.0) * self.EAST_SD * np.exp(-((latitude / self.EAST_WIDTH) ** 2))
        west = np.minimum(np.sin(angle), 0.0) * self.WEST_SD * np.exp(-((latitude / self.WEST_WIDTH) ** 2))
        return np.asarray(east + west)


def _skewed(series: Floats, skew: float) -> Floats:
    """Return ``exp(skew series)`` less its mean over its standard deviation, those of a standard normal series."""
    half = np.exp(skew**2 / 2.0)
    return np.asarray((np.exp(skew * series) - half) / (half * np.sqrt(half**2 - 1.0)))
