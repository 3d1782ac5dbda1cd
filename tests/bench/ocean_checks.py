"""Print what the simulated ocean does beside what is published: python tests/bench/ocean_checks.py [--seeds 1,2,3]."""

from __future__ import annotations

import argparse
import time
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from functools import cache

import numpy as np
from scipy.ndimage import uniform_filter1d
from scipy.signal import welch

from profiles.atlas import annual_profile, seasonal_profile
from profiles.drill.array import SITES, positions
from profiles.drill.ocean import Ocean
from profiles.statistics import harmonic_design

METRES_PER_DEGREE = 6.371e6 * np.pi / 180.0
DAY = 86_400.0
YEARS = ("2031-01-01", "2037-01-01")
COMPANION = ("1995-01", "2035-01")
BOX = tuple(
    grid.ravel() for grid in np.meshgrid(np.arange(-4.0, 5.0, 2.0), np.arange(122.5, 280.0, 5.0), indexing="ij")
)


@dataclass(frozen=True)
class Check:
    """A value of the simulated ocean, the range it has to lie in, and what is published, by whom."""

    name: str
    value: float
    low: float
    high: float
    published: str


def daily() -> np.ndarray:
    """Noons of the six years of the demo."""
    return np.arange(*YEARS, dtype="datetime64[D]").astype("datetime64[ns]") + np.timedelta64(12, "h")


def monthly() -> np.ndarray:
    """Middles of the months of a 40-year companion."""
    edges = np.arange(COMPANION[0], np.datetime64(COMPANION[1]) + 1, dtype="datetime64[M]").astype("datetime64[ns]")
    return edges[:-1] + (edges[1:] - edges[:-1]) // 2


@cache
def years(seed: int) -> Ocean:
    """The six daily years of a seed."""
    return Ocean.simulate(daily(), seed)


@cache
def companion(seed: int) -> Ocean:
    """The 40 monthly years of a seed."""
    return Ocean.simulate(monthly(), seed)


@cache
def box_depth(seed: int) -> np.ndarray:
    """Monthly 20 °C depth over the box, (position, month)."""
    return companion(seed).isotherm_depth(*BOX)


# ----------------------------------------------------------------------------------------------------
# Plain statistics


def anomalies(series: np.ndarray) -> np.ndarray:
    """Monthly series (..., month) less the mean of each calendar month."""
    parts = series.reshape(*series.shape[:-1], -1, 12)
    return (parts - parts.mean(axis=-2, keepdims=True)).reshape(series.shape)


def band_passed(series: np.ndarray, short: float, long: float) -> np.ndarray:
    """Daily series (..., day) of the periods between ``short`` and ``long`` days alone."""
    spectrum = np.fft.rfft(series - series.mean(axis=-1, keepdims=True), axis=-1)
    frequency = np.fft.rfftfreq(series.shape[-1])
    spectrum[..., (frequency < 1.0 / long) | (frequency > 1.0 / short)] = 0.0
    return np.fft.irfft(spectrum, series.shape[-1], axis=-1)


def speed(sections: list[np.ndarray], longitude: np.ndarray, longest: int) -> float:
    """Speed, m s-1, eastward positive: regression of distance on the lag of the largest correlation with the first."""
    lags = np.arange(-longest, longest + 1)
    correlation = np.mean([lag_correlations(section, lags) for section in sections], axis=0)
    best = lags[np.argmax(correlation, axis=1)].astype(float)
    distance = (longitude - longitude[0]) * METRES_PER_DEGREE
    # Lag on distance: the distances are exact, the lags whole days.
    return distance @ distance / (distance @ best) / DAY


def lag_correlations(section: np.ndarray, lags: np.ndarray) -> np.ndarray:
    """Correlation of each row (row, lag) with the first, the row later by the lag."""
    first, inner = section[0], slice(-lags[0], section.shape[1] - lags[-1])
    later = np.stack([np.roll(section, -lag, axis=1)[:, inner] for lag in lags], axis=1)
    reference = first[inner]
    return later @ reference / np.linalg.norm(later, axis=-1) / np.linalg.norm(reference)


def atlas_depth(profile: np.ndarray, depth: np.ndarray) -> float:
    """20 °C depth of one published profile, linear between its levels, 0 where its surface is colder."""
    if profile[0] < 20.0:
        return 0.0
    below = int(np.argmax(profile < 20.0))
    return float(np.interp(20.0, profile[[below, below - 1]], depth[[below, below - 1]]))


