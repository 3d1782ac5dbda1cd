"""Ways to forecast an index from what one month knows: each, once fitted, a table of coefficients.

A fitted forecaster is an array (lead, month, variable): the forecast for ``lead`` months ahead, from a start in a
calendar month, is the sum over variables of coefficient times anomaly at the start. Anomalies are over their standard
deviation in their calendar month, so coefficients compare. The first variable is the index itself.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from profiles.config import HindcastSettings
from profiles.precursor.recharge import fit_propagator, real_power

Array = NDArray[np.float64]


_LEAST_PAIRS = 24  # months with one a propagator's step later; fewer than for an oscillator with intervals (ours)


@dataclass(frozen=True)
class Training:
    """What a forecaster may see.

    Attributes
    ----------
    state : ndarray, shape (variable, time)
        Standardised monthly anomalies, the index first, NaN where there is none.
    month : ndarray of int, shape (time,)
        Calendar month, 0 to 11.
    used : ndarray of bool, shape (time,)
        The months to be fitted on; no other is looked at.
    scale : ndarray, shape (12,)
        Standard deviation of the index by calendar month.
    volume : int or None
        Which variable the recharge oscillator takes beside the index.
    """

    state: Array
    month: NDArray[np.int64]
    used: NDArray[np.bool_]
    scale: Array
    volume: int | None

    def none(self, leads: int) -> Array:
        """Return coefficients that are all 0."""
        return np.zeros((leads, 12, len(self.state)))


Forecaster = Callable[[Training, HindcastSettings], Array]


def climatology(training: Training, settings: HindcastSettings) -> Array:
    """No anomaly, whatever the start."""
    return training.none(settings.longest_lead)


def persistence(training: Training, settings: HindcastSettings) -> Array:
    """The anomaly of the start, in the units of the index, stays as it is."""
    coefficients = training.none(settings.longest_lead)
    for lead, table in enumerate(coefficients, start=1):
        table[:, 0] = training.scale / np.roll(training.scale, -lead)
    return coefficients


def damped_persistence(training: Training, settings: HindcastSettings) -> Array:
    """Regression on the index alone."""
    return _regressions(training, settings, [0])


def regression(training: Training, settings: HindcastSettings) -> Array:
    """Regression on all variables."""
    return _regressions(training, settings, list(range(len(training.state))))


def recharge(training: Training, settings: HindcastSettings) -> Array:
    """The deterministic part of the recharge oscillator, started from index and volume."""
    chosen = [0, training.volume or 0]
    step = settings.propagator_months
    fit = fit_propagator(training.state[chosen], step=step, used=training.used, least=_LEAST_PAIRS)
    coefficients = training.none(settings.longest_lead)
    for lead, table in enumerate(coefficients, start=1):
        table[:, chosen] = real_power(fit.matrix, lead / step)[0]
    return coefficients


#: By name; the first three are baselines.
FORECASTERS: Mapping[str, Forecaster] = {
    "climatology": climatology,
    "persistence": persistence,
    "damped_persistence": damped_persistence,
    "regression": regression,
    "recharge": recharge,
}
BASELINES = ("climatology", "persistence", "damped_persistence")


def fit_all(training: Training, settings: HindcastSettings) -> dict[str, Array]:
    """Fit every forecaster that the variables allow; ``combined`` is the mean of regression and recharge oscillator."""
    fitted = {
        name: forecaster(training, settings)
        for name, forecaster in FORECASTERS.items()
        if name != "recharge" or training.volume is not None
    }
    if "recharge" in fitted:
        fitted["combined"] = 0.5 * (fitted["regression"] + fitted["recharge"])
    return fitted


def _regressions(training: Training, settings: HindcastSettings, variables: list[int]) -> Array:
    """Regress the index on variables, each with a coefficient that may have an annual cycle in the start's month."""
    state = training.state[variables]
    known = training.used & np.isfinite(state).all(axis=0)
    aimed = training.used & np.isfinite(training.state[0])
    wave = annual_wave(np.arange(12))
    season = wave[:, training.month]
    features = (season[:, None, :] * np.where(known, state, 0.0)).reshape(-1, known.size)
    weights = np.repeat([settings.common_weight, settings.seasonal_weight, settings.seasonal_weight], len(variables))
    coefficients = training.none(settings.longest_lead)
    for lead, table in enumerate(coefficients, start=1):
        pair = known[:-lead] & aimed[lead:]
        terms = features[:, :-lead][:, pair]
        solved = np.linalg.solve(terms @ terms.T + np.diag(weights), terms @ training.state[0, lead:][pair])
        table[:, variables] = wave.T @ solved.reshape(3, -1)
    return coefficients


def annual_wave(month: NDArray[np.int64]) -> Array:
    """Return 1, cosine and sine of the calendar month, each of mean square 1, shape (3, month)."""
    angle = 2.0 * np.pi * month / 12.0
    return np.stack([np.ones(angle.size), np.sqrt(2.0) * np.cos(angle), np.sqrt(2.0) * np.sin(angle)])


def forecasts(coefficients: Array, state: Array, month: NDArray[np.int64]) -> Array:
    """Return the forecasts from every month, (lead, time of the start); NaN where a variable that counts is missing."""
    by_start = coefficients[:, month, :]
    terms = np.where(by_start == 0.0, 0.0, by_start * state.T)
    return np.asarray(terms.sum(axis=-1))


def by_target(from_start: Array) -> Array:
    """Turn (lead, time of the start) into (lead, time of the target), NaN where the start lies before the record."""
    turned = np.full(from_start.shape, np.nan)
    for lead, row in enumerate(from_start, start=1):
        if lead < row.size:
            turned[lead - 1, lead:] = row[:-lead]
    return turned
