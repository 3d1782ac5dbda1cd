"""What the flags say of each sensor: its data return, its faults, its gaps."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator
from typing import Any

import numpy as np
import pandas as pd
import xarray as xr
from numpy.typing import NDArray

from profiles.config import QualityControlSettings
from profiles.errors import DataError
from profiles.qc.check import Mask, Times
from profiles.qc.gap import silence
from profiles.qc.quality_control import check_chain, nominal_interval
from profiles.vocabulary import TEST_BITS, Flag

#: What a fault is called after the test that found it, the more telling test first.
KINDS = {
    "water": "in air",
    "flat_line": "stuck",
    "repeated": "repeated",
    "gross_range": "out of range",
    "spike": "spike",
    "rate_of_change": "jump",
    "climatology": "unlike the season",
    "inversion": "inversion",
    "delivered_flag": "flagged by the sender",
    "gap": "first after a gap",
}
NO_TEST = "flagged otherwise"  # a flag that no test gave, such as a person's

RETURN_COLUMNS = ["mooring", "depth", "samples", "expected", *(flag.name.lower() for flag in Flag), "return_share"]
FAULT_COLUMNS = ["mooring", "depth", "kind", "flag", "tests", "start", "end", "count"]
GAP_COLUMNS = ["mooring", "depths", "sensors", "start", "end", "duration"]

#: Columns of each table, for arrays that have no chain.
SUMMARY_COLUMNS = {"data_return": RETURN_COLUMNS, "faults": FAULT_COLUMNS, "gaps": GAP_COLUMNS}


def data_return(chain: xr.Dataset) -> pd.DataFrame:
    """Return how much of what each sensor should have given can be used.

    Parameters
    ----------
    chain : xarray.Dataset
        A flagged chain.

    Returns
    -------
    pandas.DataFrame
        One row per sensor: ``mooring``, ``depth`` (m), ``samples`` in the record, ``expected`` samples (the
        length of the record in nominal intervals, at least ``samples``), how many of the samples carry each
        flag (``good``, ``not_evaluated``, ``questionable``, ``bad``, ``missing``; they add up to ``samples``)
        and ``return_share``, good and not evaluated over expected.

    Raises
    ------
    DataError
        Where the chain carries no flags.
    """
    _check_flagged(chain)
    flags = chain["temperature_qc"].values
    counts = {flag.name.lower(): (flags == flag).sum(axis=0) for flag in Flag}
    expected = max(_expected_samples(chain["time"].values), len(flags))
    columns = {
        "mooring": _mooring(chain),
        "depth": chain["depth"].values,
        "samples": len(flags),
        "expected": expected,
    }
    usable = counts["good"] + counts["not_evaluated"]
    return pd.DataFrame(columns | counts | {"return_share": usable / expected})


def fault_list(chain: xr.Dataset) -> pd.DataFrame:
    """List the faults: runs of questionable or bad values of one sensor.

    Parameters
    ----------
    chain : xarray.Dataset
        A flagged chain.

    Returns
    -------
    pandas.DataFrame
        One row per run, in order of depth and time; a single unflagged sample does not end a run.
        ``mooring``, ``depth`` (m), ``kind`` in plain words, ``flag`` (the worst), ``tests`` concerned (text),
        ``start`` and ``end`` (first and last flagged value), ``count`` of flagged values. The kind is that of
        the test that gave the worst flag to most values; of several, the most telling.

    Raises
    ------
    DataError
        Where the chain carries no flags.
    """
    _check_flagged(chain)
    flags = chain["temperature_qc"].values
    masks = {
        Flag.QUESTIONABLE: chain["temperature_qc_questionable"].values,
        Flag.BAD: chain["temperature_qc_bad"].values,
    }
    flagged = (flags == Flag.QUESTIONABLE) | (flags == Flag.BAD)
    mooring, depths, time = _mooring(chain), chain["depth"].values, chain["time"].values
    rows = []
    for sensor, depth in enumerate(depths):
        for run in _runs(flagged[:, sensor]):
            worst = Flag(int(flags[run, sensor][flagged[run, sensor]].max()))
            found = {flag: _tally(mask[run, sensor]) for flag, mask in masks.items()}
            tests = ", ".join(name for name in TEST_BITS if any(tally[name] for tally in found.values()))
            count = int(flagged[run, sensor].sum())
            ends = time[run.start], time[run.stop - 1]
            rows.append((mooring, depth, _kind(found[worst]), int(worst), tests, *ends, count))
    return _table(rows, FAULT_COLUMNS)


def gap_list(chain: xr.Dataset, settings: QualityControlSettings | None = None) -> pd.DataFrame:
    """List the gaps: spans without a value longer than the gap test allows, the ends of the record included.

    Parameters
    ----------
    chain : xarray.Dataset
        A chain, with or without flags.
    settings : QualityControlSettings, optional
        Of which the gap's are used; the defaults where None.

    Returns
    -------
    pandas.DataFrame
        One row per span, sensors that fall silent and come back together in one row, in order of time:
        ``mooring``, ``depths`` (m, text), ``sensors`` (how many), ``start`` (last value before, or start of
        the record), ``end`` (first value after, or end of the record), ``duration`` (days).

    Raises
    ------
    DataError
        Where the chain is none.
    """
    check_chain(chain)
    longest = (settings or QualityControlSettings()).gap.longest_interval
    time, present = chain["time"].values, ~np.isnan(chain["temperature"].values)
    longest_silence = longest * nominal_interval(time)
    together: defaultdict[tuple[np.datetime64, np.datetime64], list[float]] = defaultdict(list)
    for sensor, depth in enumerate(chain["depth"].values):
        for span in _silent_spans(time, present[:, sensor], longest_silence):
            together[span].append(depth)
    rows = [_gap_row(_mooring(chain), *span, depths) for span, depths in sorted(together.items())]
    return _table(rows, GAP_COLUMNS)


def _gap_row(mooring: str, start: np.datetime64, end: np.datetime64, depths: list[float]) -> tuple[Any, ...]:
    listed = ", ".join(f"{depth:g}" for depth in depths)
    return mooring, listed, len(depths), start, end, (end - start) / np.timedelta64(1, "D")


def _check_flagged(chain: xr.Dataset) -> None:
    check_chain(chain)
    wanted = ["temperature_qc", "temperature_qc_questionable", "temperature_qc_bad"]
    absent = [name for name in wanted if name not in chain]
    if absent:
        raise DataError(
            "the chain carries no flags",
            where="chain",
            expected=", ".join(wanted),
            found=f"no {', '.join(absent)}",
            advice="run quality_control first",
        )


def _mooring(chain: xr.Dataset) -> str:
    return str(chain["mooring"].item()) if "mooring" in chain.coords else ""


def _table(rows: list[tuple[Any, ...]], columns: list[str]) -> pd.DataFrame:
    table = pd.DataFrame(rows, columns=columns)
    return table.astype({"start": "datetime64[ns]", "end": "datetime64[ns]"})


def _expected_samples(time: Times) -> int:
    if time.size < 2:
        return int(time.size)
    length = (time[-1] - time[0]) / np.timedelta64(1, "s")
    return round(float(length) / nominal_interval(time)) + 1


def _runs(flagged: Mask) -> Iterator[slice]:
    """Cut out the runs of True, single False inside them included."""
    bridged = flagged.copy()
    bridged[1:-1] |= flagged[:-2] & flagged[2:]
    edges = np.flatnonzero(np.diff(bridged, prepend=False, append=False))
    for start, stop in zip(edges[::2], edges[1::2], strict=True):
        yield slice(int(start), int(stop))


def _tally(mask: NDArray[np.uint32]) -> dict[str, int]:
    """Count for each test, the most telling first, the values that carry its bit."""
    return {name: int(np.count_nonzero(mask & np.uint32(1 << TEST_BITS[name]))) for name in KINDS}


def _kind(tally: dict[str, int]) -> str:
    leading = max(tally, key=tally.__getitem__)  # the first of several that are equal
    return KINDS[leading] if tally[leading] else NO_TEST


def _silent_spans(time: Times, present: Mask, longest_silence: float) -> Iterator[tuple[np.datetime64, np.datetime64]]:
    """Find the spans between values, or between them and the ends of the record, that are too long."""
    heard = present.copy()
    heard[[0, -1]] = True
    stamps = time[heard].astype("datetime64[ns]")
    waits = silence(stamps, np.ones((stamps.size, 1), dtype=np.bool_), np.full(1, np.datetime64("NaT", "ns")))[:, 0]
    for late in np.flatnonzero(waits > longest_silence):
        yield stamps[late - 1], stamps[late]
