"""Leading patterns of the equatorial isotherm depth: fitted once, applied anywhere."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from profiles.errors import DataError
from profiles.precursor.anomaly import Base, base_months, fit_anomaly
from profiles.precursor.series import month_of
from profiles.statistics import autocorrelation_of, fit_reflection

Array = NDArray[np.float64]


@dataclass(frozen=True)
class Patterns:
    """What was fitted.

    Attributes
    ----------
    climatology : ndarray, shape (12, longitude)
        Removed before a pattern is looked for, January first; NaN on land.
    loadings : ndarray, shape (pattern, longitude)
        Metres per standard deviation of the pattern's series; deeper in the east is positive, and where the pattern is
        alike all along the equator, deeper is.
    explained, explained_error : ndarray, shape (pattern,)
        Share of the variance, and its sampling error by the rule of North et al. (1982), share sqrt(2 / N*): patterns
        whose shares lie closer than that are not told apart.
    scale : ndarray, shape (pattern,)
        Standard deviation of the projections in the base, m.
    """

    climatology: Array
    loadings: Array
    explained: Array
    explained_error: Array
    scale: Array

    def apply(self, section: xr.DataArray) -> xr.DataArray:
        """Return the series of each pattern, in standard deviations of the base, on (pattern, time).

        Parameters
        ----------
        section : xarray.DataArray
            Isotherm depth, m, on (time, longitude), the longitudes that were fitted. A month that lacks one of the
            longitudes that ever had a value is NaN.
        """
        month = month_of(section["time"]).astype(np.int64) % 12
        anomaly = section.transpose("time", "longitude").values - self.climatology[month]
        sea = np.isfinite(self.loadings[0])
        unit = self.loadings[:, sea] / np.linalg.norm(self.loadings[:, sea], axis=1, keepdims=True)
        values = (unit @ anomaly[:, sea].T) / self.scale[:, None]
        return xr.DataArray(
            values,
            dims=("pattern", "time"),
            coords={"pattern": np.arange(1, len(unit) + 1), "time": section["time"]},
            name="isotherm_depth_pattern",
            attrs={"units": "1", "long_name": "series of a leading pattern of the equatorial isotherm depth"},
        )


def fit_patterns(section: xr.DataArray, count: int, *, base: Base | None = None) -> Patterns:
    """Fit the leading patterns (empirical orthogonal functions) of the equatorial isotherm depth.

    Parameters
    ----------
    section : xarray.DataArray
        Isotherm depth, m, on ``time`` and ``longitude`` at even steps; months may be left out, as when years are
        withheld. Longitudes without any value are land.
    count : int
        Patterns.
    base : tuple, optional
        Months that are fitted on; default all.

    Returns
    -------
    Patterns

    Raises
    ------
    DataError
        Where there are fewer complete months or longitudes than patterns.
    """
    ordered = section.transpose("time", "longitude")
    first, last = base_months(ordered.isel(longitude=0).rename("section"), base)
    months = month_of(ordered["time"])
    chosen = ordered.isel(time=(months >= first) & (months <= last))
    sea = np.isfinite(chosen.values).any(axis=0)
    whole = np.isfinite(chosen.values[:, sea]).all(axis=1)
    if whole.sum() <= count or sea.sum() < count:
        raise DataError(
            "too little of the section for its patterns",
            where=str(section.name),
            expected=f"more than {count} months and {count} longitudes with all values",
            found=f"{int(whole.sum())} months, {int(sea.sum())} longitudes",
        )
    used = chosen.isel(time=whole)
    climatology = np.full((12, sea.size), np.nan)
    anomaly = np.empty((int(whole.sum()), int(sea.sum())))
    for place, column in enumerate(np.flatnonzero(sea)):
        one = used.isel(longitude=int(column), drop=True).rename("isotherm_depth")
        fitted = fit_anomaly(one)
        climatology[:, column], anomaly[:, place] = fitted.climatology, fitted.apply(one).values
    return _decompose(anomaly, climatology, sea, count)


def _decompose(anomaly: Array, climatology: Array, sea: NDArray[np.bool_], count: int) -> Patterns:
    series, size, vectors = np.linalg.svd(anomaly, full_matrices=False)
    scale = (series * size).std(axis=0, ddof=1)[:count]
    loadings = np.full((count, sea.size), np.nan)
    for number, vector in enumerate(vectors[:count]):
        loadings[number, sea] = vector * _sign(vector) * scale[number]
    share = size[:count] ** 2 / (size**2).sum()
    effective = np.array([_effective(series[:, number]) for number in range(count)])
    return Patterns(climatology, loadings, share, share * np.sqrt(2.0 / effective), scale)


def _sign(vector: Array) -> float:
    """Return the sign that makes the mean positive, or, where most of it cancels, the east deeper than the west."""
    if abs(vector.sum()) > 0.5 * np.abs(vector).sum():
        return float(np.sign(vector.sum()))
    half = vector.size // 2
    return float(np.sign(vector[half:].sum() - vector[:half].sum())) or 1.0


def _effective(series: Array) -> float:
    """Return the effective number of months of a variance, N / sum of r_h^2 over all lags (Bartlett 1946)."""
    memory = autocorrelation_of(fit_reflection(series), series.size - 1)
    weights = 1.0 - np.arange(series.size) / series.size
    return float(series.size / (2.0 * (weights * memory**2).sum() - 1.0))
