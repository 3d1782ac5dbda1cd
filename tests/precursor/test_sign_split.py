"""Regression on the positive and the negative part of a predictor."""

from __future__ import annotations

import numpy as np
import pytest

from profiles.precursor.sign_split import split_regression

NAN = np.nan
MONTHS = np.arange(4000) % 12 + 1


def test_different_slopes_are_told_apart_exactly():
    predictor = np.array([-3.0, -2.0, -1.0, 1.0, 2.0, 3.0, 0.0, 4.0])
    target = 1.0 + 2.0 * np.maximum(predictor, 0.0) + 0.5 * np.minimum(predictor, 0.0)
    slopes, errors = split_regression(predictor, target[None], MONTHS[: target.size])
    np.testing.assert_allclose(slopes[:, 0], [2.0, 0.5])
    np.testing.assert_allclose(errors[:, 0], 0.0, atol=1e-7)


def test_white_noise_gives_the_textbook_errors():
    generator = np.random.default_rng(1)
    predictor = generator.standard_normal(4000)
    target = predictor + generator.standard_normal(4000)
    parts = np.column_stack([np.ones(4000), np.maximum(predictor, 0.0), np.minimum(predictor, 0.0)])
    expected = np.sqrt(np.diag(np.linalg.inv(parts.T @ parts)))[1:]  # of noise of unit variance
    _, errors = split_regression(predictor, target[None], MONTHS[: target.size])
    np.testing.assert_allclose(errors[:, 0], expected, rtol=0.1)


def test_errors_of_red_noise_hold_the_truth():
    # 300 records of 40 years; 95 % intervals must hold the slope of 1 in 90 to 99 %.
    generator = np.random.default_rng(2)
    held = []
    for _ in range(300):
        walk = [np.zeros(2)]
        for step in generator.standard_normal((480, 2)):
            walk.append(0.85 * walk[-1] + step)
        predictor, noise = np.array(walk[1:]).T
        slopes, errors = split_regression(predictor, (predictor + noise)[None], MONTHS[:480])
        held.append(np.abs(slopes[:, 0] - 1.0) < 1.96 * errors[:, 0])
    assert 0.90 <= np.mean(held) <= 0.99


@pytest.mark.parametrize("target", [np.full(6, NAN), np.array([1.0, NAN, NAN, 2.0, 3.0, 4.0])])
def test_too_few_of_one_sign_give_nothing(target):
    slopes, errors = split_regression(np.array([-1.0, -2.0, -3.0, 1.0, 2.0, 3.0]), target[None], MONTHS[: target.size])
    assert np.isnan([slopes, errors]).all()
