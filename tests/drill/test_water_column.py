"""The simulated water column: where its isotherm lies, how it is layered, how it outcrops."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from profiles.drill.water_column import (
    FINE_DEPTH,
    ISOTHERM,
    Shape,
    State,
    isotherm_depths,
    kept_above,
    temperatures,
)

DAY = np.zeros(1)


def shape(sines: int = 0, seed: int = 0) -> Shape:
    """An exponent of 2, a decay over 40 m, deep water of 12 °C, a mean isotherm at 150 m."""
    random = np.random.default_rng(seed)
    number = 2.0 * np.pi / random.uniform(10.0, 40.0, (1, sines))
    height = 0.85 / max(sines, 1) / number
    phase = random.uniform(0.0, 6.0, (1, sines))
    deep = np.full((1, FINE_DEPTH.size), 12.0)
    return Shape(np.full(1, 2.0), np.full(1, 40.0), np.full(1, 150.0), deep, height, number, phase, 0.0 * phase)


def state(isotherm: float, surface: float = 29.0, mixed: float = 50.0, **layers: float) -> State:
    values = {"cooling": 0.0, "top": -100.0, "base": 20.0, "edge": 4.0, "afternoon": 0.0, **layers}
    mixed = min(mixed, 0.6 * max(isotherm, 0.0))
    numbers = {"isotherm": isotherm, "surface": surface, "mixed": mixed, **values}
    return State(**{name: np.full((1, 1), value) for name, value in numbers.items()})


def profile(column: State, depth: np.ndarray = FINE_DEPTH, form: Shape | None = None) -> np.ndarray:
    return temperatures(np.asarray(depth, dtype=float)[None, :], DAY, 0, column, form or shape())[0]


def depth_of(column: State, form: Shape | None = None) -> tuple[float, int]:
    depth, passages = isotherm_depths(DAY, column, form or shape())
    return float(depth[0, 0]), int(passages[0, 0])


def test_temperature_of_each_part_of_the_column() -> None:
    # Isotherm at 150 m: tanh(150/25) = 0.9999877. Mixed to 50 m; halfway to the isotherm, at 100 m, 1 - 0.5**2 of the
    # 9 degrees remain: 26.75; 40 m below, 12 + 8/e = 14.943; far below 12.
    values = profile(state(150.0), np.array([0.0, 50.0, 100.0, 150.0, 190.0, 600.0]))
    np.testing.assert_allclose(values, [29.0, 29.0, 26.75, 20.0, 14.943, 12.0], atol=1e-3)


@settings(deadline=None)  # the first example compiles
@given(isotherm=st.floats(36.0, 250.0), surface=st.floats(22.0, 30.0))
def test_the_isotherm_lies_where_the_state_has_it(isotherm: float, surface: float) -> None:
    column = state(isotherm, surface)
    assert depth_of(column) == (pytest.approx(isotherm, abs=1e-3), 1)
    assert profile(column, np.array([isotherm]))[0] == pytest.approx(ISOTHERM, abs=1e-6)


@settings(deadline=None)  # the first example compiles
@given(isotherm=st.floats(2.0, 250.0), seed=st.integers(0, 20))
def test_the_depth_is_a_crossing_of_the_strained_column(isotherm: float, seed: int) -> None:
    form = shape(sines=3, seed=seed)
    depth, passages = depth_of(state(isotherm), form)
    assert passages == 1
    assert profile(state(isotherm), np.array([depth]), form)[0] == pytest.approx(ISOTHERM, abs=1e-3)


@settings(deadline=None)  # the first example compiles
@given(isotherm=st.floats(-10.0, 250.0), surface=st.floats(21.5, 31.0), seed=st.integers(0, 20))
def test_a_column_without_layers_never_warms_with_depth(isotherm: float, surface: float, seed: int) -> None:
    assert np.diff(profile(state(isotherm, surface), form=shape(sines=3, seed=seed))).max() <= 1e-9


def test_upper_thermocline_is_sharper_than_the_lower() -> None:
    values = profile(state(150.0), np.array([130.0, 149.0, 151.0, 170.0, 230.0]))
    above, below = (values[0] - values[1]) / 19.0, (values[3] - values[4]) / 60.0
    assert above > 1.5 * below


@settings(deadline=None)  # the first example compiles
@given(isotherm=st.floats(-1.0, 1.0))
def test_an_outcrop_comes_without_a_jump(isotherm: float) -> None:
    # A metre of the isotherm at the surface is worth (29 - 20) / 25 and (20 - 12) / 40 degrees on either side.
    column = state(isotherm)
    assert profile(column, np.array([0.0]))[0] == pytest.approx(
        ISOTHERM + isotherm * (0.36 if isotherm > 0 else 0.2), abs=0.01
    )
    assert depth_of(column)[0] == pytest.approx(max(isotherm, 0.0), abs=0.01)


def test_an_outcropped_column_is_colder_everywhere_and_its_depth_is_0() -> None:
    # 5 m above the surface: 12 + 8 exp(-5/40) = 19.060 at the surface.
    column = state(-5.0)
    assert profile(column).max() == pytest.approx(19.060, abs=1e-3)
    assert depth_of(column) == (0.0, 0)


def test_a_fresh_layer_is_colder_than_the_barrier_layer_below() -> None:
    values = profile(state(150.0, cooling=0.4, base=25.0), np.array([0.0, 20.9, 25.0, 29.1, 45.0]))
    np.testing.assert_allclose(values, [28.6, 28.6, 28.8, 29.0, 29.0], atol=0.01)


def test_an_intrusion_makes_the_column_pass_twice() -> None:
    # Isotherm at 15 m, mixed to 9: the surface has tanh(0.6) * 3 = 1.61 above 20; a layer from 4 to 9 m lacks 2.
    column = state(15.0, surface=23.0, cooling=2.0, top=4.0, base=9.0, edge=1.0)
    depth, passages = depth_of(column)
    assert passages == 2
    assert 3.0 < depth < 5.0


def test_the_afternoon_warms_the_surface_alone() -> None:
    # exp(-4/4) = 0.368 at 4 m.
    warmth = profile(state(150.0, afternoon=2.0)) - profile(state(150.0))
    np.testing.assert_allclose(warmth[[0, 2]], [2.0, 2.0 * 0.3679], atol=1e-3)
    assert warmth[20] < 1e-3


def test_deep_water_moves_with_the_isotherm_less_and_less() -> None:
    sloped = shape()._replace(deep=(20.0 - 0.02 * FINE_DEPTH)[None, :])
    moved, rest = (profile(state(isotherm), form=sloped) for isotherm in (180.0, 150.0))
    warming = (moved - rest)[FINE_DEPTH >= 250.0]
    assert np.all(np.diff(warming) < 1e-9)
    assert warming[0] > 0.3
    # 390 m below: exp(-460/150) * 30 m * 0.02 °C/m = 0.028 °C and less.
    assert 0.0 < warming[-1] < 0.04


def test_values_are_kept_above_a_floor() -> None:
    # log(1 + e^0) = 0.693: at the floor, 0.693 bends above it.
    np.testing.assert_allclose(
        kept_above(np.array([-500.0, -12.0, 100.0]), -12.0, 5.0), [-12.0, -8.534, 100.0], atol=1e-3
    )
