"""All columns of one flagged chain."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

import numpy as np
import xarray as xr

from profiles.column.isotherm import isotherm_depth, isotherm_depth_error
from profiles.column.layer_mean import layer_mean_temperature
from profiles.column.mixed_layer import mixed_layer_depth
from profiles.config import ColumnSettings
from profiles.errors import DataError
from profiles.store import TIME_BLOCK, padded_blocks
from profiles.vocabulary import Flag, describe


def columns_of(chain: xr.Dataset, settings: ColumnSettings | None = None) -> xr.Dataset:
    """Return what can be read off every profile of a flagged chain.

    Parameters
    ----------
    chain : xarray.Dataset
        With ``temperature`` and ``temperature_qc`` (time, depth), ``temperature_uncertainty`` (depth) and, where the
        sensors moved, ``sensor_depth`` (time, depth).
    settings : ColumnSettings, optional
        Default: the defaults.

    Returns
    -------
    xarray.Dataset
        On ``time``: the isotherm with its status, bracket and error, the mixed layer, the mean temperature, each with
        its status, the share of questionable values among those used, and the deployment.

    Raises
    ------
    DataError
        Where the chain has no flags.
    """
    settings = settings or ColumnSettings()
    _check_flagged(chain)
    flags = chain["temperature_qc"]
    used = flags.isin(list(settings.use_flags))
    temperature = chain["temperature"].where(used)
    sensor_depth = chain.get("sensor_depth")
    rule: dict[str, Any] = {
        "isotherm": settings.isotherm,
        "sensor_depth": sensor_depth,
        "max_bracket": settings.max_bracket,
        "crossing": settings.crossing,
        "surface_reach": settings.surface_reach,
    }
    columns = xr.merge(
        [
            isotherm_depth(temperature, **rule),
            isotherm_depth_error(
                temperature,
                chain["temperature_uncertainty"],
                **rule,
                noise=settings.sensor_noise,
                depth_accuracy=settings.depth_accuracy,
                motion=settings.motion_accuracy if sensor_depth is None else 0.0,
            ),
            mixed_layer_depth(
                temperature,
                threshold=settings.mixed_layer_threshold,
                reference_depth=settings.mixed_layer_reference,
                sensor_depth=sensor_depth,
            ),
            layer_mean_temperature(
                temperature,
                bottom=settings.mean_temperature_bottom,
                surface_reach=settings.surface_reach,
                max_gap=settings.max_bracket,
                sensor_depth=sensor_depth,
            ),
        ],
        compat="override",
        join="exact",
    )
    columns["questionable_share"] = _share(flags == Flag.QUESTIONABLE, used)
    if "deployment" in chain:
        columns["deployment"] = chain["deployment"]
    return describe(columns, isotherm_depth={"comment": columns["isotherm_depth"].attrs["comment"]})


def column_blocks(
    chain: xr.Dataset, settings: ColumnSettings | None = None, *, block_length: int = TIME_BLOCK
) -> Iterator[xr.Dataset]:
    """Yield :func:`columns_of` block by block, each in memory."""
    for block in padded_blocks(chain.sizes["time"], block_length):
        yield columns_of(chain.isel(time=block.padded).load(), settings)


def _share(part: xr.DataArray, whole: xr.DataArray) -> xr.DataArray:
    count = whole.sum("depth")
    return ((part & whole).sum("depth") / count.where(count > 0)).astype(np.float32)


def _check_flagged(chain: xr.Dataset) -> None:
    missing = [name for name in ("temperature", "temperature_qc", "temperature_uncertainty") if name not in chain]
    if missing:
        raise DataError(
            "the chain lacks what its columns are made from",
            expected="temperature, temperature_qc and temperature_uncertainty",
            found=f"no {', '.join(missing)}",
            advice="pass it through quality_control first",
        )
