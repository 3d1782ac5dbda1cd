"""Text with a row per time and a column per depth."""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from profiles.errors import DataError
from profiles.ingest.layout import TextLayout, WideLayout
from profiles.ingest.layout.parts import DEPTH_MARK, DepthScale, WideQuality
from profiles.ingest.lines import past_header
from profiles.ingest.record import Record, Tally, checked_depths
from profiles.ingest.rows import Columns, Rows, Understanding
from profiles.ingest.settling import settle_wide
from profiles.ingest.source import internal_encoding
from profiles.ingest.spool import Spool, Table, wide_type
from profiles.ingest.table import cell_methods, column_names, split_line
from profiles.ingest.units import is_pressure, to_celsius, to_downward
from profiles.ingest.wording import listed
from profiles.vocabulary import Flag

_NUMBER = r"([+-]?[0-9]+(?:[.,][0-9]+)?)"


def read_wide(path: Path, layout: WideLayout) -> Record:
    """Read a wide text file.

    Raises
    ------
    RequestError, DataError, MachineError
        Where the file cannot be read or is not what the layout says.
    """
    header, lines = past_header(path, layout)
    columns, depth = _columns(str(path), column_names(header, layout), header, layout)
    places = np.argsort(np.argsort(depth))
    tally = Tally()
    marks = layout.quality.flags if layout.quality is not None else {}
    understanding = Understanding(layout, tally, internal_encoding(layout.encoding), marks)
    read = Spool(wide_type(depth.size, flagged=bool(marks)))
    for part in lines:
        rows = packed(understanding.rows(part, columns), places, layout.temperature.units, read.row_type)
        tally.rows_kept += len(rows)
        read.append(rows)
    table = settle_wide(read, np.ones((1, depth.size), bool), tally)
    return Record(
        read=read,
        table=table,
        depth=np.sort(depth),
        scale=layout.temperature.scale,
        rejected=tally.settle(str(path)),
        rows_read=tally.rows_read,
        depth_is_pressure=is_pressure(layout.depth.units),
        cell_methods=cell_methods(layout.time),
    )


def packed(rows: Rows, places: NDArray[np.intp], units: str, row_type: np.dtype[Any]) -> Table:
    """Return rows of temperatures as a table, °C, each sensor at its place; without a value the flag is 9."""
    table = np.zeros(rows.line.size, row_type)
    table["line"], table["time"], table["label"], table["piece"] = rows.line, rows.time, rows.label, 1
    table["values"] = np.nan
    table["values"][:, places] = to_celsius(rows.values, units)
    if table["flags"].shape[1]:
        table["flags"] = Flag.MISSING
        table["flags"][:, places] = np.where(np.isnan(rows.values), Flag.MISSING, rows.flags)
    return table


# ------------------------------------------------------------------------------------------------------------
# Which columns are sensors


def _columns(
    where: str, names: Sequence[str], header: Sequence[str], layout: WideLayout
) -> tuple[Columns, NDArray[np.float64]]:
    """Return the columns that are read, and the depth of each sensor, m, positive down."""
    table = Columns(where, names)
    stated = _stated(table, header, layout)
    depths = to_downward(list(stated.values()), layout.depth.units, layout.depth.positive)
    checked_depths(depths, [f"column {names[place]!r}" for place in stated], where)
    marks, per_character = _marks(table, stated, layout.quality)
    return Columns(where, names, tuple(stated), marks, per_character), depths


def _stated(table: Columns, header: Sequence[str], layout: WideLayout) -> dict[int, float]:
    """Return the depth, as delivered, by the place of each sensor's column."""
    depth = layout.depth
    if depth.columns:
        return {table.place(name, "temperature"): value for name, value in depth.columns.items()}
    if depth.values:
        return _in_order(table, depth.first or "", depth.values)
    if depth.row is not None:
        return _of_row(table, header[depth.row - 1], layout)
    return _matched(table, depth.pattern or DEPTH_MARK)


def _in_order(table: Columns, first: str, values: Sequence[float]) -> dict[int, float]:
    place = table.place(first, "temperature")
    if place + len(values) > len(table.names):
        raise DataError(
            "there are fewer columns than depths",
            where=table.where,
            expected=f"{len(values)} columns from {first!r} on",
            found=str(len(table.names) - place),
            advice="correct values or first in the layout's [depth]",
        )
    return dict(zip(range(place, place + len(values)), values, strict=True))


