"""Models beside the array: section, pattern diagram, time against longitude, tilt and volume, each with its errors."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Final

import numpy as np
import xarray as xr
from matplotlib.axes import Axes
from matplotlib.colors import Colormap
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.patches import Circle, Patch
from matplotlib.ticker import FixedLocator
from numpy.typing import NDArray

from profiles.report import style
from profiles.report.array import hatch, line_with_band, time_edges
from profiles.report.model_findings import scores_of
from profiles.report.summary import VOLUME_UNIT
from profiles.section.grid import REGIONS, cell_edges

Floats = NDArray[np.float64]

#: A colour a model, in their order; the array is black.
COLOURS = (style.VERMILION, style.BLUE, style.GREEN, style.PURPLE, style.ORANGE, style.SKY)
_FULL: Final = "-"
_SEEN: Final = (0, (4, 1.5))
_SMALLER = "below what the array can tell"

#: What stands in the pattern diagram: quantity, place, marker, what it is called.
PATTERNS = (
    ("isotherm_depth", "array", "o", "isotherm depth, mean of the moorings"),
    ("thermocline_slope", "equator", "^", "tilt"),
    ("warm_water_volume", "total", "s", "warm water volume"),
)
_CORRELATIONS = (0.0, 0.2, 0.4, 0.6, 0.7, 0.8, 0.9, 0.95, 0.99)
_LARGEST = 5.0  # radius that is drawn of an error; a larger one covers all that is of use
_NEAR = 0.3  # of the array's standard deviation about the array, in the closer view


def _each(comparison: xr.Dataset) -> Iterator[tuple[str, xr.Dataset, str]]:
    """Yield each model's name, comparison and colour."""
    for place, model in enumerate(comparison["model"].values):
        yield style.plain(str(model)), comparison.sel(model=model), COLOURS[place % len(COLOURS)]


# --------------------------------------------------------------------------------------------------------------
# The section


@style.styled
def model_section(comparison: xr.Dataset) -> Figure:
    """Draw the mean isotherm along the equator of array and models, and the differences beside what can be told.

    Parameters
    ----------
    comparison : xarray.Dataset
        As :func:`profiles.validation.side_by_side` returns it.
    """
    isotherm = f"{float(comparison.attrs['isotherm']):g} °C isotherm"
    figure, blocks = _blocks(comparison.sizes["model"], (2.3, 1.9))
    for (name, one, colour), (above, below) in zip(_each(comparison), blocks, strict=True):
        _section_panel(above, one, colour)
        _section_difference(below, one, colour)
        above.set_title(f"{name}, {_months_of(one)}", fontsize=11)
        above.set_xlim(*REGIONS["total"])
    for above, below in _left_most(blocks):
        above.set_ylabel("depth (m)")
        below.set_ylabel("model less array (m)\npositive: deeper")
    _headed(figure, f"The {isotherm} along the equator, 2.5°S-2.5°N: array and model, means over their months")
    model = style.LACKING if len(blocks) > 1 else COLOURS[0]
    steepest = Line2D([], [], color=model, linestyle=":", linewidth=1.2, label="full model's steepest gradient")
    bars = Line2D([], [], color=model, marker="D", linestyle="none", label="lines of moorings, as seen, 95 %")
    _keyed(figure, [*_series_key(model), steepest, bars])
    return figure


def _section_panel(axis: Axes, one: xr.Dataset, colour: str) -> None:
    longitude = one["longitude"].values
    array, error = _mean_over_both(one, "array", "equatorial_isotherm_depth")
    line_with_band(axis, longitude, array, style.HALF_WIDTH_95 * error, color=style.BLACK)
    seen, full = (_mean_over_both(one, side, "equatorial_isotherm_depth")[0] for side in ("seen", "full"))
    axis.plot(longitude, full, linestyle=_FULL, color=colour, linewidth=1.6)
    axis.plot(longitude, seen, linestyle=_SEEN, color=colour, linewidth=1.4)
    steepest = one["full_equatorial_steepest_gradient_depth"].mean("time")
    axis.plot(longitude, steepest, linestyle=":", color=colour, linewidth=1.2)
    axis.set_ylim(0.0, None)
    axis.invert_yaxis()


def _mean_over_both(one: xr.Dataset, side: str, name: str) -> tuple[Floats, Floats]:
    """Return the mean over the months of both, and the mean standard error of the array's."""
    both = one[f"{name}_difference"].notnull()
    mean = one[f"{side}_{name}"].where(both).mean("time").values
    return mean, one[f"{name}_difference_error"].where(both).mean("time").values


