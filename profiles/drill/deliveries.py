"""Records as four invented institutes deliver them: two kinds of wide text, long text, OceanSITES-like NetCDF."""

from __future__ import annotations

import gzip
from collections.abc import Callable, Mapping
from pathlib import Path

import gsw
import netCDF4
import numpy as np
import pandas as pd
import xarray as xr

from profiles.drill.array import Site
from profiles.drill.fault_catalogue import Touched
from profiles.drill.faults import delivered_time
from profiles.store import replacing

UTC, LOCAL = pd.Timedelta(0), pd.Timedelta(hours=10)  # of the wide and the long delivery
TIME_ORIGIN = np.datetime64("1950-01-01", "ns")  # OceanSITES 1.4
ABSENT_HALCYON, ABSENT_SHEARWATER = "-9.999", "-99.99"  # what the two wide deliveries have where nothing was measured
KELVIN = 273.15  # K at 0 °C
FILL = np.float32(99999.0)  # OceanSITES 1.4

#: What an institute's deliveries tell of; a fault in anything else does not show in them.
TOLD: Mapping[str, frozenset[Touched]] = {
    "halcyon": frozenset({"temperature"}),  # of the time the day alone
    "marlin": frozenset({"temperature", "time"}),
    "frigate": frozenset({"temperature", "time", "pressure"}),
    "shearwater": frozenset({"temperature"}),
}

# ----------------------------------------------------------------------------------------------------
# Text


def halcyon_lines(site: Site, chain: xr.Dataset) -> tuple[list[str], list[str]]:
    """Return the head and the rows of a wide delivery: a row a day, a column a sensor, no empty days."""
    head = [
        "# Halcyon Marine Survey (invented)",
        f"# mooring {site.id}, {site.latitude:g} N, {site.longitude:g} E",
        "# daily mean temperature, degrees Celsius (ITS-90), days in UTC",
        ",".join(["date", *(f"T_{depth:g}m" for depth in chain["depth"].values)]),
    ]
    rows = [
        ",".join([day.strftime("%Y-%m-%d"), *(_number(value, ABSENT_HALCYON) for value in values)])
        for day, values in _days_with_data(chain, UTC)
    ]
    return head, rows


def shearwater_lines(site: Site, chain: xr.Dataset) -> tuple[list[str], list[str]]:
    """Return the head and the rows of a wide delivery in kelvin, sensors named by pressure, days by their number."""
    pressures = gsw.p_from_z(-chain["depth"].values.astype(np.float64), site.latitude)
    head = [
        f"% Shearwater Ocean Service (invented), mooring {site.id}",
        "% daily mean temperature in kelvin; P stands before the nominal sea pressure in dbar; days in UTC",
        "\t".join(["year", "day", *(f"P{pressure:.1f}" for pressure in pressures)]),
    ]
    rows = [
        "\t".join([day.strftime("%Y\t%j"), *(_number(value, ABSENT_SHEARWATER) for value in values + KELVIN)])
        for day, values in _days_with_data(chain, UTC)
    ]
    return head, rows


def marlin_lines(site: Site, chain: xr.Dataset) -> tuple[list[str], list[str]]:
    """Return the head and the rows of a long delivery: a row a reading, days without data left out."""
    rows = [
        f"{site.id};{day.strftime('%d.%m.%Y %H:%M')};{depth:g};{_number(value, 'NA').replace('.', ',')}"
        for day, values in _days_with_data(chain, LOCAL)
        for depth, value in zip(chain["depth"].values, values, strict=True)
    ]
    return ["station;time_local;depth_m;temp_c"], rows


def _days_with_data(chain: xr.Dataset, offset: pd.Timedelta) -> list[tuple[pd.Timestamp, np.ndarray]]:
    values = chain["temperature"].transpose("time", "depth").values
    days = pd.DatetimeIndex(delivered_time(chain)) + offset
    return [(day, row) for day, row in zip(days, values, strict=True) if np.isfinite(row).any()]


def _number(value: float, absent: str) -> str:
    return absent if np.isnan(value) else f"{value:.3f}"


