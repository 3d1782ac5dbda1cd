"""Layouts of files in blocks: a header with depths, rows under it, then another header with other depths."""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise
from typing import Any

from profiles.ingest.drafting.content import Column, share_of, sort_of
from profiles.ingest.drafting.counts import cell_names, common_beginning
from profiles.ingest.drafting.cutting import Cutting
from profiles.ingest.drafting.depth_names import plausible
from profiles.ingest.drafting.doubts import Doubt
from profiles.ingest.drafting.meaning import depth_units_in
from profiles.ingest.drafting.proposal import Proposal, Use, meaning, text_keys
from profiles.ingest.drafting.readings import flags_of, reading_settings
from profiles.ingest.drafting.sample import Line, Sample
from profiles.ingest.drafting.table import comment_mark
from profiles.ingest.drafting.time_columns import TimeGuess, time_guesses
from profiles.ingest.drafting.words import depth_units, roles_of, temperature_worth
from profiles.ingest.layout.parts import DEPTH_MARK, WHITESPACE

Row = list[str]

_LEADING = re.compile(r"\s*([^\d+\-.\s]*)")
_DEPTH_CELL = re.compile(r"([^\d+\-]*?)([+-]?[0-9]+(?:[.,][0-9]+)?)([^\d]*)")
_BETWEEN = ("", ",", ";", ",;")  # what may stand between depths beside the delimiter of the rows
_REGULAR = 0.6  # share of the blocks that must be alike; few blocks may have a damaged one among them (ours)
_MOST_BEHIND = 3  # cells of the line of depths behind the last of them


@dataclass(frozen=True)
class Block:
    """The header of a block and the rows under it."""

    header: tuple[Line, ...]
    rows: tuple[Row, ...]


@dataclass(frozen=True)
class Depths:
    """Where the depths stand in the headers: the line, cells before them, pattern; how many; other cells of a row.

    The count is 0 for a block whose header cannot be understood.
    """

    row: int
    skip: int
    pattern: str
    counts: tuple[int, ...]
    beside: int
    between: str = ""


def blocked_proposals(sample: Sample, cutting: Cutting) -> list[Proposal]:
    """Return layouts in blocks, if headers with depths come again.

    Where all headers are the same line by line, it is one table whose header was repeated, and no blocks are proposed.
    """
    if cutting.fixed:
        return []
    mark = comment_mark(sample.head, cutting)
    for comment in dict.fromkeys(("", mark)):
        lines = [line for line in sample.head if not (comment and line.text.lstrip().startswith(comment))]
        blocks, before = find_blocks(lines, cutting)
        if len({tuple(line.text.strip() for line in block.header) for block in blocks}) > 1:
            proposal = _proposal(sample, cutting, comment, blocks, before)
            if proposal is not None:
                return [proposal]
    return []


# --------------------------------------------------------------------------------------------------------------
# Blocks


def find_blocks(lines: Sequence[Line], cutting: Cutting) -> tuple[list[Block], list[Line]]:
    """Return the blocks of some lines, and the lines before the first; fewer than two where there are none."""
    runs = _runs([_leading(line.text) for line in lines])
    if len(runs) < 2:
        return [], []
    length = Counter(stop - start for start, stop in runs[1:]).most_common(1)[0][0]
    heads = [(stop - length, stop) for start, stop in runs if stop - start >= length]
    word = Counter(_leading(lines[start].text) for start, _ in heads).most_common(1)[0][0]
    heads = [(start, stop) for start, stop in heads if _leading(lines[start].text) == word]
    if len(heads) < max(2, _REGULAR * len(runs)):
        return [], []
    rows = cutting.cut([line.text for line in lines])
    ends = [*(start for start, _ in heads[1:]), len(lines)]
    blocks = [
        Block(tuple(lines[start:stop]), tuple(rows[stop:end])) for (start, stop), end in zip(heads, ends, strict=True)
    ]
    return [block for block in blocks if block.rows], list(lines[: heads[0][0]])


def _runs(words: Sequence[str]) -> list[tuple[int, int]]:
    """Return where neighbouring lines begin otherwise than most lines do."""
    usual = Counter(words).most_common(1)[0][0] if words else ""
    runs: list[tuple[int, int]] = []
    for place, word in enumerate(words):
        if word != usual:
            if runs and runs[-1][1] == place:
                runs[-1] = (runs[-1][0], place + 1)
            else:
                runs.append((place, place + 1))
    return runs


def _leading(text: str) -> str:
    match = _LEADING.match(text)
    return match[1] if match is not None else ""


def find_depths(blocks: Sequence[Block], cutting: Cutting) -> Depths | None:
    """Return where the depths stand: the line whose numbers grow and shrink with the rows; the longest of such."""
    found = [
        depths
        for row in range(len(blocks[0].header))
        for between in _BETWEEN
        if (depths := _depths_of(row, between, blocks, cutting)) is not None
    ]
    return max(found, key=lambda depths: sum(depths.counts), default=None)


