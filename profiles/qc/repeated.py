"""Repeated profiles: a stretch of the record that stands in it once more, as when files were joined wrongly.

The rule is ours. What several sensors read together does not come again value for value, sample after sample.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from profiles.config import QualityControlSettings
from profiles.qc.check import Check, Floats, Mask, Outcomes, Segment, Survey, outcomes

Signatures = NDArray[np.int64]

#: A profile that stands in a record more often says nothing: few sensors of coarse resolution often read the same.
_MOST_OFTEN = 3


def signatures(temperature: Floats) -> Signatures:
    """Return a number for each profile, (time,), equal where all of its values are equal or missing alike."""
    return np.array([hash(profile.tobytes()) for profile in np.ascontiguousarray(temperature)], dtype=np.int64)


def is_comparable(temperature: Floats, sensors: int) -> Mask:
    """Tell which profiles have values of ``sensors`` sensors or more, (time,)."""
    return np.asarray(np.isfinite(temperature).sum(axis=1) >= sensors)


def repeats(signature: Signatures, comparable: Mask, samples: int) -> Mask:
    """Tell which profiles belong to ``samples`` or more in a row that are those of an earlier stretch, in its order.

    Parameters
    ----------
    signature : ndarray of int, shape (time,)
        Of every profile of the record.
    comparable : ndarray of bool, shape (time,)
        Whether a profile has values enough.
    samples : int
        Length of the shortest stretch.

    Returns
    -------
    ndarray of bool, shape (time,)
        True in the later stretch, False in the first.
    """
    order = np.argsort(signature, kind="stable")
    same = np.diff(signature[order]) == 0
    back = np.zeros(signature.size, dtype=np.int64)  # how many samples ago the profile stood there last
    back[order[1:]] = np.where(same, np.diff(order), 0)
    _, which, often = np.unique(signature, return_inverse=True, return_counts=True)
    back[~comparable | (often[which] > _MOST_OFTEN)] = 0
    edges = np.concatenate([[0], np.flatnonzero(np.diff(back)) + 1, [back.size]])
    length = np.diff(edges)
    return np.asarray(np.repeat((length >= samples) & (back[edges[:-1]] > 0), length))


def repeated_outcome(repeated: Mask, temperature: Floats, *, sensors: int) -> Outcomes:
    """Call bad the profiles that are copies.

    Parameters
    ----------
    repeated : ndarray of bool, shape (time,)
    temperature : ndarray, shape (time, depth)
        °C; NaN gives 9, a profile of fewer than ``sensors`` values 2.
    sensors : int
    """
    judged = is_comparable(temperature, sensors)[:, None]
    return outcomes(~np.isnan(temperature), judged, np.False_, repeated[:, None])


def _outcome(segment: Segment, survey: Survey, settings: QualityControlSettings) -> Outcomes:
    repeated = np.isin(segment.time, survey.repeated)
    return repeated_outcome(repeated, segment.temperature, sensors=settings.repeated.sensors)


CHECK = Check("repeated", _outcome)
