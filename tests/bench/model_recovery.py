"""What the comparison says of models whose error is known, over many simulated oceans and their arrays.

    nice python tests/bench/model_recovery.py --seeds 101,102,... [--years 3] [--json FILE]

Each seed is an ocean, its array with faults as delivered and run, and three models of it: the ocean itself, the ocean
with its thermocline tilted by 10 % more, and the ocean 10 m deeper. Printed are, with standard errors over the seeds:
how often the 95 % intervals of model less array as seen hold the true difference, 0 for the first model, by month; how
often the interval of the whole record's bias holds the planted error; and what part of the planted error was said to be
the model's (as seen) and what the sampling's (hidden).
"""

from __future__ import annotations

import argparse
import json
import tempfile
from collections.abc import Iterator, Sequence
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import xarray as xr

from profiles import pipeline
from profiles.config import ValidationSettings
from profiles.drill.array import CHAINS, SITES
from profiles.drill.demo import days, demo_config, make_demo
from profiles.drill.ocean import Ocean
from profiles.drill.planting import FAULTS
from profiles.drill.truth import array_truth, cells
from profiles.section.grid import KILOMETRES_PER_DEGREE
from profiles.validation import compare_model

QUANTILE = 1.96
TILTED, DEEPER = 0.10, 10.0  # share of the slope; m
PIVOT = 215.0  # degrees east, where the tilt turns
SHARES = ("held", "told apart", "model's share", "sampling's share", "whole held")
LATITUDE = np.array([-4.5, -2.5, 0.0, 2.5, 4.5])
#: The lines, the middles between them, and what is needed beyond them.
LONGITUDE = np.array(
    sorted({120.0, 125.0, 130.0, 136.0, 142.5, 272.5, 280.0, *CHAINS, *(np.array([*CHAINS][:-1]) + 6.5)})
)
DEPTH = np.array(sorted({float(depth) for site in SITES for depth in site.depths} | set(np.arange(0.0, 310.0, 10.0))))
PLACES = {
    "thermocline_slope": ("equator",),
    "isotherm_depth": ("array",),
    "warm_water_volume": ("total", "west", "east"),
}


def model_of(ocean: Ocean, shift: np.ndarray) -> xr.Dataset:
    """Return daily temperature of the ocean, moved down by ``shift`` (longitude, time), m, on a grid that holds the
    moorings and their sensors."""
    latitude, longitude = cells(LATITUDE, LONGITUDE)
    columns = ocean.columns(latitude, longitude, small_scales=True)
    temperature = np.empty((ocean.time.size, DEPTH.size, latitude.size), np.float32)
    for place in range(latitude.size):
        moved = shift[place % LONGITUDE.size][:, None]
        temperature[:, :, place] = columns.temperature(place, np.clip(DEPTH - moved, 0.0, 630.0))
    shape = (ocean.time.size, DEPTH.size, LATITUDE.size, LONGITUDE.size)
    named = {"standard_name": "sea_water_temperature", "units": "degree_Celsius"}
    return xr.Dataset(
        {"temperature": (("time", "depth", "latitude", "longitude"), temperature.reshape(shape), named)},
        coords={
            "time": ocean.time,
            "depth": ("depth", DEPTH, {"units": "m", "positive": "down", "standard_name": "depth"}),
            "latitude": ("latitude", LATITUDE, {"units": "degrees_north"}),
            "longitude": ("longitude", LONGITUDE, {"units": "degrees_east"}),
        },
    )


def shifts(ocean: Ocean, truth: xr.Dataset) -> Iterator[tuple[str, np.ndarray]]:
    """Yield the models and how far each moves the columns, (longitude, time)."""
    months = truth["time"].values.astype("datetime64[M]")
    slope = truth["thermocline_slope"].values[np.searchsorted(months, ocean.time.astype("datetime64[M]"))]
    distance = (LONGITUDE - PIVOT) * KILOMETRES_PER_DEGREE / 1000.0
    yield "truth", np.zeros((LONGITUDE.size, ocean.time.size))
    yield "tilted", TILTED * distance[:, None] * slope
    yield "deeper", np.full((LONGITUDE.size, ocean.time.size), DEEPER)


