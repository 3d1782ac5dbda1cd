"""Columns that somebody else computed: the rows of a file to values by mooring and time, with the account of its rows.

A row has a value of one mooring, or in a wide file of several. The values of a file are held in memory.
"""

from __future__ import annotations

import re
from collections.abc import Collection, Iterator, Mapping, Sequence
from dataclasses import dataclass, field, replace
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from profiles.errors import DataError, RequestError
from profiles.ingest.layout import MOORING_MARK, SeriesLayout, load_layout
from profiles.ingest.lines import past_header, texts_of
from profiles.ingest.record import Rejected, Tally, repeats
from profiles.ingest.rows import Columns, Rows, Understanding
from profiles.ingest.series_numbers import Texts, converted, impossible, with_stated
from profiles.ingest.source import internal_encoding
from profiles.ingest.spool import Spool, Table
from profiles.ingest.table import column_names
from profiles.ingest.wording import listed, nearest
from profiles.vocabulary import Flag, IsothermStatus

#: What stands with each quantity: its value, the flag that it came with, and what else is said of it.
QUANTITIES: Mapping[str, tuple[str, ...]] = {
    "isotherm_depth": (
        "isotherm_depth",
        "isotherm_depth_flag",
        "isotherm_status",
        "independent",
        "persistent",
        "days",
        "spread",
    ),
    "mixed_layer_depth": ("mixed_layer_depth", "mixed_layer_depth_flag"),
    "mean_temperature": ("mean_temperature", "mean_temperature_flag"),
}
NO_STATUS = 0
_DAY_SECONDS = 86_400.0
_FAR_APART = 1.5  # days between values that are no daily ones (ours)
KEY = ["mooring", "is_month", "time"]


@dataclass(frozen=True)
class Series:
    """One file of series.

    Attributes
    ----------
    path, layout
        The file and how it is written.
    values : pandas.DataFrame
        A row per mooring and time, in this order: ``mooring``, ``line``, ``time`` (UTC; the centre of what the value
        stands for), ``is_month`` (whether that is a calendar month), ``mean_hours`` (NaN where nobody says), for each
        of :data:`QUANTITIES` what stands with it (m, °C on ITS-90; NaN missing; ``isotherm_status`` 0 where nobody
        says), ``deployment`` (NaN where nobody says).
    rows_read : int
        Data rows; the sum of those kept and those rejected.
    rows_reordered : int
        Kept rows that were earlier than a row of their mooring before them.
    rejected : tuple of Rejected
    notes : tuple of str
        What somebody who checks the file should know.
    """

    path: Path
    layout: SeriesLayout
    values: pd.DataFrame
    rows_read: int
    rows_reordered: int
    rejected: tuple[Rejected, ...]
    notes: tuple[str, ...]

    @property
    def rows_quarantined(self) -> int:
        """Rows that were not kept."""
        return len(self.rejected)

    @property
    def rows_kept(self) -> int:
        """Rows that were kept."""
        return self.rows_read - self.rows_quarantined

    @property
    def moorings(self) -> list[str]:
        """The moorings that it has a value of."""
        return [str(name) for name in self.values["mooring"].unique()]

    @property
    def quarantine(self) -> pd.DataFrame:
        """The rows that were not kept: ``file``, ``line``, ``reason``, ``text``."""
        texts = texts_of(self.path, self.layout, [row.line for row in self.rejected]) if self.rejected else {}
        rows = [(str(self.path), row.line, row.reason, texts[row.line]) for row in self.rejected]
        return pd.DataFrame(rows, columns=["file", "line", "reason", "text"]).astype({"line": np.int64})

    def without(self, lines: Mapping[int, str]) -> Series:
        """Return the series with some more rows rejected, given with their reasons."""
        more = [Rejected(line, reason) for line, reason in lines.items()]
        rejected = tuple(sorted([*self.rejected, *more], key=lambda row: row.line))
        return replace(self, values=self.values[~self.values["line"].isin(lines)], rejected=rejected)


