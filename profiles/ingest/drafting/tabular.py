"""Layouts of files that are one table: a row per time, or a row per reading."""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from profiles.ingest.drafting.content import Column
from profiles.ingest.drafting.depth_names import NamedDepths, plausible
from profiles.ingest.drafting.doubts import Doubt
from profiles.ingest.drafting.meaning import depth_lists, depth_units_in, depths_by_name, one_depth
from profiles.ingest.drafting.proposal import Proposal, Use, meaning, ranges, text_keys
from profiles.ingest.drafting.readings import flags_of, reading_settings
from profiles.ingest.drafting.sample import Sample
from profiles.ingest.drafting.table import Table, depth_groups, with_names
from profiles.ingest.drafting.time_columns import TimeGuess
from profiles.ingest.drafting.words import aggregation, depth_units, roles_of, temperature_worth
from profiles.ingest.layout.parts import DEPTH_MARK, GREATEST_DEPTH
from profiles.ingest.long import MOST_DEPTHS

_PLAIN_NUMBER = re.compile(r"[-+]?[0-9]+(?:[.,][0-9]+)?")
_RIVAL = 1.5  # less sure than the best, and another reading of the columns is not mentioned (ours)
_AGAIN = 0.7  # different times of a row; with fewer, several readings are of one time (ours)
_LONGEST_MARK, _MOST_MARKS = 8, 12  # characters of a quality mark, and different ones in a column (ours)
_MOST_STATIONS = 50  # of one file (ours)
_FEW_DEPTHS = 60  # different depths of a column; with more they are measured ones, about the sensors' (ours)


@dataclass(frozen=True)
class Found:
    """Sensors of a wide table: depth by place, as written; how the layout says it; units; doubts."""

    depth: Mapping[int, float]
    keys: Mapping[str, Any]
    units: str | None
    doubts: tuple[Doubt, ...] = ()
    needs_names: bool = False  # that differ, so given in the layout


# --------------------------------------------------------------------------------------------------------------
# Wide


def wide_proposals(sample: Sample, table: Table, time: TimeGuess, depths: Sequence[float]) -> list[Proposal]:
    """Return wide layouts, the likeliest first; ``depths`` are what the user says of them."""
    ways = _stated(table, time, depths) if depths else _found(table, time)
    proposals = []
    for place, (worth, sensors) in enumerate(ways[:3]):
        rivals = [other for rest, other in ways[place + 1 :] if other.depth != sensors.depth and rest > worth - _RIVAL]
        proposals.append(_wide(sample, table, time, sensors, rivals[0] if rivals else None))
    return proposals


def sensor_columns(table: Table, time: TimeGuess) -> list[Column]:
    """Return the columns that can be temperatures: those that are called so, else those whose numbers could be."""
    free = [column for column in table.columns if column.place not in time.places]
    numeric = [column for column in free if column.is_numeric and plausible([column]) > 0]
    called = [column for column in numeric if temperature_worth(column.label) > 0]
    if called:
        best = max(temperature_worth(column.label) for column in called)
        return [column for column in called if temperature_worth(column.label) >= best - 0.6] or called
    return [
        column
        for column in numeric
        if temperature_worth(column.label) >= 0 and not _is_counter(column) and "depth" not in roles_of(column.name)
    ]


def _is_counter(column: Column) -> bool:
    steps = np.diff(column.values)
    return (
        column.is_whole and steps.size > 1 and bool((np.median(steps) == steps).mean() > 0.9 and np.median(steps) != 0)
    )


def _stated(table: Table, time: TimeGuess, depths: Sequence[float]) -> list[tuple[float, Found]]:
    columns = sensor_columns(table, time)
    if len(columns) != len(depths):
        return []
    return [(0.0, _in_order(columns, depths, table, "m", ()))]


def _found(table: Table, time: TimeGuess) -> list[tuple[float, Found]]:
    """Return the ways to tell the sensors' depths, with how sure each is; the surer first."""
    ways: list[tuple[float, Found]] = []
    for group in depth_groups(table, time.places):
        if group.worth > -1.0:
            share = len(group.depth) / len(table.columns)
            sure = 3.0 + group.worth + 6.0 * share + (0.5 if group.pattern is not None else 0.0)
            ways.append((1.0 if group.is_numbering else sure, _of_names(table, group)))
    ways += [(2.8, way) for way in _of_header_row(table, time)]
    columns = sensor_columns(table, time)
    ways += [(1.5, way) for way in _of_prose(table, columns)]
    return sorted(ways, key=lambda way: -way[0])


