"""How many independent values a series with persistence is worth."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

Floats = NDArray[np.float64]


def lag_one(series: ArrayLike) -> float:
    """Return the lag-one autocorrelation of an evenly spaced series, NaN missing; 0 with fewer than three pairs.

    The estimate of a short series is too small by about (1 + 4 r) / n (Kendall 1954, from memory), which is added.
    """
    values = np.asarray(series, dtype=np.float64)
    departures = values - np.nanmean(values) if np.isfinite(values).any() else values
    pairs = np.isfinite(departures[1:]) & np.isfinite(departures[:-1])
    count = int(pairs.sum())
    variance = float(np.nanmean(departures**2)) if np.isfinite(values).any() else 0.0
    if count < 3 or variance == 0.0:
        return 0.0
    raw = float((departures[1:][pairs] * departures[:-1][pairs]).mean() / variance)
    return float(np.clip(raw + (1.0 + 4.0 * raw) / count, -0.95, 0.95))


def effective_count(count: float, product: float) -> float:
    """Return n (1 - p) / (1 + p), no more than n.

    Parameters
    ----------
    count : float
        n, the number of values.
    product : float
        p: the lag-one autocorrelation for a mean; the product of two for the correlation of two series; the square of
        one for a variance.

    References
    ----------
    Bretherton et al. (1999), J. Climate 12, 1990-2009 (the product form and that of a variance from memory).
    """
    return float(count * min(1.0, (1.0 - product) / (1.0 + product)))
