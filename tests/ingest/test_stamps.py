"""Stamps that are no time, or could be read in two ways."""

import numpy as np
import pytest

from profiles.ingest.clock import UNREADABLE, Zone, clock_of_texts, parse_times
from profiles.ingest.stamps import LONGEST, NOT_DECIDED, as_matrix, compiled, gathered, read_stamps


def time_of(stamp, time_format="iso8601", zone="UTC"):
    times, reasons = parse_times([stamp], time_format=time_format, zone=zone)
    assert (reasons[0] == UNREADABLE) == np.isnat(times[0])
    return times[0]


def plain(stamps, time_format):
    """Return what the kernel alone makes of stamps."""
    return read_stamps(as_matrix(np.array(stamps, dtype=object)), compiled(time_format))


@pytest.mark.parametrize(
    ("stamp", "time_format"),
    [
        ("2031-06-30T23:59:60", "iso8601"),
        ("2031-06-30T23:59:60Z", "iso8601"),
        ("2031-06-30 23:59:60", "%Y-%m-%d %H:%M:%S"),
        ("2031-06-30 23:59:61", "%Y-%m-%d %H:%M:%S"),
        ("30 Jun 2031 23:59:60.5", "%d %b %Y %H:%M:%S.%f"),
    ],
)
def test_a_leap_second_is_no_time(stamp, time_format):
    # POSIX time, and so datetime64, has no such second; strptime would make it one of the next day
    assert np.isnat(time_of(stamp, time_format))


@pytest.mark.parametrize("time_format", ["%Y %j", "%j %Y", "%y %j"])
def test_day_366_is_a_day_of_leap_years_only(time_format):
    short = "%y" in time_format
    stamp = {True: "{}".format, False: "20{}".format}[short]
    texts = [time_format.replace("%j", "366").replace("%Y", stamp(y)).replace("%y", stamp(y)) for y in (31, 32, 60)]
    found = [time_of(text, time_format) for text in texts]
    # 2032 and 2060 are leap years
    assert np.isnat(found[0])
    np.testing.assert_array_equal(found[1:], np.array(["2032-12-31", "2060-12-31"], "M8[ns]"))


def test_the_first_of_january_is_not_taken_for_a_day_366():
    assert time_of("2031 1 .366", "%Y %j .%f") == np.datetime64("2031-01-01T00:00:00.366")


@pytest.mark.parametrize(
    ("stamp", "time_format"),
    [
        ("203106301", "%Y%m%d%H"),
        ("2031630", "%Y%m%d"),
        ("2031-06-30 130", "%Y-%m-%d %H%M"),
        ("20311", "%Y%j"),
        ("310630 130", "%y%m%d %H%M"),
        ("30Jun2031 1", "%d%b%Y %H%M"),
    ],
)
def test_numbers_that_touch_need_all_their_digits(stamp, time_format):
    # 130 would be 13:00, where half past one was meant
    assert np.isnat(time_of(stamp, time_format))


@pytest.mark.parametrize(
    ("stamp", "time_format", "expected"),
    [
        ("2031-6-3 1:05", "%Y-%m-%d %H:%M", "2031-06-03T01:05"),
        ("20310630 0130", "%Y%m%d %H%M", "2031-06-30T01:30"),
        ("310630 0130", "%y%m%d %H%M", "2031-06-30T01:30"),
        ("30Jun2031 0130", "%d%b%Y %H%M", "2031-06-30T01:30"),
        ("12:05 AM 06/30/31", "%I:%M %p %m/%d/%y", "2031-06-30T00:05"),
        ("2031-06-30 10:00 UTC", "%Y-%m-%d %H:%M %Z", "2031-06-30T10:00"),
        ("2031181", "%Y%j", "2031-06-30"),
        ("2031-06-30 10:00:00 +0200", "%Y-%m-%d %H:%M:%S %z", "2031-06-30T08:00"),
    ],
)
def test_other_forms_are_read(stamp, time_format, expected):
    assert time_of(stamp, time_format) == np.datetime64(expected, "ns")


