"""A logger's clock that ran ahead or behind: its stamps to the time that it was."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from profiles.config import ClockError
from profiles.ingest.spool import Spool

Times = NDArray[np.datetime64]
_SECOND = np.timedelta64(1, "s")


def true_time(shown: Times, error: ClockError) -> Times:
    """Return UTC for what a clock showed.

    Parameters
    ----------
    shown : ndarray of datetime64[ns]
    error : ClockError
        Where it says when the clock was set and when it was checked, the error grows linearly from nothing at the one
        to all of it at the other, and stays as it is before and after; else it is the same throughout.

    Returns
    -------
    ndarray of datetime64[ns]
        In the order of ``shown``: later stays later.
    """
    if error.set is None or error.checked is None:
        return shown - _seconds(error.fast_seconds)
    start, end = (np.datetime64(moment.replace(tzinfo=None), "ns") for moment in (error.set, error.checked))
    length = float((end - start) / _SECOND)
    # The clock shows t + fast (t - start) / length at the time t; solved for t.
    elapsed = (shown - start) / _SECOND / (1.0 + error.fast_seconds / length)
    fast = error.fast_seconds * np.clip(elapsed / length, 0.0, 1.0)
    return shown - np.round(fast * 1e9).astype("timedelta64[ns]")


def _seconds(length: float) -> np.timedelta64:
    return np.timedelta64(round(length * 1e9), "ns")


def retimed(spool: Spool, error: ClockError) -> Spool:
    """Return rows with the stamps that they should have had."""
    corrected = Spool(spool.row_type)
    for rows in spool.chunks():
        changed = rows.copy()
        changed["time"] = true_time(rows["time"], error)
        corrected.append(changed)
    return corrected


def in_words(error: ClockError) -> str:
    """Return what was corrected, for the files."""
    if error.set is None or error.checked is None:
        return f"{error.fast_seconds:g} s fast throughout"
    return f"right at {_stamp(error.set)}, {error.fast_seconds:g} s fast at {_stamp(error.checked)}, linear between"


def _stamp(moment: object) -> str:
    return f"{moment:%Y-%m-%dT%H:%M:%SZ}"
