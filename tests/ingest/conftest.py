"""Layouts and files that the tests of the ingest room share."""

from __future__ import annotations

import netCDF4
import numpy as np
import pytest

from profiles.ingest import load_layout

WIDE = """
kind = "wide"
comment = "#"
missing = ["-9.999", "NA"]
[time]
column = "date"
[depth]
pattern = "T_{depth}m"
"""

LONG = """
kind = "long"
missing = ["NA"]
[time]
column = "time"
[depth]
column = "depth"
[temperature]
column = "temp"
"""


@pytest.fixture
def layout_of(tmp_path):
    """Return a function that loads a layout from its text."""

    def load(text):
        path = tmp_path / "layout.toml"
        path.write_text(text, encoding="utf-8")
        return load_layout(path)

    return load


@pytest.fixture
def wide(layout_of):
    return layout_of(WIDE)


@pytest.fixture
def long(layout_of):
    return layout_of(LONG)


@pytest.fixture
def write(tmp_path):
    """Return a function that writes a delivery, bytes or text, and gives its path."""

    def write_file(content, name="delivery.csv"):
        path = tmp_path / name
        path.write_bytes(content if isinstance(content, bytes) else content.encode())
        return path

    return write_file


@pytest.fixture
def write_netcdf(tmp_path):
    """Return a function that writes an OceanSITES-like file of three days and two depths, with changes."""

    def write_file(change=None, *, days=(29585.5, 29586.5, 29587.5), file_format="NETCDF4"):
        path = tmp_path / "delivery.nc"
        with netCDF4.Dataset(path, "w", format=file_format) as file:
            file.createDimension("TIME", None)
            file.createDimension("DEPTH", 2)
            time = file.createVariable("TIME", "f8", ("TIME",), fill_value=999999.0)
            time.setncatts({"units": "days since 1950-01-01T00:00:00Z", "standard_name": "time"})
            depth = file.createVariable("DEPTH", "f4", ("DEPTH",))
            depth.setncatts({"units": "meters", "positive": "down", "standard_name": "depth"})
            for name, value in (("LATITUDE", 0.0), ("LONGITUDE", -155.0)):
                file.createVariable(name, "f4", ())[...] = value
                file[name].standard_name = name.lower()
            temperature = file.createVariable("TEMP", "f4", ("TIME", "DEPTH"), fill_value=99999.0)
            temperature.setncatts({"units": "degree_Celsius", "standard_name": "sea_water_temperature"})
            flags = file.createVariable("TEMP_QC", "i1", ("TIME", "DEPTH"), fill_value=-128)
            time[:] = days
            depth[:] = [10.0, 1.0]
            temperature[:] = 20.0 + np.arange(2 * len(days)).reshape(-1, 2)
            flags[:] = 1
            if change is not None:
                change(file)
        return path

    return write_file
