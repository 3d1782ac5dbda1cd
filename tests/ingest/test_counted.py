"""Profiles one after another, each with a count."""

import numpy as np
import pytest

from profiles.errors import ConfigError, DataError
from profiles.ingest import read, source
from profiles.ingest.counted import NEITHER, READING, RECORD, tell_apart
from profiles.ingest.layout import CountedLayout

LAYOUT = {
    "kind": "counted",
    "delimiter": "whitespace",
    "header_rows": 1,
    "names": ["z", "t", "q"],
    "missing": ["NA"],
    "record": {"names": ["year", "day", "hour", "n"], "count": "n"},
    "time": {"parts": {"hour": "hour", "year": "year", "day_of_year": "day"}},
    "depth": {"column": "z"},
    "temperature": {"column": "t"},
    "quality": {"column": "q", "flags": {"a": 1, "b": 4}},
}
TEXT = """title
2031 1 0.5 2
1 29.5 a
25 20.5 b
2031 1 1.5 0
2031 1 2.5 3
1 29 a
10 NA a
25 20 a
"""
NAN = np.nan


@pytest.fixture
def layout():
    return CountedLayout.model_validate(LAYOUT)


def reasons(delivery):
    return dict(zip(delivery.quarantine["line"], delivery.quarantine["reason"], strict=True))


def account(delivery):
    return delivery.rows_read, delivery.rows_kept, delivery.rows_quarantined


def test_profiles_become_a_chain(write, layout):
    delivery = read(write(TEXT), layout)
    np.testing.assert_array_equal(delivery.chain["time"], np.array(["2031-01-01T00:30", "2031-01-01T02:30"], "M8[ns]"))
    np.testing.assert_array_equal(delivery.chain["depth"], [1, 10, 25])
    np.testing.assert_array_equal(delivery.chain["temperature"], np.float32([[29.5, NAN, 20.5], [29, NAN, 20]]))
    np.testing.assert_array_equal(delivery.chain["temperature_delivered_qc"], [[1, 9, 4], [1, 9, 1]])
    # three lines that begin profiles, one of them empty, and five readings
    assert account(delivery) == (8, 8, 0)


def test_a_lost_line_takes_its_profile_to_quarantine(write, layout):
    delivery = read(write(TEXT.replace("10 NA a\n", "")), layout)
    assert reasons(delivery) == dict.fromkeys(
        [6, 7, 8], "the profile of line 6: it has 2 lines of readings where it counts 3"
    )
    assert delivery.chain.sizes["time"] == 1


def test_a_doubled_line_takes_its_profile_to_quarantine(write, layout):
    delivery = read(write(TEXT.replace("1 29.5 a\n", "1 29.5 a\n" * 2)), layout)
    assert list(reasons(delivery)) == [2, 3, 4, 5]
    np.testing.assert_array_equal(delivery.chain["temperature"], np.float32([[29, NAN, 20]]))


def test_a_garbled_reading_goes_alone_since_its_profile_is_whole(write, layout):
    delivery = read(write(TEXT.replace("10 NA a", "10 2x.5 a")), layout)
    assert reasons(delivery) == {8: "column 't': '2x.5' is neither a number nor a missing token"}
    np.testing.assert_array_equal(delivery.chain["temperature"], np.float32([[29.5, 20.5], [29, 20]]))


def test_a_reading_without_a_line_that_begins_its_profile_is_quarantined(write, layout):
    delivery = read(write(TEXT.replace("title\n", "title\n1 29 a\n")), layout)
    assert reasons(delivery) == {2: "no line that begins a profile stands before this one"}


@pytest.mark.parametrize("head", ["2031 366 0.5 2", "2031 1 0.5 -2", "2031 1 0.5 2.5", "2031 1 24.5 2", "x 1 0.5 2"])
def test_a_wrong_first_line_takes_two_profiles_since_the_readings_run_on(write, layout, head):
    delivery = read(write(TEXT.replace("2031 1 2.5 3", head)), layout)
    # the empty profile of line 5 now has four lines behind it
    assert list(reasons(delivery)) == [5, 6, 7, 8, 9]
    np.testing.assert_array_equal(delivery.chain["temperature"], np.float32([[29.5, 20.5]]))


def test_an_unknown_quality_mark_goes_alone(write, layout):
    delivery = read(write(TEXT.replace("1 29 a", "1 29 z")), layout)
    assert list(reasons(delivery)) == [7]
    assert "the quality mark 'z' is in no table" in reasons(delivery)[7]


def test_lines_of_the_same_shape_are_told_by_how_the_first_begins(write):
    layout = CountedLayout.model_validate(
        LAYOUT
        | {"names": ["z", "t"], "quality": None, "header_rows": 0, "delimiter": ","}
        | {"record": {"names": ["time", "n"], "count": "n", "begins": "P"}}
        | {"time": {"column": "time", "format": "P%Y%m%d"}}
    )
    delivery = read(write("P20310101,1\n1,29\nP20310102,2\n1,28\n25,18\n"), layout)
    np.testing.assert_array_equal(delivery.chain["temperature"], [[29, NAN], [28, 18]])


