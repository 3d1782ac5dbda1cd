"""Units and temperature scales on the way in."""

from __future__ import annotations

import cf_units
import numpy as np
from numpy.typing import ArrayLike, NDArray

CELSIUS = "degree_Celsius"
METRE = "m"
T90_PER_T68 = 0.99976  # t90 = 0.99976 t68, °C: CF standard name table, sea_water_temperature; Saunders (1990)


def _require(units: str, reference: str, example: str) -> str:
    try:
        fits = cf_units.Unit(units).is_convertible(reference)
    except ValueError:
        fits = False
    if not fits:
        raise ValueError(f"unknown units: {units!r}; expected for example {example}")
    return units


def require_temperature_units(units: str) -> str:
    """Return ``units`` if they are of temperature, else raise ValueError."""
    return _require(units, CELSIUS, "degree_Celsius or kelvin")


def require_depth_units(units: str) -> str:
    """Return ``units`` if they are of length, else raise ValueError."""
    return _require(units, METRE, "m")


def to_celsius(temperature: ArrayLike, units: str) -> NDArray[np.float64]:
    """Return temperature in °C on the scale it was given on; NaN stays NaN."""
    values = np.array(temperature, dtype=np.float64)
    return np.asarray(cf_units.Unit(units).convert(values, cf_units.Unit(CELSIUS)))


def to_metres_down(depth: ArrayLike, units: str, positive: str) -> NDArray[np.float64]:
    """Return depth in metres, positive down; ``positive`` is the delivered sign, ``"down"`` or ``"up"``."""
    values = np.array(depth, dtype=np.float64)
    metres = np.asarray(cf_units.Unit(units).convert(values, cf_units.Unit(METRE)))
    return metres if positive == "down" else 0.0 - metres


def to_its90(temperature: NDArray[np.floating], scale: str) -> NDArray[np.float64]:
    """Return temperature on ITS-90, °C, from ``scale``, ``"ITS-90"`` or ``"IPTS-68"``; NaN stays NaN."""
    return np.asarray(temperature, dtype=np.float64) * (T90_PER_T68 if scale == "IPTS-68" else 1.0)
