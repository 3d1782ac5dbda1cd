"""Text in blocks, each with a header of its own."""

import numpy as np
import pytest

from profiles.errors import DataError
from profiles.ingest import read, source
from profiles.ingest.layout import BlockedLayout

LAYOUT = {
    "kind": "blocked",
    "delimiter": "whitespace",
    "comment": "#",
    "header_rows": 1,
    "missing": ["NA"],
    "block": {"begins": "LEVELS", "header_rows": 2, "before": ["day", "clock"], "after": ["marks"]},
    "time": {"columns": ["day", "clock"], "format": "%Y-%m-%d %H:%M"},
    "depth": {"row": 1, "skip": 2, "pattern": "{depth}m", "positive": "up"},
    "quality": {"column": "marks", "flags": {"a": 1, "b": 3}},
}
TWO_BLOCKS = """a title
# a comment before the first block
LEVELS at -1m -25m
day time C C
2031-01-01 00:00 29.5 20.5 ab
2031-01-01 01:00 29.4 NA aa

LEVELS at -10m -1m -40m
# a comment inside a header
day time C C C
2031-01-02 00:00 28.0 29.0 15.0 aba
"""
NAN = np.nan


@pytest.fixture
def layout():
    return BlockedLayout.model_validate(LAYOUT)


def reasons(delivery):
    return dict(zip(delivery.quarantine["line"], delivery.quarantine["reason"], strict=True))


def account(delivery):
    return delivery.rows_read, delivery.rows_kept, delivery.rows_quarantined


def test_blocks_with_other_depths_become_one_chain(write, layout):
    delivery = read(write(TWO_BLOCKS), layout)
    np.testing.assert_array_equal(delivery.chain["depth"], [1, 10, 25, 40])
    np.testing.assert_array_equal(
        delivery.chain["temperature"],
        np.float32([[29.5, NAN, 20.5, NAN], [29.4, NAN, NAN, NAN], [29.0, 28.0, NAN, 15.0]]),
    )
    # 9 where a block has no such sensor, and where it has no value whatever the mark says
    np.testing.assert_array_equal(
        delivery.chain["temperature_delivered_qc"], [[1, 9, 3, 9], [1, 9, 9, 9], [3, 1, 9, 1]]
    )
    # two headers of two lines and three rows; the title is the file's own header
    assert account(delivery) == (7, 7, 0)


def test_blocks_of_the_same_times_complete_each_other(write, layout):
    delivery = read(
        write("title\nLEVELS at -1m\nx\n2031-01-01 00:00 29 a\n2031-01-01 01:00 28 a\n"
              "LEVELS at -25m\nx\n2031-01-01 01:00 18 b\n2031-01-01 02:00 17 a\n"),
        layout,
    )  # fmt: skip
    np.testing.assert_array_equal(delivery.chain["temperature"], [[29, NAN], [28, 18], [NAN, 17]])
    np.testing.assert_array_equal(delivery.chain["temperature_delivered_qc"], [[1, 9], [1, 3], [9, 1]])
    assert account(delivery) == (8, 8, 0)


def test_of_blocks_that_share_time_and_depth_the_first_in_the_file_stays(write, layout):
    delivery = read(
        write("title\nLEVELS at -1m\nx\n2031-01-01 00:00 29 a\nLEVELS at -1m -25m\nx\n2031-01-01 00:00 28 18 aa\n"
              "2031-01-01 01:00 27 17 aa\nLEVELS at -25m\nx\n2031-01-01 00:00 16 a\n"),
        layout,
    )  # fmt: skip
    # line 7 has the depth of line 4; line 11 has none of the depths that were taken by then
    np.testing.assert_array_equal(delivery.chain["temperature"], [[29, 16], [27, 17]])
    assert reasons(delivery) == {7: "a row before it, line 4 or one like it, has the time and one of the depths"}


def test_what_a_second_block_completed_is_taken_for_a_third(write, layout):
    row = "LEVELS at {}\nx\n2031-01-01 00:00 {}\n"
    text = row.format("-1m", "29 a") + row.format("-25m", "18 a") + row.format("-25m -40m", "17 9 aa")
    delivery = read(write("title\n" + text), layout)
    np.testing.assert_array_equal(delivery.chain["temperature"], [[29, 18, NAN]])
    assert list(reasons(delivery)) == [10]


def test_a_time_that_comes_twice_in_blocks_alike_is_that_of_the_first(write, layout):
    block = "LEVELS at -1m\nx\n2031-01-01 00:00 {} a\n"
    delivery = read(write("title\n" + block.format(29) + block.format(28)), layout)
    assert delivery.chain["temperature"].item() == 29
    assert reasons(delivery) == {7: "the time is that of line 4"}


def test_a_header_that_cannot_be_understood_takes_its_rows_with_it(write, layout):
    delivery = read(write(TWO_BLOCKS.replace("-10m", "-1Om")), layout)
    assert list(reasons(delivery)) == [8, 10, 11]
    assert reasons(delivery)[8] == "a cell of the header is no depth: found '-1Om'"
    assert reasons(delivery)[11] == "the header of its block, line 8, cannot be understood"
    assert account(delivery) == (7, 4, 3)
    np.testing.assert_array_equal(delivery.chain["depth"], [1, 25])


