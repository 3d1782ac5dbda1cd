"""The report's section on precursors: a part of the page of a run, or a page of its own."""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import xarray as xr
from markupsafe import Markup

from profiles.report.captions import Caption
from profiles.report.page import PRECURSOR_LINK, Picture, Plate, environment
from profiles.report.precursor import WHOLE_YEAR, forecaster_of, month_label, name_of, readable
from profiles.report.summary import Finding, number, percent
from profiles.report.tables import Column, Layout, View, text, view
from profiles.store import write_text
from profiles.vocabulary import CAUTION

HEADING = "Precursors of the index"
_SHOWN_LEAD = 6  # months; the lead of the findings

_FOLDS = (
    "Every year was forecast by what was fitted without it and without the months near it: climatology, scales, "
    "coefficients and spread alike."
)
_INTERVALS = (
    "95 % intervals come from leaving out blocks of years in turn, so that months that belong together count together."
)

CAPTIONS: Mapping[str, Caption] = {
    "precursor_outlook": Caption(
        "Outlook",
        "Anomaly of the index: observed, and forecast from the last month of the record, with the ranges that hold "
        "50 and 90 % of outcomes; below, the probabilities of warm, neutral and cold. The spread was learnt from "
        "forecasts of years that were not fitted on. Leads and seasons at which the hindcast shows no skill are "
        "withheld.",
        "Plume of the forecast anomaly of the index against time after the observed one, above the probabilities of "
        "warm, neutral and cold by month.",
        caution=True,
    ),
    "precursor_lead_lag": Caption(
        "Lead and lag",
        "Correlation of each predictor's monthly anomaly with the index so many months later. Band: 95 % interval "
        "with the effective sample size; points: significant by the t-test with that size, which decides; dotted: "
        "the interval of a block bootstrap. Diamond: the strongest lead with its 95 % interval.",
        "Correlation with the index against lead, a panel for each predictor, with its interval.",
    ),
    "precursor_by_month": Caption(
        "By calendar month",
        "The same for each calendar month of the predictor, a year apart from pair to pair. Hatched: not "
        "significant at 5 %; of so many cells a twentieth would be significant by chance.",
        "Correlation as colour against lead and calendar month, a panel for each predictor.",
    ),
    "precursor_windows": Caption(
        "Over the decades",
        "The same in moving windows of the record, by the middle of the window. Points: the strongest lead of each "
        "window with its 95 % interval. Neighbouring windows share most of their months.",
        "Correlation as colour against the middle of the window and lead, a panel for each predictor.",
    ),
    "precursor_events": Caption(
        "Events",
        "Warm (orange, upward) and cold (green, downward) events by the stated rule, the predictor above them, and "
        "its anomaly six months before the onset of each event against the event's peak, where the record has both.",
        "Predictor and index against time with their warm and cold events, and a scatter of peak against predictor.",
    ),
    "precursor_skill": Caption(
        "Hindcast by lead",
        f"{_FOLDS} {_INTERVALS} Damped persistence is regression on the index alone.",
        "Correlation, error and skill over climatology against lead, a line for each forecaster.",
    ),
    "precursor_seasons": Caption(
        "Hindcast by target season",
        f"Scores by lead and the three months around the month forecast. {_INTERVALS} Where persistence drops across "
        "a season, what the volume adds is largest.",
        "Correlation of damped persistence and of the forecast, and the gain, as colour against target season and "
        "lead.",
    ),
    "precursor_reliability": Caption(
        "Reliability",
        "How often a category came against the probability that it had been given, all leads together, with 95 % "
        "intervals; below, how often each probability was given. On the line the probabilities are right; flatter, "
        "they are too bold.",
        "Observed share against stated probability for warm, neutral and cold, above a histogram of stated "
        "probabilities.",
        half_width=True,
    ),
}  # fmt: skip


def _decimals(places: int) -> Any:
    return lambda value: "" if pd.isna(value) else number(float(value), places)


def _p_value(value: Any) -> str:
    return "" if pd.isna(value) else "< 0.001" if float(value) < 0.001 else f"{float(value):.3f}"


def _name(value: Any) -> str:
    return text(name_of(str(value)))


