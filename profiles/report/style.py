"""How every figure looks: sizes, fonts, colours, axes, and the same bytes each time."""

from __future__ import annotations

import warnings
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from functools import wraps
from pathlib import Path
from typing import Any, ParamSpec, TypeVar

import matplotlib
import numpy as np
from matplotlib.axes import Axes
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.colors import Colormap
from matplotlib.dates import AutoDateLocator, ConciseDateFormatter
from matplotlib.figure import Figure
from matplotlib.ticker import FixedLocator, FuncFormatter, MaxNLocator
from matplotlib.transforms import blended_transform_factory
from numpy.typing import NDArray
from PIL import Image

from profiles.store import replacing

with warnings.catch_warnings():
    # cmocean 3 builds its colour maps in a way that matplotlib 3.11 deprecates; there is no newer one.
    warnings.simplefilter("ignore", matplotlib.MatplotlibDeprecationWarning)
    from cmocean import cm

DPI = 100
WIDTH = 11.0  # inches
HALF_WIDTH = 7.0  # inches; two such figures stand side by side on a desk's screen

#: Standard normal quantile of 0.975: half the width of a 95 % interval, in standard errors.
HALF_WIDTH_95 = 1.959964

# Okabe and Ito (2008), "Color Universal Design": eight colours that colour-blind readers tell apart.
BLACK, ORANGE, SKY, GREEN = "#000000", "#E69F00", "#56B4E9", "#009E73"
YELLOW, BLUE, VERMILION, PURPLE = "#F0E442", "#0072B2", "#D55E00", "#CC79A7"

INK = "#1f2933"
MISSING = "#c9ccd1"  # where there is no value
LAND = "#8d8676"
CALM = "#dfe7ee"  # where all is well
LACKING = "#5b6470"
#: Colours with a meaning of their own, which a PNG keeps as they are.
_KEPT = ("#ffffff", BLACK, ORANGE, SKY, GREEN, YELLOW, BLUE, VERMILION, PURPLE, INK, MISSING, LAND, CALM, LACKING)
_PALETTE_SIZE = 256  # of a PNG with one byte per pixel
BAND_OPACITY = 0.22

TEMPERATURE: Colormap = cm.thermal.with_extremes(bad=MISSING)
ANOMALY: Colormap = cm.balance.with_extremes(bad=MISSING)
DEPTH: Colormap = cm.deep.with_extremes(bad=MISSING)
RETURN: Colormap = cm.deep_r.with_extremes(bad=MISSING)

UPPER_OCEAN = 300.0  # m; below, the depth axis is drawn closer
_CLOSER = 0.3  # length of a metre below, of one above
_DEPTH_TICKS = np.array([0, 50, 100, 150, 200, 250, 300, 400, 500, 750, 1000, 1500, 2000], dtype=np.float64)

# By the step of the ticks (years, months, days, hours, minutes, seconds), and of a tick that begins the larger unit.
_DATES = ["%Y", "%b %Y", "%d %b", "%H:%M", "%H:%M", "%S.%f"]
_FIRST_DATES = ["%Y", "%Y", "%b %Y", "%d %b", "%H:%M", "%H:%M"]

_SETTINGS: dict[str, Any] = {
    "font.family": "DejaVu Sans",  # comes with matplotlib
    "font.size": 10.0,
    "axes.titlesize": 12.0,
    "axes.titleweight": "bold",
    "axes.titlelocation": "left",
    "axes.titlepad": 8.0,
    "axes.titley": 1.0,  # where it would stand anyway; looking for the place takes a sixth of the time
    "axes.edgecolor": INK,
    "axes.labelcolor": INK,
    "axes.titlecolor": INK,
    "text.color": INK,
    "xtick.color": INK,
    "ytick.color": INK,
    "axes.spines.top": False,
    "axes.spines.right": False,
    "legend.frameon": False,
    "legend.fontsize": 9.0,
    "hatch.linewidth": 0.6,
    "figure.dpi": DPI,
    "savefig.dpi": DPI,
}

P = ParamSpec("P")
R = TypeVar("R")


@contextmanager
def _own_settings() -> Iterator[None]:
    """Draw by our settings alone, whatever the user's own matplotlib settings are."""
    with matplotlib.rc_context():
        matplotlib.rcdefaults()
        matplotlib.rcParams.update(_SETTINGS)  # type: ignore[arg-type]
        yield


def styled(draw: Callable[P, R]) -> Callable[P, R]:
    """Make a function draw in the style of this page."""

    @wraps(draw)
    def drawn(*arguments: P.args, **settings: P.kwargs) -> R:
        with _own_settings():
            return draw(*arguments, **settings)

    return drawn


def save(figure: Figure, path: Path, *, palette: bool = False) -> Path:
    """Write a figure as PNG, whole or not at all; the same figure gives the same bytes.

    Parameters
    ----------
    figure : matplotlib.figure.Figure
    path : Path
        In a folder that exists.
    palette : bool
        Reduce to 256 colours, for half the size.

    Returns
    -------
    Path
        ``path``.

    Raises
    ------
    MachineError
        Where the file cannot be written.
    """
    with _own_settings():
        canvas = FigureCanvasAgg(figure)
        canvas.draw()  # type: ignore[no-untyped-call]
    pixels = np.asarray(canvas.buffer_rgba())[..., :3]  # type: ignore[no-untyped-call]
    picture = _with_palette(pixels) if palette else Image.fromarray(pixels)
    with replacing(path) as temporary:
        picture.save(temporary, format="PNG", dpi=(DPI, DPI))
    return path


