"""Stamps of a clock that ran ahead or behind."""

from datetime import UTC, datetime

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from profiles.config import ClockError
from profiles.ingest import read
from profiles.ingest.clock_error import true_time

SET, CHECKED = datetime(2031, 1, 1, tzinfo=UTC), datetime(2031, 1, 11, tzinfo=UTC)


def shown(*stamps):
    return np.array(stamps, "datetime64[ns]")


def test_a_clock_fast_throughout_is_put_back():
    corrected = true_time(shown("2031-01-01T00:02:00"), ClockError(fast_seconds=90.5))
    assert corrected[0] == np.datetime64("2031-01-01T00:00:29.5")


def test_drift_grows_from_setting_to_check_and_stays_as_it_is_outside():
    # 100 s in 10 days: at the true noon of day 6, half way, the clock shows 50 s more.
    error = ClockError(fast_seconds=100.0, set=SET, checked=CHECKED)
    stamps = shown("2030-12-31", "2031-01-01", "2031-01-06T00:00:50", "2031-01-11T00:01:40", "2031-01-12T00:01:40")
    expected = shown("2030-12-31", "2031-01-01", "2031-01-06", "2031-01-11", "2031-01-12")
    np.testing.assert_array_equal(true_time(stamps, error), expected)


def test_a_slow_clock_is_put_forward():
    error = ClockError(fast_seconds=-100.0, set=SET, checked=CHECKED)
    assert true_time(shown("2031-01-05T23:59:10"), error)[0] == np.datetime64("2031-01-06")


@given(st.floats(-8e5, 8e5), st.lists(st.integers(-(10**6), 2 * 10**6), min_size=2, max_size=20, unique=True))
def test_later_stays_later(fast, seconds):
    error = ClockError(fast_seconds=fast, set=SET, checked=CHECKED)
    stamps = np.datetime64("2031-01-01", "ns") + np.sort(np.array(seconds)).astype("timedelta64[s]")
    assert (np.diff(true_time(stamps, error)).astype(np.int64) > 0).all()


def test_what_the_clock_showed_at_a_true_time_comes_back():
    error = ClockError(fast_seconds=431.7, set=SET, checked=CHECKED)
    true = np.datetime64("2031-01-01", "ns") + np.arange(0, 10 * 86_400, 3_571).astype("timedelta64[s]")
    fast = 431.7 * (true - np.datetime64("2031-01-01")) / np.timedelta64(10, "D")
    back = true_time(true + (fast * 1e9).round().astype("timedelta64[ns]"), error)
    assert np.abs((back - true).astype(np.int64)).max() <= 1_000  # ns


def test_a_delivery_says_what_was_corrected_and_keeps_its_values(write, wide):
    path = write("date,T_1m\n2031-01-02,29\n2031-01-01,28\n")
    delivery = read(path, wide, clock=ClockError(fast_seconds=3600.0))
    np.testing.assert_array_equal(delivery.chain["time"], shown("2030-12-31T23:00", "2031-01-01T23:00"))
    np.testing.assert_array_equal(delivery.chain["temperature"][:, 0], [28, 29])
    said = "deployment 1 had its stamps corrected for a clock 3600 s fast throughout"
    assert delivery.chain["temperature_raw"].attrs["comment"] == said


@pytest.mark.parametrize(
    ("settings", "message"),
    [
        ({"set": SET}, "expected set and checked, or neither"),
        ({"set": CHECKED, "checked": SET}, "the clock was checked before it was set"),
        ({"set": SET, "checked": CHECKED, "fast_seconds": 1e6}, "cannot be 1e\\+06 s out after 864000 s"),
        ({"set": datetime(2031, 1, 1), "checked": CHECKED}, "a time without its zone: 2031-01-01T00:00:00; add Z"),
    ],
)
def test_an_impossible_clock_is_refused(settings, message):
    with pytest.raises(ValueError, match=message):
        ClockError(**({"fast_seconds": 1.0} | settings))
