"""Volume and tilt as precursors of an index: from a run, or from files, to ``precursor.nc``, tables and an outlook."""

from __future__ import annotations

import json
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import xarray as xr

from profiles import store
from profiles.config import PrecursorSettings
from profiles.errors import DataError
from profiles.pipeline.attributes import KEYWORDS, VOCABULARY
from profiles.pipeline.paths import Folder
from profiles.pipeline.precursor_inputs import (
    Inputs,
    Sources,
    array_description,
    base_of,
    precursor_settings,
    read_inputs,
)
from profiles.pipeline.precursor_report import write_precursor_report
from profiles.vocabulary import CAUTION, VARIABLES, describe

#: Of the series, those that a forecast may use; a pattern is fitted on the whole record, and so knows the future.
FORECAST_FROM = ("volume", "western_volume", "tilt", "wind")
UNITS_OF_VOLUME = 1e14  # m3; tables give volumes in it


@dataclass(frozen=True)
class PrecursorOutcome:
    """What was found, as the closing lines of the command say it.

    ``leads`` has a row for each predictor, ``events`` one for each event, ``scores`` one for each lead of the
    forecaster named, ``outlook`` one for each lead; ``withheld`` says why there is no hindcast or outlook, or less of
    it; ``notes`` where the series came from and what could not be done.
    """

    out: Path
    record: str
    notes: tuple[str, ...]
    leads: tuple[dict[str, Any], ...]
    events: tuple[dict[str, Any], ...]
    rule: str
    oscillator: dict[str, float]
    forecaster: str
    scores: tuple[dict[str, Any], ...]
    outlook: tuple[dict[str, Any], ...]
    withheld: str


def precursor(
    out: Path,
    sources: Sources,
    *,
    settings: PrecursorSettings | None = None,
    box: str | None = None,
    progress: Callable[[str], None] | None = None,
) -> PrecursorOutcome:
    """Make the precursor analysis of a run, or of files, into the run's folder.

    Parameters
    ----------
    out : Path
        The folder of a run; or, where ``sources`` names a file of series, any folder, made where there is none.
    sources : Sources
        Files.
    settings : PrecursorSettings, optional
        Default: those of the run's configuration, or the defaults.
    box : str, optional
        In place of the setting.
    progress : callable, optional
        Called with the name of each step when it begins.

    Raises
    ------
    RequestError
        Where a file is missing or the request does not fit.
    DataError
        Where the series are unfit for any correlation.
    MachineError
        Where the folder cannot be written.
    """
    folder = Folder(out)
    chosen = settings or precursor_settings(folder)
    if box is not None:
        chosen = chosen.model_copy(update={"box": box})
    say = progress or (lambda step: None)
    say("series")
    inputs = read_inputs(folder, sources, chosen)
    analysis = _Analysis.of(inputs, chosen)
    say("lead-lag")
    lead_lags, notes = _lead_lags(analysis)
    say("events")
    events = _events(analysis)
    say("hindcast")
    forecast = _forecast(analysis)
    say("files")
    for path in (folder.out, folder.folders()[1], folder.table("").parent):
        store.make_folder(path)
    with store.folder_lock(folder.folders()[1]):
        _write(folder, analysis, lead_lags, events, forecast)
        say("report")
        told = [*inputs.notes, *notes, forecast.withheld]
        write_precursor_report(folder, inputs.inputs, [note for note in told if note])
    return _outcome(folder, analysis, lead_lags, events, forecast, notes)


@dataclass(frozen=True)
class _Analysis:
    """The series as anomalies, patterns among the predictors."""

    inputs: Inputs
    settings: PrecursorSettings
    index: xr.DataArray
    index_anomaly: xr.DataArray
    predictors: Mapping[str, xr.DataArray]
    patterns: xr.Dataset | None

    @classmethod
    def of(cls, inputs: Inputs, settings: PrecursorSettings) -> _Analysis:
        from profiles.precursor import anomalies

        base = base_of(settings)

        def departures(series: xr.DataArray) -> xr.DataArray:
            return anomalies(series, base, detrend=settings.detrend, standardise=settings.standardise)

        predictors = {name: departures(series) for name, series in inputs.predictors.items()}
        patterns = None
        if inputs.section is not None and settings.patterns:
            series, patterns = _patterns(inputs.section, settings)
            predictors |= series
        return cls(
            inputs=inputs,
            settings=settings,
            index=anomalies(inputs.index, base, detrend=settings.detrend),
            index_anomaly=departures(inputs.index),
            predictors=predictors,
            patterns=patterns,
        )


