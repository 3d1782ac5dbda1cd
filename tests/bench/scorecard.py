"""The scorecard: the whole line against simulated oceans that no setting was chosen on.

    python tests/bench/scorecard.py --seeds 11,12,13 [--columns-only] [--json FILE] [--workers 2]
    python tests/bench/scorecard.py --deliveries FOLDER --truth FOLDER [--json FILE]

With ``--seeds`` each ocean is simulated, delivered, run and scored. With ``--columns-only`` the isotherm depths of the
sites are taken from the ocean with errors as stated, and only what follows from columns is scored: tilt, volume,
section. With ``--deliveries`` the configuration ``array.toml`` of that folder is run, and scored against a truth that
somebody else made; the format of the truth is that of ``data_demo/README.md``.

Every figure is the mean over the seeds, with its standard error. An interval is a claim only if it is both right and
narrow: coverage about 0.95 and a ratio (mean half-width over 1.96 times the rms error) of at most 1.3.
"""

from __future__ import annotations

import argparse
import json
import tempfile
from collections.abc import Callable, Iterator, Sequence
from concurrent.futures import ProcessPoolExecutor
from dataclasses import dataclass, field
from multiprocessing import get_context
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import xarray as xr

from profiles.vocabulary import Flag, IsothermStatus

QUANTILE = 1.96  # a 95 % interval of a normal error
THIRDS = {"west": (140.0, 188.0), "middle": (188.0, 227.0), "east": (227.0, 270.0)}  # thirds of the array, degrees east
OUTSIDE = {"west of the array": (120.0, 149.0), "east of the array": (266.0, 280.0)}
SEASONS = {"DJF": (12, 1, 2), "MAM": (3, 4, 5), "JJA": (6, 7, 8), "SON": (9, 10, 11)}
BRACKETS = (0.0, 12.0, 18.0, 26.0, 36.0, 52.0, 80.0)  # m
FLAGGED = (int(Flag.QUESTIONABLE), int(Flag.BAD))


@dataclass
class Score:
    """What one ocean scores: intervals by quantity and part, faults by kind, flags, statuses."""

    intervals: dict[str, dict[str, float]] = field(default_factory=dict)
    faults: pd.DataFrame = field(default_factory=pd.DataFrame)
    flagged: dict[str, float] = field(default_factory=dict)
    statuses: pd.DataFrame = field(default_factory=pd.DataFrame)


# --------------------------------------------------------------------------------------------------------------
# Intervals


def interval(error: np.ndarray, stated: np.ndarray) -> dict[str, float]:
    """Return the coverage of the 95 % interval, its half-width over the ideal one, and the rms error."""
    known = np.isfinite(error) & np.isfinite(stated)
    error, stated = error[known], stated[known]
    if error.size == 0:
        return {}
    rms = float(np.sqrt((error**2).mean()))
    return {
        "values": float(error.size),
        "coverage": float((np.abs(error) <= QUANTILE * stated).mean()),
        "ratio": float(stated.mean() / rms),
        "rms": rms,
        "bias": float(error.mean()),
    }


def score_section(section: xr.Dataset, volume: xr.Dataset, truth: xr.Dataset) -> dict[str, dict[str, float]]:
    """Score tilt, volume and equatorial section in the months that both have."""
    section, volume, truth = (by_month(dataset) for dataset in (section, volume, truth))
    section, volume, truth = xr.align(section, volume, truth, join="inner", exclude=["latitude", "longitude", "region"])
    scores = {}
    months = pd.DatetimeIndex(section["time"].values)
    slope_error = section["thermocline_slope"].values - truth["thermocline_slope"].values
    slope_stated = section["thermocline_slope_error"].values
    for part, chosen in by_season(months):
        scores[f"slope, {part}"] = interval(slope_error[chosen], slope_stated[chosen])
    for region in volume["region"].values:
        estimate, known = volume.sel(region=region), truth.sel(region=region)
        error = (estimate["warm_water_volume"].values - known["warm_water_volume"].values) / 1e14
        stated = estimate["warm_water_volume_error"].values / 1e14
        for part, chosen in by_season(months):
            scores[f"volume {region}, {part}"] = interval(error[chosen], stated[chosen])
    longitude = section["longitude"].values
    error = section["equatorial_isotherm_depth"].values - truth["equatorial_isotherm_depth"].values
    stated = section["equatorial_isotherm_depth_error"].values
    for part, (west, east) in (THIRDS | OUTSIDE).items():
        inside = (longitude >= west) & (longitude < east)
        scores[f"equatorial depth, {part}"] = interval(error[:, inside], stated[:, inside])
    return scores


