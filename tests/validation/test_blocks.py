"""How a model is cut into blocks and reads, and that every worker's part comes to the same."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import dask
import numpy as np
import pytest
import xarray as xr

from profiles import compare_model
from profiles.config import ColumnSettings, ValidationSettings
from profiles.errors import DataError
from profiles.validation import Model, open_model
from profiles.validation.blocks import Job, blocks_of, reads_of, values_of, wet_points
from profiles.validation.box import Box, Reader, box_of
from profiles.validation.full_model import ToCells
from profiles.validation.stencils import stencil

SETTINGS = ValidationSettings()
PLACE = np.array([0.0]), np.array([200.0])
#: MB of one time of the model below: 3 levels, 8 rows and 35 columns of float32.
A_STEP = 3 * 8 * 35 * 4 / 1e6


def daily(days: int, first: str = "2031-01-10", times_a_day: int = 1) -> xr.Dataset:
    hours = 24 // times_a_day * (np.arange(days * times_a_day) + 0.5)
    random = np.random.default_rng(2)
    shape = (days * times_a_day, 3, 8, 35)
    return xr.Dataset(
        {
            "temp": (
                ("time", "lev", "lat", "lon"),
                random.uniform(5.0, 30.0, shape).astype(np.float32),
                {"standard_name": "sea_water_temperature", "units": "degree_Celsius"},
            )
        },
        coords={
            "time": np.datetime64(first, "ns") + (hours * 60).astype(int) * np.timedelta64(1, "m"),
            "lev": ("lev", [5.0, 100.0, 300.0], {"units": "m", "positive": "down"}),
            "lat": ("lat", np.linspace(-5.5, 5.5, 8), {"units": "degrees_north"}),
            "lon": ("lon", np.arange(115.0, 287.0, 5.0), {"units": "degrees_east"}),
        },
    )


def opened(dataset: xr.Dataset, piece: int | None = None) -> tuple[Model, Box]:
    """Open a model whose file holds ``piece`` times in one."""
    if piece is not None:
        dataset["temp"].encoding = {"chunksizes": (piece, 3, 8, 35)}
    model = open_model(dataset)
    return model, box_of(model, *PLACE, SETTINGS)


def lengths(slices: list[slice]) -> list[int]:
    return [part.stop - part.start for part in slices]


def test_a_block_is_of_whole_months() -> None:
    """From the 10th of January on: 22 days of it, 28 of February, 31, and ten of April."""
    model, box = opened(daily(91))
    assert lengths(blocks_of(model, box, slice(0, 91), 1.0 * A_STEP)) == [22, 28, 31, 10]
    # 50 days hold January with February, but not with March too; March with April.
    assert lengths(blocks_of(model, box, slice(0, 91), 50.5 * A_STEP)) == [50, 41]
    assert lengths(blocks_of(model, box, slice(0, 91), 1e3 * A_STEP)) == [91]
    # Where the record begins later.
    assert blocks_of(model, box, slice(20, 60), 1.0 * A_STEP) == [slice(20, 22), slice(22, 50), slice(50, 60)]


def test_blocks_hold_every_step_once() -> None:
    model, box = opened(daily(400))
    for megabytes in (0.5, 3.0, 70.0, 1e4):
        blocks = blocks_of(model, box, slice(3, 398), megabytes * A_STEP)
        assert [step for block in blocks for step in range(block.start, block.stop)] == list(range(3, 398))


def test_a_read_holds_no_more_than_it_may() -> None:
    model, box = opened(daily(31))
    assert lengths(reads_of(model, box, slice(0, 31), 7.5 * A_STEP)) == [7, 7, 7, 7, 3]
    assert lengths(reads_of(model, box, slice(0, 3), 0.1 * A_STEP)) == [1, 1, 1]


def test_a_read_ends_where_a_piece_of_the_file_does() -> None:
    model, box = opened(daily(40), piece=16)
    # Pieces end at 16, 32: a read of 4 steps would read each piece four times.
    assert reads_of(model, box, slice(5, 40), 4.5 * A_STEP) == [slice(5, 16), slice(16, 32), slice(32, 40)]
    # Two pieces at a time where there is room; the first read ends with the second piece.
    assert reads_of(model, box, slice(5, 40), 36.0 * A_STEP) == [slice(5, 32), slice(32, 40)]
    # A piece that is far larger than what may be held cannot be helped.
    assert set(lengths(reads_of(model, box, slice(0, 40), 2.5 * A_STEP))) == {2}


def test_several_values_a_day_are_counted_together() -> None:
    model, box = opened(daily(10, times_a_day=4), piece=16)
    assert values_of(model, slice(2, 4)) == slice(8, 16)
    assert lengths(reads_of(model, box, slice(0, 10), 9.0 * A_STEP)) == [2] * 5


def test_what_is_loaded_reads_as_the_file_does() -> None:
    model, box = opened(daily(20).isel(lev=slice(None, None, -1)))
    reader = Reader(model, box)
    held = reader.loaded(slice(4, 12))
    np.testing.assert_array_equal(held.read(slice(1, 3)).temperature, reader.read(slice(5, 7)).temperature)
    np.testing.assert_array_equal(held.read(slice(0, 1)).depth.ravel(), [5.0, 100.0, 300.0])


def test_what_is_loaded_is_not_converted_twice(monthly_truth: xr.Dataset) -> None:
    potential = monthly_truth.isel(time=slice(0, 4)).copy(deep=True)
    potential["temp"].attrs = monthly_truth["temp"].attrs | {"standard_name": "sea_water_potential_temperature"}
    model = open_model(potential)
    reader = Reader(model, box_of(model, *PLACE, SETTINGS))
    before = potential["temp"].values.copy()
    expected = reader.read(slice(2, 4)).temperature
    held = reader.loaded(slice(1, 4))
    for _ in range(2):
        np.testing.assert_array_equal(held.read(slice(1, 3)).temperature, expected)
    assert np.abs(expected - before[2:4].transpose(0, 2, 3, 1)[..., : expected.shape[-1]]).max() > 0.01
    np.testing.assert_array_equal(potential["temp"].values, before)  # the caller's own dataset


def test_a_dataset_that_needs_no_copy_to_be_read_is_left_as_it_was() -> None:
    """Kelvin, in memory in the order in which blocks are held: what is read could be the caller's own numbers."""
    dataset = daily(5)
    order = ("time", "lat", "lon", "lev")
    kelvin = np.ascontiguousarray(dataset["temp"].transpose(*order).values + np.float32(273.15))
    dataset["temp"] = (order, kelvin.copy(), {"standard_name": "sea_water_temperature", "units": "K"})
    model, box = opened(dataset)
    water = Reader(model, box).read(slice(0, 5))
    np.testing.assert_allclose(water.temperature, kelvin - 273.15, atol=1e-4)
    np.testing.assert_array_equal(dataset["temp"].values, kelvin)


