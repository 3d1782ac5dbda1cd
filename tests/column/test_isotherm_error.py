"""The isotherm's error: both parts by hand, and the share of truth inside the stated interval."""

from __future__ import annotations

import numpy as np
import pytest
import xarray as xr

from profiles.column import isotherm_depth, isotherm_depth_error

INDEPENDENT = "isotherm_depth_error_independent"
PERSISTENT = "isotherm_depth_error_persistent"


def accuracy(profile, *values):
    return xr.DataArray(np.array(values), dims="depth", coords={"depth": profile["depth"]})


def test_both_parts_of_the_error_by_hand(make_profile):
    # 26 at 100 m and 16 at 120 m: dz/dT = 2 m/K and f = 0.6, so sqrt(0.4^2 + 0.6^2) = 0.72111.
    # Independent: 2 * 0.72111 * 0.05 = 0.072111 m.
    # Calibration 2 * sqrt((0.4 * 0.1)^2 + (0.6 * 0.2)^2) = 0.252982 m, depth 0.72111 * 1.5 = 1.081665 m; no other
    # sensor, so no bend is seen. Persistent: 1.110855 m; whole: 1.113194 m.
    profile = make_profile([26, 16], [100.0, 120.0])
    error = isotherm_depth_error(profile, accuracy(profile, 0.1, 0.2), noise=0.05, depth_accuracy=1.5)
    assert float(error[INDEPENDENT]) == pytest.approx(0.072111, abs=1e-6)
    assert float(error[PERSISTENT]) == pytest.approx(1.110855, abs=1e-6)
    assert float(error["isotherm_depth_error"]) == pytest.approx(1.113194, abs=1e-6)


def test_a_leaning_line_moves_both_sensors_alike(make_profile):
    # dz/dT = 2 m/K between 26 at 100 m and 16 at 120 m: 0.3 K are 0.6 m, whatever the share.
    profile = make_profile([26, 16], [100.0, 120.0])
    error = isotherm_depth_error(profile, accuracy(profile, 0, 0), noise=0.0, depth_accuracy=0.0, motion=0.3)
    assert float(error[PERSISTENT]) == pytest.approx(0.6)
    assert float(error[INDEPENDENT]) == 0.0


@pytest.mark.parametrize("temperatures", [(26, 25, 15, 13), (27, 25, 15, 14)])
def test_the_larger_bend_beside_the_bracket_adds_to_the_persistent_part(make_profile, temperatures):
    # Gradients -0.05, -0.5 and -0.1 K/m. T'' at 100 m: 2 (-0.5 + 0.05) / 40 = -0.0225; at 120 m: 2 (0.4) / 40 = 0.02;
    # in the other profile -0.02 and 0.0225. f = 0.5, dz/dT = 2: the error of the chord is
    # 0.5 * 0.25 * 20^2 * 0.0225 * 2 = 2.25 m.
    profile = make_profile(temperatures, [80.0, 100.0, 120.0, 140.0])
    error = isotherm_depth_error(profile, accuracy(profile, 0, 0, 0, 0), noise=0.0, depth_accuracy=0.0)
    assert float(error[PERSISTENT]) == pytest.approx(2.25)
    assert float(error[INDEPENDENT]) == 0.0


def test_the_bend_is_seen_past_missing_sensors(make_profile):
    profile = make_profile([26, np.nan, 25, 15, np.nan, 13], [80.0, 90.0, 100.0, 120.0, 130.0, 140.0])
    error = isotherm_depth_error(profile, accuracy(profile, *[0] * 6), noise=0.0, depth_accuracy=0.0)
    assert float(error[PERSISTENT]) == pytest.approx(2.25)


def test_a_straight_profile_has_no_error_of_the_chord(make_profile):
    profile = make_profile([30, 25, 15, 10], [90.0, 100.0, 120.0, 130.0])
    error = isotherm_depth_error(profile, accuracy(profile, 0, 0, 0, 0), noise=0.0, depth_accuracy=0.0)
    assert float(error[PERSISTENT]) == pytest.approx(0.0, abs=1e-12)


def test_the_error_is_the_derivative_of_the_depth(make_profile):
    # Each sensor moved by a small amount on its own; the depths' changes add in quadrature (no bend: two sensors).
    base, depths, step = np.array([23.0, 18.0]), np.array([60.0, 95.0]), 1e-6
    depth = float(isotherm_depth(make_profile(base, depths))["isotherm_depth"])
    moved = [float(isotherm_depth(make_profile(base + step * np.eye(2)[i], depths))["isotherm_depth"]) for i in (0, 1)]
    expected = np.hypot(*(np.array(moved) - depth)) / step
    profile = make_profile(base, depths)
    error = isotherm_depth_error(profile, accuracy(profile, 0, 0), noise=1.0, depth_accuracy=0.0)
    assert float(error[INDEPENDENT]) == pytest.approx(expected, rel=1e-5)


