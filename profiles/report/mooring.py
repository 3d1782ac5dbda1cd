"""One mooring through time: temperature, flags, the isotherm with its band, the mixed layer, the status."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
import xarray as xr
from matplotlib.axes import Axes
from matplotlib.colors import ListedColormap
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.patches import Patch
from numpy.typing import NDArray

from profiles.config import ColumnSettings
from profiles.report import style
from profiles.vocabulary import Flag, IsothermStatus

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]

MOST_COLUMNS = 1500  # times drawn; a longer record is averaged to no more (the panel is about 900 pixels wide)
MARK_COLUMNS = 150  # places along the time axis of which each takes one mark per sensor and flag
DEPTH_STEP = 2.5  # of the picture, on the depth axis

#: What a status is called and its colour, in the strip below the panel.
STATUSES = {
    IsothermStatus.FOUND: ("found", style.CALM),
    IsothermStatus.OUTCROPPED: ("outcropped", style.ORANGE),
    IsothermStatus.ABOVE_CHAIN: ("above the chain", style.YELLOW),
    IsothermStatus.BELOW_CHAIN: ("below the chain", style.BLUE),
    IsothermStatus.GAP: ("sensors too far apart", style.VERMILION),
    IsothermStatus.SEVERAL_CROSSINGS: ("several crossings", style.GREEN),
    IsothermStatus.TOO_FEW_SENSORS: ("too few sensors", style.LACKING),
    IsothermStatus.NOT_DELIVERED: ("not delivered", style.PURPLE),
    IsothermStatus.NOT_USED: ("delivered, not used", style.SKY),
}
_NO_PROFILE = 0  # beside the statuses, which begin at 1

_FLAG_MARKS = {
    Flag.QUESTIONABLE: {"marker": "v", "color": style.SKY, "label": "questionable value"},
    Flag.BAD: {"marker": "X", "color": "white", "label": "bad value"},
}


@dataclass(frozen=True)
class Bins:
    """Equal bins of time: ``edges`` (bin + 1,), and the bin of each sample, ``index`` (time,)."""

    edges: NDArray[np.datetime64]
    index: Integers

    @property
    def count(self) -> int:
        """Return how many bins there are."""
        return self.edges.size - 1

    @property
    def middle(self) -> NDArray[np.datetime64]:
        """Return the middle of each bin."""
        return self.edges[:-1] + np.diff(self.edges) // 2


def time_bins(time: NDArray[np.datetime64], most: int) -> Bins:
    """Return bins of a whole number of median time steps each, no more than ``most``, that hold all of ``time``."""
    stamps = time.astype("datetime64[ns]").astype(np.int64)
    step = int(np.median(np.diff(stamps))) if stamps.size > 1 else int(np.timedelta64(1, "D") / np.timedelta64(1, "ns"))
    steps = round((stamps[-1] - stamps[0]) / step) + 1
    width = -(-steps // most) * step
    start = stamps[0] - step // 2
    index = (stamps - start) // width
    edges = start + width * np.arange(index[-1] + 2)
    return Bins(edges.astype("datetime64[ns]"), index)


def binned_mean(values: Floats, bins: Bins) -> Floats:
    """Return the mean of the finite values of each bin, (bin, ...), NaN where there is none; time comes first."""
    series = values.reshape(values.shape[0], -1)
    means = np.full((bins.count, series.shape[1]), np.nan)
    for column, one in enumerate(series.T):
        finite = np.isfinite(one)
        count = np.bincount(bins.index[finite], minlength=bins.count)
        total = np.bincount(bins.index[finite], weights=one[finite], minlength=bins.count)
        means[:, column] = np.divide(total, count, out=means[:, column], where=count > 0)
    return means.reshape(bins.count, *values.shape[1:])


def commonest(status: Integers, bins: Bins) -> Integers:
    """Return the commonest status of each bin, 0 where the bin has no sample."""
    kinds = max(STATUSES) + 1
    counts = np.bincount(bins.index * kinds + status, minlength=bins.count * kinds).reshape(bins.count, kinds)
    return np.where(counts.any(axis=1), counts.argmax(axis=1), _NO_PROFILE)


def fill_depths(values: Floats, depth: Floats, levels: Floats) -> Floats:
    """Return temperature at ``levels``, (level, time), linear between neighbouring sensors that both have a value.

    A sensor without a value leaves its half of the way to each neighbour empty. The first sensor holds up to the
    surface if it is shallow enough to stand for it; below the last there is nothing.

    Parameters
    ----------
    values : ndarray, shape (time, sensor)
        °C, NaN where missing.
    depth : ndarray, shape (time or 1, sensor)
        m, ascending.
    levels : ndarray, shape (level,)
        m, ascending.
    """
    last = depth.shape[1] - 1
    above = np.clip((depth[:, :, None] <= levels).sum(axis=1) - 1, 0, max(last - 1, 0))
    below = np.minimum(above + 1, last)
    upper, lower = np.take_along_axis(depth, above, axis=1), np.take_along_axis(depth, below, axis=1)
    share = np.clip((levels - upper) / np.where(lower > upper, lower - upper, 1.0), 0.0, 1.0)
    warm, cold = (
        np.take_along_axis(values, np.broadcast_to(at, (len(values), levels.size)), axis=1) for at in (above, below)
    )
    nearest = np.where(share < 0.5, warm, cold)
    filled = np.where(np.isfinite(warm) & np.isfinite(cold), warm + share * (cold - warm), nearest)
    surface = ColumnSettings().surface_reach
    outside = (levels > depth[:, -1:]) | ((levels < depth[:, :1]) & (depth[:, :1] > surface))
    return np.where(outside, np.nan, filled).T


@style.styled
def mooring_figure(chain: xr.Dataset, columns: xr.Dataset, settings: ColumnSettings | None = None) -> Figure:
    """Draw a mooring's record.

    Parameters
    ----------
    chain : xarray.Dataset
        Flagged, with ``temperature`` and ``temperature_qc`` (time, depth), °C, and where the sensors moved
        ``sensor_depth`` (time, depth), m.
    columns : xarray.Dataset
        Of the same times, as :func:`profiles.column.columns_of` returns them.
    settings : ColumnSettings, optional
        Which flags were used and which isotherm was sought. Default: the defaults.

    Returns
    -------
    matplotlib.figure.Figure
        Values that were used in colour, grey where there was none; flagged values as marks at their sensor.
    """
    settings = settings or ColumnSettings()
    bins = time_bins(chain["time"].values, MOST_COLUMNS)
    figure = Figure(figsize=(style.WIDTH, 5.4))
    panel, strip, scale = _axes(figure)
    _draw_temperature(panel, scale, chain, bins, settings)
    handles = [*_draw_columns(panel, columns, bins, settings), *_draw_flags(panel, chain), _draw_sensors(panel, chain)]
    style.chain_depth_axis(panel, float(chain["depth"].values[-1]) * 1.01 + 1.0)
    panel.tick_params(labelbottom=False)
    panel.set_title(_title(chain))
    statuses = _draw_status(strip, columns, bins)
    figure.legend(handles=handles, loc="upper right", bbox_to_anchor=(0.995, 0.93), labelspacing=0.9)
    figure.legend(handles=statuses, loc="lower right", bbox_to_anchor=(0.995, 0.06), title="isotherm", alignment="left")
    return figure


@style.styled
def column_figure(columns: xr.Dataset, settings: ColumnSettings | None = None) -> Figure:
    """Draw the columns of a mooring that has no chain, as somebody else computed them.

    Parameters
    ----------
    columns : xarray.Dataset
        As :func:`profiles.column.columns_of_series` returns them.
    settings : ColumnSettings, optional
        Which isotherm they are of. Default: the defaults.
    """
    settings = settings or ColumnSettings()
    bins = time_bins(columns["time"].values, MOST_COLUMNS)
    figure = Figure(figsize=(style.WIDTH, 5.4))
    panel, strip, scale = _axes(figure)
    scale.remove()
    panel.set_facecolor(style.MISSING)
    handles = _draw_columns(panel, columns, bins, settings)
    depths = [columns[name].values for name in ("isotherm_depth", "mixed_layer_depth")]
    finite = np.concatenate([depth[np.isfinite(depth)] for depth in depths])
    style.chain_depth_axis(panel, 1.3 * float(finite.max(initial=_SHALLOWEST_AXIS)))
    panel.tick_params(labelbottom=False)
    panel.set_title(f"{_title(columns)}: series from elsewhere")
    statuses = _draw_status(strip, columns, bins)
    figure.legend(handles=handles, loc="upper right", bbox_to_anchor=(0.995, 0.93), labelspacing=0.9)
    figure.legend(handles=statuses, loc="lower right", bbox_to_anchor=(0.995, 0.06), title="isotherm", alignment="left")
    return figure


_SHALLOWEST_AXIS = 100.0  # m; the depth axis reaches at least this far


def write_column_figure(path: Path, columns: xr.Dataset, settings: ColumnSettings | None = None) -> Path:
    """Draw the columns of a mooring without a chain (see :func:`column_figure`) into a PNG file."""
    return style.save(column_figure(columns, settings), path, palette=True)


def write_mooring_figure(
    path: Path, chain: xr.Dataset, columns: xr.Dataset, settings: ColumnSettings | None = None
) -> Path:
    """Draw a mooring's record (see :func:`mooring_figure`) into a PNG file."""
    return style.save(mooring_figure(chain, columns, settings), path, palette=True)


