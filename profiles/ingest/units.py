"""Units and temperature scales on the way in."""

from __future__ import annotations

import cf_units
import gsw
import numpy as np
from numpy.typing import ArrayLike, NDArray

CELSIUS = "degree_Celsius"
METRE = "m"
DECIBAR = "dbar"
T90_PER_T68 = 0.99976  # t90 = 0.99976 t68, °C: CF standard name table, sea_water_temperature; Saunders (1990)


def _fits(units: str, reference: str) -> bool:
    try:
        return bool(cf_units.Unit(units).is_convertible(reference))
    except ValueError:
        return False


def _require(units: str, references: tuple[str, ...], example: str) -> str:
    if not any(_fits(units, reference) for reference in references):
        raise ValueError(f"unknown units: {units!r}; expected for example {example}")
    return units


def require_temperature_units(units: str) -> str:
    """Return ``units`` if they are of temperature, else raise ValueError."""
    return _require(units, (CELSIUS,), "degree_Celsius or kelvin")


def require_depth_units(units: str) -> str:
    """Return ``units`` if they are of length or of pressure, else raise ValueError."""
    return _require(units, (METRE, DECIBAR), "m or dbar")


def require_length_units(units: str) -> str:
    """Return ``units`` if they are of length, else raise ValueError."""
    return _require(units, (METRE,), "m or cm")


def is_pressure(units: str) -> bool:
    """Tell whether ``units`` are of pressure."""
    return _fits(units, DECIBAR)


def to_celsius(temperature: ArrayLike, units: str) -> NDArray[np.float64]:
    """Return temperature in °C on the scale it was given on; NaN stays NaN."""
    values = np.array(temperature, dtype=np.float64)
    return np.asarray(cf_units.Unit(units).convert(values, cf_units.Unit(CELSIUS)))


def to_metres(length: ArrayLike, units: str) -> NDArray[np.float64]:
    """Return lengths in m."""
    return np.asarray(cf_units.Unit(units).convert(np.array(length, dtype=np.float64), cf_units.Unit(METRE)))


def to_downward(depth: ArrayLike, units: str, positive: str) -> NDArray[np.float64]:
    """Return depth in m, or in dbar where ``units`` are of pressure, positive down.

    ``positive`` is the delivered sign, ``"down"`` or ``"up"``.
    """
    values = np.array(depth, dtype=np.float64)
    ours = cf_units.Unit(DECIBAR if is_pressure(units) else METRE)
    downward = np.asarray(cf_units.Unit(units).convert(values, ours))
    return downward if positive == "down" else 0.0 - downward


def depth_of_pressure(pressure: ArrayLike, latitude: float) -> NDArray[np.float64]:
    """Return the depth at which there is a sea pressure, m, positive down.

    Parameters
    ----------
    pressure : array_like
        Sea pressure, that is absolute pressure less 10.1325 dbar; dbar.
    latitude : float
        Degrees north.

    References
    ----------
    TEOS-10: IOC, SCOR and IAPSO (2010), Manuals and Guides 56; ``gsw.z_from_p``, for the standard ocean.
    """
    return -np.asarray(gsw.z_from_p(np.asarray(pressure, dtype=np.float64), latitude))


def to_its90(temperature: NDArray[np.floating], scale: str) -> NDArray[np.float64]:
    """Return temperature on ITS-90, °C, from ``scale``, ``"ITS-90"`` or ``"IPTS-68"``; NaN stays NaN."""
    return np.asarray(temperature, dtype=np.float64) * (T90_PER_T68 if scale == "IPTS-68" else 1.0)