def by_month(dataset: xr.Dataset) -> xr.Dataset:
    """Return the dataset with each month stamped at its start, whatever day it was stamped at."""
    return dataset.assign_coords(time=dataset["time"].values.astype("datetime64[M]").astype("datetime64[ns]"))


def by_season(times: pd.DatetimeIndex) -> Iterator[tuple[str, np.ndarray]]:
    """Yield the whole record and each season, with which times belong to it."""
    yield "all", np.ones(times.size, dtype=bool)
    for season, months in SEASONS.items():
        yield season, times.month.isin(months)


def score_columns(table: pd.DataFrame) -> dict[str, dict[str, float]]:
    """Score the isotherm depths of all profiles by third of the array, season and bracket."""
    given = table[table["error"].notna() & table["stated"].notna()]
    scores = {"isotherm depth, all": interval(given["error"].to_numpy(), given["stated"].to_numpy())}
    parts = [
        pd.cut(given["longitude"], [140.0, 188.0, 227.0, 270.0], labels=list(THIRDS), right=False),
        given["time"].dt.month.map({month: name for name, months in SEASONS.items() for month in months}),
        pd.cut(given["bracket"], list(BRACKETS)).map(lambda width: f"bracket {width.left:g}-{width.right:g} m"),
    ]
    for part in parts:
        for name, group in given.groupby(part, observed=True):
            scores[f"isotherm depth, {name}"] = interval(group["error"].to_numpy(), group["stated"].to_numpy())
    return scores


def column_table(out: Path, sites: xr.Dataset) -> pd.DataFrame:
    """Return a row per profile: what was said and what was true."""
    parts = []
    for mooring in sites["mooring"].values:
        path = out / "columns" / f"{mooring}.nc"
        if not path.is_file():
            continue
        with xr.open_dataset(path) as columns:
            columns = columns.load()
        true = sites.sel(mooring=mooring).reindex(time=columns["time"])
        parts.append(
            pd.DataFrame(
                {
                    "longitude": float(columns["longitude"]),
                    "time": pd.DatetimeIndex(columns["time"].values),
                    "error": columns["isotherm_depth"].values - true["isotherm_depth"].values,
                    "stated": columns["isotherm_depth_error"].values,
                    "bracket": columns["bracket"].values,
                    "given": columns["isotherm_status"].values.astype(int),
                    "true": true_status(true),
                }
            )
        )
    return pd.concat(parts, ignore_index=True)


def true_status(true: xr.Dataset) -> np.ndarray:
    """Return what a chain of many good sensors would have to say."""
    status = np.full(true.sizes["time"], int(IsothermStatus.FOUND))
    if "passages" in true:
        status[true["passages"].values > 1] = int(IsothermStatus.SEVERAL_CROSSINGS)
    status[true["outcropped"].values > 0] = int(IsothermStatus.OUTCROPPED)
    return status


# --------------------------------------------------------------------------------------------------------------
# Faults


