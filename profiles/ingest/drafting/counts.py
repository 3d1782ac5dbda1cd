"""Layouts of files with a profile per record: a line that counts, then as many lines of depth and reading."""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from profiles.ingest.drafting.content import Column, is_number, share_of, sort_of
from profiles.ingest.drafting.cutting import Cutting
from profiles.ingest.drafting.depth_names import plausible
from profiles.ingest.drafting.doubts import Doubt
from profiles.ingest.drafting.meaning import depth_units_in
from profiles.ingest.drafting.proposal import Proposal, Use, meaning, text_keys
from profiles.ingest.drafting.readings import reading_settings
from profiles.ingest.drafting.sample import Line, Sample
from profiles.ingest.drafting.table import comment_mark
from profiles.ingest.drafting.time_columns import TimeGuess, time_guesses
from profiles.ingest.drafting.words import depth_units, roles_of, temperature_worth

_FIRST_LINES = 60  # among which the first profile begins (ours)
_ALIKE = 0.3  # share of the lines that count which may look like readings (ours)
_COVERED = 0.8  # share of the lines that the profiles must make up

Row = list[str]


@dataclass(frozen=True)
class Walk:
    """Where profiles begin, and which cell of their first lines counts the others."""

    heads: tuple[int, ...]
    count: int
    covered: float


@dataclass(frozen=True)
class Profiles:
    """A file of profiles: its lines without comments, their cells, and which of them begin a profile."""

    cutting: Cutting
    comment: str
    comments: tuple[Line, ...]
    lines: tuple[Line, ...]
    rows: tuple[Row, ...]
    walk: Walk
    is_whole: bool

    @property
    def header(self) -> tuple[Line, ...]:
        """Lines before the first profile."""
        return self.lines[: self.walk.heads[0]]

    @property
    def records(self) -> list[Row]:
        """Cells of the lines that begin a profile."""
        return [self.rows[head] for head in self.walk.heads]

    @property
    def spans(self) -> list[tuple[int, int]]:
        """Where the readings of each profile start and stop."""
        return _profiles(self.walk, len(self.rows), self.is_whole)


def counted_proposals(sample: Sample, cutting: Cutting) -> list[Proposal]:
    """Return layouts with a profile per record, if lines count those that follow."""
    if cutting.fixed:
        return []
    comment = comment_mark(sample.head, cutting)
    is_comment = [bool(comment) and line.text.lstrip().startswith(comment) for line in sample.head]
    lines = tuple(line for line, each in zip(sample.head, is_comment, strict=True) if not each)
    comments = tuple(line for line, each in zip(sample.head, is_comment, strict=True) if each)
    rows = tuple(cutting.cut([line.text for line in lines]))
    walk = best_walk(rows, cutting.decimal, is_whole=not sample.tail)
    if walk is None:
        return []
    proposal = _proposal(sample, Profiles(cutting, comment, comments, lines, rows, walk, not sample.tail))
    return [proposal] if proposal is not None else []


# --------------------------------------------------------------------------------------------------------------
# Lines that count


def best_walk(rows: Sequence[Row], decimal: str, *, is_whole: bool) -> Walk | None:
    """Return where profiles begin; None where no cell counts the lines that follow.

    ``is_whole`` says that the rows end where the file does.
    """
    walks = [
        walk
        for start in range(min(_FIRST_LINES, len(rows)))
        for cell in range(min(len(rows[start]), 24))
        if (walk := _walk(rows, start, cell)) is not None and _is_sound(rows, walk, decimal, is_whole)
    ]
    return max(walks, key=lambda walk: (round(walk.covered, 2), len(walk.heads)), default=None)


def _walk(rows: Sequence[Row], start: int, cell: int) -> Walk | None:
    width = len(rows[start])
    heads: list[int] = []
    place, lost = start, 0
    while place < len(rows):
        count = _count(rows[place], cell, width)
        if count is None or _is_broken(rows, place, count, cell, width):
            if len(heads) < 3:
                return None
            lost, place = lost + 1, place + 1
            continue
        heads.append(place)
        place += count + 1
    return Walk(tuple(heads), cell, 1.0 - lost / max(len(rows) - start, 1)) if heads else None


def _count(row: Row, cell: int, width: int) -> int | None:
    return int(row[cell]) if len(row) == width and re.fullmatch(r"[0-9]{1,5}", row[cell]) else None


def _is_broken(rows: Sequence[Row], place: int, count: int, cell: int, width: int) -> bool:
    """Tell whether behind a profile no other begins."""
    following = place + count + 1
    return following < len(rows) and _count(rows[following], cell, width) is None


