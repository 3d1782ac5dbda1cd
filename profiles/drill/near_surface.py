"""Days to weeks near the surface: weather, fresh layers over barrier layers, intrusions, warm afternoons."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from profiles.drill.clock import Clock
from profiles.drill.lines import Lines
from profiles.drill.streams import stream

Floats = NDArray[np.float64]

_COUNT = 48
_PEAK_HOUR = 14.5  # h, local solar time, of the warm layer (common practice, no source: early afternoon)


@dataclass(frozen=True)
class NearSurface:
    """Fields of unit variance that the near-surface quantities are made of."""

    weather: Lines
    mixing: Lines
    rain: Lines
    intrusions: Lines
    calm: Lines

    WEATHER_SD = 0.3  # °C of the surface in some weeks (ours)
    MIXING_SD = 0.25  # of the logarithm of the mixed layer's depth (ours)
    FRESH, FRESH_ABOVE, FRESHEST = 0.45, 0.7, 0.8  # °C a unit of rain above a threshold, and °C at most (ours)
    FRESH_SHARE = 0.55  # of the mixed layer's depth: what lies below, to the thermocline, is the barrier layer (ours)
    FRESH_EDGE = 4.0  # m
    POOL = (165.0, 190.0)  # degrees east: barrier layers lie west of it (Sprintall and Tomczak 1992: the west)
    INTRUSION = 1.3  # share of the surface's excess over 20 °C, at most (ours)
    AFTERNOON, AFTERNOON_SPREAD = 0.4, 0.7  # °C, median peak, and the sd of its logarithm (ours)
    STRONGEST_AFTERNOON = 3.0  # °C (from memory)

    @classmethod
    def draw(cls, seed: int) -> NearSurface:
        """Draw the fields."""
        scales = {
            "weather": (12.0, 4.0, 15.0),
            "mixing": (10.0, 3.0, 8.0),
            "rain": (10.0, 4.0, 20.0),
            "intrusions": (3.0, 1.0, 6.0),
            "calm": (6.0, 3.0, 4.0),
        }
        return cls(**{name: _field(seed, name, *numbers) for name, numbers in scales.items()})

    def weather_anomaly(self, latitude: Floats, longitude: Floats, clock: Clock) -> Floats:
        """Return the anomaly of the surface temperature, °C, (position, time)."""
        return self.WEATHER_SD * self.weather.at(latitude, longitude, clock)

    def mixing_factor(self, latitude: Floats, longitude: Floats, clock: Clock) -> Floats:
        """Return what the mixed layer's depth is multiplied by, (position, time)."""
        return np.exp(self.MIXING_SD * self.mixing.at(latitude, longitude, clock))

    def fresh_cooling(self, latitude: Floats, longitude: Floats, clock: Clock) -> Floats:
        """Return how much colder a fresh layer is than the barrier layer below it, °C, (position, time)."""
        pool = np.interp(longitude, self.POOL, [1.0, 0.0])[:, None]
        rain = np.maximum(self.rain.at(latitude, longitude, clock) - self.FRESH_ABOVE, 0.0)
        return np.asarray(pool * np.minimum(self.FRESH * rain, self.FRESHEST))

    def intrusion_share(self, latitude: Floats, longitude: Floats, clock: Clock, isotherm: Floats) -> Floats:
        """Return the share of the surface's excess over the isotherm that an intrusion lacks, (position, time).

        Intrusions lie in the far east, where ``isotherm`` (position, time), m, is between 5 and 25 m deep.
        """
        east = np.interp(longitude, [245.0, 260.0], [0.0, 1.0])[:, None]
        shallow = np.clip(1.0 - np.abs(isotherm - 15.0) / 10.0, 0.0, 1.0)
        strength = np.clip(self.intrusions.at(latitude, longitude, clock) - 0.2, 0.0, 1.0)
        return np.asarray(self.INTRUSION * east * np.minimum(1.5 * shallow, 1.0) * strength)

    def afternoon(self, latitude: Floats, longitude: Floats, clock: Clock) -> Floats:
        """Return the afternoon's warmth at the surface, °C, (position, time), or its mean over the day."""
        peak = self.AFTERNOON * np.exp(self.AFTERNOON_SPREAD * self.calm.at(latitude, longitude, clock))
        return np.asarray(np.minimum(peak, self.STRONGEST_AFTERNOON) * _share_of_peak(longitude, clock))


def _field(seed: int, name: str, longitude: float, latitude: float, days: float) -> Lines:
    random = stream(seed, "near surface", name)
    return Lines.patches(random, _COUNT, longitude=longitude, latitude=latitude, days=days)


def _share_of_peak(longitude: Floats, clock: Clock) -> Floats:
    """Return ((1 + cos) / 2)**2 of the local solar hour from the peak, whose mean over a day is 3/8."""
    if clock.interval > 0.0:
        return np.full((longitude.size, 1), 3.0 / 8.0)
    hour = 24.0 * (clock.day + longitude[:, None] / 360.0)
    return np.asarray((0.5 + 0.5 * np.cos(2.0 * np.pi * (hour - _PEAK_HOUR) / 24.0)) ** 2)
