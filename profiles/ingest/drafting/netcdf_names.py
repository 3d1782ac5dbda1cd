"""NetCDF needs no draft beyond the names of variables that the standard names do not settle."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import xarray as xr

from profiles.errors import DataError
from profiles.ingest.drafting.doubts import Doubt
from profiles.ingest.drafting.proposal import Proposal
from profiles.ingest.drafting.words import roles_of, temperature_worth

_PLAIN = Proposal({"kind": "netcdf"}, (), words="NetCDF; what its standard names and attributes say needs no layout")


def netcdf_proposals(file: Path) -> list[Proposal]:
    """Return the layout without names, and one with the names that look right."""
    try:
        with xr.open_dataset(file, decode_times=False) as dataset:
            names = _names(dataset)
    except (OSError, ValueError) as error:
        raise DataError("the NetCDF file cannot be read", where=str(file), found=str(error)) from error
    if "temperature" not in names:
        return [_PLAIN]
    doubt = Doubt(
        "names of the variables", ", ".join(names.values()), "the file has no standard names that settle them"
    )
    return [_PLAIN, Proposal({"kind": "netcdf", "variables": names}, (doubt,), words="NetCDF")]


def _names(dataset: xr.Dataset) -> dict[str, Any]:
    """Return variables by what their names, units and dimensions say."""
    by_worth = sorted(
        (temperature_worth(str(name)) + temperature_worth(str(variable.attrs.get("units", ""))), str(name))
        for name, variable in dataset.variables.items()
        if len(variable.dims) >= 2
    )
    names = {"temperature": by_worth[-1][1]} if by_worth and by_worth[-1][0] > 0 else {}
    for name, variable in dataset.variables.items():
        roles = roles_of(str(name))
        if "time" in roles and " since " in str(variable.attrs.get("units", "")):
            names["time"] = str(name)
        if roles & {"depth", "pressure"} and len(variable.dims) == 1:
            names["depth"] = str(name)
    return names
