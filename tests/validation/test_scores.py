"""Scores of two series, and that their intervals hold what they say."""

from __future__ import annotations

import numpy as np
import pytest

from profiles.validation.scores import NAMES, score

TIME = np.arange("2031-01", "2037-01", dtype="datetime64[M]").astype("datetime64[ns]") + np.timedelta64(15, "D")


def scored(model, array, bias_error=np.nan, least=6, time=TIME):
    return score(
        time[: len(model)],
        np.asarray(model, float),
        np.asarray(array, float),
        bias_error=bias_error,
        least_months=least,
    )


def persistent(random, count, lag):
    """A series of variance 1 whose lag-one autocorrelation is ``lag``."""
    series = np.empty(count)
    series[0] = random.standard_normal()
    for place in range(1, count):
        series[place] = lag * series[place - 1] + np.sqrt(1.0 - lag**2) * random.standard_normal()
    return series


def test_scores_by_hand():
    # Differences 1, 3, 1, 3, 1, 3: mean 2, departures of 1 throughout. Array 0 to 5: mean 2.5, squares 17.5, over 6.
    # Model 1, 4, 3, 6, 5, 8: mean 4.5, squares 12.25 + .25 + 2.25 + 2.25 + .25 + 12.25 = 29.5, over 6.
    array, model = np.arange(6.0), np.array([1.0, 4.0, 3.0, 6.0, 5.0, 8.0])
    found = scored(model, array)
    assert (found.months, found.bias, found.centred_rms) == (6.0, 2.0, 1.0)
    assert found.array_sd == pytest.approx(np.sqrt(35.0 / 12.0))
    assert found.model_sd == pytest.approx(np.sqrt(29.5 / 6.0))
    # (-2.5)(-3.5) + (-1.5)(-.5) + (-.5)(-1.5) + .5 x 1.5 + 1.5 x .5 + 2.5 x 3.5 = 20.5, over sqrt(17.5 x 29.5).
    assert found.correlation == pytest.approx(20.5 / np.sqrt(17.5 * 29.5))
    # The triangle of Taylor (2001), eq. 2: centred rms^2 = s_m^2 + s_a^2 - 2 s_m s_a r.
    triangle = found.model_sd**2 + found.array_sd**2 - 2 * found.model_sd * found.array_sd * found.correlation
    assert found.centred_rms**2 == pytest.approx(triangle)


def test_a_stated_error_makes_the_interval_of_the_bias():
    found = scored(np.arange(6.0) + 2.0, np.arange(6.0), bias_error=0.5)
    assert (found.bias_low, found.bias_high) == (2.0 - 0.98, 2.0 + 0.98)


def test_months_that_one_side_lacks_do_not_count():
    model, array = np.arange(8.0), np.arange(8.0) - 1.0
    model[0], array[7] = np.nan, np.nan
    found = scored(model, array)
    assert (found.months, found.bias) == (6.0, 1.0)


def test_too_few_months_are_not_scored():
    found = scored(np.arange(5.0), np.arange(5.0))
    assert found.months == 5.0
    assert all(np.isnan(getattr(found, name)) for name in NAMES[1:])
    assert scored(np.full(9, np.nan), np.arange(9.0)).months == 0.0


def test_constant_series_have_no_correlation_and_no_ratio():
    found = scored(np.ones(8), np.full(8, 3.0))
    assert found.bias == -2.0
    assert np.isnan([found.correlation, found.sd_ratio, found.correlation_low]).all()


def test_a_difference_that_drifts_all_along_has_no_interval_of_sampling():
    """A line through twelve months has a lag-one autocorrelation of 0.95, the most there is: 0.3 values, or 0.6."""
    found = scored(np.arange(12.0) * 2.0, np.arange(12.0))
    assert found.centred_rms == pytest.approx(np.sqrt(143.0 / 12.0))
    for name in ("bias", "centred_rms", "correlation", "sd_ratio"):
        assert np.isnan([getattr(found, f"{name}_low"), getattr(found, f"{name}_high")]).all(), name


def test_the_annual_cycle_of_either_side():
    """cos of the year with amplitude 3 against amplitude 5 that comes 30 days later."""
    year = (TIME - TIME[0]) / np.timedelta64(1, "D") / 365.25
    array, model = 3.0 * np.cos(2 * np.pi * year), 5.0 * np.cos(2 * np.pi * (year - 30.0 / 365.25))
    found = scored(model, array)
    assert found.array_annual_amplitude == pytest.approx(3.0, rel=5e-3)
    assert found.annual_amplitude_difference == pytest.approx(2.0, rel=1e-2)
    assert found.annual_phase_difference == pytest.approx(30.0, abs=0.5)


@pytest.mark.parametrize("lag", [0.0, 0.6])
def test_intervals_of_sampling_hold_the_truth(lag):
    """600 pairs of series with correlation 0.8, true bias 1, ratio 1.5; 95 % of each interval's ends lie about right.

    The binomial standard error of 0.95 over 600 is 0.009; the formulas are those of large samples and are allowed 0.03.
    """
    random = np.random.default_rng(3)
    correlation, held = 0.8, {"bias": 0, "correlation": 0, "sd_ratio": 0, "centred_rms": 0}
    rms = np.sqrt(1.0 + 1.5**2 - 2 * 1.5 * correlation)
    true = {"bias": 1.0, "correlation": correlation, "sd_ratio": 1.5, "centred_rms": rms}
    count = 600
    for _ in range(count):
        array, other = persistent(random, 72, lag), persistent(random, 72, lag)
        model = 1.0 + 1.5 * (correlation * array + np.sqrt(1.0 - correlation**2) * other)
        found = scored(model, array)
        for name, value in true.items():
            held[name] += getattr(found, f"{name}_low") <= value <= getattr(found, f"{name}_high")
    for name, number in held.items():
        assert 0.91 < number / count < 0.985, (name, number / count)


def test_the_interval_of_the_annual_amplitude_holds_the_truth():
    random = np.random.default_rng(8)
    year = (TIME - TIME[0]) / np.timedelta64(1, "D") / 365.25
    held = 0
    for _ in range(400):
        array = 4.0 * np.cos(2 * np.pi * year)
        found = scored(array * 1.5 + persistent(random, 72, 0.5), array)
        held += found.annual_amplitude_difference_low <= 2.0 <= found.annual_amplitude_difference_high
    assert 0.91 < held / 400 < 0.985
