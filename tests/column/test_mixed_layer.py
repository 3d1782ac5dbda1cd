"""The mixed layer: worked answers, every status, and an independent loop over profiles."""

from __future__ import annotations

import numpy as np
import pytest
import xarray as xr
from hypothesis import given, settings
from hypothesis import strategies as st

from profiles import mixed_layer_depth
from profiles.errors import DataError, RequestError
from profiles.vocabulary import MixedLayerStatus

NAN = np.nan
DEPTHS = (1.0, 10.0, 30.0, 50.0, 100.0)


def one(found: xr.Dataset) -> tuple[float, MixedLayerStatus]:
    return float(found["mixed_layer_depth"]), MixedLayerStatus(int(found["mixed_layer_status"]))


def test_mixed_layer_ends_where_the_water_is_colder_by_the_threshold(make_profile):
    # 29.0 at 10 m, 28.9 at 30 m, 28.5 at 50 m: 28.8 lies a quarter of the 20 m below 30 m.
    assert one(mixed_layer_depth(make_profile([29.3, 29.0, 28.9, 28.5, 24], DEPTHS))) == (
        pytest.approx(35.0),
        MixedLayerStatus.FOUND,
    )


def test_warmer_water_below_ends_the_mixed_layer_too(make_profile):
    # 28.0 at 10 m, 28.1 at 30 m, 28.5 at 50 m: 28.2 lies a quarter of the 20 m below 30 m.
    assert one(mixed_layer_depth(make_profile([28.0, 28.0, 28.1, 28.5, 24], DEPTHS)))[0] == pytest.approx(35.0)


def test_a_swing_past_the_threshold_ends_it_even_where_the_water_turns_back(make_profile):
    # 28.0 at 10 m, 28.1 at 30 m, 27.5 at 50 m: 27.8 lies 0.3 of 0.6 K down, half of the 20 m.
    assert one(mixed_layer_depth(make_profile([28.0, 28.0, 28.1, 27.5, 24], DEPTHS)))[0] == pytest.approx(40.0)


def test_the_reference_lies_on_the_line_between_the_sensors_about_it(make_profile):
    # 29.9 at 1 m, 28.0 at 20 m: at 10 m 29.9 - 1.9 * 9 / 19 = 29.0; 28.8 is a fifth of the way to 28.0 at 20 m.
    assert one(mixed_layer_depth(make_profile([29.9, 28.0], [1.0, 20.0])))[0] == pytest.approx(12.0)


def test_the_diurnal_layer_above_the_reference_does_not_count(make_profile):
    warm, cool = ([surface, 29.0, 28.9, 28.5, 24] for surface in (31.0, 29.0))
    assert one(mixed_layer_depth(make_profile(warm, DEPTHS))) == one(mixed_layer_depth(make_profile(cool, DEPTHS)))


def test_threshold_and_reference_can_be_set(make_profile):
    # 28.9 at 30 m, 28.5 at 50 m, 24 at 100 m: 28.9 - 0.85 = 28.05 is a tenth of the way from 50 to 100 m.
    profile = make_profile([29.3, 29.0, 28.9, 28.5, 24], DEPTHS)
    assert one(mixed_layer_depth(profile, threshold=0.85, reference_depth=30.0))[0] == pytest.approx(55.0)


@pytest.mark.parametrize(
    ("temperatures", "status"),
    [
        ([29, 29, 28.9, 28.9, 28.9], MixedLayerStatus.BELOW_CHAIN),
        ([NAN, NAN, 28.9, 28.5, 24], MixedLayerStatus.NO_REFERENCE),
        ([29, NAN, NAN, NAN, NAN], MixedLayerStatus.TOO_FEW_SENSORS),
        ([NAN, 29, NAN, NAN, NAN], MixedLayerStatus.TOO_FEW_SENSORS),
        ([NAN, NAN, NAN, NAN, 24], MixedLayerStatus.TOO_FEW_SENSORS),
        ([NAN] * 5, MixedLayerStatus.TOO_FEW_SENSORS),
    ],
)
def test_where_there_is_no_depth_the_status_says_why(make_profile, temperatures, status):
    depth, found = one(mixed_layer_depth(make_profile(temperatures, DEPTHS)))
    assert np.isnan(depth)
    assert found is status


def test_a_chain_that_ends_above_the_reference_has_none(make_profile):
    assert one(mixed_layer_depth(make_profile([29, 28], [1.0, 5.0])))[1] is MixedLayerStatus.NO_REFERENCE


