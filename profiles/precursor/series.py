"""A monthly series: one value a calendar month, no month left out, stamped at the month's middle; checked."""

from __future__ import annotations

from typing import Any

import numpy as np
import pandas as pd
import xarray as xr
from numpy.typing import ArrayLike, NDArray

from profiles.errors import DataError
from profiles.vocabulary import VARIABLES

Array = NDArray[np.float64]
Months = NDArray[np.datetime64]

#: Values that files use for "missing" (common practice, no source); as data only where the rest of the series is near.
FILL_VALUES = tuple(
    sign * value
    for value in (9.9, 9.99, 9.999, 99.0, 99.9, 99.99, 99.999, 999.0, 999.9, 999.99, 9999.0, 99999.0, 1e20, 1e34, 1e35)
    for sign in (-1.0, 1.0)
)
_FAR = 8.0  # robust standard deviations from the median beyond which a value of that list is no measurement (ours)

#: A temperature, or an anomaly of one, cannot lie beyond this in °C (the sea's is below 40); kelvin always does.
LARGEST_TEMPERATURE = 60.0

#: What a sea-surface temperature in kelvin looks like where no units are stated: its median, its standard deviation.
SEA_IN_KELVIN = (271.0, 310.0)
LARGEST_SPREAD = 10.0


def month_of(time: ArrayLike | xr.DataArray) -> Months:
    """Return the calendar month of each time as ``datetime64[M]``."""
    return np.asarray(time).astype("datetime64[ns]").astype("datetime64[M]")


def middle_of(months: ArrayLike) -> Months:
    """Return the middle of each month, ``datetime64[ns]``: the stamp of the project's monthly means."""
    start = np.asarray(months).astype("datetime64[M]")
    first, after = start.astype("datetime64[ns]"), (start + 1).astype("datetime64[ns]")
    middle: Months = first + (after - first) // 2
    return middle


def calendar_month(time: ArrayLike | xr.DataArray) -> NDArray[np.int64]:
    """Return the number of the calendar month of each time, 1 to 12."""
    return month_of(time).astype(np.int64) % 12 + 1


def monthly_series(
    values: xr.DataArray | ArrayLike,
    time: ArrayLike | None = None,
    *,
    name: str | None = None,
    units: str | None = None,
    where: str | None = None,
) -> xr.DataArray:
    """Return a checked monthly series.

    Parameters
    ----------
    values : xarray.DataArray or array_like
        One value a month, on a dimension ``time`` where it is labelled. NaN is missing; missing months at both ends are
        cut off, those between stay NaN.
    time : array_like of datetime64, optional
        Needed where ``values`` carries none. Any day of the month stands for the month.
    name : str, optional
        Of the quantity; default that of ``values``. Attributes come from the vocabulary where it knows the name.
    units : str, optional
        Default: those of ``values``, else those of the vocabulary.
    where : str, optional
        File or argument, for messages; default the name.

    Returns
    -------
    xarray.DataArray
        float64 on ``time`` (datetime64[ns]), stamped at the middle of each month.

    Raises
    ------
    DataError
        Where there is no time; where months repeat, go back or are left out; where nothing, or only one value, is left;
        where a temperature is in kelvin, or what files use for "missing" stands among the values.
    """
    labelled = values if isinstance(values, xr.DataArray) else None
    name = name or (str(labelled.name) if labelled is not None and labelled.name is not None else "series")
    where = where or name
    numbers, months = _numbers_and_months(values, time, where)
    check_months(months, where)
    attributes = _attributes(name, labelled, units)
    check_values(numbers, months, where, units=attributes.get("units"))
    present = np.flatnonzero(np.isfinite(numbers))
    kept = slice(present[0], present[-1] + 1)
    return xr.DataArray(
        numbers[kept], dims="time", coords={"time": middle_of(months[kept])}, name=name, attrs=attributes
    )


def _numbers_and_months(values: xr.DataArray | ArrayLike, time: ArrayLike | None, where: str) -> tuple[Array, Months]:
    numbers = np.asarray(values, dtype=np.float64)
    if time is None and isinstance(values, xr.DataArray) and "time" in values.coords:
        time = values["time"].values
    if time is None:
        raise DataError("the series has no time", where=where, expected="a coordinate 'time', or the argument")
    times = np.asarray(time)
    if not np.issubdtype(times.dtype, np.datetime64):
        raise DataError("the times are no dates", where=where, expected="datetime64", found=str(times.dtype))
    if numbers.ndim != 1 or numbers.shape != times.shape:
        raise DataError(
            "this is no series",
            where=where,
            expected="one value for each time",
            found=f"values of shape {numbers.shape} at {times.size} times",
        )
    if np.isnat(times).any():
        raise DataError("a time is missing", where=where, found=f"none at value {int(np.isnat(times).argmax()) + 1}")
    return numbers, month_of(times)


