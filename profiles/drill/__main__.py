"""Make the demo data again: ``python -m profiles.drill FOLDER``."""

from __future__ import annotations

import argparse
import sys
from pathlib import Path

from profiles.drill.demo import SEED, make_demo
from profiles.drill.model import make_model
from profiles.drill.supplements import make_supplements
from profiles.errors import EXIT_DONE, ThermotiltError


def main(arguments: list[str] | None = None) -> int:
    """Parse, make, report; return the exit code."""
    parser = argparse.ArgumentParser(
        prog="python -m profiles.drill",
        description="Make the demo data of the invented Tropicbird Array: deliveries, companions, a model, truth.",
    )
    parser.add_argument("folder", type=Path, help="gets the demo data; files of the same names are replaced")
    parser.add_argument(
        "--seed", type=int, default=SEED, help="another seed makes another ocean (default: %(default)s)"
    )
    options = parser.parse_args(arguments)
    try:
        make_demo(options.folder, seed=options.seed, progress=print)
        make_supplements(options.folder, seed=options.seed, progress=print)
        make_model(options.folder, seed=options.seed, progress=print)
    except ThermotiltError as error:
        print(error, file=sys.stderr)
        return error.exit_code
    return EXIT_DONE


if __name__ == "__main__":
    sys.exit(main())
