"""A small invented array with all that a report is made from."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
import xarray as xr

from profiles.atlas import annual_profile
from profiles.column import columns_of
from profiles.config import Config, Delivery, Description, Mooring
from profiles.qc import data_return, fault_list, gap_list, quality_control
from profiles.report import Facts
from profiles.report.tables import LAYOUTS
from profiles.section import Section, build_section, daily_means, join_moorings, monthly_means
from profiles.vocabulary import describe

DEPTH = np.array([1, 20, 60, 100, 140, 180, 240, 300, 500], dtype=np.float32)


@dataclass(frozen=True)
class Array:
    """What the stages before the report hand it."""

    chains: dict[str, xr.Dataset]
    columns: dict[str, xr.Dataset]
    monthly: xr.Dataset
    section: Section
    tables: dict[str, pd.DataFrame] = field(default_factory=dict)


def flagged_chain(
    mooring: str, latitude: float, longitude: float, days: int, *, empty: bool = False, faults: bool = True
) -> xr.Dataset:
    """The atlas's profile that heaves by 5 m, with a stuck sensor, a spike and a gap unless clean or empty."""
    time = np.datetime64("2031-01-01T12", "ns") + np.arange(days) * np.timedelta64(1, "D")
    atlas = annual_profile([latitude], [longitude]).squeeze("position")
    heave = 5.0 * np.sin(np.arange(days) / 9.0)
    temperature = np.interp(DEPTH - heave[:, None], atlas["depth"], atlas)
    temperature += 0.01 * np.sin(37.0 * np.arange(days))[:, None]  # so that nothing is stuck by accident
    if faults:
        temperature[3:12, 2] = temperature[3, 2]
        temperature[15, 4] = 45.0
        temperature[18, :] = np.nan
    if empty:
        temperature[:] = np.nan
    values = (("time", "depth"), temperature.astype(np.float32))
    chain = xr.Dataset(
        {
            "temperature_raw": values,
            "temperature": values,
            "temperature_uncertainty": ("depth", np.full(DEPTH.size, 0.02, dtype=np.float32)),
            "deployment": ("time", np.ones(days, dtype=np.int16)),
        },
        coords={"time": time, "depth": DEPTH, "mooring": mooring, "latitude": latitude, "longitude": longitude},
    )
    return quality_control(describe(chain))


def make_array(chains: dict[str, xr.Dataset]) -> Array:
    """Pass chains through the rooms above the report."""
    columns = {name: columns_of(chain) for name, chain in chains.items()}
    monthly = join_moorings({name: monthly_means(daily_means(part)) for name, part in columns.items()})
    lists = {"data_return": data_return, "faults": fault_list, "gaps": gap_list}
    tables = {
        name: pd.concat([listed(chain) for chain in chains.values()], ignore_index=True)
        for name, listed in lists.items()
    }
    tables["deliveries"] = pd.DataFrame(
        [(name, f"{name}.csv", 30, 28, 2, 0, "used", "") for name in chains],
        columns=[column.name for column in LAYOUTS["deliveries"].columns],
    )
    tables["quarantine"] = pd.DataFrame(columns=["file", "line", "reason", "text"])
    return Array(chains, columns, monthly, build_section(monthly), tables)


@pytest.fixture(scope="session")
def small_array() -> Array:
    """Three moorings over three months, one of which never gave a value."""
    return make_array(
        {
            "TB-01": flagged_chain("TB-01", 0.0, 165.0, 90),
            "TB-02": flagged_chain("TB-02", 0.0, 200.0, 90),
            "TB-03": flagged_chain("TB-03", 2.5, 240.0, 90, empty=True),
        }
    )


@pytest.fixture(scope="session")
def single_month() -> Array:
    """Two moorings without faults over one month."""
    return make_array(
        {
            "TB-01": flagged_chain("TB-01", 0.0, 165.0, 31, faults=False),
            "TB-02": flagged_chain("TB-02", 2.5, 200.0, 31, faults=False),
        }
    )


@pytest.fixture(scope="session")
def facts_of() -> Callable[..., Facts]:
    """Make the facts of a run, with any description of the array."""

    def make(name: str = "Tropicbird Array", **description: str) -> Facts:
        delivery = Delivery(path=Path("TB-01.csv"), layout=Path("wide.toml"))
        mooring = Mooring(id="TB-01", latitude=0.0, longitude=165.0, deliveries=(delivery,))
        array = Description(name=name, **description)
        config = Config(file=Path("array.toml"), array=array, moorings=(mooring,))
        return Facts(config, "2031-05-01T00:00:00Z", {"thermotilt": "0.1.0"}, 3, 1.02)

    return make
