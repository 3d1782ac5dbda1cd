"""What the readings of some columns say of themselves: units, missing tokens, quality marks."""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Iterable, Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

from profiles.ingest.drafting.content import Column, is_missing, to_number
from profiles.ingest.drafting.doubts import Doubt
from profiles.ingest.drafting.words import temperature_units
from profiles.ingest.units import to_celsius

COLDEST, WARMEST = -4.0, 50.0  # °C; beyond is no water (ours), air on deck included
_KELVIN_FROM, _FAHRENHEIT_FROM = 200.0, 45.0  # medians of the readings (ours)
_REPEATED_DIGIT = re.compile(r"-?0*([1-9])[.,]?(?:\1|[.,])*0*")
_LARGE = 1e3  # beyond any temperature in any unit


def reading_settings(columns: Sequence[Column], hints: str) -> tuple[dict[str, Any], list[Doubt]]:
    """Return units and missing tokens of temperatures, and what is unsure about them."""
    units, doubt = units_of(columns, hints)
    missing, doubts = missing_tokens(columns, units)
    return {"units": units, "missing": missing}, [*([doubt] if doubt is not None else []), *doubts]


# --------------------------------------------------------------------------------------------------------------
# Units


def units_of(columns: Sequence[Column], hints: str) -> tuple[str, Doubt | None]:
    """Return the units of temperatures: as columns or header state, else by their size, with a doubt."""
    stated = Counter(units for column in columns if (units := _stated(column)) is not None)
    if stated:
        return stated.most_common(1)[0][0], None
    size, words = _by_size(columns)
    for line in hints.split("\n"):
        if (units := temperature_units(line)) is not None and units == size:
            return units, None
    return size, Doubt("units of temperature", size, f"the file does not state them; told by the readings, {words}")


def _stated(column: Column) -> str | None:
    for text in (*reversed(column.notes), column.name):
        if (units := temperature_units(text)) is not None:
            return units
    bare = re.search(r"[ _(\[]([CFK])[)\]]?$", column.name)
    return {"C": "degree_Celsius", "F": "degree_Fahrenheit", "K": "kelvin"}[bare[1]] if bare else None


def _by_size(columns: Sequence[Column]) -> tuple[str, str]:
    values = np.concatenate([column.values for column in columns]) if columns else np.empty(0)
    values = values[np.abs(values) < _LARGE]
    median = float(np.median(values)) if values.size else 15.0
    size = "kelvin" if median > _KELVIN_FROM else "degree_Fahrenheit" if median > _FAHRENHEIT_FROM else "degree_Celsius"
    return size, f"half of which are above {median:.4g}"


# --------------------------------------------------------------------------------------------------------------
# Missing tokens


def missing_tokens(columns: Iterable[Column], units: str) -> tuple[list[str], list[Doubt]]:
    """Return the tokens of no reading in columns of temperatures, the empty one among them, and doubts."""
    words: Counter[str] = Counter()
    numbers: Counter[str] = Counter()
    columns = list(columns)
    for column in columns:
        words.update(column.others)
        numbers.update(text for text in column.texts if np.isfinite(to_number(text, column.decimal)))
    tokens = [""] + [word for word, count in words.items() if word and (is_missing(word) or count > 2)]
    doubts = [
        Doubt(
            "missing token",
            repr(word),
            f"it stands in {words[word]} of the cells that were looked at, and is no known token",
        )
        for word in tokens
        if word and not is_missing(word)
    ]
    decimal = columns[0].decimal if columns else "."
    outside = _outside(numbers, decimal, units)
    sentinels = {text: count for text, count in outside.items() if stands_for_missing(text, count)}
    doubts += _zeros(columns, numbers, decimal)
    return tokens + _once(sentinels, decimal), doubts


def _once(texts: Iterable[str], decimal: str) -> list[str]:
    """Return texts of which no two are the same number."""
    met: dict[float, str] = {}
    for text in texts:
        met.setdefault(to_number(text, decimal), text)
    return list(met.values())


def _outside(numbers: Counter[str], decimal: str, units: str) -> dict[str, int]:
    """Return the numbers that are no temperatures of water, by their text."""
    texts = list(numbers)
    values = np.array([to_number(text, decimal) for text in texts], float)
    is_outside = beyond(values, units)
    return {text: numbers[text] for text, outside in zip(texts, is_outside, strict=True) if outside}


def beyond(values: NDArray[np.float64], units: str) -> NDArray[np.bool_]:
    """Tell which temperatures no water has."""
    celsius = to_celsius(values, units)
    return (celsius < COLDEST) | (celsius > WARMEST)


def stands_for_missing(text: str, count: int) -> bool:
    """Tell whether a number beyond all temperatures is a token: one digit repeated, very large, or often the same."""
    value = abs(float(text.replace(",", ".")))
    repeated = _REPEATED_DIGIT.fullmatch(text) is not None and len(re.sub(r"\D", "", text.rstrip("0"))) > 1
    return repeated or value >= _LARGE or count > 2


def _zeros(columns: Sequence[Column], numbers: Counter[str], decimal: str) -> list[Doubt]:
    zeros = sum(count for text, count in numbers.items() if to_number(text, decimal) == 0.0)
    values = np.concatenate([column.values for column in columns]) if columns else np.empty(0)
    others = values[(values != 0.0) & (np.abs(values) < 100.0)]
    if zeros > 3 and others.size and float(np.percentile(others, 1)) > 3.0:
        return [
            Doubt(
                "zeros",
                "a reading of 0",
                f"0 stands in {zeros} cells, and next to nothing is near it",
                'a missing token: add "0" to missing',
            )
        ]
    return []


# --------------------------------------------------------------------------------------------------------------
# Quality marks

#: Our flag by a mark: digits as in IOC Manuals and Guides 54 and OceanSITES reference table 2; letters by their first
#: sense in English (common practice, no source).
_MARKS = {
    "0": 2,
    "1": 1,
    "2": 1,
    "3": 3,
    "4": 4,
    "5": 3,
    "6": 3,
    "7": 1,
    "8": 3,
    "9": 9,
    "G": 1,
    "A": 1,
    "V": 1,
    "P": 1,
    "OK": 1,
    "GOOD": 1,
    "PASS": 1,
    "Q": 3,
    "S": 3,
    "D": 3,
    "C": 3,
    "SUSPECT": 3,
    "?": 3,
    "B": 4,
    "F": 4,
    "R": 4,
    "X": 4,
    "BAD": 4,
    "FAIL": 4,
    "M": 9,
    "N": 2,
    "-": 2,
    "": 2,
    "MISSING": 9,
    "U": 2,
    ".": 2,
    "_": 2,
}


def flags_of(marks: Iterable[str]) -> tuple[dict[str, int], Doubt]:
    """Return what marks could mean, and the doubt about it."""
    flags = {mark: _MARKS.get(mark.upper(), 2) for mark in sorted(set(marks))}
    shown = ", ".join(f"{mark or 'empty'} as {flag}" for mark, flag in flags.items())
    return flags, Doubt(
        "quality marks",
        shown,
        "what they mean is not in the file (1 good, 2 not evaluated, 3 questionable, 4 bad, 9 missing)",
    )
