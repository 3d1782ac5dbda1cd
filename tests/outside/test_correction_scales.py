"""The scales of the climatology's correction against how far apart two published atlases are alike wrong.

Sources: Levitus, S. (1982), Climatological Atlas of the World Ocean, NOAA Professional Paper 13; Levitus, S. and T. P.
Boyer (1994), World Ocean Atlas 1994, Volume 4, NOAA Atlas NESDIS 4. The depth of 20 °C of either is found here with
NumPy on the points that both have in 7S-7N, 125E-82W; what is compared is the mean product of their differences over
all pairs of points so far apart, over the mean square.
"""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import numpy as np
import pytest
import xarray as xr

from profiles.config import ClimatologyPriorSettings
from profiles.section.climatology import correction_scales

REFERENCE = Path(__file__).parents[1] / "reference"


def depth_of_20(profile: np.ndarray, depth: np.ndarray) -> float:
    """Return the depth of 20 °C in a profile that cools downwards past it, linear; NaN on land."""
    crossings = np.flatnonzero((profile[:-1] >= 20.0) & (profile[1:] < 20.0))
    if crossings.size == 0:
        return np.nan
    level = crossings[0]
    share = (profile[level] - 20.0) / (profile[level] - profile[level + 1])
    return float(depth[level] + share * (depth[level + 1] - depth[level]))


@pytest.fixture(scope="module")
def difference() -> np.ndarray:
    """Of the depths of 20 °C, m, (latitude, longitude), every 2 degrees."""
    with (
        xr.open_dataset(REFERENCE / "levitus_equatorial_pacific.nc") as annual,
        xr.open_dataset(REFERENCE / "monthly_atlas_equatorial_pacific.nc") as monthly,
    ):
        older, newer = annual["temperature"].load(), monthly["temperature"].mean("month").load()
    places = {"latitude": newer["latitude"].values, "longitude": newer["longitude"].values}
    places = {name: np.intersect1d(older[name].values, values) for name, values in places.items()}
    depths = []
    for atlas in (older.sel(places), newer.sel(places)):
        part = atlas.sel(latitude=slice(-7.0, 7.0), longitude=slice(125.0, 278.0))
        values = part.transpose("latitude", "longitude", "depth").values.astype(np.float64)
        depths.append(np.apply_along_axis(depth_of_20, 2, values, part["depth"].values))
    return depths[0] - depths[1]


def products(difference: np.ndarray) -> Iterator[tuple[float, float, float]]:
    """Yield how far apart pairs are, degrees of latitude and of longitude, and how alike their differences."""
    square = np.nanmean(difference**2)
    rows, columns = difference.shape
    for south in range(5):
        for west in range(16):
            pairs = difference[south:, west:] * difference[: rows - south, : columns - west]
            yield 2.0 * south, 2.0 * west, float(np.nanmean(pairs) / square)


def test_the_difference_of_two_atlases_has_the_size_and_the_scales_of_the_correction(difference: np.ndarray) -> None:
    prior = ClimatologyPriorSettings()
    assert np.sqrt(np.nanmean(difference**2)) == pytest.approx(prior.mean_sd, abs=1.0)
    north, east, alike = np.array(list(products(difference))).T
    stated = correction_scales(prior).between(np.zeros(1), np.zeros(1), north, east)[0]
    assert np.sqrt(np.mean((alike - stated) ** 2)) < 0.05
    # One scale, the best there is, misses by twice as much: the difference is narrow and broad at once.
    lengths = [(length, width) for length in np.arange(4.0, 50.0) for width in np.arange(2.0, 20.0)]
    single = [np.exp(-((east / length) ** 2) - (north / width) ** 2) for length, width in lengths]
    assert min(np.sqrt(np.mean((alike - one) ** 2)) for one in single) > 0.09