def check_months(months: Months, where: str) -> None:
    """Raise DataError unless each month follows the one before."""
    steps = np.diff(months).astype(np.int64)
    wrong = np.flatnonzero(steps != 1)
    if not wrong.size:
        return
    at = int(wrong[0])
    found = f"{months[at + 1]} after {months[at]}"
    more = f", and {wrong.size - 1} more such steps" if wrong.size > 1 else ""
    expected = f"{months[at] + 1} after {months[at]}"
    if np.median(steps) != 1:
        raise DataError(
            "the steps of the series are not monthly",
            where=where,
            expected="one value for each month",
            found=f"{found}; most steps are of {np.median(steps):g} months",
            advice="average it to months first",
        )
    if steps[at] < 1:
        what, advice = "a month stands twice or out of order", "sort the months and keep one value of each"
    else:
        what, advice = "months are left out", "give every month a row, with NaN where there is no value"
    raise DataError(what, where=where, expected=expected, found=found + more, advice=advice)


def check_values(numbers: Array, months: Months, where: str, *, units: str | None) -> None:
    """Raise DataError where there are too few values, or some that cannot be measurements."""
    present = np.isfinite(numbers)
    if np.isinf(numbers).any():
        raise DataError("a value is infinite", where=where, found=str(months[np.isinf(numbers).argmax()]))
    if present.sum() < 2:
        raise DataError(
            "the series holds too few values", where=where, expected="two or more", found=str(int(present.sum()))
        )
    suspicious = _left_fill_values(numbers)
    if suspicious.size:
        at = int(suspicious[0])
        raise DataError(
            "a value that stands for 'missing' was left among the data",
            where=where,
            expected="NaN or an empty field where there is no value",
            found=f"{numbers[at]:g} in {months[at]}" + (f" and {suspicious.size - 1} more" * (suspicious.size > 1)),
            advice="declare it as the file's fill value, or replace it by NaN",
        )
    _check_temperature(numbers[present], where, units)


def _left_fill_values(numbers: Array) -> NDArray[np.intp]:
    """Return where a usual fill value stands that lies far from all the others."""
    listed = np.isclose(numbers[:, None], FILL_VALUES, rtol=1e-6, atol=0.0).any(axis=1)
    others = numbers[np.isfinite(numbers) & ~listed]
    if not listed.any() or others.size < 2:
        return np.flatnonzero(listed & (np.abs(numbers) > LARGEST_TEMPERATURE) & (others.size > 0))
    middle = np.median(others)
    spread = 1.4826 * np.median(np.abs(others - middle)) or float(np.std(others))
    return np.flatnonzero(listed & (np.abs(numbers - middle) > _FAR * spread))


def _check_temperature(present: Array, where: str, units: str | None) -> None:
    middle, spread = float(np.median(present)), float(np.std(present))
    stated = units is not None and units.startswith(("degree_C", "degC", "K"))
    kelvin = SEA_IN_KELVIN[0] < middle < SEA_IN_KELVIN[1] and spread < LARGEST_SPREAD
    if (stated and abs(middle) > LARGEST_TEMPERATURE) or (units is None and kelvin):
        raise DataError(
            "the temperatures are not in °C",
            where=where,
            expected=f"degrees Celsius, at most {LARGEST_TEMPERATURE:g}",
            found=f"a median of {middle:.1f}" + (", which looks like kelvin" if kelvin else ""),
            advice="subtract 273.15, or state the units: 'K' in a CF file, or what else it is",
        )


def _attributes(name: str, labelled: xr.DataArray | None, units: str | None) -> dict[str, Any]:
    known = VARIABLES[name].attributes() if name in VARIABLES else {}
    known.pop("ancillary_variables", None)
    own = dict(labelled.attrs) if labelled is not None else {}
    return known | own | ({"units": units} if units is not None else {})


def check_varies(series: xr.DataArray, where: str) -> None:
    """Raise DataError where a series is constant: it correlates with nothing and predicts nothing."""
    values = series.values[np.isfinite(series.values)]
    scale = float(np.abs(values).max()) if values.size else 0.0
    if values.size and float(np.ptp(values)) > 1e-9 * scale:
        return
    raise DataError(
        "the series is constant",
        where=where,
        expected="values that vary",
        found=f"{values[0]:g} in all of {values.size} months" if values.size else "no value",
        advice="check that the right variable, box and level were read",
    )


def overlap(*series: xr.DataArray) -> tuple[xr.DataArray, ...]:
    """Return the series over the months that all of them span.

    Raises
    ------
    DataError
        Where there is no such month.
    """
    spans = [month_of(one["time"])[[0, -1]] for one in series]
    first, last = max(span[0] for span in spans), min(span[1] for span in spans)
    if first > last:
        listed = ", ".join(f"{one.name} {span[0]} to {span[1]}" for one, span in zip(series, spans, strict=True))
        raise DataError(
            "the series do not overlap",
            expected="months that all of them hold",
            found=listed,
            advice="check the calendar and the epoch of the files, or choose other files",
        )
    return tuple(one.isel(time=(month_of(one["time"]) >= first) & (month_of(one["time"]) <= last)) for one in series)


def as_table(**series: xr.DataArray) -> pd.DataFrame:
    """Return series side by side, a row a month, NaN where one has no value; the index is the month's middle."""
    columns = {name: pd.Series(one.values, index=pd.DatetimeIndex(one["time"].values)) for name, one in series.items()}
    return pd.DataFrame(columns).sort_index()
