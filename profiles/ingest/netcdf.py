"""CF and OceanSITES NetCDF."""

from __future__ import annotations

import re
import warnings
from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import xarray as xr
from numpy.typing import NDArray
from scipy.io import netcdf_file

from profiles.errors import DataError
from profiles.ingest.clock import hours
from profiles.ingest.layout import NetcdfLayout
from profiles.ingest.record import Record, Tally, checked_depths, repeats
from profiles.ingest.settling import settle_wide
from profiles.ingest.source import GZIP_MAGIC, check_file
from profiles.ingest.spool import Spool, wide_type
from profiles.ingest.table import cell_methods
from profiles.ingest.units import (
    METRE,
    is_pressure,
    require_depth_units,
    require_temperature_units,
    to_celsius,
    to_downward,
)
from profiles.ingest.wording import listed, nearest
from profiles.vocabulary import OCEANSITES_TO_FLAG, Flag

_HDF5_MAGIC = b"\x89HDF\r\n\x1a\n"
_CLASSIC_MAGICS = (b"CDF\x01", b"CDF\x02")
_CLASSIC_64_BIT_DATA = b"CDF\x05"

STANDARD_NAMES = {
    "temperature": "sea_water_temperature",
    "time": "time",
    "depth": "depth",
    "latitude": "latitude",
    "longitude": "longitude",
}


def read_netcdf(path: Path, layout: NetcdfLayout) -> Record:
    """Read a NetCDF file.

    Variables are found by the names in the layout, else by standard name; units, sign and scale come from the
    file. Times are rounded to the millisecond, since days in float64 are good to a microsecond.

    Raises
    ------
    RequestError, DataError, MachineError
        Where the file cannot be read or does not hold what is needed.
    """
    with _opened(path) as dataset:
        source = Source(str(path), dataset, layout)
        temperature = source.find("temperature")
        time, depth = source.coordinate("time", temperature), source.coordinate("depth", temperature)
        values = _in_celsius(source, _time_by_depth(source, temperature, time, depth))
        flags = _flags(source, temperature, time, depth)
        stamps = _stamps(source, time)
        metres = _depths(source, depth)
        scale = _scale(source, temperature)
        depth_is_pressure = is_pressure(str(depth.attrs.get("units", METRE)))
        latitude, longitude = source.position("latitude"), source.position("longitude")
        mooring = dataset.attrs.get("platform_code") or dataset.attrs.get("site_code")
    return _record(
        source,
        (stamps, metres, values, flags),
        scale=scale,
        depth_is_pressure=depth_is_pressure,
        cell_methods=_cell_methods(source, temperature),
        mooring=str(mooring) if mooring else None,
        latitude=latitude,
        longitude=longitude,
    )


# ------------------------------------------------------------------------------------------------------------
# The file


@contextmanager
def _opened(path: Path) -> Iterator[xr.Dataset]:
    _check_complete(path, check_file(path))
    try:
        with warnings.catch_warnings():
            # Files with both _FillValue and missing_value are common; both are masked.
            warnings.filterwarnings("ignore", message=".*multiple fill values", category=xr.SerializationWarning)
            with xr.open_dataset(path, engine="netcdf4", decode_timedelta=False) as dataset:
                yield dataset
    except (OSError, RuntimeError, ValueError, OverflowError) as error:
        raise DataError(
            "is damaged, or its coordinates cannot be decoded",
            where=str(path),
            expected="a complete NetCDF file",
            found=" ".join(str(error).split())[:200],
            advice="fetch the file again",
        ) from error


