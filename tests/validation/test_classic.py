"""The length that a file of NetCDF's older formats claims is the length that NetCDF's library wrote."""

from __future__ import annotations

from pathlib import Path

import netCDF4
import numpy as np
import pytest

from profiles.validation.classic import least_length

FORMATS = ["NETCDF3_CLASSIC", "NETCDF3_64BIT_OFFSET", "NETCDF3_64BIT_DATA"]
#: Variables by their dimensions and types; "t" has records. Odd sizes make padding matter.
CONTENTS = {
    "nothing": {},
    "fixed": {"a": (("x",), "f8"), "b": (("y", "x"), "i2")},
    "one with records": {"a": (("t", "y"), "i2")},
    "several with records": {
        "a": (("t",), "f8"),
        "b": (("t", "y"), "i1"),
        "c": (("x",), "f4"),
        "d": (("t", "x"), "f4"),
    },
    "scalars and letters": {"a": ((), "f8"), "b": (("y",), "S1")},
}


def write(path: Path, form: str, content: dict[str, tuple[tuple[str, ...], str]], records: int) -> None:
    with netCDF4.Dataset(path, "w", format=form) as file:
        file.title = "five"
        file.numbers = np.arange(3, dtype=np.int16)
        for name, length in (("t", None), ("x", 5), ("y", 3)):
            file.createDimension(name, length)
        for name, (dims, kind) in content.items():
            variable = file.createVariable(name, kind, dims)
            variable.units = "m"
            shape = tuple({"t": records, "x": 5, "y": 3}[dim] for dim in dims)
            variable[...] = np.full(shape, b"z") if kind == "S1" else np.ones(shape)


@pytest.mark.parametrize("form", FORMATS)
@pytest.mark.parametrize("content", CONTENTS)
@pytest.mark.parametrize("records", [0, 1, 7])
def test_the_last_value_ends_where_the_file_does(tmp_path: Path, form: str, content: str, records: int) -> None:
    path = tmp_path / "file.nc"
    write(path, form, CONTENTS[content], records)
    claimed = least_length(path)
    if not claimed:  # no values: what is left is the header
        assert content == "nothing" or (content == "one with records" and records == 0)
        return
    assert 0 <= path.stat().st_size - claimed < 4  # padding


def test_other_formats_claim_nothing(tmp_path: Path) -> None:
    path = tmp_path / "file.nc"
    write(path, "NETCDF4", CONTENTS["fixed"], 2)
    assert least_length(path) == 0
    path.write_bytes(b"")
    assert least_length(path) == 0


@pytest.mark.parametrize("kept", [4, 6, 40, 100])
def test_a_header_that_was_cut_off_is_said_to_be(tmp_path: Path, kept: int) -> None:
    path = tmp_path / "file.nc"
    write(path, FORMATS[0], CONTENTS["fixed"], 2)
    path.write_bytes(path.read_bytes()[:kept])
    with pytest.raises(ValueError, match="the header is not whole"):
        least_length(path)


def test_records_of_a_stream_are_not_counted(tmp_path: Path) -> None:
    """A file written as a stream has only ones where the number of records stands; only fixed variables tell then."""
    path = tmp_path / "file.nc"
    write(path, FORMATS[0], CONTENTS["several with records"], 7)
    whole = least_length(path)
    content = bytearray(path.read_bytes())
    content[4:8] = b"\xff" * 4
    path.write_bytes(content)
    assert 0 < least_length(path) < whole