def _of_names(table: Table, group: NamedDepths) -> Found:
    names = [table.names[place] for place in group.depth]
    if group.pattern is not None and _matches_only(table, group):
        return Found(
            group.depth, {"pattern": group.pattern}, group.units, group.doubts, needs_names=_repeat(table, names)
        )
    needs_names = _repeat(table, names)
    return Found(group.depth, {"columns": None}, group.units, group.doubts, needs_names)


def _repeat(table: Table, names: Sequence[str]) -> bool:
    return any(table.names.count(name) > 1 for name in names)


def _matches_only(table: Table, group: NamedDepths) -> bool:
    """Tell whether the pattern fits these columns and no others."""
    before, after = (group.pattern or DEPTH_MARK).split(DEPTH_MARK)
    fitting = re.compile(re.escape(before) + r"[+-]?[0-9]+(?:[.,][0-9]+)?" + re.escape(after))
    return {place for place, name in enumerate(table.names) if fitting.fullmatch(name)} == set(group.depth)


def _of_header_row(table: Table, time: TimeGuess) -> Iterator[Found]:
    """Yield the depths that stand in a row of the header above their columns."""
    width = len(table.names)
    for row in range(len(table.columns[0].notes) if table.columns else 0):
        cells = [column.notes[row] for column in table.columns]
        numbers = {
            place: float(match[1].replace(",", "."))
            for place, cell in enumerate(cells)
            if place not in time.places
            and (match := re.fullmatch(r"([-+]?[0-9]+(?:[.,][0-9]+)?)\s*(?:m|metres?|meters?|dbar)?", cell))
        }
        numeric = {column.place for column in table.columns if column.is_numeric or column.is_empty}
        if len(numbers) < 2 or not set(numbers) <= numeric or len(set(numbers.values())) < len(numbers):
            continue
        if (
            not (min(numbers.values()) >= 0 or max(numbers.values()) <= 0)
            or max(map(abs, numbers.values())) > GREATEST_DEPTH
        ):
            continue
        chosen = [table.columns[place] for place in numbers]
        if plausible(chosen) < 0:
            continue
        units = next((unit for cell in cells if (unit := depth_units(cell)) is not None), None)
        line = _header_line(table, cells)
        plain = all(_PLAIN_NUMBER.fullmatch(cells[place]) for place in numbers)
        if plain and line and len(cells) == width:
            yield Found(numbers, {"row": line}, units)
        else:
            yield _in_order(chosen, list(numbers.values()), table, units, ())


def _header_line(table: Table, cells: Sequence[str]) -> int:
    cut = table.cutting.cut([line.text for line in table.header])
    return next((place for place, row in enumerate(cut, 1) if list(row) == list(cells)), 0)


def _of_prose(table: Table, columns: Sequence[Column]) -> Iterator[Found]:
    """Yield the depths that lines of the header list, sensor by sensor or in their order."""
    if not columns:
        return
    named = len(columns) > 1 and all(column.name for column in columns)
    by_name = depths_by_name(table.prose, [column.name for column in columns]) if named else {}
    if by_name:
        yield Found({column.place: by_name[column.name] for column in columns}, {"columns": None}, None)
    for numbers, line in depth_lists(table.prose, len(columns)):
        doubt = Doubt(
            "depths",
            "the list " + ", ".join(f"{number:g}" for number in numbers),
            f"it stands in the header, {line.strip()[:80]!r}, and is taken in the order of the columns",
        )
        yield _in_order(columns, numbers, table, depth_units(line), (doubt,))
    single = one_depth([*table.prose]) if len(columns) == 1 else None
    if single is not None:
        doubt = Doubt("depth", f"{single[0]:g} m", f"it is told by this line of the header: {single[1].strip()[:80]!r}")
        yield _in_order(columns, [single[0]], table, None, (doubt,))


def _in_order(
    columns: Sequence[Column], depths: Sequence[float], table: Table, units: str | None, doubts: tuple[Doubt, ...]
) -> Found:
    places = [column.place for column in columns]
    depth = dict(zip(places, depths, strict=True))
    needs_names = _repeat(table, [table.names[place] for place in places])
    if places == list(range(places[0], places[0] + len(places))) and len(places) > 1:
        return Found(depth, {"values": list(depths), "first": None}, units, doubts, needs_names)
    return Found(depth, {"columns": None}, units, doubts, needs_names)


