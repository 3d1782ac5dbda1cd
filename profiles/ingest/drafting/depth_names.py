"""Depths that stand in the names of columns: which part of the names is the depth, and how it is written."""

from __future__ import annotations

import re
from collections import defaultdict
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field

import numpy as np

from profiles.ingest.drafting.content import Column
from profiles.ingest.drafting.doubts import Doubt
from profiles.ingest.drafting.time_forms import formats_of
from profiles.ingest.drafting.words import depth_units, temperature_worth, words_of
from profiles.ingest.layout.parts import DEPTH_MARK, GREATEST_DEPTH

_NUMBER = re.compile(r"[0-9]+(?:[.,][0-9]+)?")
_SIGN_BEFORE = re.compile(r"(?:^|[\s_(\[@=:,;/])[-+]$")
_BROKEN = re.compile(r"([0-9]+)[_p]([0-9]{1,2})(?![0-9])")
_WITH_UNIT = re.compile(
    r"(?<![0-9.,A-Za-z])([-+]?[0-9]+(?:[.,][0-9]+)?)\s*(m|metres?|meters?|cm|ft|feet|dbar|db)(?![A-Za-z0-9])",
    re.IGNORECASE,
)
_AFTER_SENSOR = re.compile(
    r"([-+]?[0-9]+(?:[.,][0-9]+)?)\s*(m|metres?|meters?|cm|ft|feet|dbar|db)(?![A-Za-z0-9])", re.IGNORECASE
)
WORTH_OF_PATTERN = 1.0
_UNORDERED = {True: 0.5, False: 2.5}  # what depths that go up and down cost, with and without a word in the names


@dataclass(frozen=True)
class NamedDepths:
    """Columns whose names give their depths.

    Attributes
    ----------
    depth : dict
        As written, by the place of the column.
    pattern : str, optional
        The names with ``{depth}`` for the number; None where they have none in common.
    label : str
        How such names read, for people.
    units : str, optional
        As the names say.
    worth : float
        How much the names speak for temperatures, see :func:`temperature_worth`; the greatest is the best.
    doubts : tuple of Doubt
    is_numbering : bool
        Whether the numbers could as well be those of the sensors.
    """

    depth: dict[int, float]
    pattern: str | None
    label: str
    units: str | None
    worth: float
    doubts: tuple[Doubt, ...] = field(default=())
    is_numbering: bool = False


def named_depths(columns: Sequence[Column]) -> list[NamedDepths]:
    """Return the groups of numeric columns whose names differ in a depth, the best first."""
    candidates = [
        column for column in columns if (column.is_numeric or column.is_empty) and not formats_of(column.name)
    ]
    found = [*_by_pattern(candidates), *_by_unit(candidates), *_broken(candidates)]
    usable = [group for group in found if _are_depths(group.depth)]
    return sorted(usable, key=lambda group: -_score(group, candidates))


def _score(group: NamedDepths, columns: Sequence[Column]) -> float:
    return (
        group.worth + 6.0 * len(group.depth) / len(columns) + (WORTH_OF_PATTERN if group.pattern is not None else 0.0)
    )


def _are_depths(depth: dict[int, float]) -> bool:
    numbers = np.array(list(depth.values()))
    one_sided = bool((numbers >= 0).all() or (numbers <= 0).all())
    return one_sided and len(set(numbers.tolist())) == numbers.size and float(np.abs(numbers).max()) <= GREATEST_DEPTH


def is_monotone(numbers: Sequence[float]) -> bool:
    """Tell whether numbers rise or fall all the way."""
    steps = np.diff(numbers)
    return bool((steps > 0).all() or (steps < 0).all())


# --------------------------------------------------------------------------------------------------------------
# One pattern for all names


def _templates(name: str) -> Iterator[tuple[str, str, float]]:
    """Yield what stands before and behind each number of a name, and the number."""
    for match in _NUMBER.finditer(name):
        start, text = match.start(), match.group()
        if _SIGN_BEFORE.search(name[:start]):
            start, text = start - 1, name[start - 1 : match.end()]
        yield name[:start], name[match.end() :], float(text.replace(",", "."))


