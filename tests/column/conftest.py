"""Profiles that the tests of this room share."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest
import xarray as xr


def _profile(temperatures, depths, *, dtype=np.float64) -> xr.DataArray:
    values = np.asarray(temperatures, dtype=dtype)
    dims = ("depth",) if values.ndim == 1 else ("time", "depth")
    return xr.DataArray(values, dims=dims, coords={"depth": np.asarray(depths, dtype=np.float64)})


@pytest.fixture(scope="session")
def make_profile() -> Callable[..., xr.DataArray]:
    """Make labelled temperatures of (depth,) or (time, depth) at sensor ``depths``."""
    return _profile
