"""The outlook: what it says, and when it is withheld."""

from __future__ import annotations

import numpy as np
import pytest
import xarray as xr

from profiles.config import HindcastSettings
from profiles.errors import DataError, RequestError
from profiles.precursor import anomalies, outlook, verify
from profiles.precursor.outlook import OutlookStatus, skill_status
from profiles.vocabulary import CAUTION


@pytest.fixture(scope="module")
def issued(record: tuple, made: xr.Dataset, quick: HindcastSettings) -> xr.Dataset:
    return outlook(*record, hindcast=made, settings=quick)


def test_outlook_carries_the_caution_and_its_start(issued: xr.Dataset) -> None:
    assert issued.attrs["caution"] == CAUTION
    assert "national services" in issued.attrs["caution"]
    assert issued.attrs["start"] == "2010-12"
    assert str(issued["target"].values[0])[:7] == "2011-01"


def test_given_leads_have_a_plume_and_probabilities(issued: xr.Dataset) -> None:
    given = issued["status"] == OutlookStatus.GIVEN
    assert given.sel(lead=1)
    part = issued.isel(lead=np.flatnonzero(given.values))
    assert (np.diff(part["plume"].values, axis=1) > 0.0).all()
    np.testing.assert_allclose(part["plume"].sel(quantile=0.5), part["forecast"], atol=1e-12)
    np.testing.assert_allclose(part["probability"].sum("category"), 1.0)
    np.testing.assert_allclose(part["usual_probability"].sum("category"), 1.0)


def test_at_one_month_the_forecast_is_near_the_last_anomaly(issued: xr.Dataset, record: tuple) -> None:
    last = float(anomalies(record[0])[-1])
    # exp(-1/20) cos(2 pi / 39) = 0.94 of it, and 0.15 of the recharge's: within one spread of the one-month forecast.
    assert float(issued["forecast"].sel(lead=1)) == pytest.approx(last, abs=2.0 * float(issued["spread"].sel(lead=1)))


def test_spread_grows_with_the_lead(issued: xr.Dataset) -> None:
    spread = issued["spread"].values
    assert spread[np.isfinite(spread)][-1] > 1.3 * spread[0]


def test_six_years_are_too_short_and_it_says_so(record: tuple) -> None:
    index, predictors = record
    found = outlook(index[:72], {name: one[:72] for name, one in predictors.items()})
    assert (found["status"] == OutlookStatus.RECORD_TOO_SHORT).all()
    assert np.isnan(found["forecast"]).all()
    assert np.isnan(found["plume"]).all()
    assert np.isnan(found["probability"]).all()
    assert np.isnan(found["usual_probability"]).all()
    assert found.attrs["reason"].startswith("withheld: the record is too short to show skill: 6.0 years, ")
    assert found.attrs["reason"].endswith("effective months; 15 years are needed")
    assert found.attrs["caution"] == CAUTION


def test_noise_gives_no_outlook(record: tuple, quick: HindcastSettings) -> None:
    index, _ = record
    random = np.random.default_rng(8)
    noise, other = (index.copy(data=random.standard_normal(index.size)) for _ in range(2))
    found = outlook(noise, {"volume": other}, settings=quick)
    assert (found["status"] == OutlookStatus.NO_SKILL).all()
    assert np.isnan(found["forecast"]).all()
    assert "the hindcast shows no skill (1, 2, 3, 4, 5, 6 months)" in found.attrs["reason"]


@pytest.fixture
def scores(made: xr.Dataset) -> xr.Dataset:
    found = verify(made).sel(forecaster="combined").copy(deep=True)
    for name in ("skill_climatology", "probability_skill"):
        found[name][:], found[f"{name}_low"][:] = 0.4, 0.1
    return found


def test_a_lead_without_skill_takes_the_longer_ones_with_it(scores: xr.Dataset) -> None:
    scores["skill_climatology_low"].loc[{"lead": 3, "season": "all"}] = -0.01
    np.testing.assert_array_equal(skill_status(scores, np.arange(6)), [0, 0, 2, 2, 2, 2])


def test_probabilities_without_skill_count_as_well(scores: xr.Dataset) -> None:
    scores["probability_skill_low"].loc[{"lead": 5, "season": "all"}] = 0.0
    np.testing.assert_array_equal(skill_status(scores, np.arange(6)), [0, 0, 0, 0, 2, 2])


def test_a_season_without_skill_is_withheld_alone(scores: xr.Dataset) -> None:
    # The targets of leads 1 to 6 are April to September: the second is May, whose season is AMJ.
    scores["skill_climatology"].loc[{"lead": 2, "season": "AMJ"}] = -0.1
    np.testing.assert_array_equal(skill_status(scores, np.arange(3, 9)), [0, 3, 0, 0, 0, 0])


def test_undefined_skill_is_no_skill(scores: xr.Dataset) -> None:
    scores["skill_climatology_low"][:] = np.nan
    assert (skill_status(scores, np.arange(6)) == OutlookStatus.NO_SKILL).all()


def test_a_last_month_without_values_moves_the_start(record: tuple, made: xr.Dataset, quick: HindcastSettings) -> None:
    index, predictors = record
    volume = predictors["volume"].copy()
    volume[-2:] = np.nan
    found = outlook(index, predictors | {"volume": volume}, hindcast=made, settings=quick)
    assert found.attrs["start"] == "2010-10"


def test_a_hindcast_of_something_else_is_refused(record: tuple, made: xr.Dataset, quick: HindcastSettings) -> None:
    index, predictors = record
    with pytest.raises(RequestError, match="the hindcast is of something else"):
        outlook(index, {"volume": predictors["volume"]}, hindcast=made, settings=quick)


@pytest.mark.parametrize("name", ["climatology", "best"])
def test_an_outlook_is_made_by_a_forecaster_that_forecasts(
    record: tuple, made: xr.Dataset, quick: HindcastSettings, name: str
) -> None:
    with pytest.raises(RequestError, match="no such forecaster; expected regression or recharge or combined"):
        outlook(*record, hindcast=made, settings=quick, forecaster=name)


def test_series_that_do_not_overlap_are_refused(record: tuple) -> None:
    index, predictors = record
    with pytest.raises(DataError, match="the series do not overlap"):
        outlook(index[:180], {"volume": predictors["volume"][180:]})
