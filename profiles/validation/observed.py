"""The array's side: what its sensors read, averaged as the model averages, and what follows from it by month."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
import xarray as xr
from numpy.typing import NDArray
from pydantic import ValidationError

from profiles import store
from profiles.column import columns_of, isotherm_depth_error, steepest_gradient_depth
from profiles.config import ColumnSettings, MeansSettings, SectionSettings, ValidationSettings
from profiles.errors import DataError, RequestError
from profiles.section import join_moorings, monthly_means
from profiles.validation.calendars import DAILY, ModelTime
from profiles.validation.full_model import MonthlySums, least_steps
from profiles.vocabulary import Flag

Floats = NDArray[np.float64]

#: Parts of the isotherm's persistent error: without that of the straight line between sensors, which a model seen by
#: the same sensors shares; and that of the leaning of the line alone.
MEASURED, LEAN = "isotherm_depth_error_measured", "isotherm_depth_error_lean"


@dataclass(frozen=True)
class Array:
    """A finished run: its folder, the settings it was made with, and the moorings whose chains it holds."""

    folder: Path
    name: str
    column: ColumnSettings
    section: SectionSettings
    validation: ValidationSettings
    moorings: tuple[str, ...]

    def chain(self, mooring: str) -> Path:
        """Return where a mooring's flagged chain is."""
        return self.folder / "chains" / f"{mooring}.nc"


def open_array(folder: str | Path) -> Array:
    """Open a finished run's folder.

    Raises
    ------
    RequestError
        Where it is no folder of a run.
    DataError
        Where the run did not come as far as chains.
    """
    path = Path(folder)
    account = store.read_record(path / "run.json")
    if account is None or "configuration" not in account:
        raise RequestError(
            "not the folder of a finished run",
            where=str(path),
            expected="run.json, chains/ and what else `thermotilt run` writes",
            found="nothing there" if not path.exists() else "no run.json that can be read",
            advice="run the array first: thermotilt run CONFIG --out FOLDER",
        )
    configuration = account["configuration"]
    known = [mooring["id"] for mooring in configuration["moorings"]]
    present = tuple(name for name in known if (path / "chains" / f"{name}.nc").is_file())
    if not present:
        raise DataError(
            "the run has no flagged chain",
            where=str(path / "chains"),
            expected="a file per mooring",
            advice="run it at least until the stage column",
        )
    column, section, validation = _settings_of(configuration, path)
    return Array(
        folder=path,
        name=configuration["array"]["name"],
        column=column,
        section=section,
        validation=validation,
        moorings=present,
    )


def _settings_of(
    configuration: dict[str, Any], path: Path
) -> tuple[ColumnSettings, SectionSettings, ValidationSettings]:
    """Return the settings that a run was made with; raise DataError where this version does not know them."""
    try:
        return (
            ColumnSettings.model_validate(configuration["column"]),
            SectionSettings.model_validate(configuration["section"]),
            ValidationSettings.model_validate(configuration.get("validation", {})),
        )
    except ValidationError as error:
        keys = ", ".join(".".join(str(part) for part in detail["loc"]) for detail in error.errors())
        raise DataError(
            "the run was made with settings that this version does not know",
            where=str(path / "run.json"),
            found=keys,
            advice="run the array again with this version: thermotilt run CONFIG --out FOLDER",
        ) from None


@dataclass(frozen=True)
class Sensors:
    """What the sensors read at steps of the comparison, sensors of every mooring from the shallowest, NaN where none.

    ``temperature`` and ``sensor_depth`` (step, mooring, sensor), °C and m; ``uncertainty`` and ``nominal`` (mooring,
    sensor); ``deployment`` (step, mooring); ``moved`` (mooring,), whether a chain says where its sensors really were.
    """

    time: ModelTime
    moorings: tuple[str, ...]
    latitude: Floats
    longitude: Floats
    temperature: Floats
    sensor_depth: Floats
    uncertainty: Floats
    nominal: Floats
    deployment: NDArray[np.int64]
    moved: NDArray[np.bool_]


def read_sensors(array: Array, time: ModelTime) -> Sensors:
    """Read the array at the steps of a model.

    A step has a value where enough of its time has one: the share of a day, or the number of days of a month, that the
    array's own means need.
    """
    read = [_read_chain(array, name, time) for name in array.moorings]
    most = max(part["temperature"].shape[1] for part in read)
    stacked = {
        name: np.stack([_padded(part[name], most) for part in read], axis=-2)
        for name in ("temperature", "sensor_depth", "uncertainty", "nominal")
    }
    return Sensors(
        time=time,
        moorings=array.moorings,
        latitude=np.array([part["latitude"] for part in read]),
        longitude=np.array([part["longitude"] for part in read]),
        deployment=np.stack([part["deployment"] for part in read], axis=-1),
        moved=np.array([part["moved"] for part in read]),
        **stacked,
    )


