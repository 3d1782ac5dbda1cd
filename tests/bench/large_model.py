"""A model larger than memory against the demo array: peak memory and time, one worker and two, half the size and whole.

    python tests/bench/large_model.py [--gigabytes 8] [--folder FOLDER] [--formats netcdf,zarr]

The model is daily potential temperature at 0.25 degrees and 33 levels, float32, of as many days as the size needs: six
years at 8 GB, the length of the array's record. Each comparison is a fresh process whose workers are spawned; its
memory is that of all of them together, pages that they share counted once (PSS), sampled ten times a second.
"""

from __future__ import annotations

import argparse
import subprocess
import sys
import tempfile
import time
from pathlib import Path

import netCDF4
import numpy as np
import psutil
import xarray as xr
from measure import ROOT, show

from profiles import pipeline
from profiles.config import load_config

LATITUDE = np.arange(-5.25, 5.3, 0.25)
LONGITUDE = np.arange(119.5, 280.6, 0.25)
DEPTH = np.concatenate([np.arange(5.0, 251.0, 10.0), np.arange(275.0, 451.0, 25.0)])
FIRST = "2031-01-01"
DAY_BYTES = 4 * LATITUDE.size * LONGITUDE.size * DEPTH.size
BATCH = 16  # days written at a time
COMPARE = """
import sys, dask
from profiles.validation import compare_model
if __name__ == "__main__":
    with dask.config.set(scheduler="processes", num_workers=int(sys.argv[3])):
        compare_model(sys.argv[1], sys.argv[2])
"""


def water(first: int, count: int) -> np.ndarray:
    """Return invented temperatures, (day, depth, latitude, longitude): a thermocline that tilts and waves."""
    day = first + np.arange(count)[:, None, None, None]
    x, y, z = LONGITUDE, LATITUDE[:, None], DEPTH[:, None, None]
    middle = 160.0 - 0.75 * (x - 140.0) + 15.0 * np.sin(2 * np.pi * (x / 60.0 - day / 90.0)) * np.exp(-((y / 3.0) ** 2))
    width = 25.0 + 0.1 * (x - 120.0) / 1.6
    return (19.0 - 9.5 * np.tanh((z - np.maximum(middle, 25.0)) / width)).astype(np.float32)


def write_netcdf(path: Path, days: int) -> None:
    """Write the model as one NetCDF file, a chunk a day, not compressed."""
    with netCDF4.Dataset(path, "w") as file:
        for name, values, attributes in (
            ("lev", DEPTH, {"standard_name": "depth", "units": "m", "positive": "down"}),
            ("lat", LATITUDE, {"units": "degrees_north"}),
            ("lon", LONGITUDE, {"units": "degrees_east"}),
        ):
            file.createDimension(name, values.size)
            variable = file.createVariable(name, "f8", (name,))
            variable[:] = values
            variable.setncatts(attributes)
        file.createDimension("time", None)
        stamp = file.createVariable("time", "f8", ("time",))
        stamp.units = f"days since {FIRST}"
        dims = ("time", "lev", "lat", "lon")
        chunks = (1, DEPTH.size, LATITUDE.size, LONGITUDE.size)
        temperature = file.createVariable("thetao", "f4", dims, chunksizes=chunks)
        temperature.setncatts({"standard_name": "sea_water_potential_temperature", "units": "degree_Celsius"})
        for start in range(0, days, BATCH):
            count = min(BATCH, days - start)
            stamp[start : start + count] = np.arange(start, start + count) + 0.5
            temperature[start : start + count] = water(start, count)


def write_zarr(source: Path, store: Path) -> None:
    """Write the same as a Zarr store."""
    with xr.open_dataset(source, chunks={"time": BATCH}) as dataset:
        for name in dataset.variables:
            dataset[name].encoding = {}
        dataset.to_zarr(store, mode="w", consolidated=False)


def compare(model: Path, out: Path, workers: int) -> tuple[float, float]:
    """Return the seconds that a comparison takes in a fresh process, and the peak memory of all its processes, MB."""
    started = time.perf_counter()
    process = subprocess.Popen([sys.executable, "-c", COMPARE, str(model), str(out), str(workers)])
    peak = 0
    while process.poll() is None:
        peak = max(peak, memory_of(process.pid))
        time.sleep(0.1)
    if process.returncode:
        raise SystemExit(f"the comparison of {model} ended with {process.returncode}")
    return time.perf_counter() - started, peak / 1e6


def memory_of(pid: int) -> int:
    """Return the memory of a process and of what it started, bytes; each page is shared out among who holds it."""
    total = 0
    try:
        process = psutil.Process(pid)
        for one in [process, *process.children(recursive=True)]:
            total += one.memory_full_info().pss
    except psutil.NoSuchProcess:
        return total
    return total


def measure(folder: Path, gigabytes: float, formats: list[str]) -> None:
    """Write the models, compare them, print the table."""
    out = folder / "out"
    pipeline.run(load_config(ROOT / "data_demo" / "array.toml"), out, until="section", workers=2)
    rows = []
    for form in formats:
        seconds: dict[tuple[float, int], float] = {}
        for share in (0.5, 1.0):
            days = round(share * gigabytes * 1e9 / DAY_BYTES)
            path = folder / f"model_{share:g}.nc"
            write_netcdf(path, days)
            if form == "zarr":
                write_zarr(path, path.with_suffix(".zarr"))
                path = path.with_suffix(".zarr")
            for workers in (1, 2) if share == 1.0 else (1,):
                seconds[share, workers], peak = compare(path, out, workers)
                rows.append(
                    (f"{form}, {days * DAY_BYTES / 1e9:.2f} GB, {workers} worker", seconds[share, workers], peak)
                )
        rows.append((f"{form}: twice the size, times as long", seconds[1.0, 1] / seconds[0.5, 1], ""))
        rows.append((f"{form}: two workers, times as fast", seconds[1.0, 1] / seconds[1.0, 2], ""))
    show("a large model against the demo array", ("comparison", "s", "peak MB"), rows)


def main() -> None:
    """Measure what the arguments name."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--gigabytes", type=float, default=8.0)
    parser.add_argument("--folder", type=Path, help="where the models are written and left; default a temporary one")
    parser.add_argument("--formats", type=lambda text: text.split(","), default=["netcdf", "zarr"])
    chosen = parser.parse_args()
    if chosen.folder:
        chosen.folder.mkdir(parents=True, exist_ok=True)
        measure(chosen.folder, chosen.gigabytes, chosen.formats)
        return
    with tempfile.TemporaryDirectory() as scratch:
        measure(Path(scratch), chosen.gigabytes, chosen.formats)


if __name__ == "__main__":
    main()