def _patterns(section: xr.DataArray, settings: PrecursorSettings) -> tuple[dict[str, xr.DataArray], xr.Dataset]:
    from profiles.precursor import fit_patterns, monthly_series

    fitted = fit_patterns(section, settings.patterns, base=base_of(settings))
    applied = fitted.apply(section)
    series = {
        f"pattern_{number}": monthly_series(applied.sel(pattern=number, drop=True), name=f"pattern_{number}", units="1")
        for number in applied["pattern"].values
    }
    described = xr.Dataset(
        {
            "pattern_loading": (("pattern", "longitude"), fitted.loadings),
            "pattern_share": ("pattern", fitted.explained),
            "pattern_share_error": ("pattern", fitted.explained_error),
        },
        coords={"pattern": applied["pattern"], "longitude": section["longitude"]},
    )
    return series, described


def _lead_lags(analysis: _Analysis) -> tuple[dict[str, xr.Dataset], list[str]]:
    """Return the lead-lag analysis of each predictor, and of those that cannot have one, why."""
    from profiles.precursor import lead_lag

    longest = analysis.settings.lead_lag.longest_lead
    found, notes = {}, []
    failed: DataError | None = None
    for name, series in analysis.predictors.items():
        try:
            found[name] = lead_lag(
                series,
                analysis.index_anomaly,
                range(-longest, longest + 1),
                settings=analysis.settings.lead_lag,
            )
        except DataError as error:
            failed = error
            notes.append(f"{name}: no correlation: {error}")
    if failed is not None and not found:
        raise failed
    return found, notes


def _events(analysis: _Analysis) -> xr.Dataset:
    from profiles.precursor import before_events, event_composites, find_events

    longest = analysis.settings.lead_lag.longest_lead
    events = find_events(analysis.index, analysis.settings.events)
    predictors = {name: series for name, series in analysis.predictors.items()}
    parts = [
        events,
        before_events(events, predictors),
        event_composites(events, predictors, range(-longest, longest + 1)),
    ]
    return xr.merge(parts, combine_attrs="drop_conflicts", compat="no_conflicts", join="exact")


@dataclass(frozen=True)
class _Forecast:
    """Hindcast, its scores and reliability, the oscillator and the outlook; each None where ``withheld`` says why."""

    hindcast: xr.Dataset | None
    scores: xr.Dataset | None
    reliability: xr.Dataset | None
    oscillator: xr.Dataset | None
    outlook: xr.Dataset | None
    withheld: str


def _forecast(analysis: _Analysis) -> _Forecast:
    from profiles.precursor import hindcast, outlook, recharge_oscillator, reliability, verify

    index = analysis.inputs.index
    predictors = {name: series for name, series in analysis.inputs.predictors.items() if name in FORECAST_FROM}
    settings, detrend = analysis.settings.hindcast, analysis.settings.detrend
    reasons: list[str] = []

    def attempt(make: Callable[[], xr.Dataset]) -> xr.Dataset | None:
        try:
            return make()
        except DataError as error:
            reasons.append(str(error))
            return None

    made = attempt(lambda: hindcast(index, predictors, settings=settings, detrend=detrend))
    scores = attempt(lambda: verify(made)) if made is not None else None
    diagram = attempt(lambda: reliability(made)) if scores is not None and made is not None else None
    oscillator = attempt(
        lambda: recharge_oscillator(
            index,
            predictors["volume"],
            base=base_of(analysis.settings),
            step=settings.propagator_months,
            seed=analysis.settings.lead_lag.seed,
        )
    )
    issued = attempt(lambda: outlook(index, predictors, hindcast=made, settings=settings, detrend=detrend))
    if issued is not None and issued.attrs["reason"]:
        reasons.append(str(issued.attrs["reason"]))
    return _Forecast(made, scores, diagram, oscillator, issued, "; ".join(dict.fromkeys(reasons)))


# --------------------------------------------------------------------------------------------------------------
# Files


