"""Fields made of plane waves."""

from __future__ import annotations

import numpy as np
import pytest

from profiles.drill.clock import Clock
from profiles.drill.lines import Lines, degrees_per_day


def clock(days: np.ndarray, interval: float = 0.0) -> Clock:
    return Clock(days, np.zeros(days.size), interval)


def one_line(frequency: float, eastward: float, northward: float = 0.0) -> Lines:
    return Lines(*(np.array([value]) for value in (frequency, eastward, northward, 0.0, 2.0)))


def test_a_line_is_its_cosine() -> None:
    # 2 cos(0.1 * 3 + 0.2 * 5 - 0.5 * 7) = 2 cos(-2.2) = -1.17700.
    value = one_line(0.5, 0.2, 0.1).at(np.array([3.0]), np.array([5.0]), clock(np.array([7.0])))
    np.testing.assert_allclose(value, [[-1.17700]], atol=1e-5)


def test_a_line_of_positive_numbers_runs_east() -> None:
    # 0.5 radians a day over 0.25 radians a degree: 2 degrees a day.
    line = one_line(0.5, 0.25)
    here = line.at(np.zeros(1), np.array([200.0]), clock(np.array([0.0])))
    later = line.at(np.zeros(1), np.array([206.0]), clock(np.array([3.0])))
    np.testing.assert_allclose(here, later, atol=1e-12)


@pytest.mark.parametrize("frequency", [0.1, 2.0, 12.0])
def test_a_mean_over_an_interval_is_the_mean_of_its_instants(frequency: float) -> None:
    line, where = one_line(frequency, 0.3), (np.zeros(1), np.array([1.0]))
    # The midpoint rule on 4000 instants.
    instants = 10.0 + (np.arange(4000) + 0.5) / 4000.0 - 0.5
    mean = line.at(*where, clock(np.array([10.0]), interval=1.0))[0, 0]
    assert mean == pytest.approx(line.at(*where, clock(instants)).mean(), abs=1e-5)


def test_patches_have_unit_variance_and_their_scales() -> None:
    # At one scale the covariance exp(-(d / scale)**2) is exp(-1) = 0.368.
    latitude, longitude = np.array([0.0, 0.0, 2.0]), np.array([200.0, 208.0, 200.0])
    fields = []
    for seed in range(400):
        lines = Lines.patches(np.random.default_rng(seed), 64, longitude=8.0, latitude=2.0, days=30.0)
        fields.append(lines.at(latitude, longitude, clock(np.array([0.0, 30.0]))))
    field = np.array(fields)
    first = field[:, 0, 0]
    products = np.array([first * first, first * field[:, 1, 0], first * field[:, 2, 0], first * field[:, 0, 1]])
    np.testing.assert_allclose(products.mean(axis=1), [1.0, 0.368, 0.368, 0.368], atol=0.15)


def test_spread_scales_make_a_longer_tail() -> None:
    # Far out, where a Gaussian has exp(-(2.5)**2) = 0.002, mixed scales keep more.
    tails = []
    for spread in (0.0, 0.6):
        fields = [
            Lines.patches(np.random.default_rng(seed), 512, longitude=8.0, latitude=2.0, days=np.inf, spread=spread)
            for seed in range(20)
        ]
        tails.append(
            np.mean([np.mean(0.5 * lines.amplitude**2 * np.cos(20.0 * lines.eastward)) * 512 for lines in fields])
        )
    assert abs(tails[0]) < 0.02
    assert tails[1] > 0.04


def test_drifting_patches_are_carried_along() -> None:
    # -0.25 m/s is 0.19425 degrees a day westward: after 40 days the field stands 7.77 degrees further west.
    lines = Lines.patches(np.random.default_rng(3), 64, longitude=8.0, latitude=2.0, days=np.inf, speed=-0.25)
    here = lines.at(np.zeros(1), np.array([200.0]), clock(np.array([0.0])))
    later = lines.at(np.zeros(1), np.array([200.0 - 7.7700]), clock(np.array([40.0])))
    np.testing.assert_allclose(here, later, atol=1e-3)


def test_speed_in_degrees() -> None:
    # 2.4 m/s is 207.36 km a day; a degree of a sphere of 6371 km has 111.195 km: 1.86483.
    assert degrees_per_day(2.4) == pytest.approx(1.86483, abs=1e-5)
