"""The simulated ocean against published values, each named in the table of tests/bench/ocean_checks.py."""

from __future__ import annotations

import importlib.util
import sys
from pathlib import Path
from types import ModuleType

import numpy as np
import pytest

SEEDS = [1, 2, 3]
_PATH = Path(__file__).parents[1] / "bench" / "ocean_checks.py"


def _bench() -> ModuleType:
    """Load the script that holds the checks; what stands in tests/bench is no package."""
    spec = importlib.util.spec_from_file_location("ocean_checks", _PATH)
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    sys.modules[spec.name] = module
    spec.loader.exec_module(module)
    return module


bench = _bench()


@pytest.mark.parametrize("group", [bench.wave_checks, bench.spectrum_checks, bench.mean_checks, bench.basin_checks])
def test_simulated_ocean_lies_in_the_published_ranges(group) -> None:
    results = list(group(SEEDS))
    outside = [
        f"{check.name}: {check.value:.2f} not in {check.low}..{check.high}"
        for check in results
        if not check.low <= check.value <= check.high
    ]
    assert len(results) >= 3
    assert outside == []


def test_measured_speed_is_that_of_a_known_wave() -> None:
    # 2.5 m/s eastward, of 45, 65 and 90 days, and noise.
    longitude, day = np.arange(190.0, 241.0, 5.0), np.arange(2000.0)
    travel = (longitude - 190.0) * bench.METRES_PER_DEGREE / 2.5 / bench.DAY
    noise = np.random.default_rng(1).standard_normal((longitude.size, day.size)) / 3.0
    section = sum(np.cos(2.0 * np.pi * (day - travel[:, None]) / period) for period in (45.0, 65.0, 90.0)) + noise
    assert bench.speed([section], longitude, 40) == pytest.approx(2.5, rel=0.05)


def test_measured_lead_is_that_of_a_shifted_series() -> None:
    volume = np.convolve(np.random.default_rng(2).standard_normal(600), np.ones(12), mode="valid")
    correlation = bench.index_correlation(volume, np.roll(volume, 7), np.arange(-24, 25))
    assert np.argmax(correlation) - 24 == 7


def test_measured_patterns_are_those_of_a_known_field() -> None:
    # Two patterns of variances 3 and 1 and none else: shares 0.75 and 0.25.
    series = np.random.default_rng(3).standard_normal((2, 5000)) * np.sqrt([[3.0], [1.0]])
    shares = bench.eof_shares(np.array([[0.6, 0.8], [0.8, -0.6]]) @ series)
    np.testing.assert_allclose(shares, [0.75, 0.25], atol=0.02)
