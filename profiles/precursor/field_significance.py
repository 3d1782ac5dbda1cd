"""Whether the strongest of many correlations is more than chance finds among so many."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from profiles.statistics import simulate

Array = NDArray[np.float64]


@dataclass(frozen=True)
class FieldSignificance:
    """The field as a whole.

    Attributes
    ----------
    p_value : float
        Share of independent pairs of series with the same memory whose strongest correlation, anywhere in the field, is
        as significant as the record's.
    significant : int
        How many of the field are significant one by one.
    p_value_of_count : float
        Share of those pairs with as many (Livezey and Chen 1983).
    """

    p_value: float
    significant: int
    p_value_of_count: float


def simulated_pairs(
    first: Array, second: Array, length: int, draws: int, generator: np.random.Generator
) -> tuple[Array, Array]:
    """Return pairs of independent series of two autoregressive models, each (draws, length), of unit variance."""
    pair = (simulate(reflection, length, draws, generator) for reflection in (first, second))
    one, other = (values / values.std(axis=-1, keepdims=True) for values in pair)
    return one, other


def field_significance(correlation: Array, simulated: Array, effective: Array, level: float) -> FieldSignificance:
    """Return the significance of a field of correlations.

    Parameters
    ----------
    correlation : ndarray, shape (...)
        Of the record; NaN is left out.
    simulated : ndarray, shape (draw, ...)
        Of independent pairs of series.
    effective : ndarray, shape (...)
        Effective size of each, of the record; it makes correlations of different leads comparable.
    level : float
        At which one correlation counts as significant, such as 0.05.

    Notes
    -----
    A correlation is measured by t, as in the test of each; a p-value is (1 + number as large) / (1 + number of draws).
    """
    from scipy.special import stdtrit

    kept = np.isfinite(correlation) & np.isfinite(effective) & (effective > 2.0)
    if not kept.any():
        return FieldSignificance(np.nan, 0, np.nan)
    freedom = effective[kept] - 2.0
    limit = stdtrit(freedom, 1.0 - level / 2.0)

    def measure(values: Array) -> tuple[Array, Array]:
        inside = np.clip(np.nan_to_num(values[..., kept]), -1.0 + 1e-12, 1.0 - 1e-12)
        # In units of the limit, so that t of few and of many degrees of freedom rank alike.
        strength = np.abs(inside) * np.sqrt(freedom / (1.0 - inside**2)) / limit
        return strength.max(axis=-1), (strength > 1.0).sum(axis=-1)

    strongest, count = measure(correlation)
    chance, chance_count = measure(simulated)
    draws = simulated.shape[0]
    return FieldSignificance(
        p_value=float((1 + (chance >= strongest).sum()) / (1 + draws)),
        significant=int(count),
        p_value_of_count=float((1 + (chance_count >= count).sum()) / (1 + draws)),
    )
