"""The moving-block bootstrap: resample stretches of time, so that what hangs together stays together."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]


def block_length(count: float, effective: float) -> int:
    """Return the length of blocks for so many samples of which so many are effective.

    Notes
    -----
    L = (n - L + 1)^((2/3)(1 - n'/n)), solved for L (Wilks 1997, J. Climate 10, 65-82; from memory); at most a fourth of
    the record (ours).
    """
    share = min(max(effective / count, 0.0), 1.0)
    lengths = np.arange(1, max(int(count) // 4, 1) + 1)
    balance = lengths - (count - lengths + 1.0) ** (2.0 / 3.0 * (1.0 - share))
    return int(lengths[np.argmin(np.abs(balance))])


def block_weights(samples: int, length: int, draws: int, generator: np.random.Generator) -> Array:
    """Return how often each sample is drawn, shape (draws, samples).

    Blocks of ``length`` samples start anywhere, with replacement, until the record is full (Kunsch 1989); what reaches
    beyond it is cut off. The ends are in fewer blocks than the middle.
    """
    blocks = -(-samples // length)
    starts = generator.integers(0, samples - length + 1, size=(draws, blocks))
    drawn = (starts[..., None] + np.arange(length)).reshape(draws, -1)[:, :samples]
    offset = drawn + samples * np.arange(draws)[:, None]
    return np.bincount(offset.ravel(), minlength=draws * samples).reshape(draws, samples).astype(np.float64)


def weighted_correlation(weights: Array, first: Array, second: Array) -> Array:
    """Return the correlation under each set of weights.

    Parameters
    ----------
    weights : ndarray, shape (draws, time)
    first, second : ndarray, shape (time, pairing)
        A pair counts where both are finite.

    Returns
    -------
    ndarray, shape (draws, pairing)
        NaN where no pair was drawn, or one of the two does not vary over those that were.
    """
    both = np.isfinite(first) & np.isfinite(second)
    # Means first, or the sums of squares lose their digits.
    x, y = (np.where(both, values - np.nanmean(values), 0.0) for values in (first, second))
    count = weights @ both.astype(np.float64)
    total = np.where(count > 0.0, count, np.nan)
    mean_x, mean_y = (weights @ values / total for values in (x, y))
    covariance = weights @ (x * y) / total - mean_x * mean_y
    variance_x, variance_y = (weights @ (values**2) / total - mean**2 for values, mean in ((x, mean_x), (y, mean_y)))
    product = variance_x * variance_y
    return covariance / np.sqrt(np.where(product > 0.0, product, np.nan))