def _padded(values: Floats, sensors: int) -> Floats:
    missing = [(0, 0)] * (values.ndim - 1) + [(0, sensors - values.shape[-1])]
    return np.pad(values, missing, constant_values=np.nan)


def _read_chain(array: Array, name: str, time: ModelTime) -> dict[str, Any]:
    """Return one chain averaged over the steps, block by block."""
    steps = time.start.size
    with store.open_dataset(array.chain(name)) as chain:
        sensors = chain.sizes["depth"]
        total, count, depths, depth_count = np.zeros((4, steps, sensors))
        deployment = np.zeros(steps, dtype=np.int64)
        hours = _nominal_hours(chain["time"].values)
        for block in store.padded_blocks(chain.sizes["time"], store.TIME_BLOCK):
            part = chain.isel(time=block.padded).load()
            place = _step_of(part["time"].values, time)
            inside = place >= 0
            used = part["temperature_qc"].isin(list(array.column.use_flags))
            warm = part["temperature"].where(used).transpose("time", "depth").values[inside].astype(np.float64)
            _add(total, count, place[inside], warm)
            if "sensor_depth" in part:
                deep = part["sensor_depth"].transpose("time", "depth").values[inside].astype(np.float64)
                _add(depths, depth_count, place[inside], deep)
            if "deployment" in part:
                np.maximum.at(deployment, place[inside], part["deployment"].values[inside].astype(np.int64))
        nominal = chain["depth"].values.astype(np.float64)
        moved = "sensor_depth" in chain
        with np.errstate(invalid="ignore"):
            warm = np.where(count >= _least(time, hours, array.section.means), total / count, np.nan)
            deep = depths / depth_count if moved else np.broadcast_to(nominal, total.shape)
        return {
            "temperature": warm,
            "sensor_depth": np.where(np.isfinite(warm), deep, np.nan),
            "uncertainty": chain["temperature_uncertainty"].values.astype(np.float64),
            "nominal": nominal,
            "deployment": deployment,
            "moved": moved,
            "latitude": float(chain["latitude"]),
            "longitude": float(chain["longitude"]),
        }


def _nominal_hours(times: NDArray[np.datetime64]) -> float:
    steps = np.diff(times) / np.timedelta64(1, "h")
    return float(np.median(steps)) if steps.size else 24.0


def _step_of(times: NDArray[np.datetime64], time: ModelTime) -> NDArray[np.int64]:
    """Return the step that each time lies in, -1 where it lies in none."""
    place = np.searchsorted(time.start, times, side="right") - 1
    inside = (place >= 0) & (times < time.stop[np.maximum(place, 0)])
    return np.where(inside, place, -1)


def _add(total: Floats, count: Floats, place: NDArray[np.int64], values: Floats) -> None:
    present = np.isfinite(values)
    np.add.at(total, place, np.where(present, values, 0.0))
    np.add.at(count, place, present.astype(np.float64))


def _least(time: ModelTime, hours: float, settings: MeansSettings) -> float:
    """Return how many values a step needs."""
    a_day = max(1.0, round(24.0 / hours))
    if time.averaging == DAILY:
        return max(1.0, settings.daily_share * a_day)
    share = settings.monthly_days / 30.4375 if time.days > 27.0 else settings.daily_share
    return max(1.0, share * time.days * a_day)


# --------------------------------------------------------------------------------------------------------------
# Columns and months


def columns_at_steps(sensors: Sensors, temperature: Floats, settings: ColumnSettings) -> dict[str, xr.Dataset]:
    """Return the columns of every mooring at the steps from ``temperature`` (step, mooring, sensor), which is the
    array's or a model's at the same sensors."""
    return {
        name: _columns(sensors, place, temperature[:, place], settings) for place, name in enumerate(sensors.moorings)
    }


