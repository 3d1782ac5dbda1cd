"""Both sides by month, like for like: the same sensors, the same steps, the same months."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from profiles.errors import DataError
from profiles.validation.calendars import ModelTime
from profiles.validation.observed import Array, Sensors, by_month, columns_at_steps, run_months, with_days_of_run

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class BothSides:
    """Monthly columns of the array and of the model as seen, on the same (mooring, time), missing where either is.

    The errors and counts on both are those of the array, so that both are mapped alike. ``averaging_effect`` (mooring,
    time), m, is what averaging temperature over the model's steps does to the array's isotherm: less the run's mean.
    """

    array: xr.Dataset
    model: xr.Dataset
    averaging_effect: xr.DataArray


def both_sides(array: Array, sensors: Sensors, seen: Floats, time: ModelTime) -> BothSides:
    """Return both sides from the model's temperature at the array's sensors, ``seen`` (step, mooring, sensor).

    Raises
    ------
    DataError
        Where no month is left.
    """
    both = np.isfinite(seen) & np.isfinite(sensors.temperature)
    sides = [np.where(both, values, np.nan) for values in (sensors.temperature, seen)]
    columns = [columns_at_steps(sensors, side, array.column) for side in sides]
    for mooring in sensors.moorings:
        _keep_common(columns[0][mooring], columns[1][mooring])
    ours, theirs = (by_month(side, time, array.section.means) for side in columns)
    theirs = theirs.reindex_like(ours)
    for name in COMPARED:
        given = ours[name].notnull() & theirs[name].notnull()
        ours[name], theirs[name] = ours[name].where(given), theirs[name].where(given)
    if not ours["isotherm_depth"].notnull().any():
        raise DataError(
            "no month has an isotherm depth on both sides",
            expected="one month or more in which the array and the model as seen have one",
            found=f"{int((~both).sum())} of {both.size} sensor values missing on either side, "
            f"{int(np.isfinite(seen).sum())} of them given by the model",
            advice="see that the model's levels reach the sensors, and that its temperatures are in the stated units",
        )
    ours = with_days_of_run(ours, array, time)
    effect = (ours["isotherm_depth"] - run_months(array, ours)["isotherm_depth"]).astype(np.float32)
    model = ours.assign({name: theirs[name] for name in COMPARED})
    return BothSides(ours, model, effect)


#: What is compared at moorings.
COMPARED = ("isotherm_depth", "steepest_gradient_depth", "mixed_layer_depth", "mean_temperature")


def _keep_common(ours: xr.Dataset, theirs: xr.Dataset) -> None:
    """Remove what only one side gives at a step."""
    for name in COMPARED:
        given = ours[name].notnull() & theirs[name].notnull()
        ours[name], theirs[name] = ours[name].where(given), theirs[name].where(given)