def test_a_zone_in_the_stamp_comes_first():
    assert time_of("2031-06-30 10:00 UTC", "%Y-%m-%d %H:%M %Z", "+10:00") == np.datetime64("2031-06-30T10:00")


@pytest.mark.parametrize(
    "stamp",
    ["2031-06-30T1", "2031-06-30T10:5", "2031-06-30 1:00", "2031-06-30T10:00.5", "2031-06-30T10:00:0",
     "2031-06-30T10:00:00.",
     "2031-06-30T", "2031-06-30T24:00", "2031-06-31", "2031-02-29", "2031-00-01", "2031-06-30T10:60", "20310630T10000",
     "2031-06-30T10:00:00+99:00", "2031-W10-1", "2031-6-3"],
)  # fmt: skip
def test_an_iso_stamp_that_lost_a_digit_or_names_no_time_is_told(stamp):
    assert np.isnat(time_of(stamp))


@pytest.mark.parametrize(
    ("stamp", "expected"),
    [
        ("2031-06-30", "2031-06-30"),
        ("2032-02-29T23:59:59.999999999", "2032-02-29T23:59:59.999999999"),
        ("2031-06-30 10:05", "2031-06-30T10:05"),
        ("2031-06-30T10", "2031-06-30T10:00"),
        ("20310630T1005", "2031-06-30T10:05"),
        ("20310630T100559.5Z", "2031-06-30T10:05:59.5"),
        ("2031-06-30 10:05 Z", "2031-06-30T10:05"),
        ("2031-06-30T10:05:00.25+0130", "2031-06-30T08:35:00.25"),
        ("2031-06-30T10:05-03", "2031-06-30T13:05"),
    ],
)
def test_whole_iso_stamps_are_read(stamp, expected):
    assert time_of(stamp) == np.datetime64(expected, "ns")


def test_the_kernel_reads_plain_forms_and_leaves_the_others():
    clock, is_utc = plain(
        ["2031-01-01T06:00Z", "2031-01-01", "2031-01-01T06:00+01:00", "x" * 60, "", "2031é"], "iso8601"
    )
    # 2031-01-01 is 22,280 days after 1970-01-01: 61 years with 15 leap days
    day = (61 * 365 + 15) * 86_400 * 10**9
    np.testing.assert_array_equal(clock[:2], [day + 6 * 3_600 * 10**9, day])
    np.testing.assert_array_equal(is_utc, [True, False, False, False, False, False])
    assert (clock[2:] == NOT_DECIDED).all()


@pytest.mark.parametrize("time_format", ["%d %b %Y", "%Y-%m-%dé", "%y%m%d", "%Y-%m-%d %H:%M%%"])
def test_forms_that_are_not_plain_are_not_compiled(time_format):
    assert compiled(time_format) is None


def test_kernel_and_slow_reader_agree_on_every_day_from_1678_to_2261():
    days = np.arange("1678-01-01", "2262-01-01", dtype="datetime64[D]")
    texts = days.astype(str)
    np.testing.assert_array_equal(plain(texts.astype(object), "%Y-%m-%d")[0].view("M8[ns]"), days)
    by_number = np.array([f"{day.year} {day.timetuple().tm_yday:03}" for day in days.astype(object)], dtype=object)
    np.testing.assert_array_equal(plain(by_number, "%Y %j")[0].view("M8[ns]"), days)
    outside, _ = clock_of_texts(["1677-12-31", "2262-01-01"], "iso8601")
    assert np.isnat(outside).all()


