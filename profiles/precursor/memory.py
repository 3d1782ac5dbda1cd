"""The memory of a monthly series: how its spread follows the seasons, and the autocorrelation of what is left."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from profiles.statistics import autocorrelation_of, fit_reflection

Array = NDArray[np.float64]


@dataclass(frozen=True)
class Memory:
    """What was fitted to series of shape (..., time).

    Attributes
    ----------
    reflection : ndarray, shape (..., order)
        Of the autoregressive model, see :func:`profiles.statistics.fit_reflection`.
    autocorrelation : ndarray, shape (..., time)
        Of the model at lags of 0, 1, ... months.
    scale : ndarray, shape (..., time)
        Standard deviation of the calendar month of each time, over that of all months.
    """

    reflection: Array
    autocorrelation: Array
    scale: Array


def fit_memory(values: Array, month: NDArray[np.int64]) -> Memory:
    """Fit the memory of anomalies.

    Parameters
    ----------
    values : ndarray, shape (..., time)
        Monthly; NaN is missing.
    month : ndarray of int, shape (time,)
        Calendar month, 1 to 12.

    Notes
    -----
    Warm and cold events are locked to the season: their index swings two to three times as far at the turn of the year
    as in spring. A test that takes the spread for constant then finds too much at leads of 0 and 12 months, too little
    between (``tests/bench/false_alarm.py``).
    """
    centred = values - np.nanmean(values, axis=-1, keepdims=True)
    scale = seasonal_spread(centred, month)
    reflection = fit_reflection(centred / scale)
    return Memory(reflection, autocorrelation_of(reflection, values.shape[-1]), scale)


def seasonal_spread(values: Array, month: NDArray[np.int64]) -> Array:
    """Return the standard deviation of the calendar month of each time, over that of all months, (..., time).

    Variances are averaged over three months, the middle one counting double: a few decades know one month's badly. 1
    where a month and its neighbours have no value, or nothing varies.
    """
    squares = np.nan_to_num(values) ** 2
    known = np.isfinite(values).astype(np.float64)
    place = (month[None, :] == np.arange(1, 13)[:, None]).astype(np.float64)
    near = 2.0 * place + np.roll(place, 1, axis=0) + np.roll(place, -1, axis=0)
    total, count = squares @ near.T, known @ near.T
    overall = squares.sum(axis=-1, keepdims=True) / np.maximum(known.sum(axis=-1, keepdims=True), 1.0)
    usable = (count > 0.0) & (total > 0.0) & (overall > 0.0)
    variance = np.where(usable, total / np.where(usable, count * overall, 1.0), 1.0)
    spread: Array = np.sqrt(variance)[..., month - 1]
    return spread
