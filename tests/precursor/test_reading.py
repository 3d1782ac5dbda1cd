"""Monthly series from files of every kind."""

from __future__ import annotations

import numpy as np
import pytest
import xarray as xr

from profiles.errors import DataError, RequestError
from profiles.precursor import read_series

NAN = np.nan
NAME = "surface_temperature_index"
VALUES = np.round(26.0 + np.sin(np.arange(36.0)), 2)
MONTHS = np.arange("2031-01", "2034-01", dtype="datetime64[M]")


@pytest.fixture
def write(tmp_path):
    def save(text, name="index.txt"):
        path = tmp_path / name
        path.write_text(text, encoding="utf-8")
        return path

    return save


def rows(values=VALUES, head="", foot=""):
    lines = [f"{2031 + n}  " + "  ".join(f"{value:7.2f}" for value in values[12 * n : 12 * n + 12]) for n in range(3)]
    return head + "\n".join(lines) + "\n" + foot


def test_rows_of_a_year_and_twelve_months(write):
    found = read_series(write(rows()), name=NAME)
    np.testing.assert_array_equal(found.values, VALUES)
    assert (found["time"].values.astype("datetime64[M]") == MONTHS).all()
    assert found.attrs["units"] == "degree_Celsius"


def test_head_and_foot_are_passed_over_and_a_lone_number_is_the_missing_value(write):
    values = VALUES.copy()
    values[-2:] = -99.99
    text = rows(values, head="   2031   2033\n", foot="  -99.99\n  Mean over the box, 1x1 degrees\n")
    found = read_series(write(text), name=NAME)
    assert found.size == 34
    np.testing.assert_array_equal(found.values, VALUES[:34])


def test_a_missing_value_that_nobody_declared_is_named(write):
    values = VALUES.copy()
    values[20] = -99.99
    path = write(rows(values))
    with pytest.raises(DataError, match=r"'missing' was left among the data; .*found -99.99 in 2032-09; declare it"):
        read_series(path, name=NAME)
    assert np.isnan(read_series(path, name=NAME, missing=-99.99).values[20])


def test_kelvin_in_a_text_is_refused(write):
    with pytest.raises(DataError, match=r"index.txt: the temperatures are not in °C; .*looks like kelvin"):
        read_series(write(rows(VALUES + 273.15)), name=NAME)


def test_a_short_row_is_named_by_its_line(write):
    lines = rows(head="# sea surface temperature\n").splitlines()
    lines[2] = lines[2].rsplit(maxsplit=1)[0]
    with pytest.raises(DataError, match=r"index.txt, line 3: this line is no year with twelve months"):
        read_series(write("\n".join(lines)), name=NAME)


def test_a_year_left_out_is_named_by_its_line(write):
    lines = rows().splitlines()
    with pytest.raises(DataError, match=r"line 2: the years do not follow one another; expected 2032; found 2033"):
        read_series(write("\n".join([lines[0], lines[2]])), name=NAME)


@pytest.mark.parametrize(
    ("head", "date"),
    [
        ("time,sst", "{}"),
        ("Month, SST", "{}"),
        ("date;sst", "{}-15"),
        ("time\tsst", "{}-15T12:00:00Z"),
        ("# made by hand\ntime,sst", "{}-01 00:00"),
    ],
)
def test_a_table_of_dates_and_values(write, head, date):
    mark = next(mark for mark in ",;\t" if mark in head)
    lines = [head, *(f"{date.format(month)}{mark}{value}" for month, value in zip(MONTHS, VALUES, strict=True))]
    found = read_series(write("\n".join(lines), "index.csv"), name=NAME)
    np.testing.assert_array_equal(found.values, VALUES)


def test_a_table_of_year_and_month(write):
    lines = ["year,month,sst", *(f"{n // 12 + 2031},{n % 12 + 1},{VALUES[n]}" for n in range(36))]
    np.testing.assert_array_equal(read_series(write("\n".join(lines), "index.csv"), name=NAME).values, VALUES)


def table(values, head="time,sst,other"):
    return "\n".join([head, *(f"{month},{value},1.5" for month, value in zip(MONTHS, values, strict=True))])


