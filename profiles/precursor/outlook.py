"""What the last month of the record says of the months to come, and when that is withheld."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from enum import IntEnum

import numpy as np
import xarray as xr
from numpy.typing import NDArray
from scipy.special import stdtrit

from profiles.config import HindcastSettings
from profiles.errors import RequestError
from profiles.precursor.forecasters import BASELINES
from profiles.precursor.hindcast import (
    CATEGORIES,
    Issued,
    aligned,
    category_probabilities,
    effective_months,
    issue,
    place_of_volume,
)
from profiles.precursor.hindcast import hindcast as make_hindcast
from profiles.precursor.series import middle_of, month_of
from profiles.precursor.verification import SEASONS, WHOLE_YEAR, verify
from profiles.vocabulary import CAUTION

Array = NDArray[np.float64]

#: Of the plume; the outermost hold 90 % between them.
QUANTILES = (0.05, 0.25, 0.5, 0.75, 0.95)


class OutlookStatus(IntEnum):
    """Why an outlook is or is not given."""

    GIVEN = 0
    RECORD_TOO_SHORT = 1
    NO_SKILL = 2
    NO_SKILL_IN_SEASON = 3


REASONS: Mapping[OutlookStatus, str] = {
    OutlookStatus.GIVEN: "given",
    OutlookStatus.RECORD_TOO_SHORT: "withheld: the record is too short to show skill",
    OutlookStatus.NO_SKILL: "withheld: at this lead, or a shorter one, the hindcast shows no skill",
    OutlookStatus.NO_SKILL_IN_SEASON: "withheld: for this season the hindcast shows no skill at this lead",
}


def outlook(
    index: xr.DataArray,
    predictors: Mapping[str, xr.DataArray],
    *,
    hindcast: xr.Dataset | None = None,
    forecaster: str | None = None,
    settings: HindcastSettings | None = None,
    detrend: bool = False,
) -> xr.Dataset:
    """Forecast the index from the last month of the record, as far as the hindcast shows skill.

    Parameters
    ----------
    index, predictors : xarray.DataArray, mapping of str to xarray.DataArray
        As for :func:`profiles.precursor.hindcast`.
    hindcast : xarray.Dataset, optional
        What that made of the same series by the same settings. Default: it is made.
    forecaster : str, optional
        Default: ``combined`` where there is a volume, else ``regression``. Named beforehand: picking the one that
        scored best would make its score too good.
    settings : HindcastSettings, optional
        Those of the hindcast.
    detrend : bool
        As for the hindcast.

    Returns
    -------
    xarray.Dataset
        On ``lead``, with the coordinate ``target`` (middle of the month forecast): ``forecast``, an anomaly in the
        units of the index from the climatology of the whole record; its ``spread``, one standard deviation, learnt out
        of sample; ``plume`` (lead, quantile); ``probability`` and ``usual_probability`` (lead, category), of the
        forecast and of any year; ``status`` (lead), of :class:`OutlookStatus`. NaN where it is withheld. The
        attributes hold the ``caution``, the ``start`` month and ``reason``, in words, where anything is withheld.

        A lead is withheld where the lower end of the 95 % interval of ``skill_climatology`` or ``probability_skill``
        is not above 0, at it or a shorter one; and where their estimates for its target season are not.

    Raises
    ------
    RequestError
        Where there is no such forecaster, or the hindcast is of other series, settings or leads.
    DataError
        As for the hindcast; a record too short for an outlook is no error: all of it is withheld.
    """
    settings = settings or HindcastSettings()
    series = aligned(index, predictors)
    whole = np.all([np.isfinite(one.values) for one in series], axis=0)
    start = int(np.flatnonzero(whole)[-1]) if whole.any() else series[0].size - 1
    chosen = forecaster or ("combined" if place_of_volume(predictors) is not None else "regression")
    plan = _Plan(series[0], start, settings, chosen, " ".join(["index", *predictors]))
    if whole.sum() < 12 * settings.shortest_outlook_record:
        reason = _too_short(series[0], int(whole.sum()), settings)
        return plan.labelled(None, np.full(settings.longest_lead, OutlookStatus.RECORD_TOO_SHORT), reason)
    if hindcast is None:
        hindcast = make_hindcast(index, predictors, settings=settings, detrend=detrend)
    plan.check(hindcast)
    status = skill_status(verify(hindcast).sel(forecaster=chosen), plan.aims % 12)
    issued = issue(series, np.ones(series[0].size, bool), place_of_volume(predictors), settings, detrend=detrend)
    return plan.labelled(issued, status, _reason(status))


def skill_status(scores: xr.Dataset, month: NDArray[np.int64]) -> NDArray[np.int64]:
    """Return whether each lead shows skill.

    Parameters
    ----------
    scores : xarray.Dataset
        Of one forecaster, as :func:`profiles.precursor.verify` returns them.
    month : ndarray of int, shape (lead,)
        Calendar month of each lead's target, 0 to 11.
    """
    names = ("skill_climatology", "probability_skill")
    sure = np.all([scores[f"{name}_low"].sel(season=WHOLE_YEAR).values > 0.0 for name in names], axis=0)
    lost = np.maximum.accumulate(~sure)
    season = xr.DataArray([SEASONS[at] for at in month], dims="lead", coords={"lead": scores["lead"]})
    seasonal = np.all([scores[name].sel(season=season).values > 0.0 for name in names], axis=0)
    status = np.where(seasonal, OutlookStatus.GIVEN, OutlookStatus.NO_SKILL_IN_SEASON)
    return np.where(lost, OutlookStatus.NO_SKILL, status)


def _too_short(index: xr.DataArray, months: int, settings: HindcastSettings) -> str:
    return (
        f"{REASONS[OutlookStatus.RECORD_TOO_SHORT]}: {months / 12:.1f} years, {effective_months(index):.0f} effective "
        f"months; "
        f"{settings.shortest_outlook_record} years are needed"
    )


def _reason(status: NDArray[np.int64]) -> str:
    """Say in words which leads are withheld and why; empty where none is."""
    parts = []
    for one in list(OutlookStatus)[1:]:
        leads = np.flatnonzero(status == one) + 1
        if leads.size:
            parts.append(f"{REASONS[one]} ({', '.join(map(str, leads))} months)")
    return "; ".join(parts)


@dataclass(frozen=True)
class _Plan:
    """What is forecast from where, by whom."""

    index: xr.DataArray
    start: int
    settings: HindcastSettings
    forecaster: str
    variables: str

    @property
    def aims(self) -> NDArray[np.int64]:
        """Months since 1970-01 of the targets."""
        first = month_of(self.index["time"])[self.start].astype(np.int64)
        return np.asarray(first + np.arange(1, self.settings.longest_lead + 1))

    def check(self, hindcast: xr.Dataset) -> None:
        """Raise RequestError where the hindcast does not speak of this outlook."""
        names = [str(name) for name in hindcast["forecaster"].values]
        if self.forecaster not in names or self.forecaster in BASELINES:
            raise RequestError(
                "no such forecaster",
                where="forecaster",
                expected=" or ".join(name for name in names if name not in BASELINES),
                found=self.forecaster,
            )
        own = (str(self.index.name), self.variables, self.settings.longest_lead, self.settings.threshold)
        stated = hindcast.attrs
        other = (stated["index"], stated["predictors"], hindcast.sizes["lead"], stated["threshold"])
        if own != other:
            raise RequestError(
                "the hindcast is of something else",
                where="hindcast",
                expected=f"index, variables, longest lead and threshold {own}",
                found=f"{other}",
                advice="make the hindcast of the same series by the same settings",
            )

    def labelled(self, issued: Issued | None, status: NDArray[np.int64], reason: str) -> xr.Dataset:
        """Return the dataset, NaN where ``status`` withholds it."""
        units = {"units": str(self.index.attrs.get("units", "1"))}
        given = status == OutlookStatus.GIVEN
        leads = np.arange(1, self.settings.longest_lead + 1)
        centre, spread, freedom, usual = self._numbers(issued)
        quantiles = centre[:, None] + spread[:, None] * stdtrit(freedom, np.array(QUANTILES))
        probability = category_probabilities(centre, spread, freedom, self.settings.threshold)

        def shown(values: Array) -> Array:
            return np.where(given.reshape(-1, *[1] * (values.ndim - 1)), values, np.nan)

        meanings = " ".join(one.name.lower() for one in OutlookStatus)
        flags = {"flag_values": np.array(list(OutlookStatus), dtype=np.int8), "flag_meanings": meanings}
        dataset = xr.Dataset(
            {
                "forecast": ("lead", shown(centre), units | {"long_name": "forecast anomaly of the index"}),
                "spread": ("lead", shown(spread), units | {"long_name": "standard deviation of the forecast"}),
                "plume": (("lead", "quantile"), shown(quantiles), units | {"long_name": "quantiles of the forecast"}),
                "probability": (
                    ("lead", "category"),
                    shown(probability),
                    {"units": "1", "long_name": "probability of the category"},
                ),
                "usual_probability": (
                    ("lead", "category"),
                    shown(usual),
                    {"units": "1", "long_name": "share of the category at that time of the year"},
                ),
                "status": ("lead", status.astype(np.int8), flags | {"long_name": "why the outlook is or is not given"}),
            },
            coords={
                "lead": ("lead", leads, {"units": "month"}),
                "target": ("lead", middle_of(self.aims.astype("datetime64[M]"))),
                "quantile": list(QUANTILES),
                "category": list(CATEGORIES),
            },
        )
        return dataset.assign_attrs(
            caution=CAUTION,
            start=str(month_of(self.index["time"])[self.start]),
            forecaster=self.forecaster,
            predictors=self.variables,
            index=str(self.index.name),
            threshold=self.settings.threshold,
            reason=reason,
        )

    def _numbers(self, issued: Issued | None) -> tuple[Array, Array, float, Array]:
        leads = self.settings.longest_lead
        if issued is None:
            nothing = np.full(leads, np.nan)
            return nothing, nothing, 1.0, np.full((leads, len(CATEGORIES)), np.nan)
        month = self.aims % 12
        centre = issued.centre[self.forecaster][:, self.start]
        return centre, issued.spread[self.forecaster][np.arange(leads), month], issued.freedom, issued.usual[month]
