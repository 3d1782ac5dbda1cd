"""Figures of a comparison of models, and its page."""

from __future__ import annotations

from pathlib import Path

import xarray as xr

from profiles import store

PAGE = "validation.html"


def write_validation_report(out: Path, comparison: xr.Dataset) -> Path:
    """Draw the figures of a comparison into a run's folder and write the page that holds them; return the page.

    Parameters
    ----------
    out : Path
        The run's folder.
    comparison : xarray.Dataset
        As :func:`profiles.validation.side_by_side` returns it.

    Raises
    ------
    MachineError
        Where the folder cannot be written.
    """
    from profiles.report import write_model_figures, write_model_page

    figures = write_model_figures(store.make_folder(out / "figures"), comparison)
    account = store.read_record(out / "run.json") or {}
    array = str(account.get("configuration", {}).get("array", {}).get("name", "the array"))
    write_model_page(out / PAGE, comparison, figures, array=array)
    return out / PAGE
