"""An unknown file looked at: the layout that fits it best, how it is understood with it, and what stays unsure."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

import numpy as np

from profiles.errors import DataError, RequestError, ThermotiltError
from profiles.ingest.delivery import Delivery
from profiles.ingest.drafting.blocks import blocked_proposals
from profiles.ingest.drafting.counts import counted_proposals
from profiles.ingest.drafting.cutting import Cutting, cuttings
from profiles.ingest.drafting.doubts import Doubt
from profiles.ingest.drafting.netcdf_names import netcdf_proposals
from profiles.ingest.drafting.proposal import Proposal
from profiles.ingest.drafting.sample import Sample, take_sample
from profiles.ingest.drafting.table import build_table
from profiles.ingest.drafting.tabular import long_proposals, sensor_columns, wide_proposals
from profiles.ingest.drafting.time_columns import time_guesses
from profiles.ingest.drafting.time_forms import formats_of
from profiles.ingest.drafting.trial import layout_of, on_sample, on_whole_file, read_with
from profiles.ingest.drafting.writing import as_toml
from profiles.ingest.layout import GREATEST_DEPTH, Layout
from profiles.ingest.source import check_file
from profiles.ingest.units import is_pressure
from profiles.ingest.wording import printable

SHOWN_ROWS = 3  # at each end of the file
_MOST_CUTTINGS = 3
_LEAST_KEPT = 0.5  # of the rows; a layout that keeps fewer is not the file's (ours)
_DOUBTFUL_SHARE = 0.02  # of the rows in quarantine, above which the draft is doubted (ours)
_NETCDF = (b"CDF\x01", b"CDF\x02", b"CDF\x05", b"\x89HDF")


@dataclass(frozen=True)
class ShownRow:
    """A row as it is understood: line, text, time in UTC, readings (°C) by depth (m); NaN is no reading."""

    line: int
    text: str
    time: np.datetime64
    readings: tuple[tuple[float, float], ...]


@dataclass(frozen=True)
class Draft:
    """A layout for a file, and how the file is understood with it.

    Attributes
    ----------
    file : Path
    packing, encoding : str
    lines : int
        Of the file; 0 for NetCDF.
    proposal : Proposal
    layout : Layout
        What is loaded from :attr:`toml`.
    toml : str
        The layout file, commented.
    first, last : tuple of ShownRow
    rows_read, rows_kept, rows_quarantined : int
    reasons : tuple of (str, int, int)
        Why rows were not understood, how many, and the first of them; the commonest first.
    """

    file: Path
    packing: str
    encoding: str
    lines: int
    proposal: Proposal
    layout: Layout
    toml: str
    first: tuple[ShownRow, ...]
    last: tuple[ShownRow, ...]
    rows_read: int
    rows_kept: int
    rows_quarantined: int
    reasons: tuple[tuple[str, int, int], ...]


def draft(path: str | Path, *, depths: Sequence[float] = ()) -> Draft:
    """Propose a layout for an unknown file, and read the file with it.

    Parameters
    ----------
    path : str or Path
        Text, plain, gzip or zip, or NetCDF.
    depths : sequence of float, optional
        Depths of the sensors in the order of their columns, m, for a wide file that does not have them.

    Returns
    -------
    Draft

    Raises
    ------
    RequestError
        Where there is no such file, or a depth is none.
    DataError
        Where no layout fits; says how far the file was understood.
    MachineError
        Where the file may not be read.
    """
    file = Path(path)
    _check_depths(depths)
    if check_file(file).startswith(_NETCDF):
        return _finished(file, "plain", "", 0, *_first_that_reads(netcdf_proposals(file), file))
    sample = take_sample(file)
    if not sample.head:
        raise DataError(
            "the file has blank lines only", where=str(file), expected="a delivery", advice="fetch it again"
        )
    progress: list[str] = []
    proposals = list(_proposals(sample, depths, progress))
    trials = [trial for trial in on_sample(proposals, sample) if trial.rows_kept]
    if not trials:
        failures = [trial.failure for trial in on_sample(proposals, sample) if trial.failure]
        raise _nothing_found(sample, [*progress, *failures[:1]])
    proposal, delivery = _first_that_reads([trial.proposal for trial in trials[:3]], file)
    return _finished(file, sample.packing, sample.encoding, sample.count, *_settled(proposal, delivery, sample))


def _check_depths(depths: Sequence[float]) -> None:
    wrong = [depth for depth in depths if not 0.0 <= depth <= GREATEST_DEPTH]
    if wrong or len(set(depths)) < len(depths):
        raise RequestError(
            "these are no depths of sensors",
            where="--depths",
            expected=f"different numbers from 0 to {GREATEST_DEPTH:g} m",
            found=", ".join(f"{depth:g}" for depth in (wrong or depths)),
        )


# --------------------------------------------------------------------------------------------------------------
# Proposals


def _proposals(sample: Sample, depths: Sequence[float], progress: list[str]) -> Iterator[Proposal]:
    """Yield layouts that could be the file's, the likeliest first, noting in ``progress`` how far each way came."""
    ways = cuttings([line.text for line in sample.lines])[:_MOST_CUTTINGS]
    progress.append(f"{sample.count} lines of text ({sample.packing}, {sample.encoding})")
    if not ways:
        progress.append("no delimiter and no fixed width cuts them into cells of numbers")
    for cutting in ways:
        several = [*counted_proposals(sample, cutting), *blocked_proposals(sample, cutting)]
        yield from several
        if not several:
            yield from _of_table(sample, cutting, depths, progress)


