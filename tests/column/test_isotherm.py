"""The isotherm's depth: worked answers, every status, and an independent loop over profiles."""

from __future__ import annotations

from itertools import pairwise

import dask.array
import numpy as np
import pytest
import xarray as xr
from hypothesis import given, settings
from hypothesis import strategies as st

from profiles import isotherm_depth
from profiles.errors import DataError, RequestError
from profiles.vocabulary import IsothermStatus

NAN = np.nan
DEPTHS = (1.0, 50.0, 100.0, 140.0, 200.0)


def one(found: xr.Dataset) -> tuple[float, IsothermStatus, float]:
    """Return depth, status and bracket of a single profile."""
    return (
        float(found["isotherm_depth"]),
        IsothermStatus(int(found["isotherm_status"])),
        float(found["bracket"]),
    )


# --------------------------------------------------------------------------------------------------------------
# Worked answers


def test_isotherm_depth_is_linear_between_the_bracketing_sensors(make_profile):
    # 22 at 100 m, 12 at 140 m: 20 lies 2/10 of the 40 m down, at 108 m.
    assert one(isotherm_depth(make_profile([29, 27, 22, 12, 10], DEPTHS))) == (108.0, IsothermStatus.FOUND, 40.0)


def test_isotherm_depth_takes_any_isotherm(make_profile):
    # 27 at 50 m, 22 at 100 m: 26 lies 1/5 of the 50 m down.
    profile = make_profile([29, 27, 22, 12, 10], DEPTHS)
    assert one(isotherm_depth(profile, isotherm=26.0)) == (60.0, IsothermStatus.FOUND, 50.0)


def test_isotherm_depth_at_a_sensor_is_that_sensors_depth(make_profile):
    assert one(isotherm_depth(make_profile([29, 27, 20, 12, 10], DEPTHS)))[0] == 100.0


def test_isotherm_depth_at_the_last_sensor_is_found_without_a_bracket(make_profile):
    assert one(isotherm_depth(make_profile([29, 27, 25, 22, 20], DEPTHS))) == (200.0, IsothermStatus.FOUND, 0.0)


def test_isotherm_depth_at_the_first_sensor_is_not_an_outcrop(make_profile):
    assert one(isotherm_depth(make_profile([20, 19, 18, 17, 16], DEPTHS)))[:2] == (1.0, IsothermStatus.FOUND)


def test_isotherm_depth_of_a_layer_at_the_isotherm_is_its_bottom(make_profile):
    # The isotherm lies where water at least as warm stands over colder water: under the last 20.
    assert one(isotherm_depth(make_profile([29, 20, 20, 20, 10], DEPTHS)))[:2] == (140.0, IsothermStatus.FOUND)


# --------------------------------------------------------------------------------------------------------------
# Statuses


def test_isotherm_depth_reports_an_outcrop_at_zero(make_profile):
    assert one(isotherm_depth(make_profile([19, 18, 15, 12, 10], DEPTHS)))[:2] == (0.0, IsothermStatus.OUTCROPPED)


def test_isotherm_depth_above_the_chain_is_unknown_not_zero(make_profile):
    depth, status, _ = one(isotherm_depth(make_profile([NAN, 18, 15, 12, 10], DEPTHS)))
    assert np.isnan(depth)
    assert status is IsothermStatus.ABOVE_CHAIN


@pytest.mark.parametrize(("top", "status"), [(5.0, IsothermStatus.OUTCROPPED), (5.1, IsothermStatus.ABOVE_CHAIN)])
def test_a_sensor_stands_for_the_surface_down_to_5_m(make_profile, top, status):
    assert one(isotherm_depth(make_profile([19, 18], [top, 50.0])))[1] is status


def test_surface_reach_can_be_set(make_profile):
    found = isotherm_depth(make_profile([19, 18], [10.0, 50.0]), surface_reach=10.0)
    assert one(found)[1] is IsothermStatus.OUTCROPPED


def test_isotherm_depth_below_the_chain_is_missing(make_profile):
    depth, status, bracket = one(isotherm_depth(make_profile([29, 28, 27, 24, NAN], DEPTHS)))
    assert np.isnan(depth)
    assert np.isnan(bracket)
    assert status is IsothermStatus.BELOW_CHAIN


def test_cold_water_over_warm_alone_leaves_the_isotherm_below_the_chain(make_profile):
    assert one(isotherm_depth(make_profile([19, 19, 21, 22, 23], DEPTHS)))[1] is IsothermStatus.BELOW_CHAIN


