"""A delivery's file to a chain, with the account of its rows."""

from __future__ import annotations

from collections.abc import Collection, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import pandas as pd
import xarray as xr
from numpy.typing import NDArray

from profiles.errors import DataError, RequestError
from profiles.ingest.layout import Layout, LongLayout, NetcdfLayout, WideLayout, load_layout
from profiles.ingest.lines import texts_of
from profiles.ingest.long import read_long
from profiles.ingest.netcdf import read_netcdf, step_text
from profiles.ingest.record import Record, Rejected, reordered, verify_count
from profiles.ingest.units import depth_of_pressure, to_its90
from profiles.ingest.wide import read_wide
from profiles.vocabulary import describe

POSITION_TOLERANCE = 0.25  # degrees; a stated and a delivered position further apart are of two sites (ours)
SENSOR_ACCURACY = 0.02  # °C, one standard deviation; Freitag et al. (2005), NOAA TM PMEL-128: 0.018, drift included
QUARANTINE_COLUMNS = ("file", "line", "reason", "text")


@dataclass(frozen=True)
class Delivery:
    """What was read, and what became of every row.

    Attributes
    ----------
    chain : xarray.Dataset
        ``temperature_raw`` (°C, on the scale it was delivered on), ``temperature`` (°C, ITS-90),
        ``temperature_uncertainty``, ``deployment`` and, where the file has flags,
        ``temperature_delivered_qc``.
    rows_read, rows_kept, rows_quarantined : int
        Data rows; in a NetCDF file, time steps. The first is the sum of the others.
    rows_reordered : int
        Kept rows that were earlier than a row before them.
    quarantine : pandas.DataFrame
        Columns ``file``, ``line`` (from 1; in a NetCDF file the number of the time step), ``reason``,
        ``text``.
    rows : pandas.DataFrame
        Columns ``source`` (place in ``sources``), ``time`` and ``line`` of every row kept.
    sources : tuple
        Files and their layouts.
    """

    chain: xr.Dataset
    rows_read: int
    rows_kept: int
    rows_quarantined: int
    rows_reordered: int
    quarantine: pd.DataFrame
    rows: pd.DataFrame
    sources: tuple[tuple[Path, Layout], ...]


def read_delivery(
    path: str | Path,
    layout: str | Path | Layout,
    *,
    mooring: str | None = None,
    latitude: float | None = None,
    longitude: float | None = None,
    sensor_accuracy: float = SENSOR_ACCURACY,
) -> xr.Dataset:
    """Read one file of a delivery.

    Parameters
    ----------
    path : str or Path
        Delimited text, plain or gzip, or NetCDF.
    layout : str, Path or Layout
        How it is written: a layout file or its object, see :func:`load_layout`.
    mooring : str, optional
        Identifier; else what the file says, else the name of the file.
    latitude, longitude : float, optional
        Degrees north and east, longitude of either custom; else what the file says, if it does.
    sensor_accuracy : float
        °C, one standard deviation.

    Returns
    -------
    xarray.Dataset
        A chain, (time, depth): time in UTC, strictly increasing; depth in m, positive down, ascending;
        missing readings are NaN. The attributes ``rows_read``, ``rows_kept`` and ``rows_quarantined`` account
        for the rows; :func:`read` also gives those that were not kept.

    Raises
    ------
    RequestError
        Where an argument is wrong or there is no such file; ConfigError where the layout is wrong.
    DataError
        Where the file is not what the layout says, holds no row that can be understood, or is of another
        place.
    MachineError
        Where it may not be read.
    """
    delivery = read(
        path, layout, mooring=mooring, latitude=latitude, longitude=longitude, sensor_accuracy=sensor_accuracy
    )
    return delivery.chain.assign_attrs(
        rows_read=delivery.rows_read, rows_kept=delivery.rows_kept, rows_quarantined=delivery.rows_quarantined
    )


def read(
    path: str | Path,
    layout: str | Path | Layout,
    *,
    mooring: str | None = None,
    latitude: float | None = None,
    longitude: float | None = None,
    sensor_accuracy: float = SENSOR_ACCURACY,
) -> Delivery:
    """Read one file with the account of its rows; arguments and errors as :func:`read_delivery`."""
    _check_arguments(latitude, longitude, sensor_accuracy)
    file = Path(path)
    layout = load_layout(layout) if isinstance(layout, str | Path) else layout
    record = _read_record(file, layout)
    position = {
        role: _position(role, stated, found, str(file))
        for role, stated, found in (
            ("latitude", latitude, record.latitude),
            ("longitude", longitude, record.longitude),
        )
    }
    rows = record.rows.assign(source=0)
    return accounted(
        _chain(record, mooring or record.mooring or _stem(file), position, sensor_accuracy),
        record.rows_read,
        reordered(record.rows["time"].to_numpy()),
        _quarantine(file, layout, record.rejected),
        rows,
        ((file, layout),),
    )