@pytest.mark.parametrize("temperatures", [[19, 18, 17], [29, 28, 27], [29, np.nan, np.nan]])
def test_where_no_isotherm_is_bracketed_there_is_no_error(make_profile, temperatures):
    profile = make_profile(temperatures, [1.0, 50.0, 100.0])
    error = isotherm_depth_error(profile, accuracy(profile, 0.1, 0.1, 0.1), noise=0.1, depth_accuracy=1.0)
    assert error.to_array().isnull().all()


def test_the_error_is_that_of_the_crossing_that_is_given(make_profile):
    # Shallow crossing 4 K over 50 m (12.5 m/K), deep one 2 K over 60 m (30 m/K), both at f = 0.5.
    profile = make_profile([29, 22, 18, 21, 19], [1.0, 50.0, 100.0, 140.0, 200.0])
    independent = [
        float(
            isotherm_depth_error(
                profile, accuracy(profile, *[0] * 5), noise=0.1, depth_accuracy=0.0, crossing=crossing
            )[INDEPENDENT]
        )
        for crossing in ("shallowest", "deepest")
    ]
    np.testing.assert_allclose(independent, [1.25 * np.sqrt(0.5), 3.0 * np.sqrt(0.5)])


def thermoclines(centres, half_width, depths):
    """Return tanh profiles from 29 to 9 degrees, which pass 20 degrees at the returned depth, and that depth."""
    profile = 19.0 - 10.0 * np.tanh((depths - centres[:, None]) / half_width[:, None])
    return profile, centres + half_width * np.arctanh(-0.1)


@pytest.mark.parametrize(
    ("depths", "shallow", "deep"),
    [
        ((1, 10, 40, 70, 100, 120, 140, 160, 180, 200, 220, 260, 300, 500), 110, 200),
        ((1, 10, 20, 30, 40, 50, 60, 70, 85, 130, 185, 240, 300, 500), 35, 110),
    ],
)
def test_the_95_percent_interval_holds_the_truth_about_as_often(make_profile, depths, shallow, deep):
    random = np.random.default_rng(8)
    size, nominal = 4000, np.array(depths, dtype=float)
    places = nominal + random.normal(0.0, 1.0, (size, nominal.size))
    truth, depth = thermoclines(random.uniform(shallow, deep, size), random.uniform(20, 50, size), places)
    calibration = random.normal(0.0, 0.1, truth.shape)
    profile = make_profile(truth + calibration + random.normal(0.0, 0.05, truth.shape), nominal)
    given = isotherm_depth(profile)["isotherm_depth"].values
    error = isotherm_depth_error(profile, accuracy(profile, *[0.1] * nominal.size), noise=0.05, depth_accuracy=1.0)[
        "isotherm_depth_error"
    ].values
    inside = np.abs(given - depth) < 1.96 * error
    assert 0.90 < inside[np.isfinite(given)].mean() < 0.98


@pytest.mark.parametrize(
    ("depths", "shallow", "deep", "rms"),
    [
        ((0, 25, 50, 75, 100, 125, 150, 200, 250, 300, 500), 130, 200, 2.2),
        ((1, 20, 40, 60, 80, 100, 120, 140, 180, 300, 500), 90, 150, 0.7),
        ((1, 20, 40, 60, 80, 100, 120, 140, 180, 300, 500), 35, 90, 0.4),
    ],
)
def test_the_error_of_the_chord_alone_is_of_the_known_size(make_profile, depths, shallow, deep, rms):
    """Linear interpolation, exact sensors, tanh thermoclines of half-width 20 to 50 m: the rms was computed for the
    design with 600 such profiles of other end temperatures, hence half to one and a half times."""
    random = np.random.default_rng(9)
    nominal = np.array(depths, dtype=float)
    truth, depth = thermoclines(random.uniform(shallow, deep, 2000), random.uniform(20, 50, 2000), nominal)
    given = isotherm_depth(make_profile(truth, nominal))["isotherm_depth"].values
    assert 0.5 * rms < np.sqrt(np.nanmean((given - depth) ** 2)) < 1.5 * rms
