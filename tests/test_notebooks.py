"""The notebooks run from the first cell to the last and show what they promise."""

from __future__ import annotations

import os
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


def printed(notebook: Any) -> str:
    outputs = [output for cell in notebook.cells if cell.cell_type == "code" for output in cell.outputs]
    return "".join(output.text for output in outputs if output.output_type == "stream" and output.name == "stdout")


# What runs notebooks warns of matters of its own; the warnings of our code are looked for below.
@pytest.mark.filterwarnings("ignore")
def test_the_notebook_on_precursors_runs_and_shows_its_figures() -> None:
    notebook = executed("volume_precursor")
    pictures = [
        output
        for cell in notebook.cells
        if cell.cell_type == "code"
        for output in cell.outputs
        if "image/png" in output.get("data", {})
    ]
    assert len(pictures) == 6
    text = printed(notebook)
    assert "national services" in text
    assert "withheld: the record is too short to show skill: 6.0 years" in text
    assert "Warning" not in "".join(
        output.text
        for cell in notebook.cells
        if cell.cell_type == "code"
        for output in cell.outputs
        if output.output_type == "stream" and output.name == "stderr"
    )
