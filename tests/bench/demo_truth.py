"""The demo run scored against the truth of its simulated ocean.

    python tests/bench/demo_truth.py [--out FOLDER] [--truth data_demo/truth]

Faults: an event is caught where at least half of its values are flagged questionable or bad on the right sensor, and
called right where the table of faults has an entry of the right kind there at that time. Errors: rms of result minus
truth beside the stated standard error, and the share of truth inside the stated 95 % interval.
"""

from __future__ import annotations

import argparse
import tempfile
from collections.abc import Iterable
from pathlib import Path

import numpy as np
import pandas as pd
import xarray as xr
from measure import ROOT, run_demo, show

from profiles.vocabulary import Flag, IsothermStatus

#: What the table of faults calls the planted kinds; the others have no test of their own yet.
CALLED = {"spike": "spike", "stuck_value": "stuck", "out_of_range": "out of range"}
FLAGGED = [int(Flag.QUESTIONABLE), int(Flag.BAD)]
BRACKETS = [0.0, 12.0, 18.0, 26.0, 36.0, 52.0, 80.0]  # m, edges


def agreement(error: np.ndarray, stated: np.ndarray) -> list[float]:
    """Return bias, rms error, rms stated error, and the share of truth inside the 95 % interval."""
    inside = np.abs(error) < 1.96 * stated
    return [error.mean(), np.sqrt((error**2).mean()), np.sqrt((stated**2).mean()), inside.mean()]


AGREEMENT = ["bias", "rms error", "stated", "inside 95 %"]


# --------------------------------------------------------------------------------------------------------------
# Faults


def score_faults(out: Path, truth: Path) -> None:
    """Print events planted, caught and rightly called by kind, and the share of good values flagged."""
    planted = pd.read_csv(truth / "faults.csv", parse_dates=["start", "end"])
    listed = pd.read_csv(out / "tables" / "faults.csv", parse_dates=["start", "end"])
    scored, counts = [], np.zeros(3, dtype=int)
    for path in sorted((out / "chains").glob("*.nc")):
        with xr.open_dataset(path) as chain:
            flags = chain["temperature_qc"].load()
        good = flags != int(Flag.MISSING)
        for event in planted[planted["mooring"] == path.stem].itertuples():
            place = {"depth": np.float32(event.depth), "time": _during(event)}
            values = flags.sel(place)
            values = values[values != int(Flag.MISSING)]
            scored.append((event.kind, float(values.isin(FLAGGED).mean()) >= 0.5, _is_called_right(event, listed)))
            good.loc[place] = False
        sound = flags.values[good.values]
        counts += [sound.size, *((sound == flag).sum() for flag in FLAGGED)]
    table = pd.DataFrame(scored, columns=["kind", "caught", "called right"]).groupby("kind")
    summary = pd.concat([table.size().rename("planted"), table.sum()], axis=1)
    show(
        "Faults, events",
        ["kind", *summary.columns],
        [
            [str(kind), *(f"{count}" for count in row)]
            for kind, row in zip(summary.index, summary.to_numpy(), strict=True)
        ],
    )
    show(
        "Values outside the planted faults",
        ["", "values", "share, %"],
        [
            ["all", f"{counts[0]}", ""],
            ["flagged questionable", f"{counts[1]}", 100.0 * counts[1] / counts[0]],
            ["flagged bad", f"{counts[2]}", 100.0 * counts[2] / counts[0]],
        ],
    )


def _during(event: object) -> slice:
    return slice(event.start.tz_localize(None), event.end.tz_localize(None))


def _is_called_right(event: object, listed: pd.DataFrame) -> bool:
    entries = listed[(listed["mooring"] == event.mooring) & (listed["depth"] == event.depth)]
    overlapping = entries[(entries["start"] <= event.end) & (entries["end"] >= event.start)]
    return bool((overlapping["kind"] == CALLED.get(event.kind, event.kind)).any())


# --------------------------------------------------------------------------------------------------------------
# Isotherm depth


