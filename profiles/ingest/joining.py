"""Several deliveries of one mooring to one."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import pandas as pd
import xarray as xr
from numpy.typing import NDArray

from profiles.errors import DataError, RequestError
from profiles.ingest.delivery import (
    POSITION_TOLERANCE,
    QUARANTINE_COLUMNS,
    Delivery,
    accounted,
    degrees_apart,
    row_texts,
)
from profiles.vocabulary import Flag, describe

Mask = NDArray[np.bool_]


def join(deliveries: Sequence[Delivery]) -> Delivery:
    """Join the deliveries of one mooring in time.

    Parameters
    ----------
    deliveries : sequence of Delivery
        As :func:`profiles.ingest.read` returned them. Their order is their precedence, and numbers the
        deployments from 1.

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
    chains = [delivery.chain for delivery in deliveries]
    coords = _common_coords(deliveries)
    winners = _winners(chains)
    rows, lost = _divided(deliveries, winners)
    chain = describe(_joined(chains, winners).assign_coords(coords), temperature_raw=_scales(chains))
    return accounted(
        chain,
        sum(delivery.rows_read for delivery in deliveries),
        sum(delivery.rows_reordered for delivery in deliveries),
        pd.concat([*(delivery.quarantine for delivery in deliveries), lost], ignore_index=True),
        rows,
        tuple(source for delivery in deliveries for source in delivery.sources),
    )


# ------------------------------------------------------------------------------------------------------------
# What must agree


def _common_coords(deliveries: Sequence[Delivery]) -> dict[str, str | float]:
    moorings = {str(delivery.chain["mooring"].item()) for delivery in deliveries}
    if len(moorings) > 1:
        raise RequestError(
            "the deliveries are of different moorings",
            where="deliveries",
            expected="one mooring",
            found=", ".join(sorted(moorings)),
            advice="join those of one mooring at a time, or name the mooring when reading",
        )
    positions = {role: _common_position(role, deliveries) for role in ("latitude", "longitude")}
    return {
        "mooring": moorings.pop(),
        **{role: value for role, value in positions.items() if value is not None},
    }


def _common_position(role: str, deliveries: Sequence[Delivery]) -> float | None:
    known = [(delivery, float(delivery.chain[role])) for delivery in deliveries if role in delivery.chain.coords]
    for delivery, value in known:
        first, common = known[0]
        if degrees_apart(value, common) > POSITION_TOLERANCE:
            raise DataError(
                f"the deliveries differ in {role}",
                where=str(delivery.sources[0][0]),
                expected=f"{common:g} degrees as in {first.sources[0][0]}, within {POSITION_TOLERANCE:g}",
                found=f"{value:g} degrees",
                advice="check that both belong to this mooring",
            )
    return known[0][1] if known else None


def _scales(chains: Sequence[xr.Dataset]) -> dict[str, str]:
    """Return the attribute that says which scale the raw temperature is on, by deployment if they differ."""
    attributes = [chain["temperature_raw"].attrs for chain in chains]
    scales = [str(held.get("reference_scale") or held["comment"]) for held in attributes]
    if len(set(scales)) == 1:
        return {"reference_scale": scales[0]}
    return {"comment": "; ".join(f"deployment {number} on {scale}" for number, scale in enumerate(scales, start=1))}


# ------------------------------------------------------------------------------------------------------------
# Who wins


def _winners(chains: Sequence[xr.Dataset]) -> list[Mask]:
    """Return for each chain which of its times no earlier chain with a depth in common has."""
    winners: list[Mask] = []
    for chain in chains:
        wins = np.ones(chain.sizes["time"], dtype=bool)
        for earlier, won in zip(chains, winners, strict=False):
            if np.isin(chain["depth"], earlier["depth"]).any():
                wins &= ~np.isin(chain["time"], earlier["time"].values[won])
        winners.append(wins)
    return winners


def _divided(deliveries: Sequence[Delivery], winners: Sequence[Mask]) -> tuple[pd.DataFrame, pd.DataFrame]:
    """Return the rows that stay, and the quarantine entries of those that lost."""
    kept, lost, first_source = [], [], 0
    for number, (delivery, wins) in enumerate(zip(deliveries, winners, strict=True), start=1):
        has_won = delivery.rows["time"].isin(delivery.chain["time"].values[wins])
        rows = delivery.rows[has_won]
        kept.append(rows.assign(source=rows["source"] + first_source))
        lost += _lost_entries(delivery, delivery.rows[~has_won], number)
        first_source += len(delivery.sources)
    return pd.concat(kept, ignore_index=True), pd.DataFrame(lost, columns=list(QUARANTINE_COLUMNS))


def _lost_entries(delivery: Delivery, rows: pd.DataFrame, number: int) -> list[tuple[str, int, str, str]]:
    reason = f"an earlier delivery has this time and comes first; this is number {number}"
    entries = []
    for place, (path, layout) in enumerate(delivery.sources):
        of_source = rows[rows["source"] == place]
        times = dict(zip(of_source["line"], of_source["time"].to_numpy(), strict=True))
        texts = row_texts(path, layout, times, times) if times else {}
        entries += [(str(path), line, reason, text) for line, text in texts.items()]
    return entries


# ------------------------------------------------------------------------------------------------------------
# One table


def _joined(chains: Sequence[xr.Dataset], winners: Sequence[Mask]) -> xr.Dataset:
    time = np.unique(np.concatenate([chain["time"].values[wins] for chain, wins in zip(chains, winners, strict=True)]))
    depth = np.unique(np.concatenate([chain["depth"].values for chain in chains]))
    joined = xr.Dataset(coords={"time": time, "depth": depth})
    shape, grid = (time.size, depth.size), ("time", "depth")
    tables = {name: np.full(shape, np.nan, np.float32) for name in ("temperature_raw", "temperature")}
    if any("temperature_delivered_qc" in chain for chain in chains):
        tables["temperature_delivered_qc"] = np.full(shape, Flag.MISSING, np.int8)
    deployment = np.zeros(time.size, dtype=np.int16)
    uncertainty = np.zeros(depth.size, dtype=np.float32)
    # Last to first, so that a time that several chains complete carries the number of the first.
    for number, chain, wins in reversed(list(zip(range(1, len(chains) + 1), chains, winners, strict=True))):
        at_time = np.searchsorted(time, chain["time"].values[wins])
        at_depth = np.searchsorted(depth, chain["depth"].values)
        deployment[at_time] = number
        uncertainty[at_depth] = np.maximum(uncertainty[at_depth], chain["temperature_uncertainty"].values)
        for name, table in tables.items():
            table[np.ix_(at_time, at_depth)] = _values(chain, name)[wins]
    joined = joined.assign({name: (grid, table) for name, table in tables.items()})
    return joined.assign(temperature_uncertainty=("depth", uncertainty), deployment=("time", deployment))


def _values(chain: xr.Dataset, name: str) -> NDArray[np.floating] | NDArray[np.int8]:
    if name in chain:
        return np.asarray(chain[name].values)
    is_missing = np.isnan(chain["temperature"].values)
    return np.where(is_missing, Flag.MISSING, Flag.NOT_EVALUATED).astype(np.int8)