def _wide(sample: Sample, table: Table, time: TimeGuess, sensors: Found, rival: Found | None) -> Proposal:
    if sensors.needs_names or _repeat(table, [table.names[place] for place in time.places]):
        table = with_names(table)
    columns = [table.columns[place] for place in sensors.depth]
    how = next((each for column in columns if (each := aggregation(" ".join((*column.notes, column.name))))), None)
    time_keys, temperature, doubts = meaning(time, _near(table, time), table.hints, how)
    readings, reading_doubts = reading_settings(columns, table.hints)
    depth, depth_doubts = _depth_keys(sensors, table, columns)
    quality, mark_places, mark_doubts = _wide_quality(table, sensors)
    doubts += [*sensors.doubts, *depth_doubts, *reading_doubts, *mark_doubts]
    if rival is not None:
        doubts.append(_rivalry(table, sensors, rival))
    content = _table_keys(sample, table) | {"kind": "wide", "missing": readings["missing"]}
    content |= {
        "time": time.named(table.names) | time_keys,
        "depth": depth,
        "temperature": {"units": readings["units"]} | temperature,
        **quality,
    }
    return Proposal(
        content,
        (*sample.doubts, *doubts, *_unused(table, {*time.places, *sensors.depth, *mark_places})),
        _uses(table, time, sensors, mark_places),
        _header(table),
        table.cutting.in_words,
        time.named_rival(table.names, time_keys),
    )


def _table_keys(sample: Sample, table: Table) -> dict[str, Any]:
    keys = text_keys(sample, table.cutting)
    if table.cutting.fixed:
        keys["fixed"] = dict(zip(table.names, map(list, table.cutting.fixed), strict=True))
        if table.cutting.trimmed:
            keys["trimmed"] = True
    if table.comment:
        keys["comment"] = table.comment
    keys["header_rows"] = len(table.header)
    if table.names_row:
        keys["names_row"] = table.names_row
    elif not table.cutting.fixed:
        keys["names"] = list(table.names)
    if table.ends_with_delimiter:
        keys["ends_with_delimiter"] = True
    return keys


def _depth_keys(sensors: Found, table: Table, columns: Sequence[Column]) -> tuple[dict[str, Any], list[Doubt]]:
    keys = dict(sensors.keys)
    if "columns" in keys:
        keys["columns"] = {table.names[place]: depth for place, depth in sensors.depth.items()}
    if "first" in keys:
        keys["first"] = table.names[min(sensors.depth)]
    keys["units"], doubts = _depth_units(sensors.units, [column.label for column in columns], table.hints)
    keys["positive"], sign = _sign(list(sensors.depth.values()))
    return keys, doubts + sign


def _depth_units(stated: str | None, labels: Sequence[str], hints: str) -> tuple[str, list[Doubt]]:
    """Return the units of depth, and what is unsure about them."""
    if stated is not None:
        return stated, []
    words = set().union(*(roles_of(label) for label in labels)) if labels else set()
    pressure = "pressure" in words
    said = depth_units_in(hints)
    if said is not None:
        return said, [Doubt("units of depth", said, "they are told by a line of the header")]
    units = "dbar" if pressure and "depth" not in words else "m"
    other = "pressure in dbar" if pressure and units == "m" else ""
    return units, [Doubt("units of depth", units, "the file does not state them", other)]


def _sign(depths: Sequence[float]) -> tuple[str, list[Doubt]]:
    if min(depths) < 0:
        return "up", [Doubt("sign of depth", "negative is below the surface", "the depths are written with a minus")]
    return "down", []


def _rivalry(table: Table, sensors: Found, rival: Found) -> Doubt:
    one, two = (f"{table.names[min(each.depth)]!r} and {len(each.depth) - 1} more" for each in (sensors, rival))
    depths = ", ".join(f"{depth:g}" for depth in list(rival.depth.values())[:4])
    return Doubt(
        "which columns are temperatures, and how deep", one, "others could be meant", f"{two}, at {depths} ..."
    )


# --------------------------------------------------------------------------------------------------------------
# Quality marks of a wide table


