"""Gross range: QARTOD test 4."""

from __future__ import annotations

import numpy as np

from profiles.config import QualityControlSettings
from profiles.qc.check import Check, Floats, Outcomes, Segment, Survey, outcomes


def gross_range_outcome(
    temperature: Floats, *, sensor_min: float, sensor_max: float, user_min: float, user_max: float
) -> Outcomes:
    """Flag what no sensor can measure as bad and what no sea of the region holds as questionable.

    Parameters
    ----------
    temperature : ndarray
        °C, any shape; NaN gives 9.
    sensor_min, sensor_max : float
        °C; outside is bad.
    user_min, user_max : float
        °C; outside is questionable. The limits themselves pass.
    """
    questionable = (temperature < user_min) | (temperature > user_max)
    bad = (temperature < sensor_min) | (temperature > sensor_max)
    return outcomes(~np.isnan(temperature), np.True_, questionable, bad)


def _outcome(segment: Segment, survey: Survey, settings: QualityControlSettings) -> Outcomes:
    return gross_range_outcome(segment.temperature, **settings.gross_range.model_dump())


CHECK = Check("gross_range", _outcome)
