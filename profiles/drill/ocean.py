"""The simulated ocean: temperature and isotherm depth, known exactly, at any position and time.

Mean and season come from :mod:`profiles.drill.mean_state`; the isotherm is moved by the oscillator, by the waves
and patches, and, where small scales are asked for, by internal waves; the column is built around it
(:mod:`profiles.drill.water_column`). All parts are functions of absolute time: oceans of one seed agree wherever
their times overlap, be they monthly, daily or of minutes.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from profiles.drill.clock import Clock
from profiles.drill.mean_state import MeanState
from profiles.drill.near_surface import NearSurface
from profiles.drill.oscillator import Oscillator
from profiles.drill.small_scales import FineStructure, InternalWaves
from profiles.drill.water_column import CALM, COOLED, ISOTHERM, Shape, State, isotherm_depths, kept_above, temperatures
from profiles.drill.waves import EastwardWaves, InstabilityWaves, Patches, WestwardWaves
from profiles.statistics import harmonic_design

Floats = NDArray[np.float64]

HIGHEST, HIGHEST_BEND = -12.0, 5.0  # m; the isotherm never lies further above the surface, and bends towards it (ours)
SMALLER_WHERE_SHALLOW = 60.0  # m; patches and internal waves are smaller where the mean isotherm is shallower (ours)
COUPLING = 0.045  # °C per m: surface on isotherm in the east (ours; order of the published 0.02-0.1)
COUPLED_EAST_OF = (200.0, 235.0)  # degrees east between which the coupling grows
COUPLED_AT_MOST = 2.5  # °C
COLDEST, WARMEST = 21.0, 31.0  # °C of the surface where the isotherm is deep (ours; the pool is capped: from memory)
SURFACE_BEND = 0.4  # °C
INTRUSION_AT_MOST = 0.9  # °C (ours)
MIXED_AT_MOST = 0.6  # share of the isotherm's depth
_SURFACE = -100.0  # m; the top of a layer that reaches the surface


@dataclass(frozen=True)
class Columns:
    """Water columns at some positions through time.

    ``clock``; ``base`` and ``displacement`` (position, time), the isotherm's depth without variability and how far
    it was moved, m, positive down; ``state`` and ``shape``, see :mod:`profiles.drill.water_column`.
    """

    clock: Clock
    base: Floats
    displacement: Floats
    state: State
    shape: Shape

    def isotherm_depth(self) -> Floats:
        """Return the depth of the isotherm, m, (position, time): the shallowest crossing, 0 where it outcrops."""
        return np.asarray(isotherm_depths(self.clock.day, self.state, self.shape)[0])

    def passages(self) -> NDArray[np.int8]:
        """Return how often the temperature falls through 20 °C with depth, (position, time)."""
        return np.asarray(isotherm_depths(self.clock.day, self.state, self.shape)[1])

    def surface_temperature(self) -> Floats:
        """Return the temperature at the surface, °C, (position, time)."""
        surface = [self.temperature(position, [0.0])[:, 0] for position in range(len(self.base))]
        return np.array(surface)

    def temperature(self, position: int, depth: ArrayLike) -> Floats:
        """Return temperature, °C, (time, depth), at one position.

        Parameters
        ----------
        position : int
        depth : array_like, shape (depth,) or (time, depth)
            m, from 0 to the end of the fine grid.
        """
        depth = np.asarray(depth, dtype=np.float64)
        where = np.ascontiguousarray(np.broadcast_to(depth, (self.clock.day.size, depth.shape[-1])))
        return np.asarray(temperatures(where, self.clock.day, position, self.state, self.shape))


@dataclass(frozen=True)
class Ocean:
    """One realisation: ``time`` (time,), the seed, and the state of each part of its variability."""

    time: NDArray[np.datetime64]
    seed: int
    clock: Clock
    oscillator: Oscillator
    eastward: EastwardWaves
    westward: WestwardWaves
    instability: InstabilityWaves
    patches: Patches
    near_surface: NearSurface
    internal: InternalWaves

    @classmethod
    def simulate(cls, time: NDArray[np.datetime64], seed: int) -> Ocean:
        """Draw an ocean.

        Parameters
        ----------
        time : ndarray of datetime64, shape (time,)
            UTC. Values half a day apart or more are means over their usual spacing: days, months. Closer together
            they are instants.
        seed : int
            The same seed gives the same ocean.

        Raises
        ------
        DataError
            Where ``time`` is empty or lies before 1980.
        """
        clock = Clock.reading(time)
        oscillator = Oscillator.draw(clock, seed)
        return cls(
            time,
            seed,
            clock,
            oscillator,
            EastwardWaves.draw(seed),
            WestwardWaves.draw(seed),
            InstabilityWaves.draw(clock, oscillator.warmth, seed),
            Patches.draw(seed),
            NearSurface.draw(seed),
            InternalWaves.draw(seed),
        )

    def columns(self, latitude: ArrayLike, longitude: ArrayLike, *, small_scales: bool = False) -> Columns:
        """Return the water columns at positions.

        Parameters
        ----------
        latitude, longitude : array_like, shape (position,)
            Degrees north and degrees east, 0-360; the box 5S-5N, 120E-80W and a margin.
        small_scales : bool, optional
            Whether internal waves and fine structure are there.

        Raises
        ------
        DataError
            Where a position lies outside the simulated ocean.
        """
        where = np.asarray(latitude, dtype=np.float64), np.asarray(longitude, dtype=np.float64)
        mean = MeanState.at(*where, self.seed)
        season = harmonic_design(self.clock.fraction).T
        base = mean.isotherm @ season
        displacement = self.displacement(*where, mean, small_scales=small_scales)
        isotherm = kept_above(base + displacement, HIGHEST, HIGHEST_BEND)
        surface = self._surface(*where, mean.surface @ season, displacement)
        fine = FineStructure.draw(*where, self.seed) if small_scales else FineStructure.none(where[0].size)
        reference = np.clip(mean.isotherm[:, 0], 0.0, None)
        shape = Shape(
            mean.exponent, mean.decay, reference, mean.deep, fine.height, fine.number, fine.phase, fine.frequency
        )
        return Columns(self.clock, base, displacement, self._state(*where, mean, isotherm, surface), shape)

    def isotherm_depth(self, latitude: ArrayLike, longitude: ArrayLike) -> Floats:
        """Return the depth of the isotherm without small scales, m, (position, time): that of the columns, quicker.

        Only where the isotherm comes near the surface are the columns built.
        """
        where = np.asarray(latitude, dtype=np.float64), np.asarray(longitude, dtype=np.float64)
        mean = MeanState.at(*where, self.seed)
        base = mean.isotherm @ harmonic_design(self.clock.fraction).T
        depth = kept_above(base + self.displacement(*where, mean, small_scales=False), HIGHEST, HIGHEST_BEND)
        shallow = (depth < CALM).any(axis=1)
        if shallow.any():
            depth[shallow] = self.columns(where[0][shallow], where[1][shallow]).isotherm_depth()
        return depth

    def surface_temperature(self, latitude: ArrayLike, longitude: ArrayLike) -> Floats:
        """Return the temperature at the surface without small scales, °C, (position, time)."""
        return self.columns(latitude, longitude).surface_temperature()

    def displacement(self, latitude: Floats, longitude: Floats, mean: MeanState, *, small_scales: bool) -> Floats:
        """Return how far the isotherm is moved, m, positive down, (position, time)."""
        where = (latitude, longitude, self.clock)
        local = self.patches.displacement(*where)
        if small_scales:
            local += self.internal.displacement(*where)
        local *= np.tanh(np.maximum(mean.isotherm[:, :1], 10.0) / SMALLER_WHERE_SHALLOW)
        waves = [part.displacement(*where) for part in (self.eastward, self.westward, self.instability)]
        return np.asarray(local + self.oscillator.displacement(latitude, longitude) + sum(waves))

    def _surface(self, latitude: Floats, longitude: Floats, base: Floats, displacement: Floats) -> Floats:
        """Return the surface's temperature, °C, (position, time), where the isotherm is deep."""
        east = np.interp(longitude, COUPLED_EAST_OF, [0.0, COUPLING])[:, None]
        own = displacement - self.oscillator.displacement(latitude, longitude)
        coupled = COUPLED_AT_MOST * np.tanh(east * own / COUPLED_AT_MOST)
        weather = self.near_surface.weather_anomaly(latitude, longitude, self.clock)
        surface = base + self.oscillator.surface_anomaly(latitude, longitude) + coupled + weather
        return -kept_above(-kept_above(surface, COLDEST, SURFACE_BEND), -WARMEST, SURFACE_BEND)

    def _state(self, latitude: Floats, longitude: Floats, mean: MeanState, isotherm: Floats, surface: Floats) -> State:
        where = (latitude, longitude, self.clock)
        mixing = self.near_surface.mixing_factor(*where) * mean.mixed_layer[:, None]
        mixed = np.minimum(mixing, MIXED_AT_MOST * np.maximum(isotherm, 0.0))
        share = self.near_surface.intrusion_share(*where, isotherm)
        intruded = share > 0.0
        excess = (surface - ISOTHERM) * np.tanh(np.maximum(isotherm, 0.0) / COOLED)
        cooling = np.where(
            intruded, np.minimum(share * excess, INTRUSION_AT_MOST), self.near_surface.fresh_cooling(*where)
        )
        return State(
            isotherm=isotherm,
            surface=surface,
            mixed=mixed,
            cooling=cooling,
            top=np.where(intruded, 0.25 * isotherm, _SURFACE),
            base=np.where(intruded, 0.6 * isotherm, self.near_surface.FRESH_SHARE * mixed),
            edge=np.where(intruded, 0.12 * isotherm, self.near_surface.FRESH_EDGE),
            afternoon=self.near_surface.afternoon(*where) + np.zeros_like(isotherm),
        )
