"""Damaged text files of every kind of layout, against a reader that shares nothing with ours.

Small files are made, sound at first, and damaged in one to three ways. For each mutant an independent reader (``re``,
``float``, ``datetime``, ``zoneinfo``) says which lines are data, which of them make sense and what they hold, by the
rules that the contributor's guide states: a row that cannot be understood goes to quarantine whole; of readings of one
sensor at one time the first in the file stays; the station with most rows stays; a profile stays where its count fits.
Ours has to agree on every line and every value, or, where nothing is left or the file is no longer what the layout
says, to tell so. Any other exception is a fault.

    python tests/bench/mutants.py --mutants 100000
"""

from __future__ import annotations

import argparse
import faulthandler
import gzip
import io
import re
import sys
import tempfile
import time
import zipfile
from collections import Counter
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field
from datetime import UTC, datetime, timedelta, timezone
from functools import cached_property
from pathlib import Path
from zoneinfo import ZoneInfo

import numpy as np

from profiles.errors import ThermotiltError
from profiles.ingest import read
from profiles.ingest.layout import KINDS

Random = np.random.Generator
BLANKS = b" \t\x0b\x0c\r\n"
NUMBER = re.compile(r"[+-]?(\d+(\.\d*)?|\.\d+)([eE][+-]?\d+)?", re.ASCII)
LARGEST = float(np.finfo(np.float32).max)
LONG_LINE = 1_000_000
LONGEST_WAIT = 120  # s for one mutant; then the program stops and says where it was
MOST_CELLS = 4096  # of a line; more columns than a delivery has


# --------------------------------------------------------------------------------------------------------------
# The independent reader: lines, cells, numbers, stamps


class UnfitError(Exception):
    """The file is not what its layout says."""


@dataclass
class Found:
    """What the independent reader finds: data lines, those that go to quarantine, and the readings."""

    lines: int = 0
    lost: set[int] = field(default_factory=set)
    values: dict[tuple[datetime, float], tuple[float, int]] = field(default_factory=dict)
    times: set[datetime] = field(default_factory=set)


def data_lines(content: bytes, layout: dict) -> tuple[list[bytes], list[tuple[int, bytes]]]:
    """Return header lines, and numbered data lines."""
    comment = layout.get("comment", "").encode()
    lines = re.split(rb"\r\n|\n|\r", content.removeprefix(b"\xef\xbb\xbf"))
    kept = [
        (number, line)
        for number, line in enumerate(lines, start=1)
        if line.strip(BLANKS) and not (comment and line.lstrip(BLANKS).startswith(comment))
    ]
    rows = layout.get("header_rows", 1 if layout["kind"] in ("wide", "long") else 0)
    if len(kept) < rows:
        raise UnfitError("header")
    return [line for _, line in kept[:rows]], kept[rows:]


def split(text: str, layout: dict) -> list[str] | None:
    """Return the cells of a line; None where it is damaged."""
    if "fixed" in layout:
        furthest = max(stop for _, stop in layout["fixed"].values())
        if len(text) < furthest:
            return None
        return [text[start - 1 : stop].strip(" \t\x0b\x0c") for start, stop in layout["fixed"].values()]
    delimiter = layout.get("delimiter", ",")
    if '"' not in text:
        return re.findall(r"[^ \t\x0b\x0c]+", text) if delimiter == "whitespace" else [
            cell.strip(" \t\x0b\x0c") for cell in text.split(delimiter)
        ]  # fmt: skip
    blank = "[ \t\x0b\x0c]*" if delimiter != "\t" else "[ \x0b\x0c]*"
    if delimiter == "whitespace":
        cell, between = r'"(?:[^"]|"")*"(?!\S)|[^\s"]\S*', "[ \t\x0b\x0c]+"
    else:
        mark = re.escape(delimiter)
        cell, between = rf'{blank}"(?:[^"]|"")*"{blank}(?=$|{mark})|{blank}(?!{blank}")[^{mark}]*', mark
    cells, place = [], 0
    text = text.strip(" \t\x0b\x0c") if delimiter == "whitespace" else text
    while True:
        match = re.compile(cell, re.ASCII).match(text, place)
        if match is None:
            return None
        cells.append(match.group().strip(" \t\x0b\x0c"))
        if match.end() == len(text) or len(cells) > MOST_CELLS:
            break
        gap = re.compile(between).match(text, match.end())
        if gap is None:
            return None
        place = gap.end()
    return [unquoted(found) for found in cells]


def unquoted(cell: str) -> str:
    quoted = len(cell) > 1 and cell[0] == cell[-1] == '"'
    return cell[1:-1].replace('""', '"').strip(" \t\x0b\x0c") if quoted else cell


def cells_of(line: bytes, layout: dict, columns: int) -> list[str] | None:
    """Return the cells of a row; None where they are not as many, or not text."""
    try:
        text = line.decode(layout.get("encoding", "utf-8"))
    except UnicodeDecodeError:
        return None
    if "\x00" in text:
        return None
    cells = split(text, layout)
    if cells is not None and layout.get("ends_with_delimiter") and len(cells) == columns + 1 and line.endswith(
        layout["delimiter"].encode()
    ):  # fmt: skip
        cells = cells[:-1]
    return cells if cells is not None and len(cells) == columns else None


