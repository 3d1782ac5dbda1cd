"""A page of figures of one simulated year, for the eye of an oceanographer.

python tests/bench/ocean_year.py PAGE.png [--seed 11] [--year 2034]
"""

from __future__ import annotations

import argparse
from pathlib import Path

import cmocean
import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure

from profiles.drill.ocean import Ocean

LONGITUDE = np.arange(125.0, 280.0, 1.5)  # degrees east
LATITUDE = np.arange(-5.0, 5.1, 0.5)  # degrees north
DEPTH = np.arange(0.0, 301.0, 4.0)  # m
MOORED = 227.0  # degrees east, the site of the columns
WEST, EAST = 165.0, 250.0  # degrees east, the sites of the profiles


def daily(first: str, last: str) -> np.ndarray:
    """Return the middle of each day, UTC."""
    return np.arange(first, last, dtype="datetime64[D]").astype("datetime64[ns]") + np.timedelta64(12, "h")


def depth_axis(axis: Axes) -> None:
    """Turn depth downwards and name it."""
    axis.invert_yaxis()
    axis.set_ylabel("depth (m)")


def along_the_equator(axis: Axes, ocean: Ocean) -> None:
    """Draw the isotherm's depth over longitude and time."""
    depth = ocean.isotherm_depth(np.zeros_like(LONGITUDE), LONGITUDE)
    drawn = axis.pcolormesh(LONGITUDE, ocean.time, depth.T, cmap=cmocean.cm.deep, shading="nearest")
    axis.figure.colorbar(drawn, ax=axis, label="20 °C isotherm (m)")
    axis.set(title="Isotherm depth along the equator", xlabel="longitude (°E)")


def anomaly_along_the_equator(axis: Axes, ocean: Ocean) -> None:
    """Draw the departure from the year's mean over longitude and time."""
    depth = ocean.isotherm_depth(np.zeros_like(LONGITUDE), LONGITUDE)
    departure = depth - depth.mean(axis=1, keepdims=True)
    limit = float(np.quantile(np.abs(departure), 0.99))
    drawn = axis.pcolormesh(
        LONGITUDE, ocean.time, departure.T, cmap=cmocean.cm.balance, vmin=-limit, vmax=limit, shading="nearest"
    )
    axis.figure.colorbar(drawn, ax=axis, label="departure (m)")
    axis.set(title="Its departure from the year's mean", xlabel="longitude (°E)")


def section(axis: Axes, ocean: Ocean, day: int) -> None:
    """Draw temperature over longitude and depth on one day."""
    columns = ocean.columns(np.zeros_like(LONGITUDE), LONGITUDE)
    temperature = np.array([columns.temperature(place, DEPTH)[day] for place in range(LONGITUDE.size)])
    drawn = axis.pcolormesh(LONGITUDE, DEPTH, temperature.T, cmap=cmocean.cm.thermal, shading="nearest")
    axis.contour(LONGITUDE, DEPTH, temperature.T, levels=[20.0], colors="white", linewidths=1.2)
    axis.figure.colorbar(drawn, ax=axis, label="temperature (°C)")
    axis.set(title=f"Temperature on the equator, {str(ocean.time[day])[:10]}", xlabel="longitude (°E)")
    depth_axis(axis)


def chart(axis: Axes, ocean: Ocean, day: int) -> None:
    """Draw the isotherm's depth over the box on one day of the cold season."""
    latitude, longitude = (grid.ravel() for grid in np.meshgrid(LATITUDE, LONGITUDE, indexing="ij"))
    depth = ocean.isotherm_depth(latitude, longitude)[:, day].reshape(LATITUDE.size, LONGITUDE.size)
    drawn = axis.pcolormesh(LONGITUDE, LATITUDE, depth, cmap=cmocean.cm.deep, shading="nearest")
    axis.figure.colorbar(drawn, ax=axis, label="20 °C isotherm (m)")
    axis.set(title="The same over the box", xlabel="longitude (°E)", ylabel="latitude (°N)")


