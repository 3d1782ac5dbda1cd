"""Lines cut at a delimiter."""

import csv

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from profiles.errors import DataError
from profiles.ingest import read
from profiles.ingest.cells import Damage, delimited_cells
from profiles.ingest.lines import find_lines

ANY_BLANKS = 0


def cut(text, delimiter=",", columns=3, **options):
    """Return the cells of one line, as many as there were, and the damage."""
    buffer = np.frombuffer(text.encode(), np.uint8)
    starts, ends = find_lines(buffer)
    code = delimiter if delimiter == ANY_BLANKS else ord(delimiter)
    found = delimited_cells(buffer, starts, ends, code, columns, **options)
    shown = min(int(found.count[0]), columns)
    return [found.text(0, column, "utf-8") for column in range(shown)], int(found.count[0]), Damage(found.damage[0])


@pytest.mark.parametrize(
    ("text", "delimiter", "cells"),
    [
        ("a,b,c", ",", ["a", "b", "c"]),
        (" a , b\t, c ", ",", ["a", "b", "c"]),
        (",,", ",", ["", "", ""]),
        ("a\t\tc", "\t", ["a", "", "c"]),
        ("a \t b\t ", "\t", ["a", "b", ""]),
        ("  a \t b   c  ", ANY_BLANKS, ["a", "b", "c"]),
        ('"a,b","c ""d""", e', ",", ["a,b", 'c "d"', "e"]),
        (' "a" ,"",b', ",", ["a", "", "b"]),
        ('"a b" c "d"', ANY_BLANKS, ["a b", "c", "d"]),
        ("a|b|c", "|", ["a", "b", "c"]),
    ],
)
def test_cells_are_freed_from_blanks_and_quotes(text, delimiter, cells):
    assert cut(text, delimiter) == (cells, 3, Damage.NONE)


def test_cells_beyond_the_columns_are_counted():
    assert cut("a,b,c,d,e") == (["a", "b", "c"], 5, Damage.NONE)
    assert cut("a") == (["a"], 1, Damage.NONE)


@pytest.mark.parametrize("text", ['"a,b', 'a,"b"c,d', 'a,""b",c', '"', 'a,"""'])
def test_quotes_that_do_not_pair_are_damage(text):
    assert cut(text)[2] == Damage.QUOTES


def test_a_nul_byte_is_damage():
    assert cut("a,b\x00,c")[2] == Damage.NUL
    assert cut('"a,b\x00', columns=2)[2] == Damage.NUL
    # the kernel stands for any run of blanks by the delimiter 0
    assert cut("a b\x00 c", ANY_BLANKS)[2] == Damage.NUL


def test_a_delimiter_more_at_the_end_is_one_cell_more_unless_the_layout_says_so():
    assert cut("a,b,c,")[1] == 4
    assert cut("a,b,c,", one_more=True) == (["a", "b", "c"], 3, Damage.NONE)
    assert cut("a,b,c", one_more=True) == (["a", "b", "c"], 3, Damage.NONE)
    assert cut("a,b,c,d", one_more=True)[1] == 4
    assert cut("a,b,c,,", one_more=True)[1] == 5


def test_rows_that_end_with_a_delimiter_are_read_where_the_layout_says_so(write, wide):
    content = "date,T_1m,T_10m\n2031-01-01,29,28,\n2031-01-02,27,26\n2031-01-03,25,24,23\n"
    layout = wide.model_copy(update={"ends_with_delimiter": True})
    assert read(write(content), layout).quarantine["line"].tolist() == [4]
    assert read(write(content), wide).quarantine["line"].tolist() == [2, 4]


@pytest.mark.parametrize("header", ['date,"T_1m,T_10m', "date,T_1m,\x00T_10m"])
def test_column_names_that_cannot_be_told_apart_are_told(write, wide, header):
    with pytest.raises(DataError, match="the column names cannot be told apart"):
        read(write(f"{header}\n2031-01-01,29,28\n"), wide)


def test_more_columns_than_a_delivery_has_are_told(write, wide):
    with pytest.raises(DataError, match="more columns than a delivery has"):
        read(write(f"date,T_1m{',x' * 4096}\n2031-01-01,29{',1' * 4096}\n"), wide)


# The csv module keeps blanks and does not tell unpaired quotes, so quotes here stand around whole cells.
plain = st.text(st.characters(codec="utf-8", exclude_characters='",\r\n\x00', exclude_categories=["Cs", "Z", "C"]))
quoted = st.text(st.sampled_from('ab,;" '), max_size=6).map(lambda text: '"' + text.replace('"', '""') + '"')


@settings(deadline=None, max_examples=300)
@given(st.lists(st.one_of(plain, quoted), min_size=1, max_size=6))
def test_cells_are_those_of_the_csv_module(cells):
    line = ",".join(cells)
    expected = [cell.strip() for cell in next(csv.reader([line]), [""])] if line else [""]
    if line:
        assert cut(line, columns=6) == (expected, len(expected), Damage.NONE)
