"""Burg's method, the order, the model's autocorrelation and its simulation."""

from __future__ import annotations

import numpy as np
import pytest

from profiles.statistics import (
    autocorrelation_of,
    burg_reflection,
    coefficients_of,
    fit_reflection,
    simulate,
    supported_order,
)

NAN = np.nan


def test_first_coefficient_by_hand():
    # Mean 0. 2 sum x_t x_(t-1) = 2 (2 - 1 + 2) = 6; sum x_t^2 + x_(t-1)^2 = (1 + 1 + 4) + (4 + 1 + 1) = 12.
    np.testing.assert_allclose(burg_reflection(np.array([2.0, 1.0, -1.0, -2.0]), 1), [0.5])


def test_no_error_is_formed_across_a_gap():
    # Mean of the six values 0. Pairs within the two halves: 2 (2 + 2) / ((1 + 4) + (1 + 4)) for (1, 2) and (-1, -2),
    # and those with the zeros: none, for they stand alone between gaps.
    values = np.array([1.0, 2.0, NAN, 0.0, NAN, -1.0, -2.0, NAN, 0.0])
    np.testing.assert_allclose(burg_reflection(values, 1), [0.8])


def test_second_order_by_hand():
    # Coefficients a1 = k1 (1 - k2), a2 = k2; autocorrelation r1 = a1 / (1 - a2), r2 = a1 r1 + a2.
    reflection = np.array([0.6, -0.5])
    np.testing.assert_allclose(coefficients_of(reflection), [0.9, -0.5])
    first = 0.9 / 1.5
    np.testing.assert_allclose(
        autocorrelation_of(reflection, 3), [1.0, first, 0.9 * first - 0.5, 0.9 * (0.9 * first - 0.5) - 0.5 * first]
    )


def test_first_order_autocorrelation_is_a_power():
    np.testing.assert_allclose(autocorrelation_of(np.array([0.8]), 30), 0.8 ** np.arange(31))


def test_coefficients_above_the_order_change_nothing():
    padded = autocorrelation_of(np.array([0.6, -0.5, 0.0, 0.0]), 20)
    np.testing.assert_allclose(padded, autocorrelation_of(np.array([0.6, -0.5]), 20), atol=1e-12)


def test_fewer_lags_than_the_order_can_be_asked_for():
    assert autocorrelation_of(np.array([0.6, -0.5, 0.1]), 1).shape == (2,)


def test_every_model_is_stationary():
    walks = np.cumsum(np.random.default_rng(1).standard_normal((20, 120)), axis=1)
    assert (np.abs(fit_reflection(walks)) < 1.0).all()


def test_order_of_white_noise_is_low_and_of_an_oscillation_is_not():
    generator = np.random.default_rng(2)
    noise = generator.standard_normal((200, 480))
    assert np.median(supported_order(burg_reflection(noise, 20), 480)) <= 2
    swings = simulate(np.array([0.99, -0.95]), 480, 200, generator)
    assert supported_order(burg_reflection(swings, 20), 480).min() >= 2


def test_order_takes_the_highest_within_two_of_the_least_criterion():
    # n = 1000: AICc of orders 0, 1, 2 differ by n ln(1 - k^2) + about 2 each. With k1 = 0.5 order 1 is far better than
    # 0; with k2^2 = 0.001 order 2 is worse than 1 by about 1, within 2; with k2 = 0 and k3 = 0 order 3 by about 4.
    reflection = np.array([0.5, np.sqrt(0.001), 0.0])
    assert supported_order(reflection, 1000) == 2
    assert supported_order(np.array([0.5, 0.0, 0.0]), 1000) == 1


def test_short_records_get_low_orders():
    values = np.random.default_rng(3).standard_normal(24)
    assert fit_reflection(values).shape == (3,)


def test_simulated_series_have_the_autocorrelation_of_the_model():
    reflection = np.array([0.9, -0.6])
    series = simulate(reflection, 400, 500, np.random.default_rng(4))
    found = [(series[:, lag:] * series[:, : 400 - lag]).mean() / (series**2).mean() for lag in (1, 2, 6)]
    np.testing.assert_allclose(found, autocorrelation_of(reflection, 6)[[1, 2, 6]], atol=0.02)


@pytest.mark.parametrize("shape", [(50,), (3, 50), (2, 3, 50)])
def test_leading_dimensions_are_kept(shape):
    values = np.random.default_rng(5).standard_normal(shape)
    found = fit_reflection(values)
    assert found.shape == (*shape[:-1], 6)
    np.testing.assert_allclose(found.reshape(-1, 6)[-1], fit_reflection(values.reshape(-1, 50)[-1]))
