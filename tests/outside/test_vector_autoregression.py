"""The propagator against the vector autoregression of statsmodels."""

from __future__ import annotations

import numpy as np
import pytest

from profiles.precursor.recharge import decay_and_frequency, fit_propagator, simulate

api = pytest.importorskip("statsmodels.tsa.api")


@pytest.fixture(scope="module")
def record() -> np.ndarray:
    matrix = np.array([[0.92, 0.2], [-0.15, 0.95]])
    return simulate(matrix, np.array([[1.0, 0.2], [0.2, 0.5]]), 300, 1, np.random.default_rng(2))[0]


def test_propagator_and_noise_are_those_of_a_vector_autoregression(record: np.ndarray) -> None:
    theirs = api.VAR(record.T).fit(1, trend="c")
    ours = fit_propagator(record)
    np.testing.assert_allclose(ours.matrix, theirs.coefs[0], rtol=1e-8)
    np.testing.assert_allclose(ours.noise, theirs.sigma_u, rtol=1e-8)
    assert ours.pairs == theirs.nobs


def test_decay_is_that_of_its_roots(record: np.ndarray) -> None:
    theirs = api.VAR(record.T).fit(1, trend="c")
    decay, frequency = decay_and_frequency(fit_propagator(record).matrix)
    root = theirs.roots[0]  # of 1 - l z: 1 / eigenvalue
    assert decay == pytest.approx(np.log(np.abs(root)))
    assert frequency == pytest.approx(np.abs(np.angle(root)))
