"""The series that the configuration lists, read and put together: the ingest stage beside the chains."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

import numpy as np
import pandas as pd
import xarray as xr

from profiles import store
from profiles.config import Config, Mooring, SeriesFile
from profiles.errors import DataError, MachineError, RequestError
from profiles.pipeline.listed import message_of, read_log
from profiles.pipeline.paths import DAYS, MONTHS, SERIES, Folder
from profiles.pipeline.task import Report, Task

if TYPE_CHECKING:
    from profiles.ingest import Series

#: Deployments of a series that nobody numbers: the place of its file in the list, from here on.
FIRST_NUMBER = 1000

#: What is said of a mooring without any delivery of which no series has a value.
NOTHING = "it has no delivery, and no series has a value of it"

_TABLES = ("deliveries", "quarantine")


def series_task(config: Config, folder: Folder) -> Task:
    """All files of series to the values of each mooring."""
    files = [config.resolve(path) for listed in config.series for path in (listed.path, listed.layout)]
    if config.recovery_log is not None:
        files.append(config.resolve(config.recovery_log))
    return Task(
        stage="ingest",
        name=SERIES,
        work=ingest_series,
        arguments=(config, folder),
        inputs=tuple(files),
        outputs=(
            *(folder.series(mooring.id, kind) for mooring in config.moorings for kind in (DAYS, MONTHS)),
            *(folder.part(table, SERIES) for table in _TABLES),
        ),
        settings={
            "series": [listed.model_dump(mode="json") for listed in config.series],
            "moorings": [mooring.model_dump(mode="json", exclude={"deliveries"}) for mooring in config.moorings],
            "definitions": {name: getattr(config.column, name) for name in _DEFINITIONS},
        },
    )


_DEFINITIONS = ("isotherm", "mixed_layer_threshold", "mixed_layer_reference", "mean_temperature_bottom")


def ingest_series(config: Config, folder: Folder) -> Report:
    """Read the series; a file that cannot be used is reported, and the others still are.

    The report says of which moorings there are values of days, of months or both.
    """
    from profiles.ingest import join_series

    read = {listed: read_listed_series(config, listed) for listed in config.series}
    usable = {listed: found for listed, found in read.items() if not isinstance(found, str)}
    values, kept = join_series(list(usable.values())) if usable else (None, [])
    used = dict(zip(usable, kept, strict=True))
    moorings = _write_values(config, values, folder)
    account = [_row(listed, used.get(listed, found)) for listed, found in read.items()]
    rejected = [series.quarantine.assign(file=listed.path.as_posix()) for listed, series in used.items()]
    store.write_table(folder.part("deliveries", SERIES), pd.DataFrame(account).drop(columns="notes"))
    empty = pd.DataFrame(columns=["file", "line", "reason", "text"])
    store.write_table(folder.part("quarantine", SERIES), pd.concat(rejected) if rejected else empty)
    return {"usable": bool(used), "deliveries": account, "moorings": moorings}


def read_listed_series(config: Config, listed: SeriesFile) -> Series | str:
    """Return one of the listed series, or the message that says why it cannot be used."""
    from profiles.ingest import read_series

    try:
        series = read_series(
            config.resolve(listed.path),
            config.resolve(listed.layout),
            moorings=[mooring.id for mooring in config.moorings],
            mooring=listed.mooring,
        )
        _check_definitions(series, config)
    except (RequestError, DataError, MachineError) as error:
        return message_of(error, config, [listed])
    return series


def _check_definitions(series: Series, config: Config) -> None:
    """Raise RequestError where a series is of another quantity than the run's columns."""
    for name, delivered in series.layout.values.definitions.items():
        ours = getattr(config.column, name)
        if delivered != ours:
            raise RequestError(
                "the series is of another quantity than the columns of this run",
                where=str(series.path),
                expected=f"{name} = {ours:g}, as in [column]",
                found=f"{delivered:g}, as its layout says",
                advice="take that quantity out of the layout's [values], or change [column]",
            )


def _row(listed: SeriesFile, found: Series | str) -> dict[str, Any]:
    names = ("rows_read", "rows_kept", "rows_quarantined", "rows_reordered")
    is_used = not isinstance(found, str)
    return {
        "mooring": listed.mooring or SERIES,
        "file": listed.path.as_posix(),
        **{name: getattr(found, name) if is_used else 0 for name in names},
        "outcome": "used" if is_used else "not used",
        "problem": found if isinstance(found, str) else "",
        "notes": [] if isinstance(found, str) else list(found.notes),
    }


# --------------------------------------------------------------------------------------------------------------
# The values of each mooring


def _write_values(config: Config, values: pd.DataFrame | None, folder: Folder) -> dict[str, list[str]]:
    """Write the values of each mooring, days and months apart; return which there are."""
    log = read_log(config) or {}
    written: dict[str, list[str]] = {}
    for mooring in config.moorings:
        for kind in (DAYS, MONTHS):
            path = folder.series(mooring.id, kind)
            ours = _of(values, mooring.id, kind)
            if ours.empty:
                path.unlink(missing_ok=True)
                continue
            store.write_dataset(path, _dataset(ours, mooring, log.get(mooring.id)), {})
            written.setdefault(mooring.id, []).append(kind)
    return written


def _of(values: pd.DataFrame | None, mooring: str, kind: str) -> pd.DataFrame:
    if values is None:
        return pd.DataFrame()
    return values[(values["mooring"] == mooring) & (values["is_month"] == (kind == MONTHS))]


def _dataset(values: pd.DataFrame, mooring: Mooring, service: Any) -> xr.Dataset:
    time = values["time"].to_numpy().astype("datetime64[ns]")
    number = values["number"].to_numpy() + FIRST_NUMBER if service is None else service.deployment_at(time)
    delivered = values["deployment"].to_numpy(np.float64)
    left_out = [
        "mooring",
        "is_month",
        "time",
        "number",
        "deployment",
        *(() if values["is_month"].all() else _OF_MONTHS),
    ]
    columns = {str(name): ("time", values[name].to_numpy()) for name in values.columns if name not in left_out}
    columns["deployment"] = ("time", np.where(np.isnan(delivered), number, delivered).astype(np.int16))
    position = {"mooring": mooring.id, "latitude": mooring.latitude, "longitude": mooring.longitude}
    return xr.Dataset(columns, coords={"time": time, **position})


_OF_MONTHS = ("days", "spread")


def series_notes(deliveries: Sequence[dict[str, Any]]) -> dict[str, list[str]]:
    """Return what somebody should know of the series, by file."""
    return {row["file"]: row["notes"] for row in deliveries if row.get("notes")}
