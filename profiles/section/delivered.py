"""Means of series that somebody else computed, and the means of a mooring from several sources put together."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np
import pandas as pd
import xarray as xr

from profiles.config import MeansSettings
from profiles.section.means import (
    AVERAGED,
    DAY_HOURS,
    INDEPENDENT,
    aligned,
    censored,
    labelled_means,
    mean_flag,
    mean_status,
    middle_of,
    time_table,
)
from profiles.vocabulary import ColumnSource, MeanStatus, describe


def monthly_means_delivered(columns: xr.Dataset, settings: MeansSettings | None = None) -> xr.Dataset:
    """Return means of months that somebody else made, as :func:`monthly_means` returns ours.

    Parameters
    ----------
    columns : xarray.Dataset
        On ``time``, a value a month, as :func:`profiles.column.columns_of_series` returns them: with
        ``isotherm_day_count``, how many days each mean is of, and ``isotherm_day_spread``, their standard deviation.
    settings : MeansSettings, optional
        Default: the defaults. The least number of days is asked of these months as of ours.
    """
    settings = settings or MeansSettings()
    table = time_table(columns)
    months = pd.DatetimeIndex(table.index).to_period("M")
    index = pd.period_range(months[0], months[-1], freq="M")
    table = table.set_index(months).reindex(index)
    means = table[[*AVERAGED, "questionable_share", "deployment", INDEPENDENT]].copy()
    count = table["isotherm_day_count"].fillna(0).astype(int).where(table["isotherm_depth"].notna(), 0)
    means["isotherm_mean_status"] = mean_status(count, censored(table).astype(int), settings.monthly_days, 0.0)
    means["isotherm_day_count"] = count
    means["isotherm_day_spread"] = table["isotherm_day_spread"]
    means["isotherm_depth_qc"] = mean_flag(means, settings.questionable_share)
    return labelled_means(means, middle_of(index), columns)


def over_days(columns: xr.Dataset, mean_hours: np.ndarray) -> xr.Dataset:
    """Return columns with values that are means of several days at each of these days, so that days can be counted.

    Where means overlap, as running means do, a day takes the nearest. The days of one mean are no independent values:
    the independent part of their errors grows with the square root of their number, so that the error of their average
    is again that of the mean.

    Parameters
    ----------
    columns : xarray.Dataset
        On ``time``, increasing.
    mean_hours : ndarray of float, (time,)
        Hours that each value is the mean of, NaN where that is not known; values of a day or less stay as they are.
    """
    is_long = mean_hours > DAY_HOURS
    if not is_long.any():
        return columns
    times = pd.DatetimeIndex(columns["time"].values)
    half = pd.to_timedelta(np.nan_to_num(mean_hours) / 2.0, unit="h")
    long = np.flatnonzero(is_long)
    first, last = (times[long] - half[long]).min(), (times[long] + half[long]).max()
    noons = pd.date_range(first.floor("D"), last, freq="D") + pd.Timedelta("12h")
    source = long[times[long].get_indexer(noons, method="nearest")]
    is_covered = np.abs(noons - times[source]) < half[source]
    is_own = noons.floor("D").isin(times[~is_long].floor("D"))
    chosen = is_covered & ~is_own
    spread = columns.isel(time=source[chosen]).assign_coords(time=noons[chosen].to_numpy())
    days = np.sqrt(mean_hours[source[chosen]] / DAY_HOURS).astype(np.float32)
    spread[INDEPENDENT] = spread[INDEPENDENT].copy(data=spread[INDEPENDENT].values * days)
    together = xr.concat([columns.isel(time=~is_long), spread], dim="time", coords="minimal", compat="override")
    return describe(together.sortby("time"))


def first_given(
    sources: Sequence[tuple[ColumnSource, xr.Dataset | None, xr.Dataset]],
) -> tuple[xr.Dataset | None, xr.Dataset]:
    """Put the means of one mooring from several sources together.

    Parameters
    ----------
    sources : sequence of tuple
        In the order in which they come: where from, the daily means if there are any, the monthly means.

    Returns
    -------
    daily, monthly : xarray.Dataset
        A month is of the first source that gives its mean of the isotherm, else of the first that has the month at all;
        its days are of the same source, or of the first that has days in that month. ``column_source`` says which.
    """
    months = [part for _, _, part in sources]
    times = np.unique(np.concatenate([part["time"].values for part in months]))
    parts = [aligned(part, times) for part in months]
    has = np.array([np.isin(times, part["time"].values) for part in months])
    gives = np.array([part["isotherm_mean_status"].values == int(MeanStatus.GIVEN) for part in parts])
    winner = np.where(gives.any(axis=0), gives.argmax(axis=0), has.argmax(axis=0))
    codes = [int(source) for source, _, _ in sources]
    monthly = _chosen(parts, winner, codes)
    owner = dict(zip(times.astype("datetime64[M]"), winner, strict=True))
    return _chosen_days([daily for _, daily, _ in sources], owner, codes), monthly


def _chosen_days(
    dailies: Sequence[xr.Dataset | None], owner: Mapping[Any, int], codes: Sequence[int]
) -> xr.Dataset | None:
    given = [(place, daily) for place, daily in enumerate(dailies) if daily is not None]
    if not given:
        return None
    times = np.unique(np.concatenate([daily["time"].values for _, daily in given]))
    months = times.astype("datetime64[M]")
    having = [set(daily["time"].values.astype("datetime64[M]")) for _, daily in given]
    places = [place for place, _ in given]

    def source_of(month: Any) -> int:
        candidates = [number for number, held in enumerate(having) if month in held]
        return next((number for number in candidates if places[number] == owner.get(month)), candidates[0])

    chosen = {month: source_of(month) for month in np.unique(months)}
    winner = np.array([chosen[month] for month in months])
    held = np.array([np.isin(times, daily["time"].values) for _, daily in given])
    kept = held[winner, np.arange(times.size)]
    parts = [aligned(daily, times[kept]) for _, daily in given]
    return _chosen(parts, winner[kept], [codes[place] for place in places])


def _chosen(parts: Sequence[xr.Dataset], winner: np.ndarray, codes: Sequence[int]) -> xr.Dataset:
    """Return at each time the values of one of several datasets that have the same times, and whose they are."""
    result = parts[0].copy()
    at = np.arange(winner.size)
    for name in result.data_vars:
        stacked = np.stack([part[name].values for part in parts])
        result[name] = ("time", stacked[winner, at].astype(result[name].dtype))
    result["column_source"] = ("time", np.array(codes, np.int8)[winner])
    return describe(result)


def without_days(monthly: xr.Dataset) -> xr.Dataset:
    """Return daily means that have no day, of a mooring that has months alone."""
    return monthly.drop_vars(["isotherm_day_count", "isotherm_day_spread"]).isel(time=slice(0, 0)).assign(
        isotherm_status=("time", np.zeros(0, np.int16))
    )  # fmt: skip
