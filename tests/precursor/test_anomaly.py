"""Anomalies from a stated base: worked answers, subsets, trends and scales; running means."""

from __future__ import annotations

import numpy as np
import pytest

from profiles.errors import DataError, RequestError
from profiles.precursor import anomalies, fit_anomaly, running_mean

NAN = np.nan
SEASON = 5.0 * np.cos(2.0 * np.pi * np.arange(12) / 12.0)


def test_monthly_means_by_hand(monthly):
    # Januaries 10, 20, 60 have the mean 30; every other month is 1 in all three years.
    values = np.ones(36)
    values[[0, 12, 24]] = 10.0, 20.0, 60.0
    found = anomalies(monthly(values)).values
    np.testing.assert_allclose(found[[0, 12, 24]], [-20.0, -10.0, 30.0])
    assert (np.delete(found, [0, 12, 24]) == 0.0).all()


def test_base_alone_makes_the_climatology(monthly):
    values = np.concatenate([np.tile(SEASON, 3), np.tile(SEASON, 2) + 2.0])
    found = anomalies(monthly(values), (2001, 2003))
    np.testing.assert_allclose(found.values, np.repeat([0.0, 2.0], [36, 24]), atol=1e-12)
    assert found.attrs["base"] == "2001-01 to 2003-12"


def test_base_may_be_given_by_month(monthly):
    values = np.concatenate([np.full(6, 100.0), np.tile(SEASON, 3), np.full(6, -100.0)])
    found = anomalies(monthly(values, start="2000-07"), ("2001-01", "2003-12"))
    np.testing.assert_allclose(found.values[6:42], 0.0, atol=1e-12)


def test_a_line_and_a_season_leave_nothing(monthly):
    # 0.02 a month, jointly fitted: even a base that ends in mid-year gives the slope exactly.
    number = np.arange(76.0)
    values = np.tile(SEASON, 7)[:76] + 0.02 * number
    fitted = fit_anomaly(monthly(values), detrend=True)
    assert fitted.slope == pytest.approx(0.02)
    np.testing.assert_allclose(fitted.apply(monthly(values)).values, 0.0, atol=1e-10)


def test_slope_is_that_of_the_joint_least_squares(monthly):
    generator = np.random.default_rng(1)
    values = np.tile(SEASON, 6) + 0.01 * np.arange(72.0) + generator.standard_normal(72)
    values[[3, 40]] = NAN
    number = np.arange(72.0)
    design = np.column_stack([np.eye(12)[np.arange(72) % 12], number])
    kept = np.isfinite(values)
    expected = np.linalg.lstsq(design[kept], values[kept], rcond=None)[0]
    fitted = fit_anomaly(monthly(values), detrend=True)
    assert fitted.slope == pytest.approx(expected[-1])
    found = fitted.apply(monthly(values)).values
    np.testing.assert_allclose(found[kept], values[kept] - design[kept] @ expected, atol=1e-9)
    assert np.isnan(found[~kept]).all()


def test_trend_goes_on_beyond_the_base(monthly):
    values = 0.5 * np.arange(60.0)
    found = fit_anomaly(monthly(values[:36]), detrend=True).apply(monthly(values))
    np.testing.assert_allclose(found.values, 0.0, atol=1e-9)


def test_standardised_by_month_has_unit_spread_in_every_month(monthly):
    generator = np.random.default_rng(2)
    values = np.tile(1.0 + np.arange(12.0), 20) * generator.standard_normal(240)
    found = anomalies(monthly(values, units="m"), standardise="month")
    np.testing.assert_allclose(found.values.reshape(20, 12).std(axis=0, ddof=1), 1.0)
    assert found.attrs["units"] == "1"
    whole = anomalies(monthly(values), standardise="whole")
    assert whole.values.std(ddof=1) == pytest.approx(1.0)