def number(cell: str, layout: dict, *, missing: bool = True) -> float | None:
    """Return a number, NaN where it is missing; None where it is none."""
    tokens = layout.get("missing", [""]) if missing else []
    if cell in tokens:
        return float("nan")
    mark = layout.get("decimal", ".")
    plain = cell.replace(".", "x").replace(mark, ".") if mark == "," else cell
    if not NUMBER.fullmatch(plain):
        return None
    value = float(plain)
    if any(NUMBER.fullmatch(token) and float(token) == value for token in tokens):
        return float("nan")
    return value if abs(value) <= LARGEST else None


def stamp(cells: dict[str, str], layout: dict) -> datetime | None:
    """Return the time of a row in UTC; None where it names none."""
    settings = layout["time"]
    try:
        if "parts" in settings:
            moment = parts_of({part: cells[name] for part, name in settings["parts"].items()}, layout)
        else:
            moment = text_of(
                " ".join(cells[name] for name in settings.get("columns", [settings.get("column")])), settings
            )
        return moment if moment is None or moment.tzinfo is UTC else in_utc(moment, settings.get("zone", "UTC"))
    except (ValueError, OverflowError):
        return None


def text_of(text: str, settings: dict) -> datetime | None:
    form = settings.get("format", "iso8601")
    if form != "iso8601":
        widths = {"Y": 4, "m": 2, "d": 2, "H": 2, "M": 2, "S": 2}
        touching = re.search(r"%[YmdHMS]%[YmdHMS]", form) is not None
        exact = re.sub(r"%([YmdHMS])", lambda found: rf"\d{{{widths[found[1]]}}}", form.replace(".", r"\."))
        if touching and not re.fullmatch(exact, text, re.ASCII):
            return None
        return datetime.strptime(text, form)
    if not re.fullmatch(
        r"(\d{4}-\d\d-\d\d|\d{8})([T ]\d\d(:\d\d(:\d\d(\.\d+)?)?|\d\d(\d\d(\.\d+)?)?)?( ?(Z|[+-]\d\d(:?\d\d)?))?)?",
        text, re.ASCII,
    ):  # fmt: skip
        return None
    if re.fullmatch(r".*T.* [Z+-].*|.* .* [Z+-].*", text):
        text = text[:11] + text[11:].replace(" ", "")
    moment = datetime.fromisoformat(text.upper())
    return moment if moment.tzinfo is None else moment.astimezone(UTC)


def parts_of(cells: dict[str, str], layout: dict) -> datetime | None:
    """Return year, day of the year and hour, of which the last may have a fraction."""
    values = {part: number(cell, layout, missing=False) for part, cell in cells.items()}
    if any(value is None for value in values.values()):
        return None
    year, day, hour = values["year"], values["day_of_year"], values["hour"]
    if year != int(year) or day != int(day) or not (1678 <= year < 2262 and 0 <= hour <= 24):
        return None
    length = (datetime(int(year) + 1, 1, 1) - datetime(int(year), 1, 1)).days
    if not 1 <= day <= length:
        return None
    return datetime(int(year), 1, 1) + timedelta(days=day - 1) + timedelta(milliseconds=round(hour * 3.6e6))


def in_utc(moment: datetime, zone: str) -> datetime | None:
    if not 1678 <= moment.year < 2262:
        return None
    if zone[0] in "+-":
        hours, minutes = (int(part) for part in zone[1:].split(":"))
        sign = -1 if zone[0] == "-" else 1
        return moment.replace(tzinfo=timezone(sign * timedelta(hours=hours, minutes=minutes))).astimezone(UTC)
    local = moment.replace(tzinfo=ZoneInfo(zone))
    if local.utcoffset() != local.replace(fold=1).utcoffset():  # skipped, or there twice
        return None
    return local.astimezone(UTC)


def depth_in(cell: str, pattern: str) -> float | None:
    before, after = (re.escape(part) for part in pattern.split("{depth}"))
    match = re.fullmatch(rf"{before}([+-]?\d+(?:[.,]\d+)?){after}", cell, re.ASCII)
    return float(match[1].replace(",", ".")) if match else None


def checked(depths: list[float]) -> list[float]:
    stored = [float(np.float32(depth)) for depth in depths]
    if not depths or len(set(stored)) < len(stored) or not all(0 <= depth <= 12_000 for depth in stored):
        raise UnfitError("depths")
    return stored


def place_of(names: list[str], name: str) -> int:
    if names.count(name) != 1:
        raise UnfitError(name)
    return names.index(name)


# --------------------------------------------------------------------------------------------------------------
# The independent reader: kinds


def names_of(header: list[bytes], layout: dict) -> list[str]:
    if "fixed" in layout:
        return list(layout["fixed"])
    text = header[layout.get("names_row", 1) - 1].decode(layout.get("encoding", "utf-8"), "surrogateescape")
    names = split(text, layout)
    if names is None or "\x00" in text or len(names) > MOST_CELLS:
        raise UnfitError("names")
    return names