def _wide_quality(table: Table, sensors: Found) -> tuple[dict[str, Any], list[int], list[Doubt]]:
    """Return [quality] if there are marks, the columns it uses, and the doubt about them."""
    marked = [
        column for column in table.columns if "quality" in roles_of(column.name) and column.place not in sensors.depth
    ]
    if len(marked) == 1 and len(sensors.depth) > 1:
        return _glued(marked[0], len(sensors.depth))
    by_depth = _marks_by_depth(marked, sensors)
    if by_depth is None and len(marked) == len(sensors.depth):
        by_depth = dict(zip(sensors.depth, marked, strict=True))
    chosen = list(by_depth.values()) if by_depth is not None else []
    longest = max((len(text) for column in chosen for text in column.texts), default=_LONGEST_MARK + 1)
    if by_depth is None or longest > _LONGEST_MARK or _repeat(table, [each.name for each in chosen]):
        return {}, [], []
    flags, doubt = flags_of({text for column in chosen for text in column.texts})
    pattern = _quality_pattern(table, sensors, by_depth)
    names = {table.names[place]: column.name for place, column in by_depth.items()}
    keys: dict[str, Any] = {"pattern": pattern} if pattern is not None else {"columns": names}
    return {"quality": keys | {"flags": flags}}, [column.place for column in chosen], [doubt]


def _glued(column: Column, sensors: int) -> tuple[dict[str, Any], list[int], list[Doubt]]:
    fitting = [text for text in column.texts if len(text) == sensors]
    if len(fitting) < 0.9 * len(column.texts):
        return {}, [], []
    flags, doubt = flags_of(set("".join(fitting)))
    return {"quality": {"column": column.name, "flags": flags}}, [column.place], [doubt]


def _marks_by_depth(marked: Sequence[Column], sensors: Found) -> dict[int, Column] | None:
    """Return the column of marks by the place of each sensor, where the names have the depth in them."""
    found: dict[int, Column] = {}
    for place, depth in sensors.depth.items():
        fitting = [
            column
            for column in marked
            if depth in {float(text.replace(",", ".")) for text in re.findall(r"[0-9]+(?:[.,][0-9]+)?", column.name)}
        ]
        if len(fitting) != 1:
            return None
        found[place] = fitting[0]
    return found


def _quality_pattern(table: Table, sensors: Found, by_depth: Mapping[int, Column]) -> str | None:
    """Return the one pattern that fits the names of all columns of marks and no others."""
    patterns: set[str] = set()
    for place, column in by_depth.items():
        match = next(
            (
                each
                for each in re.finditer(r"[0-9]+(?:[.,][0-9]+)?", column.name)
                if float(each.group().replace(",", ".")) == sensors.depth[place]
            ),
            None,
        )
        if match is None:
            return None
        patterns.add(column.name[: match.start()] + DEPTH_MARK + column.name[match.end() :])
    group = NamedDepths({column.place: 0.0 for column in by_depth.values()}, next(iter(patterns)), "", None, 0.0)
    usable = len(patterns) == 1 and next(iter(patterns)).count("{") == 1 and _matches_only(table, group)
    return patterns.pop() if usable else None


# --------------------------------------------------------------------------------------------------------------
# Long


def long_proposals(sample: Sample, table: Table, time: TimeGuess) -> list[Proposal]:
    """Return the layout with a row per reading, if the table has columns for it."""
    if _repeat(table, table.names):
        table = with_names(table)
    free = [column for column in table.columns if column.place not in time.places and column.is_numeric]
    valid = time.clock[~np.isnat(time.clock)]
    depth = _depth_column(free, comes_again=np.unique(valid).size < _AGAIN * valid.size)
    temperatures = [
        column
        for column in free
        if column is not depth and plausible([column]) > 0 and "depth" not in roles_of(column.name)
    ]
    if depth is None or not temperatures:
        return []
    ranked = sorted(temperatures, key=lambda column: -_reading_worth(column))
    rivals = [column for column in ranked[1:] if _reading_worth(column) >= 0]
    return [_long(sample, table, time, depth, ranked[0], rivals)]


def _reading_worth(column: Column) -> float:
    worth = temperature_worth(column.label)
    repeated = 1.0 - np.unique(column.values).size / max(column.values.size, 1)
    return worth - (1.0 if _is_counter(column) or repeated > 0.99 else 0.0) - (0.5 if column.is_whole else 0.0)


