"""Scores of the hindcast against scipy and scikit-learn."""

from __future__ import annotations

import numpy as np
import pytest
import xarray as xr
from scipy import stats

from profiles.precursor import verify
from profiles.precursor.series import middle_of

metrics = pytest.importorskip("sklearn.metrics")
linear_model = pytest.importorskip("sklearn.linear_model")

MONTHS, LEADS = 240, 2
NAMES = ["climatology", "persistence", "damped_persistence", "regression"]


@pytest.fixture(scope="module")
def drawn() -> xr.Dataset:
    random = np.random.default_rng(9)
    observed = random.standard_normal(MONTHS)
    forecast = 0.6 * observed + random.standard_normal((len(NAMES), LEADS, MONTHS))
    probability = random.dirichlet([2.0, 2.0, 2.0], (len(NAMES), LEADS, MONTHS))
    # Nothing before the lead, as in a record; and a gap in one forecaster, which all are scored without.
    for lead in range(LEADS):
        forecast[:, lead, : lead + 1] = np.nan
    forecast[1, :, 100:110] = np.nan
    dims = ("forecaster", "lead", "time")
    return xr.Dataset(
        {
            "forecast": (dims, forecast, {"units": "degree_Celsius"}),
            "probability": ((*dims, "category"), probability),
            "observed": ("time", observed),
            "observed_category": ("time", 1 + (observed >= 0.5).astype(int) - (observed <= -0.5)),
        },
        coords={
            "forecaster": NAMES,
            "lead": [1, 2],
            "time": middle_of(np.arange("2001-01", "2021-01", dtype="datetime64[M]")),
            "category": ["cold", "neutral", "warm"],
        },
        attrs={"block_years": 3},
    )


@pytest.fixture(params=[("all", range(1, 13)), ("MAM", (3, 4, 5))], ids=["all", "MAM"])
def part(request: pytest.FixtureRequest, drawn: xr.Dataset) -> tuple[xr.Dataset, xr.Dataset]:
    """Return the scores of a season, and what they are of, from plain selections."""
    season, months = request.param
    known = np.isfinite(drawn["forecast"].sel(lead=2)).all("forecaster") & drawn["time"].dt.month.isin(list(months))
    return verify(drawn).sel(lead=2, season=season), drawn.sel(lead=2).isel(time=np.flatnonzero(known.values))


def test_correlation_is_that_of_scipy(part: tuple[xr.Dataset, xr.Dataset]) -> None:
    scores, used = part
    for name in NAMES:
        theirs = stats.pearsonr(used["forecast"].sel(forecaster=name), used["observed"]).statistic
        assert float(scores["correlation"].sel(forecaster=name)) == pytest.approx(theirs)


def test_root_mean_square_and_skill_are_those_of_scikit_learn(part: tuple[xr.Dataset, xr.Dataset]) -> None:
    scores, used = part
    square = {
        name: metrics.mean_squared_error(used["observed"], used["forecast"].sel(forecaster=name)) for name in NAMES
    }
    for name in NAMES:
        assert float(scores["rms"].sel(forecaster=name)) == pytest.approx(np.sqrt(square[name]))
        for baseline in NAMES[:3]:
            theirs = 1.0 - square[name] / square[baseline]
            assert float(scores[f"skill_{baseline}"].sel(forecaster=name)) == pytest.approx(theirs)


def test_ranked_probability_is_the_sum_of_two_brier_scores(part: tuple[xr.Dataset, xr.Dataset]) -> None:
    scores, used = part

    def ranked(name: str) -> float:
        probability = used["probability"].sel(forecaster=name).cumsum("category").values
        return sum(
            metrics.brier_score_loss(used["observed_category"] <= at, np.clip(probability[:, at], 0.0, 1.0))
            for at in (0, 1)
        )

    theirs = 1.0 - ranked("regression") / ranked("climatology")
    assert float(scores["probability_skill"].sel(forecaster="regression")) == pytest.approx(theirs)


def test_reliability_slope_is_a_regression_with_a_mean_for_each_category(part: tuple[xr.Dataset, xr.Dataset]) -> None:
    scores, used = part
    probability = used["probability"].sel(forecaster="regression").values
    came = (used["observed_category"].values[:, None] == np.arange(3)).astype(float)
    stated, event = (values - values.mean(axis=0) for values in (probability, came))
    theirs = linear_model.LinearRegression(fit_intercept=False).fit(stated.reshape(-1, 1), event.ravel()).coef_[0]
    assert float(scores["reliability_slope"].sel(forecaster="regression")) == pytest.approx(theirs)
