"""Indices: surface temperature over a box, from a grid or from moorings, and a difference of pressures."""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np
import xarray as xr
from cf_units import Unit
from numpy.typing import NDArray

from profiles.atlas import sea_share
from profiles.errors import DataError, RequestError
from profiles.precursor.anomaly import Anomaly, Base, fit_anomaly
from profiles.precursor.series import calendar_month, check_months, month_of, monthly_series, overlap
from profiles.section.grid import cell_area, cell_edges
from profiles.vocabulary import DEGREES

Array = NDArray[np.float64]


@dataclass(frozen=True)
class Box:
    """A box, degrees north and degrees east 0-360; ``east`` is beyond 360 where the box reaches across Greenwich."""

    south: float
    north: float
    west: float
    east: float

    def __str__(self) -> str:
        return f"{self.south:g} to {self.north:g} degrees north, {self.west:g} to {self.east:g} degrees east"


#: The published boxes of sea-surface temperature (national services' definitions).
BOXES: Mapping[str, Box] = {
    "nino12": Box(-10.0, 0.0, 270.0, 280.0),
    "nino3": Box(-5.0, 5.0, 210.0, 270.0),
    "nino34": Box(-5.0, 5.0, 190.0, 240.0),
    "nino4": Box(-5.0, 5.0, 160.0, 210.0),
}

LEAST_COVERED = 0.8  # share of the box's sea without which a month has no index (ours)
LEAST_LAND_MASKED = 0.5  # a cell with a smaller share of sea is land (ours)
LEAST_MOORINGS = 0.5  # share of the box's moorings without which a month has no index (ours)


def box_of(text: str) -> Box:
    """Return a box by its name, ``nino34`` and so on, or from "south,north,west,east" in degrees north and east.

    Raises
    ------
    RequestError
        Where it is neither.
    """
    name = re.sub(r"[^a-z0-9]", "", text.lower())
    if name in BOXES:
        return BOXES[name]
    try:
        south, north, west, east = (float(part) for part in text.split(","))
    except ValueError:
        raise _no_box(text) from None
    west, east = west % 360.0, east % 360.0
    east = east + 360.0 if east <= west else east
    if not -90.0 <= south < north <= 90.0:
        raise _no_box(text)
    return Box(south, north, west, east)


def _no_box(text: str) -> RequestError:
    expected = f"{', '.join(BOXES)} or south,north,west,east in degrees north and east"
    return RequestError("no such box", where="box", expected=expected, found=repr(text))


def surface_temperature_index(field: xr.DataArray, box: Box | str, *, where: str | None = None) -> xr.DataArray:
    """Return the monthly mean surface temperature of a box.

    Parameters
    ----------
    field : xarray.DataArray
        On time, latitude and longitude, which are told by their CF attributes or names, in any order and direction;
        one value a month. NaN on land. Temperature in °C, or in the units that it states.
    box : Box or str
        As :func:`box_of` reads it.
    where : str, optional
        File, for messages.

    Returns
    -------
    xarray.DataArray
        ``surface_temperature_index``, °C, on ``time``. Cells are cut at the edges of the box and count by their area on
        the sphere; land is left out, by NaN and where the packaged relief (ETOPO5) has less sea than land. A month
        with values on less than 0.8 of the box's sea is NaN. The attributes state box and units read.

    Raises
    ------
    DataError
        Where the field is no map of months, does not reach the box, or is no temperature.
    """
    box = box_of(box) if isinstance(box, str) else box
    where = where or str(field.name)
    grid = _standard_grid(field, where)
    rows, columns = grid["latitude"].values.astype(np.float64), grid["longitude"].values.astype(np.float64)
    weights = _weights(rows, columns, box, where)
    used_rows, used_columns = weights.any(axis=1), weights.any(axis=0)
    part = grid.isel(latitude=used_rows, longitude=used_columns)
    values = part.values.astype(np.float64)
    inside = weights[np.ix_(used_rows, used_columns)]
    present = np.isfinite(values)
    # Sea is where the field ever has a value: what is always missing is its own land.
    sea = inside * present.any(axis=0)
    covered = (present * sea).sum(axis=(1, 2)) / max(float(sea.sum()), 1e-300)
    mean = (np.where(present, values, 0.0) * sea).sum(axis=(1, 2)) / np.where(
        covered >= LEAST_COVERED, covered * sea.sum(), np.nan
    )
    if not np.isfinite(mean).any():
        raise DataError(
            "no month has enough values in the box",
            where=where,
            expected=f"values on {LEAST_COVERED:g} or more of the sea in {box}",
            found=f"at most {covered.max():.2f}",
        )
    celsius, units = to_celsius(mean, field.attrs.get("units"), where)
    index = monthly_series(celsius, grid["time"].values, name="surface_temperature_index", units=DEGREES, where=where)
    return index.assign_attrs(index.attrs | {"box": str(box), "units_read": units})


