"""The notebook on models runs from the first cell to the last and shows what it promises."""

from __future__ import annotations

import os
import re
from pathlib import Path
from typing import Any

import nbclient
import nbformat
import pytest

ROOT = Path(__file__).parents[1]


def executed(name: str) -> Any:
    notebook = nbformat.read(ROOT / "notebooks" / f"{name}.ipynb", as_version=4)
    client = nbclient.NotebookClient(notebook, timeout=300, resources={"metadata": {"path": str(ROOT / "notebooks")}})
    return client.execute(env=os.environ | {"PYTHONPATH": str(ROOT)})  # this tree, wherever another is installed


def streams(notebook: Any, name: str) -> str:
    outputs = [output for cell in notebook.cells if cell.cell_type == "code" for output in cell.outputs]
    return "".join(output.text for output in outputs if output.output_type == "stream" and output.name == name)


# What runs notebooks warns of matters of its own; the warnings of our code are looked for below.
@pytest.mark.filterwarnings("ignore")
def test_the_notebook_on_models_finds_the_planted_error_and_shows_its_figures() -> None:
    notebook = executed("tilt_validation")
    outputs = [output for cell in notebook.cells if cell.cell_type == "code" for output in cell.outputs]
    assert sum("image/png" in output.get("data", {}) for output in outputs) == 4
    text = streams(notebook, "stdout")
    assert "national services" in text
    assert "potential temperature, K" in text
    tilt = re.search(r"tilt: planted (.+) m per 1000 km\n  as seen .+ whole \S+ \((\S+) to (\S+)\)", text)
    assert tilt is not None
    planted, low, high = (float(value) for value in tilt.groups())
    assert low < planted < high
    assert "flatter than the array" in text
    assert "Warning" not in streams(notebook, "stderr")
