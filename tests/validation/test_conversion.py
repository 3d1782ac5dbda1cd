"""In situ temperature from the other kinds: where they are alike, how far they part, and that it can be undone."""

from __future__ import annotations

from typing import Any

import gsw
import numpy as np
import pytest
import xarray as xr
from hypothesis import given
from hypothesis import strategies as st

from profiles.atlas import annual_salinity
from profiles.config import ValidationSettings
from profiles.validation import open_model
from profiles.validation.box import Reader, box_of
from profiles.validation.conversion import (
    ABSOLUTE,
    CONSERVATIVE,
    IN_SITU,
    POTENTIAL,
    PRACTICAL,
    absolute_salinity,
    in_situ,
    pressure_at,
)

ONE = np.ones(1)


def test_in_situ_temperature_is_left_alone() -> None:
    values = np.array([4.0, np.nan])
    assert in_situ(values, IN_SITU, 35.0 * np.ones(2), 500.0 * np.ones(2)) is values


def test_at_the_surface_potential_is_in_situ() -> None:
    np.testing.assert_allclose(in_situ(28.0 * ONE, POTENTIAL, 35.0 * ONE, 0.0 * ONE), 28.0, atol=1e-12)


def test_water_warms_as_it_sinks() -> None:
    """By T alpha / (rho c_p) per pressure: 283.15 K x 1.67e-4 / K / (1027 kg/m3 x 3990 J/kg/K) = 1.154e-8 K/Pa.

    That is 0.0577 K over 500 dbar at the surface's expansion, which grows by some per cent on the way down.
    """
    warmed = in_situ(10.0 * ONE, POTENTIAL, 35.0 * ONE, 500.0 * ONE) - 10.0
    np.testing.assert_allclose(warmed, 0.0577, rtol=0.04)


def test_absolute_salinity_is_taken_as_it_is() -> None:
    values = np.array([35.0])
    assert absolute_salinity(values, ABSOLUTE, ONE, ONE, ONE) is values


def test_practical_salinity_becomes_that_of_the_reference_composition_and_a_little_more() -> None:
    """S_R = (35.16504 / 35) S_P (TEOS-10, eq. A.3.3); the Pacific's anomaly is within 0.02 g/kg above 500 m."""
    found = absolute_salinity(35.0 * ONE, PRACTICAL, 300.0 * ONE, 200.0 * ONE, 0.0 * ONE)
    assert 0.0 <= found[0] - 35.16504 < 0.02


def test_missing_stays_missing() -> None:
    for kind in (POTENTIAL, CONSERVATIVE):
        assert np.isnan(in_situ(np.array([np.nan]), kind, 35.0 * ONE, 100.0 * ONE)).all()


@given(warm=st.floats(2.0, 31.0), salt=st.floats(33.0, 37.0), deep=st.floats(0.0, 650.0), north=st.floats(-8.0, 8.0))
def test_conversion_can_be_undone(warm: float, salt: float, deep: float, north: float) -> None:
    pressure = float(pressure_at(np.array(deep), np.array(north)))
    potential = in_situ(warm * ONE, POTENTIAL, salt * ONE, pressure * ONE)
    conservative = in_situ(warm * ONE, CONSERVATIVE, salt * ONE, pressure * ONE)
    np.testing.assert_allclose(gsw.pt0_from_t(salt, potential, pressure), warm, atol=1e-6)
    np.testing.assert_allclose(gsw.CT_from_t(salt, conservative, pressure), warm, atol=1e-6)


# --------------------------------------------------------------------------------------------------------------
# A model's water, whose in situ temperature is known

LEVELS = np.array([5.0, 100.0, 250.0, 450.0])
ROWS, COLUMNS = np.arange(-6.0, 6.1, 1.5), np.arange(117.0, 284.0, 3.0)
PLACE = np.array([0.0]), np.array([200.0])
SHAPE = (1, LEVELS.size, ROWS.size, COLUMNS.size)


def waters() -> tuple[np.ndarray, np.ndarray, tuple[np.ndarray, np.ndarray, np.ndarray]]:
    """In situ temperature that differs from point to point, practical salinity, and where both are."""
    z, y, x = np.meshgrid(LEVELS, ROWS, COLUMNS, indexing="ij")
    return 28.0 - 0.04 * z - 0.02 * (x - 200.0) + 0.1 * y, 34.5 + 0.001 * z + 0.05 * y, (z, y, x)


