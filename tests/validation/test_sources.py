"""A model's files: which are meant, in which order, and what is said of those that are not whole."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
import xarray as xr

from profiles.config import ValidationSettings
from profiles.errors import EXIT_DATA, EXIT_REQUEST, DataError, RequestError
from profiles.validation import open_model
from profiles.validation.box import Reader, box_of
from profiles.validation.sources import files_of, open_source

SETTINGS = ValidationSettings()
FORMATS = ["NETCDF4", "NETCDF3_CLASSIC", "NETCDF3_64BIT", "NETCDF3_64BIT_DATA"]


def part(first: int, count: int = 4, rows: int = 8) -> xr.Dataset:
    """Days ``first`` and following of a model whose temperature is the number of the day."""
    days = first + np.arange(count)
    shape = (count, 3, rows, 36)
    warm = np.broadcast_to(days[:, None, None, None], shape).astype(np.float32)
    random = (
        np.random.default_rng(first).uniform(0.0, 1e-3, shape).astype(np.float32)
    )  # so that packing does not shrink
    return xr.Dataset(
        {
            "temp": (
                ("time", "lev", "lat", "lon"),
                warm + random,
                {"standard_name": "sea_water_temperature", "units": "degree_Celsius"},
            )
        },
        coords={
            "time": np.datetime64("2031-01-01T12", "ns") + days * np.timedelta64(1, "D"),
            "lev": ("lev", [5.0, 100.0, 300.0], {"units": "m", "positive": "down"}),
            "lat": ("lat", np.linspace(-7.0, 7.0, rows), {"units": "degrees_north"}),
            "lon": ("lon", np.arange(115.0, 291.0, 5.0), {"units": "degrees_east"}),
        },
    )


def write(folder: Path, form: str = "NETCDF4", count: int = 4) -> list[Path]:
    """Write some files of four days each."""
    paths = [folder / f"ocean_{number}.nc" for number in range(count)]
    for number, path in enumerate(paths):
        part(4 * number).to_netcdf(path, format=form, engine="netcdf4", unlimited_dims=["time"])
    return paths


def cut(path: Path, share: float = 0.5) -> None:
    content = path.read_bytes()
    path.write_bytes(content[: int(len(content) * share)])


# --------------------------------------------------------------------------------------------------------------
# Which files


def test_a_pattern_names_its_files_in_order(tmp_path: Path) -> None:
    paths = write(tmp_path)
    assert files_of(tmp_path / "ocean_*.nc") == paths
    assert files_of(str(tmp_path / "ocean_[12].nc")) == paths[1:3]
    (tmp_path / "deep").mkdir()
    deep = tmp_path / "deep" / "ocean_9.nc"
    deep.touch()
    assert files_of(f"{tmp_path}/*/ocean_?.nc") == [deep]


def test_files_named_twice_are_read_once(tmp_path: Path) -> None:
    paths = write(tmp_path)
    assert files_of([paths[2], tmp_path / "ocean_*.nc"]) == [paths[2], paths[0], paths[1], paths[3]]


def test_a_file_whose_name_holds_a_wildcard_is_that_file(tmp_path: Path) -> None:
    odd = tmp_path / "ocean[1].nc"
    odd.touch()
    assert files_of(odd) == [odd]


@pytest.mark.parametrize("name", ["none.nc", "none_*.nc", "none/ocean_*.nc"])
def test_a_model_that_is_not_there_is_a_wrong_request(tmp_path: Path, name: str) -> None:
    with pytest.raises(
        RequestError, match=rf"{name.replace('*', '.')}: no such model; expected NetCDF files"
    ) as caught:
        open_source(tmp_path / name)
    assert caught.value.exit_code == EXIT_REQUEST


def test_no_file_at_all_is_a_wrong_request() -> None:
    with pytest.raises(RequestError, match="no model is named; expected a file"):
        open_source([])


def test_a_folder_of_files_is_told_apart_from_a_store(tmp_path: Path) -> None:
    write(tmp_path)
    with pytest.raises(RequestError, match=r"a folder that is no Zarr store.*name the files in it: '.*\*\.nc'"):
        open_source(tmp_path)


def test_a_dataset_that_is_open_is_taken_as_it_is() -> None:
    dataset = part(0)
    assert open_source(dataset) is dataset


# --------------------------------------------------------------------------------------------------------------
# Many files


def days_read(dataset: xr.Dataset, times: slice) -> list[float]:
    opened = open_model(dataset)
    box = box_of(opened, np.array([0.0]), np.array([200.0]), SETTINGS)
    return np.floor(Reader(opened, box).read(times).temperature[:, 3, 10, 1]).tolist()


def test_files_are_joined_in_the_order_of_their_times(tmp_path: Path) -> None:
    paths = write(tmp_path)
    assert days_read(open_source(paths[::-1]), slice(3, 9)) == [3.0, 4.0, 5.0, 6.0, 7.0, 8.0]


def test_a_model_of_many_files_is_called_by_the_first(tmp_path: Path) -> None:
    assert open_model(write(tmp_path)).name == "ocean_0"


def test_dates_that_stand_beside_a_numbered_dimension_order_the_files(tmp_path: Path) -> None:
    """Some models number the dimension of time, each file from 0, and give the dates as an auxiliary coordinate."""
    paths = write(tmp_path, count=3)
    for number, path in enumerate(paths):
        numbered = part(4 * (2 - number)).assign_coords(time=np.arange(4.0))
        dates = np.datetime64("2031-01-01T12", "ns") + (4 * (2 - number) + np.arange(4)) * np.timedelta64(1, "D")
        path.unlink()
        numbered.assign_coords(middle=("time", dates, {"standard_name": "time"})).to_netcdf(path)
    assert days_read(open_source(paths), slice(3, 9)) == [3.0, 4.0, 5.0, 6.0, 7.0, 8.0]


def test_files_without_dates_do_not_belong_together(tmp_path: Path) -> None:
    paths = write(tmp_path, count=2)
    for path in paths:
        path.unlink()
        part(0).assign_coords(time=np.arange(4.0)).to_netcdf(path)
    with pytest.raises(DataError, match=r"do not belong together|time was not found"):
        open_model(paths)


def test_a_block_reads_its_own_times_alone(tmp_path: Path) -> None:
    """Every time is a task, so that what a block holds in memory does not grow with the file."""
    combined = open_source(write(tmp_path))
    assert combined["temp"].chunks is not None
    assert set(combined["temp"].chunks[0]) == {1}


def test_files_of_two_grids_do_not_belong_together(tmp_path: Path) -> None:
    paths = write(tmp_path, count=2)
    part(4, rows=9).to_netcdf(paths[1])
    with pytest.raises(DataError, match=r"ocean_0\.nc and 1 more: the model's files do not belong together"):
        open_source(paths)


def test_files_that_overlap_in_time_are_refused(tmp_path: Path) -> None:
    paths = write(tmp_path, count=2)
    part(2).to_netcdf(paths[1])
    with pytest.raises(DataError, match=r"do not belong together.*monotonic.*leave out the one that overlaps"):
        open_model(paths)


@pytest.mark.parametrize("form", FORMATS)
@pytest.mark.parametrize("share", [0.9, 0.5, 0.01])
def test_one_file_that_was_cut_off_among_many_is_named(tmp_path: Path, form: str, share: float) -> None:
    """Beyond the end of a file of the older formats the library would read zeros, and name nothing."""
    paths = write(tmp_path, form)
    assert open_source(paths).sizes["time"] == 16  # whole, they are read
    cut(paths[2], share)
    with pytest.raises(
        DataError, match=r"ocean_2\.nc: the model's file cannot be read.*fetch the file again"
    ) as caught:
        open_source(tmp_path / "ocean_*.nc")
    assert caught.value.exit_code == EXIT_DATA


def spoil_text(path: Path) -> None:
    path.write_text("depth,temperature\n5,28\n", encoding="utf-8")


def spoil_all(path: Path) -> None:
    path.write_bytes(b"")


@pytest.mark.parametrize("spoil", [spoil_text, spoil_all])
def test_what_is_no_netcdf_is_named(tmp_path: Path, spoil: Callable[[Path], None]) -> None:
    paths = write(tmp_path, count=2)
    spoil(paths[1])
    with pytest.raises(DataError, match=r"ocean_1\.nc: the model's file cannot be read; expected a whole NetCDF file"):
        open_source(paths)


# --------------------------------------------------------------------------------------------------------------
# Stores


@pytest.mark.parametrize("version", [2, 3])
@pytest.mark.parametrize("listed", [False, True])
@pytest.mark.filterwarnings("ignore:Consolidated metadata is currently not part")  # on writing
def test_a_store_is_read_with_and_without_a_list_of_its_content(tmp_path: Path, version: int, listed: bool) -> None:
    part(0, 6).chunk(time=2).to_zarr(tmp_path / "ocean.zarr", zarr_format=version, consolidated=listed)
    opened = open_model(tmp_path / "ocean.zarr")
    assert opened.name == "ocean"
    assert days_read(open_source(tmp_path / "ocean.zarr"), slice(1, 4)) == [1.0, 2.0, 3.0]


def test_a_store_whose_piece_was_cut_off_breaks_off_where_it_is_read(tmp_path: Path) -> None:
    store = tmp_path / "ocean.zarr"
    part(0, 6).chunk(time=2).to_zarr(store, zarr_format=3, consolidated=False)
    cut(store / "temp" / "c" / "1" / "0" / "0" / "0")
    dataset = open_source(store)
    assert days_read(dataset, slice(0, 2)) == [0.0, 1.0]
    with pytest.raises(
        DataError, match=r"model, temp: the model's file breaks off; expected a whole file.*decompression"
    ):
        days_read(dataset, slice(2, 4))
