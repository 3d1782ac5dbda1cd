import numpy as np
import pytest

from profiles.ingest.clock import NOT_ON_THE_CLOCK, UNREADABLE, clock_of_numbers, clock_of_parts, parse_times


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


# ------------------------------------------------------------------------------------------------------------
# Numbers


def column(*numbers):
    return np.array(numbers, float)


@pytest.mark.parametrize(
    ("number", "units", "expected"),
    [
        (0.25, "days since 1899-12-30", "1899-12-30T06:00"),
        # days from noon of 1 January 4713 before Christ in the Julian calendar; 2440587.5 is the beginning of 1970
        # (Meeus 1998, Astronomical Algorithms, chapter 7)
        (2_440_587.5, "days since -4713-01-01 12:00", "1970-01-01T00:00"),
        # days from the beginning of the year 0, of which that day is the 719529th: 1970 * 365 + 478 leap days of
        # the Gregorian calendar before it (year 0 among them) + 1
        (719_529.75, "days since -0001-01-02", "1970-01-01T18:00"),
        (1_940_637_600.0, "seconds since 1970-01-01", "2031-07-01T02:00"),
    ],
)
def test_numbers_count_from_any_zero(number, units, expected):
    assert clock_of_numbers(column(number), units)[0] == np.datetime64(expected, "ns")


def test_numbers_that_lead_beyond_what_can_be_stored_are_no_times():
    assert np.isnat(clock_of_numbers(column(1e7, 1e300, -np.inf, np.nan), "days since 1970-01-01")).all()


@pytest.mark.parametrize(
    ("parts", "expected"),
    [
        ({"year_month_day": 20310723}, "2031-07-23"),
        ({"year_month_day": 20310723, "hour": 13.5}, "2031-07-23T13:30"),
        ({"year_month_day": 20310723, "hour_minute": 930}, "2031-07-23T09:30"),
        ({"hour_minute_second": 5, "year_month_day": 20320229}, "2032-02-29T00:00:05"),
        ({"hour_minute": 2400, "day_of_year": 366, "year": 2032}, "2033-01-01"),
        ({"day": 1.75, "month": 3, "year": 2031}, "2031-03-01T18:00"),  # in any order, the day is the finest
    ],
)
def test_parts_make_a_time(parts, expected):
    clock = clock_of_parts({name: column(number) for name, number in parts.items()})
    assert clock[0] == np.datetime64(expected, "ns")


@pytest.mark.parametrize(
    "parts",
    [
        {"year_month_day": 20310229},
        {"year_month_day": 20311301},
        {"year_month_day": 20310100},
        {"year_month_day": 20310723.5},
        {"year_month_day": 20310723, "hour_minute": 1360},
        {"year_month_day": 20310723, "hour_minute_second": 240001},
        {"year": 2031, "day_of_year": 1.5, "hour_minute": 1200},  # which would count the half day twice
    ],
)
def test_parts_that_make_no_time_are_told(parts):
    assert np.isnat(clock_of_parts({name: column(number) for name, number in parts.items()})[0])
