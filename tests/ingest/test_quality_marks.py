"""[quality]: delivered marks to our flags."""

import pytest
from pydantic import ValidationError

from profiles.errors import DataError
from profiles.ingest import read
from profiles.ingest.layout import LongLayout, WideLayout

FLAGS = {"0": 2, "1": 1, "2": 3, "good": 1, "": 2}
WIDE = {"kind": "wide", "time": {"column": "t"}, "depth": {"pattern": "T{depth}"}, "missing": ["NA"]}


def wide(quality, **options):
    return WideLayout.model_validate(WIDE | {"quality": quality} | options)


def flags(delivery):
    return delivery.chain["temperature_delivered_qc"].values.tolist()


def test_a_column_of_marks_for_each_sensor_by_pattern(write):
    content = "t,T25,T1,Q1,Q25\n2031-01-01,20,29,1,2\n2031-01-02,NA,28,good,1\n2031-01-03,19,27,,0\n"
    delivery = read(write(content), wide({"pattern": "Q{depth}", "flags": FLAGS}))
    # depths ascend: 1 m, 25 m; 9 where the reading is missing
    assert flags(delivery) == [[1, 3], [1, 9], [2, 2]]
    assert delivery.rows_quarantined == 0


def test_marks_by_name(write):
    content = "t,T25,T1,a,b\n2031-01-01,20,29,1,2\n"
    quality = {"columns": {"T1": "a", "T25": "b"}, "flags": FLAGS}
    assert flags(read(write(content), wide(quality))) == [[1, 3]]


def test_marks_glued_in_the_order_of_the_sensors(write):
    content = "t,T25,T1,q\n2031-01-01,20,29,12\n2031-01-02,20,29,2\n2031-01-03,20,29,1x\n2031-01-04,20,29,121\n"
    quality = {"column": "q", "flags": {"1": 1, "2": 3}}
    delivery = read(write(content), wide(quality))
    # the first character is of the first sensor in the file, which is the deeper one
    assert flags(delivery) == [[3, 1]]
    reasons = dict(zip(delivery.quarantine["line"], delivery.quarantine["reason"], strict=True))
    assert reasons == {
        3: "1 quality marks where there are 2 sensors",
        4: "the quality mark 'x' is in no table; say in [quality] flags what it means",
        5: "3 quality marks where there are 2 sensors",
    }


def test_an_unknown_mark_is_quarantined_not_guessed(write):
    content = "t,T1,Q1\n2031-01-01,29,1\n2031-01-02,29,01\n2031-01-03,29,7\n"
    delivery = read(write(content), wide({"pattern": "Q{depth}", "flags": FLAGS}))
    assert delivery.quarantine["line"].tolist() == [3, 4]


def test_marks_of_long_text_complete_each_other_by_depth(write):
    layout = LongLayout.model_validate(
        {"kind": "long", "missing": ["NA"], "time": {"column": "t"}, "depth": {"column": "z"},
         "temperature": {"column": "v"}, "quality": {"column": "q", "flags": {"A": 1, "B": 4}}}
    )  # fmt: skip
    content = "t,z,v,q\n2031-01-01,25,20,B\n2031-01-01,1,29,A\n2031-01-02,1,NA,A\n"
    assert flags(read(write(content), layout)) == [[1, 4], [9, 9]]


def test_marks_that_are_not_ascii_are_read_in_their_encoding(write):
    layout = wide({"pattern": "Q{depth}", "flags": {"gut": 1, "größer": 4}}, encoding="latin-1")
    content = "t,T1,Q1\n2031-01-01,29,größer\n2031-01-02,29,gut\n"
    assert flags(read(write(content.encode("latin-1")), layout)) == [[4], [1]]
    utf8 = wide({"pattern": "Q{depth}", "flags": {"gut": 1, "größer": 4}})
    assert flags(read(write(content), utf8)) == [[4], [1]]


def test_files_without_marks_have_no_flags(write):
    assert "temperature_delivered_qc" not in read(write("t,T1\n2031-01-01,2\n"), WideLayout.model_validate(WIDE)).chain


@pytest.mark.parametrize(
    ("quality", "message"),
    [
        ({"pattern": "F{depth}"}, "no column matches the pattern"),
        ({"pattern": "Q{depth}"}, "sensors without a column of quality marks"),
        ({"columns": {"T1": "Q1"}}, "sensors without a column of quality marks"),
        ({"column": "q"}, "the quality column is missing"),
    ],
)
def test_marks_that_are_not_there_are_told(write, quality, message):
    marks = {"1": 1} if "column" in quality else FLAGS
    with pytest.raises(DataError, match=message):
        read(write("t,T1,T25,Q1\n2031-01-01,29,20,1\n"), wide(quality | {"flags": marks}))


@pytest.mark.parametrize(
    ("quality", "message"),
    [
        ({"flags": FLAGS}, "either pattern or columns or column"),
        ({"column": "q", "pattern": "Q{depth}", "flags": {"1": 1}}, "either pattern or columns or column"),
        ({"column": "q", "flags": {"10": 1}}, "one character each"),
        ({"column": "q", "flags": {}}, "at least 1"),
        ({"column": "q", "flags": {"1": 5}}, "1, 2, 3, 4 or 9"),
    ],
)
def test_what_makes_no_table_of_marks_is_refused(quality, message):
    with pytest.raises(ValidationError, match=message):
        wide(quality)
