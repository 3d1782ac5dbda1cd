"""A proposal: the content of a layout, what each column is used for, and what is unsure."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

from profiles.ingest.drafting.cutting import Cutting
from profiles.ingest.drafting.doubts import Doubt
from profiles.ingest.drafting.meaning import averages, scale_of, zone_of
from profiles.ingest.drafting.sample import Line, Sample
from profiles.ingest.drafting.time_columns import TimeGuess

CELSIUS = "degree_Celsius"


@dataclass(frozen=True)
class Use:
    """What some columns are used for, in words."""

    columns: str
    use: str


@dataclass(frozen=True)
class Proposal:
    """A layout, proposed.

    Attributes
    ----------
    content : mapping
        Of the layout file.
    doubts : tuple of Doubt
    uses : tuple of Use
    header : tuple of (Line, str)
        Lines before the rows, and what each is.
    words : str
        How the lines are cut, in words.
    rival_time : mapping, optional
        Another [time] that reads all the stamps that were looked at.
    """

    content: Mapping[str, Any]
    doubts: tuple[Doubt, ...]
    uses: tuple[Use, ...] = field(default=())
    header: tuple[tuple[Line, str], ...] = field(default=())
    words: str = ""
    rival_time: Mapping[str, Any] | None = None

    @property
    def kind(self) -> str:
        """Kind of the layout."""
        return str(self.content["kind"])


def text_keys(sample: Sample, cutting: Cutting) -> dict[str, Any]:
    """Return the keys that all kinds of text have in common; those at their defaults are left out."""
    keys: dict[str, Any] = {}
    if not cutting.fixed:
        keys["delimiter"] = cutting.delimiter
    keys["encoding"] = sample.encoding
    keys["decimal"] = cutting.decimal
    if cutting.decimal == cutting.delimiter:
        keys["quoted"] = True
    if sample.packing == "zip" and sample.member != "*":
        keys["member"] = sample.member
    return keys


def meaning(
    time: TimeGuess, near: str, hints: str, aggregation: str | None
) -> tuple[dict[str, Any], dict[str, Any], list[Doubt]]:
    """Return what belongs into [time] and [temperature] beside names and units, and doubts.

    Parameters
    ----------
    time : TimeGuess
    near : str
        Names and units of the columns of the stamp.
    hints : str
        What else the header says.
    aggregation : str, optional
        What the header says to how the readings came about, ``"mean"`` or ``"instant"``.
    """
    keys: dict[str, Any] = {}
    doubts = list(time.doubts)
    if not time.says_zone:
        zone = zone_of(f"{near}\n{time.settings.get('format', '')}", hints)
        keys["zone"] = zone.name
        counted = str(time.settings.get("units", "")).startswith(("seconds since 1970", "milliseconds since 1970"))
        if zone.doubt is not None and not (counted and zone.name == "UTC"):
            doubts.append(zone.doubt)
    means, doubt = averages(hints, aggregation, time.step)
    scale, scale_doubt = scale_of(hints)
    doubts += [each for each in (scale_doubt, doubt) if each is not None]
    return keys | means, {"scale": scale}, doubts


def ranges(places: Sequence[int]) -> str:
    """Return places of columns in words, from 1: ``"2-5, 7"``."""
    runs: list[list[int]] = []
    for place in sorted(places):
        if runs and place == runs[-1][1] + 1:
            runs[-1][1] = place
        else:
            runs.append([place, place])
    return ", ".join(f"{first + 1}" if first == last else f"{first + 1}-{last + 1}" for first, last in runs)
