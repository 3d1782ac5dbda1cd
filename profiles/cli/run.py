"""``thermotilt run CONFIG``: the whole job."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from profiles.cli.console import ending, print_json, progress

if TYPE_CHECKING:
    from profiles.config import Config
    from profiles.pipeline import Outcome


def run(
    config: Annotated[Path, typer.Argument(help="The configuration file (TOML).", show_default=False)],
    out: Annotated[Path | None, typer.Option(help="Output folder; default out/ and the configuration's name.")] = None,
    until: Annotated[str, typer.Option(help="Last stage: ingest, qc, column, section or report.")] = "report",
    workers: Annotated[int | None, typer.Option(help="Processes; default one per processor.")] = None,
    quiet: Annotated[bool, typer.Option("--quiet", help="Print nothing but errors.")] = False,
    as_json: Annotated[bool, typer.Option("--json", help="Print one JSON document instead of text.")] = False,
) -> None:
    """Do the whole job, from deliveries to the report.

    The stages are ingest, qc (quality control), column, section and report. What an earlier run finished in the same
    folder is kept where its inputs and settings are the same.
    """
    with ending(as_json=as_json):
        from profiles import pipeline
        from profiles.config import load_config

        loaded = load_config(config)
        folder = out if out is not None else Path("out") / config.stem
        with progress(silent=quiet or as_json) as show:
            outcome = pipeline.run(loaded, folder, until=until, workers=workers, progress=show)
        if as_json:
            print_json(_document(outcome))
        else:
            _print(loaded, outcome, quiet=quiet)
        raise typer.Exit(outcome.exit_code)


def _document(outcome: Outcome) -> dict[str, object]:
    return {
        "out": str(outcome.out),
        "exit_code": outcome.exit_code,
        "stages": list(outcome.stages),
        "moorings": list(outcome.moorings),
        "rows": outcome.rows,
        "problems": [vars(problem) for problem in outcome.problems],
        "tasks": {"computed": outcome.computed, "kept": outcome.kept},
        "seconds": outcome.seconds,
        "months": outcome.months,
        "series_notes": outcome.notes,
        "latest": outcome.latest,
    }


def _print(config: Config, outcome: Outcome, *, quiet: bool) -> None:
    for problem in outcome.problems:
        typer.echo(f"thermotilt: {problem.mooring} not used ({problem.stage}): {problem.message}", err=True)
    if not quiet:
        typer.echo("\n".join(_summary(config, outcome)))


def _summary(config: Config, outcome: Outcome) -> list[str]:
    from profiles.vocabulary import CAUTION

    rows = outcome.rows
    lines = [
        f"{config.array.name}: {len(outcome.moorings)} of {len(config.moorings)} moorings used",
        f"rows read {rows['rows_read']} = kept {rows['rows_kept']} + quarantined {rows['rows_quarantined']}",
        *_row_notes(rows),
        *_series_notes(outcome),
        f"tasks computed {outcome.computed}, kept from an earlier run {outcome.kept}",
    ]
    if outcome.latest is not None:
        lines += [*_latest(config, outcome.latest), CAUTION]
    shown = outcome.out / "report.html" if "report" in outcome.stages else outcome.out
    return [*lines, f"see {shown}"]


def _row_notes(rows: dict[str, int]) -> list[str]:
    notes = {
        "rows_quarantined": "rows were not understood: tables/quarantine.csv has each with its line and the reason",
        "rows_reordered": "rows stood out of order and were sorted: tables/deliveries.csv says in which files",
    }
    return [f"{rows[name]} {note}" for name, note in notes.items() if rows[name]]


def _series_notes(outcome: Outcome) -> list[str]:
    """Say what came from series, what was the chains' although series have it too, and what to know of the files."""
    counts = {
        source: sum(months.get(source, 0) for months in outcome.months.values()) for source in ("chain", "series")
    }
    said = [f"{file}: {note}" for file, notes in outcome.notes.items() for note in notes]
    if counts["series"] or said:
        said.append(
            f"monthly means from chains {counts['chain']}, from series {counts['series']}; a chain's come first "
            "(column_source in columns_monthly.nc says which is which)"
        )
    return said


def _latest(config: Config, latest: dict[str, float]) -> list[str]:
    west, east = config.section.tilt_window
    volume, volume_half = latest["warm_water_volume"] / 1e14, 1.96 * latest["warm_water_volume_error"] / 1e14
    slope, slope_half = latest["thermocline_slope"], 1.96 * latest["thermocline_slope_error"]
    return [
        f"{latest['month']}, with 95 % intervals:",
        f"  warm water volume {volume:.2f} ± {volume_half:.2f} × 10^14 m3 (5S-5N, 120E-80W)",
        f"  thermocline slope {slope:.2f} ± {slope_half:.2f} m per 1000 km eastward ({west:g}E to {east:g}E)",
    ]
