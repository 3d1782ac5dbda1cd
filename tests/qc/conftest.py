"""Chains the tests of this room share."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest
import xarray as xr

DEPTHS = (1.0, 60.0, 140.0, 300.0)


def _chain(temperature, *, depth=None, step=86400, **coords) -> xr.Dataset:
    values = np.asarray(temperature, dtype=np.float32)
    values = values[:, None] if values.ndim == 1 else values
    time = np.datetime64("2031-01-01", "ns") + np.arange(len(values)) * np.timedelta64(step, "s")
    place = {"mooring": "TB-01", "latitude": 0.0, "longitude": 180.0}
    return xr.Dataset(
        {"temperature": (("time", "depth"), values)},
        coords={"time": time, "depth": np.asarray(depth or DEPTHS[: values.shape[1]], np.float32)} | place | coords,
    )


@pytest.fixture
def make_chain() -> Callable[..., xr.Dataset]:
    """Make a chain of (time,) or (time, depth) temperatures at 0N 180E from 2031 on, every ``step`` s."""
    return _chain