@pytest.mark.parametrize(("limit", "status"), [(40.0, IsothermStatus.FOUND), (39.9, IsothermStatus.GAP)])
def test_sensors_further_apart_than_max_bracket_are_a_gap(make_profile, limit, status):
    found = isotherm_depth(make_profile([29, 27, 22, 12, 10], DEPTHS), max_bracket=limit)
    assert one(found)[1] is status
    assert bool(found["isotherm_depth"].isnull()) == (status is IsothermStatus.GAP)


def test_a_missing_sensor_widens_the_bracket(make_profile):
    # 27 at 50 m, 12 at 140 m: 7/15 of 90 m below 50 m.
    profile = make_profile([29, 27, NAN, 12, 10], DEPTHS)
    assert one(isotherm_depth(profile)) == (pytest.approx(50 + 90 * 7 / 15), IsothermStatus.FOUND, 90.0)
    assert one(isotherm_depth(profile, max_bracket=75.0))[1] is IsothermStatus.GAP


@pytest.mark.parametrize(("crossing", "expected"), [("shallowest", 75.0), ("deepest", 170.0)])
def test_of_several_crossings_the_asked_one_is_given(make_profile, crossing, expected):
    # Down through 20 at 75 m (22 at 50, 18 at 100), up again, down at 170 m (21 at 140, 19 at 200).
    profile = make_profile([29, 22, 18, 21, 19], DEPTHS)
    assert one(isotherm_depth(profile, crossing=crossing))[:2] == (expected, IsothermStatus.SEVERAL_CROSSINGS)


def test_an_upward_passage_counts_as_a_crossing_but_is_never_given(make_profile):
    # Cold above 50 m, warm from 100 m, cold at 200 m: only the passage from 24 at 140 m to 16 at 200 m is given.
    profile = make_profile([19, 19, 24, 24, 16], DEPTHS)
    for crossing in ("shallowest", "deepest"):
        assert one(isotherm_depth(profile, crossing=crossing))[:2] == (170.0, IsothermStatus.SEVERAL_CROSSINGS)


def test_a_gap_at_the_asked_crossing_goes_before_several_crossings(make_profile):
    profile = make_profile([29, 22, 18, 21, 19], DEPTHS)
    assert one(isotherm_depth(profile, crossing="deepest", max_bracket=50.0))[1] is IsothermStatus.GAP
    assert one(isotherm_depth(profile, crossing="shallowest", max_bracket=50.0))[0] == 75.0


@pytest.mark.parametrize("temperatures", [[NAN] * 5, [29, NAN, NAN, NAN, NAN], [NAN, NAN, 19, NAN, NAN]])
def test_fewer_than_two_good_sensors_are_too_few(make_profile, temperatures):
    found = isotherm_depth(make_profile(temperatures, DEPTHS))
    assert one(found)[1] is IsothermStatus.TOO_FEW_SENSORS
    assert bool(found["isotherm_depth"].isnull())


def test_a_chain_of_one_sensor_is_too_few(make_profile):
    assert one(isotherm_depth(make_profile([19], [1.0])))[1] is IsothermStatus.TOO_FEW_SENSORS


@pytest.mark.parametrize("missing", [0, 1, 4])
def test_a_missing_sensor_away_from_the_bracket_changes_nothing(make_profile, missing):
    temperatures = np.array([29, 27, 22, 12, 10], dtype=float)
    temperatures[missing] = NAN
    assert one(isotherm_depth(make_profile(temperatures, DEPTHS))) == (108.0, IsothermStatus.FOUND, 40.0)


def test_infinite_temperatures_are_missing(make_profile):
    assert one(isotherm_depth(make_profile([29, np.inf, 22, 12, -np.inf], DEPTHS)))[0] == 108.0


# --------------------------------------------------------------------------------------------------------------
# Depths of the sensors


def test_sensor_depth_per_time_replaces_the_nominal_depth(make_profile):
    temperature = make_profile([[24, 16], [24, 16]], [100.0, 120.0])
    places = temperature.copy(data=[[100.0, 120.0], [90.0, 100.0]])
    assert isotherm_depth(temperature, sensor_depth=places)["isotherm_depth"].values.tolist() == [110.0, 95.0]


def test_sensor_depth_shared_by_all_times_is_allowed(make_profile):
    temperature = make_profile([[24, 16], [22, 18]], [100.0, 120.0])
    shared = xr.DataArray([80.0, 90.0], dims="depth", coords={"depth": temperature["depth"]})
    assert isotherm_depth(temperature, sensor_depth=shared)["isotherm_depth"].values.tolist() == [85.0, 85.0]