def accounted(
    chain: xr.Dataset,
    rows_read: int,
    rows_reordered: int,
    quarantine: pd.DataFrame,
    rows: pd.DataFrame,
    sources: tuple[tuple[Path, Layout], ...],
) -> Delivery:
    """Return a delivery whose account is verified; ThermotiltError where rows were lost, a fault of ours."""
    verify_count(rows_read, len(rows), len(quarantine), ", ".join(str(path) for path, _ in sources))
    return Delivery(
        chain=chain,
        rows_read=rows_read,
        rows_kept=len(rows),
        rows_quarantined=len(quarantine),
        rows_reordered=rows_reordered,
        quarantine=quarantine,
        rows=rows,
        sources=sources,
    )


# ------------------------------------------------------------------------------------------------------------
# One file


def _check_arguments(latitude: float | None, longitude: float | None, sensor_accuracy: float) -> None:
    if latitude is not None and not -90.0 <= latitude <= 90.0:
        raise RequestError("no latitude", where="latitude", expected="-90 to 90 degrees north", found=f"{latitude:g}")
    if longitude is not None and not -180.0 <= longitude <= 360.0:
        raise RequestError(
            "no longitude",
            where="longitude",
            expected="0 to 360 degrees east, or -180 to 180",
            found=f"{longitude:g}",
        )
    if not 0.0 < sensor_accuracy < np.inf:
        raise RequestError(
            "no accuracy",
            where="sensor_accuracy",
            expected="a positive number, °C",
            found=f"{sensor_accuracy:g}",
        )


def _read_record(path: Path, layout: Layout) -> Record:
    match layout:
        case WideLayout():
            return read_wide(path, layout)
        case LongLayout():
            return read_long(path, layout)
        case NetcdfLayout():
            return read_netcdf(path, layout)


def _position(role: str, stated: float | None, found: float | None, where: str) -> float | None:
    """Return the position that counts, the stated one before the delivered, longitude in 0-360."""
    limit = 90.0 if role == "latitude" else 360.0
    if found is not None and not -limit <= found <= limit:
        raise DataError(
            f"no {role}", where=where, expected=f"{-limit:g} to {limit:g} degrees", found=f"{found:g}",
            advice="correct the file",
        )  # fmt: skip
    if stated is not None and found is not None and degrees_apart(stated, found) > POSITION_TOLERANCE:
        raise DataError(
            f"the file is of another {role}",
            where=where,
            expected=f"{stated:g} degrees, within {POSITION_TOLERANCE:g}",
            found=f"{found:g} degrees",
            advice="check that the file belongs to this mooring",
        )
    position = stated if stated is not None else found
    if position is None:
        return None
    return float(position) % 360.0 if role == "longitude" else float(position)


def degrees_apart(one: float, other: float) -> float:
    """Return the distance of two latitudes or longitudes, the short way round."""
    return abs((one - other + 180.0) % 360.0 - 180.0)


def _stem(path: Path) -> str:
    return path.name.removesuffix(".gz").rsplit(".", 1)[0]


def _chain(record: Record, mooring: str, position: Mapping[str, float | None], sensor_accuracy: float) -> xr.Dataset:
    grid = ("time", "depth")
    known = {role: value for role, value in position.items() if value is not None}
    depth = _depth(record, position["latitude"])
    data = {
        "temperature_raw": (grid, record.temperature),
        "temperature": (grid, to_its90(record.temperature, record.scale).astype(np.float32)),
        "temperature_uncertainty": ("depth", np.full(record.depth.size, sensor_accuracy, dtype=np.float32)),
        "deployment": ("time", np.ones(record.time.size, dtype=np.int16)),
    }
    if record.delivered_qc is not None:
        data["temperature_delivered_qc"] = (grid, record.delivered_qc)
    coords = {"time": record.time, "depth": depth.astype(np.float32), "mooring": mooring, **known}
    return describe(xr.Dataset(data, coords=coords), temperature_raw={"reference_scale": record.scale})


def _depth(record: Record, latitude: float | None) -> NDArray[np.float64]:
    """Return the sensors' depths, m, from their pressures where that is what was delivered."""
    if not record.depth_is_pressure:
        return record.depth
    if latitude is None:
        raise DataError(
            "a depth cannot be told from a pressure without the latitude",
            where="latitude",
            expected="degrees north",
            advice="state the mooring's latitude",
        )
    return depth_of_pressure(record.depth, latitude)


def _quarantine(path: Path, layout: Layout, rejected: Sequence[Rejected]) -> pd.DataFrame:
    """Return rejected rows as a table, looking up the texts that are not at hand."""
    unknown = [row.line for row in rejected if row.text is None]
    texts = row_texts(path, layout, unknown, {}) if unknown else {}
    entries = [
        (str(path), row.line, row.reason, row.text if row.text is not None else texts[row.line]) for row in rejected
    ]
    return pd.DataFrame(entries, columns=list(QUARANTINE_COLUMNS)).astype({"line": np.int64})


def row_texts(path: Path, layout: Layout, lines: Collection[int], times: Mapping[int, np.datetime64]) -> dict[int, str]:
    """Return what a quarantine entry shows of some lines; ``times`` by line serve for NetCDF files."""
    if isinstance(layout, NetcdfLayout):
        return {line: step_text(line, times[line]) for line in lines}
    return texts_of(path, layout, lines)