def sensors_of(names: list[str], layout: dict) -> dict[int, float]:
    depth = layout["depth"]
    if "columns" in depth:
        found = {place_of(names, name): value for name, value in depth["columns"].items()}
    else:
        found = {
            place: value for place, name in enumerate(names) if (value := depth_in(name, depth["pattern"])) is not None
        }
        for place in found:
            place_of(names, names[place])
    return dict(zip(found, checked(list(found.values())), strict=True))


def reading_row(cells: list[str], sensors: dict[int, float], marks: str | None, layout: dict) -> dict | None:
    """Return value and flag by depth of a row with a reading per sensor; None where it makes no sense."""
    values = [number(cells[place], layout) for place in sensors]
    if any(value is None for value in values):
        return None
    flags = [2] * len(values)
    if marks is not None:
        table = layout["quality"]["flags"]
        if len(marks.encode()) != len(values) or any(mark not in table for mark in marks):
            return None
        flags = [table[mark] for mark in marks]
    return {
        depth: (value, 9 if value != value else flag)
        for depth, value, flag in zip(sensors.values(), values, flags, strict=True)
    }


def read_wide(content: bytes, layout: dict) -> Found:
    header, rows = data_lines(content, layout)
    names = names_of(header, layout)
    sensors = sensors_of(names, layout)
    stamps = [place_of(names, name) for name in layout["time"].get("columns", [layout["time"].get("column")])]
    mark = place_of(names, layout["quality"]["column"]) if "quality" in layout else None
    found = Found(lines=len(rows))
    for line, text in rows:
        cells = cells_of(text, layout, len(names))
        moment = stamp({names[place]: cells[place] for place in stamps}, layout) if cells else None
        values = reading_row(cells, sensors, cells[mark] if mark is not None else None, layout) if cells else None
        if moment is None or values is None or moment in found.times:
            found.lost.add(line)
            continue
        found.times.add(moment)
        found.values |= {(moment, depth): value for depth, value in values.items()}
    return found


def one_reading(cells: dict[str, str], layout: dict) -> tuple[float, float, int] | None:
    """Return depth, value and flag of a row with one reading; None where it makes no sense."""
    depth = number(cells[layout["depth"]["column"]], layout)
    value = number(cells[layout["temperature"]["column"]], layout)
    if depth is None or value is None or not 0 <= depth <= 12_000:
        return None
    flag = 2
    if "quality" in layout:
        flag = layout["quality"]["flags"].get(cells[layout["quality"]["column"]])
        if flag is None:
            return None
    return float(np.float32(depth)), value, 9 if value != value else flag


def settle(found: Found, readings: list[tuple[int, datetime, float, float, int]]) -> None:
    for line, moment, depth, value, flag in readings:
        if (moment, depth) in found.values:
            found.lost.add(line)
        else:
            found.values[moment, depth] = (value, flag)
            found.times.add(moment)


def read_long(content: bytes, layout: dict) -> Found:
    header, rows = data_lines(content, layout)
    names = names_of(header, layout)
    columns = [layout["time"]["column"], layout["depth"]["column"], layout["temperature"]["column"], layout["station"]]
    for name in [*columns, *([layout["quality"]["column"]] if "quality" in layout else [])]:
        place_of(names, name)
    found, readings, stations = Found(lines=len(rows)), [], Counter()
    for line, text in rows:
        cells = cells_of(text, layout, len(names))
        named = dict(zip(names, cells, strict=True)) if cells else None
        moment, reading = (stamp(named, layout), one_reading(named, layout)) if named else (None, None)
        if moment is None or reading is None:
            found.lost.add(line)
            continue
        stations[named[layout["station"]]] += 1
        readings.append((named[layout["station"]], (line, moment, *reading)))
    main = stations.most_common(1)[0][0] if stations else ""
    found.lost |= {reading[0] for station, reading in readings if station != main}
    settle(found, [reading for station, reading in readings if station == main])
    return found


def read_blocked(content: bytes, layout: dict) -> Found:
    _, rows = data_lines(content, layout)
    block, begins = layout["block"], layout["block"]["begins"].encode()
    is_first = [line.lstrip(BLANKS).startswith(begins) for _, line in rows]
    found, taken, sets = Found(lines=len(rows)), {}, 0
    sensors: dict[int, float] | None = None
    place = 0
    while place < len(rows):
        if is_first[place]:
            stop = place + 1
            while stop < min(place + block["header_rows"], len(rows)) and not is_first[stop]:
                stop += 1
            sensors = (
                block_depths([line for _, line in rows[place:stop]], layout)
                if stop - place == block["header_rows"]
                else None
            )
            if sensors is None:
                found.lost |= {line for line, _ in rows[place:stop]}
            else:
                sets += 1
            place = stop
            continue
        line, text = rows[place]
        place += 1
        names = [*block["before"], *("" for _ in sensors or ()), *block["after"]]
        cells = cells_of(text, layout, len(names)) if sensors is not None else None
        moment = stamp(dict(zip(block["before"], cells, strict=False)), layout) if cells else None
        values = reading_row(cells, sensors, cells[-1], layout) if cells else None
        if moment is None or values is None or set(values) & taken.get(moment, set()):
            found.lost.add(line)
            continue
        taken[moment] = taken.get(moment, set()) | set(values)
        found.times.add(moment)
        found.values |= {(moment, depth): value for depth, value in values.items()}
    if not sets:
        raise UnfitError("no block")
    return found