def _section_difference(axis: Axes, one: xr.Dataset, colour: str) -> None:
    longitude, name = one["longitude"].values, "equatorial_isotherm_depth"
    kinds = [f"{name}_{kind}{end}" for kind in ("difference", "seen_difference") for end in ("", "_error")]
    means = one[kinds].mean("time")
    _untold(axis, longitude, means, name)
    axis.plot(longitude, means[f"{name}_difference"], linestyle=_FULL, color=colour, linewidth=1.6)
    axis.plot(longitude, means[f"{name}_seen_difference"], linestyle=_SEEN, color=colour, linewidth=1.4)
    lines = one.isel(series=(one["kind"].values == "line") & (one["quantity"].values == "isotherm_depth"))
    places = [float(str(place).removesuffix("E")) for place in lines["place"].values]
    bias, low, high = (lines[end].values for end in ("bias", "bias_low", "bias_high"))
    axis.errorbar(
        places, bias, yerr=[bias - low, high - bias], fmt="D", color=colour, markersize=4, capsize=2, linewidth=1.0
    )
    style.longitude_axis(axis, *REGIONS["total"])


def _untold(axis: Axes, across: NDArray[np.generic], one: xr.Dataset, name: str, scale: float = 1.0) -> None:
    """Draw what the array cannot tell from none: 95 % of its measurement, and of its map, about zero."""
    for kind, opacity in (("difference", 0.16), ("seen_difference", 0.34)):
        half = style.HALF_WIDTH_95 * one[f"{name}_{kind}_error"].values / scale
        axis.fill_between(across, -half, half, color=style.LACKING, alpha=opacity, linewidth=0)
    axis.axhline(0.0, color=style.BLACK, linewidth=0.8)


# --------------------------------------------------------------------------------------------------------------
# Tilt and volume


@style.styled
def model_tilt(comparison: xr.Dataset) -> Figure:
    """Draw the tilt of array and models, and the differences beside what can be told."""
    figure = _over_time(
        comparison, "thermocline_slope", 1.0, "tilt\n(m per 1000 km)", "model less array\n(m per 1000 km)"
    )
    _headed(figure, "Tilt of the thermocline: array and model; more negative: steeper")
    return figure


@style.styled
def model_volume(comparison: xr.Dataset) -> Figure:
    """Draw the volume of warm water of array and models, and the differences beside what can be told."""
    unit = "(10$^{14}$ m$^{3}$)"
    whole = comparison.sel(region="total")
    figure = _over_time(whole, "warm_water_volume", VOLUME_UNIT, f"volume\n{unit}", f"model less array\n{unit}")
    _headed(figure, "Volume of warm water, 5°S-5°N, 120°E-80°W: array and model")
    return figure


def _over_time(comparison: xr.Dataset, name: str, scale: float, label: str, difference_label: str) -> Figure:
    figure, blocks = _blocks(comparison.sizes["model"], (1.9, 1.7))
    for (model, one, colour), (above, below) in zip(_each(comparison), blocks, strict=True):
        time = one["time"].values
        values, half = one[f"array_{name}"].values, style.HALF_WIDTH_95 * one[f"array_{name}_error"].values
        line_with_band(above, time, values / scale, half / scale, color=style.BLACK)
        _untold(below, time, one, name, scale)
        for side, dashes in (("full", _FULL), ("seen", _SEEN)):
            difference = f"{name}_difference" if side == "full" else f"{name}_seen_difference"
            above.plot(time, one[f"{side}_{name}"].values / scale, linestyle=dashes, color=colour, linewidth=1.4)
            below.plot(time, one[difference].values / scale, linestyle=dashes, color=colour, linewidth=1.4)
        style.time_axis(below)
        below.set_xlim(*time_edges(one)[[0, -1]])
        above.set_title(model, fontsize=11)
    for above, below in _left_most(blocks):
        above.set_ylabel(label)
        below.set_ylabel(difference_label)
    _keyed(figure, _series_key(style.LACKING if len(blocks) > 1 else COLOURS[0]))
    return figure


# --------------------------------------------------------------------------------------------------------------
# Time against longitude


