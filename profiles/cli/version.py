"""``thermotilt --version``."""

from __future__ import annotations

from typing import Annotated

import typer


def _show(wanted: bool) -> None:
    if wanted:
        from importlib.metadata import version

        typer.echo(f"thermotilt {version('thermotilt')}")
        raise typer.Exit


def print_version(
    version: Annotated[
        bool, typer.Option("--version", callback=_show, is_eager=True, help="Print the version and leave.")
    ] = False,
) -> None:
    """From moored thermistor-chain deliveries to the tilt of the thermocline and the volume of warm water."""
