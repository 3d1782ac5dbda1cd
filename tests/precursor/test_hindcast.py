"""The hindcast: folds, that nothing leaks, categories, what is refused."""

from __future__ import annotations

import numpy as np
import pytest
import xarray as xr
from hypothesis import given
from hypothesis import strategies as st

from profiles.config import HindcastSettings
from profiles.errors import DataError, RequestError
from profiles.precursor import anomalies, hindcast, monthly_series, running_mean
from profiles.precursor.hindcast import (
    blocks,
    categories,
    category_probabilities,
    category_shares,
    effective_months,
    folds,
    spread_by_month,
    standardised,
)

SMALL = HindcastSettings(longest_lead=3, spread_blocks=4)


@given(years=st.integers(3, 30), first=st.integers(0, 11), gap=st.integers(1, 24))
def test_no_month_near_a_fold_is_fitted_on_and_every_month_is_forecast_once(years: int, first: int, gap: int) -> None:
    year = (np.arange(12 * years) + first) // 12
    place = np.arange(year.size)
    for scheme in ("years_out", "expanding"):
        made = folds(year, gap, scheme)  # type: ignore[arg-type]
        assert (np.sum([fold.held for fold in made], axis=0) == 1).all()
        for fold in made:
            distance = np.abs(place[fold.used][:, None] - place[fold.held]).min(axis=1, initial=10**6)
            assert (distance > gap).all()
            if scheme == "expanding":
                assert not (fold.used & (place > place[fold.held][0])).any()
            else:
                assert fold.used.sum() >= year.size - 12 - 2 * gap


def test_blocks_hold_every_month_once_and_keep_their_distance() -> None:
    used = np.ones(120, bool)
    used[40:70] = False
    made = blocks(used, 5, 6)
    np.testing.assert_array_equal(np.sum([part.held for part in made], axis=0), used)
    for part in made:
        near = np.convolve(part.held, np.ones(13), "same") > 0.0
        assert not (part.used & near).any()
        assert not (part.used & ~used).any()


def changed(series: xr.DataArray, where: np.ndarray) -> xr.DataArray:
    return series.copy(data=np.where(where, series.values + 7.0 * np.sin(np.arange(series.size)), series.values))


@pytest.mark.parametrize("scheme", ["years_out", "expanding"])
def test_forecasts_of_a_year_know_nothing_of_it_but_the_month_they_start_from(make_record: object, scheme: str) -> None:
    settings = HindcastSettings(longest_lead=3, spread_blocks=4, scheme=scheme)  # type: ignore[arg-type]
    index, predictors = make_record(16, 2)  # type: ignore[operator]
    place = np.arange(index.size)
    first = 12 * 12
    start = first + 4  # a month within the year that is forecast
    # Everything changes from the lead before the year to the lead after it, save the month of the start.
    near = (place >= first - 3) & (place < first + 12 + 3) & (place != start)
    before = hindcast(index, predictors, settings=settings)
    after = hindcast(
        changed(index, near), {name: changed(one, near) for name, one in predictors.items()}, settings=settings
    )
    for lead in (1, 2, 3):
        target = {"lead": lead - 1, "time": start + lead}
        for name in ("forecast", "spread", "probability"):
            np.testing.assert_array_equal(after[name].isel(target), before[name].isel(target), err_msg=name)
    # From another start within the year they differ, and forecasts of the next year differ by what was fitted.
    assert not np.allclose(
        after["forecast"].isel(lead=0, time=first + 2)[1:], before["forecast"].isel(lead=0, time=first + 2)[1:]
    )
    later = {"lead": 0, "time": first + 30}
    assert not np.allclose(after["spread"].isel(later), before["spread"].isel(later))


