"""The array: where it is and what it returned, the section, time against longitude, tilt and volume."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import xarray as xr
from matplotlib.axes import Axes
from matplotlib.cm import ScalarMappable
from matplotlib.collections import PolyCollection
from matplotlib.colors import Normalize
from matplotlib.figure import Figure
from matplotlib.patches import Rectangle
from numpy.typing import NDArray

from profiles.atlas import relief
from profiles.report import style
from profiles.report.summary import VOLUME_UNIT, mooring_return, tilt_window, window_label
from profiles.section.grid import BAND, BOX_LATITUDE, REGIONS, cell_edges
from profiles.section.tilt import TILT_WINDOW

Floats = NDArray[np.float64]

ON_EQUATOR = 0.5  # degrees; a mooring no further off is one of the equator's
LATEST = 12  # months that stand for the present in the section
WEAK_SHARE = 0.7  # of the signal's standard deviation; where the error is larger the array says little (ours)
_VOLUME_UNIT_LABEL = "10$^{14}$ m$^{3}$"

_REGION_LOOKS = {
    "total": (style.BLACK, "-", "whole"),
    "west": (style.VERMILION, "--", "west of 155°W"),
    "east": (style.BLUE, "-.", "east of 155°W"),
}


@style.styled
def site_map(monthly: xr.Dataset, data_return: pd.DataFrame, window: tuple[float, float] = TILT_WINDOW) -> Figure:
    """Draw where the moorings are and how much of their record could be used.

    Parameters
    ----------
    monthly : xarray.Dataset
        With ``latitude`` and ``longitude`` (mooring).
    data_return : pandas.DataFrame
        As :func:`profiles.qc.data_return` returns it, all moorings below one another.
    window : tuple of float
        Degrees east, ends of the tilt's line.
    """
    figure = Figure(figsize=(style.WIDTH, 3.4))
    axis = figure.add_axes((0.06, 0.17, 0.86, 0.71))
    _draw_land(axis)
    _draw_box(axis, window)
    share = mooring_return(data_return).reindex(monthly["mooring"].values.astype(str)).to_numpy(dtype=np.float64)
    latitude, longitude = monthly["latitude"].values, monthly["longitude"].values
    norm, known = Normalize(0.0, 1.0), np.isfinite(share)
    look: dict[str, Any] = {"s": 62, "edgecolors": style.INK, "zorder": 4}
    axis.scatter(longitude[known], latitude[known], c=share[known], norm=norm, cmap=style.RETURN, **look)
    for place in zip(longitude[known], latitude[known], share[known], strict=True):
        axis.annotate(
            f"{100 * place[2]:.0f}", place[:2], (0, 7), textcoords="offset points", ha="center", fontsize=8, zorder=5
        )
    if not known.all():
        label = "series from elsewhere, no data return known"
        axis.scatter(longitude[~known], latitude[~known], color="white", marker="s", label=label, **look)
        axis.legend(loc="upper right")
    bar = figure.colorbar(ScalarMappable(norm, style.RETURN), cax=figure.add_axes((0.94, 0.17, 0.012, 0.71)))
    bar.set_label("data return (share)")
    axis.set_title("Where the array is, and the share of its values that could be used (numbers: %)")
    return figure


def _draw_land(axis: Axes) -> None:
    elevation = relief().sel(latitude=slice(-8.0, 8.0), longitude=slice(118.0, 284.0))
    axis.contourf(
        elevation["longitude"], elevation["latitude"], elevation.values, levels=[0.0, 1e5], colors=[style.LAND]
    )
    axis.set_facecolor("#eef3f6")
    style.longitude_axis(axis, 118.0, 284.0)
    axis.set_ylim(-8.0, 8.0)
    axis.yaxis.set_major_formatter(lambda latitude, _: style.latitude_label(latitude))
    axis.set_yticks([-5.0, 0.0, 5.0])
    axis.set_ylabel("latitude")


def _draw_box(axis: Axes, window: tuple[float, float]) -> None:
    west, east = REGIONS["total"]
    south, north = BOX_LATITUDE
    axis.add_patch(Rectangle((west, south), east - west, north - south, fill=False, edgecolor=style.INK))
    axis.plot([REGIONS["west"][1]] * 2, [south, north], "--", color=style.INK, linewidth=1.0)
    axis.add_patch(
        Rectangle((window[0], BAND[0]), window[1] - window[0], BAND[1] - BAND[0], facecolor=style.SKY, alpha=0.25)
    )
    words = f"Outlined: the volume, in halves meeting at 155°W.  Blue: the tilt, {window_label(window)}, 2.5°S-2.5°N."
    axis.text(east, south - 0.4, words, ha="right", va="top", fontsize=9)


@style.styled
def equatorial_section(section: xr.Dataset, monthly: xr.Dataset, *, isotherm: float = 20.0) -> Figure:
    """Draw the mean depth of the isotherm along the equator, of the record and of its last twelve months.

    Parameters
    ----------
    section : xarray.Dataset
        As :func:`profiles.section.build_section` returns it.
    monthly : xarray.Dataset
        The monthly means that it was made from.
    isotherm : float
        °C.
    """
    figure, axis = _panel((style.WIDTH, 4.4))
    longitude = section["longitude"].values
    months = section.sizes["time"]
    spans = {f"whole record, {_months(months)}": (slice(None), style.BLACK, "o")}
    if months > LATEST:
        spans[f"last {LATEST} months"] = (slice(-LATEST, None), style.VERMILION, "D")
    equator = np.abs(monthly["latitude"].values) <= ON_EQUATOR
    for name, (span, colour, marker) in spans.items():
        part = section.isel(time=span)
        depth = part["equatorial_isotherm_depth"].mean("time").values
        half = style.HALF_WIDTH_95 * part["equatorial_isotherm_depth_error"].mean("time").values
        line_with_band(axis, longitude, depth, half, color=colour, label=name)
        own = monthly["isotherm_depth"].isel(time=span, mooring=equator).mean("time").values
        axis.plot(
            monthly["longitude"].values[equator],
            own,
            marker,
            color=colour,
            markerfacecolor="white",
            markersize=6,
            linestyle="none",
            label=f"moorings at 0°, {name.split(',')[0]}",
        )
    _draw_window(axis, section)
    style.longitude_axis(axis, *REGIONS["total"])
    axis.set_ylim(0.0, None)
    style.depth_axis(axis, f"depth of the {isotherm:g} °C isotherm (m)")
    axis.set_title(f"The {isotherm:g} °C isotherm along the equator, mean of 2.5°S-2.5°N, with 95 % intervals")
    axis.legend(loc="center left", bbox_to_anchor=(1.01, 0.5))
    return figure


def _months(count: int) -> str:
    return f"{count} month{'s' if count > 1 else ''}"


def _draw_window(axis: Axes, section: xr.Dataset) -> None:
    west, east = tilt_window(section)
    across = axis.get_xaxis_transform()
    axis.plot([west, east], [0.04, 0.04], "|-", color=style.INK, linewidth=1.0, markersize=9, transform=across)
    words = f"tilt: line from {window_label((west, east))}"
    axis.text(0.5 * (west + east), 0.06, words, transform=across, ha="center", va="bottom", fontsize=9)


@style.styled
def time_longitude(section: xr.Dataset, *, isotherm: float = 20.0) -> Figure:
    """Draw the depth of the isotherm along the equator against time."""
    depth = section["equatorial_isotherm_depth"]
    low, high = style.round_limits(depth.values)
    figure, axis = _over_time(
        section, depth.values, style.DEPTH, (low, high), f"depth of the {isotherm:g} °C isotherm (m)"
    )
    axis.figure.axes[1].invert_yaxis()
    axis.set_title(f"Depth of the {isotherm:g} °C isotherm, 2.5°S-2.5°N", pad=14)
    return figure


@style.styled
def time_longitude_anomaly(section: xr.Dataset, *, isotherm: float = 20.0) -> Figure:
    """Draw the anomaly of the isotherm's depth along the equator against time, hatched where the error is large."""
    anomaly = section["equatorial_isotherm_depth_anomaly"].values
    reach = max(abs(limit) for limit in style.round_limits(anomaly))
    figure, axis = _over_time(
        section, anomaly, style.ANOMALY, (-reach, reach), "anomaly (m), positive: deeper than usual"
    )
    weak = section["equatorial_isotherm_depth_anomaly_error"].values > WEAK_SHARE * section.attrs["signal_sd"]
    hatch(axis, weak, time_edges(section), cell_edges(section["longitude"].values, "longitude"))
    axis.set_title(f"Anomaly of the {isotherm:g} °C isotherm's depth, 2.5°S-2.5°N", pad=14)
    return figure


