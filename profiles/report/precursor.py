"""Precursors of an index: lead-lag, how it changes, the hindcast's scores, the outlook, the events."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from datetime import datetime
from pathlib import Path
from textwrap import wrap
from typing import Any

import numpy as np
import xarray as xr
from matplotlib.axes import Axes
from matplotlib.cm import ScalarMappable
from matplotlib.collections import PolyCollection
from matplotlib.colors import Colormap, Normalize
from matplotlib.dates import date2num
from matplotlib.figure import Figure
from matplotlib.ticker import FixedLocator, MultipleLocator
from numpy.typing import NDArray

from profiles.report import style
from profiles.report.summary import VOLUME_UNIT
from profiles.vocabulary import CAUTION

Floats = NDArray[np.float64]

MONTHS = "JFMAMJJASOND"
RECENT = 18  # months of the index shown before an outlook
WHOLE_YEAR = "all"
FEW = 30  # forecasts of a bin below which its share is not drawn (ours)

#: Names that people read, of series and forecasters.
NAMES: Mapping[str, str] = {
    "volume": "volume",
    "western_volume": "western volume",
    "tilt": "tilt",
    "wind": "wind",
    "pressure": "pressure difference",
    "climatology": "climatology",
    "persistence": "persistence",
    "damped_persistence": "damped persistence",
    "regression": "regression",
    "recharge": "recharge oscillator",
    "combined": "regression with oscillator",
}

# Ours: no colour means warm or cold by custom, and shapes tell them apart as well.
WARM, NEUTRAL, COLD = style.ORANGE, style.CALM, style.GREEN
_CATEGORY_LOOKS = {"cold": (COLD, "v"), "neutral": (style.LACKING, "o"), "warm": (WARM, "^")}
_FORECASTER_LOOKS = {
    "combined": (style.BLACK, "-", "o"),
    "regression": (style.BLUE, "--", "s"),
    "recharge": (style.VERMILION, "-.", "D"),
    "damped_persistence": (style.PURPLE, "-", "^"),
    "persistence": (style.SKY, ":", "v"),
}


def name_of(name: str) -> str:
    """Return the name that people read."""
    return NAMES.get(name, name.replace("_", " "))


@style.styled
def lead_lag_curves(lead_lag: xr.Dataset) -> Figure:
    """Draw the correlation of each predictor with the index by lead, its interval and where it is significant.

    Parameters
    ----------
    lead_lag : xarray.Dataset
        As :func:`profiles.precursor.lead_lag` returns it, with predictors along a dimension ``predictor``.
    """
    predictors = [str(name) for name in lead_lag["predictor"].values]
    columns = 3 if len(predictors) > 2 else len(predictors)
    figure, panels = _panels(len(predictors), columns, height=3.1)
    for axis, name in zip(panels, predictors, strict=True):
        _lead_lag_panel(axis, lead_lag.sel(predictor=name))
        axis.set_title(name_of(name), fontsize=11)
    for axis in panels[-columns:]:
        axis.set_xlabel("lead (months): the predictor comes first →")
    for axis in panels[::columns]:
        axis.set_ylabel("correlation with the index")
    panels[0].legend(loc="lower left", bbox_to_anchor=(-0.02, 1.12), ncols=4, fontsize=9, borderpad=0.0)
    _headline(figure, "Correlation of each predictor with the index so many months later")
    return figure


def _lead_lag_panel(axis: Axes, one: xr.Dataset) -> None:
    lead, correlation = one["lead"].values, one["correlation"].values
    axis.axhline(0.0, color=style.LACKING, linewidth=0.8)
    axis.axvline(0.0, color=style.LACKING, linewidth=0.8)
    axis.fill_between(
        lead,
        one["correlation_lower"],
        one["correlation_upper"],
        color=style.BLUE,
        alpha=style.BAND_OPACITY,
        linewidth=0,
        label="95 % interval, effective size",
    )
    for end in ("lower", "upper"):
        label = "the same by block bootstrap" if end == "lower" else None
        axis.plot(lead, one[f"bootstrap_{end}"], ":", color=style.BLUE, linewidth=1.0, label=label)
    axis.plot(lead, correlation, color=style.BLACK, linewidth=1.0)
    sure = one["significant"].values.astype(bool)
    axis.plot(lead[sure], correlation[sure], "o", color=style.BLACK, markersize=3.5, label="significant at 5 %")
    if np.isfinite(float(one["peak_lead"])):
        axis.errorbar(
            float(one["peak_lead"]),
            -0.93,
            xerr=[
                [float(one["peak_lead"] - one["peak_lead_lower"])],
                [float(one["peak_lead_upper"] - one["peak_lead"])],
            ],
            fmt="D",
            color=style.VERMILION,
            markersize=5,
            capsize=3,
            label="strongest lead, 95 %",
        )
    axis.set_xlim(lead[0], lead[-1])
    axis.set_ylim(-1.0, 1.0)
    axis.xaxis.set_major_locator(MultipleLocator(12))
    axis.xaxis.set_minor_locator(MultipleLocator(3))


@style.styled
def lead_lag_by_month(lead_lag: xr.Dataset) -> Figure:
    """Draw the correlation by lead and starting month of each predictor, hatched where it is not significant."""
    predictors = [str(name) for name in lead_lag["predictor"].values]
    columns = 3 if len(predictors) > 2 else len(predictors)
    figure, panels = _panels(len(predictors), columns, height=3.1, right=0.9, legend=False)
    edges = _edges(lead_lag["lead"].values)
    for axis, name in zip(panels, predictors, strict=True):
        one = lead_lag.sel(predictor=name).transpose("starting_month", ...)
        values = one["correlation_by_month"].values
        _mesh(axis, edges, np.arange(0.5, 13.0), values, style.ANOMALY, (-1.0, 1.0))
        _hatch(axis, edges, np.arange(0.5, 13.0), np.isfinite(values) & (one["significant_by_month"].values != 1))
        axis.set_yticks(range(1, 13), list(MONTHS), fontsize=8)
        axis.xaxis.set_major_locator(MultipleLocator(12))
        axis.axvline(0.0, color=style.INK, linewidth=0.8)
        axis.set_title(name_of(name), fontsize=11)
        axis.invert_yaxis()
    for axis in panels[-columns:]:
        axis.set_xlabel("lead (months)")
    for axis in panels[::columns]:
        axis.set_ylabel("month of the predictor")
    _colour_bar(figure, style.ANOMALY, (-1.0, 1.0), "correlation with the index")
    _headline(figure, "Correlation with the index by calendar month of the predictor (hatched: not significant at 5 %)")
    return figure


@style.styled
def lead_lag_in_windows(lead_lag: xr.Dataset) -> Figure:
    """Draw how correlation and strongest lead change from window to window of the record."""
    predictors = [str(name) for name in lead_lag["predictor"].values]
    columns = 3 if len(predictors) > 2 else len(predictors)
    figure, panels = _panels(len(predictors), columns, height=3.1, right=0.9, legend=False)
    lead = _edges(lead_lag["lead"].values)
    for axis, name in zip(panels, predictors, strict=True):
        one = lead_lag.sel(predictor=name).transpose("window", "lead", ...)
        centre = _days(one["window"].values)
        _mesh(axis, _edges(centre), lead, one["correlation_in_window"].values.T, style.ANOMALY, (-1.0, 1.0))
        strongest = one["peak_lead_in_window"].values
        below, above = (
            strongest - one["peak_lead_lower_in_window"].values,
            one["peak_lead_upper_in_window"].values - strongest,
        )
        axis.errorbar(centre, strongest, yerr=[below, above], fmt="o-", color=style.INK, markersize=3, linewidth=0.9)
        style.time_axis(axis)
        axis.axhline(0.0, color=style.INK, linewidth=0.8)
        axis.set_ylim(lead[0], lead[-1])
        axis.yaxis.set_major_locator(MultipleLocator(12))
        axis.set_title(name_of(name), fontsize=11)
        axis.tick_params(axis="x", labelsize=8)
        axis.set_xlabel("middle of the window" if axis in panels[-columns:] else "")
    for axis in panels[::columns]:
        axis.set_ylabel("lead (months)")
    _colour_bar(figure, style.ANOMALY, (-1.0, 1.0), "correlation with the index")
    _headline(figure, "Correlation with the index in moving windows (points: strongest lead of the window, 95 %)")
    return figure


@style.styled
def skill_by_lead(scores: xr.Dataset) -> Figure:
    """Draw correlation, error and skill of every forecaster by lead, with intervals."""
    whole = scores.sel(season=WHOLE_YEAR)
    figure, panels = _panels(3, 3, height=3.9)
    titles = {
        "correlation": "correlation",
        "rms": f"rms error ({_units(scores['rms'])})",
        "skill_climatology": "skill over climatology",
    }
    shown = [name for name in _FORECASTER_LOOKS if name in scores["forecaster"].values]
    for axis, (score, label) in zip(panels, titles.items(), strict=True):
        for place, name in enumerate(shown):
            colour, dashes, marker = _FORECASTER_LOOKS[name]
            one = whole.sel(forecaster=name)
            lead = one["lead"].values + 0.12 * (place - 0.5 * (len(shown) - 1))
            middle, low, high = (one[f"{score}{end}"].values for end in ("", "_low", "_high"))
            axis.errorbar(
                lead,
                middle,
                yerr=[middle - low, high - middle],
                color=colour,
                linestyle=dashes,
                marker=marker,
                markersize=4,
                linewidth=1.3,
                elinewidth=0.8,
                label=name_of(name),
            )
        axis.set_title(label, fontsize=11)
        axis.set_xlabel("lead (months)")
        axis.xaxis.set_major_locator(MultipleLocator(3))
        axis.axhline(0.0, color=style.LACKING, linewidth=0.8)
    panels[0].set_ylim(-0.5, 1.0)
    panels[1].set_ylim(0.0, None)
    panels[2].set_ylim(-1.0, 1.0)
    panels[0].legend(loc="lower left", bbox_to_anchor=(-0.02, 1.09), ncols=5, fontsize=9, borderpad=0.0)
    _headline(figure, "Scores of the hindcast, out of sample, with 95 % intervals")
    return figure


@style.styled
def skill_by_season(scores: xr.Dataset, *, forecaster: str) -> Figure:
    """Draw correlations by lead and target season, of damped persistence and of a forecast, and what that gains."""
    parts = scores.sel(season=[str(name) for name in scores["season"].values if name != WHOLE_YEAR])
    figure, panels = _panels(3, 3, height=3.9, right=0.93, between=0.1, legend=False)
    panels[1].tick_params(labelleft=False)
    wanted = (
        ("correlation", "damped_persistence", f"correlation, {name_of('damped_persistence')}"),
        ("correlation", forecaster, f"correlation, {name_of(forecaster)}"),
        ("skill_damped_persistence", forecaster, "skill of that over the former"),
    )
    lead = _edges(scores["lead"].values.astype(np.float64))
    for axis, (score, name, title) in zip(panels, wanted, strict=True):
        one = parts.sel(forecaster=name).transpose("lead", "season")
        values = one[score].values
        colours, limits = (style.DEPTH, (0.0, 1.0)) if score == "correlation" else (style.ANOMALY, (-0.8, 0.8))
        _mesh(axis, np.arange(-0.5, 12.0), lead, values, colours, limits)
        unsure = np.isfinite(values) & ~((one[f"{score}_low"].values > 0.0) | (one[f"{score}_high"].values < 0.0))
        _hatch(axis, np.arange(-0.5, 12.0), lead, unsure)
        axis.set_xticks(range(12), [str(name) for name in one["season"].values], rotation=90, fontsize=8)
        axis.set_title(title, fontsize=10.5)
        axis.set_xlabel("target season")
        axis.yaxis.set_major_locator(
            FixedLocator([float(scores["lead"][at]) for at in (0, *range(2, scores.sizes["lead"], 3))])
        )
    panels[0].set_ylabel("lead (months)")
    _bar_beside(figure, panels[1], style.DEPTH, (0.0, 1.0), "")
    _bar_beside(figure, panels[2], style.ANOMALY, (-0.8, 0.8), "")
    _headline(figure, "Scores by lead and target season (hatched: the 95 % interval holds 0)")
    return figure


@style.styled
def reliability_diagram(reliability: xr.Dataset, *, forecaster: str) -> Figure:
    """Draw how often a category came against the probability that it was given, and how often each was given."""
    one = reliability.sel(forecaster=forecaster)
    figure = Figure(figsize=(style.HALF_WIDTH, 6.4))
    axis = figure.add_axes((0.12, 0.34, 0.84, 0.59))
    below = figure.add_axes((0.12, 0.09, 0.84, 0.17), sharex=axis)
    axis.plot([0.0, 1.0], [0.0, 1.0], color=style.LACKING, linewidth=1.0, label="right")
    for place, (name, (colour, marker)) in enumerate(_CATEGORY_LOOKS.items()):
        part = one.sel(category=name)
        enough = part["count"].values >= FEW
        stated, share, low, high = (
            part[key].values[enough]
            for key in ("stated_probability", "observed_share", "observed_share_low", "observed_share_high")
        )
        axis.errorbar(
            stated,
            share,
            yerr=[share - low, high - share],
            color=colour,
            marker=marker,
            markersize=6,
            linewidth=1.4,
            capsize=2,
            markeredgecolor=style.INK,
            markeredgewidth=0.5,
            label=name,
        )
        total = part["count"].values.sum()
        below.bar(
            part["bin"].values + 0.027 * (place - 1),
            100.0 * part["count"].values / total,
            0.026,
            color=colour,
            edgecolor=style.INK,
            linewidth=0.4,
        )
    axis.set_xlim(0.0, 1.0)
    axis.set_ylim(0.0, 1.0)
    axis.set_ylabel("share of times that it came")
    axis.legend(loc="upper left")
    slope, least, most = (float(one[f"reliability_slope{end}"]) for end in ("", "_low", "_high"))
    axis.text(0.98, 0.04, f"slope {slope:.2f} ({least:.2f} to {most:.2f})", ha="right", transform=axis.transAxes)
    below.set_xlabel("probability that was stated")
    below.set_ylabel("forecasts (%)")
    _headline(figure, "What came of stated probabilities")
    return figure


@style.styled
def outlook_plume(outlook: xr.Dataset, anomaly: xr.DataArray) -> Figure:
    """Draw the outlook after the last months of the index: its plume, and the probabilities of the categories.

    Parameters
    ----------
    outlook : xarray.Dataset
        As :func:`profiles.precursor.outlook` returns it.
    anomaly : xarray.DataArray
        Anomalies of the index up to the start.
    """
    figure = Figure(figsize=(style.WIDTH, 6.2))
    above = figure.add_axes((0.075, 0.46, 0.74, 0.42))
    below = figure.add_axes((0.075, 0.11, 0.74, 0.30), sharex=above)
    recent = anomaly.sel(time=slice(None, f"{outlook.attrs['start']}-28"))[-RECENT:]
    threshold = float(outlook.attrs["threshold"])
    units = _units(outlook["forecast"])
    given = np.isfinite(outlook["forecast"].values)
    for level in (-threshold, threshold):
        above.axhline(level, color=style.LACKING, linewidth=0.8, linestyle="--")
    above.plot(recent["time"], recent.values, color=style.BLACK, linewidth=1.6, label="observed")
    _draw_plume(above, outlook.isel(lead=given), recent)
    _draw_probabilities(below, outlook.isel(lead=given))
    ends = _days(outlook["target"].values)
    for axis in (above, below):
        axis.axvline(_days(recent["time"].values)[-1], color=style.INK, linewidth=0.8)
        if not given.all():
            first = ends[~given][0] - 15.0
            axis.axvspan(first, ends[-1] + 15.0, facecolor="none", edgecolor=style.MISSING, hatch="////", linewidth=0)
    if not given.all():
        below.text(
            0.5 * (first + ends[-1] + 15.0), 0.5, "withheld", ha="center", va="center", fontsize=10,
            bbox={"facecolor": "white", "edgecolor": style.LACKING, "pad": 3.0},
        )  # fmt: skip
    above.set_xlim(_days(recent["time"].values)[0], ends[-1] + 15.0)
    above.tick_params(labelbottom=False)
    style.time_axis(below)
    above.set_ylabel(f"anomaly of the index ({units})")
    below.set_ylabel("probability")
    above.legend(loc="center left", bbox_to_anchor=(1.01, 0.5))
    below.legend(loc="center left", bbox_to_anchor=(1.01, 0.5), reverse=True)
    below.text(0.015, 0.96, _beside_probabilities(outlook), fontsize=9, va="top", transform=below.transAxes)
    # The caution is part of the picture, wherever it is copied to.
    figure.text(
        0.075, 0.905, CAUTION, fontsize=10.5, fontweight="bold", va="bottom", color=style.INK,
        bbox={"facecolor": "#fff6e5", "edgecolor": style.ORANGE, "pad": 3.0},
    )  # fmt: skip
    _headline(
        figure,
        f"Research outlook from {month_label(outlook.attrs['start'])}, by {name_of(outlook.attrs['forecaster'])}",
    )
    return figure


def _beside_probabilities(outlook: xr.Dataset) -> str:
    """Return what is to be known of the probabilities, in lines that fit beside them."""
    threshold = f"{float(outlook.attrs['threshold']):g} {_units(outlook['forecast'])}"
    words = [
        f"Numbers: probability (%) of an anomaly of {threshold} or more above zero (warm), below (cold), or between.",
        "Dotted: how often they come at that time of the year.",
    ]
    reason = str(outlook.attrs.get("reason", ""))
    if reason:
        words.append(f"{reason[0].upper()}{reason[1:]}.")
    return "\n".join(line for sentence in words for line in wrap(sentence, 62))


def _draw_plume(axis: Axes, given: xr.Dataset, recent: xr.DataArray) -> None:
    if not given.sizes["lead"]:
        return
    start = recent.isel(time=[-1])
    time = np.concatenate([start["time"].values, given["target"].values])

    def from_last(values: Floats) -> Floats:
        return np.concatenate([start.values, values])

    quantiles = given["quantile"].values
    pairs = [(quantiles[at], quantiles[-1 - at]) for at in range(quantiles.size // 2)]
    for (low, high), opacity in zip(pairs, (0.25, 0.45), strict=True):
        ends = [from_last(given["plume"].sel(quantile=end).values) for end in (low, high)]
        label = f"{100 * (high - low):.0f} % of outcomes"
        axis.fill_between(time, ends[0], ends[1], color=style.BLUE, alpha=opacity, linewidth=0, label=label)
    axis.plot(
        time,
        from_last(given["forecast"].values),
        color=style.BLUE,
        linewidth=1.8,
        marker="o",
        markersize=4,
        label="forecast",
    )


def _draw_probabilities(axis: Axes, given: xr.Dataset) -> None:
    """Draw the probabilities as shares of a strip, cold below and warm above, and the usual ones as lines."""
    axis.set_ylim(0.0, 1.0)
    axis.yaxis.set_major_locator(MultipleLocator(0.25))
    time = given["target"].values
    foot = np.zeros(time.size)
    for name, colour in (("cold", COLD), ("neutral", NEUTRAL), ("warm", WARM)):
        share = given["probability"].sel(category=name).values if time.size else foot
        axis.bar(time, share, 26.0, foot, color=colour, edgecolor="white", linewidth=0.8, label=name)
        for when, low, part in zip(time, foot, share, strict=True):
            if part >= 0.08:
                axis.text(when, low + 0.5 * part, f"{100 * part:.0f}", ha="center", va="center", fontsize=8)
        foot = foot + share
    usual = given["usual_probability"].values.cumsum(axis=-1)
    half = np.timedelta64(13, "D")
    for when, levels in zip(time, usual, strict=True):
        axis.hlines(levels[:2], when - half, when + half, color="white", linewidth=2.2)
        axis.hlines(levels[:2], when - half, when + half, color=style.INK, linewidth=0.7, linestyle=":")


@style.styled
def events_and_volume(precursor: xr.Dataset, index: str) -> Figure:
    """Draw the index with its events, the volume above it, and the volume before each event against its peak.

    Parameters
    ----------
    precursor : xarray.Dataset
        Series, events and what came before, as the pipeline writes them to ``precursor.nc``.
    index : str
        Name of the anomaly of the index in it.
    """
    figure = Figure(figsize=(style.WIDTH, 5.6))
    above = figure.add_axes((0.07, 0.57, 0.60, 0.31))
    below = figure.add_axes((0.07, 0.13, 0.60, 0.33), sharex=above)
    beside = figure.add_axes((0.755, 0.13, 0.235, 0.75))
    time = precursor["time"].values
    name, unit, label = _first_predictor(precursor)
    series = precursor["predictor_anomaly"].sel(predictor=name).values / unit
    anomaly = precursor[index]
    for axis, values, ylabel in ((above, series, label), (below, anomaly.values, f"index ({_units(anomaly)})")):
        axis.plot(time, values, color=style.BLACK, linewidth=1.1)
        axis.axhline(0.0, color=style.LACKING, linewidth=0.8)
        axis.set_ylabel(ylabel)
        _shade_events(axis, precursor)
    above.tick_params(labelbottom=False)
    style.time_axis(below)
    above.set_xlim(time[0], time[-1])
    above.set_title(f"{name_of(name)} anomaly", fontsize=11)
    below.set_title("anomaly of the index, with its events", fontsize=11)
    months = 6
    for kind in ("cold", "warm"):
        colour, marker = _CATEGORY_LOOKS[kind]
        chosen = precursor["kind"].values == kind
        before = precursor["before_onset"].sel(predictor=name, months_before=months).values[chosen] / unit
        beside.plot(
            before,
            precursor["peak_value"].values[chosen],
            marker,
            color=colour,
            markersize=8,
            markeredgecolor=style.INK,
            markeredgewidth=0.6,
            label=f"{kind} ({int(np.isfinite(before).sum())})",
        )
    beside.axhline(0.0, color=style.LACKING, linewidth=0.8)
    beside.axvline(0.0, color=style.LACKING, linewidth=0.8)
    beside.set_xlabel(f"{label}\n{months} months before the onset")
    beside.set_ylabel(f"peak of the event ({_units(precursor['peak_value'])})")
    beside.margins(0.12)
    beside.legend(loc="lower left", bbox_to_anchor=(-0.02, 1.0), ncols=2)
    _headline(figure, f"Warm and cold events, and the {name_of(name)} before each")
    return figure


def _first_predictor(precursor: xr.Dataset) -> tuple[str, float, str]:
    """Return the volume, or what stands in its place, the size of its unit and how the axis names it."""
    names = [str(name) for name in precursor["predictor"].values]
    name = "volume" if "volume" in names else names[0]
    listed = dict(
        part.split(": ") for part in str(precursor["predictor_anomaly"].attrs["units_by_predictor"]).split("; ")
    )
    if listed[name] == "m3":
        return name, VOLUME_UNIT, f"{name_of(name)} (10$^{{14}}$ m$^{{3}}$)"
    return name, 1.0, f"{name_of(name)} ({readable(listed[name])})"


def _shade_events(axis: Axes, events: xr.Dataset) -> None:
    for onset, end, kind in zip(events["onset"].values, events["end"].values, events["kind"].values, strict=True):
        colour, marker = _CATEGORY_LOOKS[str(kind)]
        half = np.timedelta64(15, "D")
        axis.axvspan(onset - half, end + half, color=colour, alpha=0.35, linewidth=0)
        axis.plot(onset + (end - onset) / 2, 1.0, marker, color=colour, markeredgecolor=style.INK, markeredgewidth=0.4,
                  markersize=5, transform=axis.get_xaxis_transform(), clip_on=False)  # fmt: skip


# --------------------------------------------------------------------------------------------------------------
# What the figures share


def readable(units: str) -> str:
    """Return units as people write them."""
    return {"degree_Celsius": "°C", "1": "standard deviations", "m (1000 km)-1": "m per 1000 km"}.get(units, units)


def _days(time: NDArray[np.datetime64]) -> Floats:
    """Return times as the axes count them, in days."""
    return np.asarray(date2num(time), dtype=np.float64)  # type: ignore[no-untyped-call]


def month_label(month: str) -> str:
    """Return a month, 2070-12, as people write it."""
    return datetime.strptime(month, "%Y-%m").strftime("%B %Y")


def _units(array: xr.DataArray) -> str:
    return readable(str(array.attrs.get("units", "1")))


def _panels(
    count: int,
    columns: int,
    *,
    height: float,
    right: float = 0.985,
    between: float = 0.07,
    legend: bool = True,
) -> tuple[Figure, list[Axes]]:
    """Return panels in rows of ``columns``, ``height`` inches each row, with room for a headline and a legend."""
    rows = -(-count // columns)
    head, foot, gap = 0.92 if legend else 0.62, 0.55, 0.6
    whole = height * rows + head - 0.4
    figure = Figure(figsize=(style.WIDTH, whole))
    tall = (whole - head - foot - gap * (rows - 1)) / rows
    left, space = 0.075, between if columns > 1 else 0.0
    wide = (right - left - space * (columns - 1)) / columns
    places = [
        (
            left + (wide + space) * (number % columns),
            (whole - head - tall - (tall + gap) * (number // columns)) / whole,
            wide,
            tall / whole,
        )
        for number in range(count)
    ]
    return figure, [figure.add_axes(place) for place in places]


def _headline(figure: Figure, words: str) -> None:
    left = figure.axes[0].get_position().x0
    figure.text(left, 1.0 - 0.08 / figure.get_figheight(), words, fontsize=12, fontweight="bold", va="top")


def _edges(centres: NDArray[Any]) -> Floats:
    """Return borders half-way between centres; of a single one, half a unit (or a year of days) on either side."""
    centres = np.asarray(centres, dtype=np.float64)
    if centres.size == 1:
        half = 0.5 if abs(centres[0]) < 1000.0 else 182.0
        return np.array([centres[0] - half, centres[0] + half])
    middles = 0.5 * (centres[1:] + centres[:-1])
    return np.concatenate([[2 * centres[0] - middles[0]], middles, [2 * centres[-1] - middles[-1]]])


def _mesh(
    axis: Axes, across: Floats, up: Floats, values: Floats, colours: Colormap, limits: tuple[float, float]
) -> None:
    axis.set_facecolor(style.MISSING)
    axis.pcolormesh(across, up, np.ma.masked_invalid(values), cmap=colours, vmin=limits[0], vmax=limits[1])


def _hatch(axis: Axes, across: Floats, up: Floats, where: NDArray[np.bool_]) -> None:
    """Hatch the cells of ``where`` (row, column), one rectangle for each run of cells in a row."""
    rectangles = []
    for row, cells in enumerate(where):
        for first, after in np.flatnonzero(np.diff(cells, prepend=False, append=False)).reshape(-1, 2):
            west, east = across[first], across[after]
            rectangles.append([(west, up[row]), (east, up[row]), (east, up[row + 1]), (west, up[row + 1])])
    axis.add_collection(
        PolyCollection(rectangles, facecolors="none", edgecolors=style.LACKING, linewidths=0.0, hatch="////"),
        autolim=False,
    )


def _colour_bar(figure: Figure, colours: Colormap, limits: tuple[float, float], label: str) -> None:
    top = max(axis.get_position().y1 for axis in figure.axes)
    foot = min(axis.get_position().y0 for axis in figure.axes)
    place = figure.add_axes((0.92, foot + 0.1 * (top - foot), 0.012, 0.8 * (top - foot)))
    figure.colorbar(ScalarMappable(Normalize(*limits), colours), cax=place).set_label(label)


def _bar_beside(figure: Figure, axis: Axes, colours: Colormap, limits: tuple[float, float], label: str) -> None:
    box = axis.get_position()
    place = figure.add_axes((box.x1 + 0.01, box.y0, 0.012, box.height))
    figure.colorbar(ScalarMappable(Normalize(*limits), colours), cax=place).set_label(label)


def write_precursor_figures(
    folder: Path,
    *,
    precursor: xr.Dataset,
    scores: xr.Dataset | None = None,
    reliability: xr.Dataset | None = None,
    outlook: xr.Dataset | None = None,
) -> dict[str, Path]:
    """Draw all figures of a precursor analysis into PNG files.

    Parameters
    ----------
    folder : Path
        Where the files go; it must exist.
    precursor : xarray.Dataset
        Series, lead-lag and events, as the pipeline writes them to ``precursor.nc``.
    scores, reliability, outlook : xarray.Dataset, optional
        As :func:`profiles.precursor.verify`, :func:`profiles.precursor.reliability` and
        :func:`profiles.precursor.outlook` return them, where there are any.

    Returns
    -------
    dict
        The files by the name of the figure, in the order in which a report shows them.
    """
    lead_lag = precursor.sel(predictor=precursor["correlation"].notnull().any("lead"))
    index = str(precursor.attrs["target"])
    figures: dict[str, Callable[[], Figure]] = {"precursor_lead_lag": lambda: lead_lag_curves(lead_lag)}
    if np.isfinite(lead_lag["correlation_by_month"]).any():
        figures["precursor_by_month"] = lambda: lead_lag_by_month(lead_lag)
    if "correlation_in_window" in lead_lag:
        figures["precursor_windows"] = lambda: lead_lag_in_windows(lead_lag)
    if precursor.sizes["event"]:
        figures["precursor_events"] = lambda: events_and_volume(precursor, index)
    if scores is not None and reliability is not None:
        chosen = forecaster_of(scores, outlook)
        figures["precursor_skill"] = lambda: skill_by_lead(scores)
        figures["precursor_seasons"] = lambda: skill_by_season(scores, forecaster=chosen)
        figures["precursor_reliability"] = lambda: reliability_diagram(reliability, forecaster=chosen)
    if outlook is not None and np.isfinite(outlook["forecast"]).any():
        figures["precursor_outlook"] = lambda: outlook_plume(outlook, precursor[index])
    return {name: style.save(draw(), folder / f"{name}.png") for name, draw in figures.items()}


def forecaster_of(scores: xr.Dataset, outlook: xr.Dataset | None) -> str:
    """Return the forecaster that the figures show: that of the outlook, else the last of the hindcast."""
    return str(outlook.attrs["forecaster"]) if outlook is not None else str(scores["forecaster"].values[-1])