def score_faults(out: Path, planted: pd.DataFrame) -> tuple[pd.DataFrame, dict[str, float]]:
    """Return a row per event (kind, caught, what it was called), and the share of good values flagged.

    An event is caught where at least half of its values are flagged on the right sensor and the table of faults has an
    entry of its kind there at that time.
    """
    listed = read_events(out / "tables" / "faults.csv")
    rows: list[dict[str, Any]] = []
    counts = dict.fromkeys(("good", *map(str, FLAGGED)), 0)
    for path in sorted((out / "chains").glob("*.nc")):
        with xr.open_dataset(path) as chain:
            flags = chain["temperature_qc"].load()
        sound = flags.values != int(Flag.MISSING)
        for event in planted[planted["mooring"] == path.stem].itertuples():
            if event.variable != "temperature":
                rows.append({"kind": event.kind, "flagged": False, "named": False, "called": "not a temperature"})
                continue
            place = event_place(event, flags)
            rows.append({"kind": event.kind} | verdict(flags.values[place], event, listed))
            sound[place] = False
        counts["good"] += int(sound.sum())
        for flag in FLAGGED:
            counts[str(flag)] += int((flags.values[sound] == flag).sum())
    shares = {f"good values flagged {flag}": counts[str(flag)] / counts["good"] for flag in FLAGGED}
    return pd.DataFrame(rows), shares


def read_events(path: Path) -> pd.DataFrame:
    """Read a table of faults, planted or listed; its times become UTC without a zone, as in the chains."""
    table = pd.read_csv(path, parse_dates=["start", "end"])
    return table.assign(**{name: table[name].dt.tz_localize(None) for name in ("start", "end")})


def event_place(event: Any, flags: xr.DataArray) -> tuple[np.ndarray, np.ndarray]:
    """Return the index of an event's values: its sensors, from its start to its end, a day's tolerance for stamps."""
    times = pd.DatetimeIndex(flags["time"].values)
    during = np.flatnonzero((times >= event.start) & (times <= event.end))
    depths = [float(depth) for depth in str(event.depths).split()]
    nominal = flags["depth"].values
    sensors = np.array([int(np.argmin(np.abs(nominal - depth))) for depth in depths], dtype=int)
    return np.ix_(during, sensors)


def verdict(flags: np.ndarray, event: Any, listed: pd.DataFrame) -> dict[str, Any]:
    """Return whether an event was flagged, rightly named, and the commonest name it was given."""
    present = flags[flags != int(Flag.MISSING)]
    flagged = present.size > 0 and np.isin(present, FLAGGED).mean() >= 0.5
    depths = [float(depth) for depth in str(event.depths).split()]
    near = listed[
        (listed["mooring"] == event.mooring)
        & listed["depth"].map(lambda depth: min(abs(depth - other) for other in depths) < 0.6)
        & (listed["start"] <= event.end)
        & (listed["end"] >= event.start)
    ]
    called = near.groupby("kind")["count"].sum().idxmax() if len(near) else "nothing"
    return {"flagged": flagged, "named": called == event.kind, "called": called}


# --------------------------------------------------------------------------------------------------------------
# One ocean


def score_run(out: Path, truth: Path) -> Score:
    """Score a finished run against a truth folder."""
    with xr.open_dataset(truth / "sites.nc") as sites, xr.open_dataset(truth / "array.nc") as array:
        sites, array = sites.load(), array.load()
    with xr.open_dataset(out / "section.nc") as section, xr.open_dataset(out / "volume.nc") as volume:
        section, volume = section.load(), volume.load()
    table = column_table(out, sites)
    planted = read_events(truth / "faults.csv")
    events, flagged = score_faults(out, planted)
    statuses = pd.crosstab(table["true"].map(status_name), table["given"].map(status_name))
    return Score(score_columns(table) | score_section(section, volume, array), events, flagged, statuses)


def status_name(status: int) -> str:
    """Return a status as it is printed."""
    return IsothermStatus(status).name.lower().replace("_", " ")


def score_deliveries(deliveries: Path, truth: Path, workers: int) -> Score:
    """Run the configuration ``array.toml`` of a folder, or the only one in it, and score it."""
    from profiles import pipeline
    from profiles.config import load_config

    named = deliveries / "array.toml"
    (config,) = [named] if named.is_file() else deliveries.glob("*.toml")
    with tempfile.TemporaryDirectory() as scratch:
        out = Path(scratch) / "out"
        pipeline.run(load_config(config), out, until="section", workers=workers)
        return score_run(out, truth)