def test_where_lines_look_alike_one_is_a_reading_while_readings_are_owed(write):
    # day of the year and count look like depth and reading
    layout = CountedLayout.model_validate(
        LAYOUT
        | {"names": ["z", "t"], "quality": None, "header_rows": 0}
        | {"record": {"names": ["day", "n"], "count": "n"}}
        | {"time": {"column": "day", "units": "days since 2030-12-31"}}
    )
    delivery = read(write("1 2\n5 29\n25 18\n2 1\n5 28\n"), layout)
    np.testing.assert_array_equal(delivery.chain["time"], np.array(["2031-01-01", "2031-01-02"], "M8[ns]"))
    np.testing.assert_array_equal(delivery.chain["temperature"], [[29, 18], [28, NAN]])
    # Kernel: a record of two, a reading that could be a record, a reading, a record, then what is neither, a reading.
    record, reading = np.array([1, 1, 0, 1, 0, 0], bool), np.array([1, 1, 1, 1, 0, 1], bool)
    role = tell_apart(record, reading, np.array([2, 9, 0, 2, 0, 0]))
    np.testing.assert_array_equal(role, [RECORD, READING, READING, RECORD, NEITHER, READING])


def test_depths_near_a_declared_one_are_of_that_sensor(write):
    layout = CountedLayout.model_validate(
        LAYOUT | {"depth": {"column": "z", "values": [1, 10, 25], "tolerance": 0.5}, "missing": ["NA"]}
    )
    delivery = read(write(TEXT.replace("25 20.5", "24.5 20.5").replace("10 NA", "11 15")), layout)
    assert reasons(delivery) == {8: "the depth is not among those that the layout declares"}
    np.testing.assert_array_equal(delivery.chain["depth"], [1, 10, 25])
    np.testing.assert_array_equal(delivery.chain["temperature"], np.float32([[29.5, NAN, 20.5], [29, NAN, 20]]))


def test_profiles_of_a_mean_are_stamped_at_its_centre_in_utc(write):
    layout = CountedLayout.model_validate(
        LAYOUT | {"time": LAYOUT["time"] | {"zone": "+10:00", "mean_hours": 1, "stamp": "end"}}
    )
    chain = read(write(TEXT), layout).chain
    # half past midnight at UTC+10 is half past two of the day before; the hour that ends then is centred at two
    assert chain["time"].values[0] == np.datetime64("2030-12-31T14:00")
    assert chain["temperature_raw"].attrs["cell_methods"] == "time: mean (interval: 1 hours)"


def test_a_file_in_which_nothing_begins_a_profile_is_told(write, layout):
    with pytest.raises(DataError, match="no line begins a profile"):
        read(write("title\n1 29 a\n2 28 a\n"), layout)


def test_profiles_that_byte_blocks_cut_anywhere_are_read_alike(write, layout, monkeypatch):
    path = write(TEXT.replace("10 NA a\n", "") + TEXT.replace("title\n", "").replace("2031 1", "2031 2"))
    whole = read(path, layout)
    assert whole.rows_quarantined == 3
    for size in (*range(3, 30), 70):
        monkeypatch.setattr(source, "BLOCK_BYTES", size)
        cut = read(path, layout)
        assert cut.chain.identical(whole.chain)
        assert cut.quarantine.equals(whole.quarantine)


def test_summer_time_ends_among_profiles_whatever_the_byte_blocks(write, monkeypatch):
    # America/New_York, 2 November 2031: 01:30 comes twice, at 05:30 and 06:30 UTC
    layout = CountedLayout.model_validate(
        LAYOUT
        | {"record": {"names": ["t0", "n"], "count": "n"}, "header_rows": 0}
        | {"time": {"column": "t0", "zone": "America/New_York", "repeated_hour": "by_order"}}
    )
    path = write(
        "".join(f"2031-11-02T{hour}:30 1\n1 {place} a\n" for place, hour in enumerate(("00", "01", "01", "02")))
    )
    for size in (source.BLOCK_BYTES, 9):
        monkeypatch.setattr(source, "BLOCK_BYTES", size)
        hours = read(path, layout).chain["time"].dt.hour
        np.testing.assert_array_equal(hours, [4, 5, 6, 7])


def test_what_makes_no_counted_layout_is_refused(layout_of):
    text = (
        'kind = "counted"\nnames = ["z", "t"]\n[record]\nnames = ["time", "n"]\ncount = "m"\n'
        '[time]\ncolumn = "time"\n[depth]\ncolumn = "z"\ntolerance = 1\n[temperature]\ncolumn = "t"\n'
    )
    with pytest.raises(ConfigError, match="expected count among the names") as caught:
        layout_of(text)
    assert "tolerance needs values" in str(caught.value)


@pytest.mark.parametrize("text", ["2031 1 0.5 0\n2031 1 1.5 0\n", "2031 1 0.5 1\n1 x a\n"])
def test_profiles_without_a_reading_that_can_be_understood_are_told(write, layout, text):
    with pytest.raises(DataError, match="no row could be understood"):
        read(write("title\n" + text), layout)
