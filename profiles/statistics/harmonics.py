"""The seasonal cycle as mean, annual and semi-annual harmonics."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

#: The terms of :func:`harmonic_design`, in the order of its last axis.
HARMONICS = ("mean", "annual_cosine", "annual_sine", "semiannual_cosine", "semiannual_sine")


def year_fraction(time: ArrayLike) -> NDArray[np.float64]:
    """Return how much of its calendar year has passed at each time, 0 to 1.

    Parameters
    ----------
    time : array_like of datetime64
        Any shape; NaT gives NaN.
    """
    stamp = np.asarray(time, dtype="datetime64[ns]")
    year = stamp.astype("datetime64[Y]")
    start = year.astype("datetime64[ns]")
    length = (year + np.timedelta64(1, "Y")).astype("datetime64[ns]") - start
    return np.asarray((stamp - start) / length, dtype=np.float64)


def harmonic_design(fraction: ArrayLike) -> NDArray[np.float64]:
    """Return 1, cos, sin of the annual and cos, sin of the semi-annual cycle on a new last axis.

    Parameters
    ----------
    fraction : array_like
        Fraction of the year, any shape.
    """
    angle = 2.0 * np.pi * np.asarray(fraction, dtype=np.float64)
    terms = [np.ones_like(angle), np.cos(angle), np.sin(angle), np.cos(2 * angle), np.sin(2 * angle)]
    return np.stack(terms, axis=-1)