def _depths_of(row: int, between: str, blocks: Sequence[Block], cutting: Cutting) -> Depths | None:
    """Return the depths in one line of each header; None where they do not fit the rows."""
    delimiter = " " if cutting.delimiter == WHITESPACE else cutting.delimiter
    if delimiter in between:
        return None
    apart = dict.fromkeys(map(ord, between), delimiter)
    cells = [cutting.cut([block.header[row].text.translate(apart)])[0] for block in blocks]
    found = [_depth_cells(each) for each in cells]
    if _first_counts(cells, found):
        found = [None if each is None else (each[0] + 1, each[1], each[2] - 1) for each in found]
    widths = [_width(block) for block in blocks]
    forms = Counter(
        (*each[:2], width - each[2]) for each, width in zip(found, widths, strict=True) if each is not None and each[2]
    )
    if not forms:
        return None
    (skip, pattern, beside), agreeing = forms.most_common(1)[0]
    if beside < 1 or agreeing < max(2, _REGULAR * len(blocks)):
        return None
    counts = tuple(
        each[2] if each is not None and (*each[:2], width - each[2]) == (skip, pattern, beside) else 0
        for each, width in zip(found, widths, strict=True)
    )
    return Depths(row + 1, skip, pattern, counts, beside, between)


def _first_counts(cells: Sequence[Row], found: Sequence[tuple[int, str, int] | None]) -> bool:
    """Tell whether the first of the numbers says how many follow."""
    known = [(row, each) for row, each in zip(cells, found, strict=True) if each is not None]
    return bool(known) and all(row[skip] == str(count - 1) for row, (skip, _, count) in known)


def _width(block: Block) -> int:
    return Counter(len(row) for row in block.rows).most_common(1)[0][0]


def _depth_cells(cells: Row) -> tuple[int, str, int] | None:
    """Return how many cells stand before the depths of a line, their pattern, and how many there are."""
    for behind in range(min(_MOST_BEHIND, len(cells) - 1) + 1):
        inside = cells[: len(cells) - behind]
        match = _DEPTH_CELL.fullmatch(inside[-1]) if inside else None
        if match is None:
            continue
        before, after = match[1], match[3]
        numbers: list[float] = []
        for cell in reversed(inside):
            each = _DEPTH_CELL.fullmatch(cell)
            if each is None or (each[1], each[3]) != (before, after):
                break
            numbers.append(float(each[2].replace(",", ".")))
        steps = [one - two for one, two in pairwise(numbers)]
        if steps and not (all(step > 0 for step in steps) or all(step < 0 for step in steps)):
            # A count may stand before the depths; what breaks the order is none of them.
            kept = next(place for place, step in enumerate(steps, 1) if step * steps[0] <= 0)
            numbers = numbers[:kept]
        return len(inside) - len(numbers), f"{before}{DEPTH_MARK}{after}", len(numbers)
    return None


# --------------------------------------------------------------------------------------------------------------
# The layout


@dataclass(frozen=True)
class _Read:
    """The rows of all blocks in columns: the cells before the readings, all readings, the marks behind them."""

    leading: list[Column]
    readings: Column
    glued: list[set[str]]


def _read(blocks: Sequence[Block], depths: Depths, decimal: str) -> _Read:
    rows = [
        (row, count)
        for block, count in zip(blocks, depths.counts, strict=True)
        for row in block.rows
        if count and len(row) == count + depths.beside
    ]
    glued = _glued_cells(rows, depths)
    first = depths.beside - len(glued)
    leading = [Column(place, "", (), tuple(row[place] for row, _ in rows), decimal) for place in range(first)]
    cells = tuple(cell for row, count in rows for cell in row[first : first + count])
    return _Read(leading, Column(0, "", (), cells, decimal), glued)


