"""Where everything lies in a run's folder."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

from profiles.pipeline.task import HIDDEN

#: Where the columns of a mooring come from: its chain, or a series from elsewhere of days (or less) or of months.
CHAIN, DAYS, MONTHS = "chain", "days", "months"

#: What belongs to the series together; no mooring can be called so.
SERIES = "(series)"


@dataclass(frozen=True)
class Folder:
    """A run's folder."""

    out: Path

    def delivered(self, mooring: str) -> Path:
        """The chain as ingested, before flags."""
        return self.out / HIDDEN / "ingest" / f"{mooring}.nc"

    def series(self, mooring: str, kind: str) -> Path:
        """What series from elsewhere have of one mooring, of days or of months."""
        return self.out / HIDDEN / "series" / f"{mooring}.{kind}.nc"

    def part(self, table: str, mooring: str) -> Path:
        """One mooring's rows of a table."""
        return self.out / HIDDEN / "tables" / f"{table}.{mooring}.csv"

    def means(self, mooring: str, step: str) -> Path:
        """One mooring's daily or monthly means."""
        return self.out / HIDDEN / "means" / f"{mooring}.{step}.nc"

    def chain(self, mooring: str) -> Path:
        """The flagged chain."""
        return self.out / "chains" / f"{mooring}.nc"

    def columns(self, mooring: str, beside: str = "") -> Path:
        """One mooring's columns at its own times; those that come second, if there are such, beside them."""
        return self.out / "columns" / (f"series/{mooring}.{beside}.nc" if beside else f"{mooring}.nc")

    def table(self, name: str) -> Path:
        """A table of the whole array."""
        return self.out / "tables" / f"{name}.csv"

    def figure(self, name: str) -> Path:
        """A figure."""
        return self.out / "figures" / f"{name}.png"

    @property
    def daily(self) -> Path:
        """Daily means of all moorings."""
        return self.out / "columns.nc"

    @property
    def monthly(self) -> Path:
        """Monthly means of all moorings."""
        return self.out / "columns_monthly.nc"

    @property
    def section(self) -> Path:
        """The map, the equatorial section and the tilt."""
        return self.out / "section.nc"

    @property
    def volume(self) -> Path:
        """The warm water volume."""
        return self.out / "volume.nc"

    @property
    def precursor(self) -> Path:
        """The series of a precursor analysis, their lead-lag correlations and the events."""
        return self.out / "precursor.nc"

    @property
    def hindcast(self) -> Path:
        """The hindcast of the index."""
        return self.out / "precursor_hindcast.nc"

    @property
    def scores(self) -> Path:
        """The scores of the hindcast."""
        return self.out / "precursor_scores.nc"

    @property
    def reliability(self) -> Path:
        """The reliability of the hindcast's probabilities."""
        return self.out / "precursor_reliability.nc"

    @property
    def oscillator(self) -> Path:
        """The recharge oscillator."""
        return self.out / "precursor_oscillator.nc"

    @property
    def outlook(self) -> Path:
        """The outlook from the last month."""
        return self.out / "precursor_outlook.nc"

    @property
    def precursor_section(self) -> Path:
        """The report's section on precursors, and what it was made from."""
        return self.out / HIDDEN / "precursor_section.json"

    @property
    def page(self) -> Path:
        """The report."""
        return self.out / "report.html"

    @property
    def account(self) -> Path:
        """What was run, from what, and how long it took."""
        return self.out / "run.json"

    def folders(self) -> list[Path]:
        """Return every folder that a run writes to."""
        hidden = [self.out / HIDDEN / name for name in ("ingest", "series", "tables", "means", "records")]
        return [self.out, *hidden, *(self.out / name for name in ("chains", "columns", "tables", "figures"))]
