from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from profiles.atlas import monthly_temperature
from profiles.config import ClimatologySettings, QualityControlSettings
from profiles.qc import quality_control
from profiles.qc.climatology import (
    climatology_outcome,
    climatology_window,
    interpolate_profile,
    layer_extremes,
)
from profiles.vocabulary import TEST_BITS

LEVELS = np.array([0.0, 100.0, 200.0, 500.0])
COOLING = np.array([[28.0, 24.0, 12.0, 9.0]])
INVERTED = np.array([[26.0, 29.0, 12.0, 12.0]])
BIT = 1 << TEST_BITS["climatology"]


def test_interpolation_is_linear_between_levels_and_exact_on_them():
    depth = np.array([[0.0, 50.0, 100.0, 175.0, 500.0]])
    # 28 + (24-28)/2 = 26; 24 + 0.75 (12-24) = 15; and for the second profile 27.5 and 29 - 0.75 * 17 = 16.25.
    both = interpolate_profile(np.vstack([COOLING, INVERTED]), LEVELS, depth)
    np.testing.assert_allclose(both, [[28, 26, 24, 15, 9], [26, 27.5, 29, 16.25, 12]])


def test_interpolation_follows_depths_that_change_in_time():
    depth = np.array([[50.0], [150.0]])
    values = interpolate_profile(np.vstack([COOLING, COOLING]), LEVELS, depth)
    np.testing.assert_allclose(values, [[26.0], [18.0]])


def test_layer_extremes_see_a_maximum_between_their_ends():
    # 50 to 150 m: ends 27.5 and 20.5, with 29 at 100 m between.
    least, greatest = layer_extremes(INVERTED, LEVELS, np.array([[50.0]]), np.array([[150.0]]))
    assert (least.item(), greatest.item()) == (20.5, 29.0)


def test_the_window_reaches_up_and_down_the_profile():
    lower, upper = climatology_window(
        COOLING,
        LEVELS,
        np.array([[0.0, 100.0, 250.0]]),
        deviations=2.0,
        displacement_sd=25.0,
        floor_shallow=1.0,
        floor_deep=0.5,
    )
    # Reach 50 m. At 0 m: 0 to 50 m, 26 to 28, -+ 2*1. At 100 m: 50 to 150 m, 18 to 26, -+ 2*0.9.
    # At 250 m: 200 to 300 m, 11 to 12, -+ 2*0.75.
    np.testing.assert_allclose(lower, [[24.0, 16.2, 9.5]])
    np.testing.assert_allclose(upper, [[30.0, 27.8, 13.5]])


def test_the_window_beyond_the_atlas_is_that_of_its_end():
    # 900 m is taken at 500 m and below: 9 -+ 2 * 0.5, no displacement.
    lower, upper = climatology_window(
        COOLING,
        LEVELS,
        np.array([[900.0]]),
        deviations=2.0,
        displacement_sd=25.0,
        floor_shallow=1.0,
        floor_deep=0.5,
    )
    assert (lower.item(), upper.item()) == (8.0, 10.0)


@given(st.lists(st.floats(0.0, 30.0), min_size=4, max_size=4), st.floats(0.0, 500.0))
def test_the_window_holds_the_profile_itself(values, depth):
    profile, where = np.array([values]), np.array([[depth]])
    lower, upper = climatology_window(profile, LEVELS, where, **ClimatologySettings().model_dump())
    itself = interpolate_profile(profile, LEVELS, where)
    assert lower.item() < itself.item() < upper.item()


def test_climatology_is_never_worse_than_questionable():
    temperature = np.array([[np.nan, 11.9, 12.0], [18.0, np.nan, 18.1], [-99.0, 99.0, np.nan]])
    outcome = climatology_outcome(temperature, np.array([[12.0]]), np.array([[18.0]]))
    np.testing.assert_array_equal(outcome, [[9, 3, 1], [1, 9, 3], [3, 3, 9]])


def test_an_unknown_window_judges_nothing():
    outcome = climatology_outcome(np.array([[20.0, np.nan]]), np.array([[np.nan]]), np.array([[np.nan]]))
    np.testing.assert_array_equal(outcome, [[2, 9]])


@pytest.mark.parametrize("place", [(0.5, 180.5), (-3.5, 250.5)])
def test_the_published_climatology_passes_at_its_own_points(make_chain, place):
    # The atlas's twelve months at its own grid points and levels, put in as a record.
    latitude, longitude = place
    published = monthly_temperature().sel(latitude=latitude, longitude=longitude)
    published = published.sel(depth=published["depth"] <= 500)
    depth = [float(value) for value in published["depth"]]
    months = published.transpose("month", "depth").values
    chain = make_chain(months, depth=depth, step=2628000, latitude=latitude, longitude=longitude)  # 365 d / 12
    chain = chain.assign_coords(time=chain["time"] + np.timedelta64(2628000 // 2, "s"))  # the middle of each month
    flagged = quality_control(chain)
    assert (flagged["temperature_qc_ran"].values & BIT).all()
    assert not (flagged["temperature_qc_questionable"].values & BIT).any()


def test_the_same_temperature_is_judged_by_where_the_sensor_was(make_chain):
    # At 300 m the Pacific is near 11 °C: 26 °C cannot be, unless the sensor hung at 20 m. NaN falls back to
    # nominal.
    chain = make_chain([26.0, 26.1, 26.2], depth=[300.0])
    chain["sensor_depth"] = (("time", "depth"), np.array([[20.0], [300.0], [np.nan]], dtype=np.float32))
    questionable = quality_control(chain)["temperature_qc_questionable"].values[:, 0] & BIT
    np.testing.assert_array_equal(questionable != 0, [False, True, True])


@pytest.mark.parametrize("place", [{"longitude": 10.0}, {"latitude": 60.0}, {"latitude": None}, {"longitude": None}])
def test_climatology_does_not_judge_without_an_atlas(make_chain, place):
    chain = make_chain([[28.0, 27.0]] * 4)
    known = {name: value for name, value in place.items() if value is not None}
    chain = chain.assign_coords(known).drop_vars([name for name in place if name not in known])
    assert not (quality_control(chain)["temperature_qc_ran"].values & BIT).any()


def test_a_wider_window_flags_no_more(make_chain):
    chain = make_chain(np.linspace(10.0, 33.0, 60)[:, None] + np.zeros(4))
    narrow, wide = (
        quality_control(chain, QualityControlSettings.model_validate({"climatology": {"deviations": n}}))
        for n in (2.0, 4.0)
    )
    inside = (narrow["temperature_qc_questionable"] & BIT) == 0
    assert inside.any()
    assert ((wide["temperature_qc_questionable"] & BIT) == 0).where(inside, True).all()
    assert ((wide["temperature_qc_questionable"] & BIT) != 0).any()
