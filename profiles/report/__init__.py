"""Figures, tables and one web page of what a run found."""

from profiles.report.array import write_array_figures
from profiles.report.mooring import column_figure, mooring_figure, write_column_figure, write_mooring_figure
from profiles.report.page import Facts, write_page

__all__ = [
    "Facts",
    "column_figure",
    "mooring_figure",
    "write_array_figures",
    "write_column_figure",
    "write_mooring_figure",
    "write_page",
]
