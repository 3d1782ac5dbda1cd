"""Columns that somebody else computed, as columns like ours: which values are used, why others are not, how wrong."""

from __future__ import annotations

from enum import IntEnum

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from profiles.config import ColumnSettings
from profiles.errors import DataError
from profiles.vocabulary import Flag, IsothermStatus, LayerMeanStatus, MixedLayerStatus, describe

Floats = NDArray[np.float64]

#: Statuses of which there is a depth; beside another, a delivered depth is a bound at best and is not used.
_WITH_DEPTH = (IsothermStatus.FOUND, IsothermStatus.OUTCROPPED, IsothermStatus.SEVERAL_CROSSINGS)
_NEEDED = ("isotherm_depth", "isotherm_depth_flag", "isotherm_status", "independent", "persistent", "deployment")


def columns_of_series(series: xr.Dataset, settings: ColumnSettings | None = None) -> xr.Dataset:
    """Return the columns of one mooring's series.

    Parameters
    ----------
    series : xarray.Dataset
        On ``time``: ``isotherm_depth`` (m), ``mixed_layer_depth`` (m) and ``mean_temperature`` (°C), NaN missing, each
        with ``..._flag``; ``isotherm_status``, 0 where nobody said it; ``independent`` and ``persistent``, the parts of
        the isotherm's standard error, m, NaN where nobody said them; ``deployment``; of months also ``days``, of how
        many a mean is, and ``spread``, their standard deviation, m.
    settings : ColumnSettings, optional
        Which flags are used, and the errors of a depth that comes without. Default: the defaults.

    Returns
    -------
    xarray.Dataset
        What :func:`profiles.column.columns_of` gives of a chain, without the bracket. A depth of 0 is one that
        outcropped. Of months also ``isotherm_day_count`` and ``isotherm_day_spread``.

    Raises
    ------
    DataError
        Where it is no series.
    """
    settings = settings or ColumnSettings()
    _check_series(series)
    depth, status, used = _isotherm(series, settings)
    independent, persistent, taken = _errors(series, depth, status, settings)
    found: dict[str, tuple[str, NDArray[np.generic]]] = {
        "isotherm_depth": ("time", depth.astype(np.float32)),
        "isotherm_status": ("time", status.astype(np.int8)),
        "isotherm_depth_error_independent": ("time", independent.astype(np.float32)),
        "isotherm_depth_error_persistent": ("time", persistent.astype(np.float32)),
        "isotherm_depth_error": ("time", np.hypot(independent, persistent).astype(np.float32)),
    }
    for name, statuses in (("mixed_layer_depth", MixedLayerStatus), ("mean_temperature", LayerMeanStatus)):
        value, why = _other(series, name, statuses, settings)
        found |= {name: ("time", value.astype(np.float32)), _status_name(name): ("time", why)}
    questionable = (series["isotherm_depth_flag"].values == Flag.QUESTIONABLE) & used
    found["questionable_share"] = ("time", np.where(used, questionable, np.nan).astype(np.float32))
    found["deployment"] = ("time", series["deployment"].values.astype(np.int16))
    if "days" in series:
        found["isotherm_day_count"] = ("time", np.nan_to_num(series["days"].values).astype(np.int16))
        found["isotherm_day_spread"] = ("time", series["spread"].values.astype(np.float32))
    coords = {name: series[name] for name in ("time", "mooring", "latitude", "longitude") if name in series.coords}
    return describe(
        xr.Dataset(found, coords=coords),
        isotherm_depth={"comment": f"{settings.isotherm:g} °C, as delivered"},
        isotherm_depth_error={"comment": _error_comment(taken, int(np.isfinite(depth).sum()), settings)},
    )


def _status_name(quantity: str) -> str:
    return {"mixed_layer_depth": "mixed_layer_status"}.get(quantity, f"{quantity}_status")


def _isotherm(series: xr.Dataset, settings: ColumnSettings) -> tuple[Floats, NDArray[np.int64], NDArray[np.bool_]]:
    """Return the depths that are used, m, the status of all, and which are used."""
    delivered = series["isotherm_depth"].values.astype(np.float64)
    said = series["isotherm_status"].values.astype(np.int64)
    outcropped = np.where(said == 0, delivered == 0.0, said == IsothermStatus.OUTCROPPED)
    is_depth = np.where(said == 0, True, np.isin(said, [int(status) for status in _WITH_DEPTH]))
    depth = np.where(outcropped, 0.0, np.where(is_depth, delivered, np.nan))
    status = np.where(said == 0, int(IsothermStatus.FOUND), said)
    status[outcropped] = int(IsothermStatus.OUTCROPPED)
    status[is_depth.astype(bool) & np.isnan(depth)] = int(IsothermStatus.NOT_DELIVERED)
    rejected = np.isfinite(depth) & ~np.isin(series["isotherm_depth_flag"].values, settings.use_flags)
    status[rejected] = int(IsothermStatus.NOT_USED)
    return np.where(rejected, np.nan, depth), status, np.isfinite(depth) & ~rejected


def _errors(
    series: xr.Dataset, depth: Floats, status: NDArray[np.int64], settings: ColumnSettings
) -> tuple[Floats, Floats, int]:
    """Return both parts of the error, m, and of how many depths the settings' were taken.

    What outcropped has no depth that could be wrong, and keeps what was delivered.
    """
    independent, persistent = (series[name].values.astype(np.float64) for name in ("independent", "persistent"))
    bare = np.isnan(independent) | np.isnan(persistent)
    taken = bare & np.isfinite(depth) & (status != IsothermStatus.OUTCROPPED)
    independent = np.where(taken & np.isnan(independent), settings.series_error_independent, independent)
    persistent = np.where(taken & np.isnan(persistent), settings.series_error_persistent, persistent)
    given = np.isfinite(depth)
    return np.where(given, independent, np.nan), np.where(given, persistent, np.nan), int(taken.sum())


def _other(
    series: xr.Dataset, name: str, statuses: type[IntEnum], settings: ColumnSettings
) -> tuple[Floats, NDArray[np.int8]]:
    """Return the values of a quantity that are used, and the status of all."""
    members = statuses.__members__
    value = series[name].values.astype(np.float64)
    used = np.isin(series[f"{name}_flag"].values, settings.use_flags)
    status = np.where(used, members["FOUND"], members["NOT_USED"])
    status = np.where(np.isnan(value), members["NOT_DELIVERED"], status)
    return np.where(used, value, np.nan), status.astype(np.int8)


def _error_comment(taken: int, depths: int, settings: ColumnSettings) -> str:
    if not taken:
        return "as delivered"
    return (
        f"{taken} of {depths} depths came without it: {settings.series_error_independent:g} m, independent, and "
        f"{settings.series_error_persistent:g} m, persistent, were taken, as the settings say"
    )


def _check_series(series: xr.Dataset) -> None:
    missing = [name for name in _NEEDED if name not in series]
    if missing:
        raise DataError(
            "the series lacks what its columns are made from",
            expected=", ".join(_NEEDED),
            found=f"no {', '.join(missing)}",
            advice="pass on what was read of it",
        )
