"""What the sensors make of the water."""

from __future__ import annotations

import numpy as np
import pytest

from profiles.drill import instruments
from profiles.drill.demo import days
from profiles.drill.instruments import deployment_numbers, measure, missing
from profiles.drill.ocean import Columns, Ocean

TIME = days("2031-01-01", "2036-12-31")
DEPTHS = (1.0, 10.0, 400.0, 450.0, 500.0)


@pytest.fixture(scope="module")
def columns() -> Columns:
    return Ocean.simulate(TIME, 5).columns([0.0], [175.0])


def test_deployments_are_exchanged_once_a_year() -> None:
    numbers = deployment_numbers(TIME.size, np.random.default_rng(1))
    exchanges = np.flatnonzero(np.diff(numbers))
    assert numbers[0] == 0
    assert set(np.diff(numbers)) == {0, 1}
    assert set(np.diff(exchanges)) == {365}


def test_sensor_error_has_the_size_of_its_parts(columns: Columns) -> None:
    deployment = deployment_numbers(TIME.size, np.random.default_rng(2))
    errors = []
    for seed in range(12):
        read = measure(columns, 0, DEPTHS, deployment, np.random.default_rng(seed))
        errors.append(read - columns.temperature(0, DEPTHS))
    error = np.array(errors)
    # In the mixed layer the depth does not matter: 0.02 per deployment, 0.005 and rounding (0.001/sqrt(12)) per day.
    shallow = error[..., :2]
    assert shallow.std() == pytest.approx(np.hypot(0.02, 0.005), rel=0.15)
    assert np.diff(shallow, axis=1).std() == pytest.approx(0.005 * np.sqrt(2.0), rel=0.15)
    # At 400-500 m a metre of depth adds the gradient there, about 0.013 °C.
    gradient = np.abs(np.diff(columns.temperature(0, DEPTHS[2:]).mean(axis=0))).sum() / 100.0
    assert error[..., 2:].std() == pytest.approx(np.sqrt(0.02**2 + 0.005**2 + gradient**2), rel=0.2)


def test_readings_have_the_resolution(columns: Columns) -> None:
    deployment = deployment_numbers(TIME.size, np.random.default_rng(2))
    read = measure(columns, 0, DEPTHS, deployment, np.random.default_rng(3))
    np.testing.assert_allclose(read * 1000.0, np.rint(read * 1000.0), rtol=0, atol=1e-6)


def test_data_return_is_between_85_and_90_percent() -> None:
    gone = []
    for seed in range(150):
        random = np.random.default_rng(seed)
        gone.append(missing(14, deployment_numbers(TIME.size, random), random).mean())
    assert 0.85 < 1.0 - np.mean(gone) < 0.90


def test_dead_sensor_is_silent_to_the_end_of_its_deployment(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(instruments, "SINGLE_DAY_SHARE", 0.0)
    monkeypatch.setattr(instruments, "OUTAGES_PER_YEAR", 0.0)
    monkeypatch.setattr(instruments, "LOST_YEARS_PER_YEAR", 0.0)
    random = np.random.default_rng(4)
    deployment = deployment_numbers(TIME.size, random)
    gone = missing(60, deployment, random)
    returns = np.flatnonzero(np.diff(gone.astype(int), axis=0) == -1) // 60
    exchanges = np.flatnonzero(np.diff(deployment))
    assert gone.any()
    assert set(returns) <= set(exchanges)
