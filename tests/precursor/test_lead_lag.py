"""The lead-lag analysis: sign of the lead, planted leads, what is refused, and each part of the result."""

from __future__ import annotations

import numpy as np
import pytest
import xarray as xr
from scipy import stats
from scipy.signal import lfilter

from profiles import lead_lag
from profiles.config import LeadLagSettings
from profiles.errors import DataError, RequestError

NAN = np.nan
QUICK = LeadLagSettings(draws=200)


def red(generator, months, memory):
    noise = generator.standard_normal(months + 200)
    return (lfilter([1.0], [1.0, -memory], noise) * np.sqrt(1.0 - memory**2))[200:]


@pytest.fixture(scope="module")
def planted():
    """A red predictor, and a target that follows it by six months in half of its variance."""
    generator = np.random.default_rng(8)
    signal = red(generator, 486, 0.9)
    target = np.sqrt(0.5) * (signal[:-6] + red(generator, 480, 0.9))
    months = (np.datetime64("2031-01") + np.arange(480)).astype("datetime64[ns]")
    return tuple(
        xr.DataArray(values, dims="time", coords={"time": months}, name=name, attrs={"units": units})
        for values, name, units in ((signal[6:], "volume", "m3"), (target, "index", "degree_Celsius"))
    )


@pytest.fixture(scope="module")
def found(planted):
    return lead_lag(*planted, range(-24, 25), settings=QUICK)


def test_a_planted_lead_is_found_within_its_interval(found):
    assert found["peak_lead_lower"] <= 6.0 <= found["peak_lead_upper"]
    assert found["peak_lead_upper"] - found["peak_lead_lower"] < 3.0
    assert int(found["correlation"].argmax("lead")) == 30
    assert found["precursor_lead"] == found["peak_lead"]


def test_a_positive_lead_means_that_the_predictor_comes_first(planted):
    predictor, target = planted
    found = lead_lag(predictor, target, [-6, 0, 6], settings=QUICK)
    ahead = stats.linregress(predictor.values[:-6], target.values[6:])
    behind = stats.linregress(predictor.values[6:], target.values[:-6])
    np.testing.assert_allclose(found["correlation"].sel(lead=[6, -6]), [ahead.rvalue, behind.rvalue])
    np.testing.assert_allclose(found["regression_slope"].sel(lead=[6, -6]), [ahead.slope, behind.slope])
    assert found["pair_count"].values.tolist() == [474, 480, 474]


def test_turning_the_two_about_turns_the_leads(planted):
    predictor, target = planted
    one = lead_lag(predictor, target, [-6, 0, 6], settings=QUICK)
    other = lead_lag(target, predictor, [-6, 0, 6], settings=QUICK)
    for name in ("correlation", "effective_size", "deciding_p_value"):
        np.testing.assert_allclose(one[name].values, other[name].values[::-1])


def test_the_deciding_test_is_far_stricter_than_counting_months(planted, found):
    at_peak = found.sel(lead=6)
    assert 30.0 < at_peak["effective_size"] < 120.0 < at_peak["pair_count"]
    naive = stats.linregress(planted[0].values[:-6], planted[1].values[6:])
    assert naive.pvalue < at_peak["deciding_p_value"] < 0.05
    assert at_peak["significant"] == 1
    assert at_peak["correlation_lower"] > 0.0
    assert naive.stderr < at_peak["regression_slope_error"]


def test_significant_is_what_the_deciding_test_says(found):
    np.testing.assert_array_equal(found["significant"], found["deciding_p_value"] <= 0.05)
    assert "decides" in found["deciding_p_value"].attrs["long_name"]
    assert "shown beside" in found["bootstrap_p_value"].attrs["long_name"]
    assert found["significant_count"] == found["significant"].sum()


def test_bootstrap_stands_beside(found):
    at_peak = found.sel(lead=6)
    assert at_peak["bootstrap_lower"] < at_peak["correlation"] < at_peak["bootstrap_upper"]
    assert at_peak["bootstrap_p_value"] == pytest.approx(2.0 / 201.0)
    assert (found["bootstrap_lower"] <= found["bootstrap_upper"]).all()


def test_the_planted_field_is_significant_and_an_independent_one_is_not(planted, found):
    assert found["field_p_value"] == pytest.approx(1.0 / 201.0)
    generator = np.random.default_rng(10)
    other = planted[1].copy(data=red(generator, 480, 0.9))
    nothing = lead_lag(planted[0], other, settings=QUICK)
    assert nothing["field_p_value"] > 0.05
    assert nothing["deciding_p_value"].min() < nothing["field_p_value"]


def test_by_starting_month_is_that_month_of_the_predictor(planted, found):
    predictor, target = planted
    # March starts: predictor of March, target of September; 2031-03 is month 2 of the record.
    place = np.arange(2, 474, 12)
    expected = stats.linregress(predictor.values[place], target.values[place + 6])
    march = found.sel(starting_month=3, lead=6)
    assert march["correlation_by_month"] == pytest.approx(expected.rvalue)
    assert march["pair_count_by_month"] == place.size == 40
    # A year apart little is left of the memory: 0.9^12 = 0.28, twice in the product.
    assert 30.0 < march["effective_size_by_month"] <= 40.0


def test_a_month_with_too_few_years_is_missing_and_counted(planted):
    short = [series.isel(time=slice(0, 110)) for series in planted]  # 9 or 10 of each calendar month
    found = lead_lag(*short, [0], settings=QUICK)
    counts = found["pair_count_by_month"].squeeze().values
    assert set(counts) == {9, 10}
    np.testing.assert_array_equal(np.isnan(found["correlation_by_month"].squeeze()), counts < 10)


