"""The command line: one small module per command, each of which parses, calls and prints.

What a command needs is imported when it runs, so that ``thermotilt --help`` stays quick.
"""

from __future__ import annotations

import typer

from profiles.cli.check import check
from profiles.cli.draft import draft
from profiles.cli.precursor import precursor
from profiles.cli.run import run
from profiles.cli.validate import validate
from profiles.cli.version import print_version

# Plain help: the marked-up one imports a terminal library that takes longer than all else together.
app = typer.Typer(
    name="thermotilt",
    help="From moored thermistor-chain deliveries to the tilt of the thermocline and the volume of warm water.",
    pretty_exceptions_enable=False,
    add_completion=False,
    rich_markup_mode=None,
    no_args_is_help=True,
)
app.command()(run)
app.command()(check)
app.command()(draft)
app.command()(precursor)
app.command()(validate)
app.callback()(print_version)


def main() -> None:
    """Run the command that the arguments name."""
    app(prog_name="thermotilt")
