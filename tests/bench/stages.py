"""Where the time of the demo run goes, with one worker and with two, and what a second run over it takes."""

from __future__ import annotations

import argparse
import json
import tempfile
from pathlib import Path

from measure import once, run_demo, show


def stage_seconds(out: Path) -> dict[str, float]:
    """Read a run's seconds by stage."""
    return dict(json.loads((out / "run.json").read_text(encoding="utf-8"))["seconds"])


def main() -> None:
    """Run and print."""
    argparse.ArgumentParser(description=__doc__).parse_args()
    columns: dict[str, dict[str, float]] = {}
    with tempfile.TemporaryDirectory() as folder:
        for workers in (1, 2):
            out = Path(folder) / f"workers-{workers}"
            whole = once(lambda out=out, workers=workers: run_demo(out, workers))
            columns[f"{workers} worker{'s' * (workers - 1)}"] = stage_seconds(out) | {"whole command": whole}
        again = once(lambda: run_demo(out, 2))
        columns["run again"] = stage_seconds(out) | {"whole command": again}
    show(
        "The demo run, seconds by stage",
        ["", *columns, "1 over 2 workers"],
        [
            [stage, *(column[stage] for column in columns.values()), alone / columns["2 workers"][stage]]
            for stage, alone in columns["1 worker"].items()
        ],
    )


if __name__ == "__main__":
    main()
