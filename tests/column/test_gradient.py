"""The depth of the steepest fall: worked answers, an exact cubic, and an independent loop over profiles."""

from __future__ import annotations

import numpy as np
import pytest
import xarray as xr
from hypothesis import given
from hypothesis import strategies as st

from profiles.column import steepest_gradient_depth
from profiles.errors import DataError

NAN = np.nan
DEPTHS = (0.0, 20.0, 40.0, 60.0, 80.0)


def one(temperature: xr.DataArray, **places: xr.DataArray) -> float:
    return float(steepest_gradient_depth(temperature, **places)["steepest_gradient_depth"])


def test_the_steepest_fall_by_hand(make_profile):
    # Falls of 1, 5, 3, 1 over 20 m, at 10, 30, 50, 70 m. The parabola through (10, 1), (30, 5), (50, 3) per 20 m:
    # slope at 30 (4 - 2) / 40 = 0.05, bend (-2 - 4) / 400 = -0.015; the top is 0.05 / 0.015 = 10/3 below 30 m.
    assert one(make_profile([28, 27, 22, 19, 18], DEPTHS)) == pytest.approx(30.0 + 10.0 / 3.0)


def test_uneven_sensors_by_hand(make_profile):
    # Between 0, 10, 30, 70 m: falls 0.1, 0.25, 0.05 per m at 5, 20, 50 m. Steps of 15 and 30 m:
    # rise 0.15 / 15 = 0.01, decline -0.2 / 30 = -1/150; slope (0.01 x 30 - 15/150) / 45 = 0.2 / 45 = 1/225;
    # the top lies 1/225 x 22.5 / (0.01 + 1/150) = 0.1 x 60 = 6 m below 20 m.
    assert one(make_profile([28, 27, 22, 20], (0.0, 10.0, 30.0, 70.0))) == pytest.approx(26.0)


def test_three_sensors_give_the_middle_of_the_steeper_pair(make_profile):
    assert one(make_profile([28, 27, 22], (0.0, 20.0, 50.0))) == 35.0
    assert one(make_profile([28, 22, 21], (0.0, 20.0, 50.0))) == 10.0


@pytest.mark.parametrize("steepest", [52.0, 60.0, 71.0])
def test_a_cubic_is_found_exactly(make_profile, steepest):
    """T = 20 - 0.1 d + 1e-5 d^3 with d = z - z0: over equal steps its falls are a parabola about z0."""
    depth = np.arange(0.0, 141.0, 20.0)
    from_it = depth - steepest
    assert one(make_profile(20.0 - 0.1 * from_it + 1e-5 * from_it**3, depth)) == pytest.approx(steepest, abs=1e-9)


def test_a_warmer_ocean_has_its_steepest_fall_where_it_was(make_profile):
    """This is what it is for: warming moves the isotherm, a deepening moves both."""
    depth = np.arange(0.0, 301.0, 20.0)
    profile = make_profile(20.0 - 7.0 * np.tanh((depth - 130.0) / 40.0), depth)
    deeper = make_profile(20.0 - 7.0 * np.tanh((depth - 150.0) / 40.0), depth)
    assert one(profile) == pytest.approx(130.0, abs=0.2)
    assert one(profile + 1.5) == pytest.approx(one(profile), abs=1e-9)
    assert one(deeper) == pytest.approx(one(profile) + 20.0, abs=1e-3)


@pytest.mark.parametrize("dtype", [np.float32, np.float64])
def test_a_straight_line_between_two_levels_is_one_layer(make_profile, dtype):
    """A model's levels at 100 and 150 m, read at sensors every 10 m: rounding must not choose among them."""
    depth = np.arange(50.0, 201.0, 10.0)
    read = np.interp(depth, [50.0, 100.0, 150.0, 200.0], [28.0, 26.3, 17.7, 14.1])
    assert one(make_profile(read, depth, dtype=dtype)) == 125.0


@pytest.mark.parametrize("temperatures", [[20, 21, 22, 23, 24], [20, 20, 20, 20, 20]])
def test_water_that_never_cools_has_none(make_profile, temperatures):
    assert np.isnan(one(make_profile(temperatures, DEPTHS)))