def _axes(figure: Figure) -> tuple[Axes, Axes, Axes]:
    panel = figure.add_axes((0.06, 0.19, 0.715, 0.735))
    strip = figure.add_axes((0.06, 0.125, 0.715, 0.04), sharex=panel)
    scale = figure.add_axes((0.795, 0.40, 0.013, 0.20))
    return panel, strip, scale


def _title(chain: xr.Dataset) -> str:
    first, last = np.datetime_as_string(chain["time"].values[[0, -1]], unit="D")
    parts = [style.plain(str(chain["mooring"].item()))] if "mooring" in chain.coords else []
    if {"latitude", "longitude"} <= set(chain.coords):
        latitude, longitude = (float(chain[name]) for name in ("latitude", "longitude"))
        parts.append(f"{style.latitude_label(latitude)} {style.longitude_label(longitude)}")
    return ", ".join([*parts, f"{first} to {last}"])


def _draw_temperature(panel: Axes, scale: Axes, chain: xr.Dataset, bins: Bins, settings: ColumnSettings) -> None:
    flags = chain["temperature_qc"].values
    used = np.isin(flags, [int(flag) for flag in settings.use_flags])
    means = binned_mean(np.where(used, chain["temperature"].values, np.nan).astype(np.float64), bins)
    depth = _depths(chain, bins)
    deepest = style.depth_scale(np.asarray(depth.max()))
    edges = np.linspace(0.0, float(deepest), int(deepest / DEPTH_STEP) + 2)
    levels = style.scaled_depth(0.5 * (edges[1:] + edges[:-1])).astype(np.float64)
    low, high = style.round_limits(means)
    mesh = panel.pcolormesh(
        bins.edges,
        style.scaled_depth(edges),
        np.ma.masked_invalid(fill_depths(means, depth, levels)),
        cmap=style.TEMPERATURE,
        vmin=low,
        vmax=high,
    )
    panel.set_facecolor(style.MISSING)
    if not np.isfinite(means).any():
        panel.text(0.5, 0.5, "no value could be used", transform=panel.transAxes, ha="center", fontsize=14)
        scale.remove()
        return
    panel.figure.colorbar(mesh, cax=scale, extend="both").set_label("temperature (°C)", fontsize=9)
    scale.tick_params(labelsize=9)


