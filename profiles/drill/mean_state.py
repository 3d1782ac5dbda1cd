"""Mean and season of the simulated ocean: those of the packaged atlas, wrong by as much as atlases are.

The depth of the isotherm, the surface temperature and the shape of the column are read off the monthly atlas on a
coarse grid once, smoothed, and interpolated. A random field that belongs to the seed is added to the depth.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import PchipInterpolator, RegularGridInterpolator
from scipy.ndimage import gaussian_filter1d

from profiles.atlas import seasonal_profile
from profiles.drill.clock import EPOCH, Clock
from profiles.drill.lines import Lines
from profiles.drill.streams import stream
from profiles.drill.water_column import FINE_DEPTH, ISOTHERM
from profiles.errors import DataError
from profiles.statistics import HARMONICS, harmonic_design

Floats = NDArray[np.float64]

#: The box that the simulated ocean fills, 5S-5N, 120E-80W, with a margin of the coarse grid's spacing.
LATITUDES = np.arange(-6.0, 6.5, 1.0)
LONGITUDES = np.arange(118.0, 283.0, 2.0)

DIFFERENCE_SD = 7.0  # m over the box: rms difference between the two packaged atlases
SCALES = ((18.0, 8.0), (4.0, 2.0))  # degrees of longitude and latitude of the difference's halves (ours)
SEASONAL_DIFFERENCE_SD = 2.0  # m, of each annual harmonic (ours)
SURFACE_DIFFERENCE_SD = 0.25  # °C (ours)
_LINES = 60
_VIRTUAL_GRADIENT = 0.15  # °C per m; an isotherm above the surface lies as far as this gradient says (ours)
_MIXED = 0.5  # °C; the atlas's mixed layer ends where it is this much colder than its surface
_SHARPER = 0.75  # the lower thermocline decays over this share of the atlas's scale: a mean is smoother (ours)
_FADES_BELOW = 50.0  # m below the isotherm: where the atlas gives the scale of the decay
_DEEP_BELOW = 130.0  # m below the isotherm: the atlas's own profile from here
_DEEP_GRADIENT = 0.01  # °C per m, of the deep water's continuation upward
_BOX = (np.arange(-4.5, 5.0), np.arange(121.0, 280.0, 2.0))  # where the difference has its rms


@dataclass(frozen=True)
class MeanState:
    """Columns without variability, each array (position, ...).

    ``isotherm`` and ``surface`` (position, harmonic): depth, m, below 0 where it would lie above the surface, and
    temperature, °C. ``mixed_layer``, m; ``exponent`` and ``decay``, m, of the upper and the lower thermocline;
    ``deep`` (position, level), °C on the fine grid.
    """

    isotherm: Floats
    surface: Floats
    mixed_layer: Floats
    exponent: Floats
    decay: Floats
    deep: Floats

    @classmethod
    def at(cls, latitude: Floats, longitude: Floats, seed: int) -> MeanState:
        """Return the mean state of a seed's ocean at positions.

        Raises
        ------
        DataError
            Where a position lies outside the ocean.
        """
        _check_inside(latitude, longitude)
        table = RegularGridInterpolator((LATITUDES, LONGITUDES), _atlas())(np.column_stack([latitude, longitude]))
        isotherm, surface, shape, deep = np.split(table, np.cumsum([len(HARMONICS), len(HARMONICS), 3]), axis=1)
        isotherm = isotherm + _difference(latitude, longitude, isotherm[:, 0], seed)
        surface = surface.copy()
        surface[:, 0] += (
            SURFACE_DIFFERENCE_SD * _patches(seed, "surface", SCALES[0]).at(latitude, longitude, _STILL)[:, 0]
        )
        mixed_layer, exponent, decay = shape.T.copy()
        return cls(isotherm, surface, mixed_layer, exponent, decay, np.ascontiguousarray(deep))


_STILL = Clock.reading(np.array([EPOCH]))


def _patches(seed: int, name: str, scales: tuple[float, float]) -> Lines:
    random = stream(seed, "mean state", name)
    return Lines.patches(random, _LINES, longitude=scales[0], latitude=scales[1], days=np.inf)


def _difference(latitude: Floats, longitude: Floats, depth: Floats, seed: int) -> Floats:
    """Return the difference from the atlas, m, (position, harmonic), smaller where the isotherm is shallow."""
    scale = DIFFERENCE_SD / _rms(seed)
    annual = [SEASONAL_DIFFERENCE_SD * _patches(seed, name, SCALES[0]).at(latitude, longitude, _STILL) for name in "cs"]
    parts = [scale * _raw_difference(latitude, longitude, seed), *annual]
    result = np.zeros((latitude.size, len(HARMONICS)))
    result[:, :3] = np.concatenate(parts, axis=1) * _where_deep(depth)[:, None]
    return result


def _raw_difference(latitude: Floats, longitude: Floats, seed: int) -> Floats:
    parts = [_patches(seed, str(scales), scales).at(latitude, longitude, _STILL) for scales in SCALES]
    return np.asarray(sum(parts))


@cache
def _rms(seed: int) -> float:
    """Return the rms over the box of the difference before it is scaled."""
    latitude, longitude = (grid.ravel() for grid in np.meshgrid(*_BOX, indexing="ij"))
    depth = RegularGridInterpolator((LATITUDES, LONGITUDES), _atlas()[..., 0])(np.column_stack([latitude, longitude]))
    field = _raw_difference(latitude, longitude, seed)[:, 0] * _where_deep(depth)
    return float(np.sqrt(np.mean(field**2)))


def _where_deep(depth: Floats) -> Floats:
    return np.asarray(np.sqrt(np.clip(depth / 110.0, 0.2, 1.3)))


def _check_inside(latitude: Floats, longitude: Floats) -> None:
    inside = (np.abs(latitude) <= LATITUDES[-1]) & (longitude >= LONGITUDES[0]) & (longitude <= LONGITUDES[-1])
    if not inside.all():
        first = int(np.argmin(inside))
        raise DataError(
            "the position lies outside the simulated ocean",
            expected=f"{LATITUDES[0]:g} to {LATITUDES[-1]:g} degrees north, "
            f"{LONGITUDES[0]:g} to {LONGITUDES[-1]:g} degrees east",
            found=f"{latitude[first]:g} degrees north, {longitude[first]:g} degrees east",
            advice="ask for positions inside",
        )


# ----------------------------------------------------------------------------------------------------
# The atlas on the coarse grid


@cache
def _atlas() -> Floats:
    """Return what :class:`MeanState` holds, of the atlas alone, (latitude, longitude, value)."""
    latitude, longitude = (grid.ravel() for grid in np.meshgrid(LATITUDES, LONGITUDES, indexing="ij"))
    profiles = seasonal_profile(latitude, longitude)
    fine = PchipInterpolator(profiles["depth"].values, profiles.values, axis=-1)(FINE_DEPTH)
    design = harmonic_design((np.arange(12) + 0.5) / 12.0)
    monthly = np.einsum("mh,phz->pmz", design, fine)
    isotherm = _isotherm_depths(monthly) @ np.linalg.pinv(design).T
    shape = _shapes(fine[:, 0], isotherm[:, 0])
    table = np.concatenate([isotherm, fine[:, :, 0], *shape], axis=1)
    grid = table.reshape(LATITUDES.size, LONGITUDES.size, -1)
    return np.asarray(gaussian_filter1d(gaussian_filter1d(grid, 0.7, axis=0), 1.0, axis=1))


def _isotherm_depths(temperature: Floats) -> Floats:
    """Return the first depth, m, colder than the isotherm, of (..., level); negative where the surface is colder."""
    below = np.maximum(np.argmax(temperature < ISOTHERM, axis=-1), 1)[..., None]
    colder = np.take_along_axis(temperature, below, -1)[..., 0]
    warmer = np.take_along_axis(temperature, below - 1, -1)[..., 0]
    crossing = FINE_DEPTH[below[..., 0]] - FINE_DEPTH[1] * (ISOTHERM - colder) / (warmer - colder)
    return np.where(warmer < ISOTHERM, (temperature[..., 0] - ISOTHERM) / _VIRTUAL_GRADIENT, crossing)


def _shapes(mean: Floats, isotherm: Floats) -> tuple[Floats, Floats, Floats, Floats]:
    """Return mixed layer, exponent and decay, (position, 1), and the deep water, (position, level)."""
    isotherm = np.maximum(isotherm, 15.0)
    mixed = 0.8 * FINE_DEPTH[np.argmax(mean < mean[:, :1] - _MIXED, axis=1)]
    mixed = np.clip(mixed, 5.0, 0.6 * isotherm)
    deep = _deep(mean, isotherm)
    share = (_read(mean, 0.5 * (mixed + isotherm)) - ISOTHERM) / np.maximum(mean[:, 0] - ISOTHERM, 1.0)
    exponent = np.clip(np.log(np.clip(1.0 - share, 0.05, 0.95)) / np.log(0.5), 1.2, 2.2)
    fading = isotherm + _FADES_BELOW
    left = (_read(mean, fading) - _read(deep, fading)) / (ISOTHERM - _read(deep, isotherm))
    decay = np.clip(-_SHARPER * _FADES_BELOW / np.log(np.clip(left, 0.05, 0.8)), 18.0, 60.0)
    return mixed[:, None], exponent[:, None], decay[:, None], deep


def _deep(mean: Floats, isotherm: Floats) -> Floats:
    """Return the water below the thermocline, continued upward with a small gradient."""
    start = isotherm + _DEEP_BELOW
    continued = _read(mean, start)[:, None] + _DEEP_GRADIENT * (start[:, None] - FINE_DEPTH)
    return np.where(start[:, None] > FINE_DEPTH, np.minimum(continued, mean), mean)


def _read(profiles: Floats, depth: Floats) -> Floats:
    """Return each row of ``profiles`` (position, level) at its own ``depth`` (position,)."""
    return np.array([np.interp(where, FINE_DEPTH, row) for where, row in zip(depth, profiles, strict=True)])
