"""``thermotilt draft FILE``: a layout proposed for an unknown file."""

from __future__ import annotations

import math
from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer

from profiles.cli.console import ending, print_json
from profiles.errors import EXIT_DONE, RequestError

if TYPE_CHECKING:
    from profiles.ingest.drafting import Draft, ShownRow

_SHOWN_READINGS = 8  # of a row, four at each end
_SHOWN_HEADER = 12
_SHOWN_REASONS = 5
_WIDTH = 110


def draft(
    file: Annotated[
        Path, typer.Argument(help="The unknown file: text, plain, gzip or zip, or NetCDF.", show_default=False)
    ],
    write: Annotated[Path | None, typer.Option(help="Write the layout to this file.", show_default=False)] = None,
    overwrite: Annotated[bool, typer.Option("--overwrite", help="Replace that file if it is there.")] = False,
    depths: Annotated[
        str | None,
        typer.Option(
            help="Depths of the columns in their order, m, where the file has none: 1,5,10.", show_default=False
        ),
    ] = None,
    quiet: Annotated[bool, typer.Option("--quiet", help="Print only what is unsure or wrong.")] = False,
    as_json: Annotated[bool, typer.Option("--json", help="Print one JSON document instead of text.")] = False,
) -> None:
    """Look at an unknown file and propose a layout.

    Shows how header, first and last rows are understood with it, and says what is unsure. Nothing is written unless
    --write is given.
    """
    with ending(as_json=as_json):
        from profiles.ingest.drafting import draft as drafted

        _check_target(write, file, overwrite=overwrite)
        found = drafted(file, depths=_numbers(depths))
        if write is not None:
            from profiles.store import write_text

            write_text(write, found.toml)
        if as_json:
            print_json(_document(found, write))
        else:
            for line in _quietly(found) if quiet else _screen(found, write):
                typer.echo(line)
        raise typer.Exit(EXIT_DONE)


def _check_target(write: Path | None, file: Path, *, overwrite: bool) -> None:
    if write is None:
        return
    if write.exists() and file.exists() and write.samefile(file):
        raise RequestError("is the file that is looked at", where=str(write), advice="name another file for the layout")
    if write.is_dir() or (write.exists() and not overwrite):
        raise RequestError(
            "this file is already there" if write.is_file() else "this is a folder",
            where=str(write),
            advice="name another, or give --overwrite" if write.is_file() else "name a file",
        )
    if not write.parent.is_dir():
        raise RequestError("there is no such folder", where=str(write.parent), advice="make it, or name another file")


def _numbers(depths: str | None) -> list[float]:
    if depths is None:
        return []
    try:
        return [float(text) for text in depths.replace(";", ",").split(",")]
    except ValueError:
        raise RequestError("no list of numbers", where="--depths", expected="1,5,10", found=depths) from None


# --------------------------------------------------------------------------------------------------------------
# For people


def _screen(found: Draft, write: Path | None) -> list[str]:
    proposal = found.proposal
    size = f"{found.packing}, {found.encoding}, {found.lines} lines; " if found.lines else ""
    lines = [f"{found.file}: {size}{proposal.words}", f"kind: {proposal.kind}", "", *_header(found)]
    lines += ["", "columns", *(f"  {use.columns}: {use.use}" for use in proposal.uses)] if proposal.uses else []
    lines += ["", "first rows (time in UTC, depth: temperature in °C)", *_rows(found.first)]
    if found.last:
        lines += ["last rows", *_rows(found.last)]
    lines += ["", *_unsure(found), "", *_account(found), ""]
    return [*lines, *([f"layout written to {write}"] if write is not None else ["layout", found.toml])]


def _header(found: Draft) -> list[str]:
    shown = found.proposal.header
    lines = [f"  line {line.number}: {_cut(line.text)}    <- {what}" for line, what in shown[:_SHOWN_HEADER]]
    rest = [f"  and {len(shown) - _SHOWN_HEADER} more lines"] if len(shown) > _SHOWN_HEADER else []
    return ["header", *lines, *rest] if shown else ["header: none"]


def _cut(text: str) -> str:
    from profiles.ingest.wording import printable

    shown = printable(text).replace("\t", " ⇥ ")
    return shown if len(shown) <= _WIDTH else shown[: _WIDTH - 4] + " ..."


def _rows(rows: Sequence[ShownRow]) -> list[str]:
    lines: list[str] = []
    for row in rows:
        lines += [f"  line {row.line}: {_cut(row.text)}", f"    {_stamp(row)}  {_readings(row.readings)}"]
    return lines


def _stamp(row: ShownRow) -> str:
    stamp = str(row.time.astype("datetime64[ms]"))
    return f"{stamp.removesuffix('.000')}Z"


def _readings(readings: Sequence[tuple[float, float]]) -> str:
    pairs = [f"{depth:.6g}: {'missing' if math.isnan(value) else f'{value:.6g}'}" for depth, value in readings]
    half = _SHOWN_READINGS // 2
    return "  ".join(pairs if len(pairs) <= _SHOWN_READINGS else [*pairs[:half], "...", *pairs[-half:]])


def _unsure(found: Draft) -> list[str]:
    if not found.proposal.doubts:
        return ["unsure of nothing"]
    return ["unsure", *(f"  - {_whole(str(doubt))}" for doubt in found.proposal.doubts)]


def _whole(text: str) -> str:
    return text.encode("utf-8", "surrogateescape").decode("utf-8", "replace")


def _quietly(found: Draft) -> list[str]:
    return [*(_unsure(found) if found.proposal.doubts else []), *_account(found)[1:]]


def _account(found: Draft) -> list[str]:
    lines = [f"rows read {found.rows_read} = kept {found.rows_kept} + quarantined {found.rows_quarantined}"]
    for reason, count, line in found.reasons[:_SHOWN_REASONS]:
        lines.append(f"  {count} quarantined, the first in line {line}: {reason}")
    return lines


# --------------------------------------------------------------------------------------------------------------
# For machines


def _document(found: Draft, write: Path | None) -> dict[str, Any]:
    proposal = found.proposal
    return {
        "exit_code": EXIT_DONE,
        "file": found.file.as_posix(),
        "packing": found.packing,
        "encoding": found.encoding,
        "lines": found.lines,
        "cut": proposal.words,
        "layout": proposal.content,
        "toml": found.toml,
        "written": write.as_posix() if write is not None else None,
        "header": [{"line": line.number, "text": _whole(line.text), "is": what} for line, what in proposal.header],
        "columns": [vars(use) for use in proposal.uses],
        "first": [_row(row) for row in found.first],
        "last": [_row(row) for row in found.last],
        "unsure": [vars(doubt) for doubt in proposal.doubts],
        "rows": {"read": found.rows_read, "kept": found.rows_kept, "quarantined": found.rows_quarantined},
        "reasons": [{"reason": reason, "rows": count, "first_line": line} for reason, count, line in found.reasons],
    }


def _row(row: ShownRow) -> dict[str, Any]:
    readings = [
        {"depth": float(f"{depth:.7g}"), "temperature": None if math.isnan(value) else float(f"{value:.7g}")}
        for depth, value in row.readings
    ]
    return {"line": row.line, "time": _stamp(row), "readings": readings, "text": row.text}
