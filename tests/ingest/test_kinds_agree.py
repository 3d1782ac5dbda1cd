"""One table, written in every kind of text, is one chain."""

from __future__ import annotations

import tempfile
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from profiles.errors import DataError
from profiles.ingest import read, source
from profiles.ingest.layout import KINDS

TIME = {"column": "t"}
ROW_PER_READING = {"time": TIME, "depth": {"column": "z"}, "temperature": {"column": "v"}, "missing": ["NA"]}


def stamp(minute):
    return str(np.datetime64("2031-02-28T23:00") + np.timedelta64(minute, "m"))


def shown(value):
    return "NA" if np.isnan(value) else repr(value)


def wide(times, depths, values):
    rows = [",".join([stamp(time), *map(shown, row)]) for time, row in zip(times, values, strict=True)]
    layout = {"kind": "wide", "time": TIME, "depth": {"pattern": "T{depth}"}, "missing": ["NA"]}
    return ["t," + ",".join(f"T{depth:g}" for depth in depths), *rows], layout


def fixed(times, depths, values):
    rows = ["".join([stamp(time), *(f"{shown(v):>25}" for v in row)]) for time, row in zip(times, values, strict=True)]
    places = {f"c{place}": (17 + 25 * place, 41 + 25 * place) for place in range(len(depths))}
    return rows, {
        "kind": "wide", "time": TIME, "header_rows": 0, "fixed": {"t": (1, 16)} | places, "missing": ["NA"],
        "depth": {"columns": dict(zip(places, depths, strict=True))},
    }  # fmt: skip


def long(times, depths, values):
    rows = [
        f"{stamp(time)},{depth:g},{shown(value)}"
        for time, row in zip(times, values, strict=True)
        for depth, value in zip(depths, row, strict=True)
    ]
    return ["t,z,v", *rows], {"kind": "long"} | ROW_PER_READING


def blocked(times, depths, values):
    """Write each time in a block of its own, upwards and downwards by turns."""
    lines = []
    for place, (time, row) in enumerate(zip(times, values, strict=True)):
        order = slice(None, None, 1 if place % 2 else -1)
        lines.append("Z " + " ".join(f"{depth:g}" for depth in depths[order]))
        lines.append(" ".join([stamp(time), *map(shown, row[order])]))
    layout = {"kind": "blocked", "delimiter": "whitespace", "block": {"begins": "Z", "before": ["t"]}, "time": TIME}
    return lines, layout | {"missing": ["NA"]}


def counted(times, depths, values):
    lines = []
    for time, row in zip(times, values, strict=True):
        lines += [f"{stamp(time)},{len(depths)}", *(f"{z:g},{shown(v)}" for z, v in zip(depths, row, strict=True))]
    layout = {"kind": "counted", "names": ["z", "v"], "record": {"names": ["t", "n"], "count": "n"}}
    return lines, layout | ROW_PER_READING


WRITERS = [wide, fixed, long, blocked, counted]


def chain_of(lines, layout, ends="\n"):
    model = KINDS[layout["kind"]].model_validate(layout)
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "file"
        path.write_bytes("".join(line + ends for line in lines).encode())
        delivery = read(path, model)
    assert delivery.rows_read == len(lines) - model.header_rows
    return delivery


tables = st.integers(1, 4).flatmap(
    lambda columns: st.tuples(
        st.lists(st.integers(0, 5_000), min_size=1, max_size=8, unique=True),
        st.lists(st.sampled_from([0.0, 1.0, 2.5, 10.0, 25.25, 500.0, 12_000.0]), min_size=columns, max_size=columns,
                 unique=True).map(sorted),
        st.lists(
            st.lists(st.one_of(st.just(np.nan), st.floats(-5, 40)), min_size=columns, max_size=columns),
            min_size=8, max_size=8,
        ),
    )
)  # fmt: skip


@settings(deadline=None, max_examples=40)
@given(tables, st.sampled_from(["\n", "\r\n", "\r"]), st.sampled_from([8, 61, 1 << 20]))
@pytest.mark.parametrize("writer", WRITERS)
def test_a_table_comes_back_whatever_the_kind_the_line_ends_and_the_blocks(writer, table, ends, block):
    times, depths, values = table[0], table[1], table[2][: len(table[0])]
    lines, layout = writer(times, depths, values)
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(source, "BLOCK_BYTES", block)
        delivery = chain_of(lines, layout, ends)
    order = np.argsort(times)
    expected = np.array(values)[order].astype(np.float32)
    np.testing.assert_array_equal(delivery.chain["time"], np.array([stamp(times[place]) for place in order], "M8[ns]"))
    np.testing.assert_array_equal(delivery.chain["depth"], np.float32(depths))
    np.testing.assert_array_equal(delivery.chain["temperature"], expected)
    assert delivery.rows_quarantined == 0


@settings(deadline=None, max_examples=40)
@given(tables, st.integers(0, 10_000), st.binary(min_size=1, max_size=6))
@pytest.mark.parametrize("writer", WRITERS)
def test_any_bytes_put_anywhere_leave_the_account_right_or_are_told(writer, table, place, foreign):
    lines, layout = writer(table[0], table[1], table[2][: len(table[0])])
    content = "".join(line + "\n" for line in lines).encode()
    place %= len(content) + 1
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "file"
        path.write_bytes(content[:place] + foreign + content[place:])
        try:
            delivery = read(path, KINDS[layout["kind"]].model_validate(layout))
        except DataError:
            return
    rows = (content[:place] + foreign + content[place:]).removeprefix(b"\xef\xbb\xbf").splitlines()
    present = sum(bool(row.strip(b" \t\x0b\x0c")) for row in rows) - (1 if writer in (wide, long) else 0)
    assert delivery.rows_read == present == delivery.rows_kept + delivery.rows_quarantined
