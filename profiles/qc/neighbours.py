"""The samples before and after, where they are near enough in time to compare with."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from profiles.qc.check import Floats, Mask, Times


def step_seconds(time: Times) -> Floats:
    """Return the time from each sample to the next, s, one fewer than ``time``."""
    return np.asarray(np.diff(time) / np.timedelta64(1, "s"), dtype=np.float64)


def is_linked(time: Times, nominal_interval: float, longest_interval: float) -> Mask:
    """Tell which samples follow the one before without a gap.

    Parameters
    ----------
    time : ndarray of datetime64, shape (time,)
    nominal_interval : float
        s; NaN links nothing.
    longest_interval : float
        Longest step that is no gap, in nominal intervals.

    Returns
    -------
    ndarray of bool, shape (time,)
        False for the first sample.
    """
    linked = np.zeros(time.size, dtype=np.bool_)
    linked[1:] = step_seconds(time) <= longest_interval * nominal_interval
    return linked


def before(values: Floats, linked: Mask) -> Floats:
    """Return the value one sample earlier, shape as ``values``, NaN where there is none or after a gap."""
    earlier = np.full_like(values, np.nan)
    earlier[1:] = np.where(linked[1:, None], values[:-1], np.nan)
    return earlier


def after(values: Floats, linked: Mask) -> Floats:
    """Return the value one sample later, shape as ``values``, NaN where there is none or before a gap."""
    later = np.full_like(values, np.nan)
    later[:-1] = np.where(linked[1:, None], values[1:], np.nan)
    return later


def count_around(found: Mask, linked: Mask, reach: int) -> NDArray[np.int16]:
    """Count where something was found, in each sample and up to ``reach`` before and after it, as far as no gap lies
    between; shape as ``found``, (time, ...)."""
    count = found.astype(np.int16)
    unbroken = np.ones(linked.size, dtype=np.bool_)
    for step in range(1, min(reach, linked.size - 1) + 1):
        unbroken[step:] &= linked[1 : linked.size - step + 1]
        joined = unbroken[step:, None]
        count[step:] += found[:-step] & joined
        count[:-step] += found[step:] & joined
    return count