def _by_pattern(columns: Sequence[Column]) -> Iterator[NamedDepths]:
    groups: dict[tuple[str, str], dict[int, float]] = defaultdict(dict)
    for column in columns:
        for before, after, number in _templates(column.name):
            groups[before, after][column.place] = number
    notes = {column.place: " ".join(column.notes) for column in columns}
    by_place = {column.place: column for column in columns}
    for (before, after), depth in groups.items():
        pattern = before + DEPTH_MARK + after
        if pattern.count("{") > 1 or (len(depth) < 2 and not _unit_behind(after)):
            continue
        units = _unit_behind(after) or depth_units(before)
        label = f"{before}{min(depth.values()):g}{after}"
        worth = _worth(before, after, [notes[place] for place in depth], [by_place[place] for place in depth])
        ordered = is_monotone([depth[place] for place in sorted(depth)])
        worth -= 0.0 if ordered else _UNORDERED[bool(words_of(before + after))]
        doubts = tuple(_numbered(depth, units, pattern))
        yield NamedDepths(depth, pattern, label, units, worth, doubts, bool(doubts))


def _unit_behind(after: str) -> str | None:
    match = re.match(r"\s*(m|metres?|meters?|cm|ft|feet|dbar|db)(?![A-Za-z])", after, re.IGNORECASE)
    return depth_units(match.group(1)) if match is not None else None


def _worth(before: str, after: str, notes: Sequence[str], columns: Sequence[Column]) -> float:
    rest = re.sub(r"^\s*(m|metres?|meters?|cm|ft|feet|dbar|db)(?![A-Za-z])", " ", after, flags=re.IGNORECASE)
    worth = temperature_worth(f"{before} {rest}")
    worth += 0.5 if _unit_behind(after) else 0.0
    worth += float(np.median([temperature_worth(note) for note in notes])) if any(notes) else 0.0
    return worth + plausible(columns)


def plausible(columns: Sequence[Column]) -> float:
    """Return what the numbers say to their being temperatures: 0.5 where they can be, else -2."""
    medians = [float(np.median(column.values)) for column in columns if column.values.size]
    if not medians:
        return -2.0
    fits = [-3.0 <= value <= 45.0 or 270.0 <= value <= 318.0 or 28.0 <= value <= 115.0 for value in medians]
    return 0.5 if np.mean(fits) >= 0.5 else -2.0


def _numbered(depth: dict[int, float], units: str | None, pattern: str) -> Iterator[Doubt]:
    """Doubt depths that could as well be the numbers of the sensors."""
    numbers = list(depth.values())
    if units is None and len(numbers) > 1 and numbers in (list(range(len(numbers))), list(range(1, len(numbers) + 1))):
        yield Doubt(
            "depths",
            f"the number in {pattern!r}",
            f"{numbers[0]:g}, {numbers[1]:g} ... {numbers[-1]:g} may be the numbers of the sensors and no depths",
            "give the depths with --depths",
        )


# --------------------------------------------------------------------------------------------------------------
# Names that have no pattern in common


def _by_unit(columns: Sequence[Column]) -> Iterator[NamedDepths]:
    """Take the number that stands before a unit of length, in names that differ otherwise too."""
    found: dict[int, tuple[float, str]] = {}
    for column in columns:
        match = _WITH_UNIT.search(column.label) or _AFTER_SENSOR.search(column.label)
        if match is not None and temperature_worth(column.label.replace(match.group(), " ")) >= 0:
            found[column.place] = (float(match.group(1).replace(",", ".")), depth_units(match.group(2)) or "m")
    units = {unit for _, unit in found.values()}
    if found and len(units) == 1:
        chosen = [column for column in columns if column.place in found]
        worth = float(np.median([temperature_worth(column.label) for column in chosen])) + 0.5 + plausible(chosen)
        first = min(found.values())
        depth = {place: number for place, (number, _) in found.items()}
        yield NamedDepths(depth, None, f"{chosen[0].label} ({first[0]:g} {first[1]})", units.pop(), worth)


def _broken(columns: Sequence[Column]) -> Iterator[NamedDepths]:
    """Take names in which an underscore or a p stands for the decimal mark, as in t_0_5m."""
    found: dict[int, float] = {}
    chosen: list[Column] = []
    for column in columns:
        match = _BROKEN.search(column.name)
        if match is not None and words_of(column.name):
            found[column.place] = float(f"{match.group(1)}.{match.group(2)}")
            chosen.append(column)
    steps = np.diff(list(found.values()))
    if len(found) > 2 and (steps > 0).all() and any(number % 1 for number in found.values()):
        worth = float(np.median([temperature_worth(column.label) for column in chosen])) + plausible(chosen)
        doubt = Doubt(
            "depths",
            f"{chosen[0].name} is {found[chosen[0].place]:g}",
            "the decimal mark seems to be a letter or a line",
        )
        yield NamedDepths(found, None, chosen[0].name, depth_units(chosen[0].name), worth, (doubt,))