LAYOUTS: Mapping[str, Layout] = {
    "outlook": Layout(
        "Outlook by month",
        (
            Column("month", "Month", text, "fixed"),
            Column("forecast", "Anomaly", _decimals(2), "number"),
            Column("quantile_0.05", "5 %", _decimals(2), "number"),
            Column("quantile_0.95", "95 %", _decimals(2), "number"),
            Column("probability_warm", "Warm", percent, "number"),
            Column("probability_neutral", "Neutral", percent, "number"),
            Column("probability_cold", "Cold", percent, "number"),
        ),
        most=24,
        empty="No outlook was given.",
    ),
    "leads": Layout(
        "Strongest leads",
        (
            Column("predictor", "Predictor", _name),
            Column("peak_lead", "Lead (months)", _decimals(1), "number"),
            Column("peak_lead_lower", "from", _decimals(1), "number"),
            Column("peak_lead_upper", "to", _decimals(1), "number"),
            Column("peak_correlation", "Correlation", _decimals(2), "number"),
            Column("peak_effective_size", "Effective months", _decimals(0), "number"),
            Column("peak_deciding_p_value", "p", _p_value, "number"),
            Column("field_p_value", "p of the field", _p_value, "number"),
        ),
        most=20,
        empty="No predictor could be correlated.",
    ),
    "events": Layout(
        "Events",
        (
            Column("kind", "Kind", text),
            Column("onset", "Onset", text, "fixed"),
            Column("peak", "Peak", text, "fixed"),
            Column("end", "End", text, "fixed"),
            Column("duration", "Months", _decimals(0), "number"),
            Column("peak_value", "Peak anomaly", _decimals(2), "number"),
        ),
        most=60,
        empty="By this rule the record has no event.",
    ),
}


@dataclass(frozen=True)
class PrecursorFacts:
    """What the section says beside its figures.

    Attributes
    ----------
    record : str
        First and last month of the index.
    index : str
        Long name of the index.
    rule : str
        Of the events.
    notes : sequence of str
        Where the series came from, what could not be done, why anything is withheld.
    tables : mapping of str to pandas.DataFrame
        ``leads``, ``events`` and, where there is one, ``outlook``, as the pipeline writes them.
    """

    record: str
    index: str
    rule: str
    notes: Sequence[str] = ()
    tables: Mapping[str, pd.DataFrame] = field(default_factory=dict)


def precursor_section(
    figures: Mapping[str, Path],
    facts: PrecursorFacts,
    *,
    scores: xr.Dataset | None = None,
    reliability: xr.Dataset | None = None,
    oscillator: xr.Dataset | None = None,
    outlook: xr.Dataset | None = None,
) -> str:
    """Return the section as HTML, its pictures in it.

    Parameters
    ----------
    figures : mapping of str to Path
        As :func:`profiles.report.write_precursor_figures` returns them.
    facts : PrecursorFacts
    scores, reliability, oscillator, outlook : xarray.Dataset, optional
        As :mod:`profiles.precursor` makes them, where they could be made.
    """
    shown = [name for name in CAPTIONS if name in figures]
    plates = [Plate(name, CAPTIONS[name], CAPTIONS[name].text, Picture.read(figures[name])) for name in shown]
    content: str = environment().get_template("precursor.html").render(
        heading=HEADING,
        caution=CAUTION,
        introduction=f"{facts.index}, {facts.record}. Warm and cold events: {readable_rule(facts.rule)}.",
        findings=list(_findings(facts, scores, reliability, oscillator, outlook)),
        notes=[sentence(note) for note in facts.notes],
        plates=plates,
        tables=_views(facts.tables),
    )  # fmt: skip
    return content


def sentence(note: str) -> str:
    """Return a note with a capital and a full stop."""
    return f"{note[:1].upper()}{note[1:]}" + ("" if note.endswith((".", "!", "?")) else ".")


def readable_rule(rule: str) -> str:
    """Return a rule with its units as people write them."""
    return rule.replace("degree_Celsius", readable("degree_Celsius"))


def _views(tables: Mapping[str, pd.DataFrame]) -> dict[str, View]:
    shown = {}
    for name, layout in LAYOUTS.items():
        if name in tables:
            table = tables[name]
            known = table if len(table) else pd.DataFrame(columns=[column.name for column in layout.columns])
            shown[name] = view(name, layout, known.dropna(subset=["forecast"]) if name == "outlook" else known)
    return shown


