from __future__ import annotations

import numpy as np
from hypothesis import given
from hypothesis import strategies as st
from hypothesis.extra.numpy import array_shapes, arrays

from profiles.config import QualityControlSettings
from profiles.qc.quality_control import survey_record
from profiles.qc.rate_of_change import first_difference, rate_of_change_outcome

LINKED = np.arange(5) > 0


def test_rate_of_change_flags_the_sum_of_both_changes():
    # Changes 1, 4, 4, 1: sums 5, 8, 5 inside. Limit 2 * 3 * 1 = 6 in column 0, 2 * 3 * 2 = 12 in column 1.
    record = np.array([20.0, 21.0, 25.0, 21.0, 20.0])
    outcome = rate_of_change_outcome(
        np.column_stack([record, record]), LINKED, np.array([1.0, 2.0]), deviations=3.0, floor=0.1
    )
    np.testing.assert_array_equal(outcome, [[2, 2], [1, 1], [3, 1], [1, 1], [2, 2]])


def test_rate_of_change_passes_at_its_limit():
    record = np.array([[20.0], [23.0], [20.0]])  # 3 + 3 = 6 = 2 * 3 * 1
    outcome = rate_of_change_outcome(record, LINKED[:3], np.array([1.0]), deviations=3.0, floor=0.1)
    assert outcome[1, 0] == 1


def test_rate_of_change_takes_the_floor_for_a_quiet_or_unknown_spread():
    # 2 + 2 = 4 is above 2 * 3 * 0.5 = 3 and below 2 * 3 * 1 = 6.
    record = np.array([[20.0, 20.0, 20.0], [22.0, 22.0, 22.0], [20.0, 20.0, 20.0]])
    spread = np.array([0.01, np.nan, 1.0])
    outcome = rate_of_change_outcome(record, LINKED[:3], spread, deviations=3.0, floor=0.5)
    np.testing.assert_array_equal(outcome[1], [3, 3, 1])


def test_rate_of_change_does_not_judge_beside_missing_values_and_gaps():
    record = np.full((5, 2), 20.0)
    record[2, 0] = np.nan
    linked = np.array([False, True, True, True, False])
    outcome = rate_of_change_outcome(record, linked, np.ones(2), deviations=3.0, floor=0.5)
    np.testing.assert_array_equal(outcome, [[2, 2], [2, 1], [9, 1], [2, 2], [2, 2]])


def test_first_difference_skips_gaps():
    record = np.array([[20.0], [21.0], [25.0], [26.5]])
    differences = first_difference(record, np.array([False, True, False, True]))
    np.testing.assert_array_equal(differences, [[np.nan], [1.0], [np.nan], [1.5]])


def test_the_survey_measures_first_differences_and_not_values(make_chain):
    # Up and down by 0.2 °C on a slow rise of 10 °C: differences about +-0.2, 1.4826 * 0.2 = 0.30, known to
    # 2.3 %.
    samples = np.arange(1001)
    chain = make_chain(15 + 0.1 * (-1.0) ** samples + 0.01 * samples)
    spread = survey_record(chain, QualityControlSettings()).spread["rate_of_change"]
    np.testing.assert_allclose(spread, 1.4826 * 0.2, rtol=0.08)  # the rise moves half of them to 0.21, half to 0.19


records = arrays(
    np.float64,
    array_shapes(min_dims=2, max_dims=2, max_side=12),
    elements=st.integers(-60, 60).map(lambda n: n / 2),
)


@given(records, st.integers(-40, 40))
def test_rate_of_change_does_not_change_with_a_constant_offset(temperature, offset):
    linked, sd = np.arange(len(temperature)) > 0, np.ones(temperature.shape[1])
    shifted = rate_of_change_outcome(temperature + offset, linked, sd, deviations=3.0, floor=0.5)
    plain = rate_of_change_outcome(temperature, linked, sd, deviations=3.0, floor=0.5)
    np.testing.assert_array_equal(shifted, plain)