def test_a_header_whose_quotes_do_not_pair_is_not_taken_for_a_shorter_one(write, layout):
    delivery = read(write(TWO_BLOCKS.replace("-1m -40m", '-1m ""-40m')), layout)
    assert list(reasons(delivery)) == [8, 10, 11]
    assert "the header names no depth" in reasons(delivery)[8]


def test_a_row_before_the_first_block_is_quarantined(write, layout):
    delivery = read(write(TWO_BLOCKS.replace("a title\n", "a title\n2031-01-01 00:00 1 2 aa\n")), layout)
    assert reasons(delivery) == {2: "no header of a block stands before this row"}


def test_a_doubled_first_line_of_a_header_is_quarantined_alone(write, layout):
    delivery = read(write(TWO_BLOCKS.replace("LEVELS at -1m", "LEVELS at -1m -25m\nLEVELS at -1m")), layout)
    assert reasons(delivery) == {3: "the header of a block has 2 lines; these are 1"}
    assert delivery.chain.sizes["time"] == 3


def test_a_header_cut_off_by_the_end_of_the_file_is_quarantined(write, layout):
    delivery = read(write(TWO_BLOCKS + "LEVELS at -1m\n"), layout)
    assert reasons(delivery) == {12: "the header of a block has 2 lines; these are 1"}


@pytest.mark.parametrize(
    ("content", "message"),
    [
        ("title\nLEVELS at Om -1m\nx\n2031-01-01 00:00 29 a\n", "line 2: a cell of the header is no depth: found 'Om'"),
        ("title\nLEVELS at\nx\n2031-01-01 00:00 29 a\n", "line 2: the header names no depth: found "),
        ("title\nlevels at -1m\n2031-01-01 00:00 29 a\n", "found no such line"),
        ("title\nLEVELS at 5m\nx\n", "line 2: this is no depth below the surface: found -5 m"),
        ("title\nLEVELS at -5m -5m\nx\n", "line 2: a sensor depth appears twice"),
    ],
)
def test_a_file_without_a_header_that_can_be_understood_is_told(write, layout, content, message):
    with pytest.raises(DataError, match="no block has a header") as caught:
        read(write(content), layout)
    assert message.removeprefix("found ") in caught.value.found


def test_headers_of_one_line_with_default_depth_cells_are_read(write):
    layout = BlockedLayout.model_validate(
        {"kind": "blocked", "block": {"begins": "z,", "before": ["t"]}, "time": {"column": "t"}, "missing": ["", "-99"]}
    )
    delivery = read(write("z,1,2.5\n2031-01-01,29,-99\nz,1,2.5\n2031-01-02,28,\n"), layout)
    np.testing.assert_array_equal(delivery.chain["depth"], [1, 2.5])
    np.testing.assert_array_equal(delivery.chain["temperature"], [[29, NAN], [28, NAN]])
    assert account(delivery) == (4, 4, 0)


def test_blocks_that_byte_blocks_cut_anywhere_are_read_alike(write, layout, monkeypatch):
    path = write(TWO_BLOCKS * 2)  # the second title is a row of the block before it, and wrong
    whole = read(path, layout)
    assert whole.rows_quarantined == 1 + 3
    for size in (*range(3, 40), 100):
        monkeypatch.setattr(source, "BLOCK_BYTES", size)
        cut = read(path, layout)
        assert cut.chain.identical(whole.chain)
        assert cut.quarantine.equals(whole.quarantine)


def test_many_short_blocks_take_no_longer_than_their_bytes(write):
    layout = BlockedLayout.model_validate(
        {"kind": "blocked", "block": {"begins": "z,", "before": ["t"]}, "time": {"column": "t"}}
    )
    days = np.datetime64("2031-01-01") + np.arange(3_000)
    delivery = read(write("".join(f"z,1\n{day},29\n" for day in days)), layout)
    assert delivery.chain.sizes["time"] == 3_000


@pytest.mark.parametrize("row", ["2031-01-01 00:00 x a\n", ""])
def test_headers_without_a_row_that_can_be_understood_are_told(write, layout, row):
    with pytest.raises(DataError, match="no row could be understood"):
        read(write("title\nLEVELS at -1m\nx\n" + row), layout)


def test_names_of_the_cells_behind_the_readings_may_stand_behind_the_depths(write, layout):
    named = TWO_BLOCKS.replace("LEVELS at -1m -25m", "LEVELS at -1m -25m marks").replace("-40m", "-40m marks")
    assert read(write(named), layout).chain.identical(read(write(TWO_BLOCKS), layout).chain)


def test_rows_under_a_header_whose_last_depth_is_damaged_are_quarantined(write, layout):
    delivery = read(write(TWO_BLOCKS.replace("-25m", "-2x5m")), layout)
    assert set(reasons(delivery)) == {5, 6}
    np.testing.assert_array_equal(
        delivery.chain["temperature"].sel(depth=[1, 10, 40]), np.float32([[29.0, 28.0, 15.0]])
    )


def test_depths_may_stand_between_other_marks_than_the_readings(write):
    layout = BlockedLayout.model_validate(LAYOUT | {"depth": LAYOUT["depth"] | {"between": ",:"}})
    marked = TWO_BLOCKS.replace("at -1m -25m", "at: -1m, -25m").replace("at -10m -1m -40m", "at: -10m, -1m,-40m")
    plain = BlockedLayout.model_validate(LAYOUT)
    assert read(write(marked), layout).chain.identical(read(write(TWO_BLOCKS), plain).chain)
