"""Values from a chain that was not in the water, by the recovery log or by what it read."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from profiles.config import QualityControlSettings
from profiles.qc.check import Check, Mask, Outcomes, Segment, Survey, outcomes
from profiles.vocabulary import Water


def water_outcome(status: NDArray[np.integer], present: Mask) -> Outcomes:
    """Call bad what was not measured in the water.

    Parameters
    ----------
    status : ndarray of int, shape (time,)
        :class:`profiles.vocabulary.Water`.
    present : ndarray of bool, shape (time, depth)
        False gives 9.
    """
    return outcomes(present, np.True_, np.False_, (status != Water.IN_WATER)[:, None] & present)


def _outcome(segment: Segment, survey: Survey, settings: QualityControlSettings) -> Outcomes:
    present = ~np.isnan(segment.temperature)
    if segment.water is None:
        return outcomes(present, np.False_, np.False_, np.False_)
    return water_outcome(segment.water, present)


CHECK = Check("water", _outcome)