def to_celsius(values: Array, units: str | None, where: str) -> tuple[Array, str]:
    """Return temperatures in °C from the units stated, and those units; without any they are taken as they are."""
    if units is None or units in ("1", ""):
        return values, "none stated"
    try:
        unit = Unit(units)
        return np.asarray(unit.convert(values, Unit("degC")), dtype=np.float64), units
    except ValueError:
        raise DataError("the units are not of temperature", where=where, expected="°C or K", found=units) from None


def _standard_grid(field: xr.DataArray, where: str) -> xr.DataArray:
    """Return the field on (time, latitude, longitude), ascending, longitude 0-360."""
    names = {kind: _coordinate(field, kind, where) for kind in ("time", "latitude", "longitude")}
    grid = field.squeeze([dim for dim in field.dims if field.sizes[dim] == 1 and dim not in names.values()], drop=True)
    grid = grid.rename({name: kind for kind, name in names.items() if name != kind})
    if set(grid.dims) != set(names):
        raise DataError(
            "the field is no map of months",
            where=where,
            expected="dimensions of time, latitude and longitude",
            found=", ".join(f"{dim} ({size})" for dim, size in field.sizes.items()),
            advice="choose a level or a member first",
        )
    if not np.issubdtype(grid["time"].dtype, np.datetime64):
        raise DataError(
            "the times are not of the standard calendar",
            where=where,
            expected="dates that datetime64 holds",
            found=str(grid["time"].dtype),
            advice="convert the calendar first",
        )
    grid = grid.assign_coords(longitude=grid["longitude"].values.astype(np.float64) % 360.0)
    return grid.transpose("time", "latitude", "longitude").sortby(["latitude", "longitude"])


_UNITS = {"time": "(?!)", "latitude": "degree[s]?_?n(orth)?", "longitude": "degree[s]?_?e(ast)?"}
_NAMES = {"time": "time|month|date|t", "latitude": "lat.*|y|nav_lat", "longitude": "lon.*|x|nav_lon"}


def _coordinate(field: xr.DataArray, kind: str, where: str) -> str:
    """Return the name of the coordinate along one dimension that is the time, latitude or longitude (CF-1.11, 4)."""
    along = [str(name) for name in field.dims if name in field.coords]
    for name in along:
        attributes = field[name].attrs
        stated = attributes.get("standard_name") == kind or attributes.get("axis") == kind[0].upper() == "T"
        if stated or re.fullmatch(_UNITS[kind], str(attributes.get("units", "")).lower()):
            return name
    for name in along:
        if re.fullmatch(_NAMES[kind], name.lower()):
            return name
    raise DataError(
        f"the field has no {kind}",
        where=where,
        expected=f"a coordinate whose standard_name is {kind}",
        found=", ".join(map(str, field.dims)) or "no dimension",
    )


def _weights(rows: Array, columns: Array, box: Box, where: str) -> Array:
    """Return the sea's area of each cell within the box, up to a factor, (row, column)."""
    row_edges = np.clip(cell_edges(rows, "latitude"), -90.0, 90.0)
    column_edges = cell_edges(columns, "longitude")
    height = np.maximum(cell_area(np.clip(row_edges, box.south, box.north), np.array([0.0, 1.0]))[:, 0], 0.0)
    # The box, and it again a turn of the globe to either side, for grids that begin anywhere.
    width = sum(np.diff(np.clip(column_edges, box.west + turn, box.east + turn)) for turn in (-360.0, 0.0, 360.0))
    area = np.outer(height, width)
    whole = cell_area(np.array([box.south, box.north]), np.array([0.0, 1.0]))[0, 0] * (box.east - box.west)
    if not area.sum() >= LEAST_COVERED * whole:
        raise DataError(
            "the field does not reach the box",
            where=where,
            expected=str(box),
            found=f"{rows[0]:g} to {rows[-1]:g} degrees north, {columns[0]:g} to {columns[-1]:g} degrees east",
            advice="choose another box with --box, or a file that covers it",
        )
    inside = area > 0.0
    share = np.ones_like(area)
    row, column = inside.any(axis=1), inside.any(axis=0)
    at_rows, at_columns = np.flatnonzero(row), np.flatnonzero(column)
    for number in at_columns:
        # One column at a time: the columns of a box across Greenwich do not follow one another.
        edges = np.clip(column_edges[number : number + 2], 0.0, 360.0)
        block = sea_share(row_edges[at_rows[0] : at_rows[-1] + 2], edges)[:, 0]
        share[at_rows[0] : at_rows[-1] + 1, number] = np.where(np.isfinite(block), block, 1.0)
    return np.where(share >= LEAST_LAND_MASKED, area, 0.0)


