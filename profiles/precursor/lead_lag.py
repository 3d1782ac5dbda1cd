"""How a predictor and a target hang together at each lead, and how much of it chance would give."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
import xarray as xr
from numpy.typing import ArrayLike, NDArray

from profiles.config import LeadLagSettings
from profiles.errors import DataError, RequestError
from profiles.precursor.field_significance import FieldSignificance, field_significance, simulated_pairs
from profiles.precursor.memory import Memory, fit_memory
from profiles.precursor.peak import Peak, peak
from profiles.precursor.series import calendar_month, check_varies, middle_of, month_of, monthly_series, overlap
from profiles.precursor.shifting import shifted
from profiles.precursor.sign_split import split_regression
from profiles.statistics import (
    PairedStatistics,
    block_length,
    block_weights,
    paired_statistics,
    weighted_correlation,
)
from profiles.vocabulary import describe

Array = NDArray[np.float64]

LEADS = tuple(range(-24, 25))


def lead_lag(
    predictor: xr.DataArray,
    target: xr.DataArray,
    leads: Sequence[int] | ArrayLike = LEADS,
    *,
    settings: LeadLagSettings | None = None,
) -> xr.Dataset:
    """Correlate and regress a target on a predictor at each lead.

    Parameters
    ----------
    predictor, target : xarray.DataArray
        Monthly series of anomalies on ``time`` (see :func:`profiles.precursor.anomalies`); any day of a month stands
        for it. The months that both span are used; NaN between them is missing.
    leads : sequence of int
        Months. At a positive lead the predictor comes first: the target is that many months later. One that leaves
        fewer than three pairs is NaN.
    settings : LeadLagSettings, optional
        Default: the defaults.

    Returns
    -------
    xarray.Dataset
        On ``lead``: ``correlation``, with ``correlation_lower`` and ``_upper`` (Fisher's z with the effective size);
        ``regression_slope`` in units of the target per unit of the predictor, and ``regression_slope_error`` (standard
        error); ``pair_count`` and ``effective_size``; ``deciding_p_value`` and ``significant``, of the t-test with the
        effective size, which decides; ``bootstrap_p_value``, ``bootstrap_lower`` and ``bootstrap_upper``, shown beside
        it.

        On (``starting_month``, ``lead``), the calendar month of the predictor: the same with ``_by_month``, NaN where
        there are fewer years than asked for. On (``sign``, ``lead``): ``regression_slope_by_sign`` with its error, of
        positive and negative anomalies of the predictor apart. On (``window``, ``lead``): ``correlation_in_window`` and
        so on, with ``peak_lead_in_window`` and its interval on ``window``; absent where the record is shorter than a
        window.

        Scalars: ``peak_lead`` with ``peak_lead_lower`` and ``_upper`` and ``peak_correlation``, the strongest
        correlation of either sign; the same as ``precursor_lead`` and so on over positive leads alone, NaN where there
        is none; ``field_p_value``, the probability that independent series with the same memory are anywhere as
        significant, ``significant_count`` and ``field_p_value_of_count``; these with ``_by_month``.

    Raises
    ------
    RequestError
        Where the leads are not whole numbers in ascending order.
    DataError
        Where the series do not overlap, are no monthly series, are constant, or too short: the message says how many
        effective months there are.

    Notes
    -----
    See :func:`profiles.statistics.paired_statistics` for the test and its sources, and
    :func:`profiles.precursor.memory.fit_memory` for what it knows of the series. Its false-alarm rates are printed by
    ``tests/bench/false_alarm.py``. Draws come from a stated seed: the same series give the same numbers.
    """
    settings = settings or LeadLagSettings()
    work = _Work.of(predictor, target, _checked_leads(leads), settings)
    overall = work.statistics()
    _check_length(work, overall)
    parts = [_overall(work, overall), _by_month(work), _by_sign(work), _in_windows(work)]
    result = xr.merge(parts, combine_attrs="drop_conflicts", join="exact", compat="no_conflicts")
    return describe(result.assign_attrs(_stated(work)), **_units(predictor, target))


@dataclass(frozen=True)
class _Work:
    """The two series over the months that both span, their models, and what is drawn."""

    predictor: xr.DataArray
    target: xr.DataArray
    leads: NDArray[np.int64]
    settings: LeadLagSettings
    memories: tuple[Memory, Memory]
    ahead: Array

    @classmethod
    def of(
        cls, predictor: xr.DataArray, target: xr.DataArray, leads: NDArray[np.int64], settings: LeadLagSettings
    ) -> _Work:
        pair = [
            monthly_series(series, name=str(series.name or role), where=f"{role} {series.name or ''}".strip())
            for role, series in (("predictor", predictor), ("target", target))
        ]
        first, second = overlap(*pair)
        for role, series in (("predictor", first), ("target", second)):
            check_varies(series, f"{role} {series.name}")
        one, other = (fit_memory(series.values, calendar_month(series["time"])) for series in (first, second))
        return cls(first, second, leads, settings, (one, other), shifted(second.values, leads))

    def statistics(self, inside: slice = slice(None)) -> PairedStatistics:
        """Return the statistics of each lead over a part of the record; both of a pair lie in it."""
        one, other = self.memories
        return paired_statistics(
            self.predictor.values[inside],
            shifted(self.target.values[inside], self.leads),
            one.autocorrelation,
            other.autocorrelation,
            first_scale=one.scale[inside],
            second_scale=shifted(other.scale[inside], self.leads),
        )

    def generator(self, stream: int) -> np.random.Generator:
        """Return random numbers of their own for each use."""
        return np.random.default_rng([self.settings.seed, stream])

    @property
    def months(self) -> NDArray[np.int64]:
        """Calendar month of each time of the predictor."""
        return calendar_month(self.predictor["time"])


def _checked_leads(leads: Sequence[int] | ArrayLike) -> NDArray[np.int64]:
    given = np.asarray(leads)
    whole = given.ndim == 1 and given.size > 0 and np.issubdtype(given.dtype, np.integer)
    if not whole or (np.diff(given) <= 0).any():
        raise RequestError(
            "not a list of leads", where="leads", expected="whole months, ascending, each once", found=f"{leads!r:.80}"
        )
    return given.astype(np.int64)


def _check_length(work: _Work, overall: PairedStatistics) -> None:
    """Raise DataError where no lead has enough effective months."""
    effective = float(np.nan_to_num(overall.effective_size).max())
    settings = work.settings
    if effective >= settings.least_effective and work.predictor.size >= settings.least_months:
        return
    months = month_of(work.predictor["time"])
    raise DataError(
        "the series are too short for a correlation at any lead",
        where=f"{work.predictor.name} and {work.target.name}",
        expected=f"{settings.least_effective:g} or more effective months, of {settings.least_months} or more",
        found=f"{effective:.1f} effective of {int(overall.count.max())} months with both values, "
        f"{months[0]} to {months[-1]}",
        advice="take a longer record; months that resemble their neighbours count for little",
    )


def _overall(work: _Work, overall: PairedStatistics) -> xr.Dataset:
    """Return what stands on ``lead``, the peak and the field significance."""
    settings = work.settings
    result = _labelled(overall, ("lead",), "", settings)
    resampled = _resampled(work, work.ahead, overall, 0)
    result = result.assign(_bootstrap_variables(resampled, settings.level))
    found = peak(overall.correlation, resampled, work.leads, settings.level)
    one, other = _independent_pairs(work)
    simulated = np.stack([_plain_correlation(one, shifted(other, [lead])[:, 0]) for lead in work.leads], axis=-1)
    field = field_significance(overall.correlation, simulated, overall.effective_size, 1.0 - settings.level)
    result = result.assign(_peak_variables(found, "peak") | _field_variables(field, ""))
    ahead = work.leads > 0
    first = peak(overall.correlation[ahead], resampled[:, ahead], work.leads[ahead], settings.level)
    return result.assign(_peak_variables(first, "precursor")).assign_coords(lead=work.leads)


def _bootstrap_variables(resampled: Array, level: float) -> dict[str, Any]:
    """Return interval and p-value of each lead; NaN where there was nothing to resample."""
    known = np.isfinite(resampled).all(axis=0)
    values = np.where(known, resampled, 0.0)
    tail = 50.0 * (1.0 - level)
    lower, upper = np.percentile(values, [tail, 100.0 - tail], axis=0)
    opposite = np.minimum((values <= 0.0).sum(axis=0), (values >= 0.0).sum(axis=0))
    p_value = np.minimum(2.0 * (1 + opposite) / (1 + len(resampled)), 1.0)
    named = {"bootstrap_lower": lower, "bootstrap_upper": upper, "bootstrap_p_value": p_value}
    return {name: ("lead", np.where(known, ends, np.nan)) for name, ends in named.items()}


def _resampled(work: _Work, ahead: Array, statistics: PairedStatistics, stream: int, first: int = 0) -> Array:
    """Return the correlations of resampled records, (draw, lead); all leads of a draw from the same months."""
    predictor = work.predictor.values[first : first + ahead.shape[-1]]
    at = int(np.nanargmax(np.abs(statistics.correlation)))
    length = block_length(float(statistics.count[at]), float(statistics.effective_size[at]))
    weights = block_weights(ahead.shape[-1], length, work.settings.draws, work.generator(stream))
    return weighted_correlation(weights, np.broadcast_to(predictor[:, None], ahead.T.shape), ahead.T)


def _independent_pairs(work: _Work) -> tuple[Array, Array]:
    """Return pairs of independent series with the memory of the record, missing where the record is."""
    first, second = (memory.reflection for memory in work.memories)
    pair = simulated_pairs(first, second, work.predictor.size, work.settings.draws, work.generator(1))
    one, other = (
        np.where(np.isfinite(series.values), values * memory.scale, np.nan)
        for values, memory, series in zip(pair, work.memories, (work.predictor, work.target), strict=True)
    )
    return one, other


def _plain_correlation(first: Array, second: Array) -> Array:
    """Return the correlation along the last axis over the pairs that are there."""
    both = np.isfinite(first) & np.isfinite(second)
    count = np.maximum(both.sum(axis=-1, keepdims=True), 1)
    x, y = (np.where(both, values, 0.0) for values in (first, second))
    x, y = (np.where(both, values - values.sum(axis=-1, keepdims=True) / count, 0.0) for values in (x, y))
    size = (x**2).sum(axis=-1) * (y**2).sum(axis=-1)
    return (x * y).sum(axis=-1) / np.sqrt(np.where(size > 0.0, size, np.nan))


def _by_month(work: _Work) -> xr.Dataset:
    """Return what stands on (starting_month, lead): pairs a year apart, with the memory at lags of whole years."""
    # Within a calendar month the spread of either is constant.
    yearly = [memory.autocorrelation[::12] for memory in work.memories]
    one, other = _independent_pairs(work)
    statistics, simulated = [], []
    for month in range(1, 13):
        chosen = slice((month - int(work.months[0])) % 12, None, 12)
        statistics.append(paired_statistics(work.predictor.values[chosen], work.ahead[:, chosen], *yearly))
        simulated.append(
            np.stack(
                [_plain_correlation(one[:, chosen], shifted(other, [lead])[:, 0, chosen]) for lead in work.leads],
                axis=-1,
            )
        )
    joined = _stacked(statistics, work.settings.least_years)
    field = field_significance(
        joined.correlation, np.stack(simulated, axis=1), joined.effective_size, 1.0 - work.settings.level
    )
    result = _labelled(joined, ("starting_month", "lead"), "_by_month", work.settings)
    return result.assign(_field_variables(field, "_by_month")).assign_coords(
        lead=work.leads, starting_month=np.arange(1, 13)
    )


def _stacked(statistics: Sequence[PairedStatistics], least: int) -> PairedStatistics:
    """Put statistics below one another; what rests on fewer than so many pairs is NaN, the count aside."""
    fields = {name: np.stack([getattr(one, name) for one in statistics]) for name in vars(statistics[0])}
    enough = fields["count"] >= least
    return PairedStatistics(
        **{name: values if name == "count" else np.where(enough, values, np.nan) for name, values in fields.items()}
    )


def _by_sign(work: _Work) -> xr.Dataset:
    centred = work.predictor.values - np.nanmean(work.predictor.values)
    slopes, errors = split_regression(centred, work.ahead, work.months)
    names = {"regression_slope_by_sign": slopes, "regression_slope_error_by_sign": errors}
    return xr.Dataset(
        {name: (("sign", "lead"), values) for name, values in names.items()},
        coords={"sign": ["positive", "negative"], "lead": work.leads},
    )


def _in_windows(work: _Work) -> xr.Dataset:
    """Return what stands on (window, lead), nothing where the record is shorter than a window."""
    length, step = work.settings.window_months, work.settings.window_step
    starts = range(0, work.predictor.size - length + 1, step)
    if not starts:
        return xr.Dataset(coords={"lead": work.leads})
    statistics, peaks = [], []
    for number, first in enumerate(starts):
        inside = slice(first, first + length)
        ahead = shifted(work.target.values[inside], work.leads)
        found = work.statistics(inside)
        statistics.append(found)
        resampled = _resampled(work, ahead, found, 2 + number, first)
        peaks.append(peak(found.correlation, resampled, work.leads, work.settings.level))
    months = month_of(work.predictor["time"])
    result = _labelled(_stacked(statistics, 3), ("window", "lead"), "_in_window", work.settings)
    for name, attribute in (("", "lead"), ("_lower", "lower"), ("_upper", "upper")):
        result[f"peak_lead{name}_in_window"] = ("window", [getattr(one, attribute) for one in peaks])
    return result.assign_coords(
        lead=work.leads,
        window=middle_of(months[[first + length // 2 for first in starts]]),
        window_first=("window", middle_of(months[list(starts)])),
        window_last=("window", middle_of(months[[first + length - 1 for first in starts]])),
    )


def _labelled(
    statistics: PairedStatistics, dims: tuple[str, ...], suffix: str, settings: LeadLagSettings
) -> xr.Dataset:
    lower, upper = statistics.interval(settings.level)
    values = {
        "correlation": statistics.correlation,
        "correlation_lower": lower,
        "correlation_upper": upper,
        "regression_slope": statistics.slope,
        "regression_slope_error": statistics.slope_error,
        "pair_count": statistics.count.astype(np.int32),
        "effective_size": statistics.effective_size,
        "deciding_p_value": statistics.p_value,
        "significant": (statistics.p_value <= 1.0 - settings.level).astype(np.int8),
    }
    return xr.Dataset({f"{name}{suffix}": (dims, data) for name, data in values.items()})


def _peak_variables(found: Peak, name: str) -> dict[str, Any]:
    return {
        f"{name}_lead": found.lead,
        f"{name}_lead_lower": found.lower,
        f"{name}_lead_upper": found.upper,
        f"{name}_correlation": found.correlation,
    }


def _field_variables(field: FieldSignificance, suffix: str) -> dict[str, Any]:
    return {
        f"field_p_value{suffix}": field.p_value,
        f"significant_count{suffix}": np.int32(field.significant),
        f"field_p_value_of_count{suffix}": field.p_value_of_count,
    }


def _stated(work: _Work) -> dict[str, Any]:
    months = month_of(work.predictor["time"])
    return {
        "predictor": str(work.predictor.name),
        "target": str(work.target.name),
        "months": f"{months[0]} to {months[-1]}",
        "level": work.settings.level,
        "draws": work.settings.draws,
        "seed": work.settings.seed,
        "lead": "months; at a positive lead the predictor comes first",
        "decides": "the t-test with the effective size; the block bootstrap is shown beside it",
    }


def _units(predictor: xr.DataArray, target: xr.DataArray) -> Mapping[str, Mapping[str, Any]]:
    units = {"units": f"{target.attrs.get('units', '1')} / ({predictor.attrs.get('units', '1')})"}
    ends = (
        "",
        "_error",
        "_by_month",
        "_error_by_month",
        "_by_sign",
        "_error_by_sign",
        "_in_window",
        "_error_in_window",
    )
    return {f"regression_slope{end}": units for end in ends}
