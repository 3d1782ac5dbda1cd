"""Figures of a precursor analysis and its section of the report."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

import xarray as xr

from profiles import store
from profiles.pipeline.paths import Folder

TITLE = "Precursors of an index"


def write_precursor_report(folder: Folder, inputs: Sequence[Path], notes: Sequence[str]) -> None:
    """Draw the figures of the analysis in a folder and put its section into the report.

    Where the folder holds a run the section goes into its page, and stays there when the page is written again, until
    volume or tilt are others than those it was made from. Else it becomes a page of its own.

    Parameters
    ----------
    folder : Folder
        With the files of the analysis.
    inputs : sequence of Path
        What the series were read from.
    notes : sequence of str
        Sentences that the section gives.
    """
    from profiles.report import insert_precursor, write_precursor_page

    section = _section(folder, notes)
    of_run = {path.name: store.checksum(path) for path in inputs if path in (folder.volume, folder.section)}
    store.write_record(folder.precursor_section, {"section": section, "of": of_run})
    if folder.account.is_file() and folder.page.is_file():
        store.write_text(folder.page, insert_precursor(folder.page.read_text(encoding="utf-8"), section))
    else:
        write_precursor_page(folder.page, section, TITLE)


def kept_section(folder: Folder) -> str:
    """Return the section that belongs to the folder's volume and tilt; empty where there is none, or it does not."""
    record = store.read_record(folder.precursor_section) or {"section": "", "of": {}}
    fits = all(
        (folder.out / name).is_file() and store.checksum(folder.out / name) == known
        for name, known in record["of"].items()
    )
    return str(record["section"]) if fits else ""


def _section(folder: Folder, notes: Sequence[str]) -> str:
    from profiles.report import PrecursorFacts, precursor_section, write_precursor_figures
    from profiles.report.precursor_section import CAPTIONS

    pictures = store.make_folder(folder.figure("").parent)
    for name in CAPTIONS:
        folder.figure(name).unlink(missing_ok=True)
    whole = _loaded(folder.precursor)
    scores, reliability, oscillator, outlook = (
        _loaded(path) if path.is_file() else None
        for path in (folder.scores, folder.reliability, folder.oscillator, folder.outlook)
    )
    figures = write_precursor_figures(
        pictures, precursor=whole, scores=scores, reliability=reliability, outlook=outlook
    )
    tables = {
        name: store.read_table(folder.table(name))
        for name in ("leads", "events", "outlook")
        if folder.table(name).is_file()
    }
    index = whole[str(whole.attrs["target"]).removesuffix("_anomaly")]
    facts = PrecursorFacts(
        record=str(whole.attrs["months"]),
        index=str(index.attrs.get("long_name", index.name)),
        rule=str(whole.attrs["rule"]),
        notes=tuple(notes),
        tables=tables,
    )
    return precursor_section(
        figures, facts, scores=scores, reliability=reliability, oscillator=oscillator, outlook=outlook
    )


def _loaded(path: Path) -> xr.Dataset:
    with store.open_dataset(path) as dataset:
        return dataset.load()
