"""How often the stated errors of tilt and volume hold the truth, on oceans drawn from the map's own assumptions.

    python tests/bench/section_coverage.py [--draws 60] [--seed 1]

Each draw is a climatology (the atlas plus a random correction) and six years of anomalies (Gaussian in space, with
memory in time) on the grid and at the 40 sites of the demo array, seen with noise, offsets that last a deployment, and
gaps. Right errors have z = (estimate - truth) / error of rms 1, and 95 % of |z| below 1.96. It shows that the errors
follow from the assumptions, not that the assumptions hold of an ocean.
"""

from __future__ import annotations

import argparse
from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
import pandas as pd
import xarray as xr

from profiles.config import SectionSettings
from profiles.drill.array import SITES, Site, positions
from profiles.section import build_section
from profiles.section.climatology import atlas_isotherm
from profiles.section.grid import array_grid, band_weights, sea_area
from profiles.section.tilt import slope_weights
from profiles.statistics import harmonic_design, year_fraction

SETTINGS = SectionSettings()
PERSISTENT_SD = 2.0  # m, offsets that last a deployment of a year
MISSING = 0.12  # share of months that a site gives nothing

#: What is compared: the section's slopes, the volume's totals.
QUANTITIES = (
    "thermocline_slope",
    "thermocline_slope_anomaly",
    "warm_water_volume",
    "warm_water_volume_anomaly",
)


@dataclass(frozen=True)
class Draw:
    """z and the stated errors of each quantity, (time,), and the leave-one-out mean square of one ocean."""

    departures: dict[str, np.ndarray]
    errors: dict[str, np.ndarray]
    leave_one_out: float