def test_the_column_must_be_named_where_there_are_several(write):
    path = write(table(VALUES), "index.csv")
    with pytest.raises(RequestError, match=r"which column is meant.* found sst, other; name the column"):
        read_series(path, name=NAME)
    np.testing.assert_array_equal(read_series(path, name=NAME, column="sst").values, VALUES)
    with pytest.raises(RequestError, match="no such column; expected time, sst, other; found 'tos'"):
        read_series(path, name=NAME, column="tos")


def test_an_empty_field_is_missing_and_a_word_is_refused(write):
    values = [*VALUES]
    values[4] = ""
    assert np.isnan(read_series(write(table(values), "index.csv"), name=NAME, column="sst").values[4])
    values[5] = "bad"
    with pytest.raises(DataError, match=r"row 6 below the head, column 'sst': a value is no number; found 'bad'"):
        read_series(write(table(values), "index.csv"), name=NAME, column="sst")


@pytest.mark.parametrize(
    ("date", "found"), [("01/2031", "'01/2031'"), ("2031-13", "'2031-13'"), ("203101", "'203101'")]
)
def test_other_dates_are_not_guessed(write, date, found):
    with pytest.raises(DataError, match=rf"row 1 below the head: a date is not understood; .*found {found}"):
        read_series(write(f"time,sst\n{date},26.0\n2031-02,26.1\n", "index.csv"), name=NAME)


def test_a_table_without_dates_is_refused(write):
    with pytest.raises(DataError, match=r"the table has no dates; .*found when, sst"):
        read_series(write("when,sst\n1,26.0\n2,27.0\n", "index.csv"), name=NAME)


def test_a_missing_month_in_a_table_is_named(write):
    lines = table(VALUES, "time,sst,other").splitlines()
    with pytest.raises(DataError, match="months are left out; expected 2031-03 after 2031-02; found 2031-04"):
        read_series(write("\n".join(lines[:3] + lines[4:]), "index.csv"), name=NAME, column="sst")


def save(tmp_path, **variables):
    path = tmp_path / "index.nc"
    dataset = xr.Dataset(variables, coords={"time": MONTHS.astype("datetime64[ns]")})
    dataset.to_netcdf(path)
    return path


def test_a_series_in_netcdf_is_told_by_its_standard_name(tmp_path):
    attributes = {"standard_name": "sea_surface_temperature", "units": "K"}
    path = save(tmp_path, temp=("time", VALUES + 273.15, attributes), wind=("time", VALUES))
    found = read_series(path, name=NAME)
    np.testing.assert_allclose(found.values, VALUES, atol=1e-9)
    assert found.attrs["units_read"] == "K"
    np.testing.assert_array_equal(read_series(path, name="wind").values, VALUES)


def test_a_map_in_netcdf_is_averaged_over_the_box(tmp_path):
    values = np.broadcast_to(VALUES[:, None, None], (36, 20, 60)).copy()
    path = tmp_path / "map.nc"
    xr.Dataset(
        {"tos": (("time", "lat", "lon"), values, {"units": "degree_Celsius"})},
        coords={"time": MONTHS.astype("datetime64[ns]"), "lat": np.arange(-9.5, 10), "lon": np.arange(185.5, 245)},
    ).to_netcdf(path)
    np.testing.assert_allclose(read_series(path, name=NAME, box="nino34").values, VALUES)
    with pytest.raises(DataError, match="this is no series; expected one dimension, time; found time, lat, lon"):
        read_series(path, name="wind", column="tos")


def test_an_ambiguous_netcdf_file_is_refused(tmp_path):
    path = save(tmp_path, a=("time", VALUES), b=("time", VALUES))
    with pytest.raises(RequestError, match=r"which variable is meant.*found a, b"):
        read_series(path, name="wind")
    with pytest.raises(RequestError, match=r"there is no variable to read; .*found a, b"):
        read_series(path, name=NAME)


def test_what_is_no_file_or_no_text_is_refused(tmp_path):
    with pytest.raises(RequestError, match=r"nothing.csv: no such file"):
        read_series(tmp_path / "nothing.csv", name=NAME)
    (tmp_path / "index.dat").write_bytes(b"\xff\xfe\x00")
    with pytest.raises(DataError, match=r"neither text nor .nc; found byte 0 is not UTF-8"):
        read_series(tmp_path / "index.dat", name=NAME)
    (tmp_path / "index.nc").write_bytes(b"no netcdf")
    with pytest.raises(DataError, match="not a NetCDF file that can be read"):
        read_series(tmp_path / "index.nc", name=NAME)
