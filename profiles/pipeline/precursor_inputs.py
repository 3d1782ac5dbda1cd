"""Where the monthly series of a precursor analysis come from: a run, or files."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import xarray as xr
from numpy.typing import NDArray

from profiles import store
from profiles.config import ColumnSettings, PrecursorSettings, SectionSettings, validated
from profiles.errors import DataError, RequestError
from profiles.pipeline.paths import Folder

NOISE = 1.5  # m; error of a monthly isotherm depth where a file of depths states none (ours)
SHALLOWEST = 5.0  # m; a sensor no deeper than this stands for the surface (ours)

#: Series of a run or a file, by the names that tables, files and figures give them.
PREDICTORS: Mapping[str, str] = {
    "volume": "warm_water_volume_total",
    "western_volume": "warm_water_volume_west",
    "tilt": "thermocline_slope",
}


@dataclass(frozen=True)
class Sources:
    """What the command was given: files, and what in them is meant."""

    sst: Path | None = None
    sst_variable: str | None = None
    series: Path | None = None
    wind: Path | None = None
    wind_variable: str | None = None
    pressure: Path | None = None
    missing: float | None = None

    def files(self) -> list[Path]:
        """Return the files that were named."""
        return [path for path in (self.sst, self.series, self.wind, self.pressure) if path is not None]


@dataclass(frozen=True)
class Inputs:
    """The series.

    ``index`` and ``predictors`` are monthly series, not anomalies; ``section`` is the equatorial isotherm depth on
    (time, longitude), where there is one; ``inputs`` are the files that were read; ``notes`` say where they came from.
    """

    index: xr.DataArray
    predictors: Mapping[str, xr.DataArray]
    section: xr.DataArray | None
    inputs: tuple[Path, ...]
    notes: tuple[str, ...] = field(default=())


def read_inputs(folder: Folder, sources: Sources, settings: PrecursorSettings) -> Inputs:
    """Read every series.

    Raises
    ------
    RequestError
        Where there is neither a run in the folder nor a file to read from instead.
    DataError
        Where a file cannot be used.
    """
    from profiles.precursor import monthly_series, running_mean

    array = _array_series(folder, sources)
    index, index_note, index_files = _index(folder, sources, settings, array)
    predictors = {name: monthly_series(array.series[name], name=full) for name, full in PREDICTORS.items()}
    notes, inputs = [array.note, index_note], [*array.inputs, *index_files]
    for name, path in (("wind", sources.wind), ("pressure", sources.pressure)):
        if path is not None:
            predictors[name] = _other(name, path, sources)
            notes.append(f"{name}: {path.name}")
            inputs.append(path)
    if settings.running_mean > 1:
        predictors = {
            name: monthly_series(running_mean(one, settings.running_mean, kind="trailing"))
            for name, one in predictors.items()
        }
    return Inputs(index, predictors, array.section, tuple(dict.fromkeys(inputs)), tuple(notes))


@dataclass(frozen=True)
class _ArraySeries:
    series: Mapping[str, xr.DataArray]
    section: xr.DataArray | None
    surface: xr.DataArray | None
    inputs: tuple[Path, ...]
    note: str


def _array_series(folder: Folder, sources: Sources) -> _ArraySeries:
    if sources.series is None:
        return _from_run(folder)
    path = sources.series
    if not path.is_file():
        raise RequestError("no such file", where=str(path), expected="NetCDF or CSV", advice="check the path")
    if path.suffix.lower() not in (".nc", ".nc4"):
        return _from_table(path, sources)
    with store.open_dataset(path) as dataset:
        return _from_dataset(dataset.load(), path)


def _from_run(folder: Folder) -> _ArraySeries:
    if not (folder.volume.is_file() and folder.section.is_file()):
        raise RequestError(
            "there is no run with a section in this folder",
            where=str(folder.out),
            expected=f"{folder.volume.name} and {folder.section.name}",
            advice="run `thermotilt run CONFIG` first, or name a file of monthly series with --series",
        )
    with store.open_dataset(folder.volume) as volume, store.open_dataset(folder.section) as section:
        return _of_section(volume.load(), section.load(), (folder.volume, folder.section), "volume and tilt: this run")


def _of_section(volume: xr.Dataset, section: xr.Dataset, inputs: tuple[Path, ...], note: str) -> _ArraySeries:
    regions = volume["warm_water_volume"]
    series = {
        "volume": regions.sel(region="total", drop=True),
        "western_volume": regions.sel(region="west", drop=True),
        "tilt": section["thermocline_slope"],
    }
    return _ArraySeries(series, section.get("equatorial_isotherm_depth"), None, inputs, note)


def _from_dataset(dataset: xr.Dataset, path: Path) -> _ArraySeries:
    """Read what a run wrote, or monthly isotherm depths of moorings, which are mapped here."""
    if {"warm_water_volume", "thermocline_slope"} <= set(dataset.data_vars):
        return _of_section(dataset, dataset, (path,), f"volume and tilt: {path.name}")
    if "isotherm_depth" in dataset and {"mooring", "time"} == set(dataset["isotherm_depth"].dims):
        return _from_depths(dataset, path)
    raise DataError(
        "neither volume and tilt nor isotherm depths of moorings",
        where=str(path),
        expected="warm_water_volume(time, region) and thermocline_slope(time), or isotherm_depth(mooring, time)",
        found=", ".join(map(str, dataset.data_vars)),
    )


def _from_depths(dataset: xr.Dataset, path: Path) -> _ArraySeries:
    from profiles.section import build_section

    built = build_section(_as_monthly_means(dataset))
    whole = _of_section(built.volume, built.section, (path,), f"volume and tilt: mapped from {path.name}")
    surface = dataset.get("surface_temperature")
    return _ArraySeries(whole.series, whole.section, surface, whole.inputs, whole.note)


def _as_monthly_means(dataset: xr.Dataset) -> xr.Dataset:
    """Return monthly depths with what the map wants to know of each: whole months, the error stated or a usual one."""
    depth = dataset["isotherm_depth"].transpose("mooring", "time")
    missing = {"latitude", "longitude"} - set(dataset.coords) - set(dataset.data_vars)
    if missing:
        raise DataError("the moorings have no position", expected="latitude and longitude", found=str(sorted(missing)))

    def constant(value: float) -> xr.DataArray:
        return xr.full_like(depth, value, dtype=np.float64)

    days = pd.DatetimeIndex(depth["time"].values).days_in_month.to_numpy()
    error = dataset["isotherm_depth_error"] if "isotherm_depth_error" in dataset else constant(NOISE)
    given = {
        "isotherm_depth": depth,
        "isotherm_depth_error_independent": error.transpose("mooring", "time"),
        "isotherm_depth_error_persistent": constant(0.0),
        "isotherm_day_count": constant(0.0) + xr.DataArray(days, dims="time", coords={"time": depth["time"]}),
        "isotherm_day_spread": constant(0.0),
        "deployment": constant(1.0),
    }
    return xr.Dataset(given).assign_coords({name: dataset[name] for name in ("latitude", "longitude")})


def _from_table(path: Path, sources: Sources) -> _ArraySeries:
    """Read a table such as a run's ``volume_and_tilt.csv``."""
    from profiles.precursor import read_series

    series = {
        name: read_series(path, name=full, column=full, missing=sources.missing) for name, full in PREDICTORS.items()
    }
    return _ArraySeries(series, None, None, (path,), f"volume and tilt: {path.name}")


