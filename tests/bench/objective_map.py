"""The objective map against one matrix solve per time step, and at twice the size."""

from __future__ import annotations

import argparse

import numpy as np
from measure import seconds, show

from profiles import objective_map
from profiles.drill.array import SITES, positions

SIGNAL_SD, NOISE_SD, LENGTH_LONGITUDE, LENGTH_LATITUDE = 12.0, 4.0, 15.0, 3.0
GRID_LATITUDE, GRID_LONGITUDE = np.arange(-4.5, 5.0), np.arange(120.5, 280.0)
LATITUDE, LONGITUDE = positions(SITES)


def made_values(months: int, *, gaps: bool) -> np.ndarray:
    """Return anomalies (time, site), m; with gaps, each mooring is silent for a year at a time of its own."""
    random = np.random.default_rng(2)
    values = random.normal(0.0, SIGNAL_SD, (months, LATITUDE.size))
    if gaps:
        for site, start in enumerate(random.integers(0, months - 12, LATITUDE.size)):
            values[start : start + 12, site] = np.nan
    return values


def correlation(latitude: np.ndarray, longitude: np.ndarray) -> np.ndarray:
    """Return the signal's correlation between the sites and points, (site, point)."""
    east = (LONGITUDE[:, None] - longitude) / LENGTH_LONGITUDE
    north = (LATITUDE[:, None] - latitude) / LENGTH_LATITUDE
    return np.exp(-(east**2) - north**2)


def solved_each_time(values: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Do what a scientist would write without the tool: one matrix solve per time step."""
    latitude, longitude = (grid.ravel() for grid in np.meshgrid(GRID_LATITUDE, GRID_LONGITUDE, indexing="ij"))
    among = SIGNAL_SD**2 * correlation(LATITUDE, LONGITUDE) + NOISE_SD**2 * np.eye(LATITUDE.size)
    towards = SIGNAL_SD**2 * correlation(latitude, longitude)
    mean, error = np.empty((2, len(values), latitude.size))
    for time, row in enumerate(values):
        good = np.isfinite(row)
        weights = np.linalg.solve(among[np.ix_(good, good)], towards[good])
        mean[time] = row[good] @ weights
        error[time] = np.sqrt(SIGNAL_SD**2 - (towards[good] * weights).sum(axis=0))
    return mean, error


def mapped(values: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Map with the tool."""
    field = objective_map(
        values,
        LATITUDE,
        LONGITUDE,
        GRID_LATITUDE,
        GRID_LONGITUDE,
        signal_sd=SIGNAL_SD,
        noise_sd=NOISE_SD,
        length_longitude=LENGTH_LONGITUDE,
        length_latitude=LENGTH_LATITUDE,
    )
    return tuple(field[name].values.reshape(len(values), -1) for name in ("mean", "error"))


def main() -> None:
    """Time, compare and print."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--months", type=int, default=480)
    months = parser.parse_args().months
    rows = []
    for name, gaps in (("no gaps", False), ("a year's gap at each mooring", True)):
        values = made_values(months, gaps=gaps)
        for ours, plain in zip(mapped(values), solved_each_time(values), strict=True):
            np.testing.assert_allclose(ours, plain, rtol=0, atol=1e-6)
        taken, naive = (
            seconds(lambda values=values: mapped(values)),
            seconds(lambda values=values: solved_each_time(values)),
        )
        double = made_values(2 * months, gaps=gaps)
        twice = seconds(lambda double=double: mapped(double))
        rows.append([name, taken, naive, naive / taken, twice / taken])
    show(
        f"Objective map, {months} months, {LATITUDE.size} moorings, {GRID_LATITUDE.size * GRID_LONGITUDE.size} points",
        ["", "seconds", "a solve per month", "that over ours", "twice the months over ours"],
        rows,
    )


if __name__ == "__main__":
    main()