#: How an institute that delivers text writes: site, chain -> head, rows.
TEXTS: Mapping[str, Callable[[Site, xr.Dataset], tuple[list[str], list[str]]]] = {
    "halcyon": halcyon_lines,
    "marlin": marlin_lines,
    "shearwater": shearwater_lines,
}


def write_text_delivery(path: Path, head: list[str], rows: list[str]) -> None:
    """Write lines as gzip without a name or a time in its head: the same lines give the same bytes."""
    with (
        replacing(path) as temporary,
        temporary.open("wb") as stream,
        gzip.GzipFile(filename="", mode="wb", fileobj=stream, mtime=0) as packed,
    ):
        packed.write("".join(f"{line}\n" for line in [*head, *rows]).encode())


# ----------------------------------------------------------------------------------------------------
# Damage


def _truncated(row: str) -> list[str]:
    return [row[: len(row) // 2]]


def _letter(row: str) -> list[str]:
    return [f"{row[:-1]}x"]


def _duplicated(row: str) -> list[str]:
    return [row, row]


#: How the last of February is written, and what is no day.
_FEBRUARY: Mapping[str, str] = {"-02-28": "-02-30", "28.02.": "30.02.", "\t059\t": "\t399\t"}


def _no_such_day(row: str) -> list[str]:
    day = next(day for day in _FEBRUARY if day in row)
    return [row, row.replace(day, _FEBRUARY[day])]


def _is_february(row: str) -> bool:
    return any(day in row for day in _FEBRUARY)


#: How a row is damaged: what stands instead of it. The last line of that is the damaged one.
DAMAGES: Mapping[str, Callable[[str], list[str]]] = {
    "truncated line": _truncated,
    "letter in a number": _letter,
    "duplicated row": _duplicated,
    "no such day": _no_such_day,
}


def damage(rows: list[str], random: np.random.Generator) -> tuple[list[str], list[tuple[int, str]]]:
    """Damage one row of each kind; where no row is of the 28th of February, no day is made impossible.

    Parameters
    ----------
    rows : list of str
        A delivery without its head.
    random : numpy.random.Generator
        Decides which.

    Returns
    -------
    tuple
        The rows, and of each damaged one its index among them and the kind.
    """
    february = [index for index, row in enumerate(rows) if _is_february(row)]
    ordinary = [index for index, row in enumerate(rows) if index not in set(february) and row[-1].isdigit()]
    chosen = {int(index): kind for index, kind in zip(random.choice(ordinary, 3, replace=False), DAMAGES, strict=False)}
    if february:
        chosen[int(random.choice(february))] = "no such day"
    damaged: list[str] = []
    places = []
    for index, row in enumerate(rows):
        kind = chosen.get(index)
        damaged += [row] if kind is None else DAMAGES[kind](row)
        if kind is not None:
            places.append((len(damaged) - 1, kind))
    return damaged, places


# ----------------------------------------------------------------------------------------------------
# NetCDF

_FLAG_MEANINGS = (
    "unknown good_data probably_good_data potentially_correctable_bad_data bad_data nominal_value "
    "interpolated_value missing_value"
)  # OceanSITES 1.4
_NO_QUALITY_CONTROL, _MISSING = 0, 9
_COORDINATES = "TIME DEPTH LATITUDE LONGITUDE"


_TEMPERATURE: Mapping[str, str] = {
    "standard_name": "sea_water_temperature",
    "long_name": "sea water temperature",
    "units": "degree_Celsius",
    "reference_scale": "ITS-90",
    "ancillary_variables": "TEMP_QC",
}
_PRESSURE: Mapping[str, str] = {
    "standard_name": "sea_water_pressure_due_to_sea_water",
    "long_name": "sea pressure at the sensors that record it",
    "units": "dbar",
}
_WHERE = "LATITUDE: point LONGITUDE: point"


def write_netcdf_delivery(path: Path, site: Site, chain: xr.Dataset, *, means: bool = True) -> None:
    """Write an OceanSITES-like file: every time there, missing temperatures flagged 9, all others 0.

    Parameters
    ----------
    path : Path
    site : Site
    chain : xarray.Dataset
        As :func:`profiles.drill.instruments.moor` gives it, with or without faults.
    means : bool, optional
        Whether a value is the mean of its day, or an instant.
    """
    values = chain["temperature"].transpose("time", "depth").values
    methods = f"TIME: {'mean' if means else 'point'} DEPTH: point {_WHERE}"
    with replacing(path) as temporary, netCDF4.Dataset(temporary, "w", format="NETCDF4") as file:
        file.setncatts(_global_attributes(site, chain, "Daily mean" if means else "10-minute"))
        _define_coordinates(file, site, chain)
        _define(file, "TEMP", "f4", FILL, np.where(np.isfinite(values), values, FILL))
        file["TEMP"].setncatts({**_TEMPERATURE, "cell_methods": methods, "coordinates": _COORDINATES})
        _define(file, "TEMP_QC", "i1", np.int8(-128), np.where(np.isfinite(values), _NO_QUALITY_CONTROL, _MISSING))
        file["TEMP_QC"].setncatts(
            {
                "long_name": "quality flag of sea water temperature",
                "flag_values": np.array([0, 1, 2, 3, 4, 7, 8, 9], dtype=np.int8),
                "flag_meanings": _FLAG_MEANINGS,
            }
        )
        pressure = chain["pressure"].transpose("time", "depth").values
        _define(file, "PRES", "f4", FILL, np.where(np.isfinite(pressure), pressure, FILL))
        file["PRES"].setncatts({**_PRESSURE, "cell_methods": methods, "coordinates": _COORDINATES})


def _define(file: netCDF4.Dataset, name: str, dtype: str, fill: np.generic, values: np.ndarray) -> None:
    variable = file.createVariable(
        name,
        dtype,
        ("TIME", "DEPTH"),
        fill_value=fill,
        compression="zlib",
        shuffle=True,
        chunksizes=(values.shape[0], 1),
    )
    variable[...] = values


def _define_coordinates(file: netCDF4.Dataset, site: Site, chain: xr.Dataset) -> None:
    coordinates = {
        "TIME": (
            "f8",
            (delivered_time(chain) - TIME_ORIGIN) / np.timedelta64(1, "D"),
            "time",
            "days since 1950-01-01T00:00:00Z",
            "T",
        ),
        "DEPTH": ("f4", chain["depth"].values, "depth", "meters", "Z"),
        "LATITUDE": ("f4", np.array([site.latitude]), "latitude", "degrees_north", "Y"),
        "LONGITUDE": (
            "f4",
            np.array([(site.longitude + 180.0) % 360.0 - 180.0]),
            "longitude",
            "degrees_east",
            "X",
        ),
    }
    for name, (dtype, values, standard_name, units, axis) in coordinates.items():
        file.createDimension(name, None if name == "TIME" else values.size)
        variable = file.createVariable(name, dtype, (name,), compression="zlib", chunksizes=(values.size,))
        variable.setncatts({"standard_name": standard_name, "units": units, "axis": axis})
        variable[...] = values
    file["TIME"].calendar = "standard"
    file["DEPTH"].setncatts({"positive": "down", "reference": "sea_level"})


def _global_attributes(site: Site, chain: xr.Dataset, kind: str) -> dict[str, object]:
    stamps = pd.DatetimeIndex(delivered_time(chain))
    start, end = (stamp.strftime("%Y-%m-%dT%H:%M:%SZ") for stamp in (stamps.min(), stamps.max()))
    return {
        "Conventions": "CF-1.11, OceanSITES-1.4, ACDD-1.3",
        "title": f"{kind} temperature of mooring {site.id}",
        "summary": "Invented data of an invented array: no such mooring has been at sea.",
        "site_code": site.id,
        "platform_code": site.id,
        "data_mode": "D",
        "data_type": "OceanSITES time-series data",
        "format_version": "1.4",
        "update_interval": "void",
        "institution": "Frigate Marine Institute (invented)",
        "geospatial_lat_min": site.latitude,
        "geospatial_lat_max": site.latitude,
        "geospatial_lon_min": site.longitude,
        "geospatial_lon_max": site.longitude,
        "geospatial_vertical_min": float(chain["depth"][0]),
        "geospatial_vertical_max": float(chain["depth"][-1]),
        "time_coverage_start": start,
        "time_coverage_end": end,
        "processing_level": "Raw instrument data",
    }