def test_a_chain_that_ends_at_the_reference_is_mixed_to_its_end(make_profile):
    assert one(mixed_layer_depth(make_profile([29, 28], [1.0, 10.0])))[1] is MixedLayerStatus.BELOW_CHAIN


@pytest.mark.parametrize("missing", [0, 2, 4])
def test_a_missing_sensor_is_bridged(make_profile, missing):
    # Without 30 m the line runs from 10 m, 29.0, to 50 m, 28.0: 28.8 at 18 m; the others do not matter.
    temperatures = np.array([29.3, 29.0, 28.9, 28.0, 24.0])
    temperatures[missing] = NAN
    expected = 18.0 if missing == 2 else 30.0 + 20.0 / 9.0
    assert one(mixed_layer_depth(make_profile(temperatures, DEPTHS)))[0] == pytest.approx(expected)


def test_mixed_layer_uses_the_depths_where_the_sensors_were(make_profile):
    temperature = make_profile([[29.0, 28.0], [29.0, 28.0]], [10.0, 30.0])
    places = temperature.copy(data=[[10.0, 30.0], [10.0, 20.0]])
    found = mixed_layer_depth(temperature, sensor_depth=places)["mixed_layer_depth"]
    np.testing.assert_allclose(found, [14.0, 12.0])


def test_sensor_depths_out_of_order_are_refused(make_profile):
    temperature = make_profile([[29.0, 28.9, 28.0]], [10.0, 30.0, 50.0])
    places = temperature.copy(data=[[10.0, 50.0, 30.0]])
    with pytest.raises(DataError, match="sensor depths do not increase downwards"):
        mixed_layer_depth(temperature, sensor_depth=places)


@pytest.mark.parametrize("threshold", [0.0, -0.2, NAN])
def test_a_threshold_that_is_none_is_refused(make_profile, threshold):
    with pytest.raises(RequestError, match="not a threshold"):
        mixed_layer_depth(make_profile([29, 28], [1.0, 20.0]), threshold=threshold)


@pytest.mark.parametrize("dtype", [np.float32, np.float64])
def test_dask_and_both_floating_types_agree(make_profile, dtype):
    random = np.random.default_rng(5)
    values = 29.0 + random.normal(0, 0.15, (30, 5))
    values[random.random(values.shape) < 0.1] = NAN
    eager = make_profile(values, DEPTHS, dtype=dtype)
    found = mixed_layer_depth(eager)
    xr.testing.assert_identical(mixed_layer_depth(eager.chunk(time=7)).compute(), found)
    assert found["mixed_layer_depth"].dtype == dtype
    np.testing.assert_allclose(
        found["mixed_layer_depth"], mixed_layer_depth(eager.astype(np.float64))["mixed_layer_depth"], rtol=1e-6
    )


def by_hand(temperatures, depths):
    """Return depth and status of one profile by walking down the line in steps of 1 mm."""
    good = np.isfinite(temperatures)
    values, places = np.asarray(temperatures)[good], np.asarray(depths)[good]
    if good.sum() < 2:
        return NAN, MixedLayerStatus.TOO_FEW_SENSORS
    if not places[0] <= 10.0 <= places[-1]:
        return NAN, MixedLayerStatus.NO_REFERENCE
    fine = np.arange(10.0, places[-1] + 0.0005, 0.001)
    departure = np.abs(np.interp(fine, places, values) - np.interp(10.0, places, values))
    beyond = departure >= 0.2 - 1e-9
    return (fine[beyond.argmax()], MixedLayerStatus.FOUND) if beyond.any() else (NAN, MixedLayerStatus.BELOW_CHAIN)


readings = st.one_of(st.just(NAN), st.integers(-6, 6).map(lambda step: 28.0 + step / 16.0))


@settings(max_examples=200, deadline=None)
@given(temperatures=st.lists(readings, min_size=1, max_size=6), top=st.sampled_from([1.0, 10.0, 12.0]))
def test_mixed_layer_agrees_with_a_walk_down_the_profile(make_profile, temperatures, top):
    depths = top + 6.0 * np.arange(len(temperatures))
    depth, status = by_hand(temperatures, depths)
    found, found_status = one(mixed_layer_depth(make_profile(temperatures, depths)))
    assert found_status is status
    assert found == pytest.approx(depth, abs=0.0015, nan_ok=True)
