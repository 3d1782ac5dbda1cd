"""Figures, tables and one web page of what a run found."""

from profiles.report.array import write_array_figures
from profiles.report.mooring import mooring_figure, write_mooring_figure
from profiles.report.page import Facts, write_page
from profiles.report.validation import write_model_figures
from profiles.report.validation_page import write_model_page

__all__ = [
    "Facts",
    "mooring_figure",
    "write_array_figures",
    "write_model_figures",
    "write_model_page",
    "write_mooring_figure",
    "write_page",
]
