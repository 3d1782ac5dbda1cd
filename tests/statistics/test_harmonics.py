"""The seasonal cycle: how much of the year has passed, and the terms."""

from __future__ import annotations

import numpy as np
import pytest

from profiles.statistics import HARMONICS, harmonic_design, year_fraction


@pytest.mark.parametrize(
    ("time", "fraction"),
    [
        ("2031-01-01T00:00", 0.0),
        # A common year: January to June hold 31 + 28 + 31 + 30 + 31 + 30 = 181 days; half of 365 is 182.5.
        ("2031-07-01T00:00", 181 / 365),
        ("2031-07-02T12:00", 0.5),
        ("2031-12-31T12:00", 364.5 / 365),
        # A leap year has 182 days before July and 183 in half a year.
        ("2032-07-01T00:00", 182 / 366),
        ("2032-07-02T00:00", 0.5),
        ("2032-02-29T00:00", 59 / 366),
        # 2000 was a leap year, 1900 was none.
        ("2000-07-02T00:00", 0.5),
        ("1900-07-02T12:00", 0.5),
        ("1969-12-31T00:00", 364 / 365),
    ],
)
def test_year_fraction_counts_the_days_of_its_own_year(time: str, fraction: float) -> None:
    assert year_fraction(np.datetime64(time)) == pytest.approx(fraction, rel=0, abs=1e-15)


def test_year_fraction_keeps_the_shape_and_gives_nan_without_a_time() -> None:
    time = np.array([["2031-01-01", "NaT"], ["2032-01-01", "2031-01-01"]], dtype="datetime64[s]")
    np.testing.assert_array_equal(year_fraction(time), [[0.0, np.nan], [0.0, 0.0]])


def test_year_fraction_rises_through_a_year_and_starts_again() -> None:
    hours = np.arange("2031-12-30", "2032-01-03", dtype="datetime64[h]")
    fraction = year_fraction(hours)
    assert np.flatnonzero(np.diff(fraction) < 0).tolist() == [47]
    assert fraction.min() == 0.0
    assert fraction.max() < 1.0


def test_harmonic_design_at_an_eighth_of_the_year() -> None:
    # The angle is 45 degrees: cos = sin = sqrt(1/2); twice that is 90 degrees: cos = 0, sin = 1.
    half = np.sqrt(0.5)
    np.testing.assert_allclose(harmonic_design(0.125), [1.0, half, half, 0.0, 1.0], rtol=0, atol=1e-15)


def test_harmonic_design_at_the_quarters_of_the_year() -> None:
    expected = [[1, 1, 0, 1, 0], [1, 0, 1, -1, 0], [1, -1, 0, 1, 0], [1, 0, -1, -1, 0]]
    np.testing.assert_allclose(harmonic_design([0.0, 0.25, 0.5, 0.75]), expected, rtol=0, atol=1e-15)


def test_the_terms_are_named_in_the_order_of_the_design() -> None:
    fraction = (np.arange(24) + 0.5) / 24
    terms = dict(zip(HARMONICS, harmonic_design(fraction).T, strict=True))
    assert next(iter(terms)) == "mean"
    for name, cycles in [("annual", 1), ("semiannual", 2)]:
        np.testing.assert_allclose(terms[f"{name}_cosine"], np.cos(2 * np.pi * cycles * fraction), atol=1e-15)
        np.testing.assert_allclose(terms[f"{name}_sine"], np.sin(2 * np.pi * cycles * fraction), atol=1e-15)


@pytest.mark.parametrize("steps", [12, 73, 365])
def test_the_terms_are_orthogonal_over_a_year_of_even_steps(steps: int) -> None:
    # Over whole cycles the sum of 1 is n, that of cos**2 and sin**2 is n/2, and every product of two sums to zero.
    design = harmonic_design((np.arange(steps) + 0.5) / steps)
    np.testing.assert_allclose(design.T @ design / steps, np.diag([1, 0.5, 0.5, 0.5, 0.5]), rtol=0, atol=1e-13)


def test_harmonic_design_adds_one_axis_and_passes_nan_on() -> None:
    design = harmonic_design(np.array([[0.0, np.nan, 0.5]]))
    assert design.shape == (1, 3, 5)
    np.testing.assert_array_equal(design[0, 1], [1.0, np.nan, np.nan, np.nan, np.nan])


def test_a_year_of_noise_free_cycles_is_found_again() -> None:
    time = np.arange("2032-01-01", "2033-01-01", dtype="datetime64[D]")
    coefficients = np.array([120.0, 8.0, -3.0, 2.0, 0.5])
    design = harmonic_design(year_fraction(time))
    found, *_ = np.linalg.lstsq(design, design @ coefficients, rcond=None)
    np.testing.assert_allclose(found, coefficients, rtol=1e-12)
