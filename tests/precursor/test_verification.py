"""Scores: hand-worked values, intervals, seasons, reliability."""

from __future__ import annotations

import numpy as np
import pytest
import xarray as xr
from scipy import stats

from profiles.errors import DataError
from profiles.precursor import reliability, verify
from profiles.precursor.hindcast import year_blocks
from profiles.precursor.series import middle_of
from profiles.precursor.verification import (
    SCORES,
    SEASONS,
    jackknife_interval,
    leave_out_weights,
    season_weights,
)


def table(forecast: np.ndarray, probability: np.ndarray, observed: np.ndarray, *, block_years: int = 1) -> xr.Dataset:
    """Return a hindcast of one lead: climatology, two persistences that are climatology too, and one forecast."""
    flat, usual = np.zeros_like(forecast), np.broadcast_to([0.3, 0.4, 0.3], probability.shape)
    names = ["climatology", "persistence", "damped_persistence", "regression"]
    category = 1 + (observed >= 0.5).astype(int) - (observed <= -0.5)
    months = np.arange("2001-01", np.datetime64("2001-01", "M") + observed.size, dtype="datetime64[M]")
    return xr.Dataset(
        {
            "forecast": (
                ("forecaster", "lead", "time"),
                np.stack([flat, flat, flat, forecast])[:, None],
                {"units": "degree_Celsius"},
            ),
            "probability": (
                ("forecaster", "lead", "time", "category"),
                np.stack([usual, usual, usual, probability])[:, None],
            ),
            "observed": ("time", observed),
            "observed_category": ("time", np.where(np.isfinite(observed), category, -1)),
        },
        coords={
            "forecaster": names,
            "lead": [1],
            "time": middle_of(months),
            "category": ["cold", "neutral", "warm"],
        },
        attrs={"block_years": block_years},
    )


def drawn(months: int, seed: int, *, boldness: float = 1.0) -> xr.Dataset:
    """Return forecasts whose probabilities are right, or that many times as bold in the logarithm."""
    random = np.random.default_rng(seed)
    logarithm = random.standard_normal((months, 3))
    right = np.exp(logarithm) / np.exp(logarithm).sum(axis=1, keepdims=True)
    came = (random.random((months, 1)) > right.cumsum(axis=1)).sum(axis=1)
    stated = right**boldness / (right**boldness).sum(axis=1, keepdims=True)
    return table(random.standard_normal(months), stated, np.array([-1.0, 0.0, 1.0])[came], block_years=50)


@pytest.fixture
def worked() -> xr.Dataset:
    """Two years: the forecast is 1 in half of each year, -1 in the other; what comes is that, or 0 every third "
    "month."""
    forecast = np.tile([1.0] * 6 + [-1.0] * 6, 2)
    observed = np.where(np.arange(24) % 3 == 2, 0.0, forecast)
    probability = np.where(forecast[:, None] > 0, [0.0, 0.25, 0.75], [0.75, 0.25, 0.0])
    return table(forecast, probability, observed)


def test_scores_of_a_hand_worked_hindcast(worked: xr.Dataset) -> None:
    scores = verify(worked).sel(forecaster="regression", lead=1, season="all")
    # 8 of 24 miss by 1: mse 1/3; climatology misses 16 by 1: mse 2/3; means are 0.
    assert float(scores["rms"]) == pytest.approx(np.sqrt(1.0 / 3.0))
    assert float(scores["skill_climatology"]) == pytest.approx(0.5)
    # covariance 16/24, variances 1 and 16/24.
    assert float(scores["correlation"]) == pytest.approx(np.sqrt(2.0 / 3.0))
    # sharpness 0.75^2 + 0.25^2; earned 0.75 * 16/24 + 0.25 * 8/24.
    assert float(scores["sharpness"]) == pytest.approx(0.625)
    assert float(scores["earned"]) == pytest.approx(0.5 + 1.0 / 12.0)
    assert float(scores["overconfidence"]) == pytest.approx(0.625 - 7.0 / 12.0)
    # Ranked: (0, 1/4 | 1) of warm: hit 0 + (1/4)^2, neutral came 0 + (3/4)^2; the usual (0.3, 0.7): warm 0.09 + 0.49,
    # neutral 0.09 + 0.09; cold is warm mirrored.
    own, usual = (16 * 0.0625 + 8 * 0.5625) / 24, (16 * 0.58 + 8 * 0.18) / 24
    assert float(scores["probability_skill"]) == pytest.approx(1.0 - own / usual)
    assert int(verify(worked)["forecast_count"].sel(lead=1, season="all")) == 24