def _check_complete(path: Path, head: bytes) -> None:
    """Raise DataError where a file is no NetCDF file, or a classic one that ends early.

    The library reads the lost part of a truncated classic file as zeros, without a word.
    """
    if head.startswith(GZIP_MAGIC):
        raise DataError("is compressed", where=str(path), expected="a NetCDF file", found="gzip", advice="unpack it")
    if head.startswith(_CLASSIC_64_BIT_DATA):
        raise DataError(
            "is of the classic format with 64-bit data, of which it cannot be told whether it is complete",
            where=str(path),
            expected="NetCDF-4 or NetCDF-3",
            advice="convert it with nccopy -k nc4",
        )
    if head.startswith(_CLASSIC_MAGICS):
        try:
            netcdf_file(path, mmap=False).close()
        except (ValueError, TypeError, IndexError, EOFError) as error:
            raise DataError("is cut short", where=str(path), found=str(error), advice="fetch it again") from error
    elif not head.startswith(_HDF5_MAGIC):
        raise DataError(
            "is no NetCDF file",
            where=str(path),
            expected="NetCDF, as the layout says",
            found=f"it begins with {head[:12]!r}",
            advice='for text give a layout of kind = "wide" or "long"',
        )


@dataclass(frozen=True)
class Source:
    """An open file and the layout that says how to read it."""

    where: str
    dataset: xr.Dataset
    layout: NetcdfLayout

    def find(self, role: str) -> xr.DataArray:
        """Return the one variable of a role; raise DataError where there is none or more than one."""
        found = self.candidates(role)
        if len(found) == 1:
            return self.dataset[found[0]]
        raise DataError(
            f"several variables could be the {role}" if found else f"no variable is the {role}",
            where=self.where,
            expected=f"one variable with standard_name {STANDARD_NAMES[role]!r}",
            found=listed(found or [str(name) for name in self.dataset.variables]),
            advice=f"name it in the layout, [variables] {role} = ...",
        )

    def candidates(self, role: str) -> list[str]:
        """Return the names that a role could have: the one in the layout, else those of its standard name."""
        declared = getattr(self.layout.variables, role)
        names = [str(name) for name in self.dataset.variables]
        if declared is None:
            return [n for n in names if self.dataset[n].attrs.get("standard_name") == STANDARD_NAMES[role]]
        if declared not in names:
            raise DataError(
                f"the {role} variable is missing",
                where=self.where,
                expected=f"a variable {declared!r}, as the layout says",
                found=listed(names),
                advice=f"correct [variables] in the layout{nearest(declared, names)}",
            )
        return [declared]

    def coordinate(self, role: str, temperature: xr.DataArray) -> xr.DataArray:
        """Return the coordinate of ``temperature`` of a role, with one dimension or none."""
        names = [name for name in self.candidates(role) if self._fits(name, temperature)]
        if len(names) > 1:
            names = [name for name in names if name in temperature.dims]
        if len(names) == 1:
            return self.dataset[names[0]]
        raise DataError(
            f"{temperature.name} has no {role} coordinate of its own",
            where=self.where,
            expected=f"standard_name {STANDARD_NAMES[role]!r}, along a dimension of {temperature.dims}",
            found=listed(str(name) for name in self.dataset.variables),
            advice=f"name it in the layout, [variables] {role} = ...",
        )

    def _fits(self, name: str, temperature: xr.DataArray) -> bool:
        dims = self.dataset[name].dims
        return len(dims) <= 1 and set(dims) <= set(temperature.dims)

    def position(self, role: str) -> float | None:
        """Return the latitude or longitude, degrees, the median of many; None where the file has none."""
        names = self.candidates(role)
        values = self.dataset[names[0]].values.ravel().astype(np.float64) if names else np.empty(0)
        values = values[np.isfinite(values)]
        if not values.size:
            return None
        # About the first value, so that a mooring at the prime meridian keeps together.
        turns = (values - values[0] + 180.0) % 360.0 - 180.0 if role == "longitude" else values - values[0]
        return float(values[0] + np.median(turns))


# ------------------------------------------------------------------------------------------------------------
# What it holds


