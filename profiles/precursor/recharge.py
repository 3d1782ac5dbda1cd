"""A two-variable recharge oscillator fitted to a record: period, damping and their errors.

The state z = (T, h), index and volume, both as anomalies over their standard deviation, follows dz/dt = A z + noise
(Jin 1997, J. Atmos. Sci. 54, 811-829, in its linear form; with noise as in Burgers et al. 2005). Sampled every month
it is exactly z(t + 1) = M z(t) + e with M = exp(A), so M is fitted by least squares and A is its matrix logarithm:
no derivative is approximated by a difference.

Least squares on a short record draws M towards damping. The part of it that the length of the record makes is taken
off (Pope 1990, J. Time Ser. Anal. 11, 249-258, for any number of variables); intervals come from records simulated
with the corrected fit and treated alike. Errors of measurement, and weather in the monthly means, damp the fit as well,
which no formula here takes off; that a month's value is a mean does the opposite. Both count once in every ``step``
months: fitted over six months at a time, M keeps most of what it is worth and loses most of that.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import xarray as xr
from numpy.typing import NDArray
from scipy.linalg import expm, logm

from profiles.errors import DataError, RequestError
from profiles.precursor.anomaly import Base, anomalies
from profiles.precursor.series import check_varies, overlap

Array = NDArray[np.float64]

STEP = 6  # months: as good as 1 where values are exact, and much better where they are means or noisy (ours)
REPLICATES = 400  # simulated records behind an interval: its ends are known to some 7 % of its half-width (ours)
LEAST_PAIRS = 60  # pairs of months below which no oscillator is fitted: five years (ours)
_STABLE = 0.999  # the correction never takes an eigenvalue of M beyond this (Kilian 1998, Rev. Econ. Stat. 80, 218-230)
_INTERVAL = (2.5, 97.5)  # percentiles


@dataclass(frozen=True)
class Propagator:
    """``matrix`` (2, 2) of z(t + step) = matrix z(t) + e; ``noise`` (2, 2), covariance of e; ``pairs`` fitted on."""

    matrix: Array
    noise: Array
    pairs: int


def fit_propagator(
    state: Array, *, step: int = 1, used: NDArray[np.bool_] | None = None, least: int = LEAST_PAIRS
) -> Propagator:
    """Fit z(t + step) = M z(t) + e by least squares; pairs that lack a value are left out.

    Parameters
    ----------
    state : ndarray, shape (variable, time)
        Monthly anomalies about 0; the mean of the pairs is taken off once more.
    step : int
        Months.
    used : ndarray of bool, shape (time,), optional
        Months that may be looked at. Default: all.
    least : int
        Pairs without which nothing is fitted.

    Raises
    ------
    DataError
        Where fewer pairs than that are left.
    """
    known: NDArray[np.bool_] = np.asarray(np.isfinite(state).all(axis=0))
    if used is not None:
        known = known & used
    first = np.flatnonzero(known[:-step] & known[step:])
    if first.size < least:
        raise DataError(
            "too few months for a recharge oscillator",
            expected=f"{least} or more pairs of months {step} apart that have both index and volume",
            found=str(first.size),
        )
    before, after = _centred(state[:, first]), _centred(state[:, first + step])
    matrix = np.asarray(np.linalg.solve(before @ before.T, before @ after.T).T, dtype=np.float64)
    rest = after - matrix @ before
    return Propagator(matrix, rest @ rest.T / (first.size - state.shape[0] - 1), int(first.size))


def _centred(values: Array) -> Array:
    return values - values.mean(axis=-1, keepdims=True)


def stationary_covariance(matrix: Array, noise: Array) -> Array:
    """Return the covariance C of the state that solves C = M C M' + Q; any leading dims."""
    size = matrix.shape[-1]
    doubled = np.einsum("...ij,...kl->...ikjl", matrix, matrix).reshape(*matrix.shape[:-2], size**2, size**2)
    flat = np.linalg.solve(np.eye(size**2) - doubled, noise.reshape(*noise.shape[:-2], size**2, 1))
    return np.asarray(flat.reshape(noise.shape))


