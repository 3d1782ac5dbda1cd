"""Time as the simulated ocean reads it: days since an epoch, and what one value is the mean of."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from profiles.errors import DataError
from profiles.statistics import year_fraction

Floats = NDArray[np.float64]

#: Oceans of one seed agree wherever their times overlap: all start here.
EPOCH = np.datetime64("1980-01-01", "ns")
_DAY = np.timedelta64(1, "D")
_INSTANTS = 0.5  # days; values closer together than this are instants, further apart means


@dataclass(frozen=True)
class Clock:
    """``day`` (time,), days since :data:`EPOCH`; ``fraction`` (time,) of the year; ``interval``, days averaged over.

    ``interval`` is 0 where values are instants.
    """

    day: Floats
    fraction: Floats
    interval: float

    @classmethod
    def reading(cls, time: NDArray[np.datetime64]) -> Clock:
        """Read a clock off ``time`` (time,), UTC: means over the usual spacing unless that is below half a day.

        Raises
        ------
        DataError
            Where a time lies before the epoch.
        """
        day = np.asarray((time - EPOCH) / _DAY, dtype=np.float64)
        if day.size == 0 or not np.all(day >= 0.0):
            raise DataError(
                "the simulated ocean has no such time",
                expected=f"one time or more, {EPOCH.astype('datetime64[D]')} or later",
                found="no time" if day.size == 0 else str(time.min()),
                advice="ask for times after that day",
            )
        spacing = float(np.median(np.diff(day))) if day.size > 1 else 1.0
        return cls(day, year_fraction(time), spacing if spacing >= _INSTANTS else 0.0)