def seed_scores(seed: int, years: int) -> dict[str, Any]:
    """Return what one ocean scores."""
    time = days("2031-01-01", f"{2030 + years}-12-31")
    faults = {name: int(np.ceil(count * years / 6.0)) for name, count in FAULTS.items()}
    ocean = Ocean.simulate(time, seed)
    truth = array_truth(ocean)
    with tempfile.TemporaryDirectory() as scratch:
        folder = Path(scratch)
        make_demo(folder / "demo", seed=seed, time=time, faults=faults)
        pipeline.run(demo_config(folder / "demo"), folder / "out", until="section", workers=1)
        found = {
            name: compare_model(model_of(ocean, shift), folder / "out", ValidationSettings())
            for name, shift in shifts(ocean, truth)
        }
    return {"months": month_scores(found["truth"], truth), "planted": list(planted_scores(found, truth))}


def month_scores(result: xr.Dataset, truth: xr.Dataset) -> dict[str, dict[str, float]]:
    """Return coverage and z of the model that is the truth: its difference as seen is 0; that of its full field is its
    own departure from the truth, which the coarse grid makes."""
    depth = result["model_isotherm_depth"] - result["array_isotherm_depth"]
    scores = {"isotherm depth at moorings, as seen": covered(depth, result["isotherm_depth_difference_error"])}
    for name in ("thermocline_slope", "warm_water_volume", "equatorial_isotherm_depth"):
        seen, whole = result[f"{name}_seen_difference"], result[f"{name}_difference"]
        own = result[f"full_{name}"] - truth[name].assign_coords(time=result["time"])
        parts = (
            [("", {})] if name != "warm_water_volume" else [(f" {r}", {"region": r}) for r in result["region"].values]
        )
        if name.startswith("equatorial"):
            parts = [(", 150E-266E", {"longitude": slice(150.0, 266.0)})]
        for label, pick in parts:
            errors = [result[f"{name}_{kind}_error"].sel(pick) for kind in ("seen_difference", "difference")]
            scores[f"{name}{label}, as seen"] = covered(seen.sel(pick), errors[0])
            scores[f"{name}{label}, whole"] = covered((whole - own).sel(pick), errors[1])
    return scores


def covered(error: xr.DataArray, stated: xr.DataArray) -> dict[str, float]:
    """Return the coverage of the 95 % interval, the mean and the rms of error over stated, and the rms error."""
    error, stated = xr.broadcast(error, stated)
    known = np.isfinite(error.values) & np.isfinite(stated.values)
    wrong, said = error.values[known], stated.values[known]
    z = wrong / said
    return {
        "coverage": float((np.abs(z) <= QUANTILE).mean()),
        "mean z": float(z.mean()),
        "rms z": float(np.sqrt((z**2).mean())),
        "ratio": float(said.mean() / np.sqrt((wrong**2).mean())),
    }


def planted_scores(found: dict[str, xr.Dataset], truth: xr.Dataset) -> Iterator[dict[str, Any]]:
    """Yield a row a planted error and quantity: what was planted, what was found as seen and with sampling left in."""
    for model in ("tilted", "deeper"):
        for quantity, places in PLACES.items():
            for place in places:
                with_error, without = (row_of(found[name], quantity, place) for name in (model, "truth"))
                planted = planted_error(found, model, quantity, place)
                yield {
                    "model": model,
                    "quantity": f"{quantity} {place}",
                    "planted": planted,
                    "as seen": with_error["bias"],
                    "half-width": 0.5 * (with_error["bias_high"] - with_error["bias_low"]),
                    "held": bool(with_error["bias_low"] <= planted <= with_error["bias_high"]),
                    "told apart": bool(with_error["bias_low"] > 0.0 or with_error["bias_high"] < 0.0),
                    "whole held": abs(
                        with_error["mean_difference"] - planted - own_departure(found, truth, quantity, place)
                    )
                    <= QUANTILE * with_error["mean_difference_error"],
                    "whole": with_error["mean_difference"],
                    "whole half-width": QUANTILE * with_error["mean_difference_error"],
                    "model's share": (with_error["bias"] - without["bias"]) / planted if planted else np.nan,
                    "sampling's share": (with_error["mean_hidden"] - without["mean_hidden"]) / planted
                    if planted
                    else np.nan,
                }


