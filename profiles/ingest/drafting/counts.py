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
from profiles.ingest.drafting.readings import missing_tokens, units_of
from profiles.ingest.drafting.sample import Line, Sample
from profiles.ingest.drafting.table import comment_mark
from profiles.ingest.drafting.time_columns import TimeGuess, time_guesses
from profiles.ingest.drafting.words import depth_units, roles_of, temperature_worth

_FIRST_LINES = 60  # among which the first profile begins (ours)
_COVERED = 0.8  # share of the lines that the profiles must make up

Row = list[str]


@dataclass(frozen=True)
class Walk:
    """Where profiles begin, and which cell of their first lines counts the others."""

    heads: tuple[int, ...]
    count: int
    covered: float


def counted_proposals(sample: Sample, cutting: Cutting) -> list[Proposal]:
    """Return layouts with a profile per record, if lines count those that follow."""
    if cutting.fixed:
        return []
    comment = comment_mark(sample.head, cutting)
    lines = [line for line in sample.head if not (comment and line.text.lstrip().startswith(comment))]
    comments = [line for line in sample.head if comment and line.text.lstrip().startswith(comment)]
    rows = cutting.cut([line.text for line in lines])
    walk = best_walk(rows, cutting.decimal, is_whole=not sample.tail)
    if walk is None:
        return []
    proposal = _proposal(sample, cutting, comment, lines, comments, rows, walk)
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
    form = _usual_form(readings, decimal)
    if form == _usual_form([rows[head] for head in walk.heads], decimal) or "stamp" in form:
        return False  # the rows of a table, one of whose whole numbers happens to count
    numeric = share_of([cell for row in readings[:300] for cell in row], decimal, ("number", "missing"))
    return numeric > 0.8 and _depth_cell(rows, profiles, width, decimal) is not None


def _is_one_profile(rows: Sequence[Row], walk: Walk, is_whole: bool) -> bool:
    """Tell whether a file has one profile, of exactly the lines that it counts."""
    count = int(rows[walk.heads[0]][walk.count])
    return is_whole and count > 2 and walk.heads[0] + count + 1 == len(rows)


def _usual_form(rows: Sequence[Row], decimal: str) -> tuple[str, ...]:
    """Return what the cells of most rows are: whole numbers, other numbers, stamps, words."""
    forms = Counter(tuple("whole" if cell.isdigit() else sort_of(cell, decimal) for cell in row) for row in rows[:300])
    return forms.most_common(1)[0][0]


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


def _proposal(
    sample: Sample,
    cutting: Cutting,
    comment: str,
    lines: Sequence[Line],
    comments: Sequence[Line],
    rows: Sequence[Row],
    walk: Walk,
) -> Proposal | None:
    header = lines[: walk.heads[0]]
    hints = "\n".join([*(line.text for line in (*comments, *header)), sample.path.name])
    records = columns_of([rows[head] for head in walk.heads], cutting.decimal)
    guesses = [guess for guess in time_guesses(records, hints) if walk.count not in guess.places]
    profiles = _profiles(walk, len(rows), not sample.tail)
    readings, width = _readings(rows, profiles)
    depth = _depth_cell(rows, profiles, width, cutting.decimal)
    if not guesses or depth is None:
        return None
    time = guesses[0]
    names = cell_names(len(rows[walk.heads[0]]), time, {walk.count: "count"})
    reading_names, columns = _reading_columns(readings, width, depth, cutting, [*header, *comments])
    temperature = _temperature(columns, depth)
    if temperature is None:
        return None
    time_keys, scale, doubts = meaning(time, "", hints, None)
    units, unit_doubt = units_of([columns[temperature]], hints)
    missing, missing_doubts = missing_tokens([columns[temperature]], units)
    depth_keys, depth_doubts = _depth(columns[depth], reading_names[depth], hints)
    doubts += [
        *([unit_doubt] if unit_doubt else []),
        *missing_doubts,
        *depth_doubts,
        *_left(reading_names, depth, temperature),
    ]
    record: dict[str, Any] = {"names": names, "count": "count"}
    begins = _begins([rows[head][0] for head in walk.heads])
    if begins and not any(
        text.text.lstrip().startswith(begins) for place, text in enumerate(lines) if place not in set(walk.heads)
    ):
        record["begins"] = begins
    content = text_keys(sample, cutting) | ({"comment": comment} if comment else {})
    content |= {
        "kind": "counted",
        "header_rows": len(header),
        "names": reading_names,
        "missing": missing,
        "record": record,
        "time": time.named(names) | time_keys,
        "depth": depth_keys,
        "temperature": {"column": reading_names[temperature], "units": units} | scale,
    }
    uses = (
        Use(f"lines that begin a profile, cell {walk.count + 1}", "how many readings follow"),
        *(Use(f"lines that begin a profile, cell {place + 1}", f"time ({names[place]})") for place in time.places),
        Use(f"lines of readings, cell {depth + 1}", "depth"),
        Use(f"lines of readings, cell {temperature + 1}", "temperature"),
    )
    shown = [(line, "comment") for line in comments] + [(line, "header") for line in header]
    return Proposal(
        content, (*sample.doubts, *doubts), uses, tuple(shown), cutting.in_words, time.named_rival(names, time_keys)
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


def _readings(rows: Sequence[Row], profiles: Sequence[tuple[int, int]]) -> tuple[list[Row], int]:
    inside = [row for start, stop in profiles for row in rows[start:stop]]
    width = Counter(map(len, inside)).most_common(1)[0][0]
    return [row for row in inside if len(row) == width], width


def _reading_columns(
    readings: Sequence[Row], width: int, depth: int, cutting: Cutting, header: Sequence[Line]
) -> tuple[list[str], list[Column]]:
    """Return names and columns of the readings; the names from a line of the header where one fits."""
    found = next(_headings(header, width, depth), None)
    labels = found if found is not None else [""] * width
    names = [label or f"cell_{place + 1}" for place, label in enumerate(labels)]
    if found is None or len(set(names)) < width:
        names = [f"cell_{place + 1}" for place in range(width)]
    columns = [
        Column(place, names[place], (), tuple(row[place] for row in readings), cutting.decimal)
        for place in range(width)
    ]
    if found is None:
        names[depth] = "depth"
        temperature = _temperature(columns, depth)
        if temperature is not None:
            names[temperature] = "temperature"
    return names, columns


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


def _left(names: Sequence[str], depth: int, temperature: int) -> list[Doubt]:
    left = [repr(name) for place, name in enumerate(names) if place not in (depth, temperature)]
    if len(names) == 2:
        return []
    return [
        Doubt("columns that are not used", ", ".join(left), "of the cells of a reading, depth and temperature are used")
    ]


def common_beginning(texts: Sequence[str]) -> str:
    """Return the letters that all texts begin with."""
    first, last = min(texts), max(texts)
    length = next((place for place, pair in enumerate(zip(first, last, strict=False)) if pair[0] != pair[1]), None)
    return first[:length] if length is not None else first[: min(len(first), len(last))]


def _begins(firsts: Sequence[str]) -> str:
    """Return the word or sign that is the first cell of all records, or an empty text."""
    word = firsts[0]
    return word if set(firsts) == {word} and re.fullmatch(r"[^\W\d_]{2,}:?|[#%!*>$&@]+", word) else ""
