"""Properties that hold for any table and any damage."""

import csv
import io
import tempfile
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from profiles.errors import DataError
from profiles.ingest import read
from profiles.ingest.layout import LongLayout, WideLayout

WIDE = WideLayout.model_validate(
    {
        "kind": "wide",
        "comment": "#",
        "missing": ["-9.999"],
        "time": {"column": "date"},
        "depth": {"pattern": "T{depth}"},
    }
)
LONG = LongLayout.model_validate(
    {
        "kind": "long",
        "comment": "#",
        "time": {"column": "date"},
        "depth": {"column": "z"},
        "temperature": {"column": "t"},
    }
)
DEPTHS = (1.0, 10.0, 25.5)

readings = st.one_of(st.just(-9.999), st.floats(-5, 40, width=32))
damages = st.sampled_from(
    [
        lambda row: row[:-1],
        lambda row: [*row, b"1"],
        lambda row: [b"nonsense", *row[1:]],
        lambda row: [*row[:-1], b"1e999"],
        lambda row: [*row[:-1], b"\x00"],
        lambda row: [*row[:-1], b"\xfe"],
        lambda row: [*row[:-1], b'"'],
        lambda row: [b"2031-02-30", *row[1:]],
    ]
)


@st.composite
def tables(draw, columns):
    """Rows of a stamp and numbers, some damaged, some repeated, with blank and comment lines between."""
    days = draw(st.lists(st.integers(0, 60), min_size=1, max_size=12))
    rows, sound = [], []
    for day in days:
        stamp = str(np.datetime64("2031-01-01") + day)
        row = [stamp.encode(), *(repr(draw(number)).encode() for number in columns)]
        damage = draw(st.one_of(st.none(), damages))
        rows.append(row if damage is None else damage(row))
        if damage is None:
            sound.append([cell.decode() for cell in row])
    lines = [b",".join(row) for row in rows]
    between = draw(
        st.lists(st.tuples(st.integers(0, len(lines)), st.sampled_from([b"", b"  ", b"# note"])), max_size=3)
    )
    for place, line in between:
        lines.insert(place, line)
    return lines, sound


def data_lines(content):
    """Count the data rows without the code under test."""
    rows = [line.strip() for line in content.split(b"\n")]
    return sum(bool(row) and not row.startswith(b"#") for row in rows) - 1  # the header


def read_content(content, layout):
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "delivery.csv"
        path.write_bytes(content)
        return read(path, layout)


@settings(deadline=None, max_examples=60)
@given(tables([readings] * len(DEPTHS)))
def test_wide_rows_are_kept_or_quarantined_and_sound_values_are_as_csv_reads_them(table):
    lines, sound = table
    content = b"\n".join([b"date,T1,T10,T25.5", *lines])
    first = {}
    for row in csv.reader(io.StringIO("\n".join(",".join(row) for row in sound))):
        first.setdefault(row[0], [np.float32(np.nan) if cell == "-9.999" else np.float32(cell) for cell in row[1:]])
    if not first:
        with pytest.raises(DataError, match="no row could be understood"):
            read_content(content, WIDE)
        return
    delivery = read_content(content, WIDE)
    assert delivery.rows_read == data_lines(content)
    assert delivery.rows_kept + delivery.rows_quarantined == data_lines(content)
    assert delivery.rows_kept == len(first) == delivery.chain.sizes["time"]
    expected = pd.DataFrame.from_dict(first, orient="index").sort_index()
    np.testing.assert_array_equal(delivery.chain["time"], expected.index.to_numpy().astype("datetime64[ns]"))
    np.testing.assert_array_equal(delivery.chain["temperature"], expected.to_numpy(np.float32))
    # each quarantined line is the line of the file that its number says
    for entry in delivery.quarantine.itertuples():
        assert content.split(b"\n")[entry.line - 1].startswith(entry.text[:5].encode())


@settings(deadline=None, max_examples=60)
@given(tables([st.sampled_from(DEPTHS), st.floats(-5, 40, width=32)]))
def test_long_rows_are_kept_or_quarantined_and_sound_values_are_as_csv_reads_them(table):
    lines, sound = table
    content = b"\n".join([b"date,z,t", b"2031-06-01,1,20", *lines])
    delivery = read_content(content, LONG)
    first = {("2031-06-01", 1.0): np.float32(20)}
    for stamp, depth, value in csv.reader(io.StringIO("\n".join(",".join(row) for row in sound))):
        first.setdefault((stamp, float(depth)), np.float32(value))
    assert delivery.rows_read == data_lines(content)
    assert delivery.rows_kept + delivery.rows_quarantined == data_lines(content)
    assert delivery.rows_kept == len(first) == int(delivery.chain["temperature"].notnull().sum())
    for (stamp, depth), value in first.items():
        assert delivery.chain["temperature"].sel(time=stamp, depth=depth).item() == value


@settings(deadline=None, max_examples=25)
@given(tables([readings] * len(DEPTHS)), st.randoms())
def test_the_order_of_rows_does_not_matter_where_no_time_is_repeated(table, random):
    _, sound = table
    unique = list({row[0]: ",".join(row).encode() for row in sound}.values()) or [b"2031-01-01,1,2,3"]
    shuffled = random.sample(unique, len(unique))
    one, other = (read_content(b"\n".join([b"date,T1,T10,T25.5", *rows]), WIDE) for rows in (unique, shuffled))
    assert one.chain.identical(other.chain)