def test_an_expanding_window_does_not_see_later_years(make_record: object) -> None:
    settings = HindcastSettings(longest_lead=3, spread_blocks=4, scheme="expanding")
    index, predictors = make_record(14, 2)  # type: ignore[operator]
    later = np.arange(index.size) >= 12 * 11
    before = hindcast(index, predictors, settings=settings).isel(time=slice(12 * 11))
    after = hindcast(
        changed(index, later), {name: changed(one, later) for name, one in predictors.items()}, settings=settings
    ).isel(time=slice(12 * 11))
    xr.testing.assert_equal(before, after)
    # Eight years have to precede a year, and the gap of three months: the tenth is the first with a forecast.
    given_years = (
        np.isfinite(before["forecast"].sel(forecaster="regression", lead=1)).values.reshape(-1, 12).all(axis=1)
    )
    np.testing.assert_array_equal(np.flatnonzero(given_years), [9, 10])


def test_white_noise_has_no_skill() -> None:
    random = np.random.default_rng(4)
    time = np.arange("1981-01", "2011-01", dtype="datetime64[M]").astype("M8[ns]")
    index, volume = (monthly_series(random.standard_normal(360), time, name=name) for name in ("index", "volume"))
    made = hindcast(index, {"volume": volume}, settings=SMALL)
    error = ((made["forecast"] - made["observed"]) ** 2).mean("time")
    skill = (1.0 - error / error.sel(forecaster="climatology")).sel(forecaster=["damped_persistence", "regression"])
    # Six coefficients, hardly drawn to zero, on 330 months: 2 % is lost, to about as much.
    assert -0.08 < float(skill.min()) < 0.0
    assert float(skill.max()) < 0.02


def test_the_volume_gives_skill_where_it_leads(made: xr.Dataset) -> None:
    error = ((made["forecast"] - made["observed"]) ** 2).mean("time")
    skill = 1.0 - error / error.sel(forecaster="damped_persistence")
    # exp(-6/20) cos and sin of 6 months in 39: of the variance persistence explains 0.55 * 0.32, with the volume 0.55:
    # the skill over damped persistence tends to 1 - 0.45 / 0.82 = 0.45 at 6 months.
    assert float(skill.sel(forecaster="recharge", lead=6)) == pytest.approx(0.45, abs=0.15)
    assert float(skill.sel(forecaster="combined", lead=6)) > 0.2


def test_stated_spread_is_that_of_the_errors(made: xr.Dataset) -> None:
    square = (((made["forecast"] - made["observed"]) / made["spread"]) ** 2).mean("time")
    # 30 years hold some 20 independent errors: 1 to about a third.
    assert np.abs(square.sel(forecaster="combined") - 1.0).max() < 0.35


def test_probabilities_are_of_categories_that_exclude_each_other(made: xr.Dataset) -> None:
    total = made["probability"].sum("category", skipna=False)
    assert np.isfinite(total).sum() > 0
    np.testing.assert_allclose(total.values[np.isfinite(total.values)], 1.0)
    assert float(made["probability"].min()) >= 0.0


def test_the_first_months_have_no_forecast(made: xr.Dataset) -> None:
    known = np.isfinite(made["forecast"].sel(forecaster="combined"))
    for lead in (1, 4, 6):
        assert int(np.argmax(known.sel(lead=lead).values)) == lead


def test_a_gap_costs_the_forecasts_that_start_in_it(record: tuple) -> None:
    index, predictors = record
    gappy = index.copy()
    gappy[100:103] = np.nan
    made = hindcast(gappy, {"volume": predictors["volume"]}, settings=SMALL)
    combined = made["forecast"].sel(forecaster="combined")
    for lead in (1, 2, 3):
        missing = np.flatnonzero(~np.isfinite(combined.sel(lead=lead).values[lead:])) + lead
        np.testing.assert_array_equal(missing, np.arange(100, 103) + lead)
    assert not np.isfinite(made["observed"].values[100:103]).any()
    assert (made["observed_category"].values[100:103] == -1).all()


def test_without_a_volume_regression_stands_alone(record: tuple) -> None:
    index, predictors = record
    made = hindcast(index[:192], {"tilt": predictors["tilt"][:192]}, settings=SMALL)
    assert list(made["forecaster"].values) == ["climatology", "persistence", "damped_persistence", "regression"]


