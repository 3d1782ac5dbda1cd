"""Models against a finished run: each compared, all written side by side; one that cannot be used holds up no other."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from contextlib import AbstractContextManager, nullcontext
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import pandas as pd
import xarray as xr

from profiles import store
from profiles.config import Config, ValidationSettings
from profiles.errors import EXIT_DONE, EXIT_PARTIAL, DataError, RequestError, ThermotiltError
from profiles.pipeline.attributes import global_attributes

#: What validation writes in the run's folder.
FILE = "validation.nc"
SCORES, MONTHS = "model_scores", "model_months"
_MONTHLY = ("thermocline_slope", "warm_water_volume")
_SUMMARY = (
    "A model's temperature seen as the array saw the ocean, and on its own grid: isotherm depth, tilt and volume of "
    "both, the difference split into what the model is wrong by where the array looked and what the sampling hides."
)


@dataclass(frozen=True)
class ModelProblem:
    """A model that could not be compared, and why."""

    model: str
    message: str


@dataclass(frozen=True)
class Validated:
    """What was compared: ``comparison`` has a dimension ``model``, see :func:`profiles.validation.side_by_side`."""

    out: Path
    comparison: xr.Dataset
    problems: tuple[ModelProblem, ...]

    @property
    def exit_code(self) -> int:
        """0, or 5 where some models could not be used."""
        return EXIT_PARTIAL if self.problems else EXIT_DONE


def validate(
    models: Mapping[str, Any],
    out: Path,
    settings: ValidationSettings | None = None,
    *,
    workers: int = 1,
    progress: Callable[[str, str], None] | None = None,
) -> Validated:
    """Compare models with a finished run and write ``validation.nc`` and two tables into its folder.

    Parameters
    ----------
    models : mapping of str to source
        Names, and what :func:`profiles.compare_model` takes.
    out : Path
        The run's folder.
    settings : ValidationSettings, optional
        Default: those of the run.
    workers : int, optional
        Processes that read blocks of a model.
    progress : callable, optional
        Told each model's name, and ``"computed"`` or ``"failed"``.

    Raises
    ------
    ThermotiltError
        Where no model could be compared: the error of the only one, or a DataError that lists all.
    """
    from profiles.validation import compare_model, open_array, open_model, side_by_side

    if workers < 1:
        raise RequestError("no such number of workers", where="--workers", expected="1 or more", found=str(workers))
    used = settings or open_array(out).validation
    done: dict[str, xr.Dataset] = {}
    failed: dict[str, ThermotiltError] = {}
    for name, source in models.items():
        try:
            with _workers(workers):
                done[name] = compare_model(open_model(source, used, name=name), out, used)
        except (DataError, RequestError) as error:
            failed[name] = error
        if progress is not None:
            progress(name, "computed" if name in done else "failed")
    _check_any(done, failed)
    comparison = side_by_side(list(done.values()))
    _write(out, comparison, used, models)
    problems = tuple(ModelProblem(name, str(error)) for name, error in failed.items())
    return Validated(out, comparison, problems)


def _workers(count: int) -> AbstractContextManager[Any]:
    """Return a context in which blocks are done by ``count`` spawned processes."""
    if count == 1:
        return nullcontext()
    import dask

    return dask.config.set(scheduler="processes", num_workers=count)


def _check_any(done: Mapping[str, Any], failed: Mapping[str, ThermotiltError]) -> None:
    if done:
        return
    if len(failed) == 1:
        raise next(iter(failed.values()))
    raise DataError(
        "no model could be compared",
        expected="one model at least that can be read and overlaps with the array",
        found="\n  - ".join(["", *map(str, failed.values())]) if failed else "no model",
    )


def _write(out: Path, comparison: xr.Dataset, settings: ValidationSettings, models: Mapping[str, Any]) -> None:
    attributes = _attributes(out, comparison, settings, models)
    store.write_dataset(out / FILE, comparison, attributes)
    tables = store.make_folder(out / "tables")
    store.write_table(tables / f"{SCORES}.csv", scores_table(comparison))
    store.write_table(tables / f"{MONTHS}.csv", months_table(comparison))


def _attributes(
    out: Path, comparison: xr.Dataset, settings: ValidationSettings, models: Mapping[str, Any]
) -> dict[str, Any]:
    account = store.read_record(out / "run.json") or {}
    config = Config.model_validate(account["configuration"] | {"file": out / "run.json"})
    with store.open_dataset(out / "columns_monthly.nc") as monthly:
        created = str(monthly.attrs.get("date_created", ""))
    newest = store.date_of(files) if (files := _files(models)) else ""
    return global_attributes(
        config,
        comparison,
        name="validation",
        title="models like for like",
        summary=_SUMMARY,
        level="derived",
        created=max(created, newest),
        settings={"column": config.column, "section": config.section, "validation": settings},
    ) | {"source": "moored thermistor chains and models", "isotherm": comparison.attrs["isotherm"]}


def _files(models: Mapping[str, Any]) -> list[Path]:
    """Return the files of the models that are files; of a Zarr store, its own head."""
    from profiles.validation.sources import files_of

    found: list[Path] = []
    for source in models.values():
        if isinstance(source, str | Path | list | tuple):
            try:
                paths = files_of(source)
            except RequestError:
                continue
            found += [next(iter(sorted(path.glob("*.json")) or sorted(path.glob(".z*"))), path) for path in paths]
    return found


# --------------------------------------------------------------------------------------------------------------
# Tables


def scores_table(comparison: xr.Dataset) -> pd.DataFrame:
    """Return a row a model and series: what is scored, where, and every score with its 95 % interval."""
    labels = ["quantity", "place", "kind", "units"]
    scores = [str(name) for name, data in comparison.data_vars.items() if data.dims == ("model", "series")]
    parts = []
    for model in comparison["model"].values:
        part = comparison.sel(model=model)
        table = pd.DataFrame({name: part[name].values for name in [*labels, "verdict", *scores] if name in part})
        parts.append(table.assign(model=model)[["model", *labels, *(c for c in table.columns if c not in labels)]])
    return pd.concat(parts, ignore_index=True)


def months_table(comparison: xr.Dataset) -> pd.DataFrame:
    """Return a row a model and month: tilt, m per 1000 km, and volumes, m3, of both sides, and the difference split."""
    parts = []
    for model in comparison["model"].values:
        part = comparison.sel(model=model)
        columns: dict[str, Any] = {"month": pd.DatetimeIndex(part["time"].values).strftime("%Y-%m")}
        for name in _MONTHLY:
            for variable in _monthly_variables(part, name):
                data = part[variable]
                if "region" not in data.dims:
                    columns[variable] = data.values
                    continue
                columns |= {f"{variable}_{region}": data.sel(region=region).values for region in part["region"].values}
        parts.append(pd.DataFrame(columns).assign(model=model))
    table = pd.concat(parts, ignore_index=True)
    return table[["model", *(name for name in table.columns if name != "model")]]


def _monthly_variables(part: xr.Dataset, name: str) -> list[str]:
    return [str(variable) for variable in part.data_vars if name in str(variable)]
