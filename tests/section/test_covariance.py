"""The covariance of the map: values by hand, sums over a grid against the full matrix, networks."""

from __future__ import annotations

import numpy as np
import pytest

from profiles.errors import DataError
from profiles.section.covariance import Gaussian, Solver, same_networks

ROWS, COLUMNS = np.array([-2.0, 0.0, 3.0]), np.array([170.0, 180.0, 195.0, 200.0])
SITES = np.array([0.0, 2.0]), np.array([172.0, 190.0])
CELLS = tuple(axis.ravel() for axis in np.meshgrid(ROWS, COLUMNS, indexing="ij"))


@pytest.fixture
def weights():
    """Two functionals over the small grid, one of which leaves cells out."""
    drawn = np.random.default_rng(2).normal(size=(2, ROWS.size, COLUMNS.size))
    drawn[1, 0] = 0.0
    return drawn


def test_correlation_falls_to_one_over_e_at_its_length():
    correlation = Gaussian(15.0, 3.0)
    found = correlation.between(
        np.array([0.0]), np.array([180.0]), np.array([0, 3.0, 0, 3.0]), np.array([180, 180, 195, 195.0])
    )
    np.testing.assert_allclose(found, [[1.0, np.exp(-1), np.exp(-1), np.exp(-2)]])


def test_correlation_with_sums_over_a_grid_is_the_sum_of_correlations(weights):
    correlation = Gaussian(15.0, 3.0)
    expected = correlation.between(*SITES, *CELLS) @ weights.reshape(2, -1).T
    np.testing.assert_allclose(correlation.with_functionals(*SITES, weights, ROWS, COLUMNS), expected)


def test_variance_of_sums_over_a_grid_is_that_of_the_full_matrix(weights):
    correlation = Gaussian(15.0, 3.0)
    flat = weights.reshape(2, -1)
    expected = np.diag(flat @ correlation.between(*CELLS, *CELLS) @ flat.T)
    np.testing.assert_allclose(correlation.of_functionals(weights, ROWS, COLUMNS), expected)


def test_times_with_the_same_sites_and_noise_are_one_network():
    nan = np.nan
    noise = np.array([[1.0, 2.0], [nan, 2.0], [1.0, 2.0], [1.0, 2.5], [nan, nan]])
    found = {tuple(network.times): (network.sites.tolist(), network.noise.tolist()) for network in same_networks(noise)}
    assert found == {
        (0, 2): ([0, 1], [1.0, 2.0]),
        (1,): ([1], [2.0]),
        (3,): ([0, 1], [1.0, 2.5]),
        (4,): ([], []),
    }


def test_noise_of_zero_is_not_a_missing_site():
    (network,) = same_networks(np.array([[0.0, 1.0]]))
    assert network.sites.tolist() == [0, 1]


def test_solver_solves_with_signal_and_noise():
    # 4 [[1, .5], [.5, 1]] + diag(1, 9) = [[5, 2], [2, 13]], determinant 61; times (1, 0): (13, -2) / 61.
    solver = Solver.of(np.array([[1.0, 0.5], [0.5, 1.0]]), 2.0, np.array([1.0, 3.0]))
    np.testing.assert_allclose(solver.solve(np.array([1.0, 0.0])), [13 / 61, -2 / 61])


def test_sites_at_one_place_without_noise_are_refused():
    with pytest.raises(DataError, match=r"cannot be told apart.*singular data covariance"):
        Solver.of(np.ones((2, 2)), 12.0, np.zeros(2))