def _index(
    folder: Folder, sources: Sources, settings: PrecursorSettings, array: _ArraySeries
) -> tuple[xr.DataArray, str, list[Path]]:
    from profiles.precursor import box_of, moored_temperature_index, read_series

    box = box_of(settings.box)
    if sources.sst is not None:
        index = read_series(
            sources.sst, name="surface_temperature_index", column=sources.sst_variable, missing=sources.missing, box=box
        )
        area = f", mean of {index.attrs['box']}" if "box" in index.attrs else ", a series as it stands"
        return index, f"index: {sources.sst.name}{area}", [sources.sst]
    surface = array.surface
    files: list[Path] = []
    if surface is None and sources.series is None:
        surface, files = _shallowest(folder)
    if surface is None:
        raise RequestError(
            "there is no surface temperature",
            where="--sst",
            expected="a file: NetCDF on a grid or as a series, CSV, or rows of a year and twelve months",
        )
    index = moored_temperature_index(surface, box, base=base_of(settings))
    short = index.attrs["moorings_too_short"]
    left_out = f"; {short} more are too short" if short else ""
    return index, f"index: shallowest sensors of {index.attrs['moorings']} moorings in {box}{left_out}", files


def _shallowest(folder: Folder) -> tuple[xr.DataArray, list[Path]]:
    """Return the monthly mean temperature of each mooring's shallowest sensor, °C, (mooring, time)."""
    used = column_settings(folder).use_flags
    means: dict[str, pd.Series[float]] = {}
    places: dict[str, list[float]] = {"latitude": [], "longitude": []}
    files = []
    for path in sorted((folder.out / "chains").glob("*.nc")):
        with store.open_dataset(path) as chain:
            if not chain.sizes["depth"] or float(chain["depth"][0]) > SHALLOWEST:
                continue
            top = chain[["temperature", "temperature_qc"]].isel(depth=0).load()
            for name, listed in places.items():
                listed.append(float(chain[name]))
        good = top["temperature"].where(top["temperature_qc"].isin(used))
        means[path.stem] = _monthly(good.values.astype(np.float64), pd.DatetimeIndex(top["time"].values))
        files.append(path)
    if not means:
        raise RequestError(
            "no mooring has a sensor near the surface",
            where="--sst",
            expected=f"a sensor no deeper than {SHALLOWEST:g} m, or a file",
            advice="name a file of surface temperature with --sst",
        )
    table = pd.DataFrame(means).sort_index()
    months = pd.period_range(table.index[0], table.index[-1], freq="M")
    surface = xr.DataArray(
        table.reindex(months).to_numpy().T,
        dims=("mooring", "time"),
        coords={"mooring": list(means), "time": months.to_timestamp().to_numpy()}
        | {name: ("mooring", listed) for name, listed in places.items()},
        name="surface_temperature",
    )
    return surface, files