def monthly_atlas(latitude: np.ndarray, longitude: np.ndarray) -> np.ndarray:
    """20 °C depth of the packaged monthly atlas (position, month)."""
    profiles = seasonal_profile(latitude, longitude)
    months = np.einsum("mh,phz->pmz", harmonic_design((np.arange(12) + 0.5) / 12.0), profiles.values)
    return np.array([[atlas_depth(month, profiles["depth"].values) for month in place] for place in months])


def annual_atlas(latitude: np.ndarray, longitude: np.ndarray) -> np.ndarray:
    """20 °C depth of the packaged annual-mean atlas (position,)."""
    profiles = annual_profile(latitude, longitude)
    return np.array([atlas_depth(profile, profiles["depth"].values) for profile in profiles.values])


# ----------------------------------------------------------------------------------------------------
# Waves


def sections(seeds: list[int], latitude: float, longitude: np.ndarray) -> list[np.ndarray]:
    """Daily 20 °C depth along a parallel, one (longitude, day) a seed."""
    return [years(seed).isotherm_depth(np.full(longitude.size, latitude), longitude) for seed in seeds]


def wave_checks(seeds: list[int]) -> Iterator[Check]:
    """Speeds seen in time-longitude."""
    east = np.arange(190.0, 241.0, 5.0)
    band = [band_passed(section, 30.0, 120.0) for section in sections(seeds, 0.0, east)]
    kelvin = speed(band, east, 40)
    yield Check(
        "eastward speed on the equator, 30-120 days, m s-1",
        kelvin,
        2.0,
        3.0,
        "2.4 (Kessler et al. 1995); 2.26-2.82 (altimetry)",
    )
    west = np.arange(230.0, 189.0, -5.0)
    for latitude in (-4.5, 4.5):
        band = [band_passed(section, 100.0, 300.0) for section in sections(seeds, latitude, west)]
        rossby = speed(band, west, 120)
        yield Check(
            f"eastward speed at {latitude:g}N, 100-300 days, m s-1", rossby, -1.15, -0.65, "-0.8 to -0.9 (theory: c/3)"
        )
    west = np.arange(250.0, 239.0, -2.0)
    band = [band_passed(section, 15.0, 45.0) for section in sections(seeds, 2.5, west)]
    yield Check(
        "eastward speed at 2.5N, 250E, 15-45 days, m s-1",
        speed(band, west, 35),
        -0.7,
        -0.35,
        "about -0.5 (common practice, no source)",
    )
    yield Check(
        "its variance, Aug-Dec over Mar-May",
        season_ratio(band),
        2.0,
        50.0,
        "strong from June to January (common practice, no source)",
    )


def season_ratio(band: list[np.ndarray]) -> float:
    """Variance of August to December over that of March to May."""
    month = daily().astype("datetime64[M]").astype(int) % 12 + 1
    cold, warm = (month >= 8), (month >= 3) & (month <= 5)
    return float(
        np.mean([section[:, cold].var() for section in band]) / np.mean([section[:, warm].var() for section in band])
    )


def spectrum_checks(seeds: list[int]) -> Iterator[Check]:
    """Power of the 20 °C depth at 0N 220E."""
    series = [years(seed).columns([0.0], [220.0], small_scales=True).isotherm_depth()[0] for seed in seeds]
    frequency, power = np.mean([welch(one, nperseg=730, detrend="linear") for one in series], axis=0)
    low, band, high = (
        power[(frequency > 1 / long) & (frequency < 1 / short)].mean()
        for short, long in ((85, 130), (58, 77), (20, 40))
    )
    fit = (frequency > 1 / 300.0) & (frequency < 1 / 8.0)
    slope = np.polyfit(np.log(frequency[fit]), np.log(power[fit]), 1)[0]
    yield Check("spectral slope at 0N 220E, 8-300 days", slope, -4.0, -1.0, "red, about -2 (from memory)")
    yield Check(
        "power at 58-77 days over 85-130 days", band / low, 1.0, 10.0, "peak at 60-75 days (Kessler et al. 1995)"
    )
    yield Check("power at 58-77 days over 20-40 days", band / high, 4.0, 500.0, "the same")


# ----------------------------------------------------------------------------------------------------
# Mean and season


