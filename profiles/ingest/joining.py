"""Several deliveries of one mooring to one."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import replace

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from profiles.errors import DataError, RequestError
from profiles.ingest.delivery import (
    POSITION_TOLERANCE,
    QUARANTINE_COLUMNS,
    Delivery,
    Source,
    degrees_apart,
)
from profiles.ingest.record import verify_count
from profiles.ingest.spool import CHUNK_ROWS, Spool, Table, wide_type
from profiles.ingest.water import immersion
from profiles.vocabulary import Flag

Mask = NDArray[np.bool_]


def join(deliveries: Sequence[Delivery]) -> Delivery:
    """Join the deliveries of one mooring in time.

    Parameters
    ----------
    deliveries : sequence of Delivery
        As :func:`profiles.ingest.read` returned them. Their order is their precedence, and the number of their
        deployment where none was stated.

    Returns
    -------
    Delivery
        All times and all depths. Where two deliveries that share a depth have the same time, the one listed
        first wins and the rows of the other go to quarantine; deliveries of different sensors complete each
        other, under the number of the first. A delivered flag is 2, or 9 without a value, where a file had
        none. The uncertainty at a depth is the largest stated.

    Raises
    ------
    RequestError
        Where there is no delivery, or they are of different moorings.
    DataError
        Where their positions are more than 0.25 degree apart.
    """
    if not deliveries:
        raise RequestError("there is no delivery to join", where="deliveries", expected="at least one")
    if len(deliveries) == 1:
        return deliveries[0]
    mooring, position = _common_coords(deliveries)
    depth = np.unique(np.concatenate([delivery.depth for delivery in deliveries]))
    table = Spool(wide_type(depth.size, flagged=any(delivery.is_flagged for delivery in deliveries)))
    lost: list[list[NDArray[np.datetime64]]] = [[] for _ in deliveries]
    for parts in _windows([delivery.table for delivery in deliveries]):
        winners = _winners([part["time"] for part in parts], [delivery.depth for delivery in deliveries])
        table.append(_joined(deliveries, parts, winners, depth, table.row_type))
        for place, (part, wins) in enumerate(zip(parts, winners, strict=True)):
            lost[place].append(part["time"][~wins])
    divided = [
        _divided(delivery, np.concatenate(times), number)
        for number, (delivery, times) in enumerate(zip(deliveries, lost, strict=True), start=1)
    ]
    quarantine = pd.concat(
        [*(delivery.quarantine for delivery in deliveries), *(entries for _, entries in divided)], ignore_index=True
    )
    rows_read = sum(delivery.rows_read for delivery in deliveries)
    rows_kept = sum(delivery.rows_kept for delivery in deliveries) - sum(len(entries) for _, entries in divided)
    verify_count(rows_read, rows_kept, len(quarantine), mooring)
    return Delivery(
        mooring=mooring,
        position=position,
        depth=depth,
        table=table,
        scales=tuple(scale for delivery in deliveries for scale in delivery.scales),
        cell_methods=tuple(method for delivery in deliveries for method in delivery.cell_methods),
        clocks=tuple(clock for delivery in deliveries for clock in delivery.clocks),
        deployments=tuple(
            number or place for place, delivery in enumerate(deliveries, start=1) for number in delivery.deployments
        ),
        immersion=immersion(table, depth, deliveries[0].immersion.service),
        uncertainty=_largest_uncertainty(deliveries, depth),
        rows_read=rows_read,
        rows_kept=rows_kept,
        rows_quarantined=len(quarantine),
        rows_reordered=sum(delivery.rows_reordered for delivery in deliveries),
        quarantine=quarantine,
        sources=tuple(source for sources, _ in divided for source in sources),
    )


def _largest_uncertainty(deliveries: Sequence[Delivery], depth: NDArray[np.float32]) -> NDArray[np.float32]:
    uncertainty = np.zeros(depth.size, np.float32)
    for delivery in deliveries:
        at_depth = np.searchsorted(depth, delivery.depth)
        uncertainty[at_depth] = np.maximum(uncertainty[at_depth], delivery.uncertainty)
    return uncertainty


# ------------------------------------------------------------------------------------------------------------
# What must agree


def _common_coords(deliveries: Sequence[Delivery]) -> tuple[str, dict[str, float]]:
    moorings = {delivery.mooring for delivery in deliveries}
    if len(moorings) > 1:
        raise RequestError(
            "the deliveries are of different moorings",
            where="deliveries",
            expected="one mooring",
            found=", ".join(sorted(moorings)),
            advice="join those of one mooring at a time, or name the mooring when reading",
        )
    positions = {role: _common_position(role, deliveries) for role in ("latitude", "longitude")}
    return moorings.pop(), {role: value for role, value in positions.items() if value is not None}


def _common_position(role: str, deliveries: Sequence[Delivery]) -> float | None:
    known = [(delivery, delivery.position[role]) for delivery in deliveries if role in delivery.position]
    for delivery, value in known:
        first, common = known[0]
        if degrees_apart(value, common) > POSITION_TOLERANCE:
            raise DataError(
                f"the deliveries differ in {role}",
                where=str(delivery.sources[0].path),
                expected=f"{common:g} degrees as in {first.sources[0].path}, within {POSITION_TOLERANCE:g}",
                found=f"{value:g} degrees",
                advice="check that both belong to this mooring",
            )
    return known[0][1] if known else None


# ------------------------------------------------------------------------------------------------------------
# Who wins


def _windows(tables: Sequence[Spool]) -> Iterator[list[Table]]:
    """Yield the rows of several tables span by span of time, so that rows of one time come together."""
    places = [0] * len(tables)
    while any(place < table.count for place, table in zip(places, tables, strict=True)):
        ahead = [table.rows(place, place + CHUNK_ROWS) for place, table in zip(places, tables, strict=True)]
        # Up to the earliest last row of those that go on: whatever has such a time is at hand.
        unfinished = [
            rows["time"][-1]
            for rows, place, table in zip(ahead, places, tables, strict=True)
            if place + len(rows) < table.count
        ]
        window = [rows[rows["time"] <= min(unfinished)] if unfinished else rows for rows in ahead]
        places = [place + len(rows) for place, rows in zip(places, window, strict=True)]
        yield window


def _winners(times: Sequence[NDArray[np.datetime64]], depths: Sequence[NDArray[np.float32]]) -> list[Mask]:
    """Return for each delivery which of its times no earlier one with a depth in common has."""
    winners: list[Mask] = []
    for time, depth in zip(times, depths, strict=True):
        wins = np.ones(time.size, dtype=bool)
        for earlier, won, levels in zip(times, winners, depths, strict=False):
            if np.isin(depth, levels).any():
                wins &= ~np.isin(time, earlier[won])
        winners.append(wins)
    return winners


def _divided(delivery: Delivery, lost: NDArray[np.datetime64], number: int) -> tuple[list[Source], pd.DataFrame]:
    """Return the files of a delivery without the rows that lost, and the quarantine entries of those."""
    reason = f"an earlier delivery has this time and comes first; this is number {number}"
    sources, entries = [], []
    for source in delivery.sources:
        lines = source.lines_at(lost) if lost.size else {}
        texts = source.texts(lines)
        entries += [(str(source.path), line, reason, texts[line]) for line in lines]
        sources.append(replace(source, lost=source.lost | frozenset(lines)))
    return sources, pd.DataFrame(entries, columns=list(QUARANTINE_COLUMNS))


# ------------------------------------------------------------------------------------------------------------
# One table


def _joined(
    deliveries: Sequence[Delivery],
    parts: Sequence[Table],
    winners: Sequence[Mask],
    depth: NDArray[np.float32],
    row_type: np.dtype[np.void],
) -> Table:
    time = np.unique(np.concatenate([part["time"][wins] for part, wins in zip(parts, winners, strict=True)]))
    table = np.zeros(time.size, row_type)
    table["time"], table["values"], table["flags"] = time, np.nan, Flag.MISSING
    first_piece = np.cumsum([0, *(len(delivery.scales) for delivery in deliveries)])
    # Last to first, so that a time that several deliveries complete carries the number of the first.
    for delivery, part, wins, pieces in reversed(list(zip(deliveries, parts, winners, first_piece, strict=False))):
        rows = part[wins]
        at_time, at_depth = np.searchsorted(time, rows["time"]), np.searchsorted(depth, delivery.depth)
        table["piece"][at_time] = rows["piece"] + pieces
        table["values"][np.ix_(at_time, at_depth)] = rows["values"]
        if table["flags"].shape[1]:
            table["flags"][np.ix_(at_time, at_depth)] = _flags(rows)
    return table


def _flags(rows: Table) -> NDArray[np.int8]:
    if rows["flags"].shape[1]:
        return np.asarray(rows["flags"])
    return np.where(np.isnan(rows["values"]), Flag.MISSING, Flag.NOT_EVALUATED).astype(np.int8)