def _over_time(
    section: xr.Dataset, values: Floats, colours: Any, limits: tuple[float, float], label: str
) -> tuple[Figure, Axes]:
    figure = Figure(figsize=(style.HALF_WIDTH, 6.4))
    axis = figure.add_axes((0.15, 0.09, 0.655, 0.82))
    mesh = axis.pcolormesh(
        cell_edges(section["longitude"].values, "longitude"),
        time_edges(section),
        np.ma.masked_invalid(values),
        cmap=colours,
        vmin=limits[0],
        vmax=limits[1],
    )
    axis.set_facecolor(style.MISSING)
    style.longitude_axis(axis, *REGIONS["total"])
    style.time_axis(axis, vertical=True)
    style.mark_longitudes(axis, section["site_longitude"].values)
    figure.colorbar(mesh, cax=figure.add_axes((0.83, 0.2, 0.022, 0.6)), extend="both").set_label(label)
    return figure, axis


def time_edges(dataset: xr.Dataset) -> NDArray[np.datetime64]:
    """Return the first of each month, and of the one after the last."""
    months = dataset["time"].values.astype("datetime64[M]")
    return np.append(months, months[-1] + 1).astype("datetime64[ns]")


def hatch(axis: Axes, where: NDArray[np.bool_], rows: NDArray[np.datetime64], columns: Floats) -> None:
    """Hatch the cells of ``where``, one rectangle for each run of cells in a row."""
    places = axis.convert_yunits(rows)  # type: ignore[no-untyped-call]
    rectangles = []
    for row, cells in enumerate(where):
        edges = np.flatnonzero(np.diff(cells, prepend=False, append=False))
        for west, east in columns[edges].reshape(-1, 2):
            low, high = places[row], places[row + 1]
            rectangles.append([(west, low), (east, low), (east, high), (west, high)])
    axis.add_collection(
        PolyCollection(rectangles, facecolors="none", edgecolors=style.LACKING, linewidths=0.0, hatch="////"),
        autolim=False,
    )