def one_site(axis: Axes, ocean: Ocean) -> None:
    """Draw daily temperature over depth and time at one site."""
    columns = ocean.columns([0.0], [MOORED], small_scales=True)
    temperature = columns.temperature(0, DEPTH)
    drawn = axis.pcolormesh(ocean.time, DEPTH, temperature.T, cmap=cmocean.cm.thermal, shading="nearest")
    axis.plot(ocean.time, columns.isotherm_depth()[0], color="white", linewidth=0.8)
    axis.figure.colorbar(drawn, ax=axis, label="temperature (°C)")
    axis.set_title(f"Daily means at 0°N {MOORED:g}°E")
    depth_axis(axis)


def ten_days(axis: Axes, ocean: Ocean) -> None:
    """Draw ten-minute temperature over depth and time at one site."""
    columns = ocean.columns([0.0], [MOORED], small_scales=True)
    temperature = columns.temperature(0, DEPTH)
    drawn = axis.pcolormesh(ocean.time, DEPTH, temperature.T, cmap=cmocean.cm.thermal, shading="nearest")
    axis.figure.colorbar(drawn, ax=axis, label="temperature (°C)")
    axis.set_title("Ten days of 10-minute values there")
    axis.tick_params(axis="x", rotation=30)
    depth_axis(axis)


def profiles(axis: Axes, ocean: Ocean) -> None:
    """Draw a few profiles in the west and in the east."""
    for longitude, colour in ((WEST, "#d55e00"), (EAST, "#0072b2")):
        temperature = ocean.columns([0.0], [longitude], small_scales=True).temperature(0, DEPTH)
        for number, day in enumerate(range(15, ocean.time.size, 60)):
            label = f"{longitude:g}°E, every 60 days" if number == 0 else None
            axis.plot(temperature[day], DEPTH, color=colour, linewidth=0.9, label=label)
    axis.set(title="Profiles on the equator", xlabel="temperature (°C)")
    axis.legend(frameon=False)
    depth_axis(axis)


def surface(axis: Axes, ocean: Ocean) -> None:
    """Draw the surface temperature over longitude and time."""
    temperature = ocean.surface_temperature(np.zeros_like(LONGITUDE), LONGITUDE)
    drawn = axis.pcolormesh(LONGITUDE, ocean.time, temperature.T, cmap=cmocean.cm.thermal, shading="nearest")
    axis.figure.colorbar(drawn, ax=axis, label="surface temperature (°C)")
    axis.set(title="Surface temperature along the equator", xlabel="longitude (°E)")


def page(seed: int, year: int) -> Figure:
    """Return the page of one year of one ocean."""
    ocean = Ocean.simulate(daily(f"{year}-01-01", f"{year + 1}-01-01"), seed)
    fast = np.arange(f"{year}-05-01", f"{year}-05-11", np.timedelta64(10, "m"), dtype="datetime64[m]")
    quick = Ocean.simulate(fast.astype("datetime64[ns]"), seed)
    figure = Figure(figsize=(15.0, 17.0), dpi=80, layout="constrained")
    panels = figure.subplots(4, 2)
    along_the_equator(panels[0, 0], ocean)
    anomaly_along_the_equator(panels[0, 1], ocean)
    surface(panels[1, 0], ocean)
    section(panels[1, 1], ocean, day=290)
    chart(panels[2, 0], ocean, day=290)
    profiles(panels[2, 1], ocean)
    one_site(panels[3, 0], ocean)
    ten_days(panels[3, 1], quick)
    figure.suptitle(f"One year of a simulated ocean: seed {seed}, {year}")
    return figure


def main() -> None:
    """Draw the page into a file."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("page", type=Path)
    parser.add_argument("--seed", type=int, default=11)
    parser.add_argument("--year", type=int, default=2034)
    chosen = parser.parse_args()
    page(chosen.seed, chosen.year).savefig(chosen.page)


if __name__ == "__main__":
    main()