def _depths(chain: xr.Dataset, bins: Bins) -> Floats:
    """Return where the sensors were, m, (bin or 1, sensor): the nominal depth where it is not known."""
    nominal = chain["depth"].values.astype(np.float64)[None]
    if "sensor_depth" not in chain:
        return nominal
    measured = binned_mean(chain["sensor_depth"].values.astype(np.float64), bins)
    return np.maximum.accumulate(np.where(np.isfinite(measured), measured, nominal), axis=1)


def _draw_columns(panel: Axes, columns: xr.Dataset, bins: Bins, settings: ColumnSettings) -> list[Any]:
    names = ("isotherm_depth", "isotherm_depth_error", "mixed_layer_depth")
    depth, error, mixed = (binned_mean(columns[name].values.astype(np.float64), bins) for name in names)
    half = style.HALF_WIDTH_95 * error
    panel.fill_between(bins.middle, depth - half, depth + half, color="white", alpha=0.55, linewidth=0)
    band = Patch(facecolor="white", edgecolor=style.INK, linewidth=0.5, label="its 95 % interval")
    (layer,) = panel.plot(bins.middle, mixed, color=style.BLUE, linewidth=0.9, label="mixed layer depth")
    (line,) = panel.plot(
        bins.middle, depth, color=style.BLACK, linewidth=1.1, label=f"{settings.isotherm:g} °C isotherm"
    )
    for series, colour in ((mixed, style.BLUE), (depth, style.BLACK)):
        alone = _alone(series)
        panel.plot(bins.middle[alone], series[alone], ".", color=colour, markersize=2.5)
    return [line, band, layer, *_draw_outcrops(panel, columns)]


