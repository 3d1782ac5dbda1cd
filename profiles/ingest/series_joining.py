"""Several series to one: who wins where two have the same."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import pandas as pd

from profiles.ingest.record import verify_count
from profiles.ingest.series import KEY, NO_STATUS, QUANTITIES, Series
from profiles.vocabulary import Flag


def join_series(files: Sequence[Series]) -> tuple[pd.DataFrame, list[Series]]:
    """Put series together; where two have a quantity of one mooring and time, the one listed first wins.

    Returns
    -------
    values : pandas.DataFrame
        As :class:`Series` has them, by mooring, months behind the others, and time; ``number`` is
        the place of the file in the list, from 1.
    files : list of Series
        Those given; rows of which every value lost are rejected.
    """
    together = pd.concat(
        [series.values.assign(number=place) for place, series in enumerate(files, start=1)], ignore_index=True
    )
    context = [name for name in ("number", "mean_hours", "deployment") if name in together]
    joined = together.drop_duplicates(KEY)[[*KEY, *context]]
    won = pd.Series(False, index=together.index)
    lost = pd.Series(False, index=together.index)
    for quantity, columns in QUANTITIES.items():
        has = together[quantity].notna()
        if quantity == "isotherm_depth":
            has |= together["isotherm_status"] > NO_STATUS
        ours = together[has]
        is_repeat = ours.duplicated(KEY)
        won[ours.index[~is_repeat]] = True
        lost[ours.index[is_repeat]] = True
        joined = joined.merge(ours.loc[~is_repeat, [*KEY, *columns]], on=KEY, how="left")
    beaten = _beaten_lines(together, won, lost)
    kept = [series.without(beaten.get(place, {})) for place, series in enumerate(files, start=1)]
    for series in kept:
        verify_count(series.rows_read, series.rows_kept, series.rows_quarantined, str(series.path))
    return _with_codes(joined).sort_values(KEY, kind="stable").reset_index(drop=True), kept


def _beaten_lines(together: pd.DataFrame, won: pd.Series[bool], lost: pd.Series[bool]) -> dict[int, dict[int, str]]:
    """Return the rows of which nothing is left, by file and line, with the reason."""
    by_line = pd.DataFrame({"number": together["number"], "line": together["line"], "won": won, "lost": lost})
    rows = by_line.groupby(["number", "line"])[["won", "lost"]].any()
    reason = "a series that is listed before has this mooring and time, and comes first"
    found: dict[int, dict[int, str]] = {}
    for number, line in rows.index[rows["lost"] & ~rows["won"]]:
        found.setdefault(int(number), {})[int(line)] = reason
    return found


def _with_codes(joined: pd.DataFrame) -> pd.DataFrame:
    """Fill in what stands for no flag and no status where a time has no value of a quantity."""
    flags = [str(name) for name in joined if str(name).endswith("_flag")]
    filled = joined.fillna(dict.fromkeys(flags, int(Flag.NOT_EVALUATED)) | {"isotherm_status": NO_STATUS})
    return filled.astype(dict.fromkeys([*flags, "isotherm_status"], np.int8))
