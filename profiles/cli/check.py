"""``thermotilt check CONFIG``: everything that is wrong, before any work."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from profiles.cli.console import ending, print_json
from profiles.errors import EXIT_DATA, EXIT_DONE, EXIT_PARTIAL

if TYPE_CHECKING:
    from profiles.pipeline import Finding


def check(
    config: Annotated[Path, typer.Argument(help="The configuration file (TOML).", show_default=False)],
    quiet: Annotated[bool, typer.Option("--quiet", help="Print only what is wrong.")] = False,
    as_json: Annotated[bool, typer.Option("--json", help="Print one JSON document instead of text.")] = False,
) -> None:
    """Say everything that is wrong, before any work.

    Every delivery is read once; nothing is written.
    """
    with ending(as_json=as_json):
        from profiles.config import load_config
        from profiles.pipeline import survey

        loaded = load_config(config)
        findings = survey(loaded)
        exit_code = _exit_code(findings)
        if as_json:
            print_json({"exit_code": exit_code, "deliveries": [_row(finding) for finding in findings]})
        else:
            _print(findings, quiet=quiet)
        raise typer.Exit(exit_code)


def _exit_code(findings: list[Finding]) -> int:
    unusable = [finding for finding in findings if finding.outcome == "not usable"]
    if len(unusable) == len(findings):
        return EXIT_DATA
    return EXIT_PARTIAL if unusable else EXIT_DONE


def _row(finding: Finding) -> dict[str, object]:
    return vars(finding) | {"file": finding.file.as_posix()}


def _print(findings: list[Finding], *, quiet: bool) -> None:
    for finding in findings:
        if finding.message:
            typer.echo(f"{finding.mooring}: {finding.outcome}: {finding.file.as_posix()}\n    {finding.message}")
    if quiet:
        return
    counts = {
        outcome: sum(finding.outcome == outcome for finding in findings)
        for outcome in ("clean", "rows sorted", "rows quarantined", "not usable")
    }
    read, kept = sum(finding.rows_read for finding in findings), sum(finding.rows_kept for finding in findings)
    typer.echo("deliveries: " + ", ".join(f"{count} {outcome}" for outcome, count in counts.items()))
    typer.echo(f"rows read {read} = kept {kept} + quarantined {read - kept}")
