"""The recovery log: when each deployment of a mooring was in the water."""

from __future__ import annotations

import csv
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import cast

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from profiles.errors import ConfigError, DataError, RequestError
from profiles.ingest.clock import parse_times
from profiles.ingest.source import check_file
from profiles.ingest.wording import listed

COLUMNS = ("mooring", "deployment", "deployed", "recovered")
_NEVER = np.datetime64("2262-01-01", "ns")

Times = NDArray[np.datetime64]


@dataclass(frozen=True)
class Service:
    """The deployments of one mooring in order of time.

    Attributes
    ----------
    number : ndarray of int16
    deployed, recovered : ndarray of datetime64[ns]
        UTC; a mooring that was never recovered is taken to be out until the next one is deployed.
    """

    number: NDArray[np.int16]
    deployed: Times
    recovered: Times

    def deployment_at(self, time: Times) -> NDArray[np.int16]:
        """Return the number of the last deployment begun, before the first one its number."""
        return self.number[np.maximum(np.searchsorted(self.deployed, time, side="right") - 1, 0)]

    def is_out(self, time: Times) -> NDArray[np.bool_]:
        """Tell which times lie within a deployment."""
        last = np.searchsorted(self.deployed, time, side="right") - 1
        return (last >= 0) & (time <= self.recovered[np.maximum(last, 0)])


def read_recovery_log(path: Path) -> dict[str, Service]:
    """Read a recovery log.

    Parameters
    ----------
    path : Path
        CSV with the columns mooring, deployment (a whole number), deployed and recovered (ISO 8601, UTC where no offset
        is stated; recovered may be empty), others as one likes; a row a deployment, lines that begin with # aside.

    Returns
    -------
    dict of str to Service
        By mooring.

    Raises
    ------
    RequestError, DataError, MachineError
        Where there is no such file, or it is no such table; all wrong rows are named.
    """
    check_file(path)
    table = _table(path)
    missing = [name for name in COLUMNS if name not in table]
    if missing:
        raise DataError(
            "the recovery log lacks columns",
            where=str(path),
            expected=listed(COLUMNS),
            found=listed(str(name) for name in table),
            advice=f"add {listed(missing)}",
        )
    return {str(name): _service(rows, path) for name, rows in _checked(table, path).groupby("mooring", sort=False)}


def _table(path: Path) -> pd.DataFrame:
    """Return the rows as text, with the number of the line in the column ``line``."""
    try:
        with path.open(encoding="utf-8-sig", newline="") as file:
            reader = csv.reader(file, strict=True)
            rows = [(reader.line_num, row) for row in reader if row and not row[0].lstrip().startswith("#")]
    except (csv.Error, UnicodeDecodeError) as error:
        raise DataError("is no table", where=str(path), expected="CSV", found=str(error)) from None
    names = [name.strip() for name in rows[0][1]] if rows else []
    ragged = [RequestError("a row of another length", where=f"line {line}", expected=f"{len(names)} cells",
                           found=str(len(row))) for line, row in rows[1:] if len(row) != len(names)]  # fmt: skip
    if ragged:
        raise ConfigError(str(path), ragged)
    cells = [[cell.strip() for cell in row] for _, row in rows[1:]]
    return pd.DataFrame(cells, columns=names, dtype=str).assign(line=[line for line, _ in rows[1:]])


def _checked(table: pd.DataFrame, path: Path) -> pd.DataFrame:
    deployed, wrong_start = parse_times(list(table["deployed"]), time_format="iso8601", zone="UTC")
    recovered, wrong_end = parse_times(list(table["recovered"]), time_format="iso8601", zone="UTC")
    is_open = (table["recovered"] == "").to_numpy()
    number = pd.to_numeric(table["deployment"], errors="coerce")
    problems = [
        RequestError(reason, where=f"line {line}", found=found)
        for reason, wrong, column in (
            ("the time of deployment cannot be read", pd.notna(wrong_start), "deployed"),
            ("the time of recovery cannot be read", pd.notna(wrong_end) & ~is_open, "recovered"),
            ("recovered before it was deployed", recovered < deployed, "recovered"),
            ("the number of the deployment is no whole number", ~((number % 1 == 0) & (number > 0)), "deployment"),
        )
        for line, found in table.loc[np.asarray(wrong), ["line", column]].itertuples(index=False)
    ]
    if problems:
        raise ConfigError(str(path), problems)
    return table.assign(deployed=deployed, recovered=recovered, deployment=number.astype(np.int16))


def _service(rows: pd.DataFrame, path: Path) -> Service:
    """Return the deployments of one mooring; raise DataError where two of them overlap."""
    rows = rows.sort_values("deployed", kind="stable")
    deployed = cast(Times, rows["deployed"].to_numpy())
    following = np.append(deployed[1:], _NEVER)
    recovered = cast(Times, rows["recovered"].fillna(pd.Series(following, index=rows.index)).to_numpy())
    overlap = np.flatnonzero(recovered[:-1] > deployed[1:])
    if overlap.size:
        first, second = rows["line"].to_numpy()[[overlap[0], overlap[0] + 1]]
        raise DataError(
            "a mooring is deployed before the one at its place was recovered",
            where=f"{path}, lines {first} and {second}",
            expected="one deployment after the other",
            found=f"deployed {rows['deployed'].iloc[overlap[0] + 1]}, recovered {rows['recovered'].iloc[overlap[0]]}",
            advice="correct the log",
        )
    return Service(rows["deployment"].to_numpy().astype(np.int16), deployed, recovered)


def unknown_moorings(log: dict[str, Service], moorings: Sequence[str]) -> list[str]:
    """Return the moorings that a log has and a configuration has not."""
    return [name for name in log if name not in moorings]
