"""Climatological range by depth: QARTOD test 5, against the packaged atlas."""

from __future__ import annotations

from functools import lru_cache

import numpy as np

from profiles.atlas import seasonal_profile
from profiles.config import ClimatologySettings, QualityControlSettings
from profiles.errors import DataError
from profiles.qc.check import Check, Floats, Outcomes, Segment, Survey, Times, outcomes
from profiles.statistics import harmonic_design, year_fraction

#: Depth, m, from which ``floor_deep`` holds; above, the floor is linear from ``floor_shallow`` at the surface
#: (ours).
DEEP = 500.0


def interpolate_profile(profile: Floats, levels: Floats, depth: Floats) -> Floats:
    """Interpolate each time's profile linearly in depth.

    Parameters
    ----------
    profile : ndarray, shape (time, level)
    levels : ndarray, shape (level,)
        m, ascending, at least two.
    depth : ndarray, shape (time or 1, depth)
        m, within the levels.

    Returns
    -------
    ndarray, shape (time, depth)
    """
    above = np.clip(np.searchsorted(levels, depth, side="right") - 1, 0, levels.size - 2)
    share = (depth - levels[above]) / (levels[above + 1] - levels[above])
    rows = np.arange(len(profile))[:, None]
    return np.asarray((1.0 - share) * profile[rows, above] + share * profile[rows, above + 1])


def layer_extremes(profile: Floats, levels: Floats, top: Floats, bottom: Floats) -> tuple[Floats, Floats]:
    """Return the least and the greatest value of each time's profile between two depths.

    Parameters
    ----------
    profile : ndarray, shape (time, level)
    levels : ndarray, shape (level,)
        m, ascending; the profile is linear between them.
    top, bottom : ndarray, shape (time or 1, depth)
        m, within the levels.

    Returns
    -------
    least, greatest : ndarray, shape (time, depth)
    """
    at_top = interpolate_profile(profile, levels, top)
    at_bottom = interpolate_profile(profile, levels, bottom)
    least, greatest = np.minimum(at_top, at_bottom), np.maximum(at_top, at_bottom)
    for level, values in zip(levels, profile.T, strict=True):
        inside = (top <= level) & (level <= bottom)
        np.minimum(least, values[:, None], out=least, where=inside)
        np.maximum(greatest, values[:, None], out=greatest, where=inside)
    return least, greatest


def climatology_window(
    profile: Floats,
    levels: Floats,
    depth: Floats,
    *,
    deviations: float,
    displacement_sd: float,
    floor_shallow: float,
    floor_deep: float,
) -> tuple[Floats, Floats]:
    """Return the range of temperatures that the climatology allows.

    The range of the profile within ``deviations * displacement_sd`` of the depth (for a profile that cools
    downwards: from its value below to its value above), widened by ``deviations`` times a standard deviation
    that is linear in depth from the surface to 500 m.

    Parameters
    ----------
    profile : ndarray, shape (time, level)
        °C.
    levels : ndarray, shape (level,)
        m, positive down, ascending; depths beyond are taken at the nearest.
    depth : ndarray, shape (time or 1, depth)
        m, positive down.
    deviations : float
        Half-width, in standard deviations.
    displacement_sd : float
        Standard deviation of the vertical displacement of the profile, m.
    floor_shallow, floor_deep : float
        Standard deviation, °C, displacement aside, at the surface and from 500 m down.

    Returns
    -------
    lower, upper : ndarray, shape (time, depth)
        °C; the profile itself always lies between.
    """
    reach = deviations * displacement_sd
    top, bottom = (np.clip(depth + shift, levels[0], levels[-1]) for shift in (-reach, reach))
    coldest, warmest = layer_extremes(profile, levels, top, bottom)
    margin = deviations * np.interp(depth, [0.0, DEEP], [floor_shallow, floor_deep])
    return coldest - margin, warmest + margin


def climatology_outcome(temperature: Floats, lower: Floats, upper: Floats) -> Outcomes:
    """Flag values outside the window as questionable, never as bad.

    Parameters
    ----------
    temperature : ndarray, shape (time, depth)
        °C; NaN gives 9.
    lower, upper : ndarray, shapes that broadcast to that of ``temperature``
        °C; the limits themselves pass. NaN gives 2.
    """
    judged = ~(np.isnan(lower) | np.isnan(upper))
    questionable = (temperature < lower) | (temperature > upper)
    return outcomes(~np.isnan(temperature), judged, questionable, np.False_)


@lru_cache(maxsize=8)
def _atlas_harmonics(latitude: float, longitude: float) -> tuple[Floats, Floats] | None:
    """Return the atlas's levels and (harmonic, level) coefficients at a position, None outside the atlas."""
    try:
        profile = seasonal_profile(latitude, longitude)
    except DataError:
        return None
    return profile["depth"].values, profile.isel(position=0).transpose("harmonic", "depth").values


def _atlas_window(
    time: Times, depth: Floats, levels: Floats, harmonics: Floats, settings: ClimatologySettings
) -> tuple[Floats, Floats]:
    # Term by term: a matrix product may differ in the last bit with the number of rows, and so with the
    # blocks.
    terms = harmonic_design(year_fraction(time))
    profile = np.zeros((time.size, levels.size))
    for term, coefficients in zip(terms.T, harmonics, strict=True):
        profile += term[:, None] * coefficients
    return climatology_window(profile, levels, depth, **settings.model_dump())


def _outcome(segment: Segment, survey: Survey, settings: QualityControlSettings) -> Outcomes:
    atlas = None if segment.position is None else _atlas_harmonics(*segment.position)
    unknown = np.full((1, 1), np.nan)
    if atlas is None:
        return climatology_outcome(segment.temperature, unknown, unknown)
    window = _atlas_window(segment.time, segment.depth, *atlas, settings.climatology)
    return climatology_outcome(segment.temperature, *window)


CHECK = Check("climatology", _outcome)