def _is_sound(rows: Sequence[Row], walk: Walk, decimal: str, is_whole: bool) -> bool:
    if walk.covered < _COVERED or (len(walk.heads) < 2 and not _is_one_profile(rows, walk, is_whole)):
        return False
    heads = set(walk.heads)
    readings = [row for place, row in enumerate(rows) if place not in heads and place > walk.heads[0]]
    profiles = _profiles(walk, len(rows), is_whole)
    sizes = [stop - start for start, stop in profiles]
    if not readings or max(sizes, default=0) < 2 or len(readings) < len(walk.heads):
        return False
    width, agreeing = Counter(map(len, readings)).most_common(1)[0]
    if width < 2 or agreeing < 0.9 * len(readings):
        return False
    form = Counter(_form(row, decimal) for row in readings[:300]).most_common(1)[0][0]
    alike = sum(_form(rows[head], decimal) == form for head in walk.heads)
    if alike > _ALIKE * len(walk.heads) or "stamp" in form:
        return False  # the rows of a table, one of whose whole numbers happens to count
    numeric = share_of([cell for row in readings[:300] for cell in row], decimal, ("number", "missing"))
    return numeric > 0.8 and _depth_cell(rows, profiles, width, decimal) is not None


def _is_one_profile(rows: Sequence[Row], walk: Walk, is_whole: bool) -> bool:
    """Tell whether a file has one profile, of exactly the lines that it counts."""
    count = int(rows[walk.heads[0]][walk.count])
    return is_whole and count > 2 and walk.heads[0] + count + 1 == len(rows)


def _form(row: Row, decimal: str) -> tuple[str, ...]:
    """Return what the cells of a row are: whole numbers, other numbers, stamps, words."""
    return tuple("whole" if cell.isdigit() else sort_of(cell, decimal) for cell in row)


def _profiles(walk: Walk, length: int, is_whole: bool) -> list[tuple[int, int]]:
    """Return where the readings of each profile start and stop; one that the sample cuts off is left out."""
    stops = [*walk.heads[1:], length]
    spans = [(head + 1, stop) for head, stop in zip(walk.heads, stops, strict=True)]
    return spans if is_whole else spans[:-1]


def _depth_cell(rows: Sequence[Row], profiles: Sequence[tuple[int, int]], width: int, decimal: str) -> int | None:
    """Return which cell of the readings rises or falls down each profile, the same numbers coming again."""
    best: tuple[float, int] | None = None
    for cell in range(width):
        numbers = [
            [
                float(row[cell].replace(decimal, "."))
                for row in rows[start:stop]
                if len(row) == width and is_number(row[cell], decimal)
            ]
            for start, stop in profiles
        ]
        steps = [np.diff(each) for each in numbers if len(each) > 1]
        if not steps:
            continue
        ordered = np.mean([bool((each > 0).all() or (each < 0).all()) for each in steps])
        together = np.concatenate([np.array(each) for each in numbers])
        repeated = 1.0 - np.unique(together).size / together.size
        counting = all(bool((each == 1).all()) for each in steps) and width > 2
        score = float(ordered) + 0.5 * repeated - 0.05 * cell - 0.8 * counting
        if ordered > 0.8 and (best is None or score > best[0]):
            best = (score, cell)
    return best[1] if best is not None else None


# --------------------------------------------------------------------------------------------------------------
# The layout


@dataclass(frozen=True)
class Readings:
    """The lines of readings: names and columns of their cells, and which are depth and temperature."""

    names: list[str]
    columns: list[Column]
    depth: int
    temperature: int


def _proposal(sample: Sample, profiles: Profiles) -> Proposal | None:
    count = profiles.walk.count
    hints = "\n".join([*(line.text for line in (*profiles.comments, *profiles.header)), sample.path.name])
    guesses = time_guesses(columns_of(profiles.records, profiles.cutting.decimal), hints)
    time = next((guess for guess in guesses if count not in guess.places), None)
    readings = _readings(profiles)
    if time is None or readings is None:
        return None
    names = cell_names(len(profiles.records[0]), time, {count: "count"})
    time_keys, scale, doubts = meaning(time, "", hints, None)
    reading_keys, reading_doubts = reading_settings([readings.columns[readings.temperature]], hints)
    depth_keys, depth_doubts = _depth(readings.columns[readings.depth], readings.names[readings.depth], hints)
    begins = _begins(profiles)
    content = text_keys(sample, profiles.cutting) | ({"comment": profiles.comment} if profiles.comment else {})
    content |= {
        "kind": "counted",
        "header_rows": len(profiles.header),
        "names": readings.names,
        "missing": reading_keys["missing"],
        "record": {"names": names, "count": "count"} | ({"begins": begins} if begins else {}),
        "time": time.named(names) | time_keys,
        "depth": depth_keys,
        "temperature": {"column": readings.names[readings.temperature], "units": reading_keys["units"]} | scale,
    }
    shown = [(line, "comment") for line in profiles.comments] + [(line, "header") for line in profiles.header]
    return Proposal(
        content,
        (*sample.doubts, *doubts, *reading_doubts, *depth_doubts, *_left(readings)),
        _uses(count, time, names, readings),
        tuple(shown),
        profiles.cutting.in_words,
        time.named_rival(names, time_keys),
    )


