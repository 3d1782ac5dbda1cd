"""Text with a row per reading."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from profiles.ingest.layout import GREATEST_DEPTH, LongLayout
from profiles.ingest.lines import open_table
from profiles.ingest.record import Record, Tally, repeats
from profiles.ingest.rows import Rows, gathered, understood
from profiles.ingest.units import is_pressure, to_celsius, to_downward

DEPTH, TEMPERATURE = 0, 1  # columns of the values of a row


def read_long(path: Path, layout: LongLayout) -> Record:
    """Read a long text file.

    Raises
    ------
    RequestError, DataError, MachineError
        Where the file cannot be read or is not what the layout says.
    """
    tally = Tally()
    with open_table(path, layout) as table:
        columns = {
            layout.depth.column: table.column(layout.depth.column, "depth"),
            layout.temperature.column: table.column(layout.temperature.column, "temperature"),
        }
        station = table.column(layout.station, "station") if layout.station is not None else None
        parts = [_in_our_units(part, layout) for part in understood(table, tally, columns, station)]
    rows = gathered(parts, len(columns))
    rows = _with_depth(rows, layout, tally)
    rows, mooring = _of_one_station(rows, tally)
    rows = _once(rows, tally)
    rejected = tally.settle(rows.line.size, str(path))
    time, depth, temperature = _as_table(rows, _declared(layout))
    return Record(
        time=time,
        depth=depth.astype(np.float64),
        temperature=temperature,
        scale=layout.temperature.scale,
        depth_is_pressure=is_pressure(layout.depth.units),
        rows=pd.DataFrame({"time": rows.time, "line": rows.line}),
        rejected=rejected,
        rows_read=tally.rows_read,
        mooring=mooring,
    )


def _in_our_units(rows: Rows, layout: LongLayout) -> Rows:
    depth = to_downward(rows.values[:, DEPTH], layout.depth.units, layout.depth.positive)
    temperature = to_celsius(rows.values[:, TEMPERATURE], layout.temperature.units)
    return replace(rows, values=np.column_stack([depth, temperature]).astype(np.float32))


def _declared(layout: LongLayout) -> NDArray[np.float32]:
    depths = to_downward(layout.depth.values, layout.depth.units, layout.depth.positive)
    return depths.astype(np.float32)


def _with_depth(rows: Rows, layout: LongLayout, tally: Tally) -> Rows:
    depth, declared = rows.values[:, DEPTH], _declared(layout)
    reasons = np.full(depth.size, None, dtype=object)
    if declared.size:
        reasons[~np.isin(depth, declared)] = "the depth is not among those that the layout declares"
    reasons[~((depth >= 0.0) & (depth <= GREATEST_DEPTH))] = f"the depth is not between 0 and {GREATEST_DEPTH:g} m"
    reasons[np.isnan(depth)] = "the depth is missing"
    return _without(rows, pd.notna(reasons), reasons, tally)


def _of_one_station(rows: Rows, tally: Tally) -> tuple[Rows, str | None]:
    """Keep the station with most rows, and return its name; where no column names stations, keep all."""
    counts = pd.Series(rows.label).value_counts()
    if counts.empty:
        return rows, None
    main = str(counts.index[0])
    reason = f"the station is not {main!r}, of which this file has most rows"
    return _without(rows, rows.label != main, np.full(rows.line.size, reason, object), tally), main or None


def _once(rows: Rows, tally: Tally) -> Rows:
    repeated, first = repeats(pd.DataFrame({"time": rows.time, "depth": rows.values[:, DEPTH]}))
    reasons = np.full(rows.line.size, None, dtype=object)
    reasons[repeated] = [f"time and depth are those of line {line}" for line in rows.line[first[repeated]]]
    return _without(rows, repeated, reasons, tally)


def _without(rows: Rows, rejected: NDArray[np.bool_], reasons: NDArray[np.object_], tally: Tally) -> Rows:
    tally.reject(rows.line[rejected], reasons[rejected])
    return rows.where(~rejected)


def _as_table(
    rows: Rows, declared: NDArray[np.float32]
) -> tuple[NDArray[np.datetime64], NDArray[np.float32], NDArray[np.float32]]:
    time, at_time = np.unique(rows.time, return_inverse=True)
    depth = np.unique(np.concatenate([declared, rows.values[:, DEPTH].astype(np.float32)]))
    table = np.full((time.size, depth.size), np.nan, dtype=np.float32)
    table[at_time, np.searchsorted(depth, rows.values[:, DEPTH])] = rows.values[:, TEMPERATURE]
    return time, depth, table