def score_seed(seed: int) -> Score:
    """Simulate, deliver, run and score one ocean."""
    from profiles import pipeline
    from profiles.drill.demo import demo_config, make_demo

    with tempfile.TemporaryDirectory() as scratch:
        folder = Path(scratch)
        make_demo(folder / "demo", seed=seed)
        pipeline.run(demo_config(folder / "demo"), folder / "out", until="section", workers=1)
        return score_run(folder / "out", folder / "demo" / "truth")


def score_columns_only(seed: int) -> Score:
    """Score tilt, volume and section of one ocean whose isotherm depths the sites know to their stated errors."""
    from profiles.drill.array import SITES
    from profiles.drill.demo import days
    from profiles.drill.ocean import Ocean
    from profiles.drill.truth import array_truth, site_columns
    from profiles.section import build_section, join_moorings, monthly_means

    ocean = Ocean.simulate(days(), seed)
    _, whole = site_columns(ocean, SITES)
    depth = whole.isotherm_depth()
    random = np.random.default_rng(seed)
    months = {
        site.id: monthly_means(believed(site, ocean.time, depth[place], random)) for place, site in enumerate(SITES)
    }
    built = build_section(join_moorings(months))
    return Score(score_section(built.section, built.volume, array_truth(ocean)))


PERSISTENT_SD, INDEPENDENT_SD = 1.2, 0.3  # m, of the columns-only sites; of the size that chains state
MISSING_SHARE = 0.12  # of the months of a site


def believed(site: Any, time: np.ndarray, depth: np.ndarray, random: np.random.Generator) -> xr.Dataset:
    """Return daily means at a site as if columns had given them: errors as stated, some months missing."""
    month = time.astype("datetime64[M]")
    year = (time.astype("datetime64[Y]") - time[0].astype("datetime64[Y]")).astype(int)
    offset = PERSISTENT_SD * random.standard_normal(year.max() + 1)[year]
    gone = (random.random(np.unique(month).size) < MISSING_SHARE)[(month - month[0]).astype(int)]
    read = depth + offset + INDEPENDENT_SD * random.standard_normal(depth.size)
    status = np.where(gone, int(IsothermStatus.TOO_FEW_SENSORS), int(IsothermStatus.FOUND))
    known = np.where(gone, np.nan, read)
    return xr.Dataset(
        {
            "isotherm_depth": ("time", known),
            "isotherm_depth_error_independent": ("time", np.where(gone, np.nan, INDEPENDENT_SD)),
            "isotherm_depth_error_persistent": ("time", np.where(gone, np.nan, PERSISTENT_SD)),
            "isotherm_status": ("time", status),
            "mixed_layer_depth": ("time", np.full(depth.size, np.nan)),
            "mean_temperature": ("time", np.full(depth.size, np.nan)),
            "questionable_share": ("time", np.zeros(depth.size)),
            "deployment": ("time", year + 1),
        },
        coords={"time": time, "mooring": site.id, "latitude": site.latitude, "longitude": site.longitude},
    )


# --------------------------------------------------------------------------------------------------------------
# Many oceans


def mean_and_error(values: Sequence[float]) -> tuple[float, float]:
    """Return the mean over seeds and its standard error, NaN for one seed."""
    sample = np.asarray(values, dtype=np.float64)
    spread = float(sample.std(ddof=1) / np.sqrt(sample.size)) if sample.size > 1 else float("nan")
    return float(sample.mean()), spread


def summarise(scores: Sequence[Score]) -> dict[str, Any]:
    """Put the scores of many oceans together."""
    names = list(dict.fromkeys(name for score in scores for name in score.intervals))
    intervals = {}
    for name in names:
        found = [score.intervals[name] for score in scores if score.intervals.get(name)]
        intervals[name] = {key: mean_and_error([one[key] for one in found]) for key in found[0]} if found else {}
    summary: dict[str, Any] = {"seeds": len(scores), "intervals": intervals}
    events = [score.faults for score in scores if len(score.faults)]
    if events:
        table = pd.concat(events, ignore_index=True)
        summary["faults"] = fault_summary(table)
        summary["confusion"] = pd.crosstab(table["kind"], table["called"]).to_dict("index")
        shares = [score.flagged for score in scores]
        summary["flagged"] = {name: mean_and_error([share[name] for share in shares]) for name in shares[0]}
        statuses = pd.concat([score.statuses for score in scores]).groupby(level=0).sum()
        summary["statuses"] = statuses.fillna(0).astype(int).to_dict("index")
    return summary


