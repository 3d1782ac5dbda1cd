"""Figures, tables and one web page of what a run found."""

from profiles.report.array import write_array_figures
from profiles.report.mooring import column_figure, mooring_figure, write_column_figure, write_mooring_figure
from profiles.report.page import Facts, write_page
from profiles.report.precursor import write_precursor_figures
from profiles.report.precursor_section import (
    PrecursorFacts,
    insert_precursor,
    precursor_section,
    write_precursor_page,
)
from profiles.report.validation import write_model_figures
from profiles.report.validation_page import write_model_page

__all__ = [
    "Facts",
    "PrecursorFacts",
    "column_figure",
    "insert_precursor",
    "mooring_figure",
    "precursor_section",
    "write_array_figures",
    "write_column_figure",
    "write_model_figures",
    "write_model_page",
    "write_mooring_figure",
    "write_page",
    "write_precursor_figures",
    "write_precursor_page",
]