@pytest.mark.parametrize(
    "temperatures",
    [[28, NAN, NAN, NAN, 18], [NAN] * 5, [NAN, NAN, 22, NAN, NAN]],
    ids=["two sensors", "none", "one"],
)
def test_fewer_than_three_sensors_tell_nothing(make_profile, temperatures):
    assert np.isnan(one(make_profile(temperatures, DEPTHS)))


@pytest.mark.parametrize(
    ("missing", "expected"),
    [
        # Falls 5, 3, 1 at 30, 50, 70 m: the first is the steepest.
        (0, 30.0),
        # Falls 6/40, 3/20, 1/20 from 0, 40, 60 m: two alike, one layer from 0 to 60 m.
        (1, 30.0),
        # Falls 1/20, 8/40, 1/20 at 10, 40, 70 m: even about 40 m.
        (2, 40.0),
        # As by hand above: the deepest fall has no part in it.
        (4, 30.0 + 10.0 / 3.0),
    ],
)
def test_a_missing_sensor_is_bridged(make_profile, missing, expected):
    temperatures = np.array([28.0, 27.0, 22.0, 19.0, 18.0])
    temperatures[missing] = NAN
    assert one(make_profile(temperatures, DEPTHS)) == pytest.approx(expected)


def test_sensors_are_taken_where_they_really_were(make_profile):
    profile = make_profile([28, 27, 22, 19, 18], DEPTHS)
    moved = profile.copy(data=np.array(DEPTHS) - 5.0)
    assert one(profile, sensor_depth=moved) == pytest.approx(25.0 + 10.0 / 3.0)


def test_sensors_out_of_order_are_refused(make_profile):
    profile = make_profile([28, 27, 22, 19, 18], DEPTHS)
    crossed = profile.copy(data=np.array([0.0, 40.0, 20.0, 60.0, 80.0]))
    with pytest.raises(DataError, match=r"sensor depths do not increase downwards.*1 profiles"):
        steepest_gradient_depth(profile, sensor_depth=crossed)


def test_the_result_is_labelled_and_of_the_temperatures_precision(make_profile):
    found = steepest_gradient_depth(make_profile([[28, 27, 22, 19, 18]] * 3, DEPTHS, dtype=np.float32))
    assert found["steepest_gradient_depth"].dims == ("time",)
    assert found["steepest_gradient_depth"].dtype == np.float32
    assert found["steepest_gradient_depth"].attrs["units"] == "m"


def parabola_of(temperature: np.ndarray, depth: np.ndarray) -> float:
    """The same by NumPy's fit of a parabola to three points."""
    good = np.isfinite(temperature)
    temperature, depth = temperature[good], depth[good]
    if temperature.size < 3:
        return np.nan
    falls, places = -np.diff(temperature) / np.diff(depth), 0.5 * (depth[1:] + depth[:-1])
    top = int(np.argmax(falls))
    if falls[top] <= 0.0:
        return np.nan
    alike = np.abs(falls - falls[top]) <= 1e-4 * falls[top]
    end = top + int(np.argmin(np.append(alike[top:], False)))
    if end > top + 1:
        return float(0.5 * (depth[top] + depth[end]))
    if top in (0, falls.size - 1):
        return float(places[top])
    around = slice(top - 1, top + 2)
    square, linear, _ = np.polyfit(places[around] - places[top], falls[around], 2)
    return float(places[top] - 0.5 * linear / square)


@given(
    tenths=st.lists(st.one_of(st.none(), st.integers(100, 300)), min_size=3, max_size=9),
    steps=st.lists(st.integers(5, 50), min_size=9, max_size=9),
)
def test_it_is_the_top_of_a_fitted_parabola(tenths, steps):
    temperature = np.array([NAN if value is None else value / 10.0 for value in tenths])
    depth = np.cumsum(np.array(steps[: temperature.size], dtype=np.float64))
    found = one(xr.DataArray(temperature, dims="depth", coords={"depth": depth}))
    np.testing.assert_allclose(found, parabola_of(temperature, depth), atol=1e-5)
