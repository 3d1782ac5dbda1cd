"""NetCDF-4 files, CF-1.11 and ACDD-1.3: written in blocks of time, atomically, the same bytes each time."""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping
from pathlib import Path
from typing import Any

import netCDF4
import numpy as np
import xarray as xr

from profiles.errors import DataError
from profiles.store.atomic import replacing
from profiles.vocabulary import VARIABLES

TIME_BLOCK = 8192  # samples of one block: 14 sensors of float32 are half a megabyte
TIME_UNITS = "seconds since 1970-01-01T00:00:00Z"
TIME_ENCODING = {
    "units": TIME_UNITS,
    "calendar": "standard",
    "units_metadata": "leap_seconds: none",  # CF-1.12 (from memory): elapsed seconds as datetime64 counts them
}
_CHUNKS_KEPT = 2  # of each variable while writing: the one at hand and one that a block ends in
CONVENTIONS = "CF-1.11, ACDD-1.3"
_FILL: Mapping[str, Any] = {
    "f": np.float32(9.96921e36),
    "d": np.float64(9.969209968386869e36),
}  # the NetCDF default fill values


def open_dataset(path: Path) -> xr.Dataset:
    """Open a file lazily, in blocks of time where it has time.

    Raises
    ------
    DataError
        Where there is no such file or it is no NetCDF file.
    """
    try:
        dataset = xr.open_dataset(path, engine="netcdf4", decode_timedelta=False)
    except FileNotFoundError:
        raise DataError("no such file", where=str(path), advice="run the stage that writes it first") from None
    except (OSError, ValueError) as error:
        raise DataError("not a NetCDF file that can be read", where=str(path), found=str(error)) from error
    return dataset.chunk({"time": TIME_BLOCK}) if "time" in dataset.dims else dataset.chunk()


def write_dataset(path: Path, dataset: xr.Dataset, attributes: Mapping[str, Any]) -> None:
    """Write one dataset; see :func:`write_blocks`."""
    write_blocks(path, [dataset], attributes)


def write_blocks(path: Path, blocks: Iterable[xr.Dataset], attributes: Mapping[str, Any]) -> None:
    """Write blocks that follow one another in time into one file.

    Parameters
    ----------
    path : Path
        The file to create or replace.
    blocks : iterable of xarray.Dataset
        Alike in everything but time; what has no time dimension is taken from the first. Storage types come
        from the vocabulary where it knows the variable.
    attributes : mapping
        Global attributes, ACDD-1.3; ``Conventions`` is added.

    Raises
    ------
    DataError
        Where there is no block.
    MachineError
        Where the disk refuses.
    """
    with replacing(path, verify=_verify) as temporary:
        blocks = iter(blocks)
        first = next(blocks, None)
        if first is None:
            raise DataError("there is nothing to write", where=str(path))
        # netCDF4 reports a path it cannot create as PermissionError whatever the cause; a plain open says the truth.
        temporary.touch()
        with netCDF4.Dataset(temporary, "w", format="NETCDF4") as file:
            file.setncatts({"Conventions": CONVENTIONS} | dict(attributes))
            _define(file, first)
            written = _append(file, first, 0)
            for block in blocks:
                written = _append(file, block, written)


def _define(file: netCDF4.Dataset, block: xr.Dataset) -> None:
    for dim, size in block.sizes.items():
        file.createDimension(str(dim), None if dim == "time" else size)
    auxiliary = [block[name] for name in block.coords if name not in block.dims or _is_text(block[name])]
    for name in [*block.coords, *block.data_vars]:
        _define_variable(file, block[name], auxiliary)


def _define_variable(file: netCDF4.Dataset, data: xr.DataArray, auxiliary: list[xr.DataArray]) -> None:
    name = str(data.name)
    dtype = _storage_type(data)
    # The first block is as long as any, so a record shorter than a block is one chunk of its own length.
    chunks = [min(size, TIME_BLOCK) if dim == "time" else size for dim, size in data.sizes.items()]
    compress = dtype is not str and bool(data.dims)
    variable = file.createVariable(
        name,
        dtype,
        [str(dim) for dim in data.dims],
        zlib=compress,
        complevel=4,
        shuffle=compress,
        chunksizes=[max(size, 1) for size in chunks] if data.dims else None,
        fill_value=None if dtype is str or name in data.dims else _FILL.get(np.dtype(dtype).char),
    )
    attributes = {key: value for key, value in data.attrs.items() if value is not None}
    if np.issubdtype(data.dtype, np.datetime64):
        attributes |= TIME_ENCODING
    if name not in data.dims:
        attributes.pop("axis", None)  # CF-1.11, section 5: only a coordinate variable, or a scalar one, has an axis
    # CF-1.11, sections 5 and 6.1: what is no numeric variable of its own dimension is named by those it goes with.
    belonging = [str(other.name) for other in auxiliary if set(other.dims) <= set(data.dims)]
    if name not in data.coords and belonging:
        attributes["coordinates"] = " ".join(belonging)
    variable.setncatts(attributes)
    if compress:
        # By default each variable keeps the 16 MB that were written last, which a record in order never comes back to.
        variable.set_var_chunk_cache(size=_CHUNKS_KEPT * math.prod(variable.chunking()) * np.dtype(dtype).itemsize)
    if "scale_factor" in attributes:
        variable.set_auto_maskandscale(False)  # what is packed comes packed, missing values included


def _is_text(data: xr.DataArray) -> bool:
    return data.dtype.kind in "OUT"


def _storage_type(data: xr.DataArray) -> Any:
    if _is_text(data):
        return str
    if np.issubdtype(data.dtype, np.datetime64):
        return np.dtype("float64")
    known = VARIABLES.get(str(data.name))
    return np.dtype(known.dtype) if known is not None and known.dtype != "str" else data.dtype


def _append(file: netCDF4.Dataset, block: xr.Dataset, written: int) -> int:
    stop = written + block.sizes.get("time", 0)
    for name in block.variables:
        variable, data = file[str(name)], block[name]
        if "time" not in data.dims:
            if written == 0:
                variable[...] = _storable(data)
        elif stop > written:
            place = tuple(slice(written, stop) if dim == "time" else slice(None) for dim in data.dims)
            variable[place] = _storable(data)
    return stop


def _storable(data: xr.DataArray) -> Any:
    values = data.values
    if np.issubdtype(values.dtype, np.datetime64):
        return values.astype("datetime64[us]").astype(np.int64) / 1e6
    if values.dtype.kind in "OUT":
        return values.astype(object)
    if values.dtype.kind == "f":
        return np.ma.masked_invalid(values)
    return values


def _verify(path: Path) -> None:
    with netCDF4.Dataset(path) as file:
        for variable in file.variables.values():
            if variable.size:
                variable[tuple(-1 for _ in variable.dimensions)]
