"""Text with a row per time and a column per depth."""

from __future__ import annotations

import re
from dataclasses import replace
from pathlib import Path

import numpy as np
import pandas as pd

from profiles.errors import DataError
from profiles.ingest.layout import DEPTH_MARK, WideLayout
from profiles.ingest.lines import Table, open_table
from profiles.ingest.record import Record, Tally, checked_depths, repeats
from profiles.ingest.rows import gathered, understood
from profiles.ingest.units import is_pressure, to_celsius, to_downward
from profiles.ingest.wording import listed

_NUMBER = r"([+-]?[0-9]+(?:[.,][0-9]+)?)"


def read_wide(path: Path, layout: WideLayout) -> Record:
    """Read a wide text file.

    Raises
    ------
    RequestError, DataError, MachineError
        Where the file cannot be read or is not what the layout says.
    """
    tally = Tally()
    with open_table(path, layout) as table:
        sensors = _sensors(table, layout)
        columns = {name: table.column(name, "temperature") for name in sensors}
        parts = [
            replace(part, values=to_celsius(part.values, layout.temperature.units).astype(np.float32))
            for part in understood(table, tally, columns)
        ]
    rows = gathered(parts, len(sensors))
    repeated, first = repeats(pd.DataFrame({"time": rows.time}))
    tally.reject(rows.line[repeated], [f"the time is that of line {line}" for line in rows.line[first[repeated]]])
    kept = rows.where(~repeated)
    rejected = tally.settle(kept.line.size, str(path))
    by_time = np.argsort(kept.time, kind="stable")
    depth = np.array(list(sensors.values()))
    by_depth = np.argsort(depth)
    return Record(
        time=kept.time[by_time],
        depth=depth[by_depth],
        temperature=np.ascontiguousarray(kept.values[np.ix_(by_time, by_depth)]),
        scale=layout.temperature.scale,
        depth_is_pressure=is_pressure(layout.depth.units),
        rows=pd.DataFrame({"time": kept.time, "line": kept.line}),
        rejected=rejected,
        rows_read=tally.rows_read,
    )


def _sensors(table: Table, layout: WideLayout) -> dict[str, float]:
    """Return the depth of each column of temperature, m, positive down."""
    stated = layout.depth.columns or _matched(table, layout.depth.pattern or DEPTH_MARK)
    depths = to_downward(list(stated.values()), layout.depth.units, layout.depth.positive)
    labels = [f"column {name!r}" for name in stated]
    checked_depths(depths, labels, table.where)
    return dict(zip(stated, depths.tolist(), strict=True))


def _matched(table: Table, pattern: str) -> dict[str, float]:
    before, after = pattern.split(DEPTH_MARK)
    syntax = re.compile(re.escape(before) + _NUMBER + re.escape(after))
    found = {
        name: float(match.group(1).replace(",", "."))
        for name in table.names
        if (match := syntax.fullmatch(name)) is not None
    }
    if not found:
        raise DataError(
            "no column matches the pattern of the layout",
            where=table.where,
            expected=f"columns like {pattern.replace(DEPTH_MARK, '100')!r}",
            found=listed(table.names),
            advice="check pattern, delimiter and header_rows in the layout",
        )
    return found
