"""The hindcast: every year forecast by what was fitted without it.

Whole years are left out, with all months within the longest lead of them. What is fitted (climatology, trend, scale,
coefficients, spread) is fitted inside the fold on the months that are left; of the rest of the record a forecast
knows the month it starts from, and nothing else.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np
import xarray as xr
from numpy.typing import NDArray
from scipy.special import stdtr

from profiles.config import HindcastSettings
from profiles.errors import DataError, RequestError
from profiles.precursor.anomaly import fit_anomaly
from profiles.precursor.forecasters import Training, by_target, fit_all, forecasts
from profiles.precursor.series import calendar_month, check_varies, month_of, overlap
from profiles.statistics import autocorrelation_of, fit_reflection

Array = NDArray[np.float64]
Mask = NDArray[np.bool_]

CATEGORIES = ("cold", "neutral", "warm")
LEAST_REFITTED = 6  # years on which a forecast is fitted anew without a block of them, for the errors of scores (ours)
VOLUME = "volume"  # the predictor that the recharge oscillator takes


@dataclass(frozen=True)
class Fold:
    """Months that are forecast, and months that may be fitted on; both (time,)."""

    held: Mask
    used: Mask


def folds(year: NDArray[np.int64], gap: int, scheme: Literal["years_out", "expanding"]) -> list[Fold]:
    """Return a fold for every year of the record.

    Parameters
    ----------
    year : ndarray of int, shape (time,)
        Calendar year of consecutive months.
    gap : int
        Months on either side of a year that are neither forecast nor fitted on: at least the longest lead, so that
        no start of a forecast is among what was fitted on.
    scheme : {"years_out", "expanding"}
        Whether later years may be fitted on.
    """
    place = np.arange(year.size)
    made = []
    for one in np.unique(year):
        held = year == one
        first, last = place[held][[0, -1]]
        used = place < first - gap
        if scheme == "years_out":
            used = used | (place > last + gap)
        made.append(Fold(held, used))
    return made


def year_blocks(year: NDArray[np.int64], length: int) -> NDArray[np.int64]:
    """Return the number of the block of years that each month belongs to; what is left over joins the last block."""
    block = (year - year.min()) // length
    last = max((year.max() - year.min() + 1) // length - 1, 0)
    return np.minimum(block, last)


def blocks(used: Mask, count: int, gap: int) -> list[Fold]:
    """Split the months that may be fitted on into runs, each to be forecast from those further off than ``gap``."""
    place = np.arange(used.size)
    made = []
    for run in np.array_split(np.flatnonzero(used), count):
        held = used & (place >= run[0]) & (place <= run[-1])
        near = (place >= run[0] - gap) & (place <= run[-1] + gap)
        made.append(Fold(held, used & ~near))
    return made


@dataclass(frozen=True)
class Standardised:
    """Series as anomalies from the months fitted on: ``state`` (variable, time), the index first.

    ``anomaly`` (time,) and ``scale`` (12,) of the index are in its units.
    """

    state: Array
    anomaly: Array
    scale: Array


def standardised(series: Sequence[xr.DataArray], used: Mask, *, detrend: bool) -> Standardised:
    """Fit climatology, trend and scale on ``used`` months of each series, and apply them to all months.

    The scale of a calendar month is the root mean square of its own and its neighbours' standard deviations: one month
    of a few decades alone knows it badly.
    """
    month = calendar_month(series[0]["time"]) - 1
    number = month_of(series[0]["time"]).astype(np.float64)
    states, scales, indices = [], [], []
    for one in series:
        fit = fit_anomaly(one.isel(time=used), detrend=detrend, standardise="month")
        square = fit.scale**2
        scale = np.sqrt((square + np.roll(square, 1) + np.roll(square, -1)) / 3.0)
        anomaly = one.values - fit.climatology[month] - fit.slope * (number - fit.centre)
        states.append(anomaly / scale[month])
        scales.append(scale)
        indices.append(anomaly)
    return Standardised(np.stack(states), indices[0], scales[0])


@dataclass(frozen=True)
class Issued:
    """Forecasts of one fit, in the units of the index.

    ``centre`` by forecaster, (lead, time of the start); ``spread`` by forecaster, (lead, calendar month of the target),
    one standard deviation; ``freedom``, the degrees of freedom of the spread; ``usual`` (calendar month, category), how
    often each category came in the months fitted on.
    """

    standard: Standardised
    centre: dict[str, Array]
    spread: dict[str, Array]
    freedom: float
    usual: Array


def issue(
    series: Sequence[xr.DataArray], used: Mask, volume: int | None, settings: HindcastSettings, *, detrend: bool
) -> Issued:
    """Fit everything on ``used`` months, learn the spread by leaving out parts of them in turn, and forecast."""
    month = calendar_month(series[0]["time"]) - 1
    standard, centre = fitted(series, used, volume, settings, detrend=detrend)
    departures = {name: np.full((settings.longest_lead, month.size), np.nan) for name in centre}
    started = by_target(np.broadcast_to(np.where(used, 0.0, np.nan), (settings.longest_lead, month.size)))
    for part in blocks(used, settings.spread_blocks, settings.longest_lead):
        inner, guesses = fitted(series, part.used, volume, settings, detrend=detrend)
        for name, guess in guesses.items():
            departure = by_target(guess) - inner.anomaly + started  # neither start nor target outside ``used``
            departures[name][:, part.held] = departure[:, part.held]
    spread = {name: spread_by_month(found, month) for name, found in departures.items()}
    usual = category_shares(standard.anomaly[used], month[used], settings.threshold)
    return Issued(standard, centre, spread, used.sum() / 12.0 - 1.0, usual)


def fitted(
    series: Sequence[xr.DataArray], used: Mask, volume: int | None, settings: HindcastSettings, *, detrend: bool
) -> tuple[Standardised, dict[str, Array]]:
    """Fit everything but the spread on ``used`` months; return anomalies and forecasts, (lead, time of the start).

    Forecasts are in the units of the index.
    """
    month = calendar_month(series[0]["time"]) - 1
    standard = standardised(series, used, detrend=detrend)
    tables = fit_all(Training(standard.state, month, used, standard.scale, volume), settings)
    aim = (month + np.arange(1, settings.longest_lead + 1)[:, None]) % 12
    return standard, {
        name: forecasts(table, standard.state, month) * standard.scale[aim] for name, table in tables.items()
    }


def spread_by_month(departures: Array, month: NDArray[np.int64]) -> Array:
    """Return the spread (lead, calendar month of the target) of departures (lead, time of the target).

    Half of the variance is that of all months, half that of the calendar month and its two neighbours: the season
    matters, but three months of a few decades know it badly (ours).
    """
    square = departures**2
    whole = np.nanmean(square, axis=1)
    own = np.stack([np.nanmean(square[:, _near(month, at)], axis=1) for at in range(12)], axis=1)
    return np.sqrt(0.5 * (own + whole[:, None]))


def _near(month: NDArray[np.int64], at: int) -> Mask:
    return np.isin(month, [(at - 1) % 12, at, (at + 1) % 12])


def category_shares(anomaly: Array, month: NDArray[np.int64], threshold: float) -> Array:
    """Return how often each category came, (calendar month, category), in the month and its two neighbours."""
    category = categories(anomaly, threshold)
    shares = []
    for at in range(12):
        counts = np.bincount(category[_near(month, at) & (category >= 0)], minlength=len(CATEGORIES))
        # One more of each: what has not come yet is not impossible (Laplace's rule of succession).
        shares.append((counts + 1.0) / (counts.sum() + len(CATEGORIES)))
    return np.array(shares)


def categories(anomaly: Array, threshold: float) -> NDArray[np.int64]:
    """Return 0 cold (at or below -threshold), 1 neutral, 2 warm (at or above threshold), -1 where there is no value."""
    number = 1 + (anomaly >= threshold).astype(np.int64) - (anomaly <= -threshold)
    return np.where(np.isfinite(anomaly), number, -1)


def category_probabilities(centre: Array, spread: Array, freedom: float, threshold: float) -> Array:
    """Return the probabilities of cold, neutral and warm on a new last axis, of Student's t about ``centre``."""
    cold = stdtr(freedom, (-threshold - centre) / spread)
    warm = stdtr(freedom, (centre - threshold) / spread)
    return np.stack([cold, 1.0 - cold - warm, warm], axis=-1)