def real_power(matrix: Array, power: float) -> Array:
    """Return the real part of M to a power, of a diagonalisable M.

    For complex eigenvalues, and positive ones, it is real already; what a negative eigenvalue, a state that turns over
    within one step, lasts for is noise.
    """
    roots, axes = np.linalg.eig(matrix.astype(np.complex128))
    return np.real((axes * roots**power) @ np.linalg.inv(axes))


def small_sample_bias(matrix: Array, noise: Array, samples: float) -> Array:
    """Return the expected error of the least-squares M, to the first order in 1/samples; any leading dims.

    Pope (1990), after Nicholls and Pope (1988): bias = -(1/n) Q [(I - M')^-1 + M' (I - M'M')^-1 +
    sum over eigenvalues l of l (I - l M')^-1] C^-1, C the covariance of the state. For one variable it is the
    -(1 + 3 phi)/n of Kendall (1954).
    """
    identity = np.eye(matrix.shape[-1])
    turned = np.swapaxes(matrix, -1, -2)
    roots = np.linalg.eigvals(matrix).astype(np.complex128)[..., None, None]
    each = roots * np.linalg.inv(identity - roots * turned[..., None, :, :])
    inner = np.linalg.inv(identity - turned) + turned @ np.linalg.inv(identity - turned @ turned)
    whole = inner + each.sum(axis=-3).real
    return np.asarray(-noise @ whole @ np.linalg.inv(stationary_covariance(matrix, noise)) / samples)


def corrected(matrix: Array, noise: Array, samples: float) -> Array:
    """Return M less its small-sample bias, as much of it as leaves every eigenvalue below 0.999; any leading dims."""
    radius = np.abs(np.linalg.eigvals(matrix)).max(axis=-1)
    shrunk = matrix * np.minimum(1.0, _STABLE / radius)[..., None, None]
    bias = small_sample_bias(shrunk, noise, samples)
    better = shrunk - bias
    for share in np.linspace(0.95, 0.0, 20):
        wild = np.abs(np.linalg.eigvals(better)).max(axis=-1) > _STABLE
        if not wild.any():
            break
        better = np.where(wild[..., None, None], shrunk - share * bias, better)
    return np.asarray(better)


def decay_and_frequency(matrix: Array, step: int = 1) -> tuple[Array, Array]:
    """Return decay rate and angular frequency, per month, of the oscillation of M; any leading dims.

    For a pair of complex eigenvalues exp((-decay +- i frequency) step). For real ones the frequency is 0 and the decay
    is that of the slower; negative ones, which no continuous oscillator has at a step this short, count by their size.
    """
    roots = np.linalg.eigvals(matrix).astype(np.complex128)
    size = np.abs(roots).max(axis=-1)
    turning = np.abs(roots.imag).max(axis=-1) > 0.0
    angle = np.where(turning, np.abs(np.angle(roots)).max(axis=-1), 0.0)
    with np.errstate(divide="ignore"):
        decay = -np.log(size) / step
    return np.asarray(decay), np.asarray(angle / step)


def simulate(matrix: Array, noise: Array, months: int, records: int, random: np.random.Generator) -> Array:
    """Draw stationary records of z(t + 1) = M z(t) + e, shape (record, variable, month)."""
    size = matrix.shape[0]
    shocks = np.linalg.cholesky(noise) @ random.standard_normal((months, size, records))
    states = np.empty((months, size, records))
    start = np.linalg.cholesky(stationary_covariance(matrix, noise))
    states[0] = start @ random.standard_normal((size, records))
    for month in range(1, months):
        states[month] = matrix @ states[month - 1] + shocks[month]
    return np.ascontiguousarray(np.moveaxis(states, -1, 0).swapaxes(1, 2))


