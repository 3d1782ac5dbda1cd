"""Flat line: QARTOD test 8, in delayed mode.

A window is a value with its ``repeats`` previous ones, no missing value and no gap among them; it is flat
when all of them lie within the tolerance of its newest. The manual flags the newest value of a flat window.
Here, since the record is complete, every value of the window but its first carries the flag: the first may be
the last true one.
"""

from __future__ import annotations

import numpy as np

from profiles.config import QualityControlSettings
from profiles.qc.check import Check, Floats, Mask, Outcomes, Segment, Survey, outcomes
from profiles.qc.neighbours import is_linked


def ends_window(temperature: Floats, linked: Mask, *, repeats: int, tolerance: float) -> Mask:
    """Tell where a value lies within ``tolerance`` of each of its ``repeats`` previous ones.

    Parameters
    ----------
    temperature : ndarray, shape (time, depth)
        °C.
    linked : ndarray of bool, shape (time,)
        Whether a sample follows the one before without a gap.
    repeats : int
        How many previous values.
    tolerance : float
        °C; infinity asks only whether the values are there.

    Returns
    -------
    ndarray of bool, shape (time, depth)
        False where a value is missing or a gap lies among them.
    """
    flat = np.ones(temperature.shape, dtype=np.bool_)
    unbroken = np.ones(linked.size, dtype=np.bool_)
    flat[:repeats] = False
    for back in range(1, min(repeats, linked.size - 1) + 1):
        unbroken[back:] &= linked[1 : linked.size - back + 1]
        with np.errstate(invalid="ignore"):  # infinite values are not the same
            flat[back:] &= np.abs(temperature[back:] - temperature[:-back]) < tolerance
    return flat & unbroken[:, None]


def in_window(ends: Mask, length: int) -> Mask:
    """Tell which samples are among the ``length`` newest of a window, given where windows end."""
    inside = ends.copy()
    for forward in range(1, min(length, len(ends))):
        inside[:-forward] |= ends[forward:]
    return inside


def flat_line_outcome(
    temperature: Floats, linked: Mask, *, tolerance: float, repeats_questionable: int, repeats_bad: int
) -> Outcomes:
    """Flag values that do not change.

    Parameters
    ----------
    temperature : ndarray, shape (time, depth)
        °C; NaN gives 9. A value that no window of ``repeats_questionable`` holds gives 2.
    linked : ndarray of bool, shape (time,)
        Whether a sample follows the one before without a gap.
    tolerance : float
        °C; values closer than this are the same.
    repeats_questionable, repeats_bad : int
        As many previous values the same: questionable, bad.
    """
    present = ~np.isnan(temperature)
    whole = ends_window(temperature, linked, repeats=repeats_questionable, tolerance=np.inf)
    questionable = ends_window(temperature, linked, repeats=repeats_questionable, tolerance=tolerance)
    bad = ends_window(temperature, linked, repeats=repeats_bad, tolerance=tolerance)
    return outcomes(
        present,
        in_window(whole, repeats_questionable + 1),
        in_window(questionable, repeats_questionable),
        in_window(bad, repeats_bad),
    )


def _outcome(segment: Segment, survey: Survey, settings: QualityControlSettings) -> Outcomes:
    linked = is_linked(segment.time, survey.nominal_interval, settings.gap.longest_interval)
    return flat_line_outcome(segment.temperature, linked, **settings.flat_line.model_dump())


def _halo(settings: QualityControlSettings) -> int:
    return settings.flat_line.repeats_bad


CHECK = Check("flat_line", _outcome, _halo)
