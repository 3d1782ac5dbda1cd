"""Scores of a model's series against the array's: each with a 95 % interval."""

from __future__ import annotations

from dataclasses import dataclass, fields

import numpy as np
from numpy.typing import NDArray
from scipy import special  # scipy.stats would take 40 MB in every worker

from profiles.statistics import effective_count, harmonic_design, lag_one, year_fraction

Floats = NDArray[np.float64]

QUANTILE = 1.96  # a 95 % interval of a normal error
_TAIL = 0.025
_YEAR = 12  # months, at least, of a seasonal cycle
_DAYS = 365.25

Interval = tuple[float, float]


@dataclass(frozen=True)
class Scores:
    """What one pair of series scores; NaN where it cannot be said.

    ``bias`` is the mean of model less array over the months that both have. Where the array's errors are stated its
    interval is that of the observation: the true mean difference of these months lies in it. ``bias_sampling_error`` is
    the standard error of the bias as an estimate of that of other years. The other intervals are of sampling, with the
    effective number of values ``effective_count``.
    """

    months: float
    effective_count: float
    bias: float
    bias_low: float
    bias_high: float
    bias_sampling_error: float
    centred_rms: float
    centred_rms_low: float
    centred_rms_high: float
    correlation: float
    correlation_low: float
    correlation_high: float
    array_sd: float
    model_sd: float
    sd_ratio: float
    sd_ratio_low: float
    sd_ratio_high: float
    array_annual_amplitude: float
    model_annual_amplitude: float
    annual_amplitude_difference: float
    annual_amplitude_difference_low: float
    annual_amplitude_difference_high: float
    annual_phase_difference: float
    annual_phase_difference_low: float
    annual_phase_difference_high: float


NAMES = tuple(field.name for field in fields(Scores))


def score(
    time: NDArray[np.datetime64], model: Floats, array: Floats, *, bias_error: float, least_months: int
) -> Scores:
    """Score a model's monthly series against the array's.

    Parameters
    ----------
    time : ndarray of datetime64, shape (month,)
        Every month, in order.
    model, array : ndarray, shape (month,)
        NaN where either is missing; only months that both have count.
    bias_error : float
        Standard error of the mean of the array's months from its measurement; NaN where it states none, and the bias
        gets its interval from sampling.
    least_months : int
        Fewer months are not scored.
    """
    both = np.isfinite(model) & np.isfinite(array)
    count = int(both.sum())
    if count < least_months:
        return Scores(float(count), *[np.nan] * (len(NAMES) - 1))
    ours, theirs = np.where(both, model, np.nan), np.where(both, array, np.nan)
    difference = ours - theirs
    bias = float(np.nanmean(difference))
    sampling = _sampling_error(difference)
    half = QUANTILE * bias_error if np.isfinite(bias_error) else sampling[1]
    effective = effective_count(count, lag_one(ours) * lag_one(theirs))
    sds = float(np.nanstd(theirs)), float(np.nanstd(ours))
    rms, correlation = float(np.nanstd(difference)), _correlation(ours[both], theirs[both])
    return Scores(
        float(count),
        effective,
        bias,
        bias - half,
        bias + half,
        sampling[0],
        rms,
        *_rms_interval(rms, effective_count(count, lag_one(difference) ** 2)),
        correlation,
        *_correlation_interval(correlation, effective),
        *sds,
        sds[1] / sds[0] if sds[0] > 0.0 else np.nan,
        *_ratio_interval(sds, correlation, effective),
        *_seasons(time[both], ours[both], theirs[both]),
    )


def _sampling_error(difference: Floats) -> Interval:
    """Return the standard error of the mean, and the half-width of its 95 % interval (Student's t)."""
    count = int(np.isfinite(difference).sum())
    effective = effective_count(count, lag_one(difference))
    if effective <= 2.0:
        return np.nan, np.nan
    error = float(np.nanstd(difference, ddof=1) / np.sqrt(effective))
    return error, float(special.stdtrit(effective - 1.0, 1.0 - _TAIL) * error)


def _correlation(model: Floats, array: Floats) -> float:
    if min(model.std(), array.std()) == 0.0:
        return np.nan
    return float(np.corrcoef(model, array)[0, 1])


def _correlation_interval(correlation: float, effective: float) -> Interval:
    """Fisher's z with the effective number of values."""
    if not effective > 3.0 or not np.isfinite(correlation):
        return np.nan, np.nan
    if abs(correlation) >= 1.0:
        return correlation, correlation
    centre, half = np.arctanh(correlation), QUANTILE / np.sqrt(effective - 3.0)
    return float(np.tanh(centre - half)), float(np.tanh(centre + half))


def _rms_interval(rms: float, effective: float) -> Interval:
    """Chi-square of the variance of the difference with the effective number of values."""
    if effective <= 2.0:  # fewer tell nothing, and the upper end runs to infinity
        return np.nan, np.nan
    freedom = effective - 1.0
    low, high = (float(rms * np.sqrt(freedom / special.chdtri(freedom, 1.0 - tail))) for tail in (1.0 - _TAIL, _TAIL))
    return low, high


def _ratio_interval(sds: tuple[float, float], correlation: float, effective: float) -> Interval:
    """Normal log of the ratio; var = (1 - r^2) / (n - 1), by expansion about two correlated variances."""
    if not (sds[0] > 0.0 and effective > 2.0 and np.isfinite(correlation)):
        return np.nan, np.nan
    ratio, half = sds[1] / sds[0], QUANTILE * np.sqrt(max(1.0 - correlation**2, 0.0) / (effective - 1.0))
    return float(ratio * np.exp(-half)), float(ratio * np.exp(half))


def _seasons(time: NDArray[np.datetime64], model: Floats, array: Floats) -> tuple[float, ...]:
    """Return the annual amplitudes, and the differences of amplitude and phase (days, positive where the model is
    late, within half a year) with their intervals, from least squares with residuals that persist."""
    if time.size < _YEAR:
        return (np.nan,) * 8
    design = harmonic_design(year_fraction(time))
    inverse = np.linalg.pinv(design)
    coefficients = inverse @ np.stack([array, model], axis=-1)
    vectors = coefficients[1] + 1j * coefficients[2]
    amplitudes = np.abs(vectors)
    difference = model - array
    residual = difference - design @ (inverse @ difference)
    freedom = time.size - design.shape[1]
    if freedom <= 0:
        return (*amplitudes.tolist(), float(amplitudes[1] - amplitudes[0]), *[np.nan] * 5)
    sd = residual.std() * np.sqrt(time.size / freedom * _at_annual_frequency(lag_one(residual)))
    error = float(sd * np.sqrt(0.5 * ((inverse[1] ** 2).sum() + (inverse[2] ** 2).sum())))
    change = float(amplitudes[1] - amplitudes[0])
    late = float(np.angle(vectors[1] / vectors[0]) * _DAYS / (2.0 * np.pi)) if amplitudes.min() > 0.0 else np.nan
    half_phase = QUANTILE * error / amplitudes.min() * _DAYS / (2.0 * np.pi) if amplitudes.min() > 0.0 else np.nan
    half = QUANTILE * error
    return (*amplitudes.tolist(), change, change - half, change + half, late, late - half_phase, late + half_phase)


def _at_annual_frequency(lag: float) -> float:
    """Return the spectrum of first-order persistence at a period of twelve months, over that of white noise."""
    return float((1.0 - lag**2) / (1.0 - 2.0 * lag * np.cos(2.0 * np.pi / _YEAR) + lag**2))