def test_reliability_slope_of_a_hand_worked_hindcast(worked: xr.Dataset) -> None:
    # Cold and warm: p is 0.75 or 0, came in 8 of 12 or 0 of 12: covariance 0.375 * 1/3, variance 0.375^2; neutral: p is
    # 1/4 always and adds nothing. Slope 8/9.
    assert float(
        verify(worked)["reliability_slope"].sel(forecaster="regression", lead=1, season="all")
    ) == pytest.approx(8.0 / 9.0)
    assert float(reliability(worked)["reliability_slope"].sel(forecaster="regression")) == pytest.approx(8.0 / 9.0)


def test_constant_forecasts_have_no_correlation_and_no_slope(worked: xr.Dataset) -> None:
    scores = verify(worked).sel(forecaster="climatology")
    assert np.isnan(scores["correlation"]).all()
    assert np.isnan(scores["reliability_slope"]).all()
    np.testing.assert_allclose(scores["skill_climatology"], 0.0)


def test_right_probabilities_have_slope_one_and_are_not_too_sharp() -> None:
    scores = reliability(drawn(6000, 1)).sel(forecaster="regression")
    assert float(scores["reliability_slope"]) == pytest.approx(1.0, abs=0.06)
    assert float(scores["overconfidence"]) == pytest.approx(0.0, abs=0.01)


def test_bold_probabilities_are_found_out() -> None:
    scores = reliability(drawn(6000, 1, boldness=2.0)).sel(forecaster="regression")
    assert float(scores["reliability_slope_high"]) < 0.8
    assert float(scores["overconfidence_low"]) > 0.05


def test_observed_share_follows_the_stated_probability() -> None:
    found = reliability(drawn(12000, 2)).sel(forecaster="regression")
    many = found["count"].values > 200
    np.testing.assert_allclose(found["observed_share"].values[many], found["stated_probability"].values[many], atol=0.1)
    # Each forecast stands once in each category.
    np.testing.assert_array_equal(found["count"].sum("bin"), 12000)
    inside = (found["stated_probability"] >= found["observed_share_low"]) & (
        found["stated_probability"] <= found["observed_share_high"]
    )
    assert 0.7 < float(inside.values[many].mean()) <= 1.0


def test_seasons_take_the_three_months_around_theirs(worked: xr.Dataset) -> None:
    assert SEASONS[0] == "DJF"
    assert SEASONS[6] == "JJA"
    weights = season_weights(np.arange(12))
    assert np.flatnonzero(weights[1]).tolist() == [0, 1, 11]
    assert np.flatnonzero(weights[7]).tolist() == [5, 6, 7]
    spoilt = worked.copy(deep=True)
    june_to_august = worked["time"].dt.month.isin([6, 7, 8])
    spoilt["observed"] = worked["observed"].where(~june_to_august, worked["observed"] + 5.0)
    before, after = (verify(one)["rms"].sel(forecaster="regression", lead=1) for one in (worked, spoilt))
    assert after.sel(season="JJA") > before.sel(season="JJA") + 4.0
    assert after.sel(season="DJF") == before.sel(season="DJF")


def test_all_forecasters_are_scored_on_the_same_months(worked: xr.Dataset) -> None:
    worked["forecast"][3, 0, :6] = np.nan
    scores = verify(worked)
    assert int(scores["forecast_count"].sel(lead=1, season="all")) == 18
    # Climatology misses 12 of the 18 by 1.
    assert float(scores["rms"].sel(forecaster="climatology", lead=1, season="all")) == pytest.approx(np.sqrt(2.0 / 3.0))


