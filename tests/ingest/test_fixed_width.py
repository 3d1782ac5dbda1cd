"""Text with columns at fixed places."""

import numpy as np
import pytest
from pydantic import ValidationError

from profiles.ingest import read
from profiles.ingest.cells import Damage, fixed_cells
from profiles.ingest.layout import LongLayout, WideLayout
from profiles.ingest.lines import find_lines

LAYOUT = {
    "kind": "wide",
    "header_rows": 2,
    "missing": ["-99.999", ""],
    "fixed": {"day": [1, 8], "clock": [10, 13], "top": [14, 20], "low": [21, 27]},
    "time": {"columns": ["day", "clock"], "format": "%Y%m%d %H%M"},
    "depth": {"columns": {"top": 1, "low": 25}},
}
HEAD = "a title\nyyyymmdd hhmm    top    low\n"
NAN = np.nan


def wide(**options):
    return WideLayout.model_validate(LAYOUT | options)


def cells(text, places, **options):
    buffer = np.frombuffer(text.encode(), np.uint8)
    starts, ends = find_lines(buffer)
    return fixed_cells(buffer, starts, ends, np.array(places), True, **options)


def test_cells_are_cut_at_characters_and_freed_from_blanks():
    found = cells("  12 34\nåé 56 7\n", [[1, 4], [5, 5], [6, 7]])
    assert [[found.text(line, column, "utf-8") for column in range(3)] for line in range(2)] == [
        ["12", "", "34"],
        ["åé 5", "6", "7"],
    ]
    assert found.damage.tolist() == [Damage.NONE, Damage.NONE]


def test_a_line_that_ends_before_its_last_column_is_damaged_unless_blanks_are_trimmed():
    for trimmed, damage in ((False, Damage.ENDS_INSIDE), (True, Damage.NONE)):
        found = cells("123\n", [[1, 2], [3, 5]], trimmed=trimmed)
        assert found.damage[0] == damage
        assert [found.text(0, column, "utf-8") for column in range(2)] == ["12", "3"]


def test_columns_that_touch_are_told_apart(write):
    delivery = read(write(HEAD + "20310101 0000-10.123-20.456\n20310101 0100 -1.000-99.999\r\n"), wide())
    np.testing.assert_array_equal(delivery.chain["temperature"], np.float32([[-10.123, -20.456], [-1, NAN]]))


def test_rows_cut_short_are_quarantined_and_longer_ones_read(write):
    rows = ["20310101 0000 29.500 20.25", "20310101 0100 29.500 20.250 note", "20310101 0200 29.500"]
    delivery = read(write(HEAD + "\n".join(rows)), wide())
    assert delivery.quarantine["line"].tolist() == [3, 5]
    assert set(delivery.quarantine["reason"]) == {"the row ends before its last column does"}
    np.testing.assert_array_equal(delivery.chain["temperature"], np.float32([[29.5, 20.25]]))


def test_rows_may_end_early_where_the_layout_says_that_blanks_were_trimmed(write):
    delivery = read(write(HEAD + "20310101 0000 29.500\n20310101 0100         20.250\n"), wide(trimmed=True))
    np.testing.assert_array_equal(delivery.chain["temperature"], np.float32([[29.5, NAN], [NAN, 20.25]]))


def test_a_character_of_several_bytes_moves_no_column(write):
    fixed = {"note": [1, 3], "day": [4, 11], "top": [12, 17]}
    layout = wide(fixed=fixed, time={"column": "day", "format": "%Y%m%d"}, depth={"columns": {"top": 1}}, header_rows=0)
    content = "å° 20310101 29.5 \nabc20310102 28.5 \n"
    assert read(write(content), layout).chain["temperature"].values[:, 0].tolist() == [29.5, 28.5]
    latin = layout.model_copy(update={"encoding": "iso8859-1"})
    assert read(write(content.encode("latin-1")), latin).chain["temperature"].values[:, 0].tolist() == [29.5, 28.5]


def test_depths_may_stand_above_their_columns(write):
    layout = wide(depth={"row": 2}, header_rows=2)
    content = "a title\n                1.0   25.5\n20310101 0000 29.500 20.250\n"
    delivery = read(write(content), layout)
    np.testing.assert_array_equal(delivery.chain["depth"], [1, 25.5])


def test_long_text_at_fixed_places(write):
    layout = LongLayout.model_validate(
        {"kind": "long", "header_rows": 0, "fixed": {"t": [1, 16], "z": [17, 20], "v": [21, 26], "q": [27, 27]},
         "time": {"column": "t"}, "depth": {"column": "z"}, "temperature": {"column": "v"},
         "quality": {"column": "q", "flags": {"1": 1, "4": 4}}}
    )  # fmt: skip
    delivery = read(write("2031-01-01T00:00   1 29.5 1\n2031-01-01T00:00  25 20.254\n"), layout)
    np.testing.assert_array_equal(delivery.chain["temperature"], np.float32([[29.5, 20.25]]))
    np.testing.assert_array_equal(delivery.chain["temperature_delivered_qc"], [[1, 4]])


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ({"fixed": LAYOUT["fixed"] | {"low": [27, 21]}}, "the column 'low' ends before it begins"),
        ({"fixed": LAYOUT["fixed"] | {"low": [0, 21]}}, "greater than"),
        ({"names": ["a"]}, "either fixed or names"),
    ],
)
def test_places_that_make_no_column_are_refused(change, message):
    with pytest.raises(ValidationError, match=message):
        wide(**change)
