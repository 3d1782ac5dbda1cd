"""Spike in time: QARTOD test 6, |V2 - (V1 + V3)/2|, without the subtraction of vertical spike tests."""

from __future__ import annotations

import numpy as np

from profiles.config import QualityControlSettings
from profiles.qc.check import Check, Floats, Mask, Outcomes, Segment, Survey, one_neighbour, outcomes
from profiles.qc.neighbours import after, before, is_linked


def spike_height(temperature: Floats, linked: Mask) -> Floats:
    """Return |V2 - (V1 + V3)/2|, V1 and V3 being the samples before and after V2.

    Parameters
    ----------
    temperature : ndarray, shape (time, depth)
        °C.
    linked : ndarray of bool, shape (time,)
        Whether a sample follows the one before without a gap.

    Returns
    -------
    ndarray, shape (time, depth)
        °C; NaN where one of the three is missing or too far away.
    """
    with np.errstate(invalid="ignore"):  # infinite values side by side
        return np.abs(temperature - (before(temperature, linked) + after(temperature, linked)) / 2)


def spike_outcome(temperature: Floats, linked: Mask, *, threshold_low: float, threshold_high: float) -> Outcomes:
    """Flag spikes above ``threshold_low`` as questionable and above ``threshold_high`` as bad, both in °C.

    Arguments as in :func:`spike_height`. A missing value gives 9; a value without both neighbours gives 2.
    """
    height = spike_height(temperature, linked)
    return outcomes(~np.isnan(temperature), ~np.isnan(height), height > threshold_low, height > threshold_high)


def _outcome(segment: Segment, survey: Survey, settings: QualityControlSettings) -> Outcomes:
    linked = is_linked(segment.time, survey.nominal_interval, settings.gap.longest_interval)
    return spike_outcome(segment.temperature, linked, **settings.spike.model_dump())


CHECK = Check("spike", _outcome, one_neighbour)
