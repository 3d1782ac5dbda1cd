"""What header lines and names say about the readings: zone, scale, averages, units, lists of depths."""

from __future__ import annotations

import re
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from profiles.ingest.clock import parse_zone
from profiles.ingest.drafting.doubts import Doubt
from profiles.ingest.drafting.words import depth_units

_OFFSET = re.compile(r"\b(?:UTC|GMT)\s*([+\-−]\s*\d{1,2})(?::?(\d{2}))?(?!\d)")
_PLAIN_OFFSET = re.compile(r"(?:zone|offset|tz)[^0-9+\-]{0,20}([+\-]\d{1,2})(?::?(\d{2}))?(?!\d)", re.IGNORECASE)
_UTC = re.compile(r"\b(?:UTC|GMT|zulu|universal time)\b", re.IGNORECASE)
_IANA = re.compile(r"\b([A-Z][A-Za-z]+/[A-Z][A-Za-z_]+(?:/[A-Z][A-Za-z_]+)?)\b")
#: Abbreviations of zones, by their usual offset (common practice, no source); several are used in more than one place.
_ABBREVIATIONS = {
    "CET": "+01:00",
    "CEST": "+02:00",
    "MEZ": "+01:00",
    "MESZ": "+02:00",
    "EET": "+02:00",
    "EEST": "+03:00",
    "WET": "+00:00",
    "BST": "+01:00",
    "EST": "-05:00",
    "EDT": "-04:00",
    "CST": "-06:00",
    "CDT": "-05:00",
    "MST": "-07:00",
    "MDT": "-06:00",
    "PST": "-08:00",
    "PDT": "-07:00",
    "AEST": "+10:00",
    "AEDT": "+11:00",
    "AWST": "+08:00",
    "NZST": "+12:00",
    "NZDT": "+13:00",
    "JST": "+09:00",
    "HST": "-10:00",
    "BRT": "-03:00",
}
_ABBREVIATION = re.compile(rf"\b({'|'.join(_ABBREVIATIONS)})\b")
_SHIFTS = re.compile(r"daylight|summer time|\bDST\b", re.IGNORECASE)


@dataclass(frozen=True)
class Zone:
    """A zone as a layout names it, and why that is not certain."""

    name: str
    doubt: Doubt | None = None


def zone_of(near: str, hints: str) -> Zone:
    """Return the zone that names and units of the stamps (``near``), or else the header, state.

    Where neither does, it is UTC, with a doubt.
    """
    for text, certain in ((near, True), (hints, False)):
        for line in text.split("\n"):
            found = _zone_in(line)
            if found is not None:
                doubt = (
                    None
                    if certain and not found[1]
                    else Doubt(
                        "time zone",
                        found[0],
                        found[1] or f"it is told by this line of the header: {line.strip()[:80]!r}",
                    )
                )
                return Zone(found[0], doubt)
    why = "the file does not state it"
    if re.search(r"local|lokal|ortszeit", near, re.IGNORECASE):
        why = "the name of the column says local time, but the file does not state which"
    if _SHIFTS.search(hints):
        why += ", but mentions summer time"
    return Zone("UTC", Doubt("time zone", "UTC", why))


def _zone_in(line: str) -> tuple[str, str] | None:
    """Return the zone that a line names, and a reason to doubt it, or an empty text."""
    if match := _OFFSET.search(line) or _PLAIN_OFFSET.search(line):
        hours = int(match[1].replace("−", "-").replace(" ", ""))
        sign = "-" if match[1].lstrip()[0] in "-−" else "+"
        return (f"{sign}{abs(hours):02d}:{match[2] or '00'}", "") if abs(hours) <= 14 else None
    if (match := _IANA.search(line)) and _is_zone(match[1]):
        return match[1], ""
    if match := _ABBREVIATION.search(line):
        name = match[1]
        return _ABBREVIATIONS[name], f"{name} is a name of more than one zone, and may change with summer time"
    if _UTC.search(line):
        return "UTC", ""
    return None


def _is_zone(name: str) -> bool:
    try:
        parse_zone(name)
    except ValueError:
        return False
    return True


# --------------------------------------------------------------------------------------------------------------
# Scale and averages

_OLD_SCALE = re.compile(r"IPTS[ -]?68|\bT-?68\b", re.IGNORECASE)
_NEW_SCALE = re.compile(r"ITS[ -]?90|\bT-?90\b", re.IGNORECASE)
_INSTANT = re.compile(r"instantaneous|\bspot\b|\bsnapshot|not averaged", re.IGNORECASE)
_MEAN = re.compile(r"\b(?:means?|averages?|averaged|avg)\b", re.IGNORECASE)
_LENGTHS = (
    (r"daily|24[ -]?h(?:our)?s?|1[ -]day|day", 24.0),
    (r"hourly|(?<!\d)1[ -]?h(?:our)?|60[ -]?min\w*|hour", 1.0),
    (r"monthly", 0.0),
)
_NUMBERED = re.compile(
    r"(\d+(?:\.\d+)?)[ -]?(min|minute|minutes|h|hr|hour|hours|s|sec|second|seconds|day|days)\b", re.IGNORECASE
)
_UNIT_HOURS = {"m": 1.0 / 60.0, "h": 1.0, "s": 1.0 / 3600.0, "d": 24.0}


