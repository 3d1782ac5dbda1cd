"""Kinds of temperature and salinity against the check values that TEOS-10's reference library ships.

Source: IOC, SCOR and IAPSO (2010), The international thermodynamic equation of seawater, Manuals and Guides 56; the
check casts are three real ones of the reference library, with every derived quantity and the accuracy of each (names
ending in ``_ca``) as its authors state them.
"""

from __future__ import annotations

from importlib.resources import as_file, files

import numpy as np
import pytest

from profiles.validation.conversion import (
    CONSERVATIVE,
    POTENTIAL,
    PRACTICAL,
    absolute_salinity,
    in_situ,
    pressure_at,
)

Casts = dict[str, np.ndarray]


@pytest.fixture(scope="module")
def casts() -> Casts:
    with as_file(files("gsw") / "tests" / "gsw_cv_v3_0.npz") as path, np.load(path) as content:
        return {name: content[name] for name in content.files if name != "pi"}


def in_water(casts: Casts, *names: str) -> list[np.ndarray]:
    """Return values of all casts where all are there, the positions of the casts repeated."""
    shape = casts["SP_chck_cast"].shape
    whole = [np.broadcast_to(casts[name].reshape(-1, casts[name].shape[-1]), shape) for name in names]
    there = np.isfinite(np.stack(whole)).all(axis=0)
    assert there.sum() == 98
    return [values[there] for values in whole]


def test_conservative_temperature_comes_back_in_situ(casts: Casts) -> None:
    salinity, warm, pressure, published = in_water(casts, "SA_chck_cast", "CT_chck_cast", "p_chck_cast", "t_from_CT")
    found = in_situ(warm, CONSERVATIVE, salinity, pressure)
    np.testing.assert_allclose(found, published, rtol=0.0, atol=float(casts["t_from_CT_ca"]))


def test_potential_temperature_comes_back_in_situ(casts: Casts) -> None:
    """The published potential temperature of each bottle, back to the temperature that was measured."""
    salinity, warm, pressure, measured = in_water(casts, "SA_chck_cast", "pt0_from_t", "p_chck_cast", "t_chck_cast")
    found = in_situ(warm, POTENTIAL, salinity, pressure)
    np.testing.assert_allclose(found, measured, rtol=0.0, atol=2.0 * float(casts["pt0_from_t_ca"]))
    assert np.abs(warm - measured).max() > 0.1  # there is something to bring back


def test_practical_salinity_becomes_absolute(casts: Casts) -> None:
    names = ("SP_chck_cast", "p_chck_cast", "long_chck_cast", "lat_chck_cast", "SA_from_SP")
    practical, pressure, longitude, latitude, published = in_water(casts, *names)
    found = absolute_salinity(practical, PRACTICAL, pressure, longitude, latitude)
    np.testing.assert_allclose(found, published, rtol=0.0, atol=float(casts["SA_from_SP_ca"]))


def test_depths_become_pressures(casts: Casts) -> None:
    height, latitude, published = in_water(casts, "z_from_p", "lat_chck_cast", "p_chck_cast")
    np.testing.assert_allclose(pressure_at(-height, latitude), published, rtol=0.0, atol=1e-6)
