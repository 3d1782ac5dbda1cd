"""The mean temperature of a layer: worked answers, every status, properties."""

from __future__ import annotations

import numpy as np
import pytest
import xarray as xr

from profiles.column import layer_mean_temperature
from profiles.errors import DataError, RequestError
from profiles.vocabulary import LayerMeanStatus

NAN = np.nan


def one(found: xr.Dataset) -> tuple[float, LayerMeanStatus]:
    return float(found["mean_temperature"]), LayerMeanStatus(int(found["mean_temperature_status"]))


def test_layer_mean_is_trapezoids_with_the_shallowest_value_up_to_the_surface(make_profile):
    # 0-4 m at 28: 112; 4-104 m from 28 to 20: 2400; 104-204 m from 20 to 12: 1600; 204-304 m from 12 to 8, of which
    # 96 m end at 12 - 4 * 0.96 = 8.16: 96 * 10.08 = 967.68. Sum 5079.68 over 300 m.
    profile = make_profile([28, 20, 12, 8], [4.0, 104.0, 204.0, 304.0])
    assert one(layer_mean_temperature(profile)) == (pytest.approx(5079.68 / 300), LayerMeanStatus.FOUND)


def test_layer_mean_to_a_sensor_does_not_need_the_ones_below(make_profile):
    # 0-100 m from 28 to 20: 24.
    profile = make_profile([28, 20, 12], [0.0, 100.0, 200.0])
    assert one(layer_mean_temperature(profile, bottom=100.0))[0] == pytest.approx(24.0)
    assert one(layer_mean_temperature(profile.isel(depth=[0, 1]), bottom=100.0))[0] == pytest.approx(24.0)


def test_layer_mean_above_the_first_sensor_is_its_value(make_profile):
    assert one(layer_mean_temperature(make_profile([28, 20], [4.0, 100.0]), bottom=3.0))[0] == pytest.approx(28.0)


@pytest.mark.parametrize("depths", [(1.0, 50.0, 300.0), (0.0, 10.0, 20.0, 150.0, 500.0)])
def test_layer_mean_of_a_constant_profile_is_that_constant(make_profile, depths):
    assert one(layer_mean_temperature(make_profile([17.25] * len(depths), depths)))[0] == pytest.approx(17.25)


@pytest.mark.parametrize("missing", [0, 1])
def test_a_missing_sensor_is_bridged(make_profile, missing):
    # Of 28, 20, 12 at 1, 2, 101 m without the first: 20 to 2 m, then 20 to 12 over 99 m, cut at 101: (40 + 1584) / 101;
    # without the second: 28 to 1 m, then 28 to 12 over 100 m: (28 + 2000) / 101.
    temperatures = np.array([28.0, 20.0, 12.0])
    temperatures[missing] = NAN
    expected = (1624.0 if missing == 0 else 2028.0) / 101.0
    found = layer_mean_temperature(make_profile(temperatures, [1.0, 2.0, 101.0]), bottom=101.0)
    assert one(found)[0] == pytest.approx(expected)


@pytest.mark.parametrize(
    ("temperatures", "status"),
    [
        ([NAN, 27, 20, 12], LayerMeanStatus.OPEN_TOP),
        ([28, 27, 20, NAN], LayerMeanStatus.OPEN_BOTTOM),
        ([28, 27, NAN, 12], LayerMeanStatus.GAP),
        ([28, NAN, NAN, NAN], LayerMeanStatus.TOO_FEW_SENSORS),
        ([NAN, NAN, NAN, 12], LayerMeanStatus.TOO_FEW_SENSORS),
        ([NAN] * 4, LayerMeanStatus.TOO_FEW_SENSORS),
    ],
)
def test_where_there_is_no_mean_the_status_says_why(make_profile, temperatures, status):
    found = layer_mean_temperature(make_profile(temperatures, [1.0, 100.0, 200.0, 300.0]), max_gap=150.0)
    mean, given = one(found)
    assert np.isnan(mean)
    assert given is status


def test_a_gap_below_the_layer_does_not_matter(make_profile):
    profile = make_profile([28, 20, 8], [1.0, 100.0, 500.0])
    assert one(layer_mean_temperature(profile, bottom=100.0, max_gap=150.0))[1] is LayerMeanStatus.FOUND


def test_layer_mean_uses_the_depths_where_the_sensors_were(make_profile):
    temperature = make_profile([[28.0, 20.0], [28.0, 20.0]], [0.0, 100.0])
    places = temperature.copy(data=[[0.0, 100.0], [0.0, 200.0]])
    # To 100 m the second line has come to 24: mean 26.
    found = layer_mean_temperature(temperature, bottom=100.0, sensor_depth=places)["mean_temperature"]
    np.testing.assert_allclose(found, [24.0, 26.0])


def test_sensor_depths_out_of_order_are_refused(make_profile):
    temperature = make_profile([[28.0, 24.0, 20.0]], [1.0, 100.0, 300.0])
    places = temperature.copy(data=[[1.0, 300.0, 100.0]])
    with pytest.raises(DataError, match="sensor depths do not increase downwards"):
        layer_mean_temperature(temperature, sensor_depth=places)


@pytest.mark.parametrize("bottom", [0.0, -10.0, NAN])
def test_a_layer_without_thickness_is_refused(make_profile, bottom):
    with pytest.raises(RequestError, match="no layer"):
        layer_mean_temperature(make_profile([28, 20], [1.0, 100.0]), bottom=bottom)


def test_layer_mean_agrees_with_a_fine_sum_over_many_profiles(make_profile):
    random = np.random.default_rng(6)
    depths = np.array([2.0, 20.0, 75.0, 160.0, 310.0])
    values = random.uniform(5, 30, (20, depths.size))
    fine = (np.arange(30000) + 0.5) / 100.0  # np.interp holds the first value up to the surface
    expected = [np.interp(fine, depths, profile).mean() for profile in values]
    found = layer_mean_temperature(make_profile(values, depths).chunk(time=6))["mean_temperature"]
    np.testing.assert_allclose(found, expected, atol=1e-3)
