"""A model's temperature at sensors: between levels, above the first, below the last, beside land."""

from __future__ import annotations

import numpy as np
import pytest

from profiles.validation.sampling import sample
from profiles.validation.stencils import Stencil

LEVELS = np.array([5.0, 15.0, 35.0, 75.0])
WARM = np.array([28.0, 27.0, 23.0, 15.0])
COOL = WARM - 4.0


def at(sensor_depth, columns=(WARM, WARM), weights=(0.5, 0.5), depth=None, top_reach=10.0):
    temperature = np.array(columns)[None, None]
    where = Stencil(np.zeros((1, 2), np.int64), np.array([[0, 1]]), np.array([weights], dtype=np.float64), np.zeros(1))
    levels = LEVELS[None, None, None] if depth is None else np.asarray(depth, dtype=np.float64)
    return sample(temperature, levels, where, np.array([[[sensor_depth]]]), top_reach=top_reach)[0, 0, 0]


def test_between_levels_it_is_linear():
    # 20 m lies a quarter of the way from 15 m (27) to 35 m (23): 26.
    assert at(20.0) == pytest.approx(26.0)


def test_columns_count_by_their_weights():
    assert at(20.0, (WARM, COOL), (0.75, 0.25)) == pytest.approx(0.75 * 26.0 + 0.25 * 22.0)


@pytest.mark.parametrize("place", range(4))
def test_on_a_level_it_is_that_level_exactly(place):
    assert at(LEVELS[place]) == WARM[place]


def test_the_first_level_stands_for_the_water_above_it_within_reach():
    assert at(1.0) == 28.0
    assert np.isnan(at(1.0, top_reach=4.0))


def test_below_the_last_level_there_is_nothing():
    assert np.isnan(at(76.0))


@pytest.mark.parametrize(("missing", "lost"), [(0, (10.0,)), (1, (10.0, 20.0)), (2, (20.0, 50.0)), (3, (50.0,))])
def test_a_missing_level_is_not_bridged(missing, lost):
    holed = WARM.copy()
    holed[missing] = np.nan
    for depth in (10.0, 20.0, 50.0):
        assert np.isnan(at(depth, (holed, holed))) == (depth in lost)


def test_a_column_that_is_not_deep_enough_leaves_the_other():
    shallow = np.array([24.0, 23.0, np.nan, np.nan])
    assert at(50.0, (WARM, shallow)) == pytest.approx(23.0 - 8.0 * 15.0 / 40.0)


def test_levels_may_move_from_column_to_column():
    # The right column's levels are 10 m deeper: 20 m there is what 10 m is in the left one, 27.5.
    depth = np.stack([LEVELS, LEVELS + 10.0])[None, None]
    assert at(20.0, depth=depth) == pytest.approx(0.5 * 26.0 + 0.5 * 27.5)


def test_no_sensor_no_temperature():
    assert np.isnan(at(np.nan))
    assert np.isnan(at(20.0, (WARM * np.nan, WARM * np.nan)))
    assert np.isnan(at(20.0, weights=(0.0, 0.0)))
