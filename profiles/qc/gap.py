"""Gap: QARTOD test 1, seen from the record: which value is the first after a silence of its sensor."""

from __future__ import annotations

import numpy as np

from profiles.config import QualityControlSettings
from profiles.qc.check import Check, Floats, Mask, Outcomes, Segment, Survey, Times, outcomes
from profiles.vocabulary import Flag


def last_value_times(time: Times, present: Mask, previous: Times) -> Times:
    """Return when each sensor last gave a value before each sample.

    Parameters
    ----------
    time : ndarray of datetime64[ns], shape (time,)
    present : ndarray of bool, shape (time, depth)
    previous : ndarray of datetime64[ns], shape (depth,)
        The answer for the first sample; NaT where there was no value.

    Returns
    -------
    ndarray of datetime64[ns], shape (time + 1, depth)
        Row ``n`` is for sample ``n``; the last row is for a sample that would follow.
    """
    stamps = np.where(present, time[:, None], np.datetime64("NaT"))
    known = np.concatenate([previous[None], stamps]).astype("datetime64[ns]").view(np.int64)
    # NaT is the least of all int64, so the running maximum is the latest time that is one.
    return np.maximum.accumulate(known, axis=0).view("datetime64[ns]")


def silence(time: Times, present: Mask, previous: Times) -> Floats:
    """Return the time since each sensor's last value, s, (time, depth), NaN where there was none."""
    elapsed = time[:, None] - last_value_times(time, present, previous)[:-1]
    return np.asarray(elapsed / np.timedelta64(1, "s"), dtype=np.float64)


def gap_outcome(silence: Floats, present: Mask, *, longest_silence: float, flag_after_gap: int) -> Outcomes:
    """Flag the first value after a gap.

    Parameters
    ----------
    silence : ndarray, shape (time, depth)
        Time since the sensor's last value, s; NaN (the first value of a sensor) is no gap.
    present : ndarray of bool, shape (time, depth)
    longest_silence : float
        s; more is a gap.
    flag_after_gap : int
        1, 3 or 4: the QARTOD manuals differ on it.
    """
    late = silence > longest_silence
    questionable = late & (flag_after_gap == Flag.QUESTIONABLE)
    bad = late & (flag_after_gap == Flag.BAD)
    return outcomes(present, np.True_, questionable, bad)


def _outcome(segment: Segment, survey: Survey, settings: QualityControlSettings) -> Outcomes:
    present = ~np.isnan(segment.temperature)
    return gap_outcome(
        silence(segment.time, present, segment.previous),
        present,
        longest_silence=settings.gap.longest_interval * survey.nominal_interval,
        flag_after_gap=settings.gap.flag_after_gap,
    )


CHECK = Check("gap", _outcome)