def _of_row(table: Columns, text: str, layout: TextLayout) -> dict[int, float]:
    """Return the numbers of a header row by their place; its other cells are above other columns."""
    cells = split_line(text, layout)
    if len(cells) != len(table.names):
        raise DataError(
            "the header row with the depths does not fit the columns",
            where=table.where,
            expected=f"{len(table.names)} cells",
            found=f"{len(cells)} cells: {listed(cells)}",
            advice="check row in the layout's [depth]; depths in a row of their own need names, or values and first",
        )
    found = {place: number for place, cell in enumerate(cells) if (number := _depth_in(cell, DEPTH_MARK)) is not None}
    stamps = {table.place(name, "time") for name in layout.time.names}
    return {place: number for place, number in found.items() if place not in stamps}


def _depth_in(text: str, pattern: str) -> float | None:
    """Return the number that stands in a text where the pattern has its mark; None where it does not fit."""
    before, after = pattern.split(DEPTH_MARK)
    match = re.fullmatch(re.escape(before) + _NUMBER + re.escape(after), text)
    return float(match.group(1).replace(",", ".")) if match is not None else None


def is_depth(cell: str, pattern: str | None) -> bool:
    """Tell whether a cell of a header is a depth."""
    return _depth_in(cell, pattern or DEPTH_MARK) is not None


def _matched(table: Columns, pattern: str) -> dict[int, float]:
    found = {name: depth for name in table.names if (depth := _depth_in(name, pattern)) is not None}
    if not found:
        raise DataError(
            "no column matches the pattern of the layout",
            where=table.where,
            expected=f"columns like {pattern.replace(DEPTH_MARK, '100')!r}",
            found=listed(table.names),
            advice="check pattern, delimiter and header_rows in the layout",
        )
    return {table.place(name, "temperature"): depth for name, depth in found.items()}


def depths_of_cells(cells: Sequence[str], pattern: str, scale: DepthScale, where: str) -> NDArray[np.float64]:
    """Return the depths that cells of a header name, m, positive down; raise DataError where one names none."""
    depths = [_depth_in(cell, pattern) for cell in cells]
    wrong = [cell for cell, depth in zip(cells, depths, strict=True) if depth is None]
    if wrong or not depths:
        raise DataError(
            "a cell of the header is no depth" if wrong else "the header names no depth",
            where=where,
            expected=f"cells like {pattern.replace(DEPTH_MARK, '100')!r}",
            found=listed(wrong or cells),
            advice="check row, skip and pattern in the layout's [depth]",
        )
    metres = to_downward([depth for depth in depths if depth is not None], scale.units, scale.positive)
    checked_depths(metres, [f"cell {cell!r}" for cell in cells], where)
    return metres


def _marks(table: Columns, sensors: Mapping[int, float], quality: WideQuality | None) -> tuple[tuple[int, ...], bool]:
    """Return the columns of quality marks in the order of the sensors, and whether one has a character for each."""
    if quality is None:
        return (), False
    if quality.column is not None:
        return (table.place(quality.column, "quality"),), True
    names = [table.names[place] for place in sensors]
    if quality.columns:
        missing = [name for name in names if name not in quality.columns]
        if missing:
            raise DataError(
                "sensors without a column of quality marks",
                where=table.where,
                expected="one for each sensor",
                found=f"none for {listed(missing)}",
                advice="complete columns in the layout's [quality]",
            )
        return tuple(table.place(quality.columns[name], "quality") for name in names), False
    by_depth = _matched(table, quality.pattern or DEPTH_MARK)
    places = {depth: place for place, depth in by_depth.items()}
    unmarked = [name for name, depth in zip(names, sensors.values(), strict=True) if depth not in places]
    if unmarked:
        raise DataError(
            "sensors without a column of quality marks",
            where=table.where,
            expected=f"one like {quality.pattern!r} for each sensor",
            found=f"none for {listed(unmarked)}",
            advice="correct pattern in the layout's [quality], or name them in columns",
        )
    return tuple(places[depth] for depth in sensors.values()), False
