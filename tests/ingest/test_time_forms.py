"""[time] of a layout: every way in which a row can say when."""

import numpy as np
import pytest
from pydantic import ValidationError

from profiles.errors import DataError
from profiles.ingest import read
from profiles.ingest.clock import NOT_ON_THE_CLOCK, UNREADABLE
from profiles.ingest.layout import WideLayout


def wide(time, **options):
    return WideLayout.model_validate({"kind": "wide", "time": time, "depth": {"pattern": "T{depth}"}} | options)


def times(write, header, rows, time, **options):
    """Return the times of rows, a reading behind each."""
    content = "\n".join([f"{header},T1", *(f"{row},20" for row in rows)])
    return read(write(content), wide(time, **options)).chain["time"].values


def check(found, *expected):
    np.testing.assert_array_equal(found, np.array(expected, "M8[ns]"))


def test_one_column_of_iso_stamps(write):
    check(times(write, "t", ["2031-01-01T06:00Z"], {"column": "t", "zone": "+10:00"}), "2031-01-01T06:00")


def test_several_columns_are_one_stamp_in_their_order(write):
    time = {"columns": ["date", "hour"], "format": "%d.%m.%Y %H"}
    check(times(write, "hour,date", ["06,31.01.2031"], time), "2031-01-31T06:00")


@pytest.mark.parametrize(
    ("parts", "row", "expected"),
    [
        (["year", "day_of_year"], "2032,60", "2032-02-29"),
        (["year", "day_of_year"], "2032,366.5", "2032-12-31T12:00"),
        (["year", "day_of_year", "hour"], "2031,1,23.5", "2031-01-01T23:30"),
        (["hour", "year", "day_of_year"], "23.5,2031,1", "2031-01-01T23:30"),
        (["year", "day_of_year", "hour_minute"], "2031,59,1330", "2031-02-28T13:30"),
        (["year", "day_of_year", "hour_minute"], "2031,59,30", "2031-02-28T00:30"),
        (["year", "month", "day"], "2031,2,28.25", "2031-02-28T06:00"),
        (["year", "month", "day", "hour", "minute", "second"], "2031,2,28,6,7,8.5", "2031-02-28T06:07:08.5"),
        (["year", "month", "day", "hour"], "2031,12,31,24", "2032-01-01"),
        (["year", "month", "day", "hour_minute", "second"], "2031,2,28,0607,8", "2031-02-28T06:07:08"),
    ],
)
def test_columns_of_numbers(write, parts, row, expected):
    time = {"parts": {part: f"c{part}" for part in parts}}
    check(times(write, ",".join(f"c{part}" for part in parts), [row], time), expected)


@pytest.mark.parametrize(
    ("parts", "row"),
    [
        (["year", "day_of_year"], "2031,366"),
        (["year", "day_of_year"], "2031,0"),
        (["year", "day_of_year"], "2031,"),
        (["year", "day_of_year", "hour"], "2031,1.5,12"),
        (["year", "day_of_year", "hour"], "2031,1,24.5"),
        (["year", "day_of_year", "hour_minute"], "2031,1.5,1200"),
        (["year", "day_of_year", "hour_minute"], "2031,1,1260"),
        (["year", "day_of_year", "hour_minute"], "2031,1,12.5"),
        (["year", "month", "day"], "2031,2,29"),
        (["year", "month", "day"], "2031,13,1"),
        (["year", "month", "day"], "2031.5,1,1"),
        (["year", "month", "day", "hour", "minute", "second"], "2031,6,30,23,59,60"),
        (["year", "month", "day", "hour", "minute", "second"], "2031,6,30,24,0,1"),
        (["year", "month", "day", "hour", "minute", "second"], "1e999,6,30,23,59,0"),
    ],
)
def test_numbers_that_make_no_time_are_told(write, parts, row):
    sound = {"year": "2031", "month": "1", "day": "1", "day_of_year": "1"}
    content = "\n".join(
        [",".join([*parts, "T1"]), ",".join([*(sound.get(part, "0") for part in parts), "20"]), f"{row},20"]
    )
    delivery = read(write(content), wide({"parts": {part: part for part in parts}}))
    assert (delivery.rows_kept, delivery.quarantine["reason"].tolist()) == (1, [UNREADABLE])


@pytest.mark.parametrize(
    ("units", "number", "expected"),
    [
        ("seconds since 1970-01-01", "1924992000.25", "2031-01-01T00:00:00.25"),
        ("days since 1950-01-01", "29585.5", "2031-01-01T12:00"),
        ("hours since 2031-01-01 06:00", "-6", "2031-01-01"),
        ("minutes since 2031-01-01T00:00:00Z", "1.5e2", "2031-01-01T02:30"),
    ],
)
def test_numbers_since_a_time(write, units, number, expected):
    check(times(write, "t", [number], {"column": "t", "units": units}), expected)