class Oceans:
    """Draws of whole and anomalous isotherm depth at cells and sites from the covariances of the settings."""

    def __init__(self, sites: tuple[Site, ...], months: int) -> None:
        self.sites = sites
        self.rows, self.columns = array_grid()
        grid = np.meshgrid(self.rows, self.columns, indexing="ij")
        self.site_places = positions(sites)
        places = tuple(
            np.concatenate([cells.ravel(), at_sites]) for cells, at_sites in zip(grid, self.site_places, strict=True)
        )
        starts = pd.date_range("2031-01-01", periods=months + 1, freq="MS")
        self.time = (starts[:-1] + (starts[1:] - starts[:-1]) / 2).to_numpy().astype("datetime64[ns]")
        self.atlas = atlas_isotherm(*places, 20.0)
        prior = SETTINGS.climatology
        self.signal_root = _root(_correlation(places, SETTINGS.length_longitude, SETTINGS.length_latitude))
        broad = _correlation(places, prior.broad_longitude, prior.broad_latitude)
        narrow = _correlation(places, prior.narrow_longitude, prior.narrow_latitude)
        self.correction_root = _root(prior.broad_share * broad + (1.0 - prior.broad_share) * narrow)
        self.prior_sd = np.array([prior.mean_sd, *[prior.annual_sd] * 2, *[prior.semiannual_sd] * 2])

    def draw(self, random: np.random.Generator) -> tuple[np.ndarray, np.ndarray]:
        """Return the whole and its anomaly, m, (time, position)."""
        size = self.atlas.shape[0]
        correction = self.correction_root @ random.normal(size=(size, self.prior_sd.size)) * self.prior_sd
        climatology = harmonic_design(year_fraction(self.time)) @ (self.atlas + correction).T
        fresh = self.signal_root @ random.normal(size=(size, self.time.size)) * SETTINGS.signal_sd
        anomaly = fresh.T.copy()
        days = np.diff(self.time) / np.timedelta64(1, "D")
        memory = np.exp(-days / 30.4375 / SETTINGS.climatology.decorrelation_months)
        for month, kept in enumerate(memory, start=1):
            anomaly[month] = kept * anomaly[month - 1] + np.sqrt(1.0 - kept**2) * fresh[:, month]
        return climatology + anomaly, anomaly

    def monthly(self, whole: np.ndarray, random: np.random.Generator) -> xr.Dataset:
        """Return what the array would have measured of ``whole`` (time, position)."""
        shape = (len(self.sites), self.time.size)
        deployment = np.broadcast_to(np.arange(self.time.size) // 12, shape)
        offsets = random.normal(0.0, PERSISTENT_SD, (shape[0], deployment.max() + 1))
        seen = whole[:, -shape[0] :].T + np.take_along_axis(offsets, deployment, axis=1)
        seen = seen + random.normal(0.0, SETTINGS.small_scale_sd, shape)
        seen[random.random(shape) < MISSING] = np.nan
        series = {
            "isotherm_depth": seen,
            "isotherm_depth_error_independent": np.zeros(shape),
            "isotherm_depth_error_persistent": np.full(shape, PERSISTENT_SD),
            "isotherm_day_count": np.full(shape, 31),
            "isotherm_day_spread": np.full(shape, 5.0),
            "deployment": deployment,
        }
        coords = dict(zip(("latitude", "longitude"), self.site_places, strict=True))
        return xr.Dataset(
            {name: (("mooring", "time"), values) for name, values in series.items()},
            coords={"time": self.time, "mooring": [site.id for site in self.sites]}
            | {name: ("mooring", values) for name, values in coords.items()},
        )

    def truth(self, whole: np.ndarray, anomaly: np.ndarray) -> dict[str, np.ndarray]:
        """Return the true value of each of :data:`QUANTITIES`, (time,)."""
        shape = (self.time.size, self.rows.size, self.columns.size)
        band = np.nan_to_num(band_weights(self.rows, self.columns))
        wet = band.sum(axis=0) > 0.0
        slope = np.zeros(self.columns.size)
        slope[wet] = slope_weights(self.columns[wet], SETTINGS.tilt_window)
        weights = {"thermocline_slope": band * slope, "warm_water_volume": sea_area(self.rows, self.columns)}
        fields = {"": whole, "_anomaly": anomaly}
        return {
            f"{name}{suffix}": np.einsum(
                "trc,rc->t", values[:, : self.rows.size * self.columns.size].reshape(shape), weight
            )
            for name, weight in weights.items()
            for suffix, values in fields.items()
        }


def _correlation(places: tuple[np.ndarray, ...], length_longitude: float, length_latitude: float) -> np.ndarray:
    """Return the Gaussian correlation of all places."""
    latitude, longitude = places
    north = np.subtract.outer(latitude, latitude) / length_latitude
    east = np.subtract.outer(longitude, longitude) / length_longitude
    return np.exp(-(north**2) - east**2)


def _root(correlation: np.ndarray) -> np.ndarray:
    """Return a root of a correlation; the jitter is 1e-4 of a standard deviation."""
    return np.linalg.cholesky(correlation + 1e-8 * np.eye(len(correlation)))


def draws(oceans: Oceans, count: int, *, seed: int) -> Iterator[Draw]:
    """Draw oceans, map what the array sees of them, and compare."""
    random = np.random.default_rng(seed)
    for _ in range(count):
        whole, anomaly = oceans.draw(random)
        built = build_section(oceans.monthly(whole, random), SETTINGS)
        truth = oceans.truth(whole, anomaly)
        found = xr.merge([built.section, built.volume.sel(region="total", drop=True)], compat="override", join="exact")
        errors = {name: found[f"{name}_error"].values for name in QUANTITIES}
        departures = {name: (found[name].values - truth[name]) / errors[name] for name in QUANTITIES}
        yield Draw(departures, errors, built.leave_one_out)


def main() -> None:
    """Print a line per quantity."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--draws", type=int, default=60)
    parser.add_argument("--seed", type=int, default=1)
    asked = parser.parse_args()
    done = list(draws(Oceans(SITES, 72), asked.draws, seed=asked.seed))
    alone = np.mean([draw.leave_one_out for draw in done])
    print(f"{asked.draws} oceans of 72 months, 40 sites; leave-one-out {alone:.3f}")
    print(f"{'quantity':28s} {'rms z':>7s} {'in 95 %':>8s} {'± draws':>8s} {'mean z':>7s} {'mean error':>11s}")
    for name in QUANTITIES:
        departures = np.array([draw.departures[name] for draw in done])
        inside = np.abs(departures) < 1.96
        # Months of one ocean share its climatology, so the standard error of the share comes from whole oceans.
        spread = inside.mean(axis=1).std(ddof=1) / np.sqrt(len(done)) if len(done) > 1 else np.nan
        error = np.mean([draw.errors[name] for draw in done])
        rms = np.sqrt((departures**2).mean())
        print(f"{name:28s} {rms:7.3f} {inside.mean():8.3f} {spread:8.3f} {departures.mean():7.3f} {error:11.4g}")


if __name__ == "__main__":
    main()