def _time_by_depth(source: Source, variable: xr.DataArray, time: xr.DataArray, depth: xr.DataArray) -> xr.DataArray:
    """Return a variable as (time, depth); other dimensions must have one element."""
    dims = [str(coordinate.dims[0]) for coordinate in (time, depth) if coordinate.dims]
    others = {str(dim): size for dim, size in variable.sizes.items() if dim not in dims}
    large = {dim: size for dim, size in others.items() if size != 1}
    if large or not time.dims:
        raise DataError(
            f"{variable.name} is not a table of time by depth",
            where=source.where,
            expected=f"dimensions {tuple(dims)}",
            found=str(dict(variable.sizes)),
            advice="split the file, or name another variable in the layout's [variables]",
        )
    table = variable.isel(dict.fromkeys(others, 0))
    sizes = {str(dim): size for coordinate in (time, depth) for dim, size in coordinate.sizes.items()}
    missing = {dim: size for dim, size in sizes.items() if dim not in table.dims}
    return table.expand_dims(missing).transpose(*dims) if depth.dims else table.expand_dims("_depth", axis=1)


def _in_celsius(source: Source, temperature: xr.DataArray) -> NDArray[np.float64]:
    units = str(temperature.attrs.get("units", ""))
    try:
        return to_celsius(temperature.values, require_temperature_units(units))
    except ValueError as error:
        raise DataError(
            str(error),
            where=f"{source.where}, {temperature.name}:units",
            advice="correct the attribute in the file",
        ) from None


def _stamps(source: Source, time: xr.DataArray) -> NDArray[np.datetime64]:
    if not np.issubdtype(time.dtype, np.datetime64):
        raise DataError(
            f"{time.name} holds no times",
            where=source.where,
            expected="units like 'days since 1950-01-01T00:00:00Z' and a standard calendar",
            found=f"units {time.encoding.get('units', time.attrs.get('units'))!r}, "
            f"calendar {time.encoding.get('calendar', time.attrs.get('calendar'))!r}",
            advice="correct the attributes in the file",
        )
    stamps: NDArray[np.datetime64] = pd.DatetimeIndex(time.values).round("ms").to_numpy().astype("datetime64[ns]")
    return stamps + hours(source.layout.time.to_centre_hours)


def _depths(source: Source, depth: xr.DataArray) -> NDArray[np.float64]:
    units, positive = str(depth.attrs.get("units", METRE)), str(depth.attrs.get("positive", "down")).lower()
    try:
        require_depth_units(units)
    except ValueError as error:
        raise DataError(
            str(error),
            where=f"{source.where}, {depth.name}:units",
            advice="correct the attribute in the file",
        ) from None
    metres = np.atleast_1d(to_downward(depth.values, units, positive))
    checked_depths(metres, [f"{depth.name}[{place}]" for place in range(metres.size)], source.where)
    return metres


def _scale(source: Source, temperature: xr.DataArray) -> str:
    stated = str(temperature.attrs.get("reference_scale", "")).strip().upper()
    declared = source.layout.temperature.scale
    if stated not in {"", "ITS-90", "IPTS-68"}:
        raise DataError(
            "unknown temperature scale",
            where=f"{source.where}, {temperature.name}:reference_scale",
            expected="ITS-90 or IPTS-68",
            found=stated,
            advice="correct the attribute in the file",
        )
    if stated and declared is not None and stated != declared:
        raise DataError(
            "file and layout disagree on the temperature scale",
            where=f"{source.where}, {temperature.name}:reference_scale",
            expected=f"{declared}, as the layout says",
            found=stated,
            advice="remove scale from the layout to follow the file",
        )
    return stated or declared or "ITS-90"


def _flags(
    source: Source, temperature: xr.DataArray, time: xr.DataArray, depth: xr.DataArray
) -> NDArray[np.float64] | None:
    """Return the delivered flags, (time, depth), NaN where there is none; None without a flag variable."""
    declared = source.layout.variables.temperature_qc
    name = source.candidates("temperature_qc")[0] if declared is not None else f"{temperature.name}_QC"
    if name not in source.dataset.variables:
        return None
    return _time_by_depth(source, source.dataset[name], time, depth).values.astype(np.float64)