def planted_error(found: dict[str, xr.Dataset], model: str, quantity: str, place: str) -> float:
    """Return by how much the model differs from the ocean, over the record: of the whole basin, or at the moorings."""
    if place == "array":
        moved = found[model]["model_isotherm_depth"] - found["truth"]["model_isotherm_depth"]
        return float(moved.mean("mooring").mean())
    pick = {"region": place} if place != "equator" else {}
    means = [found[name][f"full_{quantity}"].sel(pick).mean().item() for name in (model, "truth")]
    return float(means[0] - means[1])


def own_departure(found: dict[str, xr.Dataset], truth: xr.Dataset, quantity: str, place: str) -> float:
    """Return by how much the model that is the ocean departs from it between the points of its coarse grid."""
    if place == "array":
        return float("nan")
    pick = {"region": place} if place != "equator" else {}
    return float(found["truth"][f"full_{quantity}"].sel(pick).mean() - truth[quantity].sel(pick).mean())


def row_of(result: xr.Dataset, quantity: str, place: str) -> dict[str, float]:
    """Return the scores of one series."""
    here = (result["quantity"].values == quantity) & (result["place"].values == place)
    row = result.isel(series=int(np.flatnonzero(here)[0]))
    return {str(name): row[name].item() for name in row.data_vars if not row[name].dims and name != "verdict"}


def summarise(scores: Sequence[dict[str, Any]]) -> None:
    """Print means over the seeds with their standard errors."""
    root = np.sqrt(len(scores))
    print(f"\noceans: {len(scores)}; mean over them ± standard error")
    print(f"{'model that is the truth':<52}{'coverage':>18}{'mean z':>9}{'rms z':>8}{'half-width ratio':>18}")
    for name in scores[0]["months"]:
        rows = pd.DataFrame([score["months"][name] for score in scores])
        mean, error = rows.mean(), rows.std(ddof=1) / root
        print(
            f"{name:<52}{mean['coverage']:>9.3f} ± {error['coverage']:.3f}{mean['mean z']:>9.2f}"
            f"{np.sqrt((rows['rms z'] ** 2).mean()):>8.2f}{mean['ratio']:>18.2f}"
        )
    table = pd.DataFrame([row for score in scores for row in score["planted"]])
    print(
        f"\n{'planted error':<38}{'planted':>10}{'as seen':>10}{'± 95 %':>9}{'held':>7}{'told apart':>11}"
        f"{'model':>8}{'sampling':>9}{'whole':>10}{'± 95 %':>9}{'held':>7}"
    )
    for (model, quantity), rows in table.groupby(["model", "quantity"], sort=False):
        unit = 1e14 if "volume" in quantity else 1.0
        values = [
            rows[name].mean() / unit for name in ("planted", "as seen", "half-width", "whole", "whole half-width")
        ]
        shares = [rows[name].mean() for name in SHARES]
        print(
            f"{model + ', ' + quantity:<38}{values[0]:>10.3f}{values[1]:>10.3f}{values[2]:>9.3f}{shares[0]:>7.2f}"
            f"{shares[1]:>11.2f}{shares[2]:>8.2f}{shares[3]:>9.2f}{values[3]:>10.3f}{values[4]:>9.3f}{shares[4]:>7.2f}"
        )


def main() -> None:
    """Score what the arguments name."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--seeds", type=lambda text: [int(seed) for seed in text.split(",")], required=True)
    parser.add_argument("--years", type=int, default=3)
    parser.add_argument("--json", type=Path)
    chosen = parser.parse_args()
    scores = []
    for seed in chosen.seeds:
        scores.append(seed_scores(seed, chosen.years))
        print(f"seed {seed}", flush=True)
    summarise(scores)
    if chosen.json:
        chosen.json.write_text(json.dumps(scores, indent=1, default=float) + "\n", encoding="utf-8")


if __name__ == "__main__":
    main()
