"""A delivery's file to a chain, with the account of its rows."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from functools import cached_property
from pathlib import Path

import numpy as np
import pandas as pd
import xarray as xr
from numpy.typing import NDArray

from profiles.config import ClockError
from profiles.errors import DataError, RequestError
from profiles.ingest.blocked import read_blocked
from profiles.ingest.clock_error import in_words, retimed
from profiles.ingest.counted import read_counted
from profiles.ingest.layout import (
    BlockedLayout,
    CountedLayout,
    Layout,
    LongLayout,
    NetcdfLayout,
    SeriesLayout,
    WideLayout,
    load_layout,
)
from profiles.ingest.lines import texts_of
from profiles.ingest.long import read_long
from profiles.ingest.netcdf import read_netcdf, step_text
from profiles.ingest.record import Record, Rejected
from profiles.ingest.recovery_log import Service
from profiles.ingest.spool import Spool, Table
from profiles.ingest.units import depth_of_pressure, to_its90
from profiles.ingest.water import Immersion, immersion
from profiles.ingest.wide import read_wide
from profiles.store import TIME_BLOCK
from profiles.vocabulary import describe

POSITION_TOLERANCE = 0.25  # degrees; a stated and a delivered position further apart are of two sites (ours)
SENSOR_ACCURACY = 0.02  # °C, one standard deviation; Freitag et al. (2005), NOAA TM PMEL-128: 0.018, drift included
QUARANTINE_COLUMNS = ("file", "line", "reason", "text")


@dataclass(frozen=True)
class Source:
    """One file of a delivery: how it is written, its rows as they were read, and which of them were not kept."""

    path: Path
    layout: Layout
    read: Spool
    lost: frozenset[int]

    def lines_at(self, times: NDArray[np.datetime64]) -> dict[int, np.datetime64]:
        """Return the times of the rows that were kept and are of some times, by line."""
        found: dict[int, np.datetime64] = {}
        for rows in self.read.chunks():
            chosen = rows[np.isin(rows["time"], times)]
            found |= {int(row["line"]): row["time"] for row in chosen if int(row["line"]) not in self.lost}
        return found

    def texts(self, times: Mapping[int, np.datetime64]) -> dict[int, str]:
        """Return what a quarantine entry shows of some lines, given with their times."""
        if isinstance(self.layout, NetcdfLayout):
            return {line: step_text(line, time) for line, time in times.items()}
        return texts_of(self.path, self.layout, times) if times else {}


@dataclass(frozen=True)
class Delivery:
    """What was read, and what became of every row.

    Attributes
    ----------
    mooring : str
    position : mapping
        ``latitude`` and ``longitude``, degrees north and east (0-360), where they are known.
    depth : ndarray of float32, (depth,)
        m, positive down, ascending.
    table : Spool
        A row per time; :meth:`blocks` makes a chain of it.
    scales : tuple of str
        Temperature scale of each piece, from the first; a piece is what one file gave to the table.
    cell_methods : tuple of str or None
        What a reading of each piece stands for, where that is known.
    clocks : tuple of str or None
        How the clock of each piece was out, and was corrected.
    deployments : tuple of int
        Number of the deployment that each piece is of, where no recovery log says it; 0 where nobody said.
    immersion : Immersion
        How it is told whether the chain was in the water.
    uncertainty : ndarray of float32, (depth,)
        °C, one standard deviation.
    rows_read, rows_kept, rows_quarantined : int
        Data rows, in text that is neither blank, comment nor header of the file; in a NetCDF file, time steps.
        The first is the sum of the others.
    rows_reordered : int
        Kept rows that were earlier than a row before them.
    quarantine : pandas.DataFrame
        Columns ``file``, ``line`` (from 1; in a NetCDF file the number of the time step), ``reason``,
        ``text``.
    sources : tuple of Source
    """

    mooring: str
    position: Mapping[str, float]
    depth: NDArray[np.float32]
    table: Spool
    scales: tuple[str, ...]
    cell_methods: tuple[str | None, ...]
    clocks: tuple[str | None, ...]
    deployments: tuple[int, ...]
    immersion: Immersion
    uncertainty: NDArray[np.float32]
    rows_read: int
    rows_kept: int
    rows_quarantined: int
    rows_reordered: int
    quarantine: pd.DataFrame
    sources: tuple[Source, ...]

    @cached_property
    def chain(self) -> xr.Dataset:
        """The whole chain, in memory; see :func:`read_delivery`."""
        return self._block(0, self.table.count)

    def blocks(self, length: int = TIME_BLOCK) -> Iterator[xr.Dataset]:
        """Yield the chain in blocks of time."""
        for start in range(0, self.table.count, length):
            yield self._block(start, start + length)

    def with_service(self, service: Service | None) -> Delivery:
        """Return the delivery with the deployments that a recovery log has of its mooring."""
        return replace(self, immersion=replace(self.immersion, service=service))

    def water_counts(self) -> dict[int, int]:
        """Return how many times with a reading have each :class:`profiles.vocabulary.Water` status."""
        counts: Counter[int] = Counter()
        for block in self.blocks():
            has_reading = block["temperature"].notnull().any("depth").values
            counts.update(block["water_status"].values[has_reading].tolist())
        return dict(counts)

    def lost_by(self, part: Delivery) -> int:
        """Return how many rows of a delivery that was joined into this one lost to others."""
        paths = {str(source.path) for source in part.sources}
        return int(self.quarantine["file"].isin(paths).sum()) - part.rows_quarantined

    @property
    def is_flagged(self) -> bool:
        """Tell whether any file came with quality flags."""
        return bool(self.table.row_type["flags"].shape[0])

    def _block(self, start: int, stop: int) -> xr.Dataset:
        rows = self.table.rows(start, stop)
        before, after = self.table.rows(max(start - 1, 0), start), self.table.rows(stop, stop + 1)
        grid, raw = ("time", "depth"), rows["values"]
        data = {
            "temperature_raw": (grid, np.ascontiguousarray(raw)),
            "temperature": (grid, self._on_its90(raw, rows["piece"])),
            "temperature_uncertainty": ("depth", self.uncertainty),
            "deployment": ("time", self._deployment(rows)),
            "water_status": ("time", self.immersion.status(rows, before, after)),
        }
        if self.is_flagged:
            data["temperature_delivered_qc"] = (grid, np.ascontiguousarray(rows["flags"]))
        coords = {"time": rows["time"].copy(), "depth": self.depth, "mooring": self.mooring, **self.position}
        return describe(
            xr.Dataset(data, coords=coords),
            temperature_raw=self._attributes,
            temperature={name: text for name, text in self._attributes.items() if name == "cell_methods"},
        )

    def _deployment(self, rows: Table) -> NDArray[np.int16]:
        logged = self.immersion.deployment(rows)
        stated = np.maximum(self.deployments, 1).astype(np.int16)[rows["piece"] - 1]
        return logged if logged is not None else stated

    @property
    def _attributes(self) -> dict[str, str]:
        """Scale and meaning of the raw readings: attributes where all pieces agree, else a comment that lists them."""
        listed: list[str] = []
        agreed: dict[str, str] = {}
        for attribute, words, values in (
            ("reference_scale", "on {}", self.scales),
            ("cell_methods", "has {}", self.cell_methods),
        ):
            if len(set(values)) > 1:
                listed += self._listed(words, values)
            elif values[0] is not None:
                agreed[attribute] = values[0]
        if any(self.clocks):
            listed += self._listed("had its stamps corrected for a clock {}", self.clocks)
        return agreed | ({"comment": "; ".join(listed)} if listed else {})

    def _listed(self, words: str, values: Sequence[str | None]) -> list[str]:
        """Return what each deployment has, in words, once each."""
        numbers = np.maximum(self.deployments, 1).tolist()
        said = [
            f"deployment {number} {words.format(value)}" for number, value in zip(numbers, values, strict=True) if value
        ]
        return list(dict.fromkeys(said))

    def _on_its90(self, raw: NDArray[np.float32], piece: NDArray[np.int16]) -> NDArray[np.float32]:
        if set(self.scales) == {"ITS-90"}:
            return np.array(raw)
        is_old = np.array([scale == "IPTS-68" for scale in self.scales])[piece - 1]
        return np.where(is_old[:, None], to_its90(raw, "IPTS-68"), raw).astype(np.float32)


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
        Text, plain, gzip or zip, or NetCDF.
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
        A chain, (time, depth): ``temperature_raw`` (°C, on the scale it was delivered on), ``temperature`` (°C,
        ITS-90), ``temperature_uncertainty``, ``deployment``, ``water_status`` (which tells readings on deck) and, where
        the file has flags, ``temperature_delivered_qc``; time in UTC, strictly increasing; depth in m, positive down,
        ascending; missing readings are NaN. The attributes ``rows_read``, ``rows_kept``, ``rows_quarantined`` account
        for the rows; :func:`read` also gives those that were not kept, and the chain in blocks where it is long.

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
    clock: ClockError | None = None,
    deployment: int | None = None,
) -> Delivery:
    """Read one file with the account of its rows.

    Arguments and errors as :func:`read_delivery`; further how the clock of the logger was out, and the number of the
    deployment.
    """
    _check_arguments(latitude, longitude, sensor_accuracy)
    file = Path(path)
    layout = load_layout(layout) if isinstance(layout, str | Path) else layout
    record = _read_record(file, layout)
    if clock is not None:
        record = _corrected(record, clock)
    position = {
        role: _position(role, stated, found, str(file))
        for role, stated, found in (
            ("latitude", latitude, record.latitude),
            ("longitude", longitude, record.longitude),
        )
    }
    depth = _depth(record, position["latitude"]).astype(np.float32)
    source = Source(file, layout, record.read, frozenset(row.line for row in record.rejected))
    return Delivery(
        mooring=mooring or record.mooring or _stem(file),
        position={role: value for role, value in position.items() if value is not None},
        depth=depth,
        table=record.table,
        scales=(record.scale,),
        cell_methods=(record.cell_methods,),
        deployments=(deployment or 0,),
        immersion=immersion(record.table, depth, None),
        clocks=(in_words(clock) if clock is not None else None,),
        uncertainty=np.full(depth.size, sensor_accuracy, np.float32),
        rows_read=record.rows_read,
        rows_kept=record.rows_read - len(record.rejected),
        rows_quarantined=len(record.rejected),
        rows_reordered=record.read.reordered,
        quarantine=_quarantine(source, record.rejected),
        sources=(source,),
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
        case BlockedLayout():
            return read_blocked(path, layout)
        case CountedLayout():
            return read_counted(path, layout)
        case NetcdfLayout():
            return read_netcdf(path, layout)
        case SeriesLayout():
            raise RequestError(
                "this is the layout of a series, not of a chain",
                where=str(path),
                expected="a layout of temperatures",
                found='kind = "series"',
                advice="list the file under [[series]] of the configuration",
            )


def _corrected(record: Record, clock: ClockError) -> Record:
    table = retimed(record.table, clock)
    return replace(record, table=table, read=table if record.read is record.table else retimed(record.read, clock))


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
    return path.name.removesuffix(".gz").removesuffix(".zip").rsplit(".", 1)[0]


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


def _quarantine(source: Source, rejected: Sequence[Rejected]) -> pd.DataFrame:
    """Return rejected rows as a table, looking up the texts that are not at hand."""
    unknown = {row.line: np.datetime64("NaT") for row in rejected if row.text is None}
    texts = source.texts(unknown)
    entries = [
        (str(source.path), row.line, row.reason, row.text if row.text is not None else texts[row.line])
        for row in rejected
    ]
    return pd.DataFrame(entries, columns=list(QUARANTINE_COLUMNS)).astype({"line": np.int64})
