"""The numbers that a reader wants first, from the datasets and tables of a run."""

from __future__ import annotations

import pandas as pd


def mooring_return(data_return: pd.DataFrame) -> pd.Series[float]:
    """Return the share of expected values that could be used, by mooring, of a table with one row per sensor."""
    table = data_return.assign(used=data_return["good"] + data_return["not_evaluated"])
    sums = table.groupby("mooring", sort=False)[["used", "expected"]].sum()
    return sums["used"] / sums["expected"]
