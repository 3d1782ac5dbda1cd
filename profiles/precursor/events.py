"""Warm and cold events of an index by a stated rule, and what volume and tilt did before each."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from profiles.config import EventSettings
from profiles.errors import DataError
from profiles.precursor.anomaly import running_mean
from profiles.precursor.series import middle_of, month_of
from profiles.vocabulary import describe

Array = NDArray[np.float64]

KINDS = {"warm": 1.0, "cold": -1.0}
MONTHS_BEFORE = (0, 3, 6, 9, 12)


def runs_beyond(values: Array, threshold: float, persistence: int) -> list[tuple[int, int]]:
    """Return the first and last place of each run of values at or above a threshold that is long enough.

    NaN ends a run.
    """
    beyond = np.concatenate([[False], np.nan_to_num(values, nan=-np.inf) >= threshold, [False]])
    edges = np.flatnonzero(np.diff(beyond.astype(np.int8)))
    pairs = zip(edges[::2], edges[1::2], strict=True)
    return [(int(first), int(after) - 1) for first, after in pairs if after - first >= persistence]


def find_events(index: xr.DataArray, settings: EventSettings | None = None) -> xr.Dataset:
    """Return the warm and cold events of an index.

    Parameters
    ----------
    index : xarray.DataArray
        Monthly anomalies on ``time``; NaN is missing.
    settings : EventSettings, optional
        Default: a centred mean of 3 months at least 0.5 from zero in 5 months in a row or more, the rule of the
        published oceanic index. The mean looks ahead: what it finds is history, and no outlook uses it.

    Returns
    -------
    xarray.Dataset
        On ``event``, in order of onset: ``kind`` ("warm" or "cold"), ``onset`` and ``end`` (first and last month beyond
        the threshold), ``peak`` (month of the largest smoothed anomaly) and its ``peak_value``, ``duration`` in months,
        and ``whole``, 0 where the record begins or ends within the event or a month beside it is missing: its onset,
        end and duration are then bounds. No event: size 0. The rule stands in the attributes.

    Raises
    ------
    RequestError
        Where the running mean is even or longer than the record.
    """
    settings = settings or EventSettings()
    smoothed = running_mean(index, settings.running_mean, kind="centred")
    values, months = smoothed.values, month_of(index["time"])
    beside = np.concatenate([[np.nan], values, [np.nan]])
    found = [
        (first, last, kind)
        for kind, sign in KINDS.items()
        for first, last in runs_beyond(sign * values, settings.threshold, settings.persistence)
    ]
    rows = [
        {
            "kind": kind,
            "onset": months[first],
            "end": months[last],
            "peak": months[first + int(np.argmax(KINDS[kind] * values[first : last + 1]))],
            "peak_value": KINDS[kind] * float(np.max(KINDS[kind] * values[first : last + 1])),
            "duration": last - first + 1,
            "whole": int(np.isfinite(beside[first]) and np.isfinite(beside[last + 2])),
        }
        for first, last, kind in sorted(found)
    ]
    return _labelled(rows, index, settings)


def _labelled(rows: Sequence[Mapping[str, Any]], index: xr.DataArray, settings: EventSettings) -> xr.Dataset:
    def column(name: str, dtype: str) -> NDArray[Any]:
        return np.array([row[name] for row in rows], dtype=dtype)

    events = xr.Dataset(
        {
            "kind": ("event", column("kind", "U4")),
            **{name: ("event", middle_of(column(name, "datetime64[M]"))) for name in ("onset", "end", "peak")},
            "peak_value": ("event", column("peak_value", "float64")),
            "duration": ("event", column("duration", "int32")),
            "whole": ("event", column("whole", "int8")),
        }
    )
    units = {"units": index.attrs.get("units", "1")}
    rule = (
        f"mean of {settings.running_mean} months {settings.threshold:g} {units['units']} or more from zero "
        f"in {settings.persistence} months or more in a row"
    )
    return describe(events.assign_attrs(rule=rule, index=str(index.name)), peak_value=units)


def before_events(
    events: xr.Dataset, predictors: Mapping[str, xr.DataArray], months_before: Sequence[int] = MONTHS_BEFORE
) -> xr.Dataset:
    """Return the predictors' anomalies before the onset of each event.

    Parameters
    ----------
    events : xarray.Dataset
        Of :func:`find_events`.
    predictors : mapping of str to xarray.DataArray
        Monthly anomalies by name, each in units of its own.
    months_before : sequence of int
        Months before the onset.

    Returns
    -------
    xarray.Dataset
        ``before_onset`` on (predictor, event, months_before), each in the units of its predictor (attribute
        ``predictor_units``); NaN outside the record, and before an event whose onset the record does not hold.
    """
    onset = month_of(events["onset"])
    known = _onset_known(events)
    values = np.stack(
        [
            np.stack([np.where(known, _at(series, onset - before), np.nan) for before in months_before], axis=-1)
            for series in predictors.values()
        ]
    )
    result = xr.Dataset(
        {"before_onset": (("predictor", "event", "months_before"), values)},
        coords={"predictor": list(predictors), "months_before": list(months_before)},
    )
    return describe(result, before_onset=_predictor_units(predictors))


def _onset_known(events: xr.Dataset) -> NDArray[np.bool_]:
    return np.asarray(events["whole"].values == 1)


def event_composites(
    events: xr.Dataset, predictors: Mapping[str, xr.DataArray], leads: Sequence[int] = tuple(range(-24, 25))
) -> xr.Dataset:
    """Return the mean course of the predictors about the peaks of warm and of cold events.

    Parameters
    ----------
    events, predictors
        As for :func:`before_events`.
    leads : sequence of int
        Months; at a positive lead the predictor comes before the peak.

    Returns
    -------
    xarray.Dataset
        On (predictor, composite_kind, lead): ``composite``, the mean over events, ``composite_error``, its standard
        error from the spread between events (NaN for fewer than three), and ``composite_count``. Few events make a
        rough error: with n of them an interval wants Student's t of n - 1 degrees of freedom.

    Raises
    ------
    DataError
        Where there is no predictor.
    """
    if not predictors:
        raise DataError("there is no predictor to average", expected="one or more")
    peaks, kinds = month_of(events["peak"]), events["kind"].values
    shape = (len(predictors), len(KINDS), len(leads))
    mean, error, count = (np.full(shape, np.nan) for _ in range(3))
    for row, series in enumerate(predictors.values()):
        for column, kind in enumerate(KINDS):
            chosen = peaks[kinds == kind]
            values = np.stack([_at(series, chosen - lead) for lead in leads], axis=-1)
            present = np.isfinite(values)
            number = present.sum(axis=0)
            total = np.where(present, values, 0.0).sum(axis=0)
            average = total / np.where(number > 0, number, np.nan)
            squares = (np.where(present, values - average, 0.0) ** 2).sum(axis=0)
            mean[row, column], count[row, column] = average, number
            error[row, column] = np.sqrt(squares / np.where(number > 2, number * (number - 1.0), np.nan))
    dims = ("predictor", "composite_kind", "lead")
    result = xr.Dataset(
        {
            "composite": (dims, mean),
            "composite_error": (dims, error),
            "composite_count": (dims, count.astype(np.int32)),
        },
        coords={"predictor": list(predictors), "composite_kind": list(KINDS), "lead": list(leads)},
    )
    units = _predictor_units(predictors)
    return describe(result, composite=units, composite_error=units)


def _predictor_units(predictors: Mapping[str, xr.DataArray]) -> dict[str, str]:
    listed = (f"{name}: {series.attrs.get('units', '1')}" for name, series in predictors.items())
    return {"units": "1", "predictor_units": "; ".join(listed)}


def _at(series: xr.DataArray, months: NDArray[np.datetime64]) -> Array:
    """Return the values of a monthly series in given months, NaN outside it."""
    place = (months - month_of(series["time"])[0]).astype(np.int64)
    inside = (place >= 0) & (place < series.size)
    return np.where(inside, series.values[np.clip(place, 0, series.size - 1)], np.nan)
