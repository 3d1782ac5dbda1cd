"""A model's files as one dataset: a file, many files, a pattern, a Zarr store, or a dataset that is open already."""

from __future__ import annotations

import json
import warnings
from collections.abc import Sequence
from pathlib import Path

import xarray as xr

from profiles.errors import DataError, RequestError
from profiles.validation.classic import least_length

Source = str | Path | xr.Dataset | Sequence[str | Path]

_ZARR_MARKS = ("zarr.json", ".zgroup", ".zmetadata", ".zattrs")
UNREADABLE = (OSError, ValueError, RuntimeError, KeyError)  # what the libraries raise on files that are not whole


def open_source(source: Source) -> xr.Dataset:
    """Open a model lazily.

    Parameters
    ----------
    source : str, Path, sequence of these, or xarray.Dataset
        NetCDF files, Zarr stores, or patterns (``model_*.nc``); what an open dataset holds is taken as it is.

    Raises
    ------
    RequestError
        Where nothing is there.
    DataError
        Where a file cannot be read or the files do not belong together; the file is named.
    """
    if isinstance(source, xr.Dataset):
        return source
    paths = files_of(source)
    parts = [_open(path) for path in paths]
    return parts[0] if len(parts) == 1 else _combine(parts, paths)


def files_of(source: str | Path | Sequence[str | Path]) -> list[Path]:
    """Return the files and stores that ``source`` names, in order, each once."""
    named = [source] if isinstance(source, str | Path) else list(source)
    found: dict[Path, None] = {}
    for name in named:
        text = str(name)
        matches = [text] if Path(text).exists() else _matching(text)
        if not matches:
            raise RequestError("no such model", where=text, expected="NetCDF files, a pattern of them, or a Zarr store")
        found |= dict.fromkeys(Path(match) for match in matches)
    if not found:
        raise RequestError("no model is named", expected="a file, a pattern or a Zarr store")
    return list(found)


def _matching(pattern: str) -> list[str]:
    """Return the paths that fit a pattern, in order; its wildcards may stand in folders too."""
    path = Path(pattern)
    plain = [part for part in path.parts if not set(part) & set("*?[")]
    start = Path(*path.parts[: path.parts.index(next((p for p in path.parts if p not in plain), path.name))])
    return sorted(str(match) for match in start.glob(str(path.relative_to(start))))


def _open(path: Path) -> xr.Dataset:
    if path.is_dir() and not any((path / mark).exists() for mark in _ZARR_MARKS):
        raise RequestError(
            "a folder that is no Zarr store",
            where=str(path),
            expected="NetCDF files, or a store with zarr.json or .zgroup",
            advice=f"name the files in it: '{path}/*.nc'",
        )
    try:
        with warnings.catch_warnings():
            # Cell areas in a file of their own are not needed.
            warnings.filterwarnings("ignore", message=r"Variable\(s\) referenced in .* not in variables")
            return _lazy(path)
    except UNREADABLE as error:
        raise DataError(
            "the model's file cannot be read",
            where=str(path),
            expected="a whole NetCDF file or Zarr store with CF times",
            found=str(error).splitlines()[0] if str(error) else type(error).__name__,
            advice="fetch the file again if it was cut off",
        ) from error


def _lazy(path: Path) -> xr.Dataset:
    if path.is_dir():
        listed = _is_consolidated(path)
        return xr.open_zarr(path, chunks=None, decode_coords="all", decode_timedelta=False, consolidated=listed)
    _check_whole(path)
    return xr.open_dataset(path, engine="netcdf4", decode_coords="all", decode_timedelta=False)


def _is_consolidated(store: Path) -> bool:
    """Tell whether the head of a Zarr store lists all that is in it; asking for the list in vain would warn."""
    head = store / "zarr.json"
    if not head.exists():
        return (store / ".zmetadata").exists()
    return bool(json.loads(head.read_text(encoding="utf-8")).get("consolidated_metadata"))


def _check_whole(path: Path) -> None:
    """Raise ValueError where a file of NetCDF's older formats was cut off."""
    least, found = least_length(path), path.stat().st_size
    if found < least:
        raise ValueError(f"a file of {found} bytes that says it has {least}")


def _combine(parts: list[xr.Dataset], paths: list[Path]) -> xr.Dataset:
    """Put files together by their coordinates; of each, one time is a task, so that a block reads only its own."""
    lazy = [_dated(part) for part in parts]
    try:
        combined = xr.combine_by_coords(
            lazy, data_vars="minimal", coords="minimal", compat="override", join="exact", combine_attrs="override"
        )
        return combined if isinstance(combined, xr.Dataset) else combined.to_dataset()
    except (ValueError, TypeError) as error:
        raise DataError(
            "the model's files do not belong together",
            where=f"{paths[0]} and {len(paths) - 1} more",
            expected="the same grid and levels, each time once",
            found=" ".join(str(error).split())[:300],
            advice="name the files of one model and one variable, or leave out the one that overlaps",
        ) from error


def _dated(part: xr.Dataset) -> xr.Dataset:
    """Return a file in chunks of one time, its dates on their own dimension: some models only number that."""
    dated = [name for name in part.variables if _holds_dates(part[name])]
    if not dated:
        return part.chunk()
    own = [name for name in dated if name in part.dims]
    name = (own or [name for name in dated if part[name].attrs.get("standard_name") == "time"] or dated)[0]
    dim = part[name].dims[0]
    if not own:
        part = part.assign_coords({dim: (dim, part[name].values, part[name].attrs)})
    return part.chunk({dim: 1})


def _holds_dates(variable: xr.DataArray) -> bool:
    if variable.ndim != 1 or not variable.size:
        return False
    return variable.dtype.kind == "M" or (variable.dtype == object and hasattr(variable.values[0], "timetuple"))
