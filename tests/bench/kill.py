"""The demo killed at random moments over its length, started again each time, and compared with a run that was not.

    python tests/bench/kill.py [--kills 20] [--seed 1] [--workers 2]

The moments are drawn evenly over the length of an uninterrupted run. Each start is given, on top, the time that a run
with nothing to do takes, so that the whole length is covered. SIGKILL goes to the whole process group.
"""

from __future__ import annotations

import argparse
import os
import random
import signal
import subprocess
import tempfile
from pathlib import Path

from measure import COMMAND, DEMO, once, run_demo, show


def contents(out: Path) -> dict[str, bytes]:
    """Read every file of a run but those that hold times and the records of tasks."""
    files = {path.relative_to(out).as_posix(): path for path in out.rglob("*") if path.is_file()}
    apart = ("run.json", ".stages/records/", ".stages/ingest/lock")
    return {name: path.read_bytes() for name, path in sorted(files.items()) if not name.startswith(apart)}


def progress(out: Path) -> tuple[int, int, str]:
    """Return how many tasks are recorded, how many unfinished files lie about, and the stage of the last record."""
    records = sorted((out / ".stages" / "records").glob("[!.]*.json"), key=lambda path: path.stat().st_mtime_ns)
    leftovers = sum(1 for _ in out.rglob(".part-*"))
    return len(records), leftovers, records[-1].name.partition(".")[0] if records else "none"


def killed_after(out: Path, workers: int, wait: float) -> bool:
    """Start the demo, kill it after a while; return whether it was still running."""
    arguments = ["run", str(DEMO), "--out", str(out), "--workers", str(workers), "--quiet"]
    process = subprocess.Popen([*COMMAND, *arguments], start_new_session=True)
    try:
        process.wait(timeout=wait)
    except subprocess.TimeoutExpired:
        os.killpg(process.pid, signal.SIGKILL)
        process.wait()
        return True
    return False


def main() -> None:
    """Run, kill, compare, print."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--kills", type=int, default=20)
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--workers", type=int, default=2)
    options = parser.parse_args()
    with tempfile.TemporaryDirectory() as folder:
        whole, cut = Path(folder) / "whole", Path(folder) / "cut"
        length = once(lambda: run_demo(whole, options.workers))
        start = once(lambda: run_demo(whole, options.workers))
        draws = random.Random(options.seed)
        moments = sorted(draws.uniform(0.0, length - start) for _ in range(options.kills))
        rows = []
        for number, (before, moment) in enumerate(zip([0.0, *moments], moments, strict=False), start=1):
            wait = start + moment - before
            killed = killed_after(cut, options.workers, wait)
            done, leftovers, stage = progress(cut)
            rows.append([f"{number}", moment, wait, "yes" if killed else "had ended", f"{done}", f"{leftovers}", stage])
        last = once(lambda: run_demo(cut, options.workers))
        uninterrupted, resumed = contents(whole), contents(cut)
    show(
        f"The demo, {length:.1f} s uninterrupted, {start:.1f} s with nothing to do, {options.workers} workers",
        ["kill", "moment, s", "after start, s", "killed", "tasks recorded", "unfinished files", "last stage recorded"],
        rows,
    )
    differing = sorted(
        name for name in uninterrupted.keys() | resumed.keys() if uninterrupted.get(name) != resumed.get(name)
    )
    print(f"\n  finished in {last:.1f} s after the last kill")
    print(f"  {len(uninterrupted)} files compared, {len(differing)} differ")
    print("".join(f"    {name}\n" for name in differing), end="")
    raise SystemExit(1 if differing else 0)


if __name__ == "__main__":
    main()
