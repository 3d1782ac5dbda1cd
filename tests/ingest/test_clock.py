import numpy as np
import pytest

from profiles.ingest.clock import NOT_ON_THE_CLOCK, UNREADABLE, parse_times


def utc(stamp, time_format="iso8601", zone="UTC", **options):
    times, reasons = parse_times([stamp], time_format=time_format, zone=zone, **options)
    return times[0], reasons[0]


@pytest.mark.parametrize(
    ("stamp", "zone", "expected"),
    [
        ("2031-01-01T00:00:00Z", "+10:00", "2031-01-01T00:00"),  # its own offset comes first
        ("2031-01-01 10:00:00+10:00", "UTC", "2031-01-01T00:00"),
        ("2031-01-01T10:00", "+10:00", "2031-01-01T00:00"),
        ("2031-01-01", "-03:30", "2031-01-01T03:30"),
        ("20310101T1200", "UTC", "2031-01-01T12:00"),
        ("2031-07-01T12:00", "America/New_York", "2031-07-01T16:00"),  # daylight time is UTC-4
        ("2031-01-01T12:00", "America/New_York", "2031-01-01T17:00"),
        ("2031-01-01T12:00:00.25", "Pacific/Guam", "2031-01-01T02:00:00.25"),  # UTC+10 all year
    ],
)
def test_iso_stamps_become_utc(stamp, zone, expected):
    assert utc(stamp, zone=zone) == (np.datetime64(expected, "ns"), None)


def test_formats_become_utc():
    assert utc("01.02.2031 09:30", "%d.%m.%Y %H:%M", "+10:00")[0] == np.datetime64("2031-01-31T23:30")
    assert utc("2031-02-01 09:30 +0200", "%Y-%m-%d %H:%M %z", "+10:00")[0] == np.datetime64("2031-02-01T07:30")


def test_offset_hours_move_a_day_to_its_noon():
    assert utc("2031-01-01", "%Y-%m-%d", offset_hours=12.0)[0] == np.datetime64("2031-01-01T12:00")


@pytest.mark.parametrize("stamp", ["", "now", "today", "nan", "2031-13-01", "2031-01-01x", "9999-01-01", "0001-01-01"])
@pytest.mark.parametrize("time_format", ["iso8601", "%Y-%m-%d"])
def test_what_is_no_time_is_told(stamp, time_format):
    time, reason = utc(stamp, time_format)
    assert np.isnat(time)
    assert reason == UNREADABLE


@pytest.mark.parametrize("stamp", ["2031", "2031-01", "2031-01-01T25:00"])
def test_an_iso_stamp_cut_short_of_its_day_is_no_time(stamp):
    assert utc(stamp)[1] == UNREADABLE


@pytest.mark.parametrize("stamp", ["2031-03-09T02:30", "2031-11-02T01:30"])
def test_local_times_that_the_clock_skips_or_repeats_are_told(stamp):
    # United States daylight time: second Sunday of March to first Sunday of November (Energy Policy Act of 2005)
    time, reason = utc(stamp, zone="America/New_York")
    assert np.isnat(time)
    assert reason == NOT_ON_THE_CLOCK


def test_one_bad_stamp_leaves_its_neighbours_alone():
    times, reasons = parse_times(["2031-01-01", "bad", "2031-01-02T00:00Z"], time_format="iso8601", zone="+01:00")
    np.testing.assert_array_equal(times, np.array(["2030-12-31T23:00", "NaT", "2031-01-02T00:00"], "datetime64[ns]"))
    assert list(reasons) == [None, UNREADABLE, None]