def mean_checks(seeds: list[int]) -> Iterator[Check]:
    """Against the packaged atlases."""
    ours = [box_depth(seed) for seed in seeds]
    theirs, other = monthly_atlas(*BOX), annual_atlas(*BOX)
    between = np.sqrt(np.mean((theirs.mean(axis=1) - other) ** 2))
    means = [depth.mean(axis=1) for depth in ours]
    differ = np.sqrt(np.mean([(mean - theirs.mean(axis=1)) ** 2 for mean in means]))
    yield Check(
        "rms difference of the 40-year mean from the monthly atlas, m",
        differ,
        5.0,
        10.0,
        f"{between:.1f} between the two packaged atlases",
    )
    apart = np.sqrt(np.mean([(mean - other) ** 2 for mean in means]))
    yield Check("rms difference from the annual-mean atlas, m", apart, 5.0, 15.0, "it is neither of them")
    for place in (150.0, 180.0, 210.0, 240.0, 265.0):
        yield from equatorial_checks(seeds, place)
    longitude = np.arange(165.0, 266.0, 5.0)
    section = np.mean(
        [companion(seed).isotherm_depth(0.0 * longitude, longitude).mean(axis=1) for seed in seeds], axis=0
    )
    drop = np.polyfit(longitude * METRES_PER_DEGREE / 1e6, section, 1)[0]
    yield Check("slope 165E-95W on the equator, m per 1000 km", drop, -14.0, -9.0, "-10.8 to -11.6 (from memory)")


def equatorial_checks(seeds: list[int], longitude: float) -> Iterator[Check]:
    """Mean, annual range and anomalies at one place on the equator."""
    where = np.zeros(1), np.array([longitude])
    series = [companion(seed).isotherm_depth(*where)[0] for seed in seeds]
    season = [one.reshape(-1, 12).mean(axis=0) for one in series]
    atlas = monthly_atlas(*where)[0]
    mean, other = float(np.mean(series)), annual_atlas(*where)[0]
    low, high = sorted((atlas.mean(), other))
    yield Check(
        f"mean at {longitude:g}E, m",
        mean,
        low - 15.0,
        high + 15.0,
        f"{atlas.mean():.0f} and {other:.0f} in the atlases",
    )
    ranges = float(np.mean([np.ptp(smooth(one)) for one in season]))
    theirs = float(np.ptp(smooth(atlas)))
    yield Check(
        f"annual range at {longitude:g}E, m", ranges, theirs - 10.0, theirs + 10.0, f"{theirs:.0f} in the monthly atlas"
    )
    spread = float(np.mean([anomalies(one).std() for one in series]))
    yield Check(f"sd of monthly anomalies at {longitude:g}E, m", spread, 8.0, 22.0, "10-20 (from memory)")


def smooth(season: np.ndarray) -> np.ndarray:
    """Annual and semi-annual harmonics of twelve months."""
    design = harmonic_design((np.arange(12) + 0.5) / 12.0)
    return design @ np.linalg.pinv(design) @ season


# ----------------------------------------------------------------------------------------------------
# Years


def basin_checks(seeds: list[int]) -> Iterator[Check]:
    """Volume, its lead over the surface, patterns, asymmetry."""
    volume = [anomalies(box_depth(seed).mean(axis=0)) for seed in seeds]
    index = [surface_index(seed) for seed in seeds]
    lags = np.arange(-24, 25)
    correlation = np.mean([index_correlation(*pair, lags) for pair in zip(volume, index, strict=True)], axis=0)
    best = int(np.argmax(correlation))
    yield Check(
        "lead of basin volume over Nino-3.4 surface, months",
        float(lags[best]),
        5.0,
        9.0,
        "6-7 (Meinen and McPhaden 2000); 2-3 seasons (McPhaden 2012)",
    )
    yield Check("correlation at that lead", correlation[best], 0.5, 0.9, "about 0.7 (from memory)")
    yield Check("correlation at no lag", correlation[24], -0.4, 0.5, "small (Clarke et al. 2007)")
    yield Check(
        "sd of the mean 20 °C depth of the box, m",
        float(np.mean([one.std() for one in volume])),
        4.0,
        8.0,
        "5: 1e14 m3 (from memory)",
    )
    yield Check(
        "sd of the Nino-3.4 surface, °C", float(np.mean([one.std() for one in index])), 0.6, 1.2, "0.85 (from memory)"
    )
    yield Check(
        "skewness of the Nino-3.4 surface",
        float(np.mean([skewness(one) for one in index])),
        0.2,
        1.5,
        "positive: warm events are stronger (Meinen and McPhaden 2000)",
    )
    yield Check(
        "share of months below the mean",
        float(np.mean([np.mean(one < 0.0) for one in index])),
        0.505,
        0.65,
        "more than half: cold ones are longer (from memory)",
    )
    yield from pattern_checks(seeds)