def hindcast(
    index: xr.DataArray,
    predictors: Mapping[str, xr.DataArray],
    *,
    settings: HindcastSettings | None = None,
    detrend: bool = False,
) -> xr.Dataset:
    """Forecast every month of the record from 1 to ``longest_lead`` months before, without having fitted on its year.

    Parameters
    ----------
    index : xarray.DataArray
        What is forecast: a monthly series on ``time``, as :func:`profiles.precursor.monthly_series` returns it. Not an
        anomaly: the climatology is fitted inside each fold. NaN is left out.
    predictors : mapping of str to xarray.DataArray
        Monthly series by name: volume, western volume, tilt, wind. The index itself is always one. The one called
        ``volume`` also drives the recharge oscillator; without it there is none. Nothing in them may stem from later
        months: no centred running mean.
    settings : HindcastSettings, optional
        Leads, scheme, threshold and weights.
    detrend : bool
        Whether a straight line in time is fitted and taken off with the climatology, inside each fold.

    Returns
    -------
    xarray.Dataset
        On ``time``, the month forecast, the months that all series span. ``forecast`` (forecaster, lead, time), an
        anomaly in the units of the index, and its ``spread``, one standard deviation; ``probability`` (forecaster,
        lead, time, category); ``observed`` (time), the anomaly that came, from the climatology of the fold, and
        ``observed_category`` (0 cold, 1 neutral, 2 warm, -1 none). ``forecast_without`` (block, forecaster, lead,
        time) and ``observed_without`` (block, time) are the same when one more block of years is left out of all that
        is fitted: what the errors of the scores come from. NaN where the month lies less than the lead after the
        first, where the start lacks a value, and where, in an expanding window, too few years precede.

    Raises
    ------
    RequestError
        Where a predictor is called ``index``, or a series went through a centred running mean.
    DataError
        Where the series do not overlap, are constant, or leave too few years to fit on.
    """
    settings = settings or HindcastSettings()
    series = aligned(index, predictors)
    volume = place_of_volume(predictors)
    time = series[0]["time"]
    year = month_of(time).astype("datetime64[Y]").astype(np.int64)
    parts = _usable_folds(folds(year, settings.longest_lead, settings.scheme), series, settings)
    block = year_blocks(year, settings.block_years)
    tables = _Tables.empty(_names(volume), settings.longest_lead, time.size, int(block.max()) + 1)
    for part in parts:
        tables.fill(part.held, issue(series, part.used, volume, settings, detrend=detrend), series[0], settings)
        for left_out in np.setdiff1d(block, block[part.held]):
            used = part.used & (block != left_out)
            if used.sum() >= 12 * LEAST_REFITTED:
                refitted = fitted(series, used, volume, settings, detrend=detrend)
                tables.fill_without(int(left_out), part.held, *refitted)
    return tables.labelled(series[0], predictors, settings)