def _alone(series: Floats) -> NDArray[np.bool_]:
    """Tell which values have no neighbour, so that no line would show them."""
    finite = np.isfinite(series)
    beside = np.zeros_like(finite)
    beside[1:] |= finite[:-1]
    beside[:-1] |= finite[1:]
    return finite & ~beside


def _draw_outcrops(panel: Axes, columns: xr.Dataset) -> list[Any]:
    time = columns["time"].values
    outcropped = columns["isotherm_status"].values == IsothermStatus.OUTCROPPED
    if not outcropped.any():
        return []
    places = _thinned(time, outcropped[:, None])[0]
    return panel.plot(
        time[places],
        np.zeros(places.size),
        "^",
        color=style.ORANGE,
        markeredgecolor=style.BLACK,
        markersize=7,
        clip_on=False,
        linestyle="none",
        label="isotherm outcropped",
    )


def _draw_flags(panel: Axes, chain: xr.Dataset) -> list[Any]:
    time, depth, flags = chain["time"].values, chain["depth"].values, chain["temperature_qc"].values
    handles: list[Any] = []
    for flag, look in _FLAG_MARKS.items():
        if not (flags == flag).any():
            continue
        places, sensors = _thinned(time, flags == flag)
        handles += panel.plot(
            time[places],
            depth[sensors],
            linestyle="none",
            markersize=5.5,
            markeredgecolor=style.BLACK,
            markeredgewidth=0.6,
            clip_on=False,
            **look,  # type: ignore[arg-type]
        )
    return handles


def _thinned(time: NDArray[np.datetime64], marked: NDArray[np.bool_]) -> tuple[Integers, Integers]:
    """Return the (time, sensor) places of ``marked``, the first of each stretch of the time axis."""
    stretch = time_bins(time, MARK_COLUMNS).index
    places, sensors = np.nonzero(marked)
    _, first = np.unique(stretch[places] * marked.shape[1] + sensors, return_index=True)
    return places[first], sensors[first]


def _draw_sensors(panel: Axes, chain: xr.Dataset) -> Line2D:
    depth = chain["depth"].values
    side = panel.get_yaxis_transform()
    (ticks,) = panel.plot(
        np.full(depth.size, 1.006),
        depth,
        "<",
        color=style.INK,
        markersize=4,
        transform=side,
        clip_on=False,
        label="sensor",
    )
    return ticks


def _draw_status(strip: Axes, columns: xr.Dataset, bins: Bins) -> list[Patch]:
    status = commonest(columns["isotherm_status"].values.astype(np.int64), bins)
    colours = ListedColormap([style.MISSING, *(colour for _, colour in STATUSES.values())])
    strip.pcolormesh(bins.edges, [0.0, 1.0], status[None], cmap=colours, vmin=-0.5, vmax=colours.N - 0.5)
    strip.set_yticks([])
    style.time_axis(strip)
    strip.set_xlim(bins.edges[0], bins.edges[-1])
    present = [(name, colour) for kind, (name, colour) in STATUSES.items() if (status == kind).any()]
    if (status == _NO_PROFILE).any():
        present.append(("no profile", style.MISSING))
    return [Patch(facecolor=colour, edgecolor=style.INK, linewidth=0.5, label=name) for name, colour in present]