@style.styled
def model_time_longitude(comparison: xr.Dataset) -> Figure:
    """Draw the isotherm along the equator against time: array, full model and difference, a row a model."""
    name, rows = "equatorial_isotherm_depth", comparison.sizes["model"]
    height = 4.6 * rows + 1.3
    figure = Figure(figsize=(style.WIDTH, height))
    limits = style.round_limits(np.stack([comparison[f"{side}_{name}"].values for side in ("array", "full")]))
    reach = max(abs(end) for end in style.round_limits(comparison[f"{name}_difference"].values))
    for row, (model, one, _) in enumerate(_each(comparison)):
        bottom = 1.25 + 4.6 * (rows - 1 - row)
        parts = ((f"array_{name}", "array"), (f"full_{name}", model), (f"{name}_difference", f"{model} less array"))
        for column, (variable, words) in enumerate(parts):
            box = (0.075 + 0.312 * column, bottom / height, 0.28, 3.95 / height)
            axis = figure.add_axes(box)
            apart = column == 2
            scale = (style.ANOMALY, -reach, reach) if apart else (style.DEPTH, *limits)
            _coloured(axis, one, one[variable].values, scale)
            if apart:
                error = one[f"{name}_difference_error"].values
                untold = np.abs(one[variable].values) < style.HALF_WIDTH_95 * error
                hatch(axis, untold, time_edges(one), cell_edges(one["longitude"].values, "longitude"))
            axis.set_title(words, fontsize=11)
            if column:
                axis.set_ylabel("")
                axis.tick_params(labelleft=False)
            if row < rows - 1:
                axis.set_xlabel("")
    _colour_bars(figure, height)
    isotherm = f"{float(comparison.attrs['isotherm']):g} °C isotherm"
    _headed(figure, f"Depth of the {isotherm}, 2.5°S-2.5°N; hatched: difference {_SMALLER}")
    return figure


def _coloured(axis: Axes, one: xr.Dataset, values: Floats, scale: tuple[Colormap, float, float]) -> None:
    colours, low, high = scale
    axis.pcolormesh(
        cell_edges(one["longitude"].values, "longitude"),
        time_edges(one),
        np.ma.masked_invalid(values),
        cmap=colours,
        vmin=low,
        vmax=high,
    )
    axis.set_facecolor(style.MISSING)
    style.longitude_axis(axis, *REGIONS["total"])
    axis.xaxis.set_major_locator(FixedLocator([140.0, 180.0, 220.0, 260.0]))
    style.time_axis(axis, vertical=True)


def _colour_bars(figure: Figure, height: float) -> None:
    """Draw the two scales below the lowest row."""
    panels = figure.axes
    for axis, box, label in (
        (panels[0], (0.2, 0.34), "depth (m)"),
        (panels[2], (0.72, 0.24), "difference (m), positive: model deeper"),
    ):
        place = figure.add_axes((box[0], 0.52 / height, box[1], 0.13 / height))
        figure.colorbar(axis.collections[0], cax=place, orientation="horizontal", extend="both").set_label(label)


# --------------------------------------------------------------------------------------------------------------
# The pattern diagram


@style.styled
def pattern_diagram(comparison: xr.Dataset) -> Figure:
    """Draw standard deviation, correlation and centred rms difference in one plane, and where the array itself stands.

    The distance from the origin is the ratio of standard deviations, model as seen to array; the cosine of the angle
    is the correlation; then the distance from the array's point is the centred rms difference, in units of the array's
    standard deviation. A dotted circle about the array's point has the rms error of the array's months as its radius:
    a model that is the ocean would stand about there, not on the point.

    References
    ----------
    Taylor (2001), J. Geophys. Res. 106, 7183-7192, equation 5 and figure 1.
    """
    figure = Figure(figsize=(style.WIDTH, 6.0))
    points = [(mark, colour, scores) for mark, colour, scores in _points(comparison)]
    reach = 1.1 * max([1.3, *(scores["sd_ratio"] for _, _, scores in points)])
    opposed = any(scores["correlation"] < 0.0 for _, _, scores in points)
    whole = figure.add_axes((0.065, 0.24, 0.42, 0.63))
    near = figure.add_axes((0.56, 0.24, 0.42, 0.63))
    for axis in (whole, near):
        _pattern_net(axis, reach)
        _observation(axis, comparison)
        for mark, colour, scores in points:
            _pattern_point(axis, mark, colour, scores)
        axis.set_aspect("equal", adjustable="box")
        axis.set_xlabel("standard deviation along the array's, ratio")
    whole.set_xlim(-reach if opposed else 0.0, reach)
    whole.set_ylim(0.0, reach)
    _correlation_labels(whole, reach, opposed)
    _closer_view(near, whole)
    whole.set_ylabel("standard deviation across, ratio")
    _headed(figure, "How the models vary beside the array: standard deviation, correlation, and rms difference")
    _pattern_key(figure, comparison)
    return figure


def _points(comparison: xr.Dataset) -> Iterator[tuple[str, str, dict[str, float]]]:
    for _, one, colour in _each(comparison):
        for quantity, place, mark, _ in PATTERNS:
            scores = dict(scores_of(one, quantity, place))
            if np.isfinite([scores["sd_ratio"], scores["correlation"]]).all():
                yield mark, colour, scores


