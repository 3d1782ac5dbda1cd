"""The simulated ocean: temperature and isotherm depth, known exactly, at any position and time.

Mean and season come from two published atlases, so that the truth differs from the packaged monthly one as
one atlas differs from another: the annual mean of Levitus (1982), and the departure of the monthly
climatology from its own mean. The parts of :mod:`profiles.drill.variability` move the isotherm up and down.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import xarray as xr
from numpy.typing import ArrayLike, NDArray
from scipy.interpolate import PchipInterpolator

from profiles.atlas import annual_profile, seasonal_profile
from profiles.drill.variability import EastwardWaves, Oscillator, RedField
from profiles.drill.water_column import FINE_DEPTH, displaced, isotherm_depths, temperatures
from profiles.statistics import harmonic_design, year_fraction

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Columns:
    """Water columns at some positions through time.

    ``harmonics`` (position, harmonic, level), °C on the fine grid; ``season`` (time, harmonic); ``base``
    (position, time), the isotherm's depth without variability, m; ``displacement`` (position, time), m,
    positive down; ``surface_anomaly`` (position, time), °C.
    """

    harmonics: Floats
    season: Floats
    base: Floats
    displacement: Floats
    surface_anomaly: Floats

    def isotherm_depth(self) -> Floats:
        """Return the depth of the isotherm, m, (position, time), 0 where it outcrops."""
        moved = displaced(self.base, self.displacement)
        return np.asarray(isotherm_depths(self.harmonics, self.season, self.base, moved, self.surface_anomaly))

    def temperature(self, position: int, depth: ArrayLike) -> Floats:
        """Return temperature, °C, (time, depth), at one position.

        Parameters
        ----------
        position : int
        depth : array_like, shape (depth,) or (time, depth)
            m, from 0 to the end of the fine grid.
        """
        depth = np.asarray(depth, dtype=np.float64)
        where = np.ascontiguousarray(np.broadcast_to(depth, (len(self.season), depth.shape[-1])))
        moved = displaced(self.base[position], self.displacement[position])
        return np.asarray(
            temperatures(
                self.harmonics[position],
                self.season,
                self.base[position],
                moved,
                self.surface_anomaly[position],
                where,
            )
        )

    def displaced_by(self, displacement: Floats) -> Columns:
        """Return the columns with a further ``displacement``, m, (position, time)."""
        return Columns(self.harmonics, self.season, self.base, self.displacement + displacement, self.surface_anomaly)


@dataclass(frozen=True)
class Ocean:
    """One realisation: ``time`` (time,), daily, and the state of each part of its variability."""

    time: NDArray[np.datetime64]
    oscillator: Oscillator
    parts: tuple[Oscillator | EastwardWaves | RedField, ...]

    @classmethod
    def simulate(cls, time: NDArray[np.datetime64], seed: int) -> Ocean:
        """Draw an ocean.

        Parameters
        ----------
        time : ndarray of datetime64, shape (time,)
            UTC, one a day.
        seed : int
            The same seed gives the same ocean.
        """
        oscillator = Oscillator.draw(time.size, seed)
        others = (EastwardWaves.draw(time.size, seed), RedField.draw(time.size, seed))
        return cls(time, oscillator, (oscillator, *others))

    def columns(self, latitude: ArrayLike, longitude: ArrayLike) -> Columns:
        """Return the water columns at positions, without small scales.

        Parameters
        ----------
        latitude, longitude : array_like, shape (position,)
            Degrees north and degrees east, 0-360.

        Raises
        ------
        DataError
            Where a position lies outside the packaged atlas.
        """
        latitude = np.asarray(latitude, dtype=np.float64)
        longitude = np.asarray(longitude, dtype=np.float64)
        harmonics = mean_and_season(latitude, longitude)
        season = harmonic_design(year_fraction(self.time))
        rest = np.zeros((latitude.size, self.time.size))
        base = isotherm_depths(harmonics, season, rest + 1.0, rest + 1.0, rest)
        displacement = sum((part.displacement(latitude, longitude) for part in self.parts), start=rest)
        return Columns(harmonics, season, base, displacement, self.oscillator.surface_anomaly(latitude, longitude))


def mean_and_season(latitude: Floats, longitude: Floats) -> Floats:
    """Return the harmonics of the base temperature, °C, (position, harmonic, level) on the fine grid."""
    departures = _fine(seasonal_profile(latitude, longitude).isel(harmonic=slice(1, None)))
    mean = _fine(annual_profile(latitude, longitude))
    return np.ascontiguousarray(np.concatenate([mean[:, None], departures], axis=1))


def _fine(profiles: xr.DataArray) -> Floats:
    """Interpolate atlas profiles (..., depth) to the fine grid, monotone between levels."""
    return np.asarray(PchipInterpolator(profiles["depth"].values, profiles.values, axis=-1)(FINE_DEPTH))