def read_series(
    path: str | Path,
    layout: str | Path | SeriesLayout,
    *,
    moorings: Collection[str],
    mooring: str | None = None,
) -> Series:
    """Read one file of isotherm depths or other columns that somebody else computed.

    Parameters
    ----------
    path : str or Path
        Text, plain, gzip or zip.
    layout : str, Path or SeriesLayout
        How it is written: a layout file or its object.
    moorings : collection of str
        Ids that are known; rows of others are rejected.
    mooring : str, optional
        Id, where the file is of one mooring and does not name it.

    Raises
    ------
    RequestError
        Where there is no such file, or it is not said which mooring it is of; ConfigError where the layout is wrong.
    DataError
        Where the file is not what the layout says, or holds no row that can be understood.
    MachineError
        Where it may not be read.
    """
    file = Path(path)
    loaded = load_layout(layout) if isinstance(layout, str | Path) else layout
    if not isinstance(loaded, SeriesLayout):
        raise RequestError(
            "this is the layout of a chain, not of a series",
            where=str(layout),
            expected='kind = "series"',
            found=f'kind = "{loaded.kind}"',
            advice="list the file under the deliveries of its mooring",
        )
    _check_mooring_is_said(loaded, mooring, str(layout if isinstance(layout, str | Path) else file))
    header, lines = past_header(file, loaded)
    tally = Tally()
    reader = _Reader.of(file, column_names(header, loaded), loaded, tally, list(moorings), mooring)
    for part in lines:
        reader.add(part)
    return reader.series()


def _check_mooring_is_said(layout: SeriesLayout, mooring: str | None, where: str) -> None:
    ways = [layout.mooring.column is not None, layout.is_wide, mooring is not None]
    if ways.count(True) != 1:
        raise RequestError(
            "it is not said which mooring the series is of" if not any(ways) else "the mooring is said twice",
            where=where,
            expected=f"either column in the layout's [mooring], or {MOORING_MARK} in the column names of [values], or "
            "mooring beside the path in the configuration's [[series]]",
            advice="give one of them",
        )


# --------------------------------------------------------------------------------------------------------------
# Which columns are read


def _numbers(layout: SeriesLayout) -> dict[str, str]:
    """Return the columns of numbers by what they hold."""
    found = {name: value.column for name, value in layout.values.given.items()}
    isotherm = layout.values.isotherm_depth
    if isotherm is not None:
        error = isotherm.error
        parts: dict[str, Any] = {"days": isotherm.days, "spread": isotherm.spread}
        if error is not None:
            parts |= {"independent": error.independent, "persistent": error.persistent, "total": error.total}
        found |= {name: column for name, column in parts.items() if isinstance(column, str)}
    return found | ({"deployment": layout.deployment} if layout.deployment is not None else {})


def _marks(layout: SeriesLayout) -> dict[str, tuple[str, Mapping[str, int]]]:
    """Return the columns of marks, and what these mean, by what they say."""
    found: dict[str, tuple[str, Mapping[str, int]]] = {
        f"{name}_flag": (value.quality.column, value.quality.flags)
        for name, value in layout.values.given.items()
        if value.quality is not None
    }
    isotherm = layout.values.isotherm_depth
    if isotherm is not None and isotherm.status is not None:
        codes = {mark: int(IsothermStatus[name.upper()]) for mark, name in isotherm.status.marks.items()}
        found["isotherm_status"] = (isotherm.status.column, codes)
    return found


def _named_moorings(names: Sequence[str], layout: SeriesLayout) -> list[str]:
    """Return the moorings that the names of columns have, as they call them.

    A name that fits several patterns is taken for the one of most letters: ``A_error`` is the error of A where errors
    are named so, not the depth of ``A_error``.
    """
    patterns = {*_numbers(layout).values(), *(column for column, _ in _marks(layout).values())}
    patterns |= set(layout.time.names)
    value = next(iter(layout.values.given.values())).column
    found = []
    for name in names:
        fitting = [pattern for pattern in patterns if _mooring_in(name, pattern) is not None]
        if fitting and max(fitting, key=lambda pattern: len(pattern.replace(MOORING_MARK, ""))) == value:
            found.append(_mooring_in(name, value) or "")
    return found


def _mooring_in(name: str, pattern: str) -> str | None:
    """Return what stands at the mark of a pattern; None where the name does not fit."""
    expression = re.escape(pattern).replace(re.escape(MOORING_MARK), "(.+)")
    match = re.fullmatch(expression, name)
    return match.group(1) if match is not None and match.groups() else ("" if match is not None else None)