def score_isotherm(out: Path, truth: Path) -> None:
    """Print the error of the isotherm depth by status and by bracket, and the statuses given against the true ones."""
    with xr.open_dataset(truth / "sites.nc") as sites:
        compared = pd.concat(
            [_compared(path, sites.sel(mooring=path.stem)) for path in sorted((out / "columns").glob("*.nc"))]
        )
    by_status = [
        [
            IsothermStatus(status).name.lower().replace("_", " "),
            f"{len(rows)}",
            f"{rows['outcropped'].mean():.4f}",
            *_errors(rows),
        ]
        for status, rows in compared.groupby("status")
    ]
    head = ["days", "truly outcropped", *AGREEMENT]
    show("Isotherm depth by status, m", ["status", *head], by_status)
    given = compared[compared["stated"].notna() & compared["error"].notna()]
    bracketed = given.groupby(pd.cut(given["bracket"], BRACKETS), observed=True)
    show(
        "Isotherm depth by bracket, m",
        ["bracket", "days", *AGREEMENT],
        [[f"{edges.left:g} to {edges.right:g}", f"{len(rows)}", *_errors(rows)] for edges, rows in bracketed]
        + [["all", f"{len(given)}", *_errors(given)]],
    )


def _compared(path: Path, site: xr.Dataset) -> pd.DataFrame:
    with xr.open_dataset(path) as columns:
        site = site.reindex(time=columns["time"])
        return pd.DataFrame(
            {
                "error": columns["isotherm_depth"].values - site["isotherm_depth"].values,
                "stated": columns["isotherm_depth_error"].values,
                "status": columns["isotherm_status"].values.astype(int),
                "bracket": columns["bracket"].values,
                "outcropped": site["outcropped"].values,
            }
        )


def _errors(rows: pd.DataFrame) -> list[float | str]:
    """Return the agreement where a depth is given, of which only bias and rms where no error is stated."""
    rows = rows[rows["error"].notna()]
    if rows.empty:
        return [""] * len(AGREEMENT)
    found = agreement(rows["error"].to_numpy(), rows["stated"].to_numpy())
    return found if rows["stated"].notna().all() else [*found[:2], "", ""]


# --------------------------------------------------------------------------------------------------------------
# Tilt and volume


def score_array(out: Path, truth: Path) -> None:
    """Print the errors of tilt and volume, and of the equatorial section by longitude."""
    with (
        xr.open_dataset(truth / "array.nc") as true,
        xr.open_dataset(out / "section.nc") as section,
        xr.open_dataset(out / "volume.nc") as volume,
    ):
        rows = [
            [
                "slope, m per 1000 km",
                *_series(section["thermocline_slope"], section["thermocline_slope_error"], true["thermocline_slope"]),
            ]
        ]
        for region in volume["region"].values:
            part = volume.sel(region=region) / 1e14
            rows.append(
                [
                    f"volume {region}, 10^14 m3",
                    *_series(
                        part["warm_water_volume"],
                        part["warm_water_volume_error"],
                        true["warm_water_volume"].sel(region=region) / 1e14,
                    ),
                ]
            )
        show("Monthly tilt and volume", ["", "months", *AGREEMENT], rows)
        error = section["equatorial_isotherm_depth"] - true["equatorial_isotherm_depth"].values
        stated = section["equatorial_isotherm_depth_error"]
        show("Equatorial section, m", ["longitude", "values", *AGREEMENT], _by_longitude(error, stated))


def _series(value: xr.DataArray, stated: xr.DataArray, true: xr.DataArray) -> list[float | str]:
    months = [data["time"].values.astype("datetime64[M]") for data in (value, true)]
    np.testing.assert_array_equal(*months)
    return [f"{value.size}", *agreement(value.values - true.values, stated.values)]


def _by_longitude(error: xr.DataArray, stated: xr.DataArray) -> Iterable[list[float | str]]:
    for west, east in ((120, 149), (149, 190), (190, 230), (230, 266), (266, 280)):
        inside = (error["longitude"] > west) & (error["longitude"] < east)
        part = error.values[:, inside.values]
        there = np.isfinite(part)
        yield [f"{west}E to {east}E", f"{there.sum()}", *agreement(part[there], stated.values[:, inside.values][there])]


def main() -> None:
    """Run where there is no run, score, print."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--out", type=Path, help="a finished run of the demo; without it the demo is run first")
    parser.add_argument("--truth", type=Path, default=ROOT / "data_demo" / "truth")
    options = parser.parse_args()
    with tempfile.TemporaryDirectory() as folder:
        out = options.out or Path(folder) / "out"
        if options.out is None:
            run_demo(out, workers=2)
        for score in (score_faults, score_isotherm, score_array):
            score(out, options.truth)


if __name__ == "__main__":
    main()
