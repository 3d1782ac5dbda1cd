"""One web page that holds a comparison of models with the array and needs nothing else."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import xarray as xr
from jinja2 import Environment, PackageLoader, StrictUndefined

from profiles.report.captions import Caption
from profiles.report.model_findings import NOT_SCORED, ModelFinding, model_findings, readings
from profiles.report.page import Picture, Plate
from profiles.report.summary import number
from profiles.report.tables import text
from profiles.store import write_text
from profiles.vocabulary import CAUTION

_SPLIT = (
    "Solid: the full model on its own grid; dashed: the model read where and when the array's sensors have good data, "
    "then mapped as the array is. Below, both less the array: the dark band about zero is what the array's measurement "
    "cannot tell (95 %), the line to read against it is the dashed one; the light band holds also what the map cannot "
    "know away from the moorings, for the solid one. What lies between the two lines is hidden by the sampling."
)

CAPTIONS: Mapping[str, Caption] = {
    "validation_section": Caption(
        "Section along the equator",
        "Mean depth of the isotherm, 2.5°S-2.5°N, over the months that array and model both have; dotted: where the "
        "temperature of the full model falls most steeply, which stays where it is in a model that is only too "
        f"warm. Diamonds: bias at the lines of moorings with 95 % intervals. {_SPLIT} Bands: the mean half-width of "
        "the monthly intervals, which the interval of an average does not exceed.",
        "Mean depth of the isotherm along the equator of array and model, and their difference with what the array "
        "cannot tell.",
    ),
    "validation_tilt": Caption(
        "Tilt of the thermocline",
        f"Monthly slope in m per 1000 km towards the east; negative: shoaling eastward. {_SPLIT}",
        "Tilt of array and model against time, and their difference with what the array cannot tell.",
    ),
    "validation_volume": Caption(
        "Volume of warm water",
        f"Monthly volume above the isotherm in 5°S-5°N, 120°E-80°W, in 10¹⁴ m³. {_SPLIT}",
        "Volume of array and model against time, and their difference with what the array cannot tell.",
    ),
    "validation_time_longitude": Caption(
        "Along the equator against time",
        "Monthly depth of the isotherm, mean of 2.5°S-2.5°N: the array's map, the full model, and model less array. "
        "Hatched: the difference is smaller than half the width of the array's 95 % interval, so that the array "
        "cannot tell it from none.",
        "Depth of the isotherm as colour against longitude and time of array and model, and their difference, hatched "
        "where the array cannot tell it.",
    ),
    "validation_pattern": Caption(
        "Pattern diagram",
        "After Taylor (2001, J. Geophys. Res. 106, 7183-7192, equation 5): distance from the origin is the ratio of "
        "standard deviations, model as seen to array; the angle is the correlation; the distance from the star is the "
        "centred rms difference. Bars: 95 % intervals with the effective number of months. Grey about the star: the "
        "array's own rms error; a model that is the ocean would stand at the rim of it, and one within it cannot be "
        "told from the ocean by how it varies. Biases do not show here.",
        "Pattern diagram of the models about the array, whole and closer, with the array's own error.",
    ),
}


@dataclass(frozen=True)
class Row:
    """A line of a model's table, as text."""

    label: str
    array: str
    bias: str
    verdict: str
    difference: str
    hidden: str
    share: str


@dataclass(frozen=True)
class ModelView:
    """A model as the page shows it."""

    name: str
    reading: str
    rows: list[Row]


def write_model_page(path: Path, comparison: xr.Dataset, figures: Mapping[str, Path], *, array: str) -> None:
    """Write a comparison as one HTML file without a reference to anything outside it.

    Parameters
    ----------
    path : Path
        In a folder that exists.
    comparison : xarray.Dataset
        As :func:`profiles.validation.side_by_side` returns it.
    figures : mapping of str to Path
        As :func:`profiles.report.write_model_figures` returns them.
    array : str
        The array's name.

    Raises
    ------
    MachineError
        Where the file cannot be written.
    """
    environment = Environment(
        loader=PackageLoader("profiles.report"),
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
    )
    content = environment.get_template("validation_page.html").render(
        title=f"Models against {text(array)}",
        caution=CAUTION,
        models=[_view(comparison.sel(model=model)) for model in comparison["model"].values],
        plates=[Plate(name, CAPTIONS[name], CAPTIONS[name].text, Picture.read(file)) for name, file in figures.items()],
    )  # fmt: skip
    write_text(path, content)


def _view(one: xr.Dataset) -> ModelView:
    return ModelView(text(one["model"].item()), text(readings(one)), [_row(finding) for finding in model_findings(one)])


def _row(finding: ModelFinding) -> Row:
    def shown(value: float) -> str:
        return number(round(value, finding.decimals) + 0.0, finding.decimals)  # no minus before a zero

    unit = finding.unit.replace("10^14 m3", "10¹⁴ m³")
    basis = "" if finding.observed else ", of sampling"
    bias = f"{shown(finding.bias)} ({shown(finding.low)} to {shown(finding.high)}{basis})"
    known = np.isfinite(finding.difference)
    return Row(
        label=f"{finding.label[0].upper()}{finding.label[1:]} ({unit})",
        array=shown(finding.array),
        bias=bias if finding.verdict != NOT_SCORED else "–",
        verdict=finding.verdict,
        difference=f"{shown(finding.difference)} ± {shown(finding.difference_half_width)}" if known else "–",
        hidden=shown(-finding.hidden),
        share=f"{100.0 * finding.share:.0f} %" if np.isfinite(finding.share) else "–",
    )