def block_depths(header: list[bytes], layout: dict) -> dict[int, float] | None:
    text = header[layout["depth"]["row"] - 1].decode("utf-8", "surrogateescape")
    cells = ((split(text, layout) if "\x00" not in text else None) or [])[layout["depth"]["skip"] :]
    depths = [depth_in(cell, layout["depth"]["pattern"]) for cell in cells]
    behind = len(layout["block"]["after"])
    if all(depth is None for depth in depths[-behind:]):  # names of the cells behind the readings
        depths = depths[:-behind]
    if any(depth is None for depth in depths):
        return None
    try:
        return dict(enumerate(checked(depths), start=len(layout["block"]["before"])))
    except UnfitError:
        return None


def read_counted(content: bytes, layout: dict) -> Found:
    _, rows = data_lines(content, layout)
    record = layout["record"]["names"]
    heads: list[tuple[int, datetime, float]] = []
    for place, (_, text) in enumerate(rows):
        cells = cells_of(text, layout, len(record))
        named = dict(zip(record, cells, strict=True)) if cells else None
        count = number(named[layout["record"]["count"]], layout, missing=False) if named else None
        moment = stamp(named, layout) if named else None
        if count is not None and count >= 0 and count == int(count) and count < 2**31 - 1 and moment is not None:
            heads.append((place, moment, count))
    if not heads:
        raise UnfitError("no profile")
    found = Found(lines=len(rows), lost={line for line, _ in rows[: heads[0][0]]})
    readings = []
    for (place, moment, count), stop in zip(heads, [*(head[0] for head in heads[1:]), len(rows)], strict=True):
        if stop - place - 1 != count:
            found.lost |= {line for line, _ in rows[place:stop]}
            continue
        for line, text in rows[place + 1 : stop]:
            cells = cells_of(text, layout, len(layout["names"]))
            reading = one_reading(dict(zip(layout["names"], cells, strict=True)), layout) if cells else None
            if reading is None:
                found.lost.add(line)
            else:
                readings.append((line, moment, *reading))
    settle(found, readings)
    return found


READERS: dict[str, Callable[[bytes, dict], Found]] = {
    "wide": read_wide, "long": read_long, "blocked": read_blocked, "counted": read_counted
}  # fmt: skip


# --------------------------------------------------------------------------------------------------------------
# Sound files


@dataclass(frozen=True)
class Kind:
    """A kind of file: its layout, and what makes a sound one of so many records."""

    layout: dict
    make: Callable[[Random, int], str]
    packed: Callable[[bytes], bytes] | None = None


def temperatures(random: Random, *shape: int) -> np.ndarray:
    return (20.0 + random.normal(0.0, 6.0, shape)).round(3)