@dataclass(frozen=True)
class RechargeFit:
    """What a fit found; times in months, intervals of 95 %.

    Attributes
    ----------
    rates : ndarray, shape (2, 2)
        A, per month, in the units of the state; corrected. NaN where M has no real logarithm.
    propagator : Propagator
        As least squares gave it.
    corrected : ndarray, shape (2, 2)
        M over ``step`` months, corrected.
    period : float
        inf where the corrected eigenvalues are real: the fit does not oscillate.
    period_interval : tuple of float
        Its upper end is inf where that happens to more than 2.5 % of the simulated records.
    decay_time : float
        e-folding time of the damping; of the slower mode where the fit does not oscillate.
    decay_time_interval : tuple of float
        Its upper end is inf where the record does not tell the damping from none.
    decay_time_uncorrected : float
        As least squares gave it.
    oscillating_share : float
        Share of the simulated records whose fit oscillates.
    """

    rates: Array
    propagator: Propagator
    corrected: Array
    period: float
    period_interval: tuple[float, float]
    decay_time: float
    decay_time_interval: tuple[float, float]
    decay_time_uncorrected: float
    oscillating_share: float


def fit_recharge(state: Array, *, step: int = STEP, replicates: int = REPLICATES, seed: int = 0) -> RechargeFit:
    """Fit the oscillator, correct it and give it intervals.

    Parameters
    ----------
    state : ndarray, shape (2, time)
        Monthly anomalies of index and volume, of similar size. NaN is left out, pair by pair.
    step : int
        Months over which M is fitted.
    replicates : int
        Simulated records behind the intervals.
    seed : int
        The same seed gives the same intervals.

    Raises
    ------
    DataError
        Where there are too few pairs of months.
    """
    fit = fit_propagator(state, step=step)
    better = corrected(fit.matrix, fit.noise, fit.pairs / step)
    decay, frequency = decay_and_frequency(better, step)
    copies = _refitted(better, fit, step, replicates, np.random.default_rng(seed))
    decays, frequencies = decay_and_frequency(copies, step)
    low, high = np.percentile(decays, _INTERVAL)
    slow, quick = np.percentile(frequencies, _INTERVAL)
    return RechargeFit(
        rates=_logarithm(better) / step,
        propagator=fit,
        corrected=better,
        period=_inverse(frequency, 2.0 * np.pi),
        period_interval=(_inverse(quick, 2.0 * np.pi), _inverse(slow, 2.0 * np.pi)),
        decay_time=_inverse(_damped(decay, step)),
        decay_time_interval=(_inverse(_damped(high, step)), _inverse(_damped(low, step))),
        decay_time_uncorrected=_inverse(decay_and_frequency(fit.matrix, step)[0]),
        oscillating_share=float(np.mean(frequencies > 0.0)),
    )


def _damped(decay: float | Array, step: int) -> float:
    """Return a decay rate; 0 where it is that of the bound, which says no more than that there may be none."""
    return float(decay) if float(decay) * step > -1.01 * np.log(_STABLE) else 0.0


def _inverse(rate: float | Array, turn: float = 1.0) -> float:
    return turn / float(rate) if rate > 0.0 else np.inf


def _logarithm(matrix: Array) -> Array:
    """Return the real matrix logarithm, NaN where there is none (a negative or zero real eigenvalue)."""
    roots = np.linalg.eigvals(matrix)
    if np.any((np.abs(roots.imag) == 0.0) & (roots.real <= 0.0)):
        return np.full(matrix.shape, np.nan)
    return np.real(logm(matrix))


def _refitted(matrix: Array, fit: Propagator, step: int, replicates: int, random: np.random.Generator) -> Array:
    """Return M as corrected from records, as long as the given one, that are simulated with ``matrix``."""
    monthly, noise = _monthly(matrix, fit.noise, step)
    records = simulate(monthly, noise, fit.pairs + step, replicates, random)
    before, after = _centred(records[..., :-step]), _centred(records[..., step:])
    own = np.swapaxes(np.linalg.solve(before @ before.swapaxes(-1, -2), before @ after.swapaxes(-1, -2)), -1, -2)
    rest = after - own @ before
    spread = rest @ rest.swapaxes(-1, -2) / (fit.pairs - matrix.shape[0] - 1)
    return corrected(own, spread, fit.pairs / step)


