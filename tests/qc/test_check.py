from __future__ import annotations

import numpy as np
import pytest

from profiles.config import QualityControlSettings
from profiles.qc.check import Survey, outcomes
from profiles.qc.quality_control import CHECKS, segment_of, survey_record


def test_outcomes_take_missing_over_not_judged_over_bad_over_questionable():
    flag = np.array([True, False])
    present, judged, questionable, bad = (grid.ravel() for grid in np.meshgrid(flag, flag, flag, flag, indexing="ij"))
    # Present and judged: 4 4 over 3 and 1 by (questionable, bad) in the order TT, TF, FT, FF; then 2; then 9.
    expected = [4, 3, 4, 1] + [2] * 4 + [9] * 8
    np.testing.assert_array_equal(outcomes(present, judged, questionable, bad), expected)


@pytest.mark.parametrize("check", CHECKS, ids=lambda check: check.name)
def test_every_test_says_9_exactly_where_the_datum_is_missing(make_chain, check):
    draw = np.random.default_rng(5)
    temperature = np.where(draw.random((40, 3)) < 0.3, np.nan, 30 * draw.random((40, 3)))
    chain, settings = make_chain(temperature), QualityControlSettings()
    survey: Survey = survey_record(chain, settings)
    segment = segment_of(chain, np.full(3, np.datetime64("NaT", "ns")))
    outcome = check.outcome(segment, survey, settings)
    assert outcome.dtype == np.int8
    np.testing.assert_array_equal(outcome == 9, np.isnan(chain["temperature"].values))
    assert set(np.unique(outcome)) <= {1, 2, 3, 4, 9}
