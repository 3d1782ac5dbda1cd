"""A file as one table: which lines are comments and header, what the columns are called, and the rows below."""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Iterator, Sequence
from dataclasses import dataclass

from profiles.ingest.drafting.content import Column, Sort, sort_of
from profiles.ingest.drafting.cutting import Cutting
from profiles.ingest.drafting.depth_names import NamedDepths, named_depths
from profiles.ingest.drafting.sample import Line, Sample
from profiles.ingest.drafting.words import is_unit, roles_of
from profiles.ingest.layout import WHITESPACE

_MARK = re.compile(r"\s*(//|--(?!\d)|[#%!*/;>$&~|@<=:'`^])")
_DATA_SHARE = 0.6  # of a data row's cells that are numbers, stamps or missing tokens
_FEW_LINES, _FEW_SHARE = 4, 0.05  # lines of a header that may look like data, or share of the rows below (ours)
_GOOD: tuple[Sort, ...] = ("number", "stamp", "missing")

Row = list[str]


@dataclass(frozen=True)
class Table:
    """A file as one table.

    Attributes
    ----------
    cutting : Cutting
    comment : str
        What comment lines begin with; empty for none.
    comments, header : tuple of Line
        Comment lines that were met, and the other lines before the first row.
    names_row : int
        Which of the header has the names, from 1; 0 where the layout has to name the columns itself.
    names : tuple of str
    columns : tuple of Column
        Over the rows that have all columns.
    first : int
        Number of the line of the first row.
    ends_with_delimiter : bool
    """

    cutting: Cutting
    comment: str
    comments: tuple[Line, ...]
    header: tuple[Line, ...]
    names_row: int
    names: tuple[str, ...]
    columns: tuple[Column, ...]
    first: int
    ends_with_delimiter: bool
    file_name: str

    @property
    def prose(self) -> list[str]:
        """The lines that may say something in words, the names of the columns apart."""
        named = {self.header[self.names_row - 1].number} if self.names_row else set()
        return [line.text for line in (*self.comments, *self.header) if line.number not in named]

    @property
    def hints(self) -> str:
        """All that stands in the header and in the comments, line by line, and the name of the file."""
        return "\n".join([line.text for line in (*self.comments, *self.header)] + [self.file_name])


def build_table(sample: Sample, cutting: Cutting) -> Table | None:
    """Return the file as one table, or None where it is none."""
    comment = comment_mark(sample.lines, cutting)
    is_comment = [bool(comment) and line.text.lstrip().startswith(comment) for line in sample.lines]
    comments = tuple(line for line, each in zip(sample.lines, is_comment, strict=True) if each)
    lines = [line for line, each in zip(sample.lines, is_comment, strict=True) if not each]
    rows = cutting.cut([line.text for line in lines])
    if len(rows) < 1:
        return None
    width = _width(rows)
    kinds = _kinds(rows, width, cutting.decimal)
    first = next((place for place, row in enumerate(rows) if _fits(row, kinds, cutting.decimal)), None)
    if width < 2 or first is None or "number" not in kinds:
        return None
    if sum(_is_data(row, cutting.decimal) for row in rows[:first]) > max(_FEW_LINES, _FEW_SHARE * (len(rows) - first)):
        return None  # much of what would be header is data of another shape
    header, header_rows = lines[:first], rows[:first]
    body = [row for row in rows[first:] if _fits(row, kinds, cutting.decimal, strictly=False)]
    one_more = _ends_with_delimiter(header_rows, body, width, cutting)
    width -= one_more
    body = [row[:width] for row in body]
    naming = _names(header, header_rows, comments, comment, body, kinds[:width], cutting)
    notes = _notes(header_rows, naming, width)
    columns = tuple(
        Column(
            place,
            naming.names[place] if naming.is_of_file else "",
            notes[place],
            tuple(row[place] for row in body),
            cutting.decimal,
        )
        for place in range(width)
    )
    return Table(
        cutting,
        comment,
        comments,
        tuple(header),
        naming.row,
        naming.names,
        columns,
        lines[first].number,
        one_more,
        sample.path.name,
    )


def comment_mark(lines: Sequence[Line], cutting: Cutting) -> str:
    """Return what the comment lines begin with; empty where there are none.

    Lines that look like data when cut are no comments.
    """
    met: Counter[str] = Counter()
    for line, row in zip(lines, cutting.cut([line.text for line in lines]), strict=True):
        match = _MARK.match(line.text)
        if match is not None and not _is_data(row, cutting.decimal):
            met[match[1]] += 1
    marks = [mark for mark, _ in met.most_common() if not _begins_data(mark, lines, cutting)]
    return marks[0] if marks else ""


