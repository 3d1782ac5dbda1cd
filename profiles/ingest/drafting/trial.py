"""Proposals put to the test: read with the readers themselves, first the sample, then the whole file."""

from __future__ import annotations

import re
import tempfile
from collections import Counter
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

import cf_units
import numpy as np

from profiles.config import validated
from profiles.errors import ThermotiltError
from profiles.ingest.delivery import Delivery, read
from profiles.ingest.drafting.content import is_missing
from profiles.ingest.drafting.doubts import Doubt
from profiles.ingest.drafting.proposal import Proposal
from profiles.ingest.drafting.readings import beyond, flags_of, stands_for_missing
from profiles.ingest.drafting.sample import Sample
from profiles.ingest.layout import KINDS, Layout
from profiles.ingest.units import CELSIUS, is_pressure

EQUATOR = 0.0  # latitude for a trial with pressures; over a chain the depth changes by less than 1 % to the pole
_TOKEN = re.compile(r"column '.*': '(.*)' is neither a number nor a missing token", re.DOTALL)
_MARK = re.compile(r"the quality mark '(.*)' is in no table", re.DOTALL)
_ROUNDS = 3  # of reading the whole file while tokens are found that the sample did not have
_AS_GOOD = 0.985  # of the rows that the best keeps; what keeps so many is as good (ours)
_A_FEW = 1  # row: a damaged one may fit a wrong layout by chance (ours)
_OFTEN = 3  # times that an unknown word has to stand in the file to be a token (ours)


def layout_of(content: Mapping[str, Any]) -> Layout:
    """Return a proposal's content as the layout that it would be loaded as."""
    return validated(KINDS[content["kind"]], dict(content), Path("draft"))


def read_with(path: Path, content: Mapping[str, Any]) -> Delivery:
    """Read a file as a proposal says."""
    pressure = is_pressure(content.get("depth", {}).get("units", "m"))
    return read(path, layout_of(content), latitude=EQUATOR if pressure else None)


# --------------------------------------------------------------------------------------------------------------
# The sample


@dataclass(frozen=True)
class Trial:
    """What a proposal made of the sample: rows it kept, none if their readings are no temperatures; why it failed."""

    proposal: Proposal
    rows_kept: int
    failure: str | None = None


def on_sample(proposals: list[Proposal], sample: Sample) -> list[Trial]:
    """Read the sample as each proposal says; the best first, those that are as good in their order."""
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / sample.path.name
        text = "\n".join(line.text for line in sample.lines) + "\n"
        path.write_bytes(text.encode("utf-8", "surrogateescape"))
        trials = [_tried(proposal, path) for proposal in proposals]
    most = max((trial.rows_kept for trial in trials), default=0)
    return sorted(
        trials, key=lambda trial: -(most if trial.rows_kept >= min(_AS_GOOD * most, most - _A_FEW) else trial.rows_kept)
    )


def _tried(proposal: Proposal, path: Path) -> Trial:
    content = {key: value for key, value in proposal.content.items() if key not in {"encoding", "member"}}
    try:
        delivery = read_with(path, content)
    except ThermotiltError as error:
        return Trial(proposal, 0, str(error))
    beyonds = np.concatenate([beyond(values, CELSIUS) for values in readings(delivery)] or [np.ones(1, bool)])
    if beyonds.size == 0 or beyonds.mean() > 0.5:
        return Trial(proposal, 0, "the readings are no temperatures of water")
    return Trial(proposal, delivery.rows_kept)


def readings(delivery: Delivery) -> Iterator[np.ndarray[Any, np.dtype[np.float64]]]:
    """Yield the readings that are not missing, °C, in pieces."""
    for rows in delivery.table.chunks():
        values = rows["values"]
        yield values[np.isfinite(values)].astype(np.float64)


# --------------------------------------------------------------------------------------------------------------
# The whole file


def on_whole_file(proposal: Proposal, path: Path) -> tuple[Proposal, Delivery]:
    """Read the whole file, and add the tokens and marks that only come where the sample did not look.

    Raises
    ------
    ThermotiltError
        Where the proposal does not fit the file.
    """
    delivery = read_with(path, proposal.content)
    for _ in range(_ROUNDS):
        completed = _completed(proposal, delivery)
        if completed is None:
            break
        proposal, delivery = completed, read_with(path, completed.content)
    return proposal, delivery


def _completed(proposal: Proposal, delivery: Delivery) -> Proposal | None:
    content = dict(proposal.content)
    if "missing" not in content:
        return None
    reasons = [str(reason) for reason in delivery.quarantine["reason"]]
    tokens = [*_words(reasons), *_sentinels(delivery, content)]
    marks = {match[1] for reason in reasons if (match := _MARK.match(reason)) is not None}
    new = [token for token in tokens if token not in content["missing"]]
    content["missing"] = [*content["missing"], *new]
    doubts = list(proposal.doubts)
    if marks and "quality" in content:
        flags, doubt = flags_of({*content["quality"]["flags"], *marks})
        content["quality"] = content["quality"] | {"flags": flags}
        doubts = [doubt if each.about == doubt.about else each for each in doubts]
    doubts += [
        Doubt("missing token", repr(token), "it comes often and is no known token")
        for token in new
        if not is_missing(token) and not re.search(r"\d", token)
    ]
    return replace(proposal, content=content, doubts=tuple(doubts)) if new or marks else None


def _words(reasons: list[str]) -> list[str]:
    """Return the words that stand for no reading in rows that were not understood."""
    met = Counter(match[1] for reason in reasons if (match := _TOKEN.match(reason)) is not None)
    return [word for word, count in met.items() if is_missing(word) or (count >= _OFTEN and not re.search(r"\d", word))]


def _sentinels(delivery: Delivery, content: Mapping[str, Any]) -> list[str]:
    """Return numbers that no water has as its temperature and that stand for no reading."""
    units = content["temperature"].get("units", CELSIUS)
    met: Counter[float] = Counter()
    for values in readings(delivery):
        met.update(values[beyond(values, CELSIUS)].tolist())
    delivered = {
        np.format_float_positional(np.float32(cf_units.Unit(CELSIUS).convert(value, units)), trim="-"): count
        for value, count in met.items()
    }
    decimal = content.get("decimal", ".")
    return [text.replace(".", decimal) for text, count in delivered.items() if stands_for_missing(text, count)]