def test_a_sensor_of_unknown_depth_is_missing(make_profile):
    temperature = make_profile([[29, 24, 16], [29, 24, 16]], [50.0, 100.0, 120.0])
    places = temperature.copy(data=[[50.0, 100.0, 120.0], [50.0, NAN, 120.0]])
    # Without the 100 m sensor: 29 at 50 m, 16 at 120 m, 9/13 of 70 m down.
    found = isotherm_depth(temperature, sensor_depth=places)
    np.testing.assert_allclose(found["isotherm_depth"], [110.0, 50 + 70 * 9 / 13])
    assert found["bracket"].values.tolist() == [20.0, 70.0]


def test_sensor_depths_out_of_order_are_refused(make_profile):
    temperature = make_profile([[24, 16], [24, 16]], [100.0, 120.0])
    places = temperature.copy(data=[[100.0, 120.0], [120.0, 100.0]])
    with pytest.raises(DataError, match=r"sensor depths do not increase downwards.*1 profiles"):
        isotherm_depth(temperature, sensor_depth=places)


def test_sensors_out_of_order_only_where_missing_are_no_disorder(make_profile):
    temperature = make_profile([24, NAN, 16], [100.0, 110.0, 120.0])
    places = temperature.copy(data=[100.0, 90.0, 120.0])
    assert float(isotherm_depth(temperature, sensor_depth=places)["isotherm_depth"]) == 110.0


@pytest.mark.parametrize("depths", [(100.0, 50.0), (50.0, 50.0)])
def test_a_depth_coordinate_that_does_not_ascend_is_refused(make_profile, depths):
    with pytest.raises(DataError, match="sensor depths are not in order"):
        isotherm_depth(make_profile([24, 16], depths))


def test_temperature_without_depth_is_refused():
    with pytest.raises(DataError, match="no vertical dimension"):
        isotherm_depth(xr.DataArray([24.0, 16.0], dims="level"))
    with pytest.raises(DataError, match="does not say how deep"):
        isotherm_depth(xr.DataArray([24.0, 16.0], dims="depth"))


def test_bare_numbers_are_refused():
    with pytest.raises(RequestError, match="not labelled"):
        isotherm_depth(np.array([24.0, 16.0]))


def test_sensor_depth_with_a_foreign_dimension_is_refused(make_profile):
    temperature = make_profile([24, 16], [100.0, 120.0])
    foreign = temperature.expand_dims(mooring=2)
    with pytest.raises(DataError, match="sensor_depth does not fit"):
        isotherm_depth(temperature, sensor_depth=foreign)


@pytest.mark.parametrize("choice", [{"method": "cubic"}, {"crossing": "middle"}])
def test_a_choice_that_there_is_not_is_refused(make_profile, choice):
    with pytest.raises(RequestError, match="no such choice"):
        isotherm_depth(make_profile([24, 16], [100.0, 120.0]), **choice)


# --------------------------------------------------------------------------------------------------------------
# Labels, types, laziness


def test_dimensions_may_come_in_any_order_and_number(make_profile):
    random = np.random.default_rng(3)
    values = -np.sort(-random.uniform(10, 30, (2, 3, 4, 5)), axis=-1)
    cube = xr.DataArray(values, dims=("model", "time", "mooring", "depth"), coords={"depth": list(DEPTHS)})
    straight = isotherm_depth(cube)["isotherm_depth"]
    turned = isotherm_depth(cube.transpose("depth", "mooring", "model", "time"))["isotherm_depth"]
    assert turned.dims == ("mooring", "model", "time")
    xr.testing.assert_equal(turned.transpose(*straight.dims), straight)


@pytest.mark.parametrize("dtype", [np.float32, np.float64])
def test_floating_types_are_those_of_the_temperature(make_profile, dtype):
    found = isotherm_depth(make_profile([29, 27, 22, 12, 10], DEPTHS, dtype=dtype))
    assert found["isotherm_depth"].dtype == dtype
    assert found["bracket"].dtype == dtype
    assert found["isotherm_status"].dtype == np.int8
    assert float(found["isotherm_depth"]) == 108.0


def test_dask_stays_lazy_and_gives_what_numpy_gives(make_profile):
    random = np.random.default_rng(4)
    values = -np.sort(-random.uniform(10, 30, (40, 5)), axis=-1)
    values[random.random(values.shape) < 0.1] = NAN
    eager = make_profile(values, DEPTHS)
    lazy = isotherm_depth(eager.chunk(time=7, depth=2))
    assert isinstance(lazy["isotherm_depth"].data, dask.array.Array)
    xr.testing.assert_identical(lazy.compute(), isotherm_depth(eager))


