"""How a mooring leans."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from profiles.drill.motion import (
    BACKGROUND_SPEED,
    CORE_LONGITUDE,
    PULSE_DAYS,
    PULSE_RISE,
    flow,
    pulses,
    red_noise,
    rise,
    temperature_error,
)

DAYS = np.arange(2000.0)
DEPTHS = (0.0, 1.0, 50.0, 100.0, 300.0, 500.0)


@settings(max_examples=30, deadline=None)
@given(
    latitude=st.floats(-5.0, 5.0),
    longitude=st.floats(120.0, 280.0),
    seed=st.integers(0, 2**32 - 1),
    spacing=st.sampled_from([1.0, 1.0 / 24.0]),
)
def test_rise_is_one_sided_zero_at_the_buoy_and_grows_with_depth(
    latitude: float, longitude: float, seed: int, spacing: float
) -> None:
    found = rise(spacing * np.arange(200), DEPTHS, latitude, longitude, np.random.default_rng(seed))
    assert found.shape == (200, 6)
    np.testing.assert_array_equal(found[:, 0], 0.0)
    assert (np.diff(found, axis=1) >= 0.0).all()
    assert np.isfinite(found).all()


def test_rise_at_300_m_is_of_the_size_that_is_stated() -> None:
    core = rise(DAYS, DEPTHS, 0.0, CORE_LONGITUDE, np.random.default_rng(1))[:, 4]
    # The brief of the design: 0 to about 10 m at 300 m typically, more in pulses.
    assert 2.0 < np.median(core) < 6.0
    assert np.mean(core < 10.0) > 0.9
    assert 12.0 < core.max() < 35.0


def test_rise_is_largest_in_the_undercurrent() -> None:
    def typical(latitude: float, longitude: float) -> float:
        return float(np.median(rise(DAYS, DEPTHS, latitude, longitude, np.random.default_rng(2))[:, 4]))

    assert typical(0.0, 225.0) > 2.0 * typical(0.0, 149.0)
    assert typical(0.0, 225.0) > 2.0 * typical(4.5, 225.0)


def test_flow_is_whole_in_the_core_and_the_background_far_away() -> None:
    assert flow(0.0, CORE_LONGITUDE) == 1.0
    assert flow(15.0, CORE_LONGITUDE) == pytest.approx(BACKGROUND_SPEED)


def test_rise_remembers_days_to_weeks() -> None:
    found = rise(DAYS, DEPTHS, 0.0, 225.0, np.random.default_rng(3))[:, 4]
    anomaly = found - found.mean()
    lagged = [float((anomaly[lag:] * anomaly[: -lag or None]).mean() / anomaly.var()) for lag in (1, 5, 90)]
    assert lagged[0] > 0.8
    assert 0.3 < lagged[1] < 0.9
    assert abs(lagged[2]) < 0.3


@pytest.mark.parametrize(("spacing", "memory"), [(1.0, 10.0), (0.25, 2.0)])
def test_red_noise_has_unit_variance_and_its_memory(spacing: float, memory: float) -> None:
    noise = red_noise(spacing * np.arange(200_000), memory, np.random.default_rng(4))
    # 200 000 samples of e-folding 10 are some 10 000 independent ones: 0.01 in the mean, 0.014 in the variance.
    assert noise.mean() == pytest.approx(0.0, abs=0.05)
    assert noise.var() == pytest.approx(1.0, abs=0.06)
    assert np.corrcoef(noise[1:], noise[:-1])[0, 1] == pytest.approx(np.exp(-spacing / memory), abs=0.01)


def test_red_noise_of_one_sample_is_a_number() -> None:
    assert np.isfinite(red_noise(np.array([0.0]), 5.0, np.random.default_rng(5))).all()


def test_pulses_are_short_and_rare() -> None:
    found = pulses(np.arange(0.0, 3652.5, 0.5), np.random.default_rng(6))
    assert found.min() == 0.0
    assert PULSE_RISE[0] < found.max() < 2.0 * PULSE_RISE[1]
    # Three a year, 4 to 15 days each: about 28 days of 365.
    assert 0.04 < (found > 0.0).mean() < 0.12
    assert PULSE_DAYS[1] < 30.0


class Line:
    """A water column of one constant gradient: 28 °C at the surface, 0.1 °C per metre."""

    def temperature(self, position: int, depth: np.ndarray) -> np.ndarray:
        return 28.0 - 0.1 * np.broadcast_to(depth, (4, np.shape(depth)[-1]))


def test_temperature_error_is_gradient_times_rms_rise() -> None:
    risen = np.array([[0.0, 1.0], [0.0, 2.0], [0.0, 3.0], [0.0, 4.0]])
    # rms of 1, 2, 3, 4 m is sqrt(7.5); at 0.1 °C per metre 0.27386 °C.
    np.testing.assert_allclose(temperature_error(Line(), 0, (5.0, 100.0), risen), [0.0, 0.1 * np.sqrt(7.5)], atol=1e-12)