def test_pieces_of_the_file_make_no_difference(truth: xr.Dataset, perfect: Path) -> None:
    """61 days in pieces of 10, read as one block and as blocks of whole months, read piece by piece."""
    part = truth.isel(time=slice(20, 81)).copy()
    part["temp"].encoding = {"chunksizes": (10, *part["temp"].shape[1:])}
    whole = compare_model(part, perfect, ValidationSettings(block_megabytes=1e3, least_months=3))
    small = compare_model(part, perfect, ValidationSettings(block_megabytes=0.03, least_months=3))
    for name in ("model_isotherm_depth", "seen_thermocline_slope", "full_isotherm_depth"):
        assert whole[name].notnull().any(), name
        np.testing.assert_allclose(small[name], whole[name], rtol=1e-6, err_msg=name)


def test_every_piece_is_read_where_the_sensors_were_then() -> None:
    """Water that cools by 0.05 °C a metre, and sensors that are elsewhere every day: 25 - 0.05 z at each."""
    dataset = daily(40)
    dataset["temp"].values[:] = (25.0 - 0.05 * dataset["lev"].values)[None, :, None, None]
    model, box = opened(dataset)
    reader = Reader(model, box)
    wet = wet_points(reader, 0)
    where = stencil(box.latitude, box.longitude, wet, *PLACE, nearest_wet=100.0)
    small = ValidationSettings(block_megabytes=7.5 * A_STEP)  # pieces of seven days
    job = Job(reader, where, ToCells.of(box, wet), 1.0, ColumnSettings(), small)
    depth = np.random.default_rng(4).uniform(5.0, 300.0, (22, 1, 6))
    part = job.do(slice(3, 25), depth, own_threads=True)
    np.testing.assert_allclose(part.seen, 25.0 - 0.05 * depth, atol=1e-4)


def test_a_scheduler_makes_no_difference(truth: xr.Dataset, perfect: Path) -> None:
    part = truth.isel(time=slice(0, 90))
    settings = ValidationSettings(block_megabytes=0.05)
    alone = compare_model(part, perfect, settings)
    with dask.config.set(scheduler="threads", num_workers=2):
        shared = compare_model(part, perfect, settings)
    for name in ("model_isotherm_depth", "full_isotherm_depth", "warm_water_volume_difference"):
        assert alone[name].notnull().any(), name
        np.testing.assert_array_equal(shared[name], alone[name], err_msg=name)


def test_an_error_in_a_block_reaches_the_caller(tmp_path: Path, truth: xr.Dataset, perfect: Path) -> None:
    """A store of which a piece in the middle was cut off, on workers of threads."""
    store = tmp_path / "ocean.zarr"
    encoding: Any = {"temp": {"chunks": (30, *truth["temp"].shape[1:])}}
    truth.isel(time=slice(0, 150)).to_zarr(store, zarr_format=3, consolidated=False, encoding=encoding)
    piece = store / "temp" / "c" / "3" / "0" / "0" / "0"
    piece.write_bytes(piece.read_bytes()[:1000])
    with (
        dask.config.set(scheduler="threads", num_workers=2),
        pytest.raises(DataError, match=r"ocean, temp: the model's file breaks off.*fetch the file again"),
    ):
        compare_model(store, perfect, ValidationSettings(block_megabytes=0.05))