def test_years_withheld_do_not_enter(monthly):
    values = np.random.default_rng(3).standard_normal(120)
    other = values.copy()
    other[48:60] += 1000.0
    kept = np.r_[0:48, 60:120]
    fitted = [fit_anomaly(monthly(v).isel(time=kept), detrend=True, standardise="whole") for v in (values, other)]
    for name in ("climatology", "scale", "slope"):
        np.testing.assert_array_equal(getattr(fitted[0], name), getattr(fitted[1], name))


def test_names_and_units_follow(monthly):
    found = anomalies(monthly(np.random.default_rng(4).standard_normal(60), units="degree_Celsius"))
    assert found.name == "surface_temperature_index_anomaly"
    assert found.attrs["units_metadata"] == "temperature: difference"
    volume = anomalies(monthly(np.random.default_rng(4).standard_normal(60), name="volume", units="m3"))
    assert (volume.name, volume.attrs["units"]) == ("volume_anomaly", "m3")


@pytest.mark.parametrize("base", [(1999, 2003), ("2001-01", "2006-01")])
def test_a_base_outside_the_record_is_refused(monthly, base):
    with pytest.raises(DataError, match="base period reaches outside the record; expected within 2001-01 to 2005-12"):
        anomalies(monthly(np.arange(60.0)), base)


@pytest.mark.parametrize(
    ("base", "message"),
    [
        ((2003, 2001), "not a base period; .*found 2003-01 to 2001-12"),
        (("2001-13", 2003), "not a month; expected a year .*found '2001-13'"),
        (("soon", 2003), "found 'soon'"),
    ],
)
def test_what_is_no_base_is_refused(monthly, base, message):
    with pytest.raises(RequestError, match=message):
        anomalies(monthly(np.arange(60.0)), base)


def test_too_short_a_base_is_refused_with_the_month(monthly):
    with pytest.raises(DataError, match=r"too short for a climatology; .*found 2 of month 1 in 2001-01 to 2002-12"):
        anomalies(monthly(np.arange(60.0)), (2001, 2002))
    values = np.arange(36.0)
    values[30] = NAN
    with pytest.raises(DataError, match="found 2 of month 7"):
        anomalies(monthly(values))


def test_a_constant_cannot_be_standardised(monthly):
    with pytest.raises(DataError, match="does not vary in the base, so it cannot be standardised"):
        anomalies(monthly(np.full(60, 3.0)), standardise="month")


def test_no_such_standard_is_refused(monthly):
    with pytest.raises(RequestError, match="expected none, whole or month; found year"):
        anomalies(monthly(np.arange(60.0)), standardise="year")


def test_trailing_mean_knows_no_later_month(monthly):
    values = np.arange(10.0)
    found = running_mean(monthly(values), 3, kind="trailing")
    np.testing.assert_allclose(found.values, [NAN, NAN, 1, 2, 3, 4, 5, 6, 7, 8])
    changed = values.copy()
    changed[6:] = 100.0
    np.testing.assert_array_equal(running_mean(monthly(changed), 3, kind="trailing").values[:6], found.values[:6])
    assert found.attrs["running_mean"] == "3 months, trailing"


def test_centred_mean_by_hand(monthly):
    values = np.array([1.0, 2.0, 6.0, 4.0, NAN, 1.0])
    found = running_mean(monthly(values), 3, kind="centred")
    np.testing.assert_allclose(found.values, [NAN, 3.0, 4.0, NAN, NAN, NAN])


@pytest.mark.parametrize(
    ("months", "kind", "message"),
    [
        (4, "centred", "1 to 12, odd where it is centred; found 4"),
        (0, "trailing", "found 0"),
        (13, "trailing", "found 13"),
        (3, "leading", "expected centred or trailing"),
    ],
)
def test_what_is_no_running_mean_is_refused(monthly, months, kind, message):
    with pytest.raises(RequestError, match=message):
        running_mean(monthly(np.arange(12.0)), months, kind=kind)
