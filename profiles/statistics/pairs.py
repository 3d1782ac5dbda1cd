"""Correlation and regression of two autocorrelated series, with the effective size of the sample."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.special import stdtr, stdtrit

Array = NDArray[np.float64]

LARGER = 0.75  # weight of the larger of two estimates of a variance (ours; keeps false alarms at their rate, bench)


@dataclass(frozen=True)
class PairedStatistics:
    """What pairs of values say, each of shape (...).

    Attributes
    ----------
    count : ndarray
        Pairs.
    effective_size : ndarray
        Independent pairs that would tell as much, 1 + 1 / var(r), at most ``count``.
    correlation, slope, slope_error : ndarray
        Of the second on the first; the error is one standard deviation with the effective size.
    t, p_value : ndarray
        t = r sqrt((n - 2) / (1 - r^2)) with the effective size n, two-sided, n - 2 degrees of freedom.
    """

    count: Array
    effective_size: Array
    correlation: Array
    slope: Array
    slope_error: Array
    t: Array
    p_value: Array

    def interval(self, level: float = 0.95) -> tuple[Array, Array]:
        """Return the interval of the correlation by Fisher's z with the effective size; NaN at 3 or fewer."""
        room = np.where(self.effective_size > 3.0, self.effective_size - 3.0, np.nan)
        half = _normal_quantile(level) / np.sqrt(room)
        middle = np.arctanh(np.clip(self.correlation, -1.0 + 1e-15, 1.0 - 1e-15))
        return np.tanh(middle - half), np.tanh(middle + half)


def _normal_quantile(level: float) -> float:
    return float(stdtrit(1e12, 0.5 + level / 2.0))


def paired_statistics(
    first: Array,
    second: Array,
    first_memory: Array,
    second_memory: Array,
    *,
    first_scale: Array | float = 1.0,
    second_scale: Array | float = 1.0,
) -> PairedStatistics:
    """Return correlation, regression and their test for pairs of values.

    Parameters
    ----------
    first, second : ndarray, shape (..., time)
        At equal steps. A pair counts where both are finite.
    first_memory, second_memory : ndarray, shape (..., time)
        Autocorrelation of each at lags of 0, 1, ... of those steps, at least as many as there are times.
    first_scale, second_scale : ndarray, shape (..., time), or float
        Standard deviation of each at each time, up to a factor, where it changes, as with the season; finite wherever
        the series is. The autocorrelation is then that of the series over it.

    Returns
    -------
    PairedStatistics
        NaN where there are fewer than three pairs, or where one of the two does not vary over them.

    Notes
    -----
    Let u be the first series over the pairs, its mean removed and of unit length. If the second is independent of it
    and has the covariance matrix R over them, up to a factor, then var(r) = u'Ru / tr(PRP), P taking the mean away:
    with a constant spread the mean over u of this is the product of the two autocorrelations, summed, of Bayley and
    Hammersley (1946) and Bartlett (1946). Here the u of the record itself is kept. The same holds with the two
    exchanged; of the two variances the geometric mean counts, the larger with a weight of 3/4, so the test is the same
    whichever comes first. No white series or full record is assumed: R has whatever shape was fitted, and missing pairs
    drop out of u and P.
    """
    both = np.isfinite(first) & np.isfinite(second)
    count = both.sum(axis=-1).astype(np.float64)
    usable = np.where(count >= 3.0, count, np.nan)
    x, x_size = _unit(first, both, usable)
    y, y_size = _unit(second, both, usable)
    correlation = np.clip((x * y).sum(axis=-1), -1.0, 1.0)
    given_first = _variance(x, second_memory, np.where(both, second_scale, 0.0), usable)
    given_second = _variance(y, first_memory, np.where(both, first_scale, 0.0), usable)
    larger, smaller = np.maximum(given_first, given_second), np.minimum(given_first, given_second)
    variance = larger**LARGER * smaller ** (1.0 - LARGER)
    effective = np.minimum(1.0 + 1.0 / variance, usable)
    freedom = np.where(effective > 2.0, effective - 2.0, np.nan)
    unexplained = np.maximum(1.0 - correlation**2, 1e-15)
    t = correlation * np.sqrt(freedom / unexplained)
    scale = y_size / x_size
    return PairedStatistics(
        count=count,
        effective_size=effective,
        correlation=correlation,
        slope=correlation * scale,
        slope_error=scale * np.sqrt(unexplained / freedom),
        t=t,
        p_value=2.0 * stdtr(freedom, -np.abs(t)),
    )


def _unit(values: Array, both: NDArray[np.bool_], count: Array) -> tuple[Array, Array]:
    """Return the values over the pairs without their mean and of unit length, 0 elsewhere, and that length."""
    kept = np.where(both, values, 0.0)
    centred = np.where(both, kept - (kept.sum(axis=-1) / count)[..., None], 0.0)
    length = np.sqrt((centred**2).sum(axis=-1))
    # What rounding leaves of a constant is no variation.
    length = np.where(length > 1e-12 * np.sqrt(count) * np.abs(kept).max(axis=-1), length, np.nan)
    return centred / length[..., None], length


def lagged_products(values: Array) -> Array:
    """Return c_h = sum_t v_t v_(t+h), doubled at h > 0, so that sum_h c_h R_h = v'Rv for a stationary R."""
    length = values.shape[-1]
    padded = 1 << (2 * length - 1).bit_length()
    power = np.abs(np.fft.rfft(np.nan_to_num(values), padded, axis=-1)) ** 2
    products = np.fft.irfft(power, padded, axis=-1)[..., :length]
    products[..., 1:] *= 2.0
    return products


def _variance(unit: Array, memory: Array, scale: Array, count: Array) -> Array:
    """Return u'Ru / tr(PRP) over the pairs; ``scale`` is 0 elsewhere."""
    length = unit.shape[-1]
    spread = (lagged_products(unit * scale) * memory[..., :length]).sum(axis=-1)
    trace = (scale**2).sum(axis=-1) - (lagged_products(scale) * memory[..., :length]).sum(axis=-1) / count
    return np.where(np.isfinite(unit).all(axis=-1), spread / trace, np.nan)
