"""The memory of a monthly series, its spread that follows the seasons included."""

from __future__ import annotations

import numpy as np
import pytest

from profiles.precursor.memory import fit_memory, seasonal_spread
from profiles.precursor.shifting import shifted
from profiles.statistics import autocorrelation_of, fit_reflection, paired_statistics, simulate

NAN = np.nan
MONTHS = np.arange(480) % 12 + 1
SEASON = 1.0 + 0.6 * np.cos(2.0 * np.pi * np.arange(480) / 12.0)


def test_spread_by_hand():
    # Two years: 4 in June of both, 0 else. Squares of June 16: mean over all 16 / 12. June itself counts double with
    # its neighbours: 2 * 16 / 4 = 8; May and July: 16 / 4 = 4; over 4/3: sqrt 6 and sqrt 3.
    values = np.tile(np.where(np.arange(12) == 5, 4.0, 0.0), 2)
    found = seasonal_spread(values, MONTHS[:24])
    np.testing.assert_allclose(found[[4, 5, 6]], [np.sqrt(3.0), np.sqrt(6.0), np.sqrt(3.0)])
    np.testing.assert_allclose(found[12:], found[:12])


def test_months_without_a_value_and_constants_have_a_spread_of_one():
    values = np.where((MONTHS[:48] >= 5) & (MONTHS[:48] <= 7), NAN, np.random.default_rng(1).standard_normal(48))
    assert seasonal_spread(values, MONTHS[:48])[5] == 1.0
    assert (seasonal_spread(np.zeros(24), MONTHS[:24]) == 1.0).all()
    assert (seasonal_spread(np.full(24, NAN), MONTHS[:24]) == 1.0).all()


def test_a_record_that_begins_in_another_month_is_told_by_the_calendar():
    values = np.random.default_rng(2).standard_normal(480) * SEASON
    whole, later = seasonal_spread(values, MONTHS), seasonal_spread(values[5:], MONTHS[5:])
    np.testing.assert_allclose(later, whole[5:], rtol=0.03)


def test_spread_and_memory_of_a_seasonal_series_are_found():
    series = simulate(np.array([0.8]), 480, 200, np.random.default_rng(3)) * SEASON
    found = fit_memory(series, MONTHS)
    expected = SEASON[:12] / np.sqrt((SEASON[:12] ** 2).mean())
    # Averaging variances over three months lifts the trough: (0.48^2 + 2 * 0.4^2 + 0.48^2) / 4 = 0.44^2 for 0.4^2.
    np.testing.assert_allclose(np.sqrt((found.scale[:, :12] ** 2).mean(axis=0)), expected, rtol=0.15)
    np.testing.assert_allclose(found.autocorrelation[:, :4].mean(axis=0), 0.8 ** np.arange(4), atol=0.03)


def test_units_do_not_matter():
    series = np.random.default_rng(4).standard_normal(240)
    one, other = fit_memory(series, MONTHS[:240]), fit_memory(1e14 * series + 1e15, MONTHS[:240])
    np.testing.assert_allclose(one.autocorrelation, other.autocorrelation, atol=1e-9)
    np.testing.assert_allclose(one.scale, other.scale)


@pytest.mark.parametrize("lead", [0, 6, 12])
def test_false_alarms_keep_their_rate_where_the_spread_follows_the_seasons(lead):
    generator = np.random.default_rng(5)
    first, second = (simulate(np.array([0.985, -0.9]), 480, 1500, generator) * SEASON for _ in range(2))
    one, other = fit_memory(first, MONTHS), fit_memory(second, MONTHS)
    ahead = shifted(second, [lead])[:, 0]
    found = paired_statistics(
        first,
        ahead,
        one.autocorrelation,
        other.autocorrelation,
        first_scale=one.scale,
        second_scale=shifted(other.scale, [lead])[:, 0],
    )
    assert 0.03 <= (found.p_value < 0.05).mean() <= 0.07
    # Without it the rate is far off: too many at whole years, too few between.
    memories = (autocorrelation_of(fit_reflection(series), 480) for series in (first, second))
    plain = paired_statistics(first, ahead, *memories)
    assert not 0.03 <= (plain.p_value < 0.05).mean() <= 0.07