def stamps(random: Random, count: int, start: str = "2031-02-25T00:00") -> list[datetime]:
    """Return half-hourly stamps, some out of order and some twice."""
    steps = np.arange(count)
    for _ in range(count // 20):
        one, other = random.integers(0, count, 2)
        steps[one], steps[other] = steps[other], steps[one if random.random() < 0.8 else other]
    return [datetime.fromisoformat(start) + timedelta(minutes=30 * int(step)) for step in steps]


def wide_csv(random: Random, count: int) -> str:
    lines = ["# a chain", "time,battery,T_25m,T_1m,T_10.5m,note"]
    for moment, row in zip(stamps(random, count), temperatures(random, count, 3), strict=True):
        cells = [
            ("NA", "-9.999", "")[random.integers(3)] if random.random() < 0.05 else f"{value:.3f}" for value in row
        ]
        note = ('"a, b"', "", "x", '"he said ""no"""')[random.integers(4)]
        lines += [f"{moment.isoformat()},12.1,{','.join(cells)},{note}"]
        lines += ["", "# a remark", "  "][: random.integers(4)] if random.random() < 0.05 else []
    return "\n".join(lines) + "\n"


def wide_tab(random: Random, count: int) -> str:
    # the last hours of summer time in New York: 2 November 2031
    lines = ["title °C", "date\thour\t1,0 m\t12,5 m\tq"]
    for moment, row in zip(stamps(random, count, "2031-11-01T18:00"), temperatures(random, count, 2), strict=True):
        cells = [f"{value:.3f}".replace(".", ",") for value in row]
        marks = "".join(random.choice(["a", "b", "c"], 2))
        lines += [f"{moment:%d.%m.%Y}\t{moment:%H:%M:%S}\t{cells[0]}\t{cells[1]}\t{marks}\t"]
    return "\r\n".join(lines) + "\r\n"


def wide_fixed(random: Random, count: int) -> str:
    lines = ["a title", "yyyymmdd hhmm    top    low  q"]
    for moment, row in zip(stamps(random, count), temperatures(random, count, 2), strict=True):
        cells = ["-99.99" if random.random() < 0.05 else f"{value:.2f}" for value in row]
        lines += [f"{moment:%Y%m%d %H%M}{cells[0]:>7}{cells[1]:>7}  {''.join(random.choice(['1', '2'], 2))}"]
    return "\n".join(lines) + "\n"


def long_text(random: Random, count: int) -> str:
    lines = ["station;time_local;depth;temp;q"]
    for moment, row in zip(stamps(random, count), temperatures(random, count, 3), strict=True):
        for depth, value in zip((1, 10, 25.5), row, strict=True):
            cell = "NA" if random.random() < 0.05 else f"{value:.3f}".replace(".", ",")
            station = "TB-02" if random.random() < 0.02 else "TB-01"
            lines += [
                f"{station};{moment:%d.%m.%Y %H:%M};{depth:g};{cell};{random.integers(1, 4)}".replace("25.5", "25,5")
            ]
    return "\n".join(lines) + "\n"


def blocked_text(random: Random, count: int) -> str:
    lines, sets = ["a title"], ([1, 10, 25], [40.5, 60], [1, 12, 25])
    moments = stamps(random, count)
    for first in range(0, count, 10):
        depths = sets[random.integers(3)]
        lines += ["LEVELS (m) " + " ".join(f"{-depth:.1f}" for depth in depths), "date time degC"]
        rows = moments[first : first + 10]
        for moment, row in zip(rows, temperatures(random, len(rows), len(depths)), strict=True):
            cells = ["1e35" if random.random() < 0.05 else f"{value:.3f}" for value in row]
            lines += [f"{moment:%Y-%m-%d %H:%M}  {'  '.join(cells)} {''.join(random.choice(['a', 'b'], len(depths)))}"]
    return "\n".join(lines) + "\n"


def counted_text(random: Random, count: int) -> str:
    lines = ["year, day of the year, hour, count"]
    for moment in stamps(random, count, "2032-12-29T00:00"):
        depths = [1, 10, 25.5][: random.integers(0, 4)]
        lines += [f"{moment.year} {moment.timetuple().tm_yday} {moment.hour + moment.minute / 60:g} {len(depths)}"]
        lines += [f"{depth:g} {temperatures(random, 1)[0]:.3f} {random.choice(['a', 'b'])}" for depth in depths]
    return "\n".join(lines) + "\n"


def zipped(content: bytes) -> bytes:
    packed = io.BytesIO()
    with zipfile.ZipFile(packed, "w", zipfile.ZIP_DEFLATED) as file:
        file.writestr("chain.csv", content)
    return packed.getvalue()


WIDE_CSV = {
    "kind": "wide", "comment": "#", "missing": ["NA", "-9.999", ""], "time": {"column": "time"},
    "depth": {"pattern": "T_{depth}m"},
}  # fmt: skip
CASES: dict[str, Kind] = {
    "wide": Kind(WIDE_CSV, wide_csv),
    "wide, marks glued": Kind(
        {"kind": "wide", "delimiter": "\t", "decimal": ",", "encoding": "iso8859-1", "header_rows": 2, "names_row": 2,
         "ends_with_delimiter": True,
         "time": {"columns": ["date", "hour"], "format": "%d.%m.%Y %H:%M:%S", "zone": "America/New_York"},
         "depth": {"pattern": "{depth} m"}, "quality": {"column": "q", "flags": {"a": 1, "b": 3, "c": 4}}},
        wide_tab,
    ),
    "fixed width": Kind(
        {"kind": "wide", "header_rows": 2, "missing": ["-99.99"],
         "fixed": {"day": [1, 8], "clock": [10, 13], "top": [14, 20], "low": [21, 27], "q": [28, 31]},
         "time": {"columns": ["day", "clock"], "format": "%Y%m%d %H%M"}, "depth": {"columns": {"top": 1, "low": 25}},
         "quality": {"column": "q", "flags": {"1": 1, "2": 4}}},
        wide_fixed,
    ),
    "long": Kind(
        {"kind": "long", "delimiter": ";", "decimal": ",", "missing": ["NA"], "station": "station",
         "time": {"column": "time_local", "format": "%d.%m.%Y %H:%M", "zone": "+10:00"}, "depth": {"column": "depth"},
         "temperature": {"column": "temp"}, "quality": {"column": "q", "flags": {"1": 1, "2": 3, "3": 4}}},
        long_text,
    ),
    "blocked": Kind(
        {"kind": "blocked", "delimiter": "whitespace", "header_rows": 1, "missing": ["1e35"],
         "block": {"begins": "LEVELS", "header_rows": 2, "before": ["date", "time"], "after": ["q"]},
         "time": {"columns": ["date", "time"], "format": "%Y-%m-%d %H:%M", "zone": "-07:00"},
         "depth": {"row": 1, "skip": 2, "pattern": "-{depth}"}, "quality": {"column": "q", "flags": {"a": 1, "b": 3}}},
        blocked_text,
    ),
    "counted": Kind(
        {"kind": "counted", "delimiter": "whitespace", "header_rows": 1, "names": ["depth", "temp", "q"],
         "record": {"names": ["year", "day", "hour", "n"], "count": "n"},
         "time": {"parts": {"year": "year", "day_of_year": "day", "hour": "hour"}}, "depth": {"column": "depth"},
         "temperature": {"column": "temp"}, "quality": {"column": "q", "flags": {"a": 1, "b": 3}}},
        counted_text,
    ),
    "gzip": Kind(WIDE_CSV, wide_csv, gzip.compress),
    "zip": Kind(WIDE_CSV, wide_csv, zipped),
}  # fmt: skip


# --------------------------------------------------------------------------------------------------------------
# Damage


def some_line(content: bytes, random: Random) -> tuple[int, int]:
    """Return where a line starts and ends."""
    lines = list(re.finditer(rb"[^\r\n]+", content))
    return lines[random.integers(len(lines))].span() if lines else (0, len(content))


def in_line(change: Callable[[bytes, Random], bytes]) -> Callable[[bytes, Random], bytes]:
    """Return what changes one line of a file."""

    def changed(content: bytes, random: Random) -> bytes:
        start, end = some_line(content, random)
        return content[:start] + change(content[start:end], random) + content[end:]

    return changed


def inserted(*texts: bytes) -> Callable[[bytes, Random], bytes]:
    """Return what puts one of some texts anywhere into a line."""

    def changed(line: bytes, random: Random) -> bytes:
        place = int(random.integers(len(line) + 1))
        return line[:place] + texts[random.integers(len(texts))] + line[place:]

    return in_line(changed)


def cell(*texts: bytes) -> Callable[[bytes, Random], bytes]:
    """Return what puts one of some texts in place of a cell."""

    def changed(line: bytes, random: Random) -> bytes:
        cells = list(re.finditer(rb"[^,;\t ]+", line))
        if not cells:
            return line
        start, end = cells[random.integers(len(cells))].span()
        return line[:start] + texts[random.integers(len(texts))] + line[end:]

    return in_line(changed)


def swapped_columns(line: bytes, random: Random) -> bytes:
    cells = re.split(rb"([,;\t ]+)", line)
    one, other = 2 * random.integers(0, (len(cells) + 1) // 2, 2)
    cells[one], cells[other] = cells[other], cells[one]
    return b"".join(cells)


def swapped_lines(content: bytes, random: Random) -> bytes:
    lines = content.split(b"\n")
    one, other = random.integers(0, len(lines), 2)
    lines[one], lines[other] = lines[other], lines[one]
    return b"\n".join(lines)


def all_columns_swapped(content: bytes, random: Random) -> bytes:
    """Swap the same two columns in every line, the header's too."""
    one, other = (int(place) for place in random.integers(0, 4, 2))
    lines = []
    for line in content.split(b"\n"):
        mark = next((mark for mark in (b";", b"\t", b",") if mark in line), b" ")
        cells = line.split(mark)
        if len(cells) > max(one, other):
            cells[one], cells[other] = cells[other], cells[one]
        lines.append(mark.join(cells))
    return b"\n".join(lines)


def doubled_header(content: bytes, random: Random) -> bytes:
    lines = content.split(b"\n")
    place = int(random.integers(len(lines))) if random.random() < 0.5 else 2
    return b"\n".join([*lines[:place], *lines[:2], *lines[place:]])


def mixed_ends(content: bytes, random: Random) -> bytes:
    lines = re.split(rb"\r\n|\n|\r", content)
    ends = [(b"\n", b"\r\n", b"\r")[place] for place in random.integers(0, 3, len(lines))]
    return b"".join(line + end for line, end in zip(lines, ends, strict=True))


def wrong_encoding(content: bytes, random: Random) -> bytes:
    text = content.decode("latin-1")
    choice = random.integers(4)
    if choice == 0:
        return text.encode("utf-16")
    if choice == 1:
        return text.encode("utf-16-le")
    place = int(random.integers(len(content) + 1))
    foreign = ("ü°".encode("latin-1"), "ü°".encode())[choice - 2]
    return content[:place] + foreign + content[place:]


def truncated(content: bytes, random: Random) -> bytes:
    return content[: random.integers(len(content) + 1)]


def flipped(content: bytes, random: Random) -> bytes:
    changed = bytearray(content)
    for place in random.integers(0, max(len(content), 1), random.integers(1, 9)):
        if place < len(changed):
            changed[place] ^= 1 << int(random.integers(8))
    return bytes(changed)


def garbled(line: bytes, random: Random) -> bytes:
    return random.integers(32, 127, max(len(line), 1)).astype(np.uint8).tobytes()


IMPOSSIBLE = (
    b"2031-02-29", b"2031-13-01", b"2031-00-10", b"2031-02-30T00:00", b"20310229", b"31.02.2031", b"29.02.2031",
    b"2400", b"25:00", b"366", b"367", b"0000-00-00", b"9999-01-01",
)  # fmt: skip
MUTATIONS: dict[str, Callable[[bytes, Random], bytes]] = {
    "truncated": truncated,
    "columns swapped in a line": in_line(swapped_columns),
    "columns swapped everywhere": all_columns_swapped,
    "lines swapped": swapped_lines,
    "header doubled": doubled_header,
    "NUL": inserted(b"\x00", b"\x00" * 40),
    "a million characters": inserted(b"9" * LONG_LINE, b"x" * LONG_LINE, b"," * LONG_LINE, b" " * LONG_LINE),
    "1e999": cell(b"1e999", b"-1e999", b"1e39", b"1e-999", b"inf", b"nan"),
    "--3": cell(b"--3", b"+-3", b"3-", b"1.2.3", b"1,2,3", b"0x10", b"1_000", b"3e", b".", b"-"),
    "a date that does not exist": cell(*IMPOSSIBLE),
    "a leap second": cell(b"23:59:60", b"2031-06-30T23:59:60", b"235960", b"23:59:61"),
    "line ends mixed": mixed_ends,
    "wrong encoding": wrong_encoding,
    "a line deleted": in_line(lambda line, random: b""),
    "a line doubled": in_line(lambda line, random: line + b"\n" + line),
    "a line garbled": in_line(garbled),
    "a line cut": in_line(lambda line, random: line[: random.integers(len(line) + 1)]),
    "quotes": inserted(b'"', b'""', b"'"),
    "delimiters": inserted(b",", b";", b"\t", b" ", b",,", b"  "),
    "byte order mark": inserted(b"\xef\xbb\xbf", b"\xff\xfe"),
    "digits": inserted(b"0", b"5", b".", b"-", b"e"),
    "a character lost": in_line(
        lambda line, random: line[: (k := int(random.integers(len(line) + 1)))] + line[k + 1 :]
    ),
    "bits flipped": flipped,
    "control characters": inserted(b"\x0b", b"\x0c", b"\x1a", b"\x1c", b"\x85", b"\x7f"),
}


# --------------------------------------------------------------------------------------------------------------
# Judgement


class FaultError(AssertionError):
    """Ours and the independent reader differ."""


@dataclass(frozen=True)
class Sound:
    """A sound file of a kind, and its layout as ours takes it."""

    name: str
    kind: Kind
    content: bytes

    @cached_property
    def layout(self) -> object:
        return KINDS[self.kind.layout["kind"]].model_validate(self.kind.layout)


def make(name: str, random: Random, records: int) -> Sound:
    """Return a sound file of a kind."""
    kind = CASES[name]
    return Sound(name, kind, kind.make(random, records).encode(kind.layout.get("encoding", "utf-8")))


def is_binary(content: bytes) -> bool:
    sample = content.removeprefix(b"\xef\xbb\xbf")[:4096]
    return len(re.findall(rb"[\x00-\x08\x0e-\x1f]", sample)) > 0.09 * len(sample)


def judge(content: bytes, sound: Sound, folder: Path) -> tuple[str, Found | None]:
    """Return what became of a file: read, read with losses, or told; raise FaultError where that is wrong."""
    path = folder / "mutant"
    path.write_bytes(content)
    try:
        expected = READERS[sound.kind.layout["kind"]](unpacked(content, sound.kind), sound.kind.layout)
    except UnfitError:
        expected = None
    try:
        delivery = read(path, sound.layout)
    except ThermotiltError as error:
        if type(error) is ThermotiltError:
            raise FaultError(f"a fault of ours: {error}") from error
        if expected is not None and expected.times and not is_binary(unpacked(content, sound.kind)):
            raise FaultError(
                f"nothing was kept where {expected.lines - len(expected.lost)} rows make sense: {error}"
            ) from error
        return "told", None
    if expected is None or not expected.times:
        raise FaultError(f"{delivery.rows_kept} rows were kept of a file that is not what its layout says")
    check_same(delivery, expected)
    return ("quarantined" if expected.lost else "kept whole"), expected


def unpacked(content: bytes, kind: Kind) -> bytes:
    """Return what is in a packed file; raise UnfitError where it is damaged."""
    if kind.packed is None:
        return content
    try:
        if content.startswith(b"PK\x03\x04"):
            with zipfile.ZipFile(io.BytesIO(content)) as archive:
                return archive.read(archive.namelist()[0])
        return gzip.decompress(content) if content.startswith(b"\x1f\x8b") else content
    except Exception as error:  # whatever the library says of damage
        raise UnfitError(str(error)) from error


def check_same(delivery, expected: Found) -> None:
    """Raise FaultError where lines, times, values or flags differ."""
    found = (delivery.rows_read, delivery.rows_kept, delivery.rows_quarantined)
    if found != (expected.lines, expected.lines - len(expected.lost), len(expected.lost)):
        raise FaultError(f"read, kept, quarantined: {found}; {expected.lines} lines, lost {sorted(expected.lost)}; "
                    f"ours lost {delivery.quarantine['line'].tolist()}")  # fmt: skip
    if set(delivery.quarantine["line"]) != expected.lost or not delivery.quarantine["line"].is_unique:
        raise FaultError(f"lost {delivery.quarantine['line'].tolist()} where {sorted(expected.lost)} make no sense")
    rows = delivery.table.rows(0, delivery.table.count)
    times = [moment.replace(tzinfo=UTC) for moment in rows["time"].astype("datetime64[us]").astype(datetime)]
    if times != sorted(expected.times):
        raise FaultError(f"times differ: {set(times) ^ expected.times}")
    depths = [float(depth) for depth in delivery.depth]
    nothing = (float("nan"), 9)
    wanted = [[expected.values.get((moment, depth), nothing) for depth in depths] for moment in times]
    values = np.array([[value for value, _ in row] for row in wanted], np.float64).reshape(len(times), -1)
    np.testing.assert_array_equal(rows["values"], values.astype(np.float32), "values")
    if {depth for _, depth in expected.values} - set(depths):
        raise FaultError(f"depths are missing: {depths}")
    if rows["flags"].shape[1]:
        np.testing.assert_array_equal(rows["flags"], [[flag for _, flag in row] for row in wanted], "flags")


def mutant(sound: Sound, random: Random) -> tuple[bytes, list[str]]:
    """Return a damaged copy, and how it was damaged."""
    ways = list(random.choice(list(MUTATIONS), (1, 1, 1, 2, 3)[random.integers(5)]))
    if "a million characters" in ways and random.random() < 0.8:  # slow for the independent reader
        ways = ["truncated" if way == "a million characters" else way for way in ways]
    content = sound.content
    packed_first = sound.kind.packed is not None and random.random() < 0.5
    if packed_first:
        ways = [way if way in ("truncated", "NUL") else "bits flipped" for way in ways]
        content = sound.kind.packed(content)
    for way in ways:
        content = MUTATIONS[way](content, random)
    if sound.kind.packed is not None and not packed_first:
        content = sound.kind.packed(content)
    return content, ways


def trials(count: int, seed: int, records: int) -> Iterator[tuple[str, list[str], str]]:
    """Yield kind, damage and outcome of so many mutants; raise FaultError at the first that is wrong."""
    random, sounds = np.random.default_rng(seed), {}
    with tempfile.TemporaryDirectory() as folder:
        for place in range(count):
            name = list(CASES)[place % len(CASES)]
            if place % (4 * len(CASES)) < len(CASES):
                sounds[name] = make(name, random, int(random.integers(1, records)))
            sound = sounds[name]
            content, ways = mutant(sound, random)
            try:
                outcome, _ = judge(content, sound, Path(folder))
            except Exception as error:
                kept = Path(tempfile.gettempdir()) / "mutant"
                kept.write_bytes(content)
                raise FaultError(
                    f"mutant {place} of seed {seed}, {name}, {' + '.join(ways)}, kept as {kept}: {error!r}"
                ) from error
            yield name, ways, outcome


def account(seed: int, records: int) -> None:
    """Print the rows of a long file of each kind in which one line in a hundred is damaged, by both readers."""
    random = np.random.default_rng(seed)
    width = max(len(name) for name in CASES) + 2
    print(
        f"{'kind of file':<{width}}"
        + "".join(f"{head:>14}" for head in ("megabytes", "rows read", "kept", "quarantined"))
    )
    with tempfile.TemporaryDirectory() as folder:
        for name in CASES:
            sound = make(name, random, records)
            content = sound.content
            for _ in range(content.count(b"\n") // 100):
                content = MUTATIONS[random.choice(ON_A_LINE)](content, random)
            packed = sound.kind.packed(content) if sound.kind.packed else content
            _, found = judge(packed, sound, Path(folder))
            if found is None:
                print(f"{name:<{width}}{'its header was damaged':>56}")
                continue
            cells = (f"{len(packed) / 1e6:.2f}", found.lines, found.lines - len(found.lost), len(found.lost))
            print(f"{name:<{width}}" + "".join(f"{text:>14}" for text in cells))
    print("both readers agree on every line and value")


ON_A_LINE = (
    "columns swapped in a line", "1e999", "--3", "a date that does not exist", "a leap second", "a line cut", "NUL",
    "a line garbled", "a line doubled", "quotes", "delimiters", "digits", "a character lost",
)  # fmt: skip
OUTCOMES = ("kept whole", "quarantined", "told")


def table(title: str, counts: dict[str, Counter[str]]) -> None:
    """Print outcomes by kind or by damage."""
    width = max(len(name) for name in counts) + 2
    print(f"\n{title:<{width}}" + "".join(f"{outcome:>14}" for outcome in (*OUTCOMES, "together")))
    for name, count in counts.items():
        print(f"{name:<{width}}" + "".join(f"{count[outcome]:>14}" for outcome in OUTCOMES) + f"{count.total():>14}")


def main() -> int:
    """Run and print."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--mutants", type=int, default=100_000)
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--records", type=int, default=40, help="at most, of a sound file")
    parser.add_argument(
        "--account", action="store_true", help="print the rows of long damaged files of each kind instead"
    )
    arguments = parser.parse_args()
    if arguments.account:
        account(arguments.seed, 100 * arguments.records)
        return 0
    by_kind: dict[str, Counter[str]] = {name: Counter() for name in CASES}
    by_damage: dict[str, Counter[str]] = {name: Counter() for name in MUTATIONS}
    start = time.perf_counter()
    try:
        faulthandler.dump_traceback_later(LONGEST_WAIT, exit=True)
        for name, ways, outcome in trials(arguments.mutants, arguments.seed, arguments.records):
            faulthandler.dump_traceback_later(LONGEST_WAIT, exit=True)
            by_kind[name][outcome] += 1
            for way in set(ways):
                by_damage[way][outcome] += 1
    except FaultError as fault:
        print(fault, file=sys.stderr)
        return 1
    table("kind of file", by_kind)
    table("damage", by_damage)
    total = sum((count for count in by_kind.values()), Counter()).total()
    print(f"\n{total} mutants in {time.perf_counter() - start:.0f} s, seed {arguments.seed}: every line accounted for, "
          "every kept value as the independent reader has it, no other exception")  # fmt: skip
    return 0


if __name__ == "__main__":
    raise SystemExit(main())