def moored_temperature_index(temperature: xr.DataArray, box: Box | str, *, base: Base | None = None) -> xr.DataArray:
    """Return the monthly surface temperature of a box from the shallowest sensors of an array's moorings.

    Parameters
    ----------
    temperature : xarray.DataArray
        °C on (mooring, time), monthly means, with ``latitude`` and ``longitude`` (mooring), degrees north and east.
    box : Box or str
        As :func:`box_of` reads it.
    base : tuple, optional
        Months whose means make each mooring's climatology; default the whole record.

    Returns
    -------
    xarray.DataArray
        ``surface_temperature_index``, °C: the mean climatology of the moorings in the box plus the mean of their
        anomalies, so that a mooring that drops out leaves no step; NaN where fewer than half of them have a value. A
        mooring too short for a climatology is left out; the attributes count both.

    Raises
    ------
    DataError
        Where no mooring of the box has a record long enough for a climatology.
    """
    box = box_of(box) if isinstance(box, str) else box
    latitude, longitude = temperature["latitude"].values, temperature["longitude"].values % 360.0
    east = (longitude >= box.west) & (longitude <= box.east) | (longitude + 360.0 <= box.east)
    inside = (latitude >= box.south) & (latitude <= box.north) & east
    recorded = temperature.transpose("mooring", "time").values
    inside &= np.isfinite(recorded).any(axis=1)
    if not inside.any():
        raise DataError(
            "no mooring with a sensor near the surface lies in the box",
            expected=str(box),
            found=f"{temperature.sizes['mooring']} moorings, {longitude.min():g} to {longitude.max():g} degrees east",
            advice="choose another box with --box, or give a file with --sst",
        )
    check_months(month_of(temperature["time"]), "the shallowest sensors")
    moored = [temperature.isel(mooring=place, drop=True).rename("temperature") for place in np.flatnonzero(inside)]
    fitted, used = _climatologies(moored, base)
    anomaly = np.stack([one.apply(series).values for one, series in zip(fitted, used, strict=True)])
    count = np.isfinite(anomaly).sum(axis=0)
    mean = np.nansum(anomaly, axis=0) / np.where(count >= LEAST_MOORINGS * len(used), count, np.nan)
    index = monthly_series(
        np.mean([one.climatology for one in fitted], axis=0)[calendar_month(temperature["time"]) - 1] + mean,
        temperature["time"].values,
        name="surface_temperature_index",
        units=DEGREES,
        where="the shallowest sensors",
    )
    counted = {"moorings": len(used), "moorings_too_short": len(moored) - len(used)}
    return index.assign_attrs(index.attrs | {"box": str(box)} | counted)


def _climatologies(moored: Sequence[xr.DataArray], base: Base | None) -> tuple[list[Anomaly], list[xr.DataArray]]:
    """Return the climatologies of the records that are long enough for one, and these records."""
    fitted, used = [], []
    failed: DataError | None = None
    for series in moored:
        try:
            fitted.append(fit_anomaly(series, base=base))
        except DataError as error:
            failed = error
        else:
            used.append(series)
    if failed is not None and not used:
        raise failed
    return fitted, used


def pressure_difference_index(
    east: xr.DataArray,
    west: xr.DataArray,
    *,
    scaling: Literal["troup", "standardised"] = "standardised",
    base: Base | None = None,
) -> xr.DataArray:
    """Return a southern-oscillation index from sea-level pressures in the east and in the west of the Pacific.

    Parameters
    ----------
    east, west : xarray.DataArray
        Monthly sea-level pressure, the same units; the published indices take Tahiti and Darwin.
    scaling : {"standardised", "troup"}
        "standardised": (e - w) / s with e and w each an anomaly over its standard deviation of the calendar month, and
        s the standard deviation of their difference. "troup": 10 times the anomaly of the pressure difference over its
        standard deviation of the calendar month. The second is about ten times the first.
    base : tuple, optional
        Months for means and standard deviations; default all in common.

    Returns
    -------
    xarray.DataArray
        ``pressure_difference_index``, eastern minus western: positive when the trade winds are strong (cold events),
        negative in warm events. The attributes state sign and scaling.

    Raises
    ------
    RequestError
        For a scaling that there is not.
    DataError
        Where the series do not overlap, or the base lies outside them.

    References
    ----------
    Troup (1965), Q. J. R. Meteorol. Soc. 91, 490-506 (from memory), and the definitions of two national services.
    """
    if scaling not in ("standardised", "troup"):
        raise RequestError("no such scaling", where="scaling", expected="standardised or troup", found=repr(scaling))
    one, other = overlap(monthly_series(east, where="east"), monthly_series(west, where="west"))
    if scaling == "troup":
        difference = one.copy(data=one.values - other.values)
        index = 10.0 * fit_anomaly(difference, base=base, standardise="month").apply(difference)
    else:
        parts = [fit_anomaly(series, base=base, standardise="month").apply(series).values for series in (one, other)]
        difference = one.copy(data=parts[0] - parts[1])
        # Each part has no seasonal cycle in the base, so this only divides by the spread of the difference there.
        index = fit_anomaly(difference, base=base, standardise="whole").apply(difference)
    formula = {
        "troup": "10 (difference - its monthly mean) / its monthly standard deviation",
        "standardised": "difference of the standardised pressures / its standard deviation",
    }[scaling]
    stated = {
        "units": "1",
        "scaling": f"{scaling}: {formula}",
        "sign": "eastern minus western pressure: negative in warm events",
    }
    return monthly_series(index.values, one["time"].values, name="pressure_difference_index", units="1").assign_attrs(
        stated
    )
