"""The autocorrelation of a short record through an autoregressive model, fitted by Burg's method; gaps allowed."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

LARGEST_ORDER = 30  # enough for an oscillation of two variables seen in one of them (ours; tests/bench/false_alarm.py)
SAMPLES_PER_ORDER = 8  # a record is asked for at most one coefficient in so many of its samples (ours)
SUPPORTED = 2.0  # models within so much of the least AICc have substantial support (Burnham and Anderson 2002, 2.6)


def burg_reflection(values: Array, largest: int) -> Array:
    """Return the reflection coefficients of orders 1 to ``largest``.

    Parameters
    ----------
    values : ndarray, shape (..., time)
        At equal steps; NaN is missing. The mean is removed first.
    largest : int
        Highest order.

    Returns
    -------
    ndarray, shape (..., largest)
        Each at most 1 in size, so that every order gives a stationary model. 0 where nothing is left to fit.

    Notes
    -----
    Burg (1967), as in Brockwell and Davis (1991), section 8.2: each coefficient is the least-squares one between the
    forward and the backward errors of the order before. Across a gap no errors are formed.
    """
    centred = values - np.nanmean(values, axis=-1, keepdims=True)
    forward = backward = np.asarray(centred, dtype=np.float64)
    reflection = np.zeros((*values.shape[:-1], largest))
    for order in range(largest):
        forward, backward = forward[..., 1:], backward[..., :-1]
        product = forward * backward
        power = np.where(np.isnan(product), 0.0, forward**2 + backward**2).sum(axis=-1)
        coefficient = 2.0 * np.nansum(product, axis=-1) / np.where(power > 0.0, power, 1.0)
        forward, backward = forward - coefficient[..., None] * backward, backward - coefficient[..., None] * forward
        reflection[..., order] = coefficient
    return reflection


def supported_order(reflection: Array, count: Array | int) -> NDArray[np.intp]:
    """Return the highest order that the data support.

    Parameters
    ----------
    reflection : ndarray, shape (..., order)
        Of :func:`burg_reflection`.
    count : ndarray or int, shape (...)
        Number of samples.

    Returns
    -------
    ndarray of int, shape (...)
        The highest order p whose AICc is within 2 of the least, AICc = n ln v_p + 2 (p + 2) n / (n - p - 3) with the
        share of variance v_p = product (1 - k_j^2) that is left (Hurvich and Tsai 1989). Not the least itself: too low
        an order hides an oscillation and makes a test find too much, while an order too high costs little.
    """
    samples = np.asarray(count, dtype=np.float64)[..., None]
    orders = np.arange(reflection.shape[-1] + 1)
    left = np.cumsum(np.log(np.maximum(1.0 - reflection**2, 1e-300)), axis=-1)
    left = np.concatenate([np.zeros_like(left[..., :1]), left], axis=-1)
    room = samples - orders - 3.0
    penalty = np.where(room > 0.0, 2.0 * (orders + 2.0) * samples / np.where(room > 0.0, room, 1.0), np.inf)
    criterion = samples * left + penalty
    supported = criterion <= criterion.min(axis=-1, keepdims=True) + SUPPORTED
    highest: NDArray[np.intp] = orders[-1] - np.argmax(supported[..., ::-1], axis=-1)
    return highest


def fit_reflection(values: Array, largest: int | None = None) -> Array:
    """Return the reflection coefficients of the highest order that the data support, 0 above it.

    Parameters
    ----------
    values : ndarray, shape (..., time)
        NaN is missing.
    largest : int, optional
        Highest order tried; default 30, or an eighth of the samples where that is less.

    Returns
    -------
    ndarray, shape (..., largest)
    """
    count = np.isfinite(values).sum(axis=-1)
    if largest is None:
        largest = int(min(LARGEST_ORDER, max(int(np.min(count)) // SAMPLES_PER_ORDER, 1)))
    reflection = burg_reflection(values, largest)
    order = supported_order(reflection, count)
    return np.where(np.arange(largest) < order[..., None], reflection, 0.0)


def coefficients_of(reflection: Array) -> Array:
    """Return the coefficients of x_t = sum a_j x_(t-j) + e_t, shape (..., order), by Levinson's recursion."""
    coefficients = reflection[..., :0]
    for order in range(reflection.shape[-1]):
        last = reflection[..., order : order + 1]
        coefficients = np.concatenate([coefficients - last * coefficients[..., ::-1], last], axis=-1)
    return coefficients


def autocorrelation_of(reflection: Array, lags: int) -> Array:
    """Return the autocorrelation of the model at lags 0 to ``lags``, shape (..., lags + 1)."""
    order = reflection.shape[-1]
    correlation = np.zeros((*reflection.shape[:-1], max(lags, order) + 1))
    correlation[..., 0] = 1.0
    coefficients = reflection[..., :0]
    left = np.ones(reflection.shape[:-1])
    for lag in range(1, order + 1):
        last = reflection[..., lag - 1]
        known = np.sum(coefficients * correlation[..., lag - 1 : 0 : -1], axis=-1)
        correlation[..., lag] = last * left + known
        coefficients = np.concatenate(
            [coefficients - last[..., None] * coefficients[..., ::-1], last[..., None]], axis=-1
        )
        left = left * (1.0 - last**2)
    for lag in range(order + 1, lags + 1):
        correlation[..., lag] = np.sum(coefficients * correlation[..., lag - 1 : lag - order - 1 : -1], axis=-1)
    return correlation[..., : lags + 1]


def simulate(reflection: Array, length: int, draws: int, generator: np.random.Generator) -> Array:
    """Return Gaussian series of the model with unit innovations, shape (draws, length).

    Parameters
    ----------
    reflection : ndarray, shape (order,)
    length, draws : int
    generator : numpy.random.Generator

    Notes
    -----
    The first ``length`` steps of each are thrown away, so that the start is forgotten.
    """
    from scipy.signal import lfilter  # here, for it takes long to import and the other rooms do not need it

    polynomial = np.concatenate([[1.0], -coefficients_of(reflection)])
    noise = generator.standard_normal((draws, 2 * length))
    return np.asarray(lfilter([1.0], polynomial, noise, axis=-1))[:, length:]