def test_units_of_the_series_do_not_matter(make_record: object) -> None:
    index, predictors = make_record(14, 3)  # type: ignore[operator]
    before = hindcast(index, predictors, settings=SMALL)
    scaled = {name: one * 1e-3 + 5.0 for name, one in predictors.items()}
    after = hindcast(index - 20.0, scaled, settings=SMALL)
    np.testing.assert_allclose(after["forecast"], before["forecast"], atol=1e-9)


def test_a_trend_is_taken_off_where_asked(make_record: object) -> None:
    index, predictors = make_record(14, 3)  # type: ignore[operator]
    drift = 0.01 * np.arange(index.size)
    plain, drifting = (
        hindcast(one, predictors, settings=SMALL, detrend=True)
        for one in (index, index.copy(data=index.values + drift))
    )
    np.testing.assert_allclose(drifting["observed"], plain["observed"], atol=1e-9)
    np.testing.assert_allclose(drifting["forecast"], plain["forecast"], atol=1e-9)


def test_standardised_anomalies_are_those_of_fit_anomaly_over_a_smoothed_scale(record: tuple) -> None:
    index, _ = record
    found = standardised([index], np.ones(index.size, bool), detrend=False)
    np.testing.assert_allclose(found.anomaly, anomalies(index).values)
    own = anomalies(index).groupby(anomalies(index)["time"].dt.month).std(ddof=1).values
    # January's is the root mean square of December's, January's and February's.
    assert found.scale[0] == pytest.approx(np.sqrt((own[11] ** 2 + own[0] ** 2 + own[1] ** 2) / 3.0))


def test_categories_by_the_threshold() -> None:
    anomaly = np.array([-0.5, -0.49, 0.0, 0.5, 2.0, np.nan])
    np.testing.assert_array_equal(categories(anomaly, 0.5), [0, 1, 1, 2, 2, -1])


def test_category_probabilities_of_a_wide_and_of_a_sharp_forecast() -> None:
    # With many degrees of freedom normal: P(Z > 0.5) = 0.3085; a forecast of +2 with spread 0.5: P(Z > -3) = 0.99865.
    found = category_probabilities(np.array([0.0, 2.0]), np.array([1.0, 0.5]), 1e6, 0.5)
    np.testing.assert_allclose(found[0], [0.30854, 0.38292, 0.30854], atol=1e-4)
    np.testing.assert_allclose(found[1], [0.0, 0.00135, 0.99865], atol=1e-4)


def test_category_shares_count_a_month_and_its_neighbours() -> None:
    month = np.arange(48) % 12
    anomaly = np.where(month == 0, 1.0, 0.0)
    shares = category_shares(anomaly, month, 0.5)
    # In December, January and February 4 of 12 months are warm; with one more of each (1, 9, 5) of 15.
    np.testing.assert_allclose(shares[0], np.array([1.0, 9.0, 5.0]) / 15.0)
    np.testing.assert_allclose(shares[5], np.array([1.0, 13.0, 1.0]) / 15.0)


def test_spread_is_half_the_season_half_the_year() -> None:
    month = np.arange(120) % 12
    departures = np.where(month == 6, 3.0, 1.0)[None]
    # All: (11 + 9) / 12; June to August: (1 + 9 + 1) / 3.
    spread = spread_by_month(departures, month)
    assert spread[0, 6] ** 2 == pytest.approx(0.5 * (20.0 / 12.0 + 11.0 / 3.0))
    assert spread[0, 0] ** 2 == pytest.approx(0.5 * (20.0 / 12.0 + 1.0))


