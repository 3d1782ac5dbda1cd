"""From the monthly means of an array to its section, tilt and volume."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pandas as pd
import xarray as xr
from numpy.typing import NDArray

from profiles.config import SectionSettings
from profiles.errors import DataError
from profiles.section.climatology import Climatology, Records, estimate_climatology
from profiles.section.covariance import Gaussian, Solver, same_networks
from profiles.section.functional import functional_error
from profiles.section.grid import REGIONS, array_grid, sea_area
from profiles.section.objective_map import objective_map
from profiles.section.tilt import section_weights, thermocline_slope
from profiles.section.volume import warm_water_volume
from profiles.statistics import HARMONICS
from profiles.vocabulary import describe

Array = NDArray[np.float64]

#: Days after which a site's isotherm depth has forgotten its small-scale part (ours), for months with gaps.
SMALL_SCALE_DAYS = 5.0


@dataclass(frozen=True)
class Section:
    """The map with its climatology and tilt, the volumes, and how well the covariance fits the data.

    ``leave_one_out`` is the mean square of each value's departure from what the others say of it, in its standard
    errors: about 1 where the covariance is right, above where the stated errors are too small.
    """

    section: xr.Dataset
    volume: xr.Dataset
    leave_one_out: float


def build_section(monthly: xr.Dataset, settings: SectionSettings | None = None, *, isotherm: float = 20.0) -> Section:
    """Map an array's monthly isotherm depths and read off the tilt and the volume.

    Parameters
    ----------
    monthly : xarray.Dataset
        Monthly means on (mooring, time) with ``latitude`` and ``longitude`` (mooring), as
        :func:`profiles.section.join_moorings` returns them.
    settings : SectionSettings, optional
        Default: the defaults.
    isotherm : float
        °C, what the depths are of.

    Raises
    ------
    DataError
        Where no mooring has a monthly mean.
    """
    settings = settings or SectionSettings()
    records, climatology, field = map_records(monthly, settings, isotherm)
    anomaly = _with_climatology(field, climatology, records, settings, "anomaly")
    whole = _with_climatology(field, climatology, records, settings, "whole")
    whole["mean"] = whole["mean"] + climatology.cells_at(records.time)
    return Section(
        section=_assemble_section(anomaly, whole, climatology, monthly, settings),
        volume=_assemble_volume(anomaly, whole),
        leave_one_out=_leave_one_out(field, records, climatology),
    )


def map_records(
    monthly: xr.Dataset, settings: SectionSettings, isotherm: float
) -> tuple[Records, Climatology, xr.Dataset]:
    """Return the records of an array, their climatology, and the map of the anomalies from it."""
    records = _records(monthly, settings)
    rows, columns = array_grid()
    climatology = estimate_climatology(records, rows, columns, isotherm, settings)
    field = objective_map(
        xr.DataArray(
            records.values - climatology.sites_at(records.time), dims=("time", "site"), coords={"time": monthly["time"]}
        ),
        records.latitude,
        records.longitude,
        rows,
        columns,
        signal_sd=settings.signal_sd,
        noise_sd=np.hypot(records.independent, records.persistent),
        length_longitude=settings.length_longitude,
        length_latitude=settings.length_latitude,
    )
    return records, climatology, field


def _records(monthly: xr.Dataset, settings: SectionSettings) -> Records:
    values = monthly["isotherm_depth"].transpose("time", "mooring").values.astype(np.float64)
    if not np.isfinite(values).any():
        raise DataError(
            "no mooring has a monthly mean isotherm depth",
            expected="one month or more with enough daily means",
            found=f"{values.shape[1]} moorings, {values.shape[0]} months, none with a mean",
            advice="see isotherm_mean_status in the columns for the reasons",
        )
    part = {name: monthly[name].transpose("time", "mooring").values for name in _INPUTS}
    persistent = np.nan_to_num(part["isotherm_depth_error_persistent"]).astype(np.float64)
    return Records(
        time=monthly["time"].values,
        latitude=monthly["latitude"].values.astype(np.float64),
        longitude=monthly["longitude"].values.astype(np.float64),
        values=values,
        independent=_independent(part, monthly, settings),
        persistent=np.where(np.isfinite(values), persistent, np.nan),
        deployment=part["deployment"].astype(np.int64),
    )


_INPUTS = (
    "isotherm_depth_error_independent",
    "isotherm_depth_error_persistent",
    "isotherm_day_count",
    "isotherm_day_spread",
    "deployment",
)


def _independent(part: dict[str, Array], monthly: xr.Dataset, settings: SectionSettings) -> Array:
    """Return the noise of a monthly mean that changes from month to month, m, (time, site).

    Sensor noise; what the map's scales do not resolve; and, where days are missing, the error of a mean of n of N days,
    spread^2 / n_effective (1 - n / N).
    """
    days = part["isotherm_day_count"].astype(np.float64)
    length = pd.DatetimeIndex(monthly["time"].values).days_in_month.to_numpy()[:, None]
    effective = np.maximum(days / SMALL_SCALE_DAYS, 1.0)
    sampling = np.nan_to_num(part["isotherm_day_spread"]) ** 2 / effective * np.clip(1.0 - days / length, 0.0, 1.0)
    sensor = np.nan_to_num(part["isotherm_depth_error_independent"])
    return np.sqrt(sensor**2 + sampling + settings.small_scale_sd**2)


def _with_climatology(
    field: xr.Dataset, climatology: Climatology, records: Records, settings: SectionSettings, quantity: str
) -> xr.Dataset:
    """Return the field with what the error of a functional needs to know of the climatology."""
    known = climatology.known
    carried = field.assign(
        parameter_latitude=("parameter_site", records.latitude[known]),
        parameter_longitude=("parameter_site", records.longitude[known]),
        climatology_prior_sd=("harmonic", climatology.prior_sd),
        climatology_information=(("parameter", "parameter_"), climatology.information),
    )
    carried.attrs |= {"quantity": quantity, "climatology_prior": settings.climatology.model_dump_json()}
    return describe(carried)


def _assemble_section(
    anomaly: xr.Dataset,
    whole: xr.Dataset,
    climatology: Climatology,
    monthly: xr.Dataset,
    settings: SectionSettings,
) -> xr.Dataset:
    rows, columns = anomaly["latitude"].values, anomaly["longitude"].values
    sea = sea_area(rows, columns) > 0.0
    grid = ("harmonic", "latitude", "longitude")
    section = anomaly.rename(mean="isotherm_depth_anomaly", error="isotherm_depth_anomaly_error")
    for name in ("isotherm_depth_anomaly", "isotherm_depth_anomaly_error"):
        section[name] = section[name].where(sea)
    section["isotherm_depth_climatology"] = (grid, np.where(sea, climatology.at_cells, np.nan))
    section["isotherm_depth_climatology_error"] = (grid, np.where(sea, climatology.cell_error, np.nan))
    weights = section_weights(anomaly)
    wet = weights.sum(axis=(1, 2)) > 0.0
    for suffix, field in (("", whole), ("_anomaly", anomaly)):
        line = np.einsum("trc,xrc->tx", field["mean"].values, weights, optimize=True)
        error = functional_error(field, weights)
        section[f"equatorial_isotherm_depth{suffix}"] = (("time", "longitude"), np.where(wet, line, np.nan))
        section[f"equatorial_isotherm_depth{suffix}_error"] = (("time", "longitude"), np.where(wet, error, np.nan))
        tilt = thermocline_slope(field, window=settings.tilt_window)
        section[f"thermocline_slope{suffix}"] = tilt["thermocline_slope"]
        section[f"thermocline_slope{suffix}_error"] = tilt["thermocline_slope_error"]
    section = section.assign_coords(harmonic=list(HARMONICS), site=monthly["mooring"].values)
    window = {"window": f"{settings.tilt_window[0]:g} to {settings.tilt_window[1]:g} degrees east"}
    slopes = [name for name in section.data_vars if str(name).startswith("thermocline_slope")]
    return describe(section, **{str(name): window for name in slopes})


def _assemble_volume(anomaly: xr.Dataset, whole: xr.Dataset) -> xr.Dataset:
    regions = []
    for region in REGIONS:
        volume, departure = warm_water_volume(whole, region=region), warm_water_volume(anomaly, region=region)
        regions.append(
            volume.assign(
                warm_water_volume_anomaly=departure["warm_water_volume"],
                warm_water_volume_anomaly_error=departure["warm_water_volume_error"],
            )
        )
    joined = xr.concat(regions, dim="region", coords="minimal", compat="override")
    return describe(joined.transpose("time", "region"))


def _leave_one_out(field: xr.Dataset, records: Records, climatology: Climatology) -> float:
    """Return the mean square of the standardised leave-one-out departures.

    With A the data covariance and g = A^-1 d, a value departs from what the others say by g_i / (A^-1)_ii, the variance
    of which is 1 / (A^-1)_ii.
    """
    anomalies = records.values - climatology.sites_at(records.time)
    correlation = Gaussian(field.attrs["length_longitude"], field.attrs["length_latitude"])
    between = correlation.between(records.latitude, records.longitude, records.latitude, records.longitude)
    squares: list[Array] = []
    for network in same_networks(field["site_noise"].values):
        sites = network.sites
        if sites.size < 2:
            continue
        solver = Solver.of(between[np.ix_(sites, sites)], field.attrs["signal_sd"], network.noise)
        inverse = solver.solve(np.eye(sites.size))
        squares.append(((anomalies[np.ix_(network.times, sites)] @ inverse) ** 2 / np.diag(inverse)).ravel())
    return float(np.concatenate(squares).mean()) if squares else float("nan")