def _write(
    folder: Folder,
    analysis: _Analysis,
    lead_lags: Mapping[str, xr.Dataset],
    events: xr.Dataset,
    forecast: _Forecast,
) -> None:
    attributes = _attributes(folder, analysis)
    whole = _together(analysis, lead_lags, events)
    store.write_dataset(folder.precursor, whole, attributes("precursors of an index", _PRECURSOR_TEXT, whole))
    tables = {
        "precursor_series": _series_table(analysis),
        "lead_lag": _lead_lag_table(lead_lags),
        "leads": pd.DataFrame(_lead_rows(lead_lags)),
        "events": _event_table(events),
    }
    if forecast.scores is not None:
        tables["hindcast"] = forecast.scores.to_dataframe().reset_index()
    if forecast.reliability is not None:
        tables["reliability"] = forecast.reliability.to_dataframe().reset_index()
    if forecast.outlook is not None:
        tables["outlook"] = pd.DataFrame(_outlook_rows(forecast.outlook))
    for path, dataset, title, text in (
        (folder.hindcast, forecast.hindcast, "hindcast of an index", _HINDCAST_TEXT),
        (folder.scores, forecast.scores, "scores of the hindcast", _HINDCAST_TEXT),
        (folder.reliability, forecast.reliability, "reliability of the hindcast's probabilities", _HINDCAST_TEXT),
        (folder.oscillator, forecast.oscillator, "recharge oscillator", _OSCILLATOR_TEXT),
        (folder.outlook, forecast.outlook, "outlook", CAUTION),
    ):
        # What an earlier analysis left would not belong to this one.
        path.unlink(missing_ok=True)
        if dataset is not None:
            store.write_dataset(path, _with_named_coordinates(dataset), attributes(title, text, dataset))
    for name in ("hindcast", "reliability", "outlook"):
        folder.table(name).unlink(missing_ok=True)
    for name, table in tables.items():
        store.write_table(folder.table(name), table)


_PRECURSOR_TEXT = (
    "Anomalies of an index and of its precursors, their correlation and regression at each lead, overall, by starting "
    "month, by sign and in moving windows, and the warm and cold events of the index."
)
_HINDCAST_TEXT = (
    "Made and verified out of sample: everything fitted is fitted anew without the years that are forecast."
)
_OSCILLATOR_TEXT = (
    "Two-variable recharge oscillator fitted to index and volume; regression leans towards damping, and the correction "
    "for the length of the record takes only part of that away."
)
_COORDINATES = {
    "lead": {"long_name": "months from the last month known to the month forecast"},
    "target": {"long_name": "month forecast"},
    "quantile": {"long_name": "probability below", "units": "1"},
    "bin": {"long_name": "middle of the bin of stated probability", "units": "1"},
}


def _with_named_coordinates(dataset: xr.Dataset) -> xr.Dataset:
    """Return the dataset with a long name on every coordinate of numbers, those of its own kept."""
    named = dataset.copy()
    for name in set(named.coords) & {*_COORDINATES, "time"}:
        known = VARIABLES["time"].attributes() if name == "time" else _COORDINATES[str(name)]
        named[name].attrs = known | named[name].attrs
    return named


def _attributes(folder: Folder, analysis: _Analysis) -> Callable[[str, str, xr.Dataset], dict[str, Any]]:
    """Return what gives the global attributes of a file (ACDD-1.3)."""
    described = array_description(folder)
    created = store.date_of(analysis.inputs.inputs)
    months = analysis.index["time"].values[[0, -1]]

    def attributes(title: str, summary: str, dataset: xr.Dataset) -> dict[str, Any]:
        given = {
            "title": f"{described['name']}: {title}" if described.get("name") else title,
            "summary": summary,
            "keywords": KEYWORDS,
            "keywords_vocabulary": "GCMD Science Keywords",
            **{
                key: described.get(key)
                for key in ("institution", "project", "creator_name", "creator_email", "license", "acknowledgement")
            },
            "source": "; ".join(analysis.inputs.notes),
            "processing_level": "derived",
            "standard_name_vocabulary": VOCABULARY,
            "comment": CAUTION,
            "history": f"{created} made by thermotilt",
            "date_created": created,
            "time_coverage_start": np.datetime_as_string(months[0], unit="s") + "Z",
            "time_coverage_end": np.datetime_as_string(months[1], unit="s") + "Z",
            "settings": json.dumps({"precursor": analysis.settings.model_dump(mode="json")}),
        }
        own = {str(key): value for key, value in dataset.attrs.items() if isinstance(value, str | int | float)}
        return own | {key: value for key, value in given.items() if value}

    return attributes


