"""Monthly series for the tests of the room."""

from __future__ import annotations

import numpy as np
import pytest
import xarray as xr


@pytest.fixture
def monthly():
    """Return what makes a monthly series of values from a first month on, stamped on the first of each month."""

    def make(values, start="2001-01", name="surface_temperature_index", **attributes):
        values = np.asarray(values, dtype=float)
        months = np.datetime64(start, "M") + np.arange(values.size)
        return xr.DataArray(
            values, dims="time", coords={"time": months.astype("datetime64[ns]")}, name=name, attrs=attributes
        )

    return make