def _begins_data(mark: str, lines: Sequence[Line], cutting: Cutting) -> bool:
    marked = [line.text for line in lines if line.text.lstrip().startswith(mark)]
    data = [_is_data(row, cutting.decimal) for row in cutting.cut(marked)]
    return sum(data) > 0.5 * len(data)


def _is_data(row: Row, decimal: str) -> bool:
    sorts = [sort_of(cell, decimal) for cell in row]
    return len(row) > 1 and "number" in sorts and sum(sort in _GOOD for sort in sorts) >= _DATA_SHARE * len(row)


def _width(rows: Sequence[Row]) -> int:
    later = _later(rows)
    return Counter(len(row) for row in later if row).most_common(1)[0][0] if any(later) else 0


def _later(rows: Sequence[Row]) -> Sequence[Row]:
    """Return the rows of the later part, where the header is past."""
    return rows[max(len(rows) // 3, min(1, len(rows) - 1)) :]


def _kinds(rows: Sequence[Row], width: int, decimal: str) -> list[Sort]:
    """Return what most cells of each column are, over the later rows."""
    later = [row for row in _later(rows) if len(row) == width]
    thinned = later[:: max(1, len(later) // 300)]
    kinds: list[Sort] = []
    for cells in zip(*thinned, strict=True):
        sorts = Counter(sort_of(cell, decimal) for cell in cells)
        numbers, stamps = sorts["number"], sorts["stamp"]
        if numbers and numbers + sorts["missing"] >= 0.8 * len(cells):
            kinds.append("number")
        elif stamps >= 0.8 * len(cells):
            kinds.append("stamp")
        else:
            kinds.append("missing" if sorts["missing"] == len(cells) else "word")
    return kinds


def _fits(row: Row, kinds: Sequence[Sort], decimal: str, *, strictly: bool = True) -> bool:
    """Tell whether a row has the columns of the table, and in them what they have elsewhere."""
    if len(row) != len(kinds):
        return False
    sorts = [sort_of(cell, decimal) for cell in row]
    numeric = [sort in ("number", "missing") for sort, kind in zip(sorts, kinds, strict=True) if kind == "number"]
    stamps = [sort in ("number", "stamp") for sort, kind in zip(sorts, kinds, strict=True) if kind == "stamp"]
    least = 0.8 if strictly else 0.5
    is_numeric = sum(numeric) >= least * len(numeric) and (not strictly or "number" in sorts or "stamp" in sorts)
    return is_numeric and all(stamps)


def _ends_with_delimiter(header: Sequence[Row], body: Sequence[Row], width: int, cutting: Cutting) -> bool:
    """Tell whether the rows end with one delimiter more than the names do."""
    if cutting.fixed or cutting.delimiter == WHITESPACE or any(row[-1] for row in body):
        return False
    return any(len(row) == width - 1 for row in header) and not any(len(row) == width for row in header)


# --------------------------------------------------------------------------------------------------------------
# Names


@dataclass(frozen=True)
class _Naming:
    row: int
    names: tuple[str, ...]
    is_of_file: bool = True


def _names(
    header: Sequence[Line],
    rows: Sequence[Row],
    comments: Sequence[Line],
    comment: str,
    body: Sequence[Row],
    kinds: Sequence[Sort],
    cutting: Cutting,
) -> _Naming:
    """Return the names, and which header row holds them; 0 where the layout must give them."""
    width = len(kinds)
    if not cutting.fixed:
        scored = [(_name_score(row, kinds), place) for place, row in enumerate(rows) if len(row) == width]
        if scored and max(scored)[0] > 0:
            place = max(scored)[1]
            return _Naming(place + 1, tuple(rows[place]))
    before = [line.text.lstrip()[len(comment) :] if line in comments else line.text for line in (*header, *comments)]
    options = [tuple(cells) for text in before for cells in _resplit(text, cutting, body, width) if len(cells) == width]
    scores = [_name_score(cells, kinds) for cells in options]
    if options and max(scores) > 0:
        best = options[scores.index(max(scores))]
        return _Naming(0, _unique(best))
    return _Naming(0, tuple(f"column_{place + 1}" for place in range(width)), is_of_file=False)


def _name_score(cells: Sequence[str], kinds: Sequence[Sort]) -> float:
    """Return how much the cells of a row look like names of columns."""
    words = [cell for cell in cells if re.search(r"[^\W\d_]", cell)]
    roles = [roles_of(cell) for cell in cells]
    with_role = sum(bool(each) for each in roles)
    units = sum(is_unit(cell) for cell in cells)
    numbered = sum(bool(re.search(r"\d", cell)) for cell in cells)
    distinct = len(set(cells))
    stamped = 2.0 * any(each & {"time", "date"} for each in roles)
    only_numbers = sum(not re.search(r"[^\W\d_]", cell) and bool(re.search(r"\d", cell)) for cell in cells)
    headed = 0.5 if words and only_numbers == len(cells) - len(words) else 0.0
    if not words:
        return 0.0
    numeric = [cell for cell, kind in zip(cells, kinds, strict=True) if kind == "number"]
    telling = [cell for cell in numeric if roles_of(cell) or re.search(r"\d", cell)]
    headed += 5.0 * (len(telling) / len(numeric) - 1.0) if numeric else 0.0
    headed += _longest_order(cells)
    return with_role + distinct + 0.5 * numbered - 1.5 * units + stamped + headed


def _longest_order(cells: Sequence[str]) -> int:
    """Return how many neighbouring cells have rising or falling numbers in them; 0 for fewer than three."""
    found = [re.findall(r"[0-9]+(?:\.[0-9]+)?", cell) for cell in cells]
    numbers = [float(each[-1]) if each else None for each in found]
    longest, length, before, direction = 0, 0, None, 0.0
    for number in numbers:
        step = 0.0 if number is None or before is None else number - before
        if number is None:
            length = 0
        elif step and (length < 2 or step * direction > 0):
            length, direction = max(length, 1) + 1, step
        else:
            length = 1
        before = number
        longest = max(longest, length)
    return longest if longest > 2 else 0


def _resplit(text: str, cutting: Cutting, body: Sequence[Row], width: int) -> Iterator[list[str]]:
    """Yield the cells of a line of the header cut in other ways than the rows are."""
    options = [
        re.split(r"\s{2,}|\t", text.strip()),
        [cell.strip(' "') for cell in re.split(r"[,;\t|]", text)],
        text.split(),
    ]
    if cutting.fixed:
        options.insert(0, _aligned(text, cutting))
    else:
        options.insert(0, cutting.cut([text.strip()])[0])
    for cells in options:
        yield cells
        if len(cells) == width - 1 and body and ":" in body[0][1] and roles_of(cells[0]) & {"time", "date"}:
            yield [cells[0], f"{cells[0]}_clock", *cells[1:]]


def _aligned(text: str, cutting: Cutting) -> list[str]:
    """Return the words of a header by the columns of fixed width that they overlap most."""
    cells = [""] * len(cutting.fixed)
    for match in re.finditer(r"\S+(?: \S+)*", text):
        overlap = [min(match.end(), stop) - max(match.start(), start - 1) for start, stop in cutting.fixed]
        best = max(range(len(overlap)), key=overlap.__getitem__)
        cells[best] = f"{cells[best]} {match.group()}".strip()
    return cells if all(cells) else []


def _unique(names: Sequence[str]) -> tuple[str, ...]:
    """Return names that differ; those that are empty or come again get their place."""
    count = Counter(names)
    return tuple(
        name if name and count[name] == 1 else f"{name or 'column'}_{place}" for place, name in enumerate(names, 1)
    )


def _notes(rows: Sequence[Row], naming: _Naming, width: int) -> list[tuple[str, ...]]:
    """Return what the header rows other than the names have above each column."""
    others = [row for place, row in enumerate(rows, 1) if place != naming.row and len(row) == width]
    return [tuple(row[place] for row in others) for place in range(width)]


def with_names(table: Table) -> Table:
    """Return the table with names that differ, given in the layout in place of those in the file."""
    names = _unique(table.names)
    columns = tuple(
        Column(column.place, names[column.place] if column.name else "", column.notes, column.texts, column.decimal)
        for column in table.columns
    )
    return Table(
        table.cutting,
        table.comment,
        table.comments,
        table.header,
        0,
        names,
        columns,
        table.first,
        table.ends_with_delimiter,
        table.file_name,
    )


def depth_groups(table: Table, taken: Sequence[int]) -> list[NamedDepths]:
    """Return the groups of columns whose names give depths, the columns of the stamp left out."""
    return named_depths([column for column in table.columns if column.place not in taken])