def scale_of(hints: str) -> tuple[str, Doubt | None]:
    """Return the temperature scale, and why that is not certain."""
    old, new = _OLD_SCALE.search(hints), _NEW_SCALE.search(hints)
    if old and not new:
        return "IPTS-68", None
    if new and not old:
        return "ITS-90", None
    why = "the header names both scales" if old else "the file does not state the scale; before 1990 it was IPTS-68"
    return "ITS-90", Doubt("temperature scale", "ITS-90", why)


def averages(hints: str, aggregation: str | None, step: np.timedelta64 | None) -> tuple[dict[str, Any], Doubt | None]:
    """Return mean_hours where it is stated, and what stays unsure."""
    if aggregation == "instant" or (aggregation is None and _INSTANT.search(hints)):
        return {"mean_hours": 0}, None
    line = next((line for line in hints.split("\n") if _MEAN.search(line) and _length(line)), "")
    length = _length(line) if line else None
    if length is None and aggregation == "mean" and step is not None:
        length = float(step / np.timedelta64(1, "s")) / 3600.0
    if length:
        return {"mean_hours": _short(length)}, Doubt(
            "stamp of the means",
            "the centre",
            f"readings are means of {length:.4g} hours; whether their start, centre or end is stamped is not stated",
            'set stamp = "start" or "end"; loggers often stamp the end, daily means the start',
        )
    return {}, Doubt(
        "mean or instantaneous",
        "unknown",
        "the file does not state it",
        "set mean_hours, 0 for one taken in an instant",
    )


def _short(length: float) -> float | int:
    rounded = round(length, 6)
    return int(rounded) if rounded == int(rounded) else rounded


def _length(line: str) -> float | None:
    if match := _NUMBERED.search(line):
        return float(match[1]) * _UNIT_HOURS[match[2][0].lower()]
    for pattern, hours in _LENGTHS:
        if re.search(rf"\b(?:{pattern})\b", line, re.IGNORECASE):
            return hours or None
    return None


# --------------------------------------------------------------------------------------------------------------
# Depths and sign in the header

_NUMBER = re.compile(r"(?<![\w.])[-+]?\d+(?:\.\d+)?(?![\d.])")
_SURFACE = re.compile(r"depth|tiefe|prof|\bz\b|level|pressure|sensor", re.IGNORECASE)
_ONE_DEPTH = re.compile(
    r"(?:depth|tiefe|profund\w*|profondeur)"
    r"\W{0,3}(?:of sensor)?[^0-9\n]{0,9}?(\d+(?:\.\d+)?)\s*(m\b|metres?|meters?)?",
    re.IGNORECASE,
)


def depth_lists(lines: Iterable[str], count: int) -> Iterator[tuple[list[float], str]]:
    """Yield lists of so many depths, rising or falling, that stand in one line of the header, and the line."""
    for line in lines:
        numbers = [float(text) for text in _NUMBER.findall(re.sub(r"(?<=\d)\s*m\b", " ", line))]
        for start in range(len(numbers) - count + 1 if count > 1 else 0):
            part = numbers[start : start + count]
            if start + count == len(numbers) and _monotone(part) and (_SURFACE.search(line) or count > 3):
                yield part, line


def _monotone(numbers: Sequence[float]) -> bool:
    steps = np.diff(numbers)
    one_sided = min(numbers) >= 0 or max(numbers) <= 0
    return bool(one_sided and ((steps > 0).all() or (steps < 0).all()))


def one_depth(lines: Iterable[str]) -> tuple[float, str] | None:
    """Return the depth of the only sensor that a line of the header states, and the line."""
    for line in lines:
        if (match := _ONE_DEPTH.search(line)) is not None and "water depth" not in line.casefold():
            return float(match[1]), line
    return None


def depths_by_name(lines: Sequence[str], names: Sequence[str]) -> dict[str, float]:
    """Return depths that lines of the header give sensor by sensor, as in "T1: 0.5 m"; empty where one has none."""
    found: dict[str, float] = {}
    for name in names:
        pattern = re.compile(
            rf"(?<![A-Za-z0-9]){re.escape(name)}(?![A-Za-z0-9.])[^0-9+\-\n]*(?:[^\n]*?depth\D*?)?([-+]?\d+(?:\.\d+)?)\s*"
            r"(?:m|metres?|meters?|dbar)?(?![A-Za-z0-9])",
            re.IGNORECASE,
        )
        match = next((match for line in lines if (match := pattern.search(line)) is not None), None)
        if match is None:
            return {}
        found[name] = float(match[1])
    return found if len(set(found.values())) == len(found) else {}


def depth_units_in(hints: str) -> str | None:
    """Return the units of depth that a line of the header states which is about depths."""
    for line in hints.split("\n"):
        if re.search(r"depth|pressure|sensor|dbar|tiefe", line, re.IGNORECASE) and (units := depth_units(line)):
            return units
    return None
