"""The moving-block bootstrap."""

from __future__ import annotations

import numpy as np
import pytest

from profiles.statistics import block_length, block_weights, weighted_correlation

NAN = np.nan


@pytest.mark.parametrize(
    ("count", "effective", "expected"),
    [
        (100, 100.0, 1),  # independent: exponent 0, so L = 1
        (100, 25.0, 10),  # exponent 1/2: sqrt(101 - 10) = 9.5 is nearer to 10 than sqrt(101 - 9) = 9.6 to 9
        (100, 1.0, 18),  # exponent 0.66: 83^0.66 = 18.5 is nearer to 18 than 82^0.66 = 18.3 to 19
        (40, 4.0, 8),  # exponent 0.6: 33^0.6 = 8.1 is nearer to 8 than 32^0.6 = 8.0 to 9
        (16, 1.0, 4),  # exponent 0.625: 13^0.625 = 5.0, but a fourth of the record is the most
    ],
)
def test_block_length_by_hand(count, effective, expected):
    assert block_length(count, effective) == expected


def test_every_draw_is_as_long_as_the_record():
    weights = block_weights(50, 7, 200, np.random.default_rng(1))
    assert (weights.sum(axis=1) == 50.0).all()
    assert (weights >= 0.0).all()


def test_a_block_as_long_as_the_record_is_the_record():
    assert (block_weights(30, 30, 5, np.random.default_rng(2)) == 1.0).all()


def test_blocks_keep_neighbours_together():
    # With blocks of 10 of 40 samples a draw is of four blocks: at most 4 starts, each followed by its neighbours.
    weights = block_weights(40, 10, 300, np.random.default_rng(3))
    changes = (np.diff(weights, axis=1) != 0.0).sum(axis=1)
    assert changes.max() <= 8


def test_weights_of_one_give_the_correlation_itself():
    generator = np.random.default_rng(4)
    first, second = generator.standard_normal((60, 3)) + 1e3, generator.standard_normal((60, 3))
    second[5, 0] = first[7, 0] = NAN
    found = weighted_correlation(np.ones((1, 60)), first, second)[0]
    both = np.isfinite(first[:, 0]) & np.isfinite(second[:, 0])
    expected = [np.corrcoef(first[both, 0], second[both, 0])[0, 1]]
    expected += [np.corrcoef(first[:, n], second[:, n])[0, 1] for n in (1, 2)]
    np.testing.assert_allclose(found, expected, rtol=1e-9)


def test_weights_count_samples_as_often_as_drawn():
    first, second = np.array([[1.0], [2.0], [4.0]]), np.array([[3.0], [1.0], [2.0]])
    found = weighted_correlation(np.array([[2.0, 0.0, 3.0], [1.0, 1.0, 2.0]]), first, second)[:, 0]
    drawn = [[0, 0, 2, 2, 2], [0, 1, 2, 2]]
    np.testing.assert_allclose(found, [np.corrcoef(first[at, 0], second[at, 0])[0, 1] for at in drawn])


def test_a_constant_draw_has_no_correlation():
    assert np.isnan(weighted_correlation(np.array([[3.0, 0.0]]), np.array([[1.0], [2.0]]), np.array([[1.0], [2.0]])))
