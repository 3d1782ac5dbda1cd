"""The flag that came with the delivery, as one test among the others."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from profiles.config import QualityControlSettings
from profiles.errors import DataError
from profiles.qc.check import Check, Mask, Outcomes, Segment, Survey, outcomes
from profiles.vocabulary import Flag


def delivered_flag_outcome(delivered: NDArray[np.integer], present: Mask) -> Outcomes:
    """Take over the sender's flags.

    Parameters
    ----------
    delivered : ndarray of int
        :class:`profiles.vocabulary.Flag`. A value that the sender calls missing (9) is bad: it stands for
        none.
    present : ndarray of bool, same shape
        False gives 9.
    """
    judged = delivered != Flag.NOT_EVALUATED
    bad = (delivered == Flag.BAD) | (delivered == Flag.MISSING)
    return outcomes(present, judged, delivered == Flag.QUESTIONABLE, bad)


def _outcome(segment: Segment, survey: Survey, settings: QualityControlSettings) -> Outcomes:
    present = ~np.isnan(segment.temperature)
    if segment.delivered is None:
        return delivered_flag_outcome(np.full(present.shape, Flag.NOT_EVALUATED), present)
    _check_known(segment.delivered)
    return delivered_flag_outcome(segment.delivered, present)


def _check_known(delivered: NDArray[np.integer]) -> None:
    strange = np.setdiff1d(delivered, [int(flag) for flag in Flag])
    if strange.size:
        raise DataError(
            "the delivered flags hold codes that are no primary-level flag",
            where="temperature_delivered_qc",
            expected="1, 2, 3, 4 or 9",
            found=", ".join(str(code) for code in strange[:5]),
            advice="translate the sender's flags when reading the delivery",
        )


CHECK = Check("delivered_flag", _outcome)