def test_effective_months_of_noise_and_of_red_noise() -> None:
    random = np.random.default_rng(2)
    time = np.arange("1901-01", "2001-01", dtype="datetime64[M]").astype("M8[ns]")
    white = monthly_series(random.standard_normal(1200), time, name="white")
    red = white.copy(data=np.zeros(1200))
    for month in range(1, 1200):
        red[month] = 0.8 * red.values[month - 1] + white.values[month]
    assert effective_months(white) == pytest.approx(1200.0, rel=0.05)
    # (1 - 0.64) / (1 + 0.64) = 0.2195 of 1200 is 263.
    assert effective_months(red) == pytest.approx(263.0, rel=0.25)


def test_a_record_of_six_years_is_too_short_and_its_effective_months_are_told(record: tuple) -> None:
    index, predictors = record
    short = {name: one[:72] for name, one in predictors.items()}
    with pytest.raises(
        DataError, match=r"too short for a hindcast; expected 96 months .* in every series, \d+ effective"
    ):
        hindcast(index[:72], short)


@pytest.mark.parametrize("lead", [1, 12, 24])
@pytest.mark.parametrize("scheme", ["years_out", "expanding"])
def test_the_shortest_record_that_is_not_refused_gives_a_hindcast(record: tuple, lead: int, scheme: str) -> None:
    settings = HindcastSettings(longest_lead=lead, scheme=scheme)  # type: ignore[arg-type]
    index, predictors = record
    # Training months that are asked for, twelve that are forecast, and the leads on one side or on both.
    years = -(-(96 + 2 * max(lead - 12, 0) + 12 + (1 if scheme == "expanding" else 2) * lead) // 12)
    short = {name: one[: 12 * years] for name, one in predictors.items()}
    made = hindcast(index[: 12 * years], short, settings=settings)
    assert np.isfinite(made["forecast"].sel(forecaster="combined", lead=1)).sum() >= 12
    with pytest.raises(DataError, match="too short for a hindcast"):
        hindcast(
            index[: 12 * (years - 1)], {name: one[: 12 * (years - 1)] for name, one in short.items()}, settings=settings
        )


def test_a_centred_mean_is_refused(record: tuple) -> None:
    index, predictors = record
    smooth = running_mean(predictors["volume"], 3, kind="centred")
    with pytest.raises(RequestError, match="a centred running mean knows the future"):
        hindcast(index, {"volume": smooth})


def test_the_index_is_no_predictor_of_its_own_name(record: tuple) -> None:
    index, _ = record
    with pytest.raises(RequestError, match="the index is a predictor already"):
        hindcast(index, {"index": index})


def test_series_that_do_not_overlap_are_refused(record: tuple) -> None:
    index, predictors = record
    with pytest.raises(DataError, match="the series do not overlap"):
        hindcast(index[:180], {"volume": predictors["volume"][180:]})


def test_a_constant_predictor_is_refused(record: tuple) -> None:
    index, predictors = record
    with pytest.raises(DataError, match="tilt: the series is constant"):
        hindcast(index, predictors | {"tilt": xr.zeros_like(index)})


def test_forecasts_without_a_block_know_nothing_of_it(make_record: object) -> None:
    index, predictors = make_record(15, 2)  # type: ignore[operator]
    settings = HindcastSettings(longest_lead=3, spread_blocks=4, block_years=5)
    place = np.arange(index.size)
    block = (place >= 60) & (place < 120)  # the second of three
    before = hindcast(index, predictors, settings=settings)
    after = hindcast(
        changed(index, block), {name: changed(one, block) for name, one in predictors.items()}, settings=settings
    )
    # Forecasts of years outside the block, from starts outside it, in its third month or later.
    outside = np.flatnonzero(~block & ((place < 60) | (place >= 123)))
    for name in ("forecast_without", "observed_without"):
        np.testing.assert_array_equal(
            after[name].isel(block=1, time=outside), before[name].isel(block=1, time=outside), err_msg=name
        )
        assert not np.allclose(
            after[name].isel(block=0, time=outside[-12:]), before[name].isel(block=0, time=outside[-12:])
        )
    # Months of the block itself are not forecast without it.
    assert np.isnan(before["forecast_without"].isel(block=1, time=np.flatnonzero(block))).all()