def _monthly(matrix: Array, noise: Array, step: int) -> tuple[Array, Array]:
    """Return M and Q of one month from those of ``step``; the state's covariance is that of the longer step."""
    if step == 1:
        return matrix, noise
    rates = _logarithm(matrix) / step
    if np.isnan(rates).any():
        raise DataError(
            f"the state hardly outlasts {step} months, so that nothing can be said of single ones",
            where="step",
            advice="fit over fewer months at a time",
        )
    monthly = expm(rates)
    whole = stationary_covariance(matrix, noise)
    rest = whole - monthly @ whole @ monthly.T
    roots, axes = np.linalg.eigh(rest)
    floor = 1e-6 * np.trace(whole)
    return monthly, (axes * np.maximum(roots, floor)) @ axes.T


def recharge_oscillator(
    index: xr.DataArray,
    volume: xr.DataArray,
    *,
    base: Base | None = None,
    step: int = STEP,
    replicates: int = REPLICATES,
    seed: int = 0,
) -> xr.Dataset:
    """Fit the recharge oscillator to a record of an index and a volume.

    Parameters
    ----------
    index, volume : xarray.DataArray
        Monthly series on ``time``; the months that both span are used, those that lack a value left out.
    base : tuple, optional
        Base of the anomalies, as in :func:`profiles.precursor.anomalies`.
    step : int
        Months over which the propagator is fitted.
    replicates, seed : int
        As in :func:`fit_recharge`.

    Returns
    -------
    xarray.Dataset
        Scalars ``period`` and ``decay_time`` (months, e-folding; inf: none) with ``_low`` and ``_high``, the ends of
        their 95 % intervals; ``decay_time_uncorrected``; ``oscillating_share`` of the simulated records; and ``rates``
        (equation, term), per month, of the anomalies in their own units: how fast the row's quantity grows for a unit
        of the column's.

    Raises
    ------
    RequestError
        Where ``step`` is below 1.
    DataError
        Where the series do not overlap, are constant, or too short.
    """
    if step < 1:
        raise RequestError("not a number of months", where="step", expected="1 or more", found=str(step))
    both = tuple(anomalies(one, base) for one in overlap(index, volume))
    for one, name in zip(both, ("index", "volume"), strict=True):
        check_varies(one, name)
    scale = np.array([float(one.std()) for one in both])
    state = np.stack([one.values for one in both]) / scale[:, None]
    fit = fit_recharge(state, step=step, replicates=replicates, seed=seed)
    numbers = {
        "period": (fit.period, "period of the oscillation"),
        "period_low": (fit.period_interval[0], "lower end of the 95 % interval of period"),
        "period_high": (fit.period_interval[1], "upper end of the 95 % interval of period"),
        "decay_time": (fit.decay_time, "e-folding time of the damping, corrected for the length of the record"),
        "decay_time_low": (fit.decay_time_interval[0], "lower end of the 95 % interval of decay_time"),
        "decay_time_high": (fit.decay_time_interval[1], "upper end of the 95 % interval of decay_time"),
        "decay_time_uncorrected": (fit.decay_time_uncorrected, "e-folding time as least squares gave it"),
    }
    result = xr.Dataset(
        {name: ((), value, {"units": "month", "long_name": text}) for name, (value, text) in numbers.items()}
    )
    share = {"units": "1", "long_name": "share of records simulated with the fit whose own fit oscillates"}
    result["oscillating_share"] = ((), fit.oscillating_share, share)
    units = [str(one.attrs.get("units", "1")) for one in both]
    rates = fit.rates * scale[:, None] / scale
    result["rates"] = (("equation", "term"), rates, {"long_name": "growth of the equation's quantity, per month"})
    result = result.assign_coords(equation=["index", "volume"], term=["index", "volume"])
    note = "Errors of measurement and weather in the monthly means damp the fit too; that part is not corrected."
    return result.assign_attrs(
        index_units=units[0], volume_units=units[1], months=fit.propagator.pairs, step_months=step, note=note
    )
