"""Temperature inversion: a sensor that for a while reads warmer than one above it.

A test of this name is among GTSPP's (IOC Manuals and Guides 22, 2010, test 2.12); the rule is ours. Water that is
warmer below is rare, little and soon gone, so that an inversion mostly tells of sensors that were swapped, of a wrong
depth or of an offset. Which of two sensors errs the readings cannot say; but one that is out of order with several
others errs rather than each of those.
"""

from __future__ import annotations

import numpy as np

from profiles.config import QualityControlSettings
from profiles.qc.check import Check, Floats, Mask, Outcomes, Segment, Survey, outcomes
from profiles.qc.neighbours import count_around, is_linked


def inversion_outcome(temperature: Floats, linked: Mask, *, tolerance: float, reach: int) -> Outcomes:
    """Flag sensors that are out of order; never worse than questionable.

    Of a pair that is out of order the sensor is flagged that is so with more others; both, if they are alike.

    Parameters
    ----------
    temperature : ndarray, shape (time, depth)
        °C, depths downwards; NaN gives 9, a value without any other in its profile 2.
    linked : ndarray of bool, shape (time,)
        Whether a sample follows the one before without a gap.
    tolerance : float
        °C; by more than this the lower sensor of a pair has to be warmer.
    reach : int
        So it has to be in more than this many of the samples from ``reach`` before to ``reach`` after, that is in
        most of them, no gap among them.
    """
    present = ~np.isnan(temperature)
    pairs = _lasting_inversions(temperature, linked, tolerance, reach)
    partners = np.zeros(temperature.shape, dtype=np.int16)
    for upper, lower_warmer in enumerate(pairs):
        partners[:, upper] += lower_warmer.sum(axis=1, dtype=np.int16)
        partners[:, upper + 1 :] += lower_warmer
    suspect = np.zeros(temperature.shape, dtype=np.bool_)
    for upper, lower_warmer in enumerate(pairs):
        above, below = partners[:, upper, None], partners[:, upper + 1 :]
        suspect[:, upper] |= (lower_warmer & (above >= below)).any(axis=1)
        suspect[:, upper + 1 :] |= lower_warmer & (below >= above)
    judged = present & (present.sum(axis=1) > 1)[:, None]
    return outcomes(present, judged, suspect, np.False_)


def _lasting_inversions(temperature: Floats, linked: Mask, tolerance: float, reach: int) -> list[Mask]:
    """Return for each sensor which of those below it are warmer for a while, (time, sensors below)."""
    pairs = []
    for upper in range(temperature.shape[1] - 1):
        with np.errstate(invalid="ignore"):  # infinite values are in no order
            difference = temperature[:, upper + 1 :] - temperature[:, upper, None]
        around = count_around(difference > tolerance, linked, reach)
        pairs.append((around > reach) & ~np.isnan(difference))
    return pairs


def _outcome(segment: Segment, survey: Survey, settings: QualityControlSettings) -> Outcomes:
    linked = is_linked(segment.time, survey.nominal_interval, settings.gap.longest_interval)
    return inversion_outcome(segment.temperature, linked, **settings.inversion.model_dump())


def _halo(settings: QualityControlSettings) -> int:
    return settings.inversion.reach


CHECK = Check("inversion", _outcome, _halo)