def test_both_signs_of_a_linear_response_have_its_slope(found):
    one = found.sel(lead=6)
    for sign in ("positive", "negative"):
        part = one.sel(sign=sign)
        error = float(part["regression_slope_error_by_sign"])
        assert abs(float(part["regression_slope_by_sign"] - np.sqrt(0.5))) < 3.0 * error


def test_windows_show_where_the_lead_changes():
    # For 20 years the target follows by three months, for 20 by nine.
    generator = np.random.default_rng(11)
    signal = red(generator, 480, 0.9)
    follows = np.concatenate([np.roll(signal, 3)[:240], np.roll(signal, 9)[240:]])
    months = (np.datetime64("2031-01") + np.arange(480)).astype("datetime64[ns]")
    predictor, target = (
        xr.DataArray(values, dims="time", coords={"time": months})
        for values in (signal, follows + 0.3 * red(generator, 480, 0.5))
    )
    found = lead_lag(predictor, target, settings=QUICK)
    leads = found["peak_lead_in_window"].values
    assert found.sizes["window"] == 26  # (480 - 180) / 12 + 1
    assert leads[0] == pytest.approx(3.0, abs=0.6)
    assert leads[-1] == pytest.approx(9.0, abs=0.6)
    assert found["window_last"].values[0].astype("datetime64[M]") == np.datetime64("2045-12")


def test_a_record_shorter_than_a_window_has_none(planted):
    found = lead_lag(*(series.isel(time=slice(0, 150)) for series in planted), settings=QUICK)
    assert not [name for name in found.variables if "window" in str(name)]


def test_the_same_series_give_the_same_numbers(planted, found):
    xr.testing.assert_identical(lead_lag(*planted, range(-24, 25), settings=QUICK), found)


def test_gaps_are_passed_over(planted, found):
    predictor, target = (series.copy() for series in planted)
    predictor[100:106] = NAN
    target[300] = NAN
    gappy = lead_lag(predictor, target, settings=QUICK)
    assert gappy["pair_count"].sel(lead=0) == 473
    assert gappy["correlation"].sel(lead=6) == pytest.approx(float(found["correlation"].sel(lead=6)), abs=0.03)


def test_only_common_months_count(planted):
    predictor, target = planted
    found = lead_lag(predictor.isel(time=slice(0, 400)), target.isel(time=slice(100, None)), [0], settings=QUICK)
    assert found["pair_count"] == 300
    assert found.attrs["months"] == "2039-05 to 2064-04"


def test_slopes_have_the_units_of_both(found):
    assert found["regression_slope"].attrs["units"] == "degree_Celsius / (m3)"
    assert found["regression_slope_by_sign"].attrs["units"] == "degree_Celsius / (m3)"


def test_no_positive_lead_gives_no_precursor(planted):
    found = lead_lag(*planted, [-3, -2, -1], settings=QUICK)
    assert np.isnan(found["precursor_lead"])
    assert found["peak_lead"] == -1.0


@pytest.mark.parametrize(
    "leads",
    [[], [0.5, 1.5], [3, 1], [1, 1], [[0, 1]], ["a"]],
    ids=["none", "halves", "order", "twice", "table", "text"],
)
def test_what_is_no_list_of_leads_is_refused(planted, leads):
    with pytest.raises(RequestError, match="not a list of leads; expected whole months, ascending, each once"):
        lead_lag(*planted, leads)


def test_a_lead_beyond_the_record_has_no_correlation(planted):
    found = lead_lag(*(series.isel(time=slice(0, 60)) for series in planted), [-70, 0, 59], settings=QUICK)
    assert np.isfinite(found["correlation"].values).tolist() == [False, True, False]
    assert found["pair_count"].values.tolist() == [0, 60, 1]


@pytest.mark.parametrize("months", [2, 10, 23])
def test_too_short_a_record_says_how_many_months_are_effective(planted, months):
    short = [series.isel(time=slice(0, months)) for series in planted]
    message = rf"too short .*expected 6 or more effective months.* found \d+\.\d effective of {months} months"
    with pytest.raises(DataError, match=message):
        lead_lag(*short, settings=QUICK)


def test_a_long_record_of_slow_series_is_too_short_too():
    # Straight lines: neighbours say the same, however many there are.
    months = (np.datetime64("2031-01") + np.arange(60)).astype("datetime64[ns]")
    slow = [xr.DataArray(np.cos(np.arange(60) / step), dims="time", coords={"time": months}) for step in (30.0, 40.0)]
    with pytest.raises(DataError, match=r"found \d\.\d effective of 60 months with both values, 2031-01 to 2035-12"):
        lead_lag(*slow, settings=QUICK)


def test_series_apart_constant_gappy_or_in_kelvin_are_refused(planted):
    predictor, target = planted
    late = target.assign_coords(time=target["time"] + np.timedelta64(365 * 60, "D"))
    with pytest.raises(DataError, match="do not overlap"):
        lead_lag(predictor, late.isel(time=slice(0, 1)).reindex(time=late["time"][:2], fill_value=1.0))
    with pytest.raises(DataError, match="predictor volume: the series is constant"):
        lead_lag(xr.full_like(predictor, 3.0), target)
    with pytest.raises(DataError, match="target index: months are left out"):
        lead_lag(predictor, target.isel(time=np.delete(np.arange(480), 40)))
    with pytest.raises(DataError, match="target index: the temperatures are not in °C"):
        lead_lag(predictor, target + 300.0)
    with pytest.raises(DataError, match="target index: a value that stands for 'missing'"):
        lead_lag(predictor, target.where(target["time"] != target["time"][7], -99.99))
