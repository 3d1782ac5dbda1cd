"""Tables as the page shows them: chosen columns, plain headings, values as text, long ones cut and said to be."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Any, Literal

import pandas as pd

from profiles.report.summary import count, mooring_counts, percent
from profiles.vocabulary import Flag

LONGEST_TEXT = 160  # characters of a cell


@dataclass(frozen=True)
class Column:
    """A column: its name in the table, its heading, how a value becomes text, and how that is set.

    ``setting`` is "number" (to the right), "fixed" (in one line) or empty.
    """

    name: str
    heading: str
    show: Callable[[Any], str]
    setting: Literal["number", "fixed", ""] = ""


@dataclass(frozen=True)
class Layout:
    """How a table is shown: the rows for which ``weight`` is largest come first, and no more than ``most``."""

    heading: str
    columns: tuple[Column, ...]
    most: int
    empty: str
    weight: Callable[[pd.DataFrame], pd.Series[Any]] | None = None
    order: str = "The first"


@dataclass(frozen=True)
class View:
    """A table ready to be shown. ``cut`` says what is left out, empty where nothing is."""

    heading: str
    columns: tuple[Column, ...]
    rows: list[list[str]]
    cut: str
    empty: str


def text(value: Any) -> str:
    """Return a value as text that can be shown: no control characters, not longer than a cell should be."""
    shown = "" if pd.isna(value) else str(value)
    shown = "".join(sign if sign.isprintable() else "\ufffd" for sign in shown)
    return shown if len(shown) <= LONGEST_TEXT else f"{shown[:LONGEST_TEXT]}…"


def _time(value: Any) -> str:
    return "" if pd.isna(value) else pd.Timestamp(value).strftime("%Y-%m-%d %H:%M")


def _count(value: Any) -> str:
    return "" if pd.isna(value) else count(value)


def _short(value: Any) -> str:
    return "" if pd.isna(value) else f"{float(value):.4g}"


def _flag(value: Any) -> str:
    return Flag(int(value)).name.lower().replace("_", " ")


_MOORING = Column("mooring", "Mooring", text)
_SPAN = (Column("start", "From (UTC)", _time, "fixed"), Column("end", "To (UTC)", _time, "fixed"))

LAYOUTS: Mapping[str, Layout] = {
    "data_return": Layout(
        "Data return by mooring",
        (
            _MOORING,
            Column("sensors", "Sensors", _count, "number"),
            Column("expected", "Values expected", _count, "number"),
            Column("good", "Good", _count, "number"),
            Column("not_evaluated", "Not evaluated", _count, "number"),
            Column("questionable", "Questionable", _count, "number"),
            Column("bad", "Bad", _count, "number"),
            Column("missing", "Missing", _count, "number"),
            Column("return_share", "Data return", percent, "number"),
        ),
        most=200,
        empty="No mooring has a record.",
    ),
    "faults": Layout(
        "Faults",
        (
            _MOORING,
            Column("depth", "Depth (m)", _short, "number"),
            Column("kind", "Kind", text),
            Column("flag", "Flag", _flag),
            *_SPAN,
            Column("count", "Values", _count, "number"),
            Column("tests", "Tests", text),
        ),
        most=40,
        empty="No value was found questionable or bad.",
        weight=lambda faults: faults["count"],
        order="The longest",
    ),
    "gaps": Layout(
        "Gaps",
        (
            _MOORING,
            Column("depths", "Depths (m)", text),
            Column("sensors", "Sensors", _count, "number"),
            *_SPAN,
            Column("duration", "Days", _short, "number"),
        ),
        most=40,
        empty="No sensor was silent for longer than the gap test allows.",
        weight=lambda gaps: gaps["duration"],
        order="The longest",
    ),
    "deliveries": Layout(
        "Deliveries",
        (
            _MOORING,
            Column("file", "File", text),
            Column("rows_read", "Rows read", _count, "number"),
            Column("rows_kept", "Kept", _count, "number"),
            Column("rows_quarantined", "In quarantine", _count, "number"),
            Column("rows_reordered", "Put in order", _count, "number"),
            Column("outcome", "Outcome", text),
            Column("problem", "Problem", text),
        ),
        most=100,
        empty="There was no delivery.",
        weight=lambda deliveries: deliveries["problem"].notna() & deliveries["problem"].ne(""),
        order="Those with a problem, then others,",
    ),
    "quarantine": Layout(
        "Quarantine",
        (
            Column("file", "File", text),
            Column("line", "Line", _count, "number"),
            Column("reason", "Reason", text),
            Column("text", "Text", text),
        ),
        most=40,
        empty="Every row that was read could be kept.",
    ),
}


def views(tables: Mapping[str, pd.DataFrame]) -> dict[str, View]:
    """Return the tables of a run as they are shown.

    Parameters
    ----------
    tables : mapping of str to pandas.DataFrame
        ``data_return``, ``faults``, ``gaps``, ``deliveries`` and ``quarantine``.
    """
    shown = {**tables, "data_return": _by_mooring(tables["data_return"])}
    return {name: view(name, layout, shown[name]) for name, layout in LAYOUTS.items()}


def _by_mooring(data_return: pd.DataFrame) -> pd.DataFrame:
    table = mooring_counts(data_return).reset_index()
    return table.assign(return_share=table["used"] / table["expected"])


def view(name: str, layout: Layout, table: pd.DataFrame) -> View:
    """Return a table as it is shown; ``name`` is that of its file in ``tables/``."""
    part = _heaviest_first(table.reset_index(drop=True), layout).head(layout.most)
    cells = [[column.show(value) for value in part[column.name]] for column in layout.columns]
    left_out = len(table) > layout.most
    cut = f"{layout.order} {layout.most} of {count(len(table))}; all stand in tables/{name}.csv." if left_out else ""
    return View(layout.heading, layout.columns, [list(row) for row in zip(*cells, strict=True)], cut, layout.empty)


def _heaviest_first(table: pd.DataFrame, layout: Layout) -> pd.DataFrame:
    if layout.weight is None:
        return table
    return table.loc[layout.weight(table).sort_values(ascending=False, kind="stable").index]