def _with_palette(pixels: NDArray[np.uint8]) -> Image.Image:
    """Reduce (row, column, 3) to a palette, hardly seen as long as the colours with a meaning are kept."""
    free = _PALETTE_SIZE - len(_KEPT)
    reduced = Image.fromarray(pixels).quantize(free, method=Image.Quantize.MEDIANCUT, dither=Image.Dither.NONE)
    index, palette = np.array(reduced), np.zeros((_PALETTE_SIZE, 3), dtype=np.uint8)
    found = np.asarray(reduced.getpalette(), dtype=np.uint8).reshape(-1, 3)[:free]
    palette[: len(found)] = found
    packed = pixels.astype(np.uint32) @ np.array([1 << 16, 1 << 8, 1], dtype=np.uint32)
    for place, colour in enumerate(_KEPT, start=free):
        index[packed == int(colour[1:], 16)] = place
        palette[place] = np.frombuffer(bytes.fromhex(colour[1:]), dtype=np.uint8)
    picture = Image.fromarray(index)
    picture.putpalette(palette.tobytes())
    return picture


def depth_scale(depth: NDArray[np.floating[Any]]) -> NDArray[np.floating[Any]]:
    """Return the place of a depth, m, on the depth axis: below 300 m a metre is drawn 0.3 as long."""
    return np.where(depth <= UPPER_OCEAN, depth, UPPER_OCEAN + _CLOSER * (depth - UPPER_OCEAN))


def scaled_depth(place: NDArray[np.floating[Any]]) -> NDArray[np.floating[Any]]:
    """Return the depth, m, at a place on the depth axis, the inverse of :func:`depth_scale`."""
    return np.where(place <= UPPER_OCEAN, place, UPPER_OCEAN + (place - UPPER_OCEAN) / _CLOSER)


def chain_depth_axis(axis: Axes, deepest: float) -> None:
    """Make the vertical axis one of depth, downward, from the surface to ``deepest`` (m), closer below 300 m."""
    axis.set_yscale("function", functions=(depth_scale, scaled_depth))
    axis.set_ylim(deepest, 0.0)
    axis.yaxis.set_major_locator(FixedLocator(_DEPTH_TICKS[deepest >= _DEPTH_TICKS].tolist()))
    axis.yaxis.set_major_formatter(FuncFormatter(lambda depth, _: f"{depth:g}"))
    axis.set_ylabel("depth (m)" if deepest <= UPPER_OCEAN else f"depth (m), closer below {UPPER_OCEAN:g} m")


def depth_axis(axis: Axes, label: str = "depth (m)") -> None:
    """Turn the vertical axis so that depth increases downward."""
    if not axis.yaxis_inverted():
        axis.invert_yaxis()
    axis.set_ylabel(label)


def longitude_axis(axis: Axes, west: float, east: float) -> None:
    """Make the horizontal axis one of longitude, degrees east, from ``west`` to ``east``."""
    axis.set_xlim(west, east)
    axis.xaxis.set_major_locator(FixedLocator(np.arange(np.ceil(west / 20) * 20, east + 1.0, 20).tolist()))
    axis.xaxis.set_major_formatter(FuncFormatter(lambda longitude, _: longitude_label(longitude)))
    axis.set_xlabel("longitude")


def time_axis(axis: Axes, *, vertical: bool = False) -> None:
    """Make an axis one of dates, UTC."""
    dates = axis.yaxis if vertical else axis.xaxis
    locator = AutoDateLocator(minticks=4, maxticks=9)  # type: ignore[no-untyped-call]
    dates.set_major_locator(locator)
    labels = ConciseDateFormatter(  # type: ignore[no-untyped-call]
        locator, formats=_DATES, zero_formats=_FIRST_DATES, show_offset=False
    )
    dates.set_major_formatter(labels)
    dates.set_label_text("time (UTC)")


def longitude_label(longitude: float) -> str:
    """Return a longitude in degrees east, 0-360, as people write it: 165°E, 95°W."""
    if longitude in (0.0, 180.0):
        return f"{longitude:g}°"
    return f"{longitude:g}°E" if longitude < 180.0 else f"{360.0 - longitude:g}°W"


def latitude_label(latitude: float) -> str:
    """Return a latitude in degrees north as people write it: 2.5°S, 0°."""
    return f"{abs(latitude):g}°" + ("N" if latitude > 0.0 else "S" if latitude < 0.0 else "")


def plain(text: str) -> str:
    """Return text that is drawn as it stands, a dollar sign included, which would begin a formula."""
    return text.replace("$", r"\$")


def round_limits(values: NDArray[np.floating[Any]], *, steps: int = 10) -> tuple[float, float]:
    """Return round numbers about all but the outermost hundredth of ``values``; (0, 1) where there is none."""
    finite = values[np.isfinite(values)]
    if not finite.size:
        return 0.0, 1.0
    low, high = np.percentile(finite, (1.0, 99.0))
    ticks = MaxNLocator(steps).tick_values(float(low), float(high))
    return float(ticks[0]), float(ticks[-1])


def mark_longitudes(axis: Axes, longitudes: NDArray[np.floating[Any]]) -> None:
    """Mark longitudes by triangles along the top of the axes."""
    places = np.unique(np.round(longitudes, 1))
    top = blended_transform_factory(axis.transData, axis.transAxes)
    axis.plot(places, np.ones(places.size), "v", color=INK, markersize=5, transform=top, clip_on=False)