def place_of(sd_ratio: float, correlation: float) -> tuple[float, float]:
    """Return where a model stands in the diagram."""
    return sd_ratio * correlation, sd_ratio * float(np.sqrt(max(1.0 - correlation**2, 0.0)))


def _pattern_net(axis: Axes, reach: float) -> None:
    turn = np.linspace(0.0, np.pi, 181)
    step = 0.25 * np.ceil(reach / 2.5)  # no more than ten rings
    for radius in (1.0, *np.arange(step, reach, step)):
        strong = radius == 1.0
        axis.plot(
            radius * np.cos(turn),
            radius * np.sin(turn),
            color=style.BLACK if strong else style.MISSING,
            linewidth=1.0 if strong else 0.7,
            zorder=1,
        )
    for correlation in (*_CORRELATIONS, *(-value for value in _CORRELATIONS[1:])):
        across, up = place_of(reach, correlation)
        axis.plot([0.0, across], [0.0, up], color=style.MISSING, linewidth=0.6, zorder=1)
    for radius in (0.1, 0.2, 0.3, 0.5, 1.0):
        axis.add_patch(
            Circle((1.0, 0.0), radius, fill=False, edgecolor=style.SKY, linewidth=0.7, linestyle="--", zorder=1)
        )
    axis.plot([1.0], [0.0], "*", color=style.BLACK, markersize=13, zorder=5, clip_on=False)


def _observation(axis: Axes, comparison: xr.Dataset) -> None:
    """Draw the array's own error about its point, of each quantity; of several models that of the first, for they are
    of the same array."""
    one = comparison.isel(model=0)
    for quantity, place, *_ in PATTERNS:
        scores = scores_of(one, quantity, place)
        radius = scores["observation_noise"] / scores["array_sd"] if scores["array_sd"] > 0.0 else np.nan
        if np.isfinite(radius):
            radius = min(radius, _LARGEST)
            axis.add_patch(Circle((1.0, 0.0), radius, facecolor=style.LACKING, alpha=0.16, linewidth=0, zorder=2))
            turn = np.linspace(np.pi, 0.0, 60)
            axis.plot(1.0 + radius * np.cos(turn), radius * np.sin(turn), ":", color=style.LACKING, linewidth=1.2)


def _pattern_point(axis: Axes, mark: str, colour: str, scores: dict[str, float]) -> None:
    ratio, correlation = scores["sd_ratio"], scores["correlation"]
    along = [place_of(ratio, r) for r in np.linspace(scores["correlation_low"], scores["correlation_high"], 30)]
    across = [place_of(r, correlation) for r in (scores["sd_ratio_low"], scores["sd_ratio_high"])]
    for path in (along, across):
        axis.plot(*zip(*path, strict=True), color=colour, linewidth=1.0, alpha=0.6, zorder=3)
    axis.plot(
        *place_of(ratio, correlation), marker=mark, color=colour, markersize=8, markeredgecolor=style.INK, zorder=6
    )


def _correlation_labels(axis: Axes, reach: float, opposed: bool) -> None:
    shown = [*_CORRELATIONS, *(-value for value in _CORRELATIONS[1:] if opposed)]
    for correlation in shown:
        across, up = place_of(1.03 * reach, correlation)
        turn = float(np.degrees(np.arctan2(up, across)))
        axis.text(
            across,
            up,
            f"{correlation:g}".replace("-", "−"),
            rotation=turn if turn <= 90.0 else turn - 180.0,
            rotation_mode="anchor",
            ha="left" if turn <= 90.0 else "right",
            va="center",
            fontsize=8,
        )
    rim = np.linspace(0.0, np.pi if opposed else 0.5 * np.pi, 91)
    axis.plot(reach * np.cos(rim), reach * np.sin(rim), color=style.INK, linewidth=1.0, clip_on=False)
    axis.text(0.8 * reach, 0.8 * reach, "correlation", rotation=-45.0, ha="center", va="center", fontsize=10)


def _closer_view(near: Axes, whole: Axes) -> None:
    near.set_xlim(1.0 - _NEAR, 1.0 + _NEAR)
    near.set_ylim(0.0, 2.0 * _NEAR)
    near.set_title("closer, about the array", fontsize=11)
    for radius in (0.1, 0.2, 0.3, 0.5):
        near.text(1.0, radius, f"{radius:g}", color=style.BLUE, fontsize=8, ha="center", va="bottom")
    corners = np.array([[-1, 0], [1, 0], [1, 2], [-1, 2], [-1, 0]]) * _NEAR
    whole.plot(1.0 + corners[:, 0], corners[:, 1], color=style.LACKING, linewidth=0.8, zorder=2)