def _uses(count: int, time: TimeGuess, names: Sequence[str], readings: Readings) -> tuple[Use, ...]:
    return (
        Use(f"lines that begin a profile, cell {count + 1}", "how many readings follow"),
        *(Use(f"lines that begin a profile, cell {place + 1}", f"time ({names[place]})") for place in time.places),
        Use(f"lines of readings, cell {readings.depth + 1}", "depth"),
        Use(f"lines of readings, cell {readings.temperature + 1}", "temperature"),
    )


def columns_of(rows: Sequence[Row], decimal: str) -> list[Column]:
    """Return the cells of rows as columns without names."""
    width = Counter(map(len, rows)).most_common(1)[0][0]
    fitting = [row for row in rows if len(row) == width]
    return [Column(place, "", (), tuple(row[place] for row in fitting), decimal) for place in range(width)]


def cell_names(width: int, time: TimeGuess, others: dict[int, str]) -> list[str]:
    """Return names for the cells of lines that have none."""
    names = [others.get(place, f"cell_{place + 1}") for place in range(width)]
    settings = time.settings
    if "column" in settings:
        names[settings["column"]] = "stamp"
    for name, place in zip(("date", "clock", "half", "more"), settings.get("columns", ()), strict=False):
        names[place] = name
    for part, place in settings.get("parts", {}).items():
        names[place] = part
    return names


def _readings(profiles: Profiles) -> Readings | None:
    """Return the readings, named by a line of the header where one fits; None without depth and temperature."""
    decimal = profiles.cutting.decimal
    inside = [row for start, stop in profiles.spans for row in profiles.rows[start:stop]]
    width = Counter(map(len, inside)).most_common(1)[0][0]
    depth = _depth_cell(profiles.rows, profiles.spans, width, decimal)
    if depth is None:
        return None
    found = next(_headings((*profiles.header, *profiles.comments), width, depth), None) or [""] * width
    fitting = [row for row in inside if len(row) == width]
    columns = [Column(place, found[place], (), tuple(row[place] for row in fitting), decimal) for place in range(width)]
    temperature = _temperature(columns, depth)
    if temperature is None:
        return None
    if all(found) and len(set(found)) == width:
        return Readings(found, columns, depth, temperature)
    names = [f"cell_{place + 1}" for place in range(width)]
    names[depth], names[temperature] = "depth", "temperature"
    return Readings(names, columns, depth, temperature)


def _headings(header: Sequence[Line], width: int, depth: int) -> Iterator[list[str]]:
    for line in header:
        text = re.sub(r"^\w+:\s+", "", line.text.strip(" \t#%!*;/:"))
        for cells in (re.split(r"\s{2,}|[,;\t|]\s*", text), text.split()):
            if len(cells) == width and roles_of(cells[depth]) & {"depth", "pressure"}:
                yield [cell.strip(' "') for cell in cells]


def _temperature(columns: Sequence[Column], depth: int) -> int | None:
    usable = [column for column in columns if column.place != depth and column.is_numeric and plausible([column]) > 0]
    ranked = sorted(usable, key=lambda column: (-temperature_worth(column.name), column.is_whole, column.place))
    return ranked[0].place if ranked else None


def _depth(column: Column, name: str, hints: str) -> tuple[dict[str, Any], list[Doubt]]:
    stated = depth_units(name) or ("dbar" if "pressure" in roles_of(name) else None)
    units = stated or depth_units_in(hints)
    doubts = [] if stated else [Doubt("units of depth", units or "m", "the file does not state them with the readings")]
    keys: dict[str, Any] = {"column": name, "units": units or "m"}
    keys["positive"] = "up" if column.values.size and float(np.median(column.values)) < 0 else "down"
    if keys["positive"] == "up":
        doubts.append(Doubt("sign of depth", "negative is below the surface", "the depths are written with a minus"))
    return keys, doubts


def _left(readings: Readings) -> list[Doubt]:
    used = (readings.depth, readings.temperature)
    left = ", ".join(repr(name) for place, name in enumerate(readings.names) if place not in used)
    why = "of the cells of a reading, depth and temperature are used"
    return [Doubt("columns that are not used", left, why)] if left else []


def common_beginning(texts: Sequence[str]) -> str:
    """Return the letters that all texts begin with."""
    first, last = min(texts), max(texts)
    length = next((place for place, pair in enumerate(zip(first, last, strict=False)) if pair[0] != pair[1]), None)
    return first[:length] if length is not None else first[: min(len(first), len(last))]


def _begins(profiles: Profiles) -> str:
    """Return the word or sign that is the first cell of all records and begins no other line, or an empty text."""
    words = {row[0] for row in profiles.records}
    word = words.pop()
    if words or not re.fullmatch(r"[^\W\d_]{2,}:?|[#%!*>$&@]+", word):
        return ""
    heads = set(profiles.walk.heads)
    others = (line.text for place, line in enumerate(profiles.lines) if place not in heads)
    return "" if any(text.lstrip().startswith(word) for text in others) else word