@style.styled
def tilt_and_anomaly(section: xr.Dataset) -> Figure:
    """Draw the tilt of the thermocline and its anomaly with their 95 % intervals."""
    figure, (above, below) = _two_panels(section, right=0.98)
    for axis, name in ((above, "thermocline_slope"), (below, "thermocline_slope_anomaly")):
        half = style.HALF_WIDTH_95 * section[f"{name}_error"].values
        line_with_band(axis, section["time"].values, section[name].values, half, color=style.BLACK)
    below.axhline(0.0, color=style.LACKING, linewidth=0.8)
    above.set_ylabel("tilt\n(m per 1000 km)")
    below.set_ylabel("anomaly\n(m per 1000 km)")
    above.set_title(
        f"Tilt of the thermocline, {window_label(tilt_window(section))}, with 95 % intervals; more negative: steeper"
    )
    return figure


@style.styled
def volume_and_anomaly(volume: xr.Dataset) -> Figure:
    """Draw the volume of warm water and its anomaly, whole, west and east, with their 95 % intervals."""
    figure, (above, below) = _two_panels(volume, right=0.84)
    for region, (colour, dashes, name) in _REGION_LOOKS.items():
        part = volume.sel(region=region)
        for axis, quantity in ((above, "warm_water_volume"), (below, "warm_water_volume_anomaly")):
            values, half = (part[quantity + suffix].values / VOLUME_UNIT for suffix in ("", "_error"))
            line_with_band(
                axis,
                part["time"].values,
                values,
                style.HALF_WIDTH_95 * half,
                color=colour,
                linestyle=dashes,
                label=name,
            )
    below.axhline(0.0, color=style.LACKING, linewidth=0.8)
    above.set_ylim(0.0, None)
    above.set_ylabel(f"volume\n({_VOLUME_UNIT_LABEL})")
    below.set_ylabel(f"anomaly\n({_VOLUME_UNIT_LABEL})")
    above.set_title("Volume of warm water, 5°S-5°N, 120°E-80°W, with 95 % intervals")
    above.legend(loc="center left", bbox_to_anchor=(1.01, 0.5))
    return figure