def _findings(
    facts: PrecursorFacts,
    scores: xr.Dataset | None,
    reliability: xr.Dataset | None,
    oscillator: xr.Dataset | None,
    outlook: xr.Dataset | None,
) -> Iterator[Finding]:
    for row in facts.tables["leads"].head(1).to_dict("records"):
        lead = f"{number(row['peak_lead'], 1)} months"
        interval = f"{number(row['peak_lead_lower'], 1)} to {number(row['peak_lead_upper'], 1)}"
        note = f"95 % interval {interval}; correlation {number(row['peak_correlation'], 2)}; positive: it comes first"
        yield Finding(f"Lead of the {name_of(str(row['predictor']))}", lead, note)
    kinds = facts.tables["events"].get("kind", pd.Series(dtype=str)).tolist()
    yield Finding("Events", f"{kinds.count('warm')} warm, {kinds.count('cold')} cold", f"in {facts.record}")
    if scores is not None:
        yield _skill(scores, outlook)
    if reliability is not None:
        one = reliability.sel(forecaster=forecaster_of(reliability, outlook))
        slope, low, high = (float(one[f"reliability_slope{end}"]) for end in ("", "_low", "_high"))
        note = f"95 % interval {number(low, 2)} to {number(high, 2)}; 1 is right, below is too bold"
        yield Finding("Reliability slope", number(slope, 2), note)
    if oscillator is not None:
        yield _oscillator(oscillator)
    yield _first_outlook(outlook)


def _skill(scores: xr.Dataset, outlook: xr.Dataset | None) -> Finding:
    lead = min(_SHOWN_LEAD, int(scores["lead"].max()))
    name = forecaster_of(scores, outlook)
    one = scores.sel(forecaster=name, lead=lead, season=WHOLE_YEAR)
    low, high = (number(float(one[f"correlation_{end}"]), 2) for end in ("low", "high"))
    gain = number(float(one["skill_damped_persistence"]), 2)
    note = f"95 % interval {low} to {high}; {name_of(name)}; skill over damped persistence {gain}"
    return Finding(f"Correlation {lead} months ahead, out of sample", number(float(one["correlation"]), 2), note)


def _oscillator(oscillator: xr.Dataset) -> Finding:
    def months(name: str) -> str:
        value = float(oscillator[name])
        return f"{value:.0f}" if np.isfinite(value) else "∞"

    period, decay = (
        f"{months(name)} months (95 % {months(f'{name}_low')} to {months(f'{name}_high')})"
        for name in ("period", "decay_time")
    )
    note = (
        f"e-folding of its damping {decay}, {months('decay_time_uncorrected')} before the correction for the length "
        "of the record; noise in the series damps it further"
    )
    return Finding("Period of the recharge oscillator", period, note)


def _first_outlook(outlook: xr.Dataset | None) -> Finding:
    given = outlook.dropna("lead", subset=["forecast"]) if outlook is not None else None
    if given is None or not given.sizes["lead"]:
        return Finding("Outlook", "withheld", CAUTION)
    last = given.isel(lead=-1)
    month = month_label(str(last["target"].values.astype("datetime64[M]")))
    shares = [
        f"{name} {percent(float(last['probability'].sel(category=name)))}" for name in ("warm", "neutral", "cold")
    ]
    return Finding(f"Outlook for {month}, {int(last['lead'])} months ahead", ", ".join(shares), CAUTION)


# --------------------------------------------------------------------------------------------------------------
# Into a page

_PLACES = (("<!-- precursor link -->\n", "<!-- /precursor link -->"), ("<!-- precursor -->\n", "<!-- /precursor -->"))


def insert_precursor(page: str, section: str) -> str:
    """Return the page of a run with the section in its place: what :func:`profiles.report.write_page` makes of both."""
    for (begin, end), content in zip(_PLACES, (PRECURSOR_LINK if section else "", section), strict=True):
        pattern = re.compile(re.escape(begin) + ".*?" + re.escape(end), re.DOTALL)
        page = pattern.sub(lambda _, text=f"{begin}{content}{end}": text, page, count=1)  # type: ignore[misc]
    return page


def write_precursor_page(path: Path, section: str, title: str) -> None:
    """Write the section as a page of its own.

    Parameters
    ----------
    path : Path
        In a folder that exists.
    section : str
        Of :func:`precursor_section`.
    title : str

    Raises
    ------
    MachineError
        Where the file cannot be written.
    """
    template = environment().get_template("precursor_page.html")
    write_text(path, template.render(title=title, caution=CAUTION, section=Markup(section)))
