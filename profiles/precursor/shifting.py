"""Pairs of a predictor and a target that lie so many months apart."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

Array = NDArray[np.float64]


def shifted(target: Array, leads: ArrayLike) -> Array:
    """Return the target so many months after each time.

    Parameters
    ----------
    target : ndarray, shape (..., time)
        Monthly.
    leads : array_like of int, shape (lead,)
        Months; positive looks ahead: the predictor at the time comes first.

    Returns
    -------
    ndarray, shape (..., lead, time)
        ``result[..., k, t] = target[..., t + leads[k]]``, NaN beyond the record.
    """
    length = target.shape[-1]
    places = np.arange(length) + np.asarray(leads)[:, None]
    inside = (places >= 0) & (places < length)
    return np.where(inside, target[..., np.clip(places, 0, length - 1)], np.nan)