def model(warm: np.ndarray, standard_name: str, salinity: tuple[np.ndarray, str, str] | None = None) -> xr.Dataset:
    variables: dict[str, Any] = {
        "warm": (
            ("time", "lev", "lat", "lon"),
            warm.reshape(SHAPE),
            {"standard_name": standard_name, "units": "degree_Celsius"},
        )
    }
    if salinity is not None:
        values, name, units = salinity
        # In another order of dimensions than the temperature.
        turned = values.reshape(SHAPE).transpose(3, 1, 0, 2)
        variables["salt"] = (("lon", "lev", "time", "lat"), turned, {"standard_name": name, "units": units})
    return xr.Dataset(
        variables,
        coords={
            "time": np.array(["2031-01-16"], dtype="datetime64[ns]"),
            "lev": ("lev", LEVELS, {"units": "m", "positive": "down"}),
            "lat": ("lat", ROWS, {"units": "degrees_north"}),
            "lon": ("lon", COLUMNS, {"units": "degrees_east"}),
        },
    )


def read(dataset: xr.Dataset, **settings: Any) -> tuple[np.ndarray, slice, slice]:
    """Return what is read, (level, row, column), and which rows and columns those are."""
    chosen = ValidationSettings(averaging_days=30.0, **settings)
    opened = open_model(dataset, chosen)
    box = box_of(opened, *PLACE, chosen)
    read = Reader(opened, box).read(slice(0, 1)).temperature[0]
    return read.transpose(2, 0, 1), box.rows, box.columns[0]


def of_kind(kind: str, salinity: np.ndarray, warm: np.ndarray, pressure: np.ndarray) -> np.ndarray:
    to_kind = gsw.pt0_from_t if kind == POTENTIAL else gsw.CT_from_t
    return np.asarray(to_kind(salinity, warm, pressure))


@pytest.mark.parametrize("kind", [POTENTIAL, CONSERVATIVE])
@pytest.mark.parametrize("own", [PRACTICAL, ABSOLUTE])
def test_a_model_is_brought_in_situ_with_its_own_salinity(kind: str, own: str) -> None:
    warm, practical, (z, y, x) = waters()
    pressure = gsw.p_from_z(-z, y)
    absolute = gsw.SA_from_SP(practical, pressure, x, y)
    salinity = (practical if own == PRACTICAL else absolute, f"sea_water_{own}_salinity", "1")
    dataset = model(of_kind(kind, absolute, warm, pressure), f"sea_water_{kind}_temperature", salinity)
    found, rows, columns = read(dataset)
    np.testing.assert_allclose(found, warm[:, rows, columns], atol=1e-6)


def test_without_salinity_the_atlas_stands_in() -> None:
    """Its salinity, linear between its levels, computed here from its own profiles; at 450 m it makes up to 0.07 K."""
    warm, _, (z, y, x) = waters()
    pressure = gsw.p_from_z(-z, y)
    profiles = annual_salinity(np.clip(y[0].ravel(), -9.5, 9.5), np.clip(x[0].ravel(), 115.5, 291.5))  # (point, depth)
    practical = np.stack([np.interp(LEVELS, profiles["depth"].values, row) for row in profiles.values], axis=-1)
    absolute = gsw.SA_from_SP(practical.reshape(z.shape), pressure, x, y)
    dataset = model(of_kind(POTENTIAL, absolute, warm, pressure), "sea_water_potential_temperature")
    found, rows, columns = read(dataset)
    np.testing.assert_allclose(found, warm[:, rows, columns], atol=1e-6)
    assert np.abs(found - dataset["warm"].values[0][:, rows, columns]).max() > 0.05


def test_the_atlas_can_be_asked_for_though_the_model_has_salinity() -> None:
    warm, practical, _ = waters()
    with_own = model(warm, "sea_water_potential_temperature", (practical + 3.0, "sea_water_practical_salinity", "1"))
    without = model(warm, "sea_water_potential_temperature")
    np.testing.assert_array_equal(read(with_own, salinity="atlas")[0], read(without)[0])
    assert not np.array_equal(read(with_own)[0], read(without)[0])


def test_land_stays_land() -> None:
    warm, practical, _ = waters()
    warm[:, 3, 10], practical[:, 3, 10] = np.nan, np.nan
    dataset = model(warm, "sea_water_conservative_temperature", (practical, "sea_water_practical_salinity", "1"))
    found, rows, columns = read(dataset)
    missing = np.isnan(found)
    np.testing.assert_array_equal(missing, np.isnan(warm[:, rows, columns]))
    assert missing.sum() == LEVELS.size
