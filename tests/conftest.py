"""A small array for the rooms that run the whole job: three moorings, one of each layout, a year and a half."""

from __future__ import annotations

import shutil
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest
import xarray as xr

from profiles import store
from profiles.column import columns_of
from profiles.config import ColumnSettings, SectionSettings, ValidationSettings, load_config
from profiles.drill.array import SITES
from profiles.drill.configuration import configuration_text
from profiles.drill.demo import days, simulated_chains, write_configuration, write_deliveries
from profiles.drill.ocean import Ocean
from profiles.drill.planting import plant_over_array
from profiles.drill.truth import site_columns
from profiles.pipeline import run
from profiles.section import daily_means, join_moorings, monthly_means

SEED = 5
SMALL = tuple(site for site in SITES if site.id in ("TB-07", "TB-18", "TB-28"))


@pytest.fixture(scope="session")
def small_array(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A folder with ``array.toml``, its layouts, its deliveries and ``damaged.csv``; not to be changed."""
    folder = tmp_path_factory.mktemp("small")
    ocean = Ocean.simulate(days("2031-01-01", "2032-06-30"), SEED)
    _, whole = site_columns(ocean, SMALL)
    chains = list(simulated_chains(ocean, SMALL, whole, SEED))
    chains, _ = plant_over_array(chains, SMALL, {"spike": 3, "stuck value": 2}, SEED)
    write_deliveries(folder, SMALL, chains, SEED).to_csv(folder / "damaged.csv", index=False)
    write_configuration(folder, "array.toml", configuration_text(SMALL))
    return folder


@pytest.fixture
def array(small_array: Path, tmp_path: Path) -> Path:
    """A copy of the small array, times of change included, that a test may change."""
    return shutil.copytree(small_array, tmp_path / "array")


@pytest.fixture(scope="session")
def finished(small_array: Path, tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The folder of an uninterrupted run over the small array with one worker; not to be changed."""
    out = tmp_path_factory.mktemp("finished") / "out"
    run(load_config(small_array / "array.toml"), out, workers=1)
    return out


@pytest.fixture
def out(finished: Path, tmp_path: Path) -> Path:
    """A copy of the finished folder that a test may change."""
    return shutil.copytree(finished, tmp_path / "out")


@pytest.fixture(scope="session")
def write_run() -> Callable[[Path, dict[str, xr.Dataset]], Path]:
    """Return what writes the part of a finished run that a model is compared with, from flagged chains by mooring."""
    return _write_run


def _write_run(folder: Path, chains: dict[str, xr.Dataset]) -> Path:
    """Write what the comparison reads of a finished run."""
    store.make_folder(folder / "chains")
    for name, chain in chains.items():
        store.write_dataset(folder / "chains" / f"{name}.nc", chain, {})
    monthly = join_moorings({name: monthly_means(daily_means(columns_of(chain))) for name, chain in chains.items()})
    store.write_dataset(folder / "columns_monthly.nc", monthly, {"date_created": "2033-01-01T00:00:00Z"})
    moorings = [
        {
            "id": name,
            "latitude": float(chain["latitude"]),
            "longitude": float(chain["longitude"]),
            "deliveries": [{"path": "none.csv", "layout": "none.toml"}],
        }
        for name, chain in chains.items()
    ]
    configuration: dict[str, Any] = {"array": {"name": "Perfect Array"}, "moorings": moorings} | {
        name: settings.model_dump(mode="json")
        for name, settings in (
            ("column", ColumnSettings()),
            ("section", SectionSettings()),
            ("validation", ValidationSettings()),
        )
    }
    store.write_record(folder / "run.json", {"configuration": configuration})
    return folder


@pytest.fixture(scope="session")
def contents() -> Callable[[Path], dict[str, bytes]]:
    """Return what reads every file of a run's folder, by its name in it, save the account and the records."""

    def read(folder: Path) -> dict[str, bytes]:
        files = {path.relative_to(folder).as_posix(): path for path in folder.rglob("*") if path.is_file()}
        return {name: path.read_bytes() for name, path in sorted(files.items()) if _is_result(name)}

    return read


def _is_result(name: str) -> bool:
    return name != "run.json" and not name.startswith((".stages/records/", ".stages/ingest/lock"))