@style.styled
def return_by_depth(data_return: pd.DataFrame) -> Figure:
    """Draw the share of usable values of every sensor, a column of bars for each mooring."""
    figure = Figure(figsize=(style.WIDTH, 5.0))
    axis = figure.add_axes((0.07, 0.15, 0.84, 0.76))
    norm = Normalize(0.0, 1.0)
    moorings = data_return["mooring"].drop_duplicates().tolist()
    if not moorings:
        axis.text(0.5, 0.5, "no mooring has a chain", transform=axis.transAxes, ha="center", fontsize=14)
        axis.set_axis_off()
        return figure
    for place, mooring in enumerate(moorings):
        sensors = data_return[data_return["mooring"] == mooring].sort_values("depth")
        edges = _sensor_edges(sensors["depth"].to_numpy(dtype=np.float64))
        colours = style.RETURN(norm(sensors["return_share"].to_numpy(dtype=np.float64)))
        axis.bar(place, np.diff(edges), 0.86, edges[:-1], color=colours, edgecolor="white", linewidth=0.6)
        axis.plot(np.full(len(sensors), place), sensors["depth"], ".", color=style.INK, markersize=2.0)
    style.chain_depth_axis(axis, float(data_return["depth"].max()) * 1.06)
    axis.set_xlim(-0.6, len(moorings) - 0.4)
    axis.set_xticks(range(len(moorings)), [style.plain(str(name)) for name in moorings], rotation=90, fontsize=8)
    axis.set_xlabel("mooring")
    bar = figure.colorbar(ScalarMappable(norm, style.RETURN), cax=figure.add_axes((0.93, 0.2, 0.012, 0.6)))
    bar.set_label("data return (share)")
    axis.set_title("Share of the expected values that could be used, by mooring and sensor (dots)")
    return figure


def _sensor_edges(depth: Floats) -> Floats:
    """Return the borders half-way between sensors, from the surface to a little below the last."""
    return np.concatenate([[0.0], 0.5 * (depth[1:] + depth[:-1]), [depth[-1] * 1.05]])


def _panel(size: tuple[float, float]) -> tuple[Figure, Axes]:
    figure = Figure(figsize=size)
    return figure, figure.add_axes((0.065, 0.13, 0.645, 0.77))


def _two_panels(dataset: xr.Dataset, *, right: float) -> tuple[Figure, tuple[Axes, Axes]]:
    figure = Figure(figsize=(style.WIDTH, 5.0))
    above = figure.add_axes((0.085, 0.52, right - 0.085, 0.40))
    below = figure.add_axes((0.085, 0.11, right - 0.085, 0.36), sharex=above)
    above.tick_params(labelbottom=False)
    style.time_axis(below)
    below.set_xlim(*time_edges(dataset)[[0, -1]])
    return figure, (above, below)


def line_with_band(axis: Axes, across: NDArray[Any], values: Floats, half_width: Floats, **look: Any) -> None:
    """Draw a line in its 95 % band; a single value as a point with its error bar."""
    if values.size == 1:
        axis.errorbar(across, values, yerr=half_width, fmt="o", capsize=4, color=look["color"], label=look.get("label"))
        return
    axis.fill_between(
        across, values - half_width, values + half_width, color=look["color"], alpha=style.BAND_OPACITY, linewidth=0
    )
    axis.plot(across, values, linewidth=1.6, **look)


def write_array_figures(
    folder: Path,
    *,
    monthly: xr.Dataset,
    data_return: pd.DataFrame,
    section: xr.Dataset,
    volume: xr.Dataset,
    isotherm: float = 20.0,
) -> dict[str, Path]:
    """Draw all figures of the array into PNG files.

    Parameters
    ----------
    folder : Path
        Where the files go; it must exist.
    monthly : xarray.Dataset
        Monthly means on (mooring, time), as :func:`profiles.section.join_moorings` returns them.
    data_return : pandas.DataFrame
        As :func:`profiles.qc.data_return` returns it, all moorings below one another.
    section, volume : xarray.Dataset
        As :func:`profiles.section.build_section` returns them.
    isotherm : float
        °C, what the depths are of.

    Returns
    -------
    dict
        The files by the name of the figure, in the order in which a report shows them.
    """
    figures: dict[str, Callable[[], Figure]] = {
        "map": lambda: site_map(monthly, data_return, tilt_window(section)),
        "volume": lambda: volume_and_anomaly(volume),
        "tilt": lambda: tilt_and_anomaly(section),
        "section": lambda: equatorial_section(section, monthly, isotherm=isotherm),
        "time_longitude": lambda: time_longitude(section, isotherm=isotherm),
        "time_longitude_anomaly": lambda: time_longitude_anomaly(section, isotherm=isotherm),
        "data_return": lambda: return_by_depth(data_return),
    }
    return {name: style.save(draw(), folder / f"{name}.png") for name, draw in figures.items()}
