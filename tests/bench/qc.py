"""All tests of the quality control against a centred moving median over the same array, and at twice the size."""

from __future__ import annotations

import argparse

import numpy as np
import pandas as pd
import xarray as xr
from measure import seconds, show

from profiles import quality_control
from profiles.drill.array import CHAINS

DEPTH = np.array(CHAINS[188.0], dtype=np.float32)
WINDOW = 145  # samples of the median, a day of 10-minute values


def made_chain(samples: int) -> xr.Dataset:
    """Return a chain of 10-minute values: a thermocline that a tide and a season move, noise, missing values."""
    random = np.random.default_rng(3)
    time = np.datetime64("2031-01-01", "ns") + np.arange(samples) * np.timedelta64(10, "m")
    days = np.arange(samples)[:, None] / 144.0
    depth = 140.0 + 10.0 * np.sin(2.0 * np.pi * days / 0.5175) + 20.0 * np.sin(2.0 * np.pi * days / 365.25)
    values = 18.5 - 9.5 * np.tanh((DEPTH - depth) / 70.0) + random.normal(0.0, 0.02, (samples, DEPTH.size))
    values[random.random(values.shape) < 0.02] = np.nan
    return xr.Dataset(
        {"temperature": (("time", "depth"), values.astype(np.float32))},
        coords={"time": time, "depth": DEPTH, "mooring": "TB-12", "latitude": 0.0, "longitude": 188.0},
    )


def main() -> None:
    """Time and print."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--samples", type=int, default=52_560)
    samples = parser.parse_args().samples
    chain, double = made_chain(samples), made_chain(2 * samples)
    table = pd.DataFrame(chain["temperature"].values)
    median = seconds(lambda: table.rolling(WINDOW, center=True, min_periods=1).median(), repeats=3)
    ours = seconds(lambda: quality_control(chain).load(), repeats=3)
    twice = seconds(lambda: quality_control(double).load(), repeats=3)
    show(
        f"Quality control, {samples} samples of {DEPTH.size} sensors, all tests",
        ["", "seconds", "ratio"],
        [
            [f"centred moving median of {WINDOW} samples", median, ""],
            ["quality_control, over the median", ours, ours / median],
            ["quality_control of twice as many, over ours", twice, twice / ours],
        ],
    )


if __name__ == "__main__":
    main()