def _depth_column(columns: Sequence[Column], *, comes_again: bool) -> Column | None:
    """Return the column of depths: called so, or where times come again one with few different numbers."""
    least = 0.0 if comes_again else 1.0
    scored = [(score, column) for column in columns if (score := _depth_worth(column)) > least]
    return max(scored, key=lambda each: each[0])[1] if scored else None


def _depth_worth(column: Column) -> float:
    values = column.values[np.abs(column.values) < GREATEST_DEPTH]
    if not values.size or not (np.mean(values >= -1.0) > 0.97 or np.mean(values <= 1.0) > 0.97):
        return 0.0
    roles = roles_of(column.name)
    distinct = np.unique(values).size
    worth = 3.0 * ("depth" in roles) + 2.0 * ("pressure" in roles)
    worth -= 2.5 * (temperature_worth(column.label) > 0) + 3.0 * bool(roles & {"quality", "spread", "other", "counter"})
    if 1 < distinct <= max(_FEW_DEPTHS, 2) and distinct <= 0.6 * values.size and not _is_counter(column):
        worth += 0.8
    return worth if distinct > 1 else worth - 2.0


def _long(
    sample: Sample, table: Table, time: TimeGuess, depth: Column, temperature: Column, rivals: Sequence[Column]
) -> Proposal:
    used = dict.fromkeys(time.places, "time") | {depth.place: "depth", temperature.place: "temperature"}
    time_keys, scale, doubts = meaning(time, _near(table, time), table.hints, aggregation(temperature.label))
    readings, reading_doubts = reading_settings([temperature], table.hints)
    depth_keys, depth_doubts = _column_depth(depth, table)
    quality, mark_doubts = _long_quality(table, used, temperature)
    station, station_doubts = _station(table, used)
    doubts += [*reading_doubts, *depth_doubts]
    if rivals:
        others = ", ".join(repr(table.names[column.place]) for column in rivals[:3])
        named = repr(table.names[temperature.place])
        doubts.append(Doubt("column of the temperature", named, "others could be meant", others))
    content = _table_keys(sample, table) | {"kind": "long", "missing": readings["missing"], **station}
    content |= {
        "time": time.named(table.names) | time_keys,
        "depth": depth_keys,
        "temperature": {"column": table.names[temperature.place], "units": readings["units"]} | scale,
        **quality,
    }
    return Proposal(
        content,
        (*sample.doubts, *doubts, *mark_doubts, *station_doubts, *_unused(table, set(used))),
        tuple(Use(f"{place + 1} {table.names[place]!r}", use) for place, use in sorted(used.items())),
        _header(table),
        table.cutting.in_words,
        time.named_rival(table.names, time_keys),
    )


def _near(table: Table, time: TimeGuess) -> str:
    """Return names and units of the columns of the stamp."""
    return "\n".join(table.columns[place].label for place in time.places)


def _column_depth(depth: Column, table: Table) -> tuple[dict[str, Any], list[Doubt]]:
    keys: dict[str, Any] = {"column": table.names[depth.place]}
    stated = next((unit for text in (*depth.notes, depth.name) if (unit := depth_units(text)) is not None), None)
    keys["units"], doubts = _depth_units(stated, [depth.label], table.hints)
    values = depth.values[np.abs(depth.values) < GREATEST_DEPTH]
    keys["positive"], sign = _sign([float(np.median(values))] if values.size else [0.0])
    distinct = np.unique(values)
    if distinct.size > _FEW_DEPTHS:
        sensors, tolerance = clusters(values)
        if sensors:
            keys["values"], keys["tolerance"] = sensors, tolerance
            doubts.append(
                Doubt(
                    "depths of the sensors",
                    ", ".join(f"{each:g}" for each in sensors),
                    f"the column has {distinct.size} different depths; these are what they gather about",
                )
            )
        elif distinct.size > MOST_DEPTHS:
            doubts.append(Doubt("depths of the sensors", "unknown", "there are more depths than a mooring has sensors"))
    return keys, doubts + sign