def test_the_rule_stands_in_the_attributes(make_profile):
    found = isotherm_depth(make_profile([24, 16], [100.0, 120.0]), isotherm=19.5, max_bracket=60, crossing="deepest")
    comment = found["isotherm_depth"].attrs["comment"]
    for part in ("19.5 degree_Celsius", "at most 60 m", "deepest crossing", "0 where the isotherm outcrops"):
        assert part in comment
    assert found["isotherm_depth"].attrs["units"] == "m"
    assert "outcropped" in found["isotherm_status"].attrs["flag_meanings"]


# --------------------------------------------------------------------------------------------------------------
# Properties and an independent loop


def by_hand(temperatures, depths, isotherm, max_bracket, deepest):
    """Return depth and status of one profile by a list of its downward passages."""
    good = [(t, z) for t, z in zip(temperatures, depths, strict=True) if not np.isnan(t)]
    if len(good) < 2:
        return NAN, IsothermStatus.TOO_FEW_SENSORS
    pairs = list(pairwise(good))
    changes = [pair for pair in pairs if (pair[0][0] >= isotherm) != (pair[1][0] >= isotherm)]
    downward = [pair for pair in changes if pair[0][0] >= isotherm]
    if not downward:
        if good[-1][0] == isotherm:
            return good[-1][1], IsothermStatus.SEVERAL_CROSSINGS if changes else IsothermStatus.FOUND
        if good[-1][0] > isotherm:
            return NAN, IsothermStatus.BELOW_CHAIN
        return (0.0, IsothermStatus.OUTCROPPED) if good[0][1] <= 5.0 else (NAN, IsothermStatus.ABOVE_CHAIN)
    (warm, upper), (cold, lower) = downward[-1 if deepest else 0]
    if lower - upper > max_bracket:
        return NAN, IsothermStatus.GAP
    depth = np.interp(isotherm, [cold, warm], [lower, upper])
    return depth, IsothermStatus.FOUND if len(changes) == 1 else IsothermStatus.SEVERAL_CROSSINGS


# Steps of 1/8 °C about the isotherm, so that values at the isotherm and equal neighbours are drawn often.
readings = st.one_of(st.just(NAN), st.integers(-24, 24).map(lambda step: 20.0 + step / 8.0))
chains = st.lists(readings, min_size=1, max_size=9)


@settings(max_examples=300, deadline=None)
@given(
    temperatures=chains, top=st.sampled_from([1.0, 5.0, 8.0]), gap=st.sampled_from([25.0, 75.0]), deepest=st.booleans()
)
def test_isotherm_depth_agrees_with_a_loop_over_passages(make_profile, temperatures, top, gap, deepest):
    depths = top + 20.0 * np.arange(len(temperatures)) + np.arange(len(temperatures)) ** 2
    found = isotherm_depth(
        make_profile(temperatures, depths), max_bracket=gap, crossing="deepest" if deepest else "shallowest"
    )
    depth, status = by_hand(temperatures, depths, 20.0, gap, deepest)
    assert one(found)[1] is status
    assert float(found["isotherm_depth"]) == pytest.approx(depth, abs=1e-9, nan_ok=True)


@settings(max_examples=100, deadline=None)
@given(temperatures=chains, shift=st.integers(-80, 80).map(lambda step: step / 8.0))
def test_warming_profile_and_isotherm_alike_leaves_the_depth(make_profile, temperatures, shift):
    depths = 1.0 + 20.0 * np.arange(len(temperatures))
    profile = make_profile(temperatures, depths)
    xr.testing.assert_equal(isotherm_depth(profile), isotherm_depth(profile + shift, isotherm=20.0 + shift))


@settings(max_examples=100, deadline=None)
@given(temperatures=chains, shift=st.sampled_from([0.5, 16.0, 128.0]))
def test_lowering_the_chain_lowers_a_depth_that_is_given_by_as_much(make_profile, temperatures, shift):
    depths = 8.0 + 32.0 * np.arange(len(temperatures))  # below the surface's reach: an outcrop would not shift
    here = isotherm_depth(make_profile(temperatures, depths))
    lower = isotherm_depth(make_profile(temperatures, depths + shift))
    np.testing.assert_allclose(lower["isotherm_depth"], here["isotherm_depth"] + shift, rtol=1e-12)
    np.testing.assert_array_equal(lower["isotherm_status"], here["isotherm_status"])
