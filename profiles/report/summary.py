"""The numbers that a reader wants first, from the datasets and tables of a run."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
import pandas as pd
import xarray as xr

from profiles.report.style import HALF_WIDTH_95, longitude_label

VOLUME_UNIT = 1e14  # m3

# Mean square of the standardised leave-one-out departures within which the stated errors are called fitting (ours).
_FITTING = (0.67, 1.5)


@dataclass(frozen=True)
class Finding:
    """One number of the summary: what it is, its value as text, and what to know of it."""

    label: str
    value: str
    note: str


def mooring_return(data_return: pd.DataFrame) -> pd.Series[float]:
    """Return the share of expected values that could be used, by mooring, of a table with one row per sensor."""
    sums = mooring_counts(data_return)
    return sums["used"] / sums["expected"]


def mooring_counts(data_return: pd.DataFrame) -> pd.DataFrame:
    """Return the counts of a table with one row per sensor, summed by mooring, with ``used`` and ``sensors``."""
    table = data_return.assign(used=data_return["good"] + data_return["not_evaluated"], sensors=1)
    counts = ["sensors", "expected", "used", "good", "not_evaluated", "questionable", "bad", "missing"]
    return table.groupby("mooring", sort=False)[counts].sum()


def tilt_window(section: xr.Dataset) -> tuple[float, float]:
    """Return the ends of the line whose slope is the tilt, degrees east, as the section states them."""
    west, _, east, *_ = str(section["thermocline_slope"].attrs["window"]).split()
    return float(west), float(east)


def window_label(window: tuple[float, float]) -> str:
    """Return the ends of a window as people write them: 165°E to 95°W."""
    return " to ".join(longitude_label(end) for end in window)


def findings(
    section: xr.Dataset, volume: xr.Dataset, leave_one_out: float, tables: Mapping[str, pd.DataFrame]
) -> list[Finding]:
    """Return the summary of a run.

    Parameters
    ----------
    section, volume : xarray.Dataset
        As :func:`profiles.section.build_section` returns them.
    leave_one_out : float
        Mean square of the standardised leave-one-out departures; NaN where there is none.
    tables : mapping of str to pandas.DataFrame
        Of which ``deliveries`` and ``data_return`` are used.
    """
    total = volume.sel(region="total")
    return [
        _moorings(section, tables["data_return"]),
        _rows(tables["deliveries"]),
        _data_return(tables["data_return"]),
        _latest(
            total,
            "warm_water_volume",
            label="Volume of warm water",
            unit="× 10¹⁴ m³",
            scale=VOLUME_UNIT,
            decimals=2,
            note="5°S-5°N, 120°E-80°W",
        ),
        _latest(
            section,
            "thermocline_slope",
            label="Tilt of the thermocline",
            unit="m per 1000 km",
            scale=1.0,
            decimals=1,
            note=window_label(tilt_window(section)),
        ),
        Finding("Leave-one-out check", number(leave_one_out, 2), fit_of_errors(leave_one_out)),
    ]


def number(value: float, decimals: int) -> str:
    """Return a number as text with a true minus sign; a dash for NaN."""
    return "–" if np.isnan(value) else f"{value:.{decimals}f}".replace("-", "−")


def count(value: float) -> str:
    """Return a count as text, thousands set apart by narrow spaces that do not break."""
    return f"{int(value):,}".replace(",", "\u202f")


def percent(share: float) -> str:
    """Return a share as a percentage; a dash for NaN."""
    return "–" if np.isnan(share) else f"{100.0 * share:.1f} %"


def fit_of_errors(leave_one_out: float) -> str:
    """Say in a sentence what the leave-one-out check says of the stated errors."""
    if np.isnan(leave_one_out):
        return "Each mooring against what the others say of it; not possible with fewer than two moorings."
    meaning = (
        "the stated errors are wider than the moorings call for"
        if leave_one_out < _FITTING[0]
        else "the stated errors are too small: read the 95 % intervals with care"
        if leave_one_out > _FITTING[1]
        else "the stated errors fit"
    )
    measure = "Each mooring against what the others say of it, mean square in units of the stated variance; 1 is right"
    return f"{measure}: {meaning}."


def _moorings(section: xr.Dataset, data_return: pd.DataFrame) -> Finding:
    mapped = int(np.isfinite(section["site_noise"].values).any(axis=0).sum())
    known = len(set(section["site"].values.astype(str)) | set(data_return["mooring"].astype(str)))
    return Finding("Moorings used", f"{mapped} of {known}", "in the map of the isotherm, in one month or more")


def _rows(deliveries: pd.DataFrame) -> Finding:
    read, kept, quarantined = (deliveries[f"rows_{name}"].sum() for name in ("read", "kept", "quarantined"))
    return Finding("Rows read", count(read), f"{count(kept)} kept, {count(quarantined)} in quarantine")


def _data_return(data_return: pd.DataFrame) -> Finding:
    sums = mooring_counts(data_return).sum()
    share = sums["used"] / sums["expected"] if sums["expected"] else np.nan
    note = f"of the expected values could be used; {count(sums['questionable'])} questionable, {count(sums['bad'])} bad"
    return Finding("Data return", percent(share), note)


def _latest(
    dataset: xr.Dataset, name: str, *, label: str, unit: str, scale: float, decimals: int, note: str
) -> Finding:
    """Return the last month's value and anomaly with their 95 % half-widths."""
    given = np.flatnonzero(np.isfinite(dataset[name].values))
    if not given.size:
        return Finding(label, "–", f"no month has a value; {note}")
    last = dataset.isel(time=given[-1])
    month = pd.Timestamp(last["time"].item()).strftime("%B %Y")
    value, anomaly = (
        f"{number(float(last[quantity]) / scale, decimals)} ± "
        f"{number(HALF_WIDTH_95 * float(last[f'{quantity}_error']) / scale, decimals)}"
        for quantity in (name, f"{name}_anomaly")
    )
    return Finding(label, f"{value} {unit}", f"{month}, 95 % interval; anomaly {anomaly}; {note}")
