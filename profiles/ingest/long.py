"""Text with a row per reading."""

from __future__ import annotations

from dataclasses import dataclass, field
from pathlib import Path

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from profiles.errors import DataError
from profiles.ingest.layout import GREATEST_DEPTH, CountedLayout, LongLayout
from profiles.ingest.layout.parts import ColumnDepth
from profiles.ingest.lines import past_header
from profiles.ingest.record import Record, Tally
from profiles.ingest.rows import Columns, Rows, Understanding
from profiles.ingest.settling import of_one_station, settle_long
from profiles.ingest.source import internal_encoding
from profiles.ingest.spool import Spool, Table, long_type
from profiles.ingest.table import cell_methods, column_names
from profiles.ingest.units import is_pressure, to_celsius, to_downward
from profiles.vocabulary import Flag

DEPTH, TEMPERATURE = 0, 1  # columns of the numbers of a row
_ROUNDING = 1e-6  # of a depth: what lies at the very edge of the tolerance is within it
MOST_DEPTHS = 400  # of one file; a column of more different depths is no list of sensors (ours)


def read_long(path: Path, layout: LongLayout) -> Record:
    """Read a long text file.

    Raises
    ------
    RequestError, DataError, MachineError
        Where the file cannot be read or is not what the layout says.
    """
    header, lines = past_header(path, layout)
    columns = reading_columns(Columns(str(path), column_names(header, layout)), layout)
    tally = Tally()
    understanding = Understanding(
        layout, tally, internal_encoding(layout.encoding), layout.quality.flags if layout.quality is not None else {}
    )
    readings = Readings(layout, tally, str(path))
    for part in lines:
        readings.add(understanding.rows(part, columns, sensor=DEPTH))
    return readings.record(list(understanding.labels) if layout.station is not None else [])


def reading_columns(table: Columns, layout: LongLayout | CountedLayout) -> Columns:
    """Return the columns that are read of a table with one reading a row."""
    station = layout.station if isinstance(layout, LongLayout) else None
    return Columns(
        table.where,
        table.names,
        numbers=(table.place(layout.depth.column, "depth"), table.place(layout.temperature.column, "temperature")),
        marks=(table.place(layout.quality.column, "quality"),) if layout.quality is not None else (),
        label=table.place(station, "station") if station is not None else None,
    )


@dataclass
class Readings:
    """The readings of a file as they come in, one a row, and the depths that were met."""

    layout: LongLayout | CountedLayout
    tally: Tally
    where: str
    read: Spool = field(default_factory=lambda: Spool(long_type()))

    def __post_init__(self) -> None:
        self._declared = _declared(self.layout.depth)
        self._depths = set(self._declared.tolist())

    def add(self, rows: Rows) -> None:
        """Take rows of depth and temperature; those of an impossible depth are rejected."""
        depth = _nearest(to_downward(rows.values[:, DEPTH], self.layout.depth.units, self.layout.depth.positive),
                         self._declared, self.layout.depth)  # fmt: skip
        reasons = self._reasons(depth)
        kept = rows.without(reasons, self.tally)
        table = _packed(kept, depth[pd.isna(reasons)], self.layout.temperature.units)
        self._note_depths(table["depth"])
        self.tally.rows_kept += len(table)
        self.read.append(table)

    def _reasons(self, depth: NDArray[np.float32]) -> NDArray[np.object_]:
        reasons = np.full(depth.size, None, dtype=object)
        if self._declared.size:
            reasons[~np.isin(depth, self._declared)] = "the depth is not among those that the layout declares"
        reasons[~((depth >= 0.0) & (depth <= GREATEST_DEPTH))] = f"the depth is not between 0 and {GREATEST_DEPTH:g} m"
        reasons[np.isnan(depth)] = "the depth is missing"
        return reasons

    def _note_depths(self, depth: NDArray[np.float32]) -> None:
        self._depths.update(np.unique(depth).tolist())
        if len(self._depths) > MOST_DEPTHS:
            raise DataError(
                "there are more depths than a mooring has sensors",
                where=self.where,
                expected=f"at most {MOST_DEPTHS}",
                found=f"{len(self._depths)} or more",
                advice="give the sensors' depths in the layout, [depth] values, with the tolerance around each",
            )

    def record(self, stations: list[str]) -> Record:
        """Return the file as a record, of the station with most rows."""
        layout, flagged = self.layout, self.layout.quality is not None
        read, mooring = of_one_station(self.read, stations, self.tally)
        depth = np.array(sorted(self._depths), np.float32)
        if read is not self.read:
            met = {float(value) for rows in read.chunks() for value in np.unique(rows["depth"])}
            depth = np.array(sorted(met | set(self._declared.tolist())), np.float32)
        table = settle_long(read, depth, flagged, self.tally)
        return Record(
            read=read,
            table=table,
            depth=depth.astype(np.float64),
            scale=layout.temperature.scale,
            rejected=self.tally.settle(self.where, table.count),
            rows_read=self.tally.rows_read,
            depth_is_pressure=is_pressure(layout.depth.units),
            cell_methods=cell_methods(layout.time),
            mooring=mooring,
        )


def _declared(depth: ColumnDepth) -> NDArray[np.float32]:
    return np.sort(to_downward(depth.values, depth.units, depth.positive).astype(np.float32))


def _nearest(found: NDArray[np.float64], declared: NDArray[np.float32], depth: ColumnDepth) -> NDArray[np.float32]:
    """Return depths in float32, those near a declared one as that."""
    stored = found.astype(np.float32)
    if not declared.size or not depth.tolerance:
        return stored
    reach = abs(float(to_downward([depth.tolerance], depth.units, "down")[0]))
    above = np.clip(np.searchsorted(declared, stored), 1, declared.size - 1) if declared.size > 1 else np.zeros_like(
        stored, dtype=np.intp)  # fmt: skip
    lower = declared[np.maximum(above - 1, 0)]
    near = np.where(np.abs(lower - stored) <= np.abs(declared[above] - stored), lower, declared[above])
    distance = np.abs(near.astype(np.float64) - found)
    return np.where(distance <= reach + _ROUNDING * np.abs(found), near, stored).astype(np.float32)


def _packed(rows: Rows, depth: NDArray[np.float32], units: str) -> Table:
    table = np.zeros(rows.line.size, long_type())
    table["line"], table["time"], table["label"], table["depth"] = rows.line, rows.time, rows.label, depth
    table["value"] = to_celsius(rows.values[:, TEMPERATURE], units)
    is_missing = np.isnan(rows.values[:, TEMPERATURE])
    table["flag"] = np.where(is_missing, Flag.MISSING, rows.flags[:, 0] if rows.flags.shape[1] else Flag.NOT_EVALUATED)
    return table