def _in_our_flags(
    flags: NDArray[np.float64], is_missing: NDArray[np.bool_], own: Mapping[str, int]
) -> tuple[NDArray[np.int8], NDArray[np.bool_]]:
    """Return our flags (2, or 9 without a value, where none came), and where one is in no table."""
    mapping = {**OCEANSITES_TO_FLAG, **{int(code): Flag(flag) for code, flag in own.items()}}
    ours = np.where(is_missing, Flag.MISSING, Flag.NOT_EVALUATED).astype(np.int8)
    for code, flag in mapping.items():
        ours[flags == code] = flag
    return ours, ~(np.isnan(flags) | np.isin(flags, list(mapping)))


def _cell_methods(source: Source, temperature: xr.DataArray) -> str | None:
    """Return what a reading stands for: what the layout says, else the file's own words about time."""
    stated = re.search(r"\btime: (?:mean|point)(?: \([^)]*\))?", str(temperature.attrs.get("cell_methods", "")))
    return cell_methods(source.layout.time) or (stated.group() if stated is not None else None)


Contents = tuple[NDArray[np.datetime64], NDArray[np.float64], NDArray[np.float64], NDArray[np.float64] | None]


def _record(source: Source, contents: Contents, **known: Any) -> Record:
    """Sort out the time steps that make no sense, and put the rest in order."""
    time, depth, temperature, flags = contents
    tally = Tally(rows_read=time.size)
    ours, reasons = None, np.full(time.size, None, dtype=object)
    if flags is not None:
        ours, unknown = _in_our_flags(flags, np.isnan(temperature), source.layout.flags)
        for row in np.flatnonzero(unknown.any(axis=1)):
            reasons[row] = f"the flag {flags[row][unknown[row]][0]:g} is in no table; say in [flags] what it means"
    reasons[np.isinf(temperature).any(axis=1)] = "a temperature is infinite"
    reasons[np.isnat(time)] = "the time is missing"
    _name_repeats(time, reasons)
    is_bad = pd.notna(reasons)
    kept, line = np.flatnonzero(~is_bad), np.arange(1, time.size + 1)
    tally.reject(line[is_bad], reasons[is_bad], [step_text(line, time[line - 1]) for line in line[is_bad]])
    tally.rows_kept = kept.size
    read = _spooled(time, temperature, ours, depth, kept)
    return Record(
        read=read,
        table=settle_wide(read, np.ones((1, depth.size), bool), tally),
        depth=np.sort(depth),
        rejected=tally.settle(source.where),
        rows_read=tally.rows_read,
        **known,
    )


def _spooled(
    time: NDArray[np.datetime64],
    temperature: NDArray[np.float64],
    flags: NDArray[np.int8] | None,
    depth: NDArray[np.float64],
    kept: NDArray[np.intp],
) -> Spool:
    spool = Spool(wide_type(depth.size, flagged=flags is not None))
    rows, by_depth = np.zeros(kept.size, spool.row_type), np.argsort(depth)
    rows["line"], rows["time"], rows["piece"] = kept + 1, time[kept], 1
    rows["values"] = temperature[np.ix_(kept, by_depth)]
    if flags is not None:
        rows["flags"] = flags[np.ix_(kept, by_depth)]
    spool.append(rows)
    return spool


def _name_repeats(time: NDArray[np.datetime64], reasons: NDArray[np.object_]) -> None:
    """Among the rows without a reason so far, name those that repeat the time of an earlier one."""
    sound = np.flatnonzero(~pd.notna(reasons))
    repeated, first = repeats(pd.DataFrame({"time": time[sound]}))
    reasons[sound[repeated]] = [f"the time is that of time step {step + 1}" for step in sound[first[repeated]]]


def step_text(step: int, time: np.datetime64) -> str:
    """Return what a quarantine entry shows of a time step."""
    return f"time step {step}: {np.datetime_as_string(time, unit='ms')}"
