"""Robust spread: of an array, and by surveys of blocks."""

from __future__ import annotations

from functools import reduce

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays
from scipy.stats import median_abs_deviation, norm

from profiles.statistics import SpreadSurvey, robust_sd
from profiles.statistics.spread import NORMAL_MAD

#: Bins of the survey: 100 to a factor of ten, so the edges of a bin differ by 10**0.01, its middle from either by half.
HALF_BIN = 10**0.005

blocks = arrays(
    np.float64,
    st.tuples(st.integers(0, 40), st.just(2)),
    elements=st.one_of(st.floats(-900.0, 900.0, allow_subnormal=False), st.just(np.nan)),
)


def lower_median(magnitudes: np.ndarray) -> float:
    """The middle value, the lower of two."""
    return float(np.sort(magnitudes)[(magnitudes.size - 1) // 2])


def test_the_factor_is_that_of_the_normal_distribution() -> None:
    # Phi^-1(3/4) is the median of the absolute value of a standard normal variable.
    assert pytest.approx(1.0 / norm.ppf(0.75), rel=1e-14) == NORMAL_MAD


def test_robust_sd_of_five_numbers_by_hand() -> None:
    # Median of 1, 2, 3, 4, 100 is 3; deviations 2, 1, 0, 1, 97 have the median 1; times 1.4826.
    assert robust_sd(np.array([1.0, 2.0, 3.0, 4.0, 100.0])) == pytest.approx(1.4826022, abs=1e-7)


def test_robust_sd_of_four_numbers_takes_the_mean_of_the_middle_two() -> None:
    # Median of 0, 1, 5, 9 is 3; deviations 3, 2, 2, 6 have the median 2.5.
    assert robust_sd(np.array([0.0, 1.0, 5.0, 9.0])) == pytest.approx(2.5 * 1.4826022, abs=1e-6)


def test_robust_sd_leaves_missing_values_out_wherever_they_are() -> None:
    values = np.array([[np.nan, 1.0, 1.0], [1.0, np.nan, 3.0], [3.0, 3.0, np.nan], [5.0, 5.0, 5.0]])
    # Each column holds 1, 3, 5: median 3, deviations 2, 0, 2, median 2.
    np.testing.assert_allclose(robust_sd(values), np.full(3, 2 * 1.4826022), atol=1e-6)


def test_robust_sd_of_nothing_is_nan() -> None:
    np.testing.assert_array_equal(robust_sd(np.array([[np.nan, 7.0], [np.nan, np.nan]])), [np.nan, 0.0])


@pytest.mark.parametrize("axis", [0, 1, 2, -1])
def test_robust_sd_goes_along_the_axis_that_scipy_goes_along(axis: int) -> None:
    values = np.random.default_rng(1).normal(size=(4, 5, 6))
    values[0, 0, 0] = np.nan
    expected = median_abs_deviation(values, axis=axis, scale="normal", nan_policy="omit")
    np.testing.assert_allclose(robust_sd(values, axis=axis), expected, rtol=1e-12)


def test_robust_sd_scales_and_does_not_shift() -> None:
    values = np.random.default_rng(2).normal(size=101)
    np.testing.assert_allclose(robust_sd(3.0 * values + 20.0), 3.0 * robust_sd(values), rtol=1e-12)


def test_robust_sd_of_a_normal_sample_is_its_standard_deviation() -> None:
    # The estimator's efficiency is 37 %: its relative standard error is 1.17 / sqrt(n) = 0.0037 for 100 000 values.
    sample = np.random.default_rng(3).normal(0.0, 2.0, 100_000)
    assert robust_sd(sample) == pytest.approx(2.0, rel=4 * 0.0037)


def test_a_survey_of_three_numbers_by_hand() -> None:
    # |value| is 0.1, 0.2, 5: the median is 0.2 and the spread 0.2965, known to half a bin, 1.2 %.
    survey = SpreadSurvey(1).add(np.array([[-0.2], [0.1], [5.0]]))
    assert survey.sd()[0] == pytest.approx(0.2 * 1.4826, rel=0.0116)


@given(blocks)
def test_a_survey_equals_the_robust_spread_to_half_a_bin(values: np.ndarray) -> None:
    surveyed = SpreadSurvey(2).add(values).sd()
    for found, column in zip(surveyed, values.T, strict=True):
        magnitudes = np.abs(column[np.isfinite(column)])
        if magnitudes.size == 0:
            assert np.isnan(found)
        elif (median := lower_median(magnitudes)) < 1.0001e-5:
            assert found < 1.51e-5  # the lowest edge: finer than any sensor resolves
        else:
            ratio = found / (1.482602218505602 * median)
            assert 1 / HALF_BIN - 1e-9 <= ratio <= HALF_BIN + 1e-9


@given(st.lists(blocks, min_size=1, max_size=6), st.randoms())
def test_a_survey_does_not_depend_on_blocks_and_their_order(parts: list[np.ndarray], random: object) -> None:
    whole = SpreadSurvey(2).add(np.concatenate(parts))
    in_turn = reduce(lambda survey, part: survey.add(part), parts, SpreadSurvey(2))
    shuffled = list(parts)
    random.shuffle(shuffled)  # type: ignore[attr-defined]
    merged = reduce(lambda survey, part: survey.merge(SpreadSurvey(2).add(part)), shuffled, SpreadSurvey(2))
    np.testing.assert_array_equal(in_turn.counts, whole.counts)
    np.testing.assert_array_equal(merged.counts, whole.counts)
    np.testing.assert_array_equal(merged.sd(), whole.sd())


@given(blocks)
def test_a_survey_counts_every_finite_value_once(values: np.ndarray) -> None:
    counts = SpreadSurvey(2).add(values).counts
    np.testing.assert_array_equal(counts.sum(axis=1), np.isfinite(values).sum(axis=0))


def test_a_survey_agrees_with_the_array_on_many_values() -> None:
    values = np.random.default_rng(4).normal(0.0, [0.02, 0.7, 30.0], (20_001, 3))
    survey = SpreadSurvey(3).add(values[:7000]).merge(SpreadSurvey(3).add(values[7000:]))
    # About zero and about the median are the same to 1.25 sd / sqrt(n) = 0.9 % of the sd; half a bin is 1.2 %.
    np.testing.assert_allclose(survey.sd(), robust_sd(values), rtol=0.021)


def test_a_survey_of_nothing_is_nan_for_that_sensor_alone() -> None:
    survey = SpreadSurvey(2).add(np.array([[np.nan, 1.0], [np.nan, np.nan]]))
    assert np.isnan(survey.sd()[0])
    assert survey.sd()[1] == pytest.approx(1.4826, rel=0.0116)


def test_a_survey_does_not_mix_sensors() -> None:
    values = np.array([[1.0, 100.0], [1.0, 100.0]])
    np.testing.assert_allclose(SpreadSurvey(2).add(values).sd(), [1.4826, 148.26], rtol=0.0116)


def test_a_survey_holds_values_beyond_its_bins() -> None:
    # 1e9 is beyond the last edge, 1000, and is counted there; half of the values and more are zero.
    assert SpreadSurvey(1).add(np.array([[1e9]])).sd()[0] == pytest.approx(1482.6, rel=1e-4)
    assert SpreadSurvey(1).add(np.array([[0.0], [0.0], [1e9]])).sd()[0] == 0.0
