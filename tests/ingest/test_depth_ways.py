"""[depth]: every way in which a file can say how deep."""

import numpy as np
import pytest
from pydantic import ValidationError

from profiles.errors import DataError
from profiles.ingest import read
from profiles.ingest.layout import LongLayout, WideLayout

NAN = np.nan


def wide(depth, **options):
    return WideLayout.model_validate({"kind": "wide", "time": {"column": "t"}, "depth": depth} | options)


def long(depth, **options):
    table = {"kind": "long", "time": {"column": "t"}, "depth": {"column": "z"} | depth, "temperature": {"column": "v"}}
    return LongLayout.model_validate(table | options)


ROWS = "2031-01-01,20,29\n"


@pytest.mark.parametrize(
    ("depth", "header"),
    [
        ({"pattern": "T_{depth}m"}, "t,T_25m,T_1m"),
        ({"pattern": "{depth}"}, "t,25,1.0"),
        ({"pattern": "T-{depth}", "positive": "up"}, "t,T--25,T--1"),
        ({"pattern": "[{depth}] (°C)"}, "t,[25] (°C),[1] (°C)"),
        ({"pattern": "{depth}", "units": "cm"}, "t,2500,100"),
        ({"columns": {"deep": 25, "top": 1}}, "t,deep,top"),
        ({"columns": {"top": -1, "deep": -25}, "positive": "up"}, "t,deep,top"),
        ({"values": [25, 1], "first": "a"}, "t,a,b"),
    ],
)
def test_the_depths_of_columns_are_told_and_sorted(write, depth, header):
    chain = read(write(f"{header}\n{ROWS}"), wide(depth)).chain
    np.testing.assert_array_equal(chain["depth"], [1, 25])
    np.testing.assert_array_equal(chain["temperature"], [[29, 20]])


@pytest.mark.parametrize("head", ["t,a,b\nm,25,1", "m,25,1\nt,a,b"])
def test_depths_stand_in_a_header_row(write, head):
    lines = head.split("\n")
    depth, names = 1 + lines.index("m,25,1"), 1 + lines.index("t,a,b")
    chain = read(write(f"{head}\n{ROWS}"), wide({"row": depth}, header_rows=2, names_row=names)).chain
    np.testing.assert_array_equal(chain["depth"], [1, 25])
    np.testing.assert_array_equal(chain["temperature"], [[29, 20]])


def test_a_number_above_the_stamps_is_no_depth(write):
    chain = read(write(f"2031,25,1\nt,a,b\n{ROWS}"), wide({"row": 1}, header_rows=2, names_row=2)).chain
    np.testing.assert_array_equal(chain["depth"], [1, 25])


def test_columns_that_are_no_sensors_are_left_alone(write):
    content = "t,battery,T1,T25,note\n2031-01-01,x,29,20,any text\n"
    for depth in ({"pattern": "T{depth}"}, {"values": [1, 25], "first": "T1"}):
        chain = read(write(content), wide(depth)).chain
        np.testing.assert_array_equal(chain["temperature"], [[29, 20]])


@pytest.mark.parametrize(
    ("header", "depth", "message"),
    [
        ("t,a,b", {"pattern": "T{depth}"}, "no column matches the pattern"),
        ("t,T1,T1", {"pattern": "T{depth}"}, "there are 2 columns of this name"),
        ("t,T1,T1.0", {"pattern": "T{depth}"}, "a sensor depth appears twice"),
        ("t,T1,T-25", {"pattern": "T{depth}"}, "this is no depth below the surface"),
        ("t,T1,T99999", {"pattern": "T{depth}"}, "this is no depth below the surface"),
        ("t,a,b", {"columns": {"a": 1, "c": 2}}, "the temperature column is missing"),
        ("t,a,b", {"values": [1, 2, 3], "first": "a"}, "there are fewer columns than depths"),
        ("t,a,b", {"values": [1, 2], "first": "x"}, "the temperature column is missing"),
    ],
)
def test_depths_that_do_not_fit_the_file_are_told(write, header, depth, message):
    with pytest.raises(DataError, match=message):
        read(write(f"{header}\n{ROWS}"), wide(depth))


def test_a_row_of_depths_that_does_not_fit_the_names_is_told(write):
    with pytest.raises(DataError, match="does not fit the columns"):
        read(write(f"25,1\nt,a,b\n{ROWS}"), wide({"row": 1}, header_rows=2, names_row=2))