def test_interval_of_a_mean_is_that_of_students_t() -> None:
    values = np.random.default_rng(1).standard_normal(12)
    weights = leave_out_weights(np.arange(12))
    means = weights @ values / weights.sum(axis=1)
    low, high = jackknife_interval(means, lambda v: v, lambda v: v)
    # With blocks of one value the jackknife's error of a mean is s / sqrt(n).
    expected = stats.ttest_1samp(values, 0.0).confidence_interval(0.95)
    assert (low, high) == pytest.approx((expected.low, expected.high))


def test_intervals_hold_the_score_where_errors_persist() -> None:
    # Forecasts and errors that persist for some months: the interval of the correlation holds the true 1/sqrt(2) in
    # about 19 of 20 records of 30 years. Of 60, fewer than 50 would hold in 1 of 1000 such tests.
    held = 0
    for seed in range(60):
        noise = np.random.default_rng(seed).standard_normal((2, 360))
        slow = np.zeros((2, 360))
        for month in range(1, 360):
            slow[:, month] = 0.8 * slow[:, month - 1] + 0.6 * noise[:, month]
        made = table(slow[0], np.full((360, 3), 1.0 / 3.0), slow.sum(axis=0), block_years=3)
        scores = verify(made).sel(forecaster="regression", lead=1, season="all")
        held += float(scores["correlation_low"]) < np.sqrt(0.5) < float(scores["correlation_high"])
    assert held >= 50


def test_year_blocks_are_whole_and_the_rest_joins_the_last() -> None:
    year = np.repeat(np.arange(2001, 2009), 12)
    blocks = year_blocks(year, 3)
    assert [np.unique(year[blocks == number]).tolist() for number in (0, 1)] == [
        [2001, 2002, 2003],
        [2004, 2005, 2006, 2007, 2008],
    ]


def test_every_score_has_an_interval_and_units(made: xr.Dataset) -> None:
    scores = verify(made)
    for name in SCORES:
        one = scores.sel(forecaster="combined", season="all")
        assert (one[f"{name}_low"] <= one[name]).all()
        assert (one[name] <= one[f"{name}_high"]).all()
        assert scores[name].attrs["units"] == ("degree_Celsius" if name == "rms" else "1")


def test_leads_of_a_reliability_can_be_chosen(made: xr.Dataset) -> None:
    few = reliability(made, first_lead=2, last_lead=4)
    assert few.attrs["leads"] == "2 to 4 months"
    assert int(few["count"].sum()) < int(reliability(made)["count"].sum())


def test_a_hindcast_of_one_block_has_no_intervals(worked: xr.Dataset) -> None:
    with pytest.raises(DataError, match="too short for scores with intervals; expected two or more blocks of 3 years"):
        verify(worked.assign_attrs(block_years=3))


def test_what_was_fitted_counts_in_the_error_of_a_score(worked: xr.Dataset) -> None:
    # Without a block the forecast is three times as large, and its error another: the two years then no longer agree.
    times = np.array([1.0, 3.0]).reshape(2, 1, 1, 1)
    without = worked.assign(
        forecast_without=(("block", *worked["forecast"].dims), worked["forecast"].values * times),
        observed_without=(("block", "time"), np.stack([worked["observed"].values] * 2)),
    )
    plain, refitted = (verify(one).sel(forecaster="regression", lead=1, season="all") for one in (worked, without))
    assert float(refitted["rms"]) == float(plain["rms"])
    # Both years are alike: taking the fitted as given there is no error; with it the mean square is 1/3, or that of
    # 2 where it was hit and 3 where it was not, (16 * 4 + 8 * 9) / 24 = 17/3.
    assert float(plain["rms_high"]) == pytest.approx(float(plain["rms"]))
    logs = 0.5 * np.log(np.array([1.0 / 3.0, 17.0 / 3.0]))
    error = np.sqrt(0.5 * ((logs - logs.mean()) ** 2).sum())
    expected = np.exp(logs[0] + stats.t.ppf(0.975, 1) * error)
    assert float(refitted["rms_high"]) == pytest.approx(expected)
