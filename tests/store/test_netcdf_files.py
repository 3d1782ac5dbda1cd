"""NetCDF files: what is written comes back, in the same bytes, in one piece or in blocks."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import netCDF4
import numpy as np
import pytest
import xarray as xr

from profiles import store
from profiles.errors import DataError, MachineError
from profiles.store import open_dataset, write_blocks, write_dataset
from profiles.vocabulary import describe

ATTRIBUTES = {"title": "A chain", "date_created": "2037-01-01T00:00:00Z"}


def chain(samples: int = 7) -> xr.Dataset:
    """A chain with times to the microsecond, gaps, flags, masks and text."""
    generator = np.random.default_rng(3)
    step = np.timedelta64(600_000_123, "us")
    time = (np.datetime64("2031-03-01T00:00:00.000007", "us") + step * np.arange(samples)).astype("datetime64[ns]")
    temperature = generator.normal(20.0, 3.0, (samples, 3)).astype(np.float32)
    temperature[1:2, 0] = temperature[2:3, :] = np.nan
    dataset = xr.Dataset(
        {
            "temperature": (("time", "depth"), temperature),
            "temperature_qc": (("time", "depth"), np.where(np.isnan(temperature), 9, 1).astype(np.int8)),
            "temperature_qc_ran": (("time", "depth"), np.full((samples, 3), 2**32 - 1, np.uint32)),
            "temperature_uncertainty": ("depth", np.array([0.02, np.nan, 0.02], np.float32)),
            "serial": ("depth", ["A-1", "Ä 2", ""]),
            "note": ("time", np.array([f"{place} °C" for place in range(samples)], dtype=object)),
        },
        coords={
            "time": time,
            "depth": np.array([1.0, 20.0, 500.0], np.float32),
            "mooring": "B-1",
            "latitude": -2.5,
            "longitude": 265.0,
        },
    )
    return describe(dataset)


def blocks_of(dataset: xr.Dataset, length: int) -> Iterator[xr.Dataset]:
    for start in range(0, dataset.sizes["time"], length):
        yield dataset.isel(time=slice(start, start + length))


def read(path: Path) -> xr.Dataset:
    with open_dataset(path) as dataset:
        return dataset.load()


@pytest.fixture(scope="module")
def written(tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("written") / "chain.nc"
    write_dataset(path, chain(), ATTRIBUTES)
    return path


def test_numbers_missing_values_and_text_come_back(written: Path) -> None:
    back, given = read(written), chain()
    assert set(back.variables) == set(given.variables)
    for name in set(given.variables) - {"time"}:
        np.testing.assert_array_equal(back[name].values, given[name].values, err_msg=str(name))
        assert back[name].dims == given[name].dims


def test_times_come_back_to_the_microsecond(written: Path) -> None:
    # Seconds since 1970 as float64 are 2**-22 s = 0.24 us apart from 2004 to 2038, so half a microsecond tells them.
    apart = np.abs(read(written)["time"].values - chain()["time"].values)
    assert apart.max() < np.timedelta64(500, "ns")


def test_missing_values_are_filled_in_the_file_and_flags_are_not(written: Path) -> None:
    with netCDF4.Dataset(written) as file:
        file.set_auto_mask(False)
        # netCDF's default fill value for float, NC_FILL_FLOAT = 9.9692099683868690e+36.
        assert file["temperature"][1, 0] == np.float32(9.9692099683868690e36) == file["temperature"]._FillValue
        assert "_FillValue" not in file["temperature_qc"].ncattrs()
        assert "_FillValue" not in file["time"].ncattrs()
        assert "_FillValue" not in file["depth"].ncattrs()


def test_types_in_the_file_are_those_of_the_vocabulary(tmp_path: Path) -> None:
    wide = chain().assign(
        temperature=chain()["temperature"].astype(np.float64), temperature_qc=chain()["temperature_qc"].astype(np.int64)
    )
    write_dataset(tmp_path / "chain.nc", wide, ATTRIBUTES)
    with netCDF4.Dataset(tmp_path / "chain.nc") as file:
        names = ["time", "depth", "temperature", "temperature_qc", "temperature_qc_ran", "latitude"]
        types = {name: file[name].dtype for name in names}
    assert types == {
        "time": np.float64,
        "depth": np.float32,
        "temperature": np.float32,
        "temperature_qc": np.int8,
        "temperature_qc_ran": np.uint32,
        "latitude": np.float64,
    }


def test_attributes_say_conventions_units_and_scalar_coordinates(written: Path) -> None:
    with netCDF4.Dataset(written) as file:
        assert file.Conventions == "CF-1.11, ACDD-1.3"
        assert {name: file.getncattr(name) for name in ATTRIBUTES} == ATTRIBUTES
        assert (file["time"].units, file["time"].calendar) == ("seconds since 1970-01-01T00:00:00Z", "standard")
        assert set(file["temperature"].coordinates.split()) == {"mooring", "latitude", "longitude"}
        assert "coordinates" not in file["time"].ncattrs()
        assert file["temperature"].units == "degree_Celsius"
        # CF-1.11, section 5: a scalar coordinate is none with a dimension of its own, so it has no axis here.
        assert "axis" not in file["latitude"].ncattrs()
        assert file["depth"].axis == "Z"
        assert file.dimensions["time"].isunlimited()
        assert not file.dimensions["depth"].isunlimited()


def test_the_same_content_gives_the_same_bytes(written: Path, tmp_path: Path) -> None:
    write_dataset(tmp_path / "again.nc", chain(), ATTRIBUTES)
    assert store.checksum(tmp_path / "again.nc") == store.checksum(written)
    warmer = chain()
    warmer["temperature"] = warmer["temperature"] + np.float32(1e-3)
    write_dataset(tmp_path / "other.nc", warmer, ATTRIBUTES)
    assert store.checksum(tmp_path / "other.nc") != store.checksum(written)


def test_the_same_blocks_give_the_same_bytes(tmp_path: Path) -> None:
    for name in ("one.nc", "two.nc"):
        write_blocks(tmp_path / name, blocks_of(chain(50), 16), ATTRIBUTES)
    assert store.checksum(tmp_path / "one.nc") == store.checksum(tmp_path / "two.nc")


@pytest.mark.parametrize("length", [1, 3, 6, 7])
def test_blocks_hold_the_same_as_one_write(written: Path, tmp_path: Path, length: int) -> None:
    write_blocks(tmp_path / "blocks.nc", blocks_of(chain(), length), ATTRIBUTES)
    xr.testing.assert_identical(read(tmp_path / "blocks.nc"), read(written))


def test_a_record_longer_than_a_block_comes_back(tmp_path: Path) -> None:
    samples = store.TIME_BLOCK + 5
    dataset = describe(
        xr.Dataset(
            {"isotherm_depth": ("time", np.arange(samples, dtype=np.float32))},
            coords={"time": np.datetime64("2031-01-01", "ns") + np.timedelta64(600, "s") * np.arange(samples)},
        )
    )
    write_dataset(tmp_path / "long.nc", dataset, ATTRIBUTES)
    with open_dataset(tmp_path / "long.nc") as back:
        assert back["isotherm_depth"].chunks == ((store.TIME_BLOCK, 5),)
        np.testing.assert_array_equal(back["isotherm_depth"], dataset["isotherm_depth"])
        np.testing.assert_array_equal(back["time"], dataset["time"])
    with netCDF4.Dataset(tmp_path / "long.nc") as file:
        assert file["isotherm_depth"].chunking() == [store.TIME_BLOCK]


def test_a_dataset_without_time_is_written(tmp_path: Path) -> None:
    dataset = xr.Dataset(
        {"sea_share": (("latitude", "longitude"), [[0.25, 1.0]])}, {"latitude": [0.5], "longitude": [1, 2]}
    )
    write_dataset(tmp_path / "map.nc", describe(dataset), ATTRIBUTES)
    np.testing.assert_array_equal(read(tmp_path / "map.nc")["sea_share"], [[0.25, 1.0]])


def test_a_record_without_a_sample_is_written(tmp_path: Path) -> None:
    write_dataset(tmp_path / "chain.nc", chain(0), ATTRIBUTES)
    assert dict(read(tmp_path / "chain.nc").sizes) == {"time": 0, "depth": 3}


def test_a_file_is_opened_without_reading_its_values(written: Path) -> None:
    with open_dataset(written) as dataset:
        assert dataset["temperature"].chunks == ((7,), (3,))


def test_nothing_to_write_is_an_error_and_keeps_the_old_file(tmp_path: Path) -> None:
    path = tmp_path / "chain.nc"
    path.write_bytes(b"old")
    with pytest.raises(DataError, match=r"chain\.nc: there is nothing to write"):
        write_blocks(path, iter([]), ATTRIBUTES)
    assert {entry.name: entry.read_bytes() for entry in tmp_path.iterdir()} == {"chain.nc": b"old"}


def test_a_failing_block_leaves_nothing(tmp_path: Path) -> None:
    def failing() -> Iterator[xr.Dataset]:
        yield from blocks_of(chain(), 3)
        raise DataError("the delivery ends in the middle")

    with pytest.raises(DataError, match="the delivery ends in the middle"):
        write_blocks(tmp_path / "chain.nc", failing(), ATTRIBUTES)
    assert list(tmp_path.iterdir()) == []


def test_a_file_damaged_while_it_was_written_does_not_appear(tmp_path: Path) -> None:
    path = tmp_path / "chain.nc"

    def cut_off() -> Iterator[xr.Dataset]:
        yield chain()
        # The disk loses what was written: the name now stands for an empty file, which verification must notice.
        (part,) = tmp_path.glob(".part-*")
        part.unlink()
        part.touch()

    with pytest.raises(MachineError, match="cannot be written"):
        write_blocks(path, cut_off(), ATTRIBUTES)
    assert list(tmp_path.iterdir()) == []


@pytest.mark.parametrize("content", [b"", b"time,depth\n", b"CDF\x01 and then no more"])
def test_what_is_no_netcdf_file_is_refused(tmp_path: Path, content: bytes) -> None:
    path = tmp_path / "chain.nc"
    path.write_bytes(content)
    with pytest.raises(DataError, match=r"chain\.nc: not a NetCDF file that can be read"):
        open_dataset(path)


def test_a_missing_file_names_the_stage_to_run(tmp_path: Path) -> None:
    with pytest.raises(DataError, match=r"chain\.nc: no such file; run the stage that writes it first"):
        open_dataset(tmp_path / "chain.nc")


def test_attributes_with_non_ascii_text_come_back(tmp_path: Path) -> None:
    write_dataset(tmp_path / "chain.nc", chain(), ATTRIBUTES | {"summary": "Gemäß 20 °C, 黒潮"})
    assert read(tmp_path / "chain.nc").attrs["summary"] == "Gemäß 20 °C, 黒潮"


def test_what_is_packed_is_written_as_it_comes(tmp_path: Path) -> None:
    # 2 steps of 0.5 above 10, and a missing value.
    packed = {"scale_factor": 0.5, "add_offset": 10.0, "missing_value": np.int16(-1)}
    write_dataset(tmp_path / "packed.nc", xr.Dataset({"packed": ("n", np.array([2, -1], np.int16), packed)}), {})
    with netCDF4.Dataset(tmp_path / "packed.nc") as file:
        assert file["packed"][0] == 11.0
        assert np.ma.getmaskarray(file["packed"][...]).tolist() == [False, True]
