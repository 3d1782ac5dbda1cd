"""Tables as CSV: comma, UTF-8, LF, ISO 8601 times, six significant digits."""

from __future__ import annotations

from pathlib import Path

import pandas as pd

from profiles.store.atomic import replacing


def write_table(path: Path, table: pd.DataFrame) -> None:
    """Write a table without its index, whole or not at all."""
    with replacing(path) as temporary, temporary.open("w", encoding="utf-8", newline="") as stream:
        table.to_csv(stream, index=False, float_format="%.6g", date_format="%Y-%m-%dT%H:%M:%SZ", lineterminator="\n")


def read_table(path: Path) -> pd.DataFrame:
    """Read a table that :func:`write_table` wrote; times stay text."""
    return pd.read_csv(path, keep_default_na=False, na_values=[""])