def effective_months(index: xr.DataArray) -> float:
    """Return how many independent months an index is worth where it is correlated with another series of its memory.

    N / (1 + 2 sum over lags k of (1 - k/N) r_k^2) (Bartlett 1946, J. R. Stat. Soc. Suppl. 8, 27-41), r the
    autocorrelation, about the means of the calendar months, of the autoregression that the record supports.
    """
    month = calendar_month(index["time"])
    season = np.array([np.nanmean(index.values[month == one]) if (month == one).any() else 0.0 for one in range(1, 13)])
    count = int(np.isfinite(index.values).sum())
    memory = autocorrelation_of(fit_reflection(index.values - season[month - 1]), count - 1)[1:]
    return float(count / (1.0 + 2.0 * ((1.0 - np.arange(1, count) / count) * memory**2).sum()))


def aligned(index: xr.DataArray, predictors: Mapping[str, xr.DataArray]) -> tuple[xr.DataArray, ...]:
    """Return index and predictors over their common months; raise where one cannot be used."""
    if "index" in predictors:
        raise RequestError(
            "the index is a predictor already", where="predictors", advice="leave it out, or call yours another name"
        )
    for name, one in {"index": index, **predictors}.items():
        check_varies(one, name)
        if "centred" in str(one.attrs.get("running_mean", "")):
            raise RequestError(
                "a centred running mean knows the future",
                where=name,
                expected="monthly values, or a trailing mean",
                found=str(one.attrs["running_mean"]),
            )
    return overlap(index, *predictors.values())


def place_of_volume(predictors: Mapping[str, xr.DataArray]) -> int | None:
    """Return the place of the volume among the variables, the index first."""
    return list(predictors).index(VOLUME) + 1 if VOLUME in predictors else None


def _names(volume: int | None) -> list[str]:
    names = ["climatology", "persistence", "damped_persistence", "regression"]
    return names if volume is None else [*names, "recharge", "combined"]