def clusters(depths: np.ndarray[Any, np.dtype[np.float64]]) -> tuple[list[float], float]:
    """Return the depths about which many gather, and how far those are that belong to them; none where they do not."""
    ordered = np.unique(depths)
    gaps = np.diff(ordered)
    wide = float(np.ptp(ordered)) / 100.0
    cuts = np.flatnonzero(gaps > max(wide, 5.0 * float(np.median(gaps))))
    groups = np.split(ordered, cuts + 1)
    if not 1 < len(groups) <= _FEW_DEPTHS:
        return [], 0.0
    middles = [float(np.round(np.median(group), 1)) for group in groups]
    reach = max(float(np.abs(group - middle).max()) for group, middle in zip(groups, middles, strict=True))
    tolerance = float(np.ceil(reach * 10.0) / 10.0)
    apart = float(np.diff(middles).min())
    return (middles, tolerance) if 2.0 * tolerance < apart else ([], 0.0)


def _long_quality(table: Table, used: dict[int, str], temperature: Column) -> tuple[dict[str, Any], list[Doubt]]:
    """Return [quality] if there is a column of marks, noting its use."""
    marked = [
        column
        for column in table.columns
        if column.place not in used
        and "quality" in roles_of(column.name)
        and max(map(len, column.texts)) <= _LONGEST_MARK
        and len(set(column.texts)) <= _MOST_MARKS
    ]
    named = [column for column in marked if temperature.name.casefold() in column.name.casefold()]
    behind = [column for column in marked if column.place == temperature.place + 1]
    column = next(iter([*named, *behind, *(marked if len(marked) == 1 else [])]), None)
    if column is None:
        return {}, []
    used[column.place] = "quality marks"
    flags, doubt = flags_of(set(column.texts))
    return {"quality": {"column": column.name, "flags": flags}}, [doubt]


def _station(table: Table, used: dict[int, str]) -> tuple[dict[str, Any], list[Doubt]]:
    """Return the key for the column of stations if there is one, noting its use."""
    for column in table.columns:
        stations = len(set(column.texts))
        if column.place not in used and "station" in roles_of(column.name) and stations <= _MOST_STATIONS:
            used[column.place] = "station"
            why = f"{stations} stations are in one file; the one with most rows is read, the others go to quarantine"
            return {"station": column.name}, [Doubt("station", repr(column.name), why)] if stations > 1 else []
    return {}, []


# --------------------------------------------------------------------------------------------------------------
# In words


def _uses(table: Table, time: TimeGuess, sensors: Found, quality: Sequence[int]) -> tuple[Use, ...]:
    names = table.names
    uses = [Use(f"{place + 1} {names[place]!r}", "time") for place in time.places]
    ordered = sorted(sensors.depth)
    depths = ", ".join(f"{sensors.depth[place]:g}" for place in ordered)
    uses.append(Use(f"{ranges(ordered)} {names[ordered[0]]!r} ...", f"temperature at {depths}"))
    if quality:
        uses.append(Use(f"{ranges(quality)} {names[min(quality)]!r}", "quality marks"))
    return tuple(uses)


def _unused(table: Table, used: set[int]) -> list[Doubt]:
    """Return doubts about the columns that are left, those apart that are called temperatures."""
    left = [column for column in table.columns if column.place not in used]
    best = max((temperature_worth(table.columns[place].label) for place in used), default=0.0)
    like = [
        column
        for column in left
        if column.is_numeric and plausible([column]) > 0 and temperature_worth(column.label) >= max(best - 0.6, 1.0)
    ]
    rest = [column for column in left if column not in like]
    doubts = []
    if like:
        what = "they are called temperatures without a depth; if they are of the chain, name them in [depth] columns"
        doubts.append(Doubt("temperatures that are not used", _listed(table, like), what))
    if rest:
        what = "they seem to be neither time, depth, temperature nor marks"
        doubts.append(Doubt("columns that are not used", _listed(table, rest), what))
    return doubts


def _listed(table: Table, columns: Sequence[Column]) -> str:
    shown = ", ".join(repr(table.names[column.place]) for column in columns[:8])
    return shown + (f" and {len(columns) - 8} more" if len(columns) > 8 else "")


def _header(table: Table) -> tuple[tuple[Any, str], ...]:
    lines = [(line, "comment") for line in table.comments]
    for place, line in enumerate(table.header, 1):
        lines.append((line, "names of the columns" if place == table.names_row else "header"))
    return tuple(sorted(lines, key=lambda each: each[0].number))