def _pattern_key(figure: Figure, comparison: xr.Dataset) -> None:
    models = [Patch(facecolor=colour, label=name) for name, _, colour in _each(comparison)]
    marks = [
        Line2D([], [], marker=mark, color=style.INK, markerfacecolor="white", linestyle="none", label=words)
        for _, _, mark, words in PATTERNS
    ]
    others = [
        Line2D([], [], marker="*", color=style.BLACK, markersize=11, linestyle="none", label="the array"),
        Patch(facecolor=style.MISSING, label="rms error of the array's months, a circle a quantity"),
        Line2D([], [], color=style.SKY, linestyle="--", linewidth=0.9, label="centred rms difference, ratio"),
    ]
    figure.legend(handles=[*models, *marks, *others], loc="lower center", ncol=3, bbox_to_anchor=(0.5, 0.02))


# --------------------------------------------------------------------------------------------------------------
# What the figures share


def _blocks(count: int, heights: tuple[float, float]) -> tuple[Figure, list[tuple[Axes, Axes]]]:
    """Return a figure with two panels, one above the other, for each of ``count`` models, two models abreast."""
    abreast = min(count, 2)
    rows = -(-count // abreast)
    left, right, between, top, foot, head, gap, key = 0.95, 0.3, 0.55, 0.3, 0.55, 0.4, 0.12, 0.75
    row_height = sum(heights) + gap + head + foot
    size = style.WIDTH, top + rows * row_height + key
    width = (size[0] - left - right - between * (abreast - 1)) / abreast
    figure, blocks = Figure(figsize=size), []
    for place in range(count):
        row, column = divmod(place, abreast)
        across = left + column * (width + between)
        base = size[1] - top - (row + 1) * row_height + foot
        below = figure.add_axes(_share((across, base, width, heights[1]), size))
        box = _share((across, base + heights[1] + gap, width, heights[0]), size)
        above = figure.add_axes(box, sharex=below)
        above.tick_params(labelbottom=False)
        blocks.append((above, below))
    return figure, blocks


def _share(box: tuple[float, float, float, float], size: tuple[float, float]) -> tuple[float, float, float, float]:
    return box[0] / size[0], box[1] / size[1], box[2] / size[0], box[3] / size[1]


def _left_most(blocks: list[tuple[Axes, Axes]]) -> list[tuple[Axes, Axes]]:
    return blocks[:: min(len(blocks), 2)]


def _headed(figure: Figure, words: str) -> None:
    figure.text(0.015, 1.0 - 0.12 / figure.get_figheight(), words, fontsize=12, weight="bold", ha="left", va="top")


def _keyed(figure: Figure, handles: list[Line2D | Patch]) -> None:
    figure.legend(handles=handles, loc="lower center", ncol=3, bbox_to_anchor=(0.5, 0.0))


def _series_key(colour: str) -> list[Line2D | Patch]:
    return [
        Line2D([], [], color=style.BLACK, linewidth=1.6, label="array, band: 95 % interval"),
        Line2D([], [], color=colour, linestyle=_FULL, linewidth=1.6, label="full model"),
        Line2D([], [], color=colour, linestyle=_SEEN, linewidth=1.4, label="model as seen by the array"),
        Patch(facecolor=style.LACKING, alpha=0.45, label="what measurement cannot tell, 95 %"),
        Patch(facecolor=style.LACKING, alpha=0.16, label="what the map cannot tell, 95 %"),
    ]


def _months_of(one: xr.Dataset) -> str:
    """Return the first and the last month that both have."""
    months = one["time"].values[one["equatorial_isotherm_depth_difference"].notnull().any("longitude").values]
    return f"{str(months[0])[:7]} to {str(months[-1])[:7]}" if months.size else "no month of both"


FIGURES: dict[str, Callable[[xr.Dataset], Figure]] = {
    "validation_section": model_section,
    "validation_tilt": model_tilt,
    "validation_volume": model_volume,
    "validation_time_longitude": model_time_longitude,
    "validation_pattern": pattern_diagram,
}


def write_model_figures(folder: Path, comparison: xr.Dataset) -> dict[str, Path]:
    """Draw all figures of a comparison into PNG files.

    Parameters
    ----------
    folder : Path
        Where the files go; it must exist.
    comparison : xarray.Dataset
        As :func:`profiles.validation.side_by_side` returns it.

    Returns
    -------
    dict
        The files by the name of the figure, in the order in which a report shows them.
    """
    return {name: style.save(draw(comparison), folder / f"{name}.png") for name, draw in FIGURES.items()}
