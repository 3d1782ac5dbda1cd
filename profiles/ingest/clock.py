"""Stamps of text to UTC."""

from __future__ import annotations

import re
from collections.abc import Sequence
from datetime import UTC, datetime, timedelta, timezone, tzinfo
from zoneinfo import ZoneInfo, available_timezones

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from profiles.ingest.wording import nearest

ISO_8601 = "iso8601"

# A stamp that itself says how far it is from UTC: Z, or an offset after the time of day.
_WITH_OFFSET = re.compile(r"[Zz]$|[Tt ].*[+-][0-9]{2}(?::?[0-9]{2})?$")
_ISO_DAY = re.compile(r"[0-9]{4}-[0-9]{2}-[0-9]{2}|[0-9]{8}")
_DIGIT = re.compile(r"[0-9]")
_FIRST, _LAST = (
    np.datetime64("1678-01-01", "us"),
    np.datetime64("2262-01-01", "us"),
)  # what datetime64[ns] holds
_NAT = np.datetime64("NaT", "ns")

UNREADABLE = "the time cannot be read"
NOT_ON_THE_CLOCK = "this local time does not exist, or exists twice, in the layout's zone"


def parse_zone(name: str) -> tzinfo:
    """Return the zone of ``"UTC"``, an offset like ``"+10:00"`` or an IANA name; ValueError for others."""
    if name.upper() in {"UTC", "Z"}:
        return UTC
    if name[:1] in {"+", "-"}:
        return _offset_zone(name)
    if name in available_timezones():
        return ZoneInfo(name)
    raise ValueError(
        f"no such time zone: {name!r}; expected UTC, an offset like +10:00 or an IANA name"
        + nearest(name, available_timezones())
    )


def _offset_zone(name: str) -> tzinfo:
    try:
        offset = datetime.strptime(name, "%z").utcoffset()
    except ValueError:
        raise ValueError(f"no offset from UTC: {name!r}; expected hours and minutes like +10:00") from None
    return timezone(offset or timedelta(0))


def parse_times(
    stamps: Sequence[str], *, time_format: str, zone: str, offset_hours: float = 0.0
) -> tuple[NDArray[np.datetime64], NDArray[np.object_]]:
    """Read stamps.

    Parameters
    ----------
    stamps : sequence of str
    time_format : str
        strptime format or ``"iso8601"``, which must name at least the day.
    zone : str
        Where the clock stood; an offset in the stamp itself comes first.
    offset_hours : float
        Added to every stamp.

    Returns
    -------
    times : ndarray of datetime64[ns]
        UTC; NaT where a stamp cannot be read.
    reasons : ndarray of object
        Why not, or None.
    """
    texts = np.array(stamps, dtype=object)
    clock = _wall_clock(texts, time_format)
    reasons = np.full(clock.size, None, dtype=object)
    reasons[np.isnat(clock)] = UNREADABLE
    times = clock.copy()
    naive = ~_with_offset(texts, time_format)
    times[naive] = _from_zone(clock[naive], zone)
    reasons[np.isnat(times) & ~np.isnat(clock)] = NOT_ON_THE_CLOCK
    return times + np.timedelta64(round(offset_hours * 3_600e9), "ns"), reasons


def _wall_clock(texts: NDArray[np.object_], time_format: str) -> NDArray[np.datetime64]:
    """Return stamps as the clock showed them; those with an offset of their own are in UTC already."""
    is_iso = time_format == ISO_8601
    # pandas also reads words such as "now", whatever the format.
    plausible = _ISO_DAY.match if is_iso else _DIGIT.search
    guarded = [text if plausible(text) else None for text in texts]
    read = pd.to_datetime(
        pd.Series(guarded, dtype=object),
        format="ISO8601" if is_iso else time_format,
        errors="coerce",
        utc=True,
    )
    clock = read.dt.tz_localize(None).to_numpy().astype("datetime64[us]")
    clock[~((clock >= _FIRST) & (clock < _LAST))] = _NAT
    return clock.astype("datetime64[ns]")


def _with_offset(texts: NDArray[np.object_], time_format: str) -> NDArray[np.bool_]:
    if time_format != ISO_8601:
        return np.full(texts.size, "%z" in time_format)
    return np.fromiter((_WITH_OFFSET.search(text) is not None for text in texts), bool, texts.size)


def _from_zone(clock: NDArray[np.datetime64], zone: str) -> NDArray[np.datetime64]:
    local = pd.DatetimeIndex(clock).tz_localize(parse_zone(zone), ambiguous="NaT", nonexistent="NaT")
    return local.tz_convert("UTC").tz_localize(None).to_numpy().astype("datetime64[ns]")