def surface_index(seed: int) -> np.ndarray:
    """Monthly anomaly of the surface temperature, 5S-5N, 170-120W."""
    latitude, longitude = (
        grid.ravel() for grid in np.meshgrid([-4.0, -2.0, 0.0, 2.0, 4.0], np.arange(192.5, 240.0, 5.0))
    )
    return anomalies(companion(seed).surface_temperature(latitude, longitude).mean(axis=0))


def index_correlation(volume: np.ndarray, index: np.ndarray, lags: np.ndarray) -> np.ndarray:
    """Correlation at each lag of the index after the volume, months."""
    return lag_correlations(np.stack([uniform_filter1d(volume, 3), uniform_filter1d(index, 3)]), lags)[1]


def skewness(series: np.ndarray) -> float:
    """Third moment over the cube of the standard deviation."""
    return float(np.mean((series - series.mean()) ** 3) / series.std() ** 3)


def pattern_checks(seeds: list[int]) -> Iterator[Check]:
    """Empirical orthogonal functions of the monthly 20 °C depth along the equator and over the box."""
    shares = np.mean([eof_shares(anomalies(box_depth(seed))) for seed in seeds], axis=0)
    yield Check(
        "share of the first two patterns of the box, monthly",
        shares[:2].sum(),
        0.34,
        0.9,
        "0.86 of smoothed, mapped fields (Clarke et al. 2007)",
    )
    smoothed = [uniform_filter1d(zonally_smoothed(anomalies(box_depth(seed))), 5, axis=1) for seed in seeds]
    shares = np.mean([eof_shares(field) for field in smoothed], axis=0)
    yield Check(
        "the same, means of 5S-5N, smoothed to 30 degrees and 5 months",
        shares[:2].sum(),
        0.7,
        0.97,
        "0.86: 0.51 and 0.35 (Clarke et al. 2007)",
    )
    yield Check("the first of these alone", shares[0], 0.35, 0.8, "0.51 (the same)")


def zonally_smoothed(field: np.ndarray) -> np.ndarray:
    """Means over latitude and over 30 degrees of longitude, as a map from a few moorings has."""
    return uniform_filter1d(field.reshape(5, -1, field.shape[-1]).mean(axis=0), 6, axis=0)


def eof_shares(field: np.ndarray) -> np.ndarray:
    """Share of the variance in the first three patterns."""
    power = np.linalg.svd(field, compute_uv=False) ** 2
    return power[:3] / power.sum()


def checks(seeds: list[int]) -> list[Check]:
    """All of them."""
    groups = (wave_checks, spectrum_checks, mean_checks, basin_checks)
    return [check for group in groups for check in group(seeds)]


def run_times(seed: int) -> dict[str, float]:
    """Seconds for six daily years of the whole box, of 40 columns with small scales, and 40 monthly years of the box.

    Once before, so that nothing is compiled on the way.
    """
    box = tuple(grid.ravel() for grid in np.meshgrid(np.arange(-4.5, 5.0), np.arange(120.5, 280.0), indexing="ij"))
    sites = positions(SITES)
    Ocean.simulate(daily()[:40], seed).columns(*sites, small_scales=True).isotherm_depth()
    jobs = {
        "six years of 1600 daily columns": lambda: Ocean.simulate(daily(), seed).isotherm_depth(*box),
        "six years of the 40 sites with small scales": lambda: (
            Ocean.simulate(daily(), seed).columns(*sites, small_scales=True).isotherm_depth()
        ),
        "40 years of 1600 monthly columns": lambda: Ocean.simulate(monthly(), seed).isotherm_depth(*box),
    }
    return {name: seconds(job) for name, job in jobs.items()}


def seconds(job: Callable[[], object]) -> float:
    """Time that a job takes."""
    start = time.perf_counter()
    job()
    return time.perf_counter() - start


def main() -> int:
    """Print the table; fail where a value lies outside its range."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--seeds", default="1,2,3,4", help="comma-separated (default: %(default)s)")
    seeds = [int(seed) for seed in parser.parse_args().seeds.split(",")]
    results = checks(seeds)
    for check in results:
        mark = " " if check.low <= check.value <= check.high else "!"
        print(f"{mark} {check.name:62s} {check.value:8.2f}  [{check.low:.2f}, {check.high:.2f}]  {check.published}")
    for name, taken in run_times(seeds[0]).items():
        print(f"  {name:62s} {taken:8.1f} s")
    return 0 if all(check.low <= check.value <= check.high for check in results) else 1


if __name__ == "__main__":
    raise SystemExit(main())
