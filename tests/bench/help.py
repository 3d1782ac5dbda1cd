"""``thermotilt --help`` against ``python -c "import numpy"``, alternating, medians."""

from __future__ import annotations

import argparse
import statistics
import subprocess
import sys

from measure import COMMAND, once, show

CALLS = {
    'python -c "import numpy"': [sys.executable, "-c", "import numpy"],
    "thermotilt --help": [*COMMAND, "--help"],
    "thermotilt run --help": [*COMMAND, "run", "--help"],
}


def main() -> None:
    """Time and print."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--rounds", type=int, default=15)
    rounds = parser.parse_args().rounds
    times: dict[str, list[float]] = {name: [] for name in CALLS}
    for _ in range(rounds + 1):
        for name, call in CALLS.items():
            times[name].append(once(lambda call=call: subprocess.run(call, check=True, stdout=subprocess.DEVNULL)))
    medians = {name: statistics.median(taken[1:]) for name, taken in times.items()}  # the first fills the disk's cache
    floor = next(iter(medians.values()))
    show(
        f"Start of the command, median of {rounds} alternating rounds",
        ["", "seconds", "ratio", "aim"],
        [
            [name, median, median / floor, "at most 2" if "thermotilt" in name else ""]
            for name, median in medians.items()
        ],
    )


if __name__ == "__main__":
    main()
