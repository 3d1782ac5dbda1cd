"""Whether the probabilities of the hindcast are right on simulated oceans: slope, boldness, and the scores' intervals.

``python tests/bench/reliability.py [--first 401] [--seeds 24] [--years 40] [--scheme years_out]``

Each seed is an ocean of 40 years: the index of 5S-5N, 170W-120W with the error of the companion's surface temperature,
volume, western volume and tilt with errors of the size and memory that the demo array's have. No seed below 401 is
one that a setting was chosen on.

Printed for each forecaster: the mean over seeds of the reliability slope with all leads together, its standard error,
least and largest; and of the overconfidence (sharpness less what was earned, in points of probability), which must not
be above 0. By lead: skill and slope of the combined forecast, and the share of seeds in which the 95 % interval of a
score holds the truth: what the same forecast, fitted on the whole record, scores on the other oceans.
"""

from __future__ import annotations

import argparse
from collections.abc import Sequence

import numpy as np
import xarray as xr
from measure import show
from scipy.signal import lfilter

from profiles.config import HindcastSettings
from profiles.drill.ocean import Ocean
from profiles.drill.streams import stream
from profiles.drill.supplements import COMPANION_SURFACE_SD, INDEX_LONGITUDE
from profiles.drill.truth import LATITUDE, array_truth, cells
from profiles.precursor import hindcast, monthly_series, reliability, verify
from profiles.precursor.forecasters import by_target
from profiles.precursor.hindcast import aligned, fitted, place_of_volume
from profiles.precursor.series import middle_of, month_of

Record = tuple[xr.DataArray, dict[str, xr.DataArray]]

#: Standard deviation and month-to-month memory of the error of each, as measured on the companion (truth less map).
ERRORS = {"volume": (0.26e14, 0.85), "western_volume": (0.25e14, 0.85), "tilt": (0.5, 0.5)}
COVERED = ("correlation", "rms", "skill_climatology", "skill_damped_persistence")
FORECASTER = "combined"


def ocean(seed: int, years: int) -> Record:
    """Return the index and the predictors of an ocean."""
    time = middle_of(np.arange("2031-01", np.datetime64("2031-01", "M") + 12 * years, dtype="datetime64[M]"))
    simulated = Ocean.simulate(time, seed)
    latitude, longitude = cells(LATITUDE, INDEX_LONGITUDE)
    surface = simulated.surface_temperature(latitude, longitude)
    random = stream(seed, "reliability")
    index = np.average(surface, axis=0, weights=np.cos(np.radians(latitude)))
    index += COMPANION_SURFACE_SD * random.standard_normal(time.size)
    truth = array_truth(simulated)
    volume = truth["warm_water_volume"]
    exact = {
        "volume": volume.sel(region="total").values,
        "western_volume": volume.sel(region="west").values,
        "tilt": truth["thermocline_slope"].values,
    }
    seen = {}
    for name, (size, memory) in ERRORS.items():
        shocks = size * np.sqrt(1.0 - memory**2) * random.standard_normal(time.size + 60)
        seen[name] = monthly_series(exact[name] + lfilter([1.0], [1.0, -memory], shocks)[60:], time, name=name)
    return monthly_series(index, time, name="surface_temperature_index"), seen


def scores_elsewhere(own: Record, others: Sequence[Record], settings: HindcastSettings) -> dict[str, np.ndarray]:
    """Return what forecasts fitted on one record score on others, by lead."""
    series = aligned(*own)
    everything = np.ones(series[0].size, bool)
    guesses: dict[str, list[np.ndarray]] = {}
    came = []
    for other in others:
        # The other record in place of the own one, fitted on the own: climatology, scale and coefficients.
        joined = [xr.DataArray(np.concatenate([mine.values, theirs.values]), dims="time", name=mine.name)
                  for mine, theirs in zip(series, aligned(*other), strict=True)]  # fmt: skip
        months = middle_of(month_of(series[0]["time"])[0] + np.arange(joined[0].size))
        joined = [one.assign_coords(time=months) for one in joined]
        used = np.concatenate([everything, np.zeros(joined[0].size - everything.size, bool)])
        standard, centre = fitted(joined, used, place_of_volume(own[1]), settings, detrend=False)
        kept = slice(everything.size + settings.longest_lead, None)
        came.append(standard.anomaly[kept])
        for name, guess in centre.items():
            guesses.setdefault(name, []).append(by_target(guess)[:, kept])
    observed = np.concatenate(came)
    forecast = {name: np.concatenate(parts, axis=1) for name, parts in guesses.items()}
    error = {name: ((guess - observed) ** 2).mean(axis=1) for name, guess in forecast.items()}
    return {
        "correlation": np.array([np.corrcoef(guess, observed)[0, 1] for guess in forecast[FORECASTER]]),
        "rms": np.sqrt(error[FORECASTER]),
        "skill_climatology": 1.0 - error[FORECASTER] / error["climatology"],
        "skill_damped_persistence": 1.0 - error[FORECASTER] / error["damped_persistence"],
    }


def summaries(values: np.ndarray) -> list[float]:
    """Return mean, standard error, least and largest of the seeds."""
    return [values.mean(), values.std(ddof=1) / np.sqrt(values.size), values.min(), values.max()]


def _held(scores: xr.Dataset, name: str, truth: Sequence[float]) -> np.ndarray:
    """Return in which seeds the interval of a score holds the truth."""
    return (scores[f"{name}_low"].values <= truth) & (truth <= scores[f"{name}_high"].values)


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    for name, default in (("first", 401), ("seeds", 24), ("years", 40)):
        parser.add_argument(f"--{name}", type=int, default=default)
    parser.add_argument("--scheme", choices=("years_out", "expanding"), default="years_out")
    options = parser.parse_args()
    settings = HindcastSettings(scheme=options.scheme)
    diagrams, scores = [], []
    records = [ocean(seed, options.years) for seed in range(options.first, options.first + options.seeds)]
    truth = [scores_elsewhere(own, [other for other in records if other is not own], settings) for own in records]
    for record in records:
        made = hindcast(*record, settings=settings)
        diagrams.append(reliability(made)[["reliability_slope", "overconfidence"]])
        scores.append(verify(made).sel(forecaster=FORECASTER, season="all", drop=True))
    pooled, by_lead = xr.concat(diagrams, "seed"), xr.concat(scores, "seed")
    title = f"{options.seeds} oceans of {options.years} years, {options.scheme}"
    head = ("forecaster", "mean", "error", "least", "largest")
    for score in ("reliability_slope", "overconfidence"):
        rows = (
            [str(name), *summaries(pooled[score].sel(forecaster=name).values)] for name in pooled["forecaster"].values
        )
        show(f"{title}: {score}, leads together", head, rows)
    rows = []
    for lead in by_lead["lead"].values:
        one = by_lead.sel(lead=lead)
        slope = summaries(one["reliability_slope"].values)
        held = [np.mean(_held(one, name, [true[name][lead - 1] for true in truth])) for name in COVERED]
        rows.append([f"{lead}", float(one["skill_climatology"].mean()), *slope, *held])
    columns = ("lead", "skill", "slope", "error", "least", "largest", *(f"{name} held" for name in COVERED))
    show(f"{title}: {FORECASTER}", columns, rows)


if __name__ == "__main__":
    main()
