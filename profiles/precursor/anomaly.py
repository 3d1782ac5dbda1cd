"""Anomalies of a monthly series from a stated base: seasonal cycle, trend and scale, fitted once, applied anywhere."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from profiles.errors import DataError, RequestError
from profiles.precursor.series import calendar_month, month_of
from profiles.vocabulary import DIFFERENCE, VARIABLES

Array = NDArray[np.float64]
Base = tuple[str | int, str | int]
Standard = Literal["none", "whole", "month"]

LEAST_YEARS = 3  # years of a calendar month without which its mean, and its spread, say little (ours)


@dataclass(frozen=True)
class Anomaly:
    """What was fitted: an anomaly is (value - climatology - trend) / scale.

    Attributes
    ----------
    base : tuple of str
        First and last month of the base.
    climatology : ndarray, shape (12,)
        Mean of each calendar month, January first, at ``centre`` where there is a trend.
    slope : float
        Trend per month, 0 where none was asked for.
    centre : float
        Months since 1970-01 where the trend is 0.
    scale : ndarray, shape (12,)
        Standard deviation of the anomalies, of all months or of each; 1 where none was asked for.
    standardised : bool
        Whether ``scale`` is one.
    """

    base: tuple[str, str]
    climatology: Array
    slope: float
    centre: float
    scale: Array
    standardised: bool

    def apply(self, series: xr.DataArray) -> xr.DataArray:
        """Return the anomalies of any months of the same quantity, in the base's terms; NaN stays NaN.

        The name gets ``_anomaly``; units are those of the series, or 1 where standardised.
        """
        month = calendar_month(series["time"]) - 1
        trend = self.slope * (month_of(series["time"]).astype(np.float64) - self.centre)
        values = (series.values - self.climatology[month] - trend) / self.scale[month]
        name = f"{series.name}_anomaly"
        known = VARIABLES[name].attributes() if name in VARIABLES else {}
        known.pop("ancillary_variables", None)
        units = "1" if self.standardised else series.attrs.get("units", "1")
        difference = DIFFERENCE if units.startswith("degree_C") else {}
        stated = {"units": units, "base": " to ".join(self.base), "trend_per_month_removed": self.slope}
        long_name = {"long_name": f"anomaly of {series.attrs.get('long_name', series.name)}"}
        return series.copy(data=values).rename(name).assign_attrs(long_name | known | stated | difference)


def fit_anomaly(
    series: xr.DataArray, *, base: Base | None = None, detrend: bool = False, standardise: Standard = "none"
) -> Anomaly:
    """Fit the seasonal cycle, and trend and scale where asked, on the months of a base.

    Parameters
    ----------
    series : xarray.DataArray
        On ``time``; months may be left out, as when years are withheld. NaN is left out.
    base : tuple, optional
        First and last month, "1991-01" and "2020-12", or years, both inclusive. Default: all months of ``series``.
    detrend : bool
        Whether a straight line in time is fitted together with the means of the calendar months (least squares).
    standardise : {"none", "whole", "month"}
        Whether anomalies are divided by their standard deviation in the base (n - 1): of all months, or each calendar
        month by its own.

    Returns
    -------
    Anomaly

    Raises
    ------
    RequestError
        Where the base is not two months in order.
    DataError
        Where the base reaches beyond the record, or a calendar month has too few values in it.
    """
    if standardise not in ("none", "whole", "month"):
        raise RequestError("no such choice", where="standardise", expected="none, whole or month", found=standardise)
    first, last = base_months(series, base)
    months = month_of(series["time"])
    used = (months >= first) & (months <= last) & np.isfinite(series.values)
    _check_enough(series, months[used], (first, last))
    number, month = months[used].astype(np.float64), calendar_month(months[used]) - 1
    values = series.values[used].astype(np.float64)
    climatology, slope, centre = _seasonal_fit(values, month, number, detrend)
    anomalies = values - climatology[month] - slope * (number - centre)
    return Anomaly(
        base=(str(first), str(last)),
        climatology=climatology,
        slope=slope,
        centre=centre,
        scale=_scale(anomalies, month, standardise, series),
        standardised=standardise != "none",
    )


def anomalies(
    series: xr.DataArray,
    base: Base | None = None,
    *,
    detrend: bool = False,
    standardise: Standard = "none",
) -> xr.DataArray:
    """Return the anomalies of a series from its own base; arguments and errors as for :func:`fit_anomaly`."""
    return fit_anomaly(series, base=base, detrend=detrend, standardise=standardise).apply(series)


def running_mean(series: xr.DataArray, months: int, *, kind: Literal["centred", "trailing"]) -> xr.DataArray:
    """Return the mean over so many months.

    Parameters
    ----------
    series : xarray.DataArray
        A monthly series without left-out months.
    months : int
        Odd where centred; 1 leaves the series as it is.
    kind : {"centred", "trailing"}
        Centred on the month, or of the month and those before. Only the latter knows nothing of the future: a hindcast
        or an outlook must not use the other.

    Returns
    -------
    xarray.DataArray
        The same months, NaN where one of the window is missing or outside the record. The attribute ``running_mean``
        says which.

    Raises
    ------
    RequestError
        Where the length is below 1, longer than the record, or even and centred; or where there is no such kind.
    """
    if kind not in ("centred", "trailing"):
        raise RequestError("no such choice", where="kind", expected="centred or trailing", found=repr(kind))
    if months < 1 or months > series.size or (kind == "centred" and months % 2 == 0):
        raise RequestError(
            "not a length of a running mean",
            where="months",
            expected=f"1 to {series.size}" + (", odd where it is centred" if kind == "centred" else ""),
            found=str(months),
        )
    mean = series.rolling(time=months, center=kind == "centred", min_periods=months).mean()
    return mean.assign_attrs(series.attrs | {"running_mean": f"{months} months, {kind}"})


def base_months(series: xr.DataArray, base: Base | None) -> tuple[np.datetime64, np.datetime64]:
    """Return the first and last month of a base; raise RequestError or DataError where it is none of this record."""
    record = month_of(series["time"])
    if base is None:
        return record[0], record[-1]
    first, last = _month(base[0], "01"), _month(base[1], "12")
    if first > last:
        raise RequestError(
            "not a base period", where="base", expected="the first month, then the last", found=f"{first} to {last}"
        )
    if first < record[0] or last > record[-1]:
        raise DataError(
            "the base period reaches outside the record",
            where=str(series.name),
            expected=f"within {record[0]} to {record[-1]}",
            found=f"{first} to {last}",
            advice="choose a base that the record covers",
        )
    return first, last


def _month(given: str | int, month: str) -> np.datetime64:
    text = str(given)
    try:
        return np.datetime64(f"{text}-{month}" if len(text) == 4 else text, "M")
    except ValueError:
        raise RequestError(
            "not a month", where="base", expected="a year (2001) or a month ('2001-01')", found=repr(given)
        ) from None


def _check_enough(series: xr.DataArray, months: NDArray[np.datetime64], base: tuple[np.datetime64, ...]) -> None:
    counts = np.bincount(calendar_month(months) - 1, minlength=12)
    if counts.min() >= LEAST_YEARS:
        return
    short = int(counts.argmin())
    raise DataError(
        "the base is too short for a climatology",
        where=str(series.name),
        expected=f"{LEAST_YEARS} or more values of each calendar month",
        found=f"{counts[short]} of month {short + 1} in {base[0]} to {base[1]}",
        advice="choose a longer base",
    )


def _seasonal_fit(values: Array, month: NDArray[np.int64], number: Array, detrend: bool) -> tuple[Array, float, float]:
    """Return the 12 means, the slope per month and the month at which the trend is 0 (least squares, jointly)."""
    counts = np.bincount(month, minlength=12)

    def within(quantity: Array) -> tuple[Array, Array]:
        means = np.bincount(month, weights=quantity, minlength=12) / counts
        return means, quantity - means[month]

    means, departures = within(values)
    centre = float(number.mean())
    if not detrend:
        return means, 0.0, centre
    place, drift = within(number - centre)
    slope = float(drift @ departures / (drift @ drift))
    return means - slope * place, slope, centre


def _scale(anomalies: Array, month: NDArray[np.int64], standardise: Standard, series: xr.DataArray) -> Array:
    if standardise == "none":
        return np.ones(12)
    groups = [month == number for number in range(12)] if standardise == "month" else [np.ones(month.size, bool)] * 12
    scale = np.array([np.std(anomalies[group], ddof=1) for group in groups])
    if (scale > 1e-9 * (np.abs(series.values[np.isfinite(series.values)]).max() or 1.0)).all():
        return scale
    raise DataError(
        "the series does not vary in the base, so it cannot be standardised",
        where=str(series.name),
        expected="a standard deviation above 0",
        found=f"0 in calendar month {int(scale.argmin()) + 1}",
    )
