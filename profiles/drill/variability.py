"""What moves the thermocline of the simulated ocean: parts whose state can be read at any position.

A part is drawn once, from its own stream of random numbers, so that adding or changing one leaves the others
alone.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from profiles.drill.sphere import METRES_PER_DEGREE
from profiles.drill.streams import stream

Floats = NDArray[np.float64]

DAY = 86_400.0  # s


def autoregressive(noise: Floats, days: float) -> Floats:
    """Return daily red noise, unit variance, e-folding time ``days``, made from ``noise`` (time, ...)."""
    memory = np.exp(-1.0 / days)
    result = np.empty_like(noise)
    result[0] = noise[0]
    for day in range(1, len(noise)):
        result[day] = memory * result[day - 1] + np.sqrt(1.0 - memory**2) * noise[day]
    return result


# ----------------------------------------------------------------------------------------------------
# Years: recharge and tilt


@dataclass(frozen=True)
class Oscillator:
    """A recharge oscillator, linear, damped and driven by noise.

    ``recharge`` and ``warmth`` (time,) have unit variance. The recharge leads the warmth by a quarter of a
    period, and a warm phase is one of flat tilt (Jin 1997, J. Atmos. Sci. 54, 811-829, in its linear form;
    the amplitudes and shapes here are ours).
    """

    recharge: Floats
    warmth: Floats

    PERIOD = 3.5 * 365.25  # days (FACTS H: 3.42 years at the neutral point)
    DAMPING = 2.0 * 365.25  # days, e-folding time (fits to observations give about 25 months, from memory)
    RECHARGE_SD = 6.0  # m
    TILT_SD = 10.0  # m at the ends of the array
    NODE = 200.0  # degrees east (FACTS C3: date line to 160W, from memory)
    WEST_WIDTH, EAST_WIDTH = 55.0, 70.0  # degrees from the node to the extremes of the tilt
    TILT_WIDTH = 8.0  # degrees of latitude, e-folding of its Gaussian
    SURFACE_SD = 0.7  # °C at the eastern extreme

    @classmethod
    def draw(cls, days: int, seed: int) -> Oscillator:
        """Draw a stationary series of ``days`` daily states."""
        noise = stream(seed, "oscillator").standard_normal((days, 2)) @ np.array([1.0, 1.0j])
        step = np.exp(-1.0 / cls.DAMPING + 2.0j * np.pi / cls.PERIOD)
        state = np.empty(days, dtype=np.complex128)
        state[0] = noise[0]
        for day in range(1, days):
            state[day] = step * state[day - 1] + np.sqrt(1.0 - abs(step) ** 2) * noise[day]
        return cls(recharge=state.real.copy(), warmth=state.imag.copy())

    def displacement(self, latitude: Floats, longitude: Floats) -> Floats:
        """Return the displacement of the isotherm, m, positive down, (position, time)."""
        trapped = np.exp(-((latitude / self.TILT_WIDTH) ** 2))
        tilt = self.TILT_SD * trapped * self._eastward(longitude)
        return self.RECHARGE_SD * self.recharge + tilt[:, None] * self.warmth

    def surface_anomaly(self, latitude: Floats, longitude: Floats) -> Floats:
        """Return the anomaly of the surface temperature, °C, (position, time); it grows from west to east."""
        trapped = np.exp(-((latitude / self.TILT_WIDTH) ** 2))
        share = 0.5 * (1.0 + self._eastward(longitude)) * trapped
        return np.asarray(self.SURFACE_SD * share[:, None] * self.warmth)

    def _eastward(self, longitude: Floats) -> Floats:
        """Shape of the tilt: -1 at its western, 0 at its node, 1 at its eastern extreme."""
        away = longitude - self.NODE
        width = np.where(away < 0.0, self.WEST_WIDTH, self.EAST_WIDTH)
        return np.asarray(np.sin(0.5 * np.pi * np.clip(away / width, -1.0, 1.0)))


# ----------------------------------------------------------------------------------------------------
# Weeks: waves that run eastward


@dataclass(frozen=True)
class EastwardWaves:
    """Equatorial Kelvin waves: lines of a band of frequencies, each running eastward unchanged.

    ``frequency`` (line,), radians per day; ``cosine``, ``sine`` (line,), m.
    """

    time: Floats  # days since the start
    frequency: Floats
    cosine: Floats
    sine: Floats

    PERIODS = (60.0, 75.0)  # days (Kessler, McPhaden and Weickmann 1995)
    SPEED = 2.4  # m s-1 (the same)
    WIDTH = 3.0  # degrees of latitude, e-folding of the Gaussian (FACTS G: sqrt(c/beta) is about 3 degrees)
    SD = 5.0  # m on the equator (ours)
    LINES = 32

    @classmethod
    def draw(cls, days: int, seed: int) -> EastwardWaves:
        """Draw lines spread over the band."""
        random = stream(seed, "eastward waves")
        short, long = cls.PERIODS
        frequency = 2.0 * np.pi * random.uniform(1.0 / long, 1.0 / short, cls.LINES)
        cosine, sine = cls.SD / np.sqrt(cls.LINES) * random.standard_normal((2, cls.LINES))
        return cls(np.arange(days, dtype=np.float64), frequency, cosine, sine)

    def displacement(self, latitude: Floats, longitude: Floats) -> Floats:
        """Return the displacement of the isotherm, m, positive down, (position, time)."""
        places, where = np.unique(longitude, return_inverse=True)
        travel = places * METRES_PER_DEGREE / self.SPEED / DAY
        phase = self.frequency * (self.time - travel[:, None])[..., None]
        wave = np.cos(phase) @ self.cosine + np.sin(phase) @ self.sine
        return np.asarray(np.exp(-((latitude / self.WIDTH) ** 2))[:, None] * wave[where])


# ----------------------------------------------------------------------------------------------------
# Weeks to months: red noise in space and time


@dataclass(frozen=True)
class RedField:
    """Red noise: covariance ``sd**2 exp(-(dx/LX)**2 - (dy/LY)**2)`` in space, e-folding in time.

    A sum of Fourier modes with ``amplitude`` (time, column mode, row mode) of unit variance, periodic far
    outside the region.
    """

    amplitude: Floats

    SD = 5.0  # m (ours)
    SCALE_LONGITUDE, SCALE_LATITUDE = (
        10.0,
        2.5,
    )  # degrees (ours, between eddies and the scales of Meyers et al. 1991)
    DAYS = 40.0  # e-folding time (ours)
    PERIOD_LONGITUDE, PERIOD_LATITUDE = 360.0, 30.0  # degrees
    WAVES_LONGITUDE, WAVES_LATITUDE = 26, 9  # three standard deviations of the spectrum and more

    @classmethod
    def draw(cls, days: int, seed: int) -> RedField:
        """Draw the amplitudes of all modes."""
        modes = (2 * cls.WAVES_LONGITUDE + 1, 2 * cls.WAVES_LATITUDE + 1)
        noise = stream(seed, "red field").standard_normal((days, *modes))
        return cls(autoregressive(noise, cls.DAYS))

    def displacement(self, latitude: Floats, longitude: Floats) -> Floats:
        """Return the displacement of the isotherm, m, positive down, (position, time)."""
        columns = _modes(longitude, self.PERIOD_LONGITUDE, self.SCALE_LONGITUDE, self.WAVES_LONGITUDE)
        rows = _modes(latitude, self.PERIOD_LATITUDE, self.SCALE_LATITUDE, self.WAVES_LATITUDE)
        pattern = (columns[:, :, None] * rows[:, None, :]).reshape(latitude.size, -1)
        return np.asarray(self.SD * pattern @ self.amplitude.reshape(len(self.amplitude), -1).T)


def _modes(place: Floats, period: float, scale: float, waves: int) -> Floats:
    """Return 1, cos, sin of ``waves`` wave numbers at ``place``, (place, mode).

    Their squares are weighted by the spectrum of exp(-(d/scale)**2) and sum to 1.
    """
    number = 2.0 * np.pi / period * np.arange(1, waves + 1)
    power = np.concatenate([[0.5], np.exp(-((number * scale / 2.0) ** 2))])
    weight = np.sqrt(power / power.sum())
    angle = place[:, None] * number
    terms = np.concatenate([weight[1:] * np.cos(angle), weight[1:] * np.sin(angle)], axis=1)
    return np.concatenate([np.full((place.size, 1), weight[0]), terms], axis=1)


# ----------------------------------------------------------------------------------------------------
# Days: what one site sees alone

SMALL_SCALE_SD = 3.0  # m; internal waves in a daily mean (ours)


def small_scale_displacement(sites: int, days: int, seed: int) -> Floats:
    """Return the displacement of the isotherm by small scales, m, (site, time), all independent."""
    return SMALL_SCALE_SD * stream(seed, "small scale").standard_normal((sites, days))
