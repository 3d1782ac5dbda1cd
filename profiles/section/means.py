"""Daily and monthly means of columns, given only where enough of the time is covered."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np
import pandas as pd
import xarray as xr

from profiles.config import MeansSettings
from profiles.errors import DataError
from profiles.vocabulary import ColumnSource, Flag, IsothermStatus, MeanStatus, describe

_CENSORED = (IsothermStatus.ABOVE_CHAIN, IsothermStatus.BELOW_CHAIN)
DAY_HOURS = 24.0
INDEPENDENT = "isotherm_depth_error_independent"
AVERAGED = ("isotherm_depth", "isotherm_depth_error_persistent", "mixed_layer_depth", "mean_temperature")


def daily_means(columns: xr.Dataset, settings: MeansSettings | None = None) -> xr.Dataset:
    """Return the means of each day, stamped at its middle.

    Parameters
    ----------
    columns : xarray.Dataset
        Columns of one mooring on ``time``, as :func:`profiles.column.columns_of` returns them.
    settings : MeansSettings, optional
        Default: the defaults.

    Returns
    -------
    xarray.Dataset
        On ``time``, every day from the first to the last. ``isotherm_mean_status`` says why a mean of the isotherm is
        not given, ``isotherm_depth_qc`` flags one of whose inputs too many are questionable, and ``isotherm_status`` is
        the commonest of the day.
    """
    settings = settings or MeansSettings()
    table = time_table(columns)
    times = pd.DatetimeIndex(table.index)
    days = times.floor("D")
    index = pd.date_range(days[0], days[-1], freq="D")
    expected = max(1, round(24.0 / _nominal_hours(times)))
    grouped = table.groupby(days)
    least = settings.daily_share * expected
    means = _means_where(grouped, least).reindex(index)
    means[INDEPENDENT] = _error_of_mean(table[INDEPENDENT], days).reindex(index)
    means["isotherm_status"] = _commonest_status(table, days).reindex(index)
    count = grouped["isotherm_depth"].count().reindex(index, fill_value=0)
    outside = censored(table).groupby(days).sum().reindex(index, fill_value=0)
    means["isotherm_mean_status"] = mean_status(count, outside, least, settings.censored_share)
    means["isotherm_depth_qc"] = mean_flag(means, settings.questionable_share)
    return labelled_means(means, index + pd.Timedelta("12h"), columns)


def monthly_means(daily: xr.Dataset, settings: MeansSettings | None = None) -> xr.Dataset:
    """Return the means of each month, stamped at its middle.

    Parameters
    ----------
    daily : xarray.Dataset
        As :func:`daily_means` returns it.
    settings : MeansSettings, optional
        Default: the defaults.

    Returns
    -------
    xarray.Dataset
        On ``time``, every month from the first to the last, with the number of days in ``isotherm_day_count`` and their
        standard deviation in ``isotherm_day_spread``. A month in which the isotherm lay outside the chain on more than
        the stated share of days has no mean: the days that are left would be a biased sample.
    """
    settings = settings or MeansSettings()
    table = time_table(daily)
    table["deployment"] = table["deployment"].where(table["deployment"] > 0)  # a day without a sample has none
    months = pd.DatetimeIndex(table.index).to_period("M")
    index = pd.period_range(months[0], months[-1], freq="M")
    grouped = table.groupby(months)
    least = settings.monthly_days
    means = _means_where(grouped, least).reindex(index)
    means[INDEPENDENT] = _error_of_mean(table[INDEPENDENT], months).reindex(index)
    count = grouped["isotherm_depth"].count().reindex(index, fill_value=0)
    outside = censored(table).groupby(months).sum().reindex(index, fill_value=0)
    means["isotherm_mean_status"] = mean_status(count, outside, least, settings.censored_share)
    means["isotherm_day_count"] = count
    means["isotherm_day_spread"] = grouped["isotherm_depth"].std().reindex(index)
    means["isotherm_depth_qc"] = mean_flag(means, settings.questionable_share)
    return labelled_means(means, middle_of(index), daily)


def join_moorings(means: Mapping[str, xr.Dataset]) -> xr.Dataset:
    """Join the means of several moorings on (mooring, time); times that a mooring lacks are missing.

    Raises
    ------
    DataError
        Where there is no mooring.
    """
    if not means:
        raise DataError("there is no mooring to join", expected="one or more")
    times = np.unique(np.concatenate([part["time"].values for part in means.values()]))
    parts = [aligned(part, times).assign_coords(mooring=name) for name, part in means.items()]
    # Positions stand along the moorings even where they are all the same, as on the equator.
    position = [name for name in ("latitude", "longitude") if all(name in part.coords for part in parts)]
    joined = xr.concat(parts, dim="mooring", join="exact", coords=position, compat="equals", combine_attrs="override")
    return describe(joined)


#: What stands where a mooring has no day or month, by the variables that hold whole numbers.
_NOTHING = {
    "isotherm_status": int(IsothermStatus.TOO_FEW_SENSORS),
    "isotherm_mean_status": int(MeanStatus.TOO_FEW_VALUES),
    "isotherm_depth_qc": int(Flag.MISSING),
    "isotherm_day_count": 0,
    "deployment": 0,
    "column_source": int(ColumnSource.NEITHER),
}


def middle_of(months: pd.PeriodIndex) -> pd.DatetimeIndex:
    return months.start_time + (months.end_time.ceil("D") - months.start_time) / 2


def aligned(part: xr.Dataset, times: np.ndarray) -> xr.Dataset:
    fill = {str(name): _NOTHING.get(str(name), np.nan) for name in part.data_vars}
    return part.reindex(time=times, fill_value=fill)


def time_table(columns: xr.Dataset) -> pd.DataFrame:
    series = {str(name): data for name, data in columns.data_vars.items() if data.dims == ("time",)}
    return pd.DataFrame(
        {name: data.values for name, data in series.items()}, index=pd.DatetimeIndex(columns["time"].values)
    )


def _nominal_hours(times: pd.DatetimeIndex) -> float:
    """Return the median time step in hours, a day where there is none."""
    steps = np.diff(times.to_numpy()) / np.timedelta64(1, "h")
    return float(np.median(steps)) if steps.size else 24.0


def _means_where(grouped: Any, least: float) -> pd.DataFrame:
    """Return the means of the columns that are averaged, where enough values are there."""
    means = pd.DataFrame({name: grouped[name].mean().where(grouped[name].count() >= least) for name in AVERAGED})
    means["questionable_share"] = grouped["questionable_share"].mean()
    means["deployment"] = grouped["deployment"].last()
    return means


def _error_of_mean(errors: pd.Series[float], groups: pd.Index) -> pd.Series[float]:
    """Return the standard error of the mean of each group of values whose errors are independent."""
    squares = (errors**2).groupby(groups)
    return squares.sum(min_count=1) ** 0.5 / squares.count()


def _commonest_status(table: pd.DataFrame, groups: pd.DatetimeIndex) -> pd.Series[int]:
    """Return the commonest status of each group, the first in the vocabulary where two are equally common."""
    codes = [int(status) for status in IsothermStatus]
    counts = pd.DataFrame({code: table["isotherm_status"] == code for code in codes}).groupby(groups).sum()
    return counts.idxmax(axis=1)


def censored(table: pd.DataFrame) -> pd.Series[bool]:
    return table["isotherm_status"].isin([int(status) for status in _CENSORED])


def mean_status(count: pd.Series[int], outside: pd.Series[Any], least: float, censored_share: float) -> pd.Series[int]:
    status = pd.Series(int(MeanStatus.GIVEN), index=count.index)
    status[count < least] = int(MeanStatus.TOO_FEW_VALUES)
    status[outside > censored_share * (count + outside)] = int(MeanStatus.CENSORED)
    return status


def mean_flag(means: pd.DataFrame, questionable_share: float) -> pd.Series[int]:
    """Return the flag of each mean: missing, questionable where too much of its input is, else good."""
    flag = pd.Series(int(Flag.GOOD), index=means.index)
    flag[means["questionable_share"] > questionable_share] = int(Flag.QUESTIONABLE)
    flag[means["isotherm_mean_status"] != int(MeanStatus.GIVEN)] = int(Flag.MISSING)
    return flag


def labelled_means(means: pd.DataFrame, times: pd.DatetimeIndex, source: xr.Dataset) -> xr.Dataset:
    given = means["isotherm_mean_status"] == int(MeanStatus.GIVEN)
    parts = [name for name in means.columns if name.startswith("isotherm_depth")]
    means.loc[~given, parts] = np.nan
    means["isotherm_depth_error"] = np.hypot(
        means["isotherm_depth_error_independent"], means["isotherm_depth_error_persistent"]
    )
    dataset = xr.Dataset(coords={"time": times.to_numpy()})
    for name, values in means.items():
        nothing = _NOTHING.get(str(name))
        stored = values.astype(np.float32) if nothing is None else values.fillna(nothing).astype(np.int16)
        dataset[str(name)] = ("time", stored.to_numpy())
    scalars = {name: source[name] for name in ("mooring", "latitude", "longitude") if name in source.coords}
    return describe(dataset.assign_coords(scalars))
