"""Regression on the positive and on the negative part of a predictor: whether charge and discharge act alike."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from profiles.precursor.memory import fit_memory

Array = NDArray[np.float64]


def split_regression(predictor: Array, target: Array, month: NDArray[np.int64]) -> tuple[Array, Array]:
    """Return the slopes of the target on the positive and on the negative part of a predictor, and their errors.

    Parameters
    ----------
    predictor : ndarray, shape (time,)
        Anomalies.
    target : ndarray, shape (lead, time)
        NaN is missing.
    month : ndarray of int, shape (time,)
        Calendar month, 1 to 12.

    Returns
    -------
    tuple of ndarray, shape (2, lead)
        Slopes of positive and of negative anomalies, y = a + b max(x, 0) + c min(x, 0) + e by least squares, and their
        standard errors. The parts are chosen by the predictor: chosen by the target, slopes would be biased.

    Notes
    -----
    The covariance of the coefficients is (X'X)^-1 X'RX (X'X)^-1 s^2 with R the autocovariance of the residuals up to a
    factor, from their memory and seasonal spread (:func:`profiles.precursor.memory.fit_memory`), and s^2 their sum of
    squares over tr(MR), M = I - X (X'X)^-1 X'.
    """
    parts = np.stack([np.ones_like(predictor), np.maximum(predictor, 0.0), np.minimum(predictor, 0.0)], axis=-1)
    slopes, errors = np.full((2, target.shape[0]), np.nan), np.full((2, target.shape[0]), np.nan)
    for lead, values in enumerate(target):
        both = np.isfinite(predictor) & np.isfinite(values)
        signs = [int((predictor[both] > 0.0).sum()), int((predictor[both] < 0.0).sum())]
        if min(signs) < 3:
            continue
        slopes[:, lead], errors[:, lead] = _fit(parts, values, both, month)
    return slopes, errors


def _fit(parts: Array, values: Array, both: NDArray[np.bool_], month: NDArray[np.int64]) -> tuple[Array, Array]:
    design, response = parts[both], values[both]
    inverse = np.linalg.inv(design.T @ design)
    coefficients = inverse @ design.T @ response
    residuals = np.where(both, values - parts @ coefficients, np.nan)
    place = np.flatnonzero(both)
    memory = fit_memory(residuals, month)
    scale = memory.scale[both]
    matrix = memory.autocorrelation[np.abs(place[:, None] - place)] * scale[:, None] * scale
    spread = design.T @ matrix @ design
    trace = (scale**2).sum() - np.trace(inverse @ spread)
    variance = float(np.nansum(residuals**2)) / trace
    return coefficients[1:], np.sqrt(np.diag(inverse @ spread @ inverse)[1:] * variance)
