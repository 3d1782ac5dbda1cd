"""Text in blocks: a header with depths, the rows under it, then another header with other depths."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from profiles.errors import DataError
from profiles.ingest.layout import WHITESPACE, BlockedLayout
from profiles.ingest.lines import Lines, past_header
from profiles.ingest.record import Record, Tally
from profiles.ingest.rows import Columns, Understanding
from profiles.ingest.settling import settle_wide
from profiles.ingest.source import internal_encoding
from profiles.ingest.spool import Spool, wide_type
from profiles.ingest.table import cell_methods, split_line
from profiles.ingest.units import is_pressure
from profiles.ingest.wide import depths_of_cells, is_depth, packed

Depths = NDArray[np.float64]


@dataclass(frozen=True)
class Header:
    """The header of a block: its lines, their depths in the order of the cells, or why they cannot be told."""

    lines: Lines
    depth: Depths | None
    problem: str = ""


def read_blocked(path: Path, layout: BlockedLayout) -> Record:
    """Read a blocked text file.

    The file is read twice: first for the depths that its blocks have, together.

    Raises
    ------
    RequestError, DataError, MachineError
        Where the file cannot be read or is not what the layout says.
    """
    sets = _depth_sets(path, layout)
    depth = np.unique(np.concatenate(list(sets)).astype(np.float32)).astype(np.float64)
    tally = Tally()
    marks = layout.quality.flags if layout.quality is not None else {}
    understanding = Understanding(layout, tally, internal_encoding(layout.encoding), marks)
    read = Spool(wide_type(depth.size, flagged=bool(marks)))
    header: Header | None = None
    for part in _parts(path, layout):
        if isinstance(part, Header):
            header = part
            _count_header(header, tally)
        elif header is None or header.depth is None:
            _reject(part, header, tally)
        else:
            rows = understanding.rows(part, _columns(str(path), header.depth, layout))
            places = np.searchsorted(depth, header.depth.astype(np.float32))
            packed_rows = packed(rows, places, layout.temperature.units, read.row_type)
            packed_rows["label"] = sets[tuple(header.depth)]
            tally.rows_kept += len(packed_rows)
            read.append(packed_rows)
    table = settle_wide(read, _masks(sets, depth), tally)
    return Record(
        read=read,
        table=table,
        depth=depth,
        scale=layout.temperature.scale,
        rejected=tally.settle(str(path), table.count),
        rows_read=tally.rows_read,
        depth_is_pressure=is_pressure(layout.depth.units),
        cell_methods=cell_methods(layout.time),
    )


def _masks(sets: dict[tuple[float, ...], int], depth: Depths) -> NDArray[np.bool_]:
    return np.array([np.isin(depth.astype(np.float32), np.array(members, np.float32)) for members in sets])


def _columns(where: str, depth: Depths, layout: BlockedLayout) -> Columns:
    before, after = layout.block.before, layout.block.after
    names = [*before, *(f"{level:g}" for level in depth), *after]
    numbers = tuple(range(len(before), len(before) + depth.size))
    if layout.quality is None:
        return Columns(where, names, numbers)
    mark = Columns(where, [*before, *("" for _ in depth), *after]).place(layout.quality.column, "quality")
    return Columns(where, names, numbers, (mark,), per_character=True)


# ------------------------------------------------------------------------------------------------------------
# Blocks


def _parts(path: Path, layout: BlockedLayout) -> Iterator[Header | Lines]:
    """Yield headers of blocks and the rows between them, in file order."""
    _, blocks = past_header(path, layout)
    held: Lines | None = None
    for block in blocks:
        lines = block if held is None else block.behind(held)
        held = None
        starts = np.flatnonzero(lines.begin_with(layout.block.begins)).tolist()
        if not starts or starts[0] > 0:
            yield lines.where(slice(None, starts[0] if starts else None))
        for start, stop in zip(starts, [*starts, len(lines)][1:], strict=True):
            part = lines.where(slice(start, stop))
            if stop == len(lines) and len(part) < layout.block.header_rows:
                held = part.cut_loose()
            else:
                yield from _headed(part, str(path), layout)
    if held is not None:
        yield from _headed(held, str(path), layout)


def _headed(lines: Lines, where: str, layout: BlockedLayout) -> Iterator[Header | Lines]:
    """Yield the header of a block, and the rows that follow it."""
    length = layout.block.header_rows
    head, rows = lines.where(slice(None, length)), lines.where(slice(length, None))
    if len(head) < length:
        yield Header(head, None, f"the header of a block has {length} lines; these are {len(head)}")
        return
    cells = _depth_cells(head.texts()[layout.depth.row - 1], layout)
    try:
        depth = depths_of_cells(cells, layout.depth.pattern or "{depth}", layout.depth, where)
    except DataError as error:
        yield Header(head, None, f"{error.what}: found {error.found}")
    else:
        yield Header(head, depth)
    yield rows


def _depth_cells(text: str, layout: BlockedLayout) -> list[str]:
    """Return the cells of a header line that are depths; behind them it may name the cells behind the readings."""
    delimiter = " " if layout.delimiter == WHITESPACE else layout.delimiter
    apart = text.translate(dict.fromkeys(map(ord, layout.depth.between), delimiter))
    cells, most = split_line(apart, layout)[layout.depth.skip :], len(layout.block.after)
    named = most < len(cells) and not any(is_depth(cell, layout.depth.pattern) for cell in cells[len(cells) - most :])
    return cells[: len(cells) - most] if named else cells


def _depth_sets(path: Path, layout: BlockedLayout) -> dict[tuple[float, ...], int]:
    """Return the depths of each sort of block, numbered in the order of their coming."""
    headers = [part for part in _parts(path, layout) if isinstance(part, Header)]
    sets: dict[tuple[float, ...], int] = {}
    for header in headers:
        if header.depth is not None:
            sets.setdefault(tuple(header.depth), len(sets))
    if sets:
        return sets
    raise DataError(
        "no block has a header that can be understood",
        where=str(path),
        expected=f"lines that begin with {layout.block.begins!r}, depths in line {layout.depth.row} of each header",
        found=f"line {headers[0].lines.number[0]}: {headers[0].problem}" if headers else "no such line",
        advice="check begins and header_rows in the layout's [block]; row, skip and pattern in its [depth]",
    )


def _count_header(header: Header, tally: Tally) -> None:
    tally.rows_read += len(header.lines)
    if header.depth is not None:
        tally.rows_kept += len(header.lines)
    else:
        tally.reject(header.lines.number, [header.problem] * len(header.lines), header.lines.texts())


def _reject(lines: Lines, header: Header | None, tally: Tally) -> None:
    reason = (
        "no header of a block stands before this row"
        if header is None
        else f"the header of its block, line {header.lines.number[0]}, cannot be understood"
    )
    tally.rows_read += len(lines)
    tally.reject(lines.number, [reason] * len(lines), lines.texts())
