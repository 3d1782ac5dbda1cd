"""Monthly series from files: CSV, rows of a year and twelve months, NetCDF."""

from __future__ import annotations

import re
from pathlib import Path

import numpy as np
import pandas as pd
import xarray as xr

from profiles.errors import DataError, RequestError
from profiles.precursor.index import Box, surface_temperature_index, to_celsius
from profiles.precursor.series import monthly_series

_NUMBER = re.compile(r"[-+]?(\d+\.?\d*|\.\d+)([eEdD][-+]?\d+)?")
_YEARS = range(1700, 2301)


def read_series(
    path: Path | str,
    *,
    name: str,
    column: str | None = None,
    missing: float | None = None,
    box: Box | str | None = None,
) -> xr.DataArray:
    """Read a monthly series from a file, by its content.

    Parameters
    ----------
    path : Path or str
        NetCDF (``.nc``): a series, or for an index of surface temperature a map, averaged over ``box``. Text with a
        year and twelve values a row. Else CSV with a head.
    name : str
        Of the quantity, as in the vocabulary.
    column : str, optional
        Variable or column; needed where the file has more than one that it could be.
    missing : float, optional
        What stands for "missing" in a text file, besides an empty field and NaN.
    box : Box or str, optional
        For a map.

    Returns
    -------
    xarray.DataArray
        See :func:`profiles.precursor.monthly_series`.

    Raises
    ------
    RequestError
        Where there is no such file, or it has no such column.
    DataError
        Where it cannot be understood, or its months are not whole.
    """
    path = Path(path)
    if not path.is_file():
        raise RequestError("no such file", where=str(path), expected="NetCDF, CSV or text", advice="check the path")
    if path.suffix.lower() in (".nc", ".nc4", ".cdf"):
        return _read_netcdf(path, name, column, box)
    try:
        text = path.read_text(encoding="utf-8-sig")
    except UnicodeDecodeError as error:
        raise DataError("neither text nor .nc", where=str(path), found=f"byte {error.start} is not UTF-8") from None
    lines = text.splitlines()
    if any(_year_row(line.split()) for line in lines):
        return parse_year_rows(lines, name=name, where=str(path), missing=missing)
    return _read_csv(path, name, column, missing)


def _numbers(fields: list[str]) -> list[float] | None:
    if not fields or not all(_NUMBER.fullmatch(field) or field.lower() == "nan" for field in fields):
        return None
    return [float(field.lower().replace("d", "e")) for field in fields]


def _year_row(fields: list[str]) -> bool:
    return len(fields) == 13 and fields[0].isdigit() and int(fields[0]) in _YEARS and _numbers(fields) is not None


def parse_year_rows(lines: list[str], *, name: str, where: str, missing: float | None = None) -> xr.DataArray:
    """Return the series of rows of a year and its twelve monthly values.

    Parameters
    ----------
    lines : list of str
        Text before the first row and after the last is passed over; one that is a single number says what stands for
        "missing", the custom of such files.
    name, where : str
    missing : float, optional
        What stands for "missing" where the file does not say it.

    Raises
    ------
    DataError
        With the line, where a row between has other than thirteen numbers, or the years do not follow one another.
    """
    rows = [number for number, line in enumerate(lines) if _year_row(line.split())]
    years: list[int] = []
    values: list[list[float]] = []
    for number in range(rows[0], rows[-1] + 1):
        fields = lines[number].split()
        if not _year_row(fields):
            raise DataError(
                "this line is no year with twelve months",
                where=f"{where}, line {number + 1}",
                expected="a year and twelve numbers",
                found=repr(lines[number][:60]),
                advice="write what stands for 'missing' where a month has no value",
            )
        if years and int(fields[0]) != years[-1] + 1:
            raise DataError(
                "the years do not follow one another",
                where=f"{where}, line {number + 1}",
                expected=str(years[-1] + 1),
                found=fields[0],
            )
        years.append(int(fields[0]))
        values.append(_numbers(fields[1:]) or [])
    if missing is None:
        missing = _stated_missing(lines, rows)
    data = np.array(values, dtype=np.float64).ravel()
    months = np.arange(f"{years[0]}-01", f"{years[-1] + 1}-01", dtype="datetime64[M]").astype("datetime64[ns]")
    return monthly_series(_without(data, missing), months, name=name, where=where)


def _stated_missing(lines: list[str], rows: list[int]) -> float | None:
    outside = [*lines[: rows[0]], *lines[rows[-1] + 1 :]]
    single = [numbers[0] for numbers in (_numbers(line.split()) for line in outside) if numbers and len(numbers) == 1]
    return single[-1] if single else None


def _without(values: np.ndarray, missing: float | None) -> np.ndarray:
    return values if missing is None else np.where(np.isclose(values, missing, rtol=1e-6), np.nan, values)