def _usable_folds(parts: list[Fold], series: Sequence[xr.DataArray], settings: HindcastSettings) -> list[Fold]:
    whole = np.all([np.isfinite(one.values) for one in series], axis=0)
    # Longer leads leave less of the training months when parts of them are left out in turn.
    least = 12 * settings.least_training_years + 2 * max(settings.longest_lead - 12, 0)
    enough = [part for part in parts if (part.used & whole).sum() >= least]
    if enough and (settings.scheme == "expanding" or len(enough) == len(parts)):
        return enough
    most = max(int((part.used & whole).sum()) for part in parts)
    effective = effective_months(series[0])
    found = f"{whole.size} months, {int(whole.sum())} with a value in every series, {effective:.0f} effective"
    raise DataError(
        "the record is too short for a hindcast",
        expected=f"{least} months or more to fit on, without the year that is forecast "
        f"and the {settings.longest_lead} months on either side",
        found=f"{found}; at most {most} to fit on",
        advice="bring a longer record, or ask for shorter leads",
    )


@dataclass(frozen=True)
class _Tables:
    """The arrays of a hindcast while it is filled, fold by fold."""

    names: list[str]
    forecast: Array
    spread: Array
    probability: Array
    observed: Array
    forecast_without: NDArray[np.float32]
    observed_without: Array

    @classmethod
    def empty(cls, names: list[str], leads: int, times: int, blocks: int) -> _Tables:
        shape = (len(names), leads, times)
        return cls(
            names,
            np.full(shape, np.nan),
            np.full(shape, np.nan),
            np.full((*shape, len(CATEGORIES)), np.nan),
            np.full(times, np.nan),
            np.full((blocks, *shape), np.nan, dtype=np.float32),
            np.full((blocks, times), np.nan),
        )

    def fill_without(self, block: int, held: Mask, standard: Standardised, centre: Mapping[str, Array]) -> None:
        self.observed_without[block, held] = standard.anomaly[held]
        for place, name in enumerate(self.names):
            self.forecast_without[block, place][:, held] = by_target(centre[name])[:, held]

    def fill(self, held: Mask, issued: Issued, index: xr.DataArray, settings: HindcastSettings) -> None:
        month = calendar_month(index["time"])[held] - 1
        self.observed[held] = issued.standard.anomaly[held]
        for place, name in enumerate(self.names):
            centre = by_target(issued.centre[name])[:, held]
            spread = np.where(np.isfinite(centre), issued.spread[name][:, month], np.nan)
            probability = category_probabilities(centre, spread, issued.freedom, settings.threshold)
            if name == "climatology":
                probability = np.where(np.isfinite(centre)[..., None], issued.usual[month], np.nan)
            self.forecast[place][:, held] = centre
            self.spread[place][:, held] = spread
            self.probability[place][:, held] = probability

    def labelled(
        self, index: xr.DataArray, predictors: Mapping[str, xr.DataArray], settings: HindcastSettings
    ) -> xr.Dataset:
        units = {"units": str(index.attrs.get("units", "1"))}
        dims = ("forecaster", "lead", "time")
        category = categories(self.observed, settings.threshold).astype(np.int8)
        flags = {"flag_values": np.arange(-1, 3, dtype=np.int8), "flag_meanings": " ".join(["none", *CATEGORIES])}
        dataset = xr.Dataset(
            {
                "forecast": (dims, self.forecast, units | {"long_name": "forecast anomaly of the index"}),
                "spread": (dims, self.spread, units | {"long_name": "standard deviation of the forecast"}),
                "probability": ((*dims, "category"), self.probability, {"units": "1", "long_name": "probability"}),
                "observed": ("time", self.observed, units | {"long_name": "anomaly of the index that came"}),
                "forecast_without": (
                    ("block", *dims),
                    self.forecast_without,
                    units | {"long_name": "forecast when a block of years is left out besides"},
                ),
                "observed_without": (
                    ("block", "time"),
                    self.observed_without,
                    units | {"long_name": "anomaly that came, from the climatology without a block of years"},
                ),
                "observed_category": ("time", category, flags | {"long_name": "category that came"}),
            },
            coords={
                "forecaster": self.names,
                "lead": ("lead", np.arange(1, settings.longest_lead + 1), {"units": "month"}),
                "time": index["time"],
                "category": list(CATEGORIES),
                "block": ("block", np.arange(len(self.observed_without)), {"long_name": "block of years left out"}),
            },
        )
        return dataset.assign_attrs(
            scheme=settings.scheme,
            threshold=settings.threshold,
            predictors=" ".join(["index", *predictors]),
            index=str(index.name),
            block_years=settings.block_years,
        )
