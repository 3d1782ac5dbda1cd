"""What a mooring's sensors make of the water: motion, wrong nominal depths, calibration, drift, noise, silence."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import gsw
import numpy as np
import xarray as xr
from numpy.typing import ArrayLike, NDArray

from profiles.drill.array import Site
from profiles.drill.motion import rise
from profiles.drill.ocean import Columns
from profiles.drill.service import Deployment, Outage, all_depths, delivered_values, deployments, numbers, outages
from profiles.drill.streams import stream
from profiles.vocabulary import describe

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]
Times = NDArray[np.datetime64]

MONTH = 30.4375  # days

DEPTH_SD = 1.0  # m, sensor on the line against nominal depth, per sensor and deployment (ours)
SHALLOWEST_SENSOR = 0.2  # m; a sensor never leaves the water


@dataclass(frozen=True)
class Make:
    """How good a thermistor is, standard deviations.

    ``offset``, °C, per sensor and deployment; ``drift``, °C per month, likewise; ``noise``, °C, of one value;
    ``decimals`` of a value.
    """

    offset: float
    drift: float
    noise: float
    decimals: int


#: Makes of thermistor. Noise is from memory.
MAKES: Mapping[str, Make] = {
    # Freitag et al. (2005): 0.0181 °C with drift. sqrt(0.0167**2 + 0.001**2 * 12**2 / 3) = 0.0181 over a year.
    "chain": Make(offset=0.0167, drift=0.001, noise=0.005, decimals=3),
    # Initial accuracy 0.002 °C, drift 0.0002 °C per month, resolution 0.0001 to 0.001 °C (data sheets).
    "logger": Make(offset=0.002, drift=0.0002, noise=0.001, decimals=3),
    # About 0.09 to 0.1 °C in all (from memory): sqrt(0.085**2 + 0.005**2 * 12**2 / 3) = 0.092.
    "old chain": Make(offset=0.085, drift=0.005, noise=0.01, decimals=2),
}

PRESSURE_DEPTHS = (100.0, 300.0, 500.0)  # m; the sensors nearest to these have pressure (ours; 300, 500 from memory)
PRESSURE_OFFSET_SD = 0.8  # dbar per sensor and deployment: data sheets say 0.6, Freitag et al. (2005) 0.98 with drift
PRESSURE_DRIFT_SD = 0.08  # dbar per month: sqrt(0.8**2 + 0.08**2 * 12**2 / 3) = 0.97
PRESSURE_NOISE_SD = 0.1  # dbar, one value (from memory)
PRESSURE_DECIMALS = 2


def with_pressure(depths: ArrayLike) -> Integers:
    """Return the places of the sensors that also record pressure, ascending, for nominal ``depths`` (depth,), m."""
    away = np.abs(np.asarray(depths, dtype=np.float64)[:, None] - np.asarray(PRESSURE_DEPTHS))
    return np.unique(away.argmin(axis=0))


def ageing(offset: Floats, drift: Floats, days: Floats, starts: Floats, deployment: Integers) -> Floats:
    """Return the error of sensors that start with an offset and drift on.

    Parameters
    ----------
    offset, drift : ndarray, shape (deployment, depth)
        In the unit of the error, and that per month.
    days : ndarray, shape (time,)
    starts : ndarray, shape (deployment,)
        Days.
    deployment : ndarray of int, shape (time,)
        Place of the deployment in the others' first dimension.

    Returns
    -------
    ndarray, shape (time, depth)
    """
    months = (days - starts[deployment]) / MONTH
    return np.asarray(offset[deployment] + drift[deployment] * months[:, None])


def moor(
    columns: Columns,
    position: int,
    site: Site,
    time: Times,
    visited: Floats,
    *,
    seed: int,
    berth: int = 0,
    make: Make = MAKES["chain"],
) -> tuple[xr.Dataset, xr.Dataset, tuple[Outage, ...]]:
    """Moor one chain in the simulated ocean.

    Parameters
    ----------
    columns : Columns
        Of the same times as ``time``.
    position : int
        Of the site among them.
    site : Site
        Its depths are those of the first deployment.
    time : ndarray of datetime64, shape (time,)
        UTC, evenly spaced.
    visited : ndarray, shape (visit,)
        Days since the first time, as :func:`profiles.drill.service.visits` gives them for the line.
    seed : int
        With the site's name decides everything else.
    berth : int, optional
        Place of the mooring on its line, from 0.
    make : Make, optional
        Of its thermistors.

    Returns
    -------
    tuple
        The chain, dims (time, depth): ``temperature``, ``pressure`` where a sensor has it, ``deployment`` from 1;
        NaN where nothing was delivered. Its depths are all that any deployment had. Then its truth:
        ``sensor_depth`` (time, depth), m, and on (number, depth) ``calibration_offset``, ``calibration_drift``,
        ``depth_offset``, ``pressure_offset``, ``pressure_drift``. Then its outages.
    """
    days = (time - time[0]) / np.timedelta64(1, "D")
    deployed = deployments(visited, berth, site.depths, stream(seed, "deployments", site.id))
    befallen = outages(deployed, stream(seed, "outages", site.id))
    depths = all_depths(deployed)
    deployment = numbers(days, deployed)
    errors = sensor_errors(len(deployed), depths, make, stream(seed, "sensors", site.id))
    risen = rise(days, depths, site.latitude, site.longitude, stream(seed, "motion", site.id))
    depth = np.asarray(depths) + errors["depth_offset"][deployment] - risen
    depth = np.maximum(depth, np.minimum(SHALLOWEST_SENSOR, depths))
    delivered = delivered_values(days, depths, deployed, befallen, stream(seed, "gaps", site.id))

    aged = _Aged(errors, days, np.array([each.start for each in deployed]), deployment)
    noise = stream(seed, "noise", site.id)
    temperature = columns.temperature(position, depth) + aged("calibration")
    temperature = (temperature + make.noise * noise.standard_normal(depth.shape)).round(make.decimals)
    pressure = gsw.p_from_z(-depth, site.latitude) + aged("pressure")
    pressure = (pressure + PRESSURE_NOISE_SD * noise.standard_normal(depth.shape)).round(PRESSURE_DECIMALS)
    recorded = _pressure_mask(depths, deployed)[deployment]
    chain = _chain(
        site,
        time,
        depths,
        np.where(delivered, temperature, np.nan),
        np.where(delivered & recorded, pressure, np.nan),
        deployment + 1,
    )
    return chain, _truth(chain, depth, errors), befallen


@dataclass(frozen=True)
class _Aged:
    """Errors of all deployments through time, by the name of the quantity."""

    errors: Mapping[str, Floats]
    days: Floats
    starts: Floats
    deployment: Integers

    def __call__(self, name: str) -> Floats:
        offset, drift = self.errors[f"{name}_offset"], self.errors[f"{name}_drift"]
        return ageing(offset, drift, self.days, self.starts, self.deployment)


def sensor_errors(count: int, depths: tuple[float, ...], make: Make, random: np.random.Generator) -> dict[str, Floats]:
    """Draw what is wrong with each sensor of each of ``count`` deployments, (deployment, depth).

    ``calibration_offset``, °C; ``calibration_drift``, °C per month; ``depth_offset``, m, positive down;
    ``pressure_offset``, dbar; ``pressure_drift``, dbar per month.
    """
    spread = {
        "calibration_offset": make.offset,
        "calibration_drift": make.drift,
        "depth_offset": DEPTH_SD,
        "pressure_offset": PRESSURE_OFFSET_SD,
        "pressure_drift": PRESSURE_DRIFT_SD,
    }
    return {name: sd * random.standard_normal((count, len(depths))) for name, sd in spread.items()}


def _pressure_mask(depths: tuple[float, ...], deployed: tuple[Deployment, ...]) -> NDArray[np.bool_]:
    """Return which of ``depths`` have pressure, (deployment, depth)."""
    return np.array([np.isin(depths, np.asarray(each.depths)[with_pressure(each.depths)]) for each in deployed])


def _chain(
    site: Site, time: Times, depths: tuple[float, ...], temperature: Floats, pressure: Floats, deployment: Integers
) -> xr.Dataset:
    chain = xr.Dataset(
        {
            "temperature": (("time", "depth"), temperature),
            "pressure": (("time", "depth"), pressure),
            "deployment": ("time", deployment.astype(np.int16)),
        },
        coords={
            "time": time,
            "depth": np.asarray(depths, dtype=np.float32),
            "mooring": site.id,
            "latitude": site.latitude,
            "longitude": site.longitude,
        },
    )
    chain["pressure"].attrs = {
        "long_name": "sea pressure at the sensor",
        "units": "dbar",
        "standard_name": "sea_water_pressure_due_to_sea_water",
    }
    return describe(chain, deployment={"long_name": "number of the deployment that measured, from 1"})


_ERROR_UNITS = {
    "calibration_offset": "degree_Celsius",
    "calibration_drift": "degree_Celsius month-1",
    "depth_offset": "m",
    "pressure_offset": "dbar",
    "pressure_drift": "dbar month-1",
}


def _truth(chain: xr.Dataset, depth: Floats, errors: Mapping[str, Floats]) -> xr.Dataset:
    count = len(errors["depth_offset"])
    truth = xr.Dataset(
        {
            "sensor_depth": (("time", "depth"), depth.round(2).astype(np.float32)),
            **{name: (("number", "depth"), values.round(6)) for name, values in errors.items()},
        },
        coords={**chain.coords, "number": np.arange(1, count + 1, dtype=np.int16)},
    )
    for name, unit in _ERROR_UNITS.items():
        truth[name].attrs = {"long_name": f"{name.replace('_', ' ')} of the sensor in the deployment", "units": unit}
    return describe(truth)