def fault_summary(table: pd.DataFrame) -> dict[str, dict[str, float]]:
    """Return, by kind, how many were planted, the shares flagged, named and caught, and the binomial standard error."""
    rows = {}
    for kind, group in table.groupby("kind"):
        caught = (group["flagged"] & group["named"]).mean()
        rows[str(kind)] = {
            "planted": float(len(group)),
            "flagged": float(group["flagged"].mean()),
            "named": float(group["named"].mean()),
            "caught": float(caught),
            "standard error": float(np.sqrt(caught * (1.0 - caught) / len(group))),
        }
    return rows


def show(summary: dict[str, Any]) -> None:
    """Print the scorecard."""
    print(f"oceans scored: {summary['seeds']}; mean over them ± standard error\n")
    print(f"{'interval':<44}{'coverage':>16}{'half-width ratio':>20}{'rms error':>18}")
    for name, found in summary["intervals"].items():
        if found:
            cells = [pair(found[key], digits) for key, digits in (("coverage", 3), ("ratio", 2), ("rms", 2))]
            print(f"{name:<44}{cells[0]:>16}{cells[1]:>20}{cells[2]:>18}")
    if "faults" not in summary:
        return
    print(f"\n{'fault':<24}{'planted':>8}{'flagged':>9}{'named':>8}{'caught':>16}")
    for kind, row in summary["faults"].items():
        caught = pair((row["caught"], row["standard error"]), 2)
        print(f"{kind:<24}{row['planted']:>8.0f}{row['flagged']:>9.2f}{row['named']:>8.2f}{caught:>16}")
    print("\nplanted (rows) and what it was called (columns)")
    print(pd.DataFrame.from_dict(summary["confusion"], orient="index").fillna(0).astype(int).to_string())
    print()
    for name, share in summary["flagged"].items():
        print(f"{name}: {share[0]:.5f} ± {share[1]:.5f}")
    print("\nstatus true (rows) and given (columns)")
    print(pd.DataFrame.from_dict(summary["statuses"], orient="index").fillna(0).astype(int).to_string())


def pair(value: tuple[float, float], digits: int) -> str:
    """Return a mean with its standard error as text."""
    mean, error = value
    return f"{mean:.{digits}f}" if np.isnan(error) else f"{mean:.{digits}f} ± {error:.{digits}f}"


def over_seeds(score: Callable[[int], Score], seeds: Sequence[int], workers: int) -> list[Score]:
    """Score the seeds, ``workers`` at a time."""
    if workers == 1:
        return [score(seed) for seed in seeds]
    with ProcessPoolExecutor(workers, mp_context=get_context("spawn")) as pool:
        return list(pool.map(score, seeds))


def main() -> None:
    """Score what the arguments name."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--seeds", type=lambda text: [int(seed) for seed in text.split(",")], default=[])
    parser.add_argument("--columns-only", action="store_true")
    parser.add_argument("--deliveries", type=Path)
    parser.add_argument("--truth", type=Path)
    parser.add_argument("--json", type=Path)
    parser.add_argument("--workers", type=int, default=2)
    chosen = parser.parse_args()
    if bool(chosen.seeds) == bool(chosen.deliveries) or bool(chosen.deliveries) != bool(chosen.truth):
        parser.error("expected either --seeds, or --deliveries with --truth")
    if chosen.deliveries:
        scores = [score_deliveries(chosen.deliveries, chosen.truth, chosen.workers)]
    else:
        score = score_columns_only if chosen.columns_only else score_seed
        scores = over_seeds(score, chosen.seeds, chosen.workers)
    summary = summarise(scores)
    show(summary)
    if chosen.json:
        chosen.json.write_text(json.dumps(summary, indent=1, default=float) + "\n", encoding="utf-8")


if __name__ == "__main__":
    main()
