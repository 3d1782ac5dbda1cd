"""Correlation, regression and the test with the effective size."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats

from profiles.statistics import autocorrelation_of, fit_reflection, paired_statistics, simulate

NAN = np.nan
WHITE = np.eye(1, 600)[0]


def red(memory, length=600):
    return memory ** np.arange(length)


def test_effective_size_by_hand():
    # Three pairs, u = (-1, 0, 1) / sqrt 2 for both; memory 1, 1/2, 1/4.
    # u'Ru = 1 - 1/4 = 3/4; tr(PRP) = 3 - (3 + 4/2 + 2/4) / 3 = 7/6; var = 9/14; size = 1 + 14/9 = 23/9.
    found = paired_statistics(np.array([1.0, 2.0, 3.0]), np.array([5.0, 7.0, 9.0]), red(0.5), red(0.5))
    assert found.effective_size == pytest.approx(23.0 / 9.0)
    assert found.correlation == pytest.approx(1.0)
    assert found.slope == pytest.approx(2.0)


def test_a_spread_that_changes_counts_by_hand():
    # As above, the second twice as wide at the third time: u o s = (-1, 0, 2) / sqrt 2. u'Ru = (1 + 4) / 2 - 2 / 4 = 2;
    # tr(PRP) = 6 - (6 + 2 (1/2 + 2/2) + 2 * 2/4) / 3 = 8/3; var = 3/4. The other way it is 9/14 as before; the larger
    # counts three times in the geometric mean.
    scale = np.array([1.0, 1.0, 2.0])
    found = paired_statistics(
        np.array([1.0, 2.0, 3.0]), np.array([5.0, 7.0, 9.0]), red(0.5), red(0.5), second_scale=scale
    )
    assert found.effective_size == pytest.approx(1.0 + 1.0 / ((3.0 / 4.0) ** 0.75 * (9.0 / 14.0) ** 0.25))


def test_white_series_count_whole_and_give_the_textbook_test():
    generator = np.random.default_rng(1)
    first, second = generator.standard_normal(50), generator.standard_normal(50)
    found, expected = paired_statistics(first, second, WHITE, WHITE), stats.linregress(first, second)
    assert found.effective_size == pytest.approx(50.0)
    assert found.p_value == pytest.approx(expected.pvalue)
    assert found.slope == pytest.approx(expected.slope)
    assert found.slope_error == pytest.approx(expected.stderr)


def test_red_series_reach_the_published_formula_in_the_mean():
    # n (1 - r1 r2) / (1 + r1 r2) for two AR(1) series: 2000 (1 - 0.56) / (1 + 0.56) = 564.
    generator = np.random.default_rng(2)
    first, second = (simulate(np.array([memory]), 2000, 300, generator) for memory in (0.8, 0.7))
    found = paired_statistics(first, second, red(0.8, 2000), red(0.7, 2000))
    assert 1.0 / (1.0 / (found.effective_size - 1.0)).mean() == pytest.approx(564.0, rel=0.05)


def test_the_size_is_never_above_the_count():
    # Both alternate: (-0.5)^2 > 0 in the product, but against white noise nothing may be gained.
    generator = np.random.default_rng(3)
    first = simulate(np.array([-0.5]), 200, 40, generator)
    second = simulate(np.array([0.5]), 200, 40, generator)
    assert (paired_statistics(first, second, red(-0.5), red(0.5)).effective_size <= 200.0).all()


def test_the_order_of_the_two_does_not_matter():
    generator = np.random.default_rng(4)
    first, second = simulate(np.array([0.9]), 100, 1, generator)[0], simulate(np.array([0.5]), 100, 1, generator)[0]
    one = paired_statistics(first, second, red(0.9), red(0.5))
    other = paired_statistics(second, first, red(0.5), red(0.9))
    assert one.p_value == pytest.approx(other.p_value)
    assert one.effective_size == pytest.approx(other.effective_size)


def test_units_change_the_slope_alone():
    generator = np.random.default_rng(5)
    first, second = generator.standard_normal(60), generator.standard_normal(60)
    one = paired_statistics(first, second, red(0.5), red(0.5))
    other = paired_statistics(1e14 * first + 1e15, 0.01 * second - 3.0, red(0.5), red(0.5))
    assert other.p_value == pytest.approx(one.p_value)
    assert other.slope == pytest.approx(1e-16 * one.slope)


@pytest.mark.parametrize("missing", [[0], [29, 30], [59], list(range(0, 60, 3))])
def test_missing_pairs_drop_out(missing):
    generator = np.random.default_rng(6)
    first, second = generator.standard_normal(60), generator.standard_normal(60)
    first[missing[0]] = second[missing[-1]] = NAN
    second[missing] = NAN
    kept = np.isfinite(first) & np.isfinite(second)
    found = paired_statistics(first, second, WHITE, WHITE)
    expected = stats.linregress(first[kept], second[kept])
    assert found.count == kept.sum()
    assert found.p_value == pytest.approx(expected.pvalue)
    assert found.correlation == pytest.approx(expected.rvalue)


def test_too_few_pairs_and_constants_are_missing():
    nothing = paired_statistics(np.full(9, NAN), np.arange(9.0), WHITE, WHITE)
    two = paired_statistics(np.array([1.0, 2.0, NAN]), np.array([1.0, 3.0, 2.0]), WHITE, WHITE)
    constant = paired_statistics(np.full(9, 0.1), np.arange(9.0), WHITE, WHITE)
    for found in (nothing, two, constant):
        assert np.isnan([found.correlation, found.effective_size, found.p_value, found.slope]).all()
    assert (nothing.count, two.count, constant.count) == (0, 2, 9)


def test_interval_of_the_correlation_by_hand():
    # r = 0.5 with 28 effective: z = 0.549306, half-width 1.959964 / 5 = 0.391993; tanh(0.157313), tanh(0.941299).
    found = paired_statistics(np.zeros(3), np.zeros(3), WHITE, WHITE)
    known = type(found)(**{**vars(found), "correlation": np.array(0.5), "effective_size": np.array(28.0)})
    np.testing.assert_allclose(known.interval(), (0.156028, 0.735818), atol=2e-6)


@pytest.mark.parametrize("kind", ["red", "oscillation", "gaps"])
def test_false_alarms_keep_their_rate_with_fitted_memory(kind):
    # 1500 pairs: three standard errors of 5 % are 1.7 %. The full study is tests/bench/false_alarm.py.
    generator = np.random.default_rng(7)
    reflection = {"red": [0.9], "oscillation": [0.985, -0.92], "gaps": [0.8]}[kind]
    first, second = (simulate(np.array(reflection), 240, 1500, generator) for _ in range(2))
    if kind == "gaps":
        first = np.where(generator.random(first.shape) < 0.1, NAN, first)
    memories = [autocorrelation_of(fit_reflection(values), 240) for values in (first, second)]
    found = paired_statistics(first, second, *memories)
    assert 0.03 <= (found.p_value < 0.05).mean() <= 0.07