def _columns(sensors: Sensors, place: int, temperature: Floats, settings: ColumnSettings) -> xr.Dataset:
    there = np.isfinite(sensors.nominal[place])
    coordinates = {"time": sensors.time.middle, "depth": sensors.nominal[place, there]}
    both = ("time", "depth")
    chain = xr.Dataset(
        {
            "temperature": (both, temperature[:, there]),
            "temperature_qc": (both, np.full((temperature.shape[0], there.sum()), int(Flag.GOOD), np.int8)),
            "temperature_uncertainty": ("depth", sensors.uncertainty[place, there]),
            "deployment": ("time", sensors.deployment[:, place]),
        },
        coords=coordinates,
    )
    if sensors.moved[place]:
        chain["sensor_depth"] = (both, sensors.sensor_depth[:, place, there])
    columns = columns_of(chain, settings.model_copy(update={"use_flags": (int(Flag.GOOD),)}))
    steepest = steepest_gradient_depth(chain["temperature"], sensor_depth=chain.get("sensor_depth"))[
        "steepest_gradient_depth"
    ]
    persistent = columns["isotherm_depth_error_persistent"]
    straight = _persistent(chain, settings, motion=0.0)
    leaning = 0.0 if sensors.moved[place] else settings.motion_accuracy
    lean = np.sqrt(np.maximum(_persistent(chain, settings, motion=leaning) ** 2 - straight**2, 0.0))
    measured = np.sqrt(np.maximum(persistent**2 - straight**2, 0.0))
    position = {"mooring": sensors.moorings[place]} | {
        name: float(getattr(sensors, name)[place]) for name in ("latitude", "longitude")
    }
    found = {"steepest_gradient_depth": steepest, MEASURED: measured, LEAN: lean}
    return columns.assign(found).assign_coords(position)


def _persistent(chain: xr.Dataset, settings: ColumnSettings, *, motion: float) -> xr.DataArray:
    """Return the persistent error of a chain of perfect sensors: that of the straight line between them, and of its
    leaning by ``motion``, °C."""
    return isotherm_depth_error(
        chain["temperature"],
        0.0 * chain["temperature_uncertainty"],
        isotherm=settings.isotherm,
        sensor_depth=chain.get("sensor_depth"),
        max_bracket=settings.max_bracket,
        crossing=settings.crossing,
        surface_reach=settings.surface_reach,
        noise=0.0,
        depth_accuracy=0.0,
        motion=motion,
    )["isotherm_depth_error_persistent"]


def by_month(columns: Mapping[str, xr.Dataset], time: ModelTime, settings: MeansSettings) -> xr.Dataset:
    """Return monthly means of all moorings on (mooring, time), as :func:`profiles.section.join_moorings` does,
    with those of the steepest gradient and of the parts of the error."""
    least = least_steps(time.days, settings)
    adapted = settings.model_copy(update={"monthly_days": int(least)})
    joined = join_moorings({name: monthly_means(part, adapted) for name, part in columns.items()})
    months = joined["time"].values.astype("datetime64[M]")
    sums = MonthlySums()
    for name in ("steepest_gradient_depth", MEASURED, LEAN):
        values = np.stack([part[name].values for part in columns.values()], axis=-1)
        sums.add(name, time.month, values)
        means = [sums.mean(name, month, least) for month in months]
        missing = np.full(len(columns), np.nan)
        joined[name] = (("mooring", "time"), np.stack([missing if m is None else m for m in means], axis=-1))
    return joined


def with_days_of_run(monthly: xr.Dataset, array: Array, time: ModelTime) -> xr.Dataset:
    """Return the months with the number of days and their spread as the run found them, where steps are longer than a
    day: what missing days cost a mean can only be told from days."""
    if time.averaging == DAILY:
        return monthly
    own = run_months(array, monthly)
    return monthly.assign(isotherm_day_count=own["isotherm_day_count"], isotherm_day_spread=own["isotherm_day_spread"])


def run_months(array: Array, like: xr.Dataset) -> xr.Dataset:
    """Return the run's own monthly means on the moorings and months of ``like``."""
    with store.open_dataset(array.folder / "columns_monthly.nc") as stored:
        own = stored.load()
    months = own["time"].values.astype("datetime64[M]")
    names = ("isotherm_depth", "isotherm_day_count", "isotherm_day_spread")
    own = own[list(names)].assign_coords(time=months.astype("datetime64[ns]"))
    wanted = like["time"].values.astype("datetime64[M]").astype("datetime64[ns]")
    fill = {"isotherm_day_count": 0}
    placed = own.reindex(mooring=like["mooring"].values, time=wanted, fill_value=fill | _nan(names))
    return placed.assign_coords(time=like["time"].values)


def _nan(names: tuple[str, ...]) -> dict[str, float]:
    return {name: np.nan for name in names if name != "isotherm_day_count"}
