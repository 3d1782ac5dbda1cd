"""Rows in file order to a table with a row per time: sorted, repeats told apart, the losers to quarantine.

The rule: of readings of one sensor at one time, the one that stands first in the file stays.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from profiles.ingest.record import Tally, repeats
from profiles.ingest.spool import Spool, Table, wide_type
from profiles.vocabulary import Flag

Mask = NDArray[np.bool_]


def settle_wide(read: Spool, sets: Mask, tally: Tally) -> Spool:
    """Return rows with a reading of each sensor as a table, strictly increasing in time.

    Parameters
    ----------
    read : Spool
        Rows of :func:`profiles.ingest.spool.wide_type`, the label saying which sensors a row has.
    sets : ndarray of bool, (label, sensor)
        Those sensors. Rows of one time that share none complete each other.
    tally : Tally
        Takes the rows that lost.
    """
    if read.is_increasing:
        return read
    table = Spool(read.row_type)
    for rows in read.by_time():
        is_repeat, first = repeats(pd.DataFrame({"time": rows["time"], "label": rows["label"]}))
        _quarantine(rows, is_repeat, first, "the time is that of line {}", tally)
        table.append(_completed(rows[~is_repeat], sets, tally))
    return table


def _quarantine(rows: Table, is_lost: Mask, winners: NDArray[np.intp], reason: str, tally: Tally) -> None:
    lines = rows["line"]
    tally.take_back(lines[is_lost], [reason.format(line) for line in lines[winners[is_lost]]])


def _completed(rows: Table, sets: Mask, tally: Tally) -> Table:
    """Put rows of one time together where they have different sensors."""
    is_later = np.concatenate([[False], np.diff(rows["time"]).astype(np.int64) == 0])
    if not is_later.any():
        return rows
    rows, owner = rows.copy(), np.flatnonzero(~is_later)[np.cumsum(~is_later) - 1]
    taken: dict[int, Mask] = {}
    for place in np.flatnonzero(is_later):
        first, own = int(owner[place]), sets[rows["label"][place]]
        held = taken.get(first, sets[rows["label"][first]])
        if (held & own).any():
            tally.take_back(
                rows["line"][place : place + 1],
                [f"a row before it, line {rows['line'][first]} or one like it, has the time and one of the depths"],
            )
            continue
        rows["values"][first, own] = rows["values"][place, own]
        if rows["flags"].shape[1]:
            rows["flags"][first, own] = rows["flags"][place, own]
        taken[first] = held | own
    return rows[~is_later]


def settle_long(read: Spool, depth: NDArray[np.float32], flagged: bool, tally: Tally) -> Spool:
    """Return rows with one reading each as a table with a row per time and a column per depth.

    Parameters
    ----------
    read : Spool
        Rows of :func:`profiles.ingest.spool.long_type`.
    depth : ndarray of float32
        Of the sensors, ascending.
    flagged : bool
        Whether the rows have flags.
    tally : Tally
        Takes the rows that lost.
    """
    table = Spool(wide_type(depth.size, flagged=flagged))
    for rows in read.by_time():
        is_repeat, first = repeats(pd.DataFrame({"time": rows["time"], "depth": rows["depth"]}))
        _quarantine(rows, is_repeat, first, "time and depth are those of line {}", tally)
        table.append(_as_table(rows[~is_repeat], depth, table.row_type))
    return table


def _as_table(rows: Table, depth: NDArray[np.float32], row_type: np.dtype[np.void]) -> Table:
    time, at_time = np.unique(rows["time"], return_inverse=True)
    table = np.zeros(time.size, row_type)
    at_depth = np.searchsorted(depth, rows["depth"])
    table["time"], table["piece"] = time, 1
    table["values"] = np.nan
    table["values"][at_time, at_depth] = rows["value"]
    if table["flags"].shape[1]:
        table["flags"] = Flag.MISSING
        table["flags"][at_time, at_depth] = rows["flag"]
    return table


def of_one_station(read: Spool, labels: Sequence[str], tally: Tally) -> tuple[Spool, str | None]:
    """Keep the station with most rows, and return its name; where no column names stations, keep all."""
    if not labels:
        return read, None
    counts = np.zeros(len(labels), np.int64)
    for rows in read.chunks():
        counts += np.bincount(rows["label"], minlength=len(labels))
    main = int(counts.argmax())
    if counts[main] == read.count:
        return read, labels[main] or None
    kept = Spool(read.row_type)
    for rows in read.chunks():
        other = rows["line"][rows["label"] != main]
        reason = f"the station is not {labels[main]!r}, of which this file has most rows"
        tally.take_back(other, [reason] * other.size)
        kept.append(rows[rows["label"] == main])
    return kept, labels[main] or None
