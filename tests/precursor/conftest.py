"""Monthly series for the tests of the room."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest
import xarray as xr

from profiles.config import HindcastSettings
from profiles.precursor import hindcast, monthly_series
from profiles.precursor.recharge import simulate


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


Record = tuple[xr.DataArray, dict[str, xr.DataArray]]


def rotation(period: float, decay: float) -> np.ndarray:
    """Return M of one month: exp(-1/decay) times a turn by 2 pi / period; the volume goes before the index."""
    angle = 2.0 * np.pi / period
    turn = np.array([[np.cos(angle), np.sin(angle)], [-np.sin(angle), np.cos(angle)]])
    return np.exp(-1.0 / decay) * turn


def oscillating(years: int, seed: int, *, period: float = 39.0, decay: float = 20.0) -> Record:
    """Return an index, °C, and a volume, m3, of a damped oscillation with a season, and a tilt that is noise."""
    matrix = rotation(period, decay)
    noise = np.eye(2) - matrix @ matrix.T  # so that the state has unit variance
    random = np.random.default_rng(seed)
    warmth, recharge = simulate(matrix, noise, 12 * years, 1, random)[0]
    time = np.arange("1981-01", np.datetime64("1981-01", "M") + 12 * years, dtype="datetime64[M]").astype("M8[ns]")
    season = np.cos(2.0 * np.pi * np.arange(12 * years) / 12.0)
    index = monthly_series(27.0 + 0.9 * warmth + season, time, name="surface_temperature_index", units="degree_Celsius")
    volume = monthly_series(1e14 * (24.0 + recharge - 0.5 * season), time, name="warm_water_volume_total", units="m3")
    tilt = monthly_series(random.standard_normal(12 * years), time, name="thermocline_slope", units="m (1000 km)-1")
    return index, {"volume": volume, "tilt": tilt}


@pytest.fixture(scope="session")
def record() -> Record:
    """Thirty years."""
    return oscillating(30, 5)


@pytest.fixture(scope="session")
def make_record() -> Callable[..., Record]:
    return oscillating


@pytest.fixture(scope="session")
def quick() -> HindcastSettings:
    """Settings of a hindcast that takes a second."""
    return HindcastSettings(longest_lead=6, spread_blocks=4)


@pytest.fixture(scope="session")
def made(record: Record, quick: HindcastSettings) -> xr.Dataset:
    return hindcast(*record, settings=quick)
