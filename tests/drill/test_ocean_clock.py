"""How the simulated ocean reads time."""

from __future__ import annotations

import numpy as np
import pytest

from profiles.drill.clock import Clock
from profiles.errors import DataError


def stamps(first: str, last: str, step: np.timedelta64) -> np.ndarray:
    return np.arange(first, last, step, dtype="datetime64[m]").astype("datetime64[ns]")


def test_days_count_from_the_epoch() -> None:
    # 1980 is a leap year: its last day begins 365 days after its first.
    clock = Clock.reading(stamps("1980-12-31T12:00", "1981-01-02T12:00", np.timedelta64(1440, "m")))
    np.testing.assert_array_equal(clock.day, [365.5, 366.5])


@pytest.mark.parametrize(("minutes", "interval"), [(10, 0.0), (60, 0.0), (1440, 1.0), (7200, 5.0)])
def test_values_close_together_are_instants_and_others_means(minutes: int, interval: float) -> None:
    clock = Clock.reading(stamps("2031-01-01", "2031-03-01", np.timedelta64(minutes, "m")))
    assert clock.interval == interval


def test_one_time_alone_is_a_day() -> None:
    assert Clock.reading(stamps("2031-01-01", "2031-01-02", np.timedelta64(1440, "m"))).interval == 1.0


def test_times_before_the_epoch_are_refused() -> None:
    with pytest.raises(DataError, match="no such time"):
        Clock.reading(stamps("1979-12-30", "1980-01-03", np.timedelta64(1440, "m")))


def test_no_time_at_all_is_refused() -> None:
    with pytest.raises(DataError, match="found no time"):
        Clock.reading(np.array([], dtype="datetime64[ns]"))