@dataclass
class _Reader:
    """One file under way: which columns are read, and the rows so far."""

    path: Path
    layout: SeriesLayout
    tally: Tally
    known: list[str]
    columns: Columns
    places: list[str]  # the moorings that a row has values of, by our ids; empty where a label says it
    unused: list[str]  # moorings of a wide file that are not known
    numbers: list[str] = field(default_factory=list)
    marks: list[str] = field(default_factory=list)

    @classmethod
    def of(
        cls,
        path: Path,
        names: Sequence[str],
        layout: SeriesLayout,
        tally: Tally,
        known: list[str],
        mooring: str | None,
    ) -> _Reader:
        table = Columns(str(path), names)
        called = _named_moorings(names, layout) if layout.is_wide else [""]
        ids = {name: layout.mooring.ids.get(name, name) for name in called}
        used = [name for name in called if ids[name] in known] if layout.is_wide else called
        if not used:
            raise DataError(
                "no column is of a mooring of the configuration",
                where=str(path),
                expected=f"columns like {next(iter(layout.values.given.values())).column!r} for {listed(known)}",
                found=listed(called) or f"no such column among {listed(names)}",
                advice="correct the pattern, or give the ids in the layout's [mooring]",
            )
        twice = [name for name in used if sum(ids[name] == ids[other] for other in used) > 1]
        if twice:
            raise DataError("columns of one mooring", where=str(path), expected="one for each", found=listed(twice))
        numbers, marks = _numbers(layout), _marks(layout)
        place = _Placing(table, used)
        label = layout.mooring.column
        return cls(
            path,
            layout,
            tally,
            known,
            Columns(
                table.where,
                names,
                numbers=place.all(numbers.values()),
                marks=place.all(column for column, _ in marks.values()),
                tables=[codes for _ in used for _, codes in marks.values()],
                label=table.place(label, "mooring") if label is not None else None,
            ),
            places=[ids[name] for name in used] if layout.is_wide else [mooring] if mooring is not None else [],
            unused=[name for name in called if name not in used],
            numbers=list(numbers),
            marks=list(marks),
        )

    def __post_init__(self) -> None:
        self._understanding = Understanding(self.layout, self.tally, internal_encoding(self.layout.encoding), {})
        shape = (max(len(self.places), 1),)
        self._read = Spool(
            np.dtype(
                [
                    ("line", np.int64),
                    ("time", "datetime64[ns]"),
                    ("label", np.int32),
                    ("numbers", np.float32, (*shape, len(self.numbers))),
                    ("marks", np.int8, (*shape, len(self.marks))),
                ]
            )
        )

    def add(self, lines: Any) -> None:
        """Take some lines; those that cannot be understood or are of no known mooring are rejected."""
        rows = self._understanding.rows(lines, self.columns)
        shape = (rows.line.size, *self._read.row_type["numbers"].shape)
        numbers = rows.values.reshape(shape)
        fields = {name: numbers[..., place] for place, name in enumerate(self.numbers)}
        ours = converted(fields, self.layout)
        reasons, wrong = self._unknown(rows), impossible(fields, ours, self.layout)
        reasons = np.where(pd.isna(reasons), wrong, reasons)
        kept = rows.without(reasons, self.tally)
        is_kept = pd.isna(reasons)
        table = np.zeros(kept.line.size, self._read.row_type)
        table["line"], table["time"], table["label"] = kept.line, self._centre(kept.time), kept.label
        for place, name in enumerate(self.numbers):
            table["numbers"][..., place] = ours[name][is_kept]
        table["marks"] = kept.flags.reshape(table["marks"].shape)
        self.tally.rows_kept += len(table)
        self._read.append(table)

    def _unknown(self, rows: Rows) -> Texts:
        """Return why a row is of no mooring that is known, or None."""
        reasons = np.full(rows.line.size, None, dtype=object)
        if self.columns.label is None:
            return reasons
        said: list[str | None] = []
        for name in self._understanding.labels:
            mooring = self.layout.mooring.ids.get(name, name)
            unknown = f"the configuration has no mooring {mooring!r}{nearest(mooring, self.known)}"
            said.append(None if mooring in self.known else unknown if name else "the mooring is missing")
        return np.array([*said, None], dtype=object)[:-1][rows.label]

    def _centre(self, time: NDArray[np.datetime64]) -> NDArray[np.datetime64]:
        """Return the middle of the month where a value is that of a month."""
        if self.layout.time.mean is None:
            return time
        month = time.astype("datetime64[M]")
        start, end = month.astype("datetime64[ns]"), (month + 1).astype("datetime64[ns]")
        return np.asarray(start + (end - start) // 2)

    def series(self) -> Series:
        """Return what was read."""
        if not self._read.count:
            self.tally.settle(str(self.path))
        values = self._values()
        values, reordered = self._settled(values)
        rejected = self.tally.settle(str(self.path))
        has_value = values[list(self.layout.values.given)].notna().any(axis=1) | (values["isotherm_status"] > NO_STATUS)
        valued = has_value.groupby(values["mooring"]).transform("any")
        if not has_value.any():
            raise DataError(
                "no row has a value", where=str(self.path), advice="check missing and the columns of [values]"
            )
        return Series(
            self.path,
            self.layout,
            values[valued].reset_index(drop=True),
            self.tally.rows_read,
            reordered,
            rejected,
            tuple(self._notes(values[valued])),
        )

    def _values(self) -> pd.DataFrame:
        """Return a row per mooring and time, in the order of the file."""
        labels = [self.layout.mooring.ids.get(name, name) for name in self._understanding.labels]
        parts = [pd.DataFrame(columns=[*KEY, "line"])]
        for rows in self._read.chunks():
            for place in range(rows["numbers"].shape[1]):
                if self.places:
                    mooring = np.full(len(rows), self.places[place], dtype=object)
                else:
                    mooring = np.array([self.layout.mooring.ids.get(name, name) for name in labels], object)[
                        rows["label"]
                    ]
                parts.append(self._of_one(rows, place, mooring))
        return pd.concat(parts[1:] or parts, ignore_index=True)

    def _of_one(self, rows: Table, place: int, mooring: Texts) -> pd.DataFrame:
        numbers = {name: rows["numbers"][:, place, at].astype(np.float64) for at, name in enumerate(self.numbers)}
        marks = {name: rows["marks"][:, place, at] for at, name in enumerate(self.marks)}
        is_month = self.layout.time.mean is not None
        table = pd.DataFrame(
            {
                "mooring": mooring,
                "line": rows["line"],
                "time": rows["time"],
                "is_month": is_month,
                "mean_hours": np.nan if self.layout.time.mean_hours is None else self.layout.time.mean_hours,
            }
        )
        for columns in QUANTITIES.values():
            for name in columns:
                nothing: Any = Flag.NOT_EVALUATED if name.endswith("_flag") else NO_STATUS
                codes = name.endswith(("_flag", "_status"))
                table[name] = marks.get(name, np.int8(nothing)) if codes else numbers.get(name, np.nan)
        table["deployment"] = numbers.get("deployment", np.nan)
        isotherm = self.layout.values.isotherm_depth
        return table if isotherm is None else with_stated(table, isotherm, numbers)

    def _settled(self, values: pd.DataFrame) -> tuple[pd.DataFrame, int]:
        """Return the values by mooring and time, the first where several are of one, and how many rows were late."""
        is_repeat, first = repeats(values[KEY])
        losers = values[is_repeat].assign(winner=values["line"].to_numpy()[first[is_repeat]]).drop_duplicates("line")
        what = "month" if self.layout.time.mean is not None else "time"
        reasons = [f"mooring and {what} are those of line {line}" for line in losers["winner"]]
        self.tally.take_back(losers["line"].to_numpy(np.int64), reasons)
        kept = values[~is_repeat]
        late = kept["time"] < kept.groupby("mooring")["time"].cummax()
        reordered = int(kept.loc[late, "line"].nunique())
        return kept.sort_values(["mooring", "time"], kind="stable"), reordered

    def _notes(self, values: pd.DataFrame) -> Iterator[str]:
        if self.unused:
            yield f"columns of moorings that the configuration does not have are not used: {listed(self.unused)}"
        if self.layout.values.isotherm_depth is not None:
            given = values["isotherm_depth"] > 0.0
            bare = int((given & values[["independent", "persistent"]].isna().any(axis=1)).sum())
            if bare:
                yield (
                    f"{bare} of {int(given.sum())} isotherm depths have no error; "
                    "[column] series_error_independent and series_error_persistent are taken"
                )
        steps = values.groupby("mooring")["time"].diff().dropna().dt.total_seconds() / _DAY_SECONDS
        silent = self.layout.time.mean is None and self.layout.time.mean_hours is None
        if silent and len(steps) and steps.median() > _FAR_APART:
            yield (
                f"values are {steps.median():g} days apart and the layout does not say what they are means of "
                '(mean_hours, or mean = "month" in [time]): each counts for one day'
            )


@dataclass(frozen=True)
class _Placing:
    """Where the columns of several moorings stand."""

    table: Columns
    moorings: Sequence[str]

    def all(self, patterns: Any) -> tuple[int, ...]:
        """Return the places of the columns, mooring by mooring."""
        chosen = list(patterns)
        return tuple(
            self.table.place(pattern.replace(MOORING_MARK, mooring), "series")
            for mooring in self.moorings
            for pattern in chosen
        )
