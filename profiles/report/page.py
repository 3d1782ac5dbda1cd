"""One web page that holds the whole report and needs nothing else."""

from __future__ import annotations

import base64
import struct
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import pandas as pd
import xarray as xr
from jinja2 import Environment, PackageLoader, StrictUndefined
from markupsafe import Markup

from profiles.config import Config
from profiles.report.array import WEAK_SHARE
from profiles.report.captions import CAPTIONS, MOORING_TEXT, Caption
from profiles.report.summary import findings, mooring_return, percent, tilt_window, window_label
from profiles.report.tables import text, views
from profiles.store import write_text
from profiles.vocabulary import CAUTION

#: The line of the contents that leads to the section on precursors, where there is one.
PRECURSOR_LINK = '<li><a href="#precursor">Precursors of the index</a></li>\n'


@dataclass(frozen=True)
class Facts:
    """What the page says of a run beside its results.

    ``config`` is what was asked for, ``date`` when the inputs last changed, ``versions`` of what computed by name,
    ``input_count`` how many input files were checksummed, ``leave_one_out`` as in :class:`profiles.section.Section`.
    """

    config: Config
    date: str
    versions: Mapping[str, str]
    input_count: int
    leave_one_out: float


@dataclass(frozen=True)
class Picture:
    """A PNG file as the page carries it."""

    address: str
    width: int
    height: int

    @classmethod
    def read(cls, path: Path) -> Picture:
        """Read a PNG file; its size stands in bytes 16 to 24 (PNG specification, IHDR)."""
        content = path.read_bytes()
        width, height = struct.unpack(">II", content[16:24])
        return cls(f"data:image/png;base64,{base64.b64encode(content).decode('ascii')}", width, height)


@dataclass(frozen=True)
class Plate:
    """A figure of the array with its caption."""

    name: str
    caption: Caption
    text: str
    picture: Picture


@dataclass(frozen=True)
class MooringPlate:
    """A mooring's figure under one line that says what it holds."""

    anchor: str
    name: str
    data_return: str
    picture: Picture


def write_page(
    path: Path,
    *,
    facts: Facts,
    section: xr.Dataset,
    volume: xr.Dataset,
    figures: Mapping[str, Path],
    mooring_figures: Mapping[str, Path],
    tables: Mapping[str, pd.DataFrame],
    precursor: str = "",
) -> None:
    """Write the report as one HTML file without a reference to anything outside it.

    Parameters
    ----------
    path : Path
        In a folder that exists.
    facts : Facts
        The run.
    section, volume : xarray.Dataset
        As :func:`profiles.section.build_section` returns them.
    figures : mapping of str to Path
        As :func:`profiles.report.write_array_figures` returns them.
    mooring_figures : mapping of str to Path
        PNG files by mooring, in the order in which they are shown.
    tables : mapping of str to pandas.DataFrame
        ``data_return``, ``faults`` and ``gaps`` as the quality control returns them, all moorings below one
        another; ``deliveries`` (mooring, file, rows_read, rows_kept, rows_quarantined, rows_reordered, outcome,
        problem) and ``quarantine`` (file, line, reason, text).
    precursor : str, optional
        The section of :func:`profiles.report.precursor_section`.

    Raises
    ------
    MachineError
        Where the file cannot be written.
    """
    plates = list(_plates(figures, section, facts.config))
    content = environment().get_template("page.html").render(
        facts=facts,
        caution=CAUTION,
        findings=findings(section, volume, facts.leave_one_out, tables),
        plates=plates,
        mooring_text=MOORING_TEXT.format(isotherm=f"{facts.config.column.isotherm:g}"),
        moorings=list(_mooring_plates(mooring_figures, tables["data_return"])),
        tables=views(tables),
        settings=list(_settings(facts.config)),
        precursor=Markup(precursor),
        precursor_link=Markup(PRECURSOR_LINK if precursor else ""),
    )  # fmt: skip
    write_text(path, content)


def environment() -> Environment:
    """Return what renders the templates: text is escaped, a name that is missing is an error."""
    return Environment(
        loader=PackageLoader("profiles.report"),
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
    )


def _plates(figures: Mapping[str, Path], section: xr.Dataset, config: Config) -> Iterator[Plate]:
    words = {
        "isotherm": f"{config.column.isotherm:g}",
        "window": window_label(tilt_window(section)),
        "weak": f"{WEAK_SHARE * section.attrs['signal_sd']:.1f}",
    }
    for name, path in figures.items():
        caption = CAPTIONS[name]
        yield Plate(name, caption, caption.text.format_map(words), Picture.read(path))


def _mooring_plates(mooring_figures: Mapping[str, Path], data_return: pd.DataFrame) -> Iterator[MooringPlate]:
    share = mooring_return(data_return)
    for place, (name, path) in enumerate(mooring_figures.items(), start=1):
        returned = percent(float(share[name])) if name in share.index else "–"
        yield MooringPlate(f"mooring-{place}", text(name), returned, Picture.read(path))


def _settings(config: Config) -> Iterator[tuple[str, str]]:
    """Give every threshold of a configuration by its dotted name."""
    for table in ("qc", "column", "section", "precursor"):
        yield from _dotted(table, getattr(config, table).model_dump(mode="json"))


def _dotted(name: str, value: Any) -> Iterator[tuple[str, str]]:
    if isinstance(value, dict):
        for key, inner in value.items():
            yield from _dotted(f"{name}.{key}", inner)
    else:
        yield name, ", ".join(map(str, value)) if isinstance(value, list) else str(value)
