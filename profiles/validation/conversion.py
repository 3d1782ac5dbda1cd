"""In situ temperature from whichever temperature a model carries (TEOS-10)."""

from __future__ import annotations

from collections.abc import Mapping

import gsw
import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]

IN_SITU, POTENTIAL, CONSERVATIVE = "in situ", "potential", "conservative"

#: Kinds of temperature and of salinity by their CF standard names (CF Standard Name Table v83).
TEMPERATURES: Mapping[str, str] = {
    "sea_water_temperature": IN_SITU,
    "sea_water_potential_temperature": POTENTIAL,
    "sea_water_conservative_temperature": CONSERVATIVE,
}
PRACTICAL, ABSOLUTE = "practical", "absolute"
SALINITIES: Mapping[str, str] = {
    "sea_water_practical_salinity": PRACTICAL,
    "sea_water_salinity": PRACTICAL,
    "sea_water_absolute_salinity": ABSOLUTE,
}


def absolute_salinity(salinity: Floats, kind: str, pressure: Floats, longitude: Floats, latitude: Floats) -> Floats:
    """Return absolute salinity, g/kg, of ``salinity`` of either kind; all arrays broadcast against one another."""
    if kind == ABSOLUTE:
        return salinity
    return np.asarray(gsw.SA_from_SP(salinity, pressure, longitude, latitude))


def pressure_at(depth: Floats, latitude: Floats) -> Floats:
    """Return the sea pressure, dbar, at ``depth``, m, positive down (``gsw.p_from_z``, the standard ocean)."""
    return np.asarray(gsw.p_from_z(-depth, latitude))


def in_situ(temperature: Floats, kind: str, salinity: Floats, pressure: Floats) -> Floats:
    """Return in situ temperature, °C.

    Parameters
    ----------
    temperature : ndarray
        °C, of ``kind``: in situ, potential (reference 0 dbar) or conservative. NaN gives NaN.
    kind : str
    salinity : ndarray
        Absolute salinity, g/kg.
    pressure : ndarray
        Sea pressure, dbar.

    References
    ----------
    TEOS-10: IOC, SCOR and IAPSO (2010), Manuals and Guides 56. Water of potential temperature θ brought from 0 dbar to
    ``pressure`` has its in situ temperature there: ``gsw.pt_from_t`` from 0 to ``pressure``.
    """
    if kind == IN_SITU:
        return temperature
    if kind == POTENTIAL:
        return np.asarray(gsw.pt_from_t(salinity, temperature, 0.0, pressure))
    return np.asarray(gsw.t_from_CT(salinity, temperature, pressure))
