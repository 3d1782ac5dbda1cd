"""Tables as CSV."""

from __future__ import annotations

from pathlib import Path
from typing import IO

import numpy as np
import pandas as pd
import pytest

from profiles.store import read_table, write_table

TABLE = pd.DataFrame(
    {
        "mooring": ["B-1", "NA", 'a "b", c'],
        "time": pd.to_datetime(["2031-03-01T00:00:00", "2031-03-01T12:30:05", None]),
        "count": [1, 1234567, -3],
        "depth": [150.0, 1.0 / 3.0, np.nan],
        "volume": [1.5e15, 1234567.0, 1e-7],
        "note": ["20 °C", "", "two\nlines"],
    }
)


def test_a_table_is_written_as_stated(tmp_path: Path) -> None:
    write_table(tmp_path / "table.csv", TABLE)
    # Comma, UTF-8, LF, times ISO 8601 in UTC, six significant digits for numbers that are not whole, no index.
    assert (tmp_path / "table.csv").read_bytes().decode("utf-8") == (
        "mooring,time,count,depth,volume,note\n"
        "B-1,2031-03-01T00:00:00Z,1,150,1.5e+15,20 °C\n"
        "NA,2031-03-01T12:30:05Z,1234567,0.333333,1.23457e+06,\n"
        '"a ""b"", c",,-3,,1e-07,"two\nlines"\n'
    )


def test_a_table_comes_back(tmp_path: Path) -> None:
    write_table(tmp_path / "table.csv", TABLE)
    back = read_table(tmp_path / "table.csv")
    assert list(back) == list(TABLE)
    # A mooring that is called NA is one; an empty cell is none.
    assert back["mooring"].tolist() == TABLE["mooring"].tolist()
    assert back["time"].tolist()[:2] == ["2031-03-01T00:00:00Z", "2031-03-01T12:30:05Z"]
    assert back["count"].tolist() == [1, 1234567, -3]
    np.testing.assert_allclose(back["depth"], TABLE["depth"], rtol=5e-6)
    assert back["note"].isna().tolist() == [False, True, False]


def test_an_empty_table_keeps_its_header(tmp_path: Path) -> None:
    write_table(tmp_path / "table.csv", TABLE.iloc[:0])
    assert (tmp_path / "table.csv").read_text() == "mooring,time,count,depth,volume,note\n"
    assert list(read_table(tmp_path / "table.csv")) == list(TABLE)


def test_a_table_that_cannot_be_written_leaves_the_old_one(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    write_table(tmp_path / "table.csv", TABLE)
    old = (tmp_path / "table.csv").read_bytes()

    def fail(self: pd.DataFrame, stream: IO[str], **_: object) -> None:
        stream.write("moor")
        raise ZeroDivisionError("halfway")

    monkeypatch.setattr(pd.DataFrame, "to_csv", fail)
    with pytest.raises(ZeroDivisionError, match="halfway"):
        write_table(tmp_path / "table.csv", TABLE)
    assert {path.name: path.read_bytes() for path in tmp_path.iterdir()} == {"table.csv": old}
