"""What the benches share: timing inside one run, running the command, and a small table."""

from __future__ import annotations

import subprocess
import sys
import time
from collections.abc import Callable, Iterable, Sequence
from pathlib import Path

ROOT = Path(__file__).parents[2]
DEMO = ROOT / "config" / "tropicbird.toml"
COMMAND = (sys.executable, "-c", "from profiles.cli import main; main()")


def seconds(work: Callable[[], object], repeats: int = 5) -> float:
    """Return the shortest of some runs after one that does not count (it compiles and touches memory)."""
    work()
    return min(once(work) for _ in range(repeats))


def once(work: Callable[[], object]) -> float:
    """Return how long one run takes."""
    start = time.perf_counter()
    work()
    return time.perf_counter() - start


def run_demo(out: Path, workers: int) -> None:
    """Run the demo into a folder."""
    subprocess.run([*COMMAND, "run", str(DEMO), "--out", str(out), "--workers", str(workers), "--quiet"], check=True)


def show(title: str, head: Sequence[str], rows: Iterable[Sequence[object]]) -> None:
    """Print a table: the first column to the left, the others to the right."""
    cells = [[*head], *([value if isinstance(value, str) else f"{value:.3g}" for value in row] for row in rows)]
    widths = [max(len(row[place]) for row in cells) for place in range(len(head))]
    print(f"\n{title}")
    for row in cells:
        first, *others = (
            cell.rjust(width) if place else cell.ljust(width)
            for place, (cell, width) in enumerate(zip(row, widths, strict=True))
        )
        print("  " + "  ".join([first, *others]))