def _proposal(
    sample: Sample, cutting: Cutting, comment: str, blocks: Sequence[Block], before: Sequence[Line]
) -> Proposal | None:
    depths, begins = find_depths(blocks, cutting), _begins(blocks)
    if depths is None or not begins or temperature_worth(depths.pattern) < 0:
        return None
    read = _read(blocks, depths, cutting.decimal)
    shown = next(block for block, count in zip(blocks, depths.counts, strict=True) if count)
    hints = "\n".join([*(line.text for line in (*before, *shown.header)), sample.path.name])
    guesses = time_guesses(read.leading, hints) if read.leading else []
    numeric = share_of(read.readings.texts[:2000], cutting.decimal, ("number", "missing"))
    if not guesses or numeric < 0.9 or plausible([read.readings]) < 0:
        return None
    time, names = guesses[0], cell_names(len(read.leading), guesses[0], {})
    time_keys, temperature, doubts = meaning(time, "", hints, None)
    reading_keys, reading_doubts = reading_settings([read.readings], hints)
    depth, depth_doubts = _depth_keys(depths, shown, hints)
    block, quality, mark_doubts = _block_keys(begins, shown, names, read.glued)
    content = text_keys(sample, cutting) | ({"comment": comment} if comment else {})
    content |= {"kind": "blocked", "header_rows": len(before), "missing": reading_keys["missing"], "block": block}
    content |= {"time": time.named(names) | time_keys, "depth": depth}
    content |= {"temperature": {"units": reading_keys["units"]} | temperature, **quality}
    doubts += [*reading_doubts, *depth_doubts, *mark_doubts, *_unused(names)]
    header = [(line, "header") for line in before] + [(line, "header of a block") for line in shown.header]
    return Proposal(
        content,
        (*sample.doubts, *doubts),
        _uses(depths, time, names),
        tuple(header),
        cutting.in_words,
        time.named_rival(names, time_keys),
    )


def _block_keys(
    begins: str, block: Block, names: list[str], glued: Sequence[set[str]]
) -> tuple[dict[str, Any], dict[str, Any], list[Doubt]]:
    """Return [block], [quality] if there are marks, and doubts about them."""
    keys: dict[str, Any] = {"begins": begins, "header_rows": len(block.header), "before": names}
    if not glued:
        return keys, {}, []
    flags, doubt = flags_of(glued[0])
    keys["after"] = ["marks", *(f"marks_{place}" for place in range(2, len(glued) + 1))]
    doubts = [doubt]
    if len(glued) > 1:
        other = f"{len(glued)} cells behind the readings have a character for each of them"
        doubts.append(Doubt("which marks are of the quality", "the first", other))
    return keys, {"quality": {"column": "marks", "flags": flags}}, doubts


def _uses(depths: Depths, time: TimeGuess, names: Sequence[str]) -> tuple[Use, ...]:
    return (
        Use(f"line {depths.row} of each block's header, from cell {depths.skip + 1} on", "depths"),
        *(Use(f"rows, cell {place + 1}", f"time ({names[place]})") for place in time.places),
        Use(f"rows, from cell {len(names) + 1} on", "temperature at the depths of the block"),
    )


def _unused(names: Sequence[str]) -> list[Doubt]:
    left = ", ".join(name for name in names if name.startswith("cell_"))
    why = "they stand before the readings and are no part of the stamp"
    return [Doubt("cells that are not used", left, why)] if left else []


def _begins(blocks: Sequence[Block]) -> str:
    """Return what the first line of each header begins with, and no other line."""
    prefix = common_beginning([block.header[0].text.lstrip() for block in blocks])
    match = re.match(r"[^\d]*", prefix)
    whole = (match.group() if match is not None else "").rstrip(" \t+-.,;\"'") or prefix.strip()
    others = [line.text.lstrip() for block in blocks for line in block.header[1:]]
    others += [row[0] for block in blocks for row in block.rows if row and sort_of(row[0], ".") != "word"]
    word = whole.split()[:1] if len(whole.split()) > 1 else []
    return next((text for text in (*word, whole) if text and not any(each.startswith(text) for each in others)), "")


def _glued_cells(rows: Sequence[tuple[Row, int]], depths: Depths) -> list[set[str]]:
    """Return the characters of the last cells of the rows that have one for each reading, cell by cell."""
    found: list[set[str]] = []
    several = len(set(depths.counts) - {0}) > 1 or max(depths.counts) > 1
    for behind in range(1, depths.beside if several else 1):
        fitting = [
            row[-behind]
            for row, count in rows
            if len(row[-behind]) == count and re.fullmatch(r"[0-9A-Za-z?]+", row[-behind])
        ]
        if len(fitting) < 0.9 * len(rows):
            break
        found.insert(0, set("".join(fitting)))
    return found


def _depth_keys(depths: Depths, block: Block, hints: str) -> tuple[dict[str, Any], list[Doubt]]:
    line = block.header[depths.row - 1].text
    after = depths.pattern.split(DEPTH_MARK)[1]
    stated = depth_units(after) or depth_units(line) or ("dbar" if "pressure" in roles_of(line) else None)
    units = stated or depth_units_in(hints) or "m"
    keys: dict[str, Any] = {"row": depths.row, "skip": depths.skip}
    if depths.pattern != DEPTH_MARK:
        keys["pattern"] = depths.pattern
    if depths.between:
        keys["between"] = depths.between
    keys |= {"units": units, "positive": "down"}
    doubts = [] if stated else [Doubt("units of depth", units, "the header of the blocks does not state them")]
    if re.search(r"(?<![\w.])-[0-9]", line):
        keys["positive"] = "up"
        doubts.append(Doubt("sign of depth", "negative is below the surface", "the depths are written with a minus"))
    return keys, doubts