@pytest.mark.parametrize(
    ("depth", "message"),
    [
        ({}, "either pattern or columns or row or values"),
        ({"pattern": "T{depth}", "row": 1}, "either pattern or columns or row or values"),
        ({"pattern": "T"}, "expected {depth} once"),
        ({"pattern": "{depth}{depth}"}, "expected {depth} once"),
        ({"values": [1, 2]}, "expected first"),
        ({"values": [1, 1], "first": "a"}, "appears twice"),
        ({"columns": {"a": 1, "b": 1}}, "appears twice"),
        ({"row": 2}, "expected one of the header_rows"),
        ({"pattern": "{depth}", "units": "kelvin"}, "unknown units"),
    ],
)
def test_what_makes_no_depth_is_refused(depth, message):
    with pytest.raises(ValidationError, match=message):
        wide(depth)


# ------------------------------------------------------------------------------------------------------------
# A depth in each row


def test_depths_of_rows_may_be_heights_in_other_units(write):
    chain = read(
        write("t,z,v\n2031-01-01,-2500,20\n2031-01-01,-100,29\n"), long({"units": "cm", "positive": "up"})
    ).chain
    np.testing.assert_array_equal(chain["depth"], [1, 25])
    np.testing.assert_array_equal(chain["temperature"], [[29, 20]])


def test_rows_of_an_impossible_or_missing_depth_are_quarantined(write):
    delivery = read(write("t,z,v\n2031-01-01,1,29\n2031-01-01,-1,29\n2031-01-01,12001,1\n2031-01-01,,1\n"), long({}))
    assert delivery.quarantine["reason"].tolist() == [
        "the depth is not between 0 and 12000 m",
        "the depth is not between 0 and 12000 m",
        "the depth is missing",
    ]


def test_rows_of_another_depth_than_the_declared_are_quarantined(write):
    delivery = read(write("t,z,v\n2031-01-01,1,29\n2031-01-01,2,28\n"), long({"values": [25, 1]}))
    assert delivery.quarantine["reason"].tolist() == ["the depth is not among those that the layout declares"]
    # a declared sensor without a row has a column all the same
    np.testing.assert_array_equal(delivery.chain["temperature"], [[29, NAN]])


@pytest.mark.parametrize(("tolerance", "kept"), [(0.4, ["20", "5.6"]), (0.5, ["20", "5.5", "5.6"]), (4.5, None)])
def test_rows_near_a_declared_depth_are_of_that_sensor(write, tolerance, kept):
    depths = ["20", "5.5", "5.6", "10"]
    rows = "".join(f"2031-01-0{place},{depth},2{place}\n" for place, depth in enumerate(depths, start=1))
    delivery = read(write("t,z,v\n" + rows), long({"values": [20, 5.0, 6.0], "tolerance": tolerance}))
    found = {
        depths[time.day - 1]: float(delivery.chain["depth"][place])
        for time, place in zip(
            delivery.chain["time"].values.astype("M8[us]").astype(object),
            np.isfinite(delivery.chain["temperature"].values).argmax(axis=1),
            strict=True,
        )
    }
    # 5.5 lies as near to 5 as to 6: it goes to the shallower; 10 is 4 from 6
    assert found == {depth: {"20": 20.0, "5.5": 5.0, "5.6": 6.0, "10": 6.0}[depth] for depth in kept or depths}


@pytest.mark.parametrize(("depth", "edge"), [("20.1", 0.1), ("19.9", 0.1), ("500.3", 0.3)])
def test_the_edge_of_the_tolerance_is_within_it(write, depth, edge):
    declared = round(float(depth))
    chain = read(write(f"t,z,v\n2031-01-01,{depth},20\n"), long({"values": [declared], "tolerance": edge})).chain
    assert chain["depth"].values.tolist() == [declared]


def test_a_file_with_more_depths_than_a_mooring_has_sensors_is_told(write):
    rows = "".join(f"2031-01-01,{depth},20\n" for depth in range(401))
    with pytest.raises(DataError, match="more depths than a mooring has sensors"):
        read(write("t,z,v\n" + rows), long({}))
    near = long({"values": [200], "tolerance": 300})
    assert read(write("t,z,v\n" + rows), near).rows_kept == 1  # all are of one sensor and time: the first stays