def _of_table(sample: Sample, cutting: Cutting, depths: Sequence[float], progress: list[str]) -> Iterator[Proposal]:
    table = build_table(sample, cutting)
    if table is None:
        progress.append(f"{cutting.in_words}: no table of rows that are alike")
        return
    guesses = time_guesses(table.columns, table.hints)
    if not guesses:
        progress.append(
            f"{cutting.in_words}: {len(table.columns)} columns, none of which can be read as a time that goes on"
        )
        if sum(bool(formats_of(name)) for name in table.names) > 2:
            progress.append("the times seem to be the names of the columns; turn rows into columns first")
        return
    time = guesses[0]
    found = [*wide_proposals(sample, table, time, depths), *([] if depths else long_proposals(sample, table, time))]
    yield from found
    if not found:
        sensors = sensor_columns(table, time)
        named = ", ".join(repr(table.names[column.place]) for column in sensors[:8]) or "none"
        progress.append(
            f"{cutting.in_words}: {len(table.columns)} columns, of which {len(sensors)} can be temperatures ({named}), "
            f"times from {np.datetime_as_string(np.nanmin(time.clock), unit='m')}; their depths are not in the file"
            + (f", and {len(depths)} were given" if depths else "; give them in the order of the columns with --depths")
        )


def _nothing_found(sample: Sample, progress: Sequence[str]) -> DataError:
    return DataError(
        "no layout is found that fits",
        where=str(sample.path),
        found="; ".join(dict.fromkeys(progress)),
        advice="write one by hand after the examples in config/layouts",
    )


def _first_that_reads(proposals: Sequence[Proposal], file: Path) -> tuple[Proposal, Delivery]:
    """Return the first proposal that the whole file can be read with, and what was read."""
    failure: ThermotiltError | None = None
    for proposal in proposals:
        try:
            completed, delivery = on_whole_file(proposal, file)
        except ThermotiltError as error:
            failure = failure or error
            continue
        if delivery.rows_kept >= _LEAST_KEPT * delivery.rows_read:
            return completed, delivery
        failure = failure or DataError(
            "the layout that fits best keeps too few rows",
            where=str(file),
            expected=f"at least {_LEAST_KEPT:.0%}",
            found=f"{delivery.rows_kept} of {delivery.rows_read}; "
            + "; ".join(f"{count} rows: {reason}" for reason, count, _ in _reasons(delivery)[:3]),
            advice="write one by hand after the examples in config/layouts",
        )
    raise failure or DataError("no layout is found that fits", where=str(file))


def _settled(proposal: Proposal, delivery: Delivery, sample: Sample) -> tuple[Proposal, Delivery]:
    """Return the proposal without the doubt about the form of the stamps, where the whole file settles it."""
    rival = proposal.rival_time
    if rival is None or not sample.tail:
        return proposal, delivery
    other = replace(proposal, content={**proposal.content, "time": rival}, rival_time=proposal.content["time"])
    try:
        second = read_with(sample.path, other.content)
    except ThermotiltError:
        kept = 0
    else:
        kept = second.rows_kept
    if kept == delivery.rows_kept:
        return proposal, delivery
    chosen, read = (proposal, delivery) if kept < delivery.rows_kept else (other, second)
    certain = tuple(doubt for doubt in chosen.doubts if doubt.about not in {"day or month first", "form of the stamps"})
    return replace(chosen, doubts=certain), read


# --------------------------------------------------------------------------------------------------------------
# How the file is understood


def _finished(file: Path, packing: str, encoding: str, lines: int, proposal: Proposal, delivery: Delivery) -> Draft:
    first, last = _shown(delivery)
    if is_pressure(proposal.content.get("depth", {}).get("units", "m")):
        why = "the latitude that turns pressure into depth is no part of a layout; the configuration states it"
        proposal = replace(proposal, doubts=(*proposal.doubts, Doubt("depths shown here", "those at the equator", why)))
    if delivery.rows_quarantined > _DOUBTFUL_SHARE * delivery.rows_read:
        why = "the layout does not fit them, or they are damaged; the reasons stand with the account"
        lost = f"{delivery.rows_quarantined} of {delivery.rows_read} go to quarantine"
        proposal = replace(proposal, doubts=(*proposal.doubts, Doubt("rows that are not understood", lost, why)))
    return Draft(
        file,
        packing,
        encoding,
        lines,
        proposal,
        layout_of(proposal.content),
        as_toml(proposal, file.name),
        first,
        last,
        delivery.rows_read,
        delivery.rows_kept,
        delivery.rows_quarantined,
        tuple(_reasons(delivery)),
    )


def _reasons(delivery: Delivery) -> list[tuple[str, int, int]]:
    reasons = delivery.quarantine["reason"]
    first = dict(reversed(list(zip(reasons, delivery.quarantine["line"], strict=True))))
    return [(printable(reason), count, int(first[reason])) for reason, count in Counter(reasons).most_common()]


def _shown(delivery: Delivery) -> tuple[tuple[ShownRow, ...], tuple[ShownRow, ...]]:
    """Return the first and the last rows in the order of the file, as they are understood."""
    source = delivery.sources[0]
    read = source.read
    first = read.rows(0, SHOWN_ROWS)
    last = read.rows(max(read.count - SHOWN_ROWS, min(SHOWN_ROWS, read.count)), read.count)
    stamps = {int(row["line"]): row["time"] for rows in (first, last) for row in rows}
    texts = source.texts(stamps)
    return tuple(tuple(_shown_row(row, delivery, texts) for row in rows) for rows in (first, last))  # type: ignore[return-value]


def _shown_row(row: Any, delivery: Delivery, texts: Mapping[int, str]) -> ShownRow:
    line = int(row["line"])
    if "values" in row.dtype.names:
        readings = zip(delivery.depth.tolist(), row["values"].tolist(), strict=True)
    else:
        readings = zip([float(row["depth"])], [float(row["value"])], strict=True)
    return ShownRow(line, texts.get(line, ""), row["time"], tuple(readings))
