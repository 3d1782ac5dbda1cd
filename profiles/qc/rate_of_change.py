"""Rate of change: QARTOD test 7 in the two-sided (EuroGOOS) form.

Implemented is |V2 - V1| + |V3 - V2| > 2 N SD, where SD is the robust standard deviation of the *first
differences* of the sensor's whole record, but at least a floor. The manuals differ on what SD is of; that of
the values would scale with the season and not with what happens from one sample to the next.
"""

from __future__ import annotations

import numpy as np

from profiles.config import QualityControlSettings
from profiles.qc.check import Check, Floats, Mask, Outcomes, Segment, Survey, one_neighbour, outcomes
from profiles.qc.neighbours import after, before, is_linked


def first_difference(temperature: Floats, linked: Mask) -> Floats:
    """Return V2 - V1, °C, (time, depth); NaN where one is missing or a gap lies between."""
    with np.errstate(invalid="ignore"):  # infinite values side by side
        return np.asarray(temperature - before(temperature, linked))


def rate_of_change_outcome(
    temperature: Floats, linked: Mask, sd: Floats, *, deviations: float, floor: float
) -> Outcomes:
    """Flag changes that the sensor's record makes unlikely; never worse than questionable.

    Parameters
    ----------
    temperature : ndarray, shape (time, depth)
        °C; NaN gives 9, and 2 on either side of it.
    linked : ndarray of bool, shape (time,)
        Whether a sample follows the one before without a gap.
    sd : ndarray, shape (depth,)
        Standard deviation of first differences, °C; NaN counts as the floor.
    deviations : float
        Limit on the mean of the two changes, in standard deviations.
    floor : float
        Least standard deviation, °C.
    """
    to_here = first_difference(temperature, linked)
    change = np.abs(to_here) + np.abs(after(to_here, linked))
    limit = 2.0 * deviations * np.fmax(sd, floor)
    return outcomes(~np.isnan(temperature), ~np.isnan(change), change > limit, np.False_)


def _outcome(segment: Segment, survey: Survey, settings: QualityControlSettings) -> Outcomes:
    linked = is_linked(segment.time, survey.nominal_interval, settings.gap.longest_interval)
    sd = survey.spread[CHECK.name]
    return rate_of_change_outcome(segment.temperature, linked, sd, **settings.rate_of_change.model_dump())


def _survey(segment: Segment, nominal_interval: float, settings: QualityControlSettings) -> Floats:
    linked = is_linked(segment.time, nominal_interval, settings.gap.longest_interval)
    return first_difference(segment.temperature, linked)


CHECK = Check("rate_of_change", _outcome, one_neighbour, _survey)