def _read_csv(path: Path, name: str, column: str | None, missing: float | None) -> xr.DataArray:
    """Read a table with a head, a column of dates (or of year and month) and one of values."""
    try:
        table = pd.read_csv(path, sep=None, engine="python", comment="#", skipinitialspace=True, encoding="utf-8-sig")
    except (ValueError, pd.errors.ParserError) as error:
        raise DataError("not a table that can be read", where=str(path), found=str(error).splitlines()[0]) from None
    table.columns = [str(label).strip() for label in table.columns]
    times, used = _dates(table, path)
    numeric = [label for label in table.select_dtypes("number").columns if label not in used]
    chosen = _choose(column, list(numeric), list(table.columns), path, "column")
    values = pd.to_numeric(table[chosen], errors="coerce").to_numpy(dtype=np.float64)
    unread = np.flatnonzero(~np.isfinite(values) & table[chosen].notna().to_numpy())
    if unread.size:
        raise DataError(
            "a value is no number",
            where=f"{path}, row {int(unread[0]) + 1} below the head, column {chosen!r}",
            found=repr(table[chosen].iloc[int(unread[0])]),
        )
    return monthly_series(_without(values, missing), times, name=name, where=f"{path}, column {chosen!r}")


def _dates(table: pd.DataFrame, path: Path) -> tuple[np.ndarray, list[str]]:
    labels = {str(label).lower(): str(label) for label in table.columns}
    if {"year", "month"} <= set(labels):
        used = [labels["year"], labels["month"]]
        text = table[used[0]].astype(str) + "-" + table[used[1]].astype(str).str.zfill(2)
    else:
        found = next((labels[key] for key in ("time", "date", "month", "datetime") if key in labels), None)
        if found is None:
            raise DataError(
                "the table has no dates",
                where=str(path),
                expected="a column 'time', 'date' or 'month', or two, 'year' and 'month'",
                found=", ".join(table.columns),
            )
        used, text = [found], table[found].astype(str).str.strip()
    shape = re.compile(r"\d{4}-\d{2}(-\d{2}([T ].*)?)?")
    wrong = [row for row, value in enumerate(text) if not shape.fullmatch(value) or not "01" <= value[5:7] <= "12"]
    if wrong:
        raise DataError(
            "a date is not understood",
            where=f"{path}, row {wrong[0] + 1} below the head",
            expected="2031-01, or 2031-01-16 with or without a time (ISO 8601)",
            found=repr(text.iloc[wrong[0]]),
        )
    return np.array([value[:7] for value in text], dtype="datetime64[M]").astype("datetime64[ns]"), used


def _choose(wanted: str | None, candidates: list[str], known: list[str], path: Path, kind: str) -> str:
    if wanted is not None:
        if wanted not in known:
            raise RequestError(
                f"no such {kind}", where=str(path), expected=", ".join(known) or "none", found=repr(wanted)
            )
        return wanted
    if len(candidates) != 1:
        raise RequestError(
            f"which {kind} is meant?" if candidates else f"there is no {kind} to read",
            where=str(path),
            expected=f"one {kind} of numbers by month",
            found=", ".join(candidates) or ", ".join(known) or "none",
            advice=f"name the {kind}",
        )
    return candidates[0]


def _read_netcdf(path: Path, name: str, column: str | None, box: Box | str | None) -> xr.DataArray:
    try:
        dataset = xr.open_dataset(path, engine="netcdf4", decode_timedelta=False)
    except (OSError, ValueError) as error:
        raise DataError("not a NetCDF file that can be read", where=str(path), found=str(error)) from None
    with dataset:
        candidates = _candidates(dataset, name)
        chosen = _choose(column, candidates, [str(label) for label in dataset.data_vars], path, "variable")
        data = dataset[chosen].load()
    where = f"{path}, {chosen}"
    if data.ndim > 1:
        if box is None or name != "surface_temperature_index":
            found = ", ".join(map(str, data.dims))
            raise DataError("this is no series", where=where, expected="one dimension, time", found=found)
        return surface_temperature_index(data, box, where=where)
    if name == "surface_temperature_index":
        celsius, units = to_celsius(data.values.astype(np.float64), data.attrs.get("units"), where)
        series = monthly_series(celsius, data["time"].values, name=name, where=where)
        return series.assign_attrs(series.attrs | {"units_read": units})
    return monthly_series(data.rename(name), where=where)


def _candidates(dataset: xr.Dataset, name: str) -> list[str]:
    """Return the variables that could be meant: of that name; or of surface temperature; or all along time alone."""
    along = {str(label): data for label, data in dataset.data_vars.items() if "time" in data.dims}
    if name in along:
        return [name]
    if name == "surface_temperature_index":
        standard = ("sea_surface_temperature", "surface_temperature", "sea_surface_skin_temperature")
        return [
            label
            for label, data in along.items()
            if data.attrs.get("standard_name") in standard or label.lower() in ("sst", "tos")
        ]
    return [label for label, data in along.items() if data.ndim == 1 and data.dtype.kind == "f"]