def test_cells_are_joined_by_a_blank_and_long_ones_are_left():
    buffer = np.frombuffer(b"2031-01-01,06:00," + b"9" * LONGEST, np.uint8)
    starts, ends = np.array([[0, 11], [0, 17]], np.int32), np.array([[10, 16], [10, 17 + LONGEST]], np.int32)
    rows, lengths = gathered(buffer, starts, ends)
    assert rows[0, : lengths[0]].tobytes() == b"2031-01-01 06:00"
    assert lengths[1] == 0


def test_a_stamp_of_a_million_letters_is_told_at_once():
    for text in ("2031 " + " " * 1_000_000, "2031-01-01T" + "+1" * 500_000, "9" * 1_000_000):
        for time_format in ("iso8601", "%Y-%m-%d", "%d %b %Y %H:%M", "%Y%m%d %Z"):
            assert np.isnat(time_of(text, time_format))


# ------------------------------------------------------------------------------------------------------------
# The hour that the end of summer time repeats, by order: America/New_York, 2 November 2031, 01:00 to 02:00

FIRST, SECOND = "2031-11-02T05", "2031-11-02T06"


def by_order(zone, minutes, sensors=None):
    clock = np.array([f"2031-11-02T{minute}" for minute in minutes], "M8[ns]")
    return zone.to_utc(clock, None if sensors is None else np.array(sensors, float))


def utc(*stamps):
    return np.array([f"2031-11-02T{stamp}" for stamp in stamps], "M8[ns]")


def test_the_repeated_hour_is_told_by_its_order_over_pieces_of_a_file():
    zone = Zone("America/New_York", by_order=True)
    np.testing.assert_array_equal(by_order(zone, ["00:30", "01:00", "01:30"]), utc("04:30", "05:00", "05:30"))
    np.testing.assert_array_equal(by_order(zone, ["01:00", "01:30", "02:00"]), utc("06:00", "06:30", "07:00"))


def test_hourly_stamps_are_told_by_being_equal():
    zone = Zone("America/New_York", by_order=True)
    np.testing.assert_array_equal(by_order(zone, ["01:00", "01:00"]), utc("05:00", "06:00"))


def test_sensors_at_one_time_do_not_take_each_other_for_the_second_round():
    zone = Zone("America/New_York", by_order=True)
    found = by_order(zone, ["01:00", "01:00", "01:00", "01:00"], [1, 10, 1, 10])
    np.testing.assert_array_equal(found, utc("05:00", "05:00", "06:00", "06:00"))


def test_sensors_one_after_another_each_go_round_twice():
    zone = Zone("America/New_York", by_order=True)
    once = ["01:00", "01:30", "01:00", "01:30"]
    found = by_order(zone, once * 2, [1] * 4 + [10] * 4)
    np.testing.assert_array_equal(found, np.tile(utc("05:00", "05:30", "06:00", "06:30"), 2))


def test_sensors_one_after_another_that_meet_the_hour_once_a_round():
    zone = Zone("America/New_York", by_order=True)
    once = ["00:00", "01:00", "01:00", "02:00"]
    np.testing.assert_array_equal(by_order(zone, once, [1] * 4), utc("04:00", "05:00", "06:00", "07:00"))
    np.testing.assert_array_equal(by_order(zone, once, [10] * 4), utc("04:00", "05:00", "06:00", "07:00"))


def test_a_sensor_that_is_new_in_the_second_round_is_of_that():
    zone = Zone("America/New_York", by_order=True)
    found = by_order(zone, ["01:00", "01:30", "01:00", "01:00", "01:30"], [1, 1, 1, 10, 10])
    np.testing.assert_array_equal(found, utc("05:00", "05:30", "06:00", "06:00", "06:30"))


def test_without_an_order_repeated_hours_stay_unknown_and_skipped_ones_always_do():
    assert np.isnat(by_order(Zone("America/New_York"), ["01:00"])).all()
    # 9 March 2031: 02:00 to 03:00 does not exist
    skipped = np.array(["2031-03-09T02:30"], "M8[ns]")
    assert np.isnat(Zone("America/New_York", by_order=True).to_utc(skipped)).all()