def test_a_number_since_a_time_is_of_the_declared_zone_and_needs_sense(write):
    time = {"column": "t", "units": "days since 2031-01-01", "zone": "+06:00"}
    content = "t,T1\n1,20\n1e999,20\n1e300,20\n--3,20\n,20\n"
    delivery = read(write(content), wide(time, missing=["-9"]))
    check(delivery.chain["time"].values, "2031-01-01T18:00")
    assert delivery.quarantine["reason"].tolist() == [UNREADABLE] * 4


def test_decimal_commas_are_also_those_of_times(write):
    options = {"delimiter": ";", "decimal": ","}
    content = "t;T1\n0,5;20,5\n"
    delivery = read(write(content), wide({"column": "t", "units": "days since 2031-01-01"}, **options))
    check(delivery.chain["time"].values, "2031-01-01T12:00")


@pytest.mark.parametrize(
    ("stamp", "hour"), [("start", "01T12:00"), ("centre", "01T00:00"), ("end", "2030-12-31T12:00")]
)
def test_a_mean_is_stamped_at_its_centre(write, stamp, hour):
    expected = hour if "-" in hour else f"2031-01-{hour}"
    check(times(write, "t", ["2031-01-01"], {"column": "t", "mean_hours": 24, "stamp": stamp}), expected)


def test_offset_hours_are_added_to_every_stamp(write):
    time = {"column": "t", "mean_hours": 1, "stamp": "end", "offset_hours": -0.25}
    check(times(write, "t", ["2031-01-01T06:00"], time), "2031-01-01T05:15")


@pytest.mark.parametrize(("rule", "kept"), [("quarantine", 2), ("by_order", 4)])
def test_the_repeated_hour_goes_to_quarantine_or_by_order(write, rule, kept):
    stamps = ["2031-11-02T00:30", "2031-11-02T01:30", "2031-11-02T01:30", "2031-11-02T02:30"]
    content = "\n".join(["t,T1", *(f"{stamp},20" for stamp in stamps)])
    delivery = read(write(content), wide({"column": "t", "zone": "America/New_York", "repeated_hour": rule}))
    assert delivery.rows_kept == kept
    assert set(delivery.quarantine["reason"]) <= {NOT_ON_THE_CLOCK}
    expected = ["2031-11-02T04:30", "2031-11-02T05:30", "2031-11-02T06:30", "2031-11-02T07:30"]
    check(delivery.chain["time"].values, *(expected if kept == 4 else expected[::3]))


@pytest.mark.parametrize(
    "stamps",
    [["01:00 1", "01:00 10", "01:30 1", "01:30 10", "01:00 1", "01:00 10", "01:30 1", "01:30 10"],
     ["01:00 1", "01:30 1", "01:00 1", "01:30 1", "01:00 10", "01:30 10", "01:00 10", "01:30 10"]],
)  # fmt: skip
def test_the_repeated_hour_of_long_text_goes_by_the_order_of_each_sensor(write, long, stamps):
    layout = long.model_copy(
        update={"time": long.time.model_copy(update={"zone": "America/New_York", "repeated_hour": "by_order"})}
    )
    rows = [f"2031-11-02T{stamp.replace(' ', ',')},20" for stamp in stamps]
    delivery = read(write("\n".join(["time,depth,temp", *rows])), layout)
    check(delivery.chain["time"].values, *(f"2031-11-02T{h}:{m}" for h in ("05", "06") for m in ("00", "30")))
    assert delivery.rows_quarantined == 0
    assert delivery.chain["temperature"].notnull().all()


@pytest.mark.parametrize(
    ("time", "message"),
    [
        ({}, "either column or columns or parts"),
        ({"column": "t", "columns": ["a"]}, "either column or columns or parts"),
        ({"columns": ["a", "b"], "units": "days since 1950-01-01"}, "units go with a single column"),
        ({"column": "t", "units": "days since 1950-01-01", "format": "%Y%m%d"}, "units go with a single column"),
        ({"column": "t", "units": "months since 1950-01-01"}, "a length that changes"),
        ({"column": "t", "units": "metres"}, "no units of time"),
        ({"column": "t", "format": "%H:%M"}, "does not give year, month and day"),
        ({"column": "t", "zone": "Mars/Olympus"}, "no such time zone"),
        ({"column": "t", "zone": "+25"}, "no offset from UTC"),
        ({"column": "t", "stamp": "end"}, "needs mean_hours"),
        ({"parts": {"year": "y", "hour": "h"}}, "parts make no stamp"),
        ({"parts": {"year": "y", "day_of_year": "d", "minute": "m"}}, "parts make no stamp"),
    ],
)
def test_what_makes_no_stamp_is_refused(time, message):
    with pytest.raises(ValidationError, match=message):
        wide(time)


def test_a_time_column_that_is_not_there_is_told(write):
    with pytest.raises(DataError, match="the time column is missing"):
        read(write("a,T1\n2031-01-01,20\n"), wide({"column": "t"}))
