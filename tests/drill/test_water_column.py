"""Moving a thermocline: exact depths, monotone stretching, surface anomalies."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from profiles.drill.water_column import (
    FINE_DEPTH,
    ISOTHERM,
    REACH,
    SHALLOWEST,
    displaced,
    isotherm_depths,
    temperatures,
)

SEASON = np.array([[1.0, 0.0, 0.0, 0.0, 0.0]])


def columns(profile: np.ndarray) -> np.ndarray:
    """One position without a season, (position, harmonic, level)."""
    harmonics = np.zeros((1, 5, FINE_DEPTH.size))
    harmonics[0, 0] = profile
    return harmonics


def mixed_then_linear() -> np.ndarray:
    """29 °C to 50 m, 0.1 °C a metre below: 20 °C at 50 + 9 / 0.1 = 140 m; 4 °C from 300 m on."""
    return np.maximum(np.minimum(29.0, 29.0 - 0.1 * (FINE_DEPTH - 50.0)), 4.0)


def moved_temperature(profile: np.ndarray, base: float, moved: float, anomaly: float, depth: np.ndarray) -> np.ndarray:
    one = np.ones(1)
    return temperatures(columns(profile)[0], SEASON, one * base, one * moved, one * anomaly, depth[None, :])[0]


def moved_isotherm(profile: np.ndarray, base: float, moved: float, anomaly: float = 0.0) -> float:
    one = np.ones((1, 1))
    return float(isotherm_depths(columns(profile), SEASON, one * base, one * moved, one * anomaly)[0, 0])


def test_isotherm_of_an_unmoved_column_is_its_crossing() -> None:
    assert moved_isotherm(mixed_then_linear(), 1.0, 1.0) == pytest.approx(140.0, abs=1e-9)


def test_isotherm_between_two_levels_is_linear() -> None:
    # 21 °C at 100 m and 18 °C at 102 m: a third of the way, 100 + 2/3 m.
    profile = np.where(FINE_DEPTH <= 100.0, 21.0, 18.0)
    assert moved_isotherm(profile, 1.0, 1.0) == pytest.approx(100.0 + 2.0 / 3.0, abs=1e-9)


def test_isotherm_is_at_the_surface_where_that_is_colder() -> None:
    assert moved_isotherm(np.full(FINE_DEPTH.size, 19.9), 1.0, 1.0) == 0.0


def test_isotherm_is_missing_where_nothing_is_colder() -> None:
    assert np.isnan(moved_isotherm(np.full(FINE_DEPTH.size, 25.0), 1.0, 1.0))


def test_missing_displacement_gives_missing_depth_and_temperature() -> None:
    assert np.isnan(moved_isotherm(mixed_then_linear(), 140.0, np.nan))
    assert np.isnan(moved_temperature(mixed_then_linear(), 140.0, np.nan, 0.0, FINE_DEPTH)).all()


@given(moved=st.floats(80.0, 240.0), anomaly=st.floats(-3.0, 3.0))
def test_isotherm_lies_where_it_was_moved_to(moved: float, anomaly: float) -> None:
    # Linear on the 2 m grid: the curvature of the profile within one step is worth centimetres.
    assert moved_isotherm(mixed_then_linear(), 140.0, moved, anomaly) == pytest.approx(moved, abs=0.12)


@given(moved=st.floats(8.0, 240.0), anomaly=st.floats(-3.0, 3.0))
def test_temperature_at_the_moved_isotherm_is_that_of_the_isotherm(moved: float, anomaly: float) -> None:
    exact = moved_temperature(mixed_then_linear(), 140.0, moved, anomaly, np.array([moved]))
    assert exact[0] == pytest.approx(ISOTHERM, abs=1e-9)


@given(moved=st.floats(8.0, 240.0), anomaly=st.floats(-3.0, 3.0))
def test_temperature_never_rises_with_depth(moved: float, anomaly: float) -> None:
    values = moved_temperature(mixed_then_linear(), 140.0, moved, anomaly, FINE_DEPTH)
    assert np.all(np.diff(values) <= 1e-9)


@given(moved=st.floats(8.0, 240.0))
def test_column_stays_as_it_was_at_the_surface_and_far_below(moved: float) -> None:
    profile = mixed_then_linear()
    values = moved_temperature(profile, 140.0, moved, 0.0, FINE_DEPTH)
    deep = max(140.0, moved) + REACH <= FINE_DEPTH
    assert values[0] == pytest.approx(29.0)
    np.testing.assert_allclose(values[deep], profile[deep], rtol=0, atol=1e-12)


def test_surface_anomaly_is_whole_at_the_surface_and_gone_at_the_isotherm() -> None:
    # The surface stands 9 °C above the isotherm; at 24.5 °C, half of that, a cube leaves an eighth.
    values = moved_temperature(mixed_then_linear(), 140.0, 140.0, 0.8, np.array([0.0, 95.0, 140.0, 200.0]))
    np.testing.assert_allclose(values, [29.8, 24.5 + 0.8 / 8.0, 20.0, 14.0], rtol=0, atol=1e-9)


def test_cold_anomaly_leaves_the_surface_above_the_isotherm() -> None:
    # The surface stands 9 °C above: it is never cooled by more than a quarter of that.
    assert moved_temperature(mixed_then_linear(), 140.0, 140.0, -8.0, np.zeros(1))[0] == pytest.approx(26.75)


def test_displaced_isotherm_is_the_sum_where_it_is_deep_and_never_shallower_than_its_limit() -> None:
    moved = displaced(np.array([150.0, 150.0, 30.0, 10.0]), np.array([0.0, -20.0, -200.0, 0.0]))
    np.testing.assert_allclose(moved[:2], [150.0, 130.0], rtol=0, atol=1e-6)
    assert np.all(moved[2:] >= SHALLOWEST)
    # 2 m above the limit, a bend of 4 m: 8 + 4 log(1 + exp(0.5)) = 8 + 4 * 0.97408.
    assert moved[3] == pytest.approx(11.8963, abs=1e-4)
