"""Isotherm depth with status and bracket against the floor, against a Python loop, and at twice the size."""

from __future__ import annotations

import argparse

import numpy as np
import xarray as xr
from measure import once, seconds, show

from profiles import isotherm_depth

DEPTH = np.array([1, 10, 40, 70, 100, 120, 140, 160, 180, 200, 220, 260, 300, 500], dtype=np.float32)
MISSING = 0.05  # share of values
LOOPED = 20_000  # profiles that the loop is timed on


def made_profiles(count: int) -> np.ndarray:
    """Return profiles (profile, sensor), °C: a thermocline at 80 to 220 m, noise, missing values."""
    random = np.random.default_rng(1)
    centre = random.uniform(80.0, 220.0, (count, 1)).astype(np.float32)
    values = 20.0 - 9.0 * np.tanh((DEPTH - centre) / np.float32(60.0))
    values += random.standard_normal(values.shape, dtype=np.float32) * np.float32(0.05)
    values[random.random(values.shape, dtype=np.float32) < MISSING] = np.nan
    return values.astype(np.float32)


def looped(values: np.ndarray) -> np.ndarray:
    """Do what a scientist would write without the tool: a loop over profiles with numpy.interp."""
    depths = np.full(len(values), np.nan)
    for place, profile in enumerate(values):
        good = np.isfinite(profile)
        if good.sum() > 1:
            depths[place] = np.interp(-20.0, -profile[good], DEPTH[good], left=np.nan, right=np.nan)
    return depths


def tool(values: np.ndarray) -> float:
    """Return the tool's seconds."""
    chain = xr.DataArray(values, dims=("time", "depth"), coords={"depth": DEPTH})
    return seconds(lambda: isotherm_depth(chain, max_bracket=75.0))


def main() -> None:
    """Time and print."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--profiles", type=int, default=4_000_000)
    count = parser.parse_args().profiles
    values = made_profiles(count)
    buffer = values.copy()
    floor = seconds(lambda: np.copyto(buffer, values))
    ours = tool(values)
    loop = once(lambda: looped(values[:LOOPED])) * count / LOOPED
    twice = tool(made_profiles(2 * count))
    show(
        f"Isotherm depth, {count} profiles of {DEPTH.size} sensors, {MISSING:.0%} missing, float32",
        ["", "seconds", "ratio", "aim"],
        [
            ["numpy.copyto into a touched buffer", floor, "", ""],
            ["isotherm_depth, over the floor", ours, ours / floor, "at most 8"],
            [
                f"Python loop with numpy.interp ({LOOPED} profiles scaled up), over ours",
                loop,
                loop / ours,
                "at least 80",
            ],
            ["isotherm_depth of twice as many, over ours", twice, twice / ours, "about 2"],
        ],
    )


if __name__ == "__main__":
    main()