def _together(analysis: _Analysis, lead_lags: Mapping[str, xr.Dataset], events: xr.Dataset) -> xr.Dataset:
    """Return series, lead-lag and events in one dataset, predictors along a dimension."""
    names = list(analysis.predictors)
    index = analysis.inputs.index
    series = xr.concat(
        [one.rename("predictor_anomaly").reindex(time=index["time"]) for one in analysis.predictors.values()],
        dim=xr.Variable("predictor", names),
        combine_attrs="drop",
        coords="minimal",
        compat="override",
    )
    joined = xr.concat(
        [one.drop_vars(["window_first", "window_last"], errors="ignore") for one in lead_lags.values()],
        dim=xr.Variable("predictor", list(lead_lags)),
        join="outer",
        combine_attrs="drop_conflicts",
        data_vars="all",
        coords="minimal",
        compat="override",
        fill_value={name: -1 for name in ("significant_in_window", "pair_count_in_window")},
    ).reindex(predictor=names)
    if "window" in joined.dims:
        joined = joined.transpose(..., "window")  # times last (CF-1.11, section 2.4)
    units = "; ".join(f"{name}: {one.attrs.get('units', '1')}" for name, one in analysis.predictors.items())
    whole = xr.merge(
        [
            index.to_dataset(name=str(index.name)),
            analysis.index_anomaly.to_dataset(name=str(analysis.index_anomaly.name)),
            series.to_dataset(),
            joined,
            events,
            *([analysis.patterns] if analysis.patterns is not None else []),
        ],
        combine_attrs="drop_conflicts",
        compat="no_conflicts",
        join="outer",
    )
    slopes = {str(name): {"units": "1", "units_by_predictor": units, "comment": "units of the index per unit of the "
              "predictor"} for name in whole.data_vars if str(name).startswith("regression_slope")}  # fmt: skip
    return describe(whole, predictor_anomaly={"units_by_predictor": units}, **slopes)


def _series_table(analysis: _Analysis) -> pd.DataFrame:
    from profiles.precursor.series import as_table, month_of

    table = as_table(
        index=analysis.inputs.index, index_anomaly=analysis.index_anomaly, **_in_table_units(analysis.predictors)
    )
    table.insert(0, "month", month_of(table.index.to_numpy()).astype(str))
    return table


def _in_table_units(predictors: Mapping[str, xr.DataArray]) -> dict[str, xr.DataArray]:
    """Return the anomalies with volumes in 1e14 m3, and names that say so."""
    return {
        f"{name}_1e14_m3" if series.attrs.get("units") == "m3" else name: series / _unit(series)
        for name, series in predictors.items()
    }


def _unit(series: xr.DataArray) -> float:
    return UNITS_OF_VOLUME if series.attrs.get("units") == "m3" else 1.0


_LEAD_COLUMNS = (
    "correlation", "correlation_lower", "correlation_upper", "regression_slope", "regression_slope_error", "pair_count",
    "effective_size", "deciding_p_value", "significant", "bootstrap_p_value", "bootstrap_lower", "bootstrap_upper",
)  # fmt: skip


def _lead_lag_table(lead_lags: Mapping[str, xr.Dataset]) -> pd.DataFrame:
    parts = [
        one[list(_LEAD_COLUMNS)].to_dataframe().reset_index().assign(predictor=name) for name, one in lead_lags.items()
    ]
    return pd.concat(parts, ignore_index=True)[["predictor", "lead", *_LEAD_COLUMNS]]


def _lead_rows(lead_lags: Mapping[str, xr.Dataset]) -> list[dict[str, Any]]:
    """Return a row a predictor: the strongest leads, of all and of those at which it comes first."""
    rows = []
    for name, one in lead_lags.items():
        row: dict[str, Any] = {"predictor": name, "months": one.attrs["months"]}
        for kind in ("peak", "precursor"):
            parts = ("lead", "lead_lower", "lead_upper", "correlation")
            row |= {f"{kind}_{part}": float(one[f"{kind}_{part}"]) for part in parts}
            row |= _at_lead(one, row[f"{kind}_lead"], kind)
        row |= {f"field_{part}": float(one[f"field_{part}"]) for part in ("p_value", "p_value_of_count")}
        rows.append(row | {"significant_count": int(one["significant_count"])})
    return rows