def _monthly(values: NDArray[np.float64], times: pd.DatetimeIndex) -> pd.Series[float]:
    """Return the means of the months of which half the days or more have a value."""
    daily = pd.Series(values, index=times).groupby(times.floor("D")).mean()
    months = pd.DatetimeIndex(daily.index).to_period("M")
    grouped = daily.groupby(months)
    mean, count = grouped.mean(), grouped.count()
    return mean.where(count >= 0.5 * pd.PeriodIndex(mean.index).days_in_month)


def _other(name: str, path: Path, sources: Sources) -> xr.DataArray:
    from profiles.precursor import pressure_difference_index, read_series

    if name == "wind":
        return read_series(path, name="wind", column=sources.wind_variable, missing=sources.missing)
    if path.suffix.lower() == ".csv":
        columns = set(pd.read_csv(path, nrows=0, skipinitialspace=True).columns.str.strip())
        if {"east", "west"} <= columns:
            east, west = (
                read_series(path, name=f"pressure_{side}", column=side, missing=sources.missing)
                for side in ("east", "west")
            )
            return pressure_difference_index(east, west)
    return read_series(path, name="pressure_difference_index", missing=sources.missing)


def _configured(folder: Folder) -> dict[str, Any]:
    account = store.read_record(folder.account) or {}
    configuration = account.get("configuration")
    return configuration if isinstance(configuration, dict) else {}


def column_settings(folder: Folder) -> ColumnSettings:
    """Return the settings by which the run read off its columns."""
    return validated(ColumnSettings, _configured(folder).get("column", {}), folder.account)


def section_settings(folder: Folder) -> SectionSettings:
    """Return the settings by which the run made its section."""
    return validated(SectionSettings, _configured(folder).get("section", {}), folder.account)


def precursor_settings(folder: Folder) -> PrecursorSettings:
    """Return the settings of the run's configuration, or the defaults."""
    return validated(PrecursorSettings, _configured(folder).get("precursor", {}), folder.account)


def array_description(folder: Folder) -> dict[str, str]:
    """Return what the run's configuration says of its array, empty where there is no run."""
    described = _configured(folder).get("array", {})
    return {str(key): str(value) for key, value in described.items()} if isinstance(described, dict) else {}


def base_of(settings: PrecursorSettings) -> tuple[str, str] | None:
    """Return the base of anomalies, None where it is each whole record."""
    return (settings.base[0], settings.base[1]) if settings.base else None