def _at_lead(one: xr.Dataset, lead: float, kind: str) -> dict[str, float]:
    """Return the interval, the size and the test at the whole lead next to the strongest."""
    names = ("correlation_lower", "correlation_upper", "effective_size", "deciding_p_value")
    if not np.isfinite(lead):
        return {f"{kind}_{name}": np.nan for name in names}
    nearest = one.sel(lead=lead, method="nearest")
    return {f"{kind}_{name}": float(nearest[name]) for name in names}


def _event_table(events: xr.Dataset) -> pd.DataFrame:
    return pd.DataFrame(_event_rows(events))


def _event_rows(events: xr.Dataset) -> list[dict[str, Any]]:
    rows = []
    for at in range(events.sizes["event"]):
        one = events.isel(event=at)
        row: dict[str, Any] = {"kind": str(one["kind"].item())}
        row |= {name: str(one[name].values.astype("datetime64[M]")) for name in ("onset", "peak", "end")}
        row |= {"peak_value": float(one["peak_value"]), "duration": int(one["duration"]), "whole": int(one["whole"])}
        for name in one["predictor"].values:
            before = one["before_onset"].sel(predictor=name)
            row |= {f"{name}_{int(months)}_months_before": float(before.sel(months_before=months)) for months in
                    before["months_before"].values}  # fmt: skip
        rows.append(row)
    return rows


def _outlook_rows(outlook: xr.Dataset) -> list[dict[str, Any]]:
    rows = []
    for lead in outlook["lead"].values:
        one = outlook.sel(lead=lead)
        row: dict[str, Any] = {"lead": int(lead), "month": str(one["target"].values.astype("datetime64[M]"))}
        row |= {"forecast": float(one["forecast"]), "spread": float(one["spread"])}
        row |= {f"quantile_{float(q):g}": float(one["plume"].sel(quantile=q)) for q in one["quantile"].values}
        for category in one["category"].values:
            row[f"probability_{category}"] = float(one["probability"].sel(category=category))
            row[f"usual_{category}"] = float(one["usual_probability"].sel(category=category))
        rows.append(row | {"status": int(one["status"])})
    return rows


# --------------------------------------------------------------------------------------------------------------
# The closing lines


def _outcome(
    folder: Folder,
    analysis: _Analysis,
    lead_lags: Mapping[str, xr.Dataset],
    events: xr.Dataset,
    forecast: _Forecast,
    notes: list[str],
) -> PrecursorOutcome:
    months = analysis.index["time"].values[[0, -1]].astype("datetime64[M]")
    outlook = forecast.outlook
    forecaster = str(outlook.attrs["forecaster"]) if outlook is not None else ""
    return PrecursorOutcome(
        out=folder.out,
        record=f"{months[0]} to {months[1]}",
        notes=(*analysis.inputs.notes, *notes),
        leads=tuple(_lead_rows(lead_lags)),
        events=tuple(_event_rows(events)),
        rule=str(events.attrs["rule"]),
        oscillator=_scalars(forecast.oscillator),
        forecaster=forecaster,
        scores=tuple(_score_rows(forecast.scores, forecaster)),
        outlook=tuple(_outlook_rows(outlook)) if outlook is not None else (),
        withheld=forecast.withheld,
    )


def _scalars(dataset: xr.Dataset | None) -> dict[str, float]:
    if dataset is None:
        return {}
    return {str(name): float(value) for name, value in dataset.data_vars.items() if not value.dims}


_SHOWN_SCORES = ("correlation", "skill_climatology", "skill_damped_persistence", "probability_skill")


def _score_rows(scores: xr.Dataset | None, forecaster: str) -> list[dict[str, Any]]:
    if scores is None or forecaster not in scores["forecaster"].values:
        return []
    whole = scores.sel(forecaster=forecaster, season="all")
    return [
        {"lead": int(lead)}
        | {
            f"{name}{end}": float(whole[f"{name}{end}"].sel(lead=lead))
            for name in _SHOWN_SCORES
            for end in ("", "_low", "_high")
        }
        for lead in whole["lead"].values
    ]
