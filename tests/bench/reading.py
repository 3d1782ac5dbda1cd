"""Reading text: speed against ``pandas.read_csv``, and whether the memory grows with the record.

Files are made here, in a folder that is removed at the end. Each measurement is a process of its own: the two readers
take turns, and the shortest run of each counts; the peak memory is what the system says of a process that reads a file
and writes its blocks as a run of the tool does.
"""

from __future__ import annotations

import argparse
import json
import subprocess
import sys
import tempfile
import warnings
from collections.abc import Callable, Iterable, Iterator, Sequence
from pathlib import Path

import numpy as np
import pandas as pd
from measure import once, show

from profiles.ingest import read
from profiles.ingest.layout import LongLayout, WideLayout
from profiles.store import write_blocks

DEPTHS = (1, 10, 20, 40, 60, 80, 100, 120, 140, 180, 220, 300, 400, 500)
STEP = np.timedelta64(10, "m")
START = np.datetime64("2031-01-01T00:00:00", "s")
PIECE = 50_000  # rows of a file that are made at a time
TAILS = 5_000  # different rows of readings
WORST = ("x", "1e999", "--3", "20.1,4.0")  # in place of a reading, in a bad row
WIDE = {"kind": "wide", "time": {"column": "time"}, "depth": {"pattern": "T{depth}"}}
LONG = {
    "kind": "long", "time": {"column": "time"}, "depth": {"column": "depth"}, "temperature": {"column": "temperature"}
}  # fmt: skip


# --------------------------------------------------------------------------------------------------------------
# Files


def stamps(rows: int, *, shuffled: bool = False) -> Iterator[list[str]]:
    """Yield 10-minute stamps, in order or in none."""
    steps = np.random.default_rng(1).permutation(rows) if shuffled else np.arange(rows)
    for first in range(0, rows, PIECE):
        yield np.datetime_as_string(START + steps[first : first + PIECE] * STEP, unit="s").tolist()


def readings(random: np.random.Generator, rows: int, form: str = "{:.3f}") -> list[list[str]]:
    """Return rows of temperatures as a thermocline has them."""
    mean = 20.0 - 9.0 * np.tanh((np.array(DEPTHS) - 130.0) / 90.0)
    values = mean + random.normal(0.0, 0.5, (rows, len(DEPTHS)))
    return [[form.format(value) for value in row] for row in values.tolist()]


def write_wide(path: Path, rows: int, *, bad_share: float = 0.0, shuffled: bool = False, form: str = "{:.3f}") -> None:
    """Write a row per time; in bad ones one reading is no number."""
    random = np.random.default_rng(2)
    sound = readings(random, TAILS, form)
    tails = np.array([",".join(row) for row in sound], dtype=object)
    broken = np.array(
        [",".join([WORST[place % len(WORST)], *row[1:]]) for place, row in enumerate(sound)], dtype=object
    )
    with path.open("w") as file:
        file.write("time," + ",".join(f"T{depth}" for depth in DEPTHS) + "\n")
        for times in stamps(rows, shuffled=shuffled):
            chosen = random.integers(0, TAILS, len(times))
            texts = np.where(random.random(len(times)) < bad_share, broken[chosen], tails[chosen])
            file.write("".join([f"{time},{text}\n" for time, text in zip(times, texts, strict=True)]))


def write_long(path: Path, rows: int, *, shuffled: bool = False) -> None:
    """Write a row per reading."""
    random = np.random.default_rng(2)
    pairs = [list(zip(DEPTHS, row, strict=True)) for row in readings(random, TAILS)]
    with path.open("w") as file:
        file.write("time,depth,temperature\n")
        for times in stamps(rows, shuffled=shuffled):
            chosen = random.integers(0, TAILS, len(times)).tolist()
            file.write(
                "".join([f"{time},{z},{t}\n" for time, row in zip(times, chosen, strict=True) for z, t in pairs[row]])
            )


# --------------------------------------------------------------------------------------------------------------
# What one process does


def shortest(work: Callable[[], object], runs: int) -> float:
    """Return the shortest of some runs, s, after one that compiles."""
    work()
    return min(once(work) for _ in range(runs))


def with_ours(path: Path, runs: int) -> float:
    """Time our reader."""
    layout = WideLayout.model_validate(WIDE)
    return shortest(lambda: read(path, layout), runs)


def with_pandas(path: Path, runs: int) -> float:
    """Time pandas, which leaves stamps, and columns with a bad cell, as text, and skips rows with a cell too many."""
    warnings.simplefilter("ignore", pd.errors.DtypeWarning)  # of columns that hold numbers and text
    return shortest(lambda: pd.read_csv(path, on_bad_lines="skip"), runs)


def peak_memory(path: Path, kind: str) -> float:
    """Read a file and write its blocks; return the largest memory of this process, MB."""
    layout = LongLayout.model_validate(LONG) if kind == "long" else WideLayout.model_validate(WIDE)
    delivery = read(path, layout)
    write_blocks(path.with_suffix(".nc"), delivery.blocks(), {})
    status = dict(line.split(":", 1) for line in Path("/proc/self/status").read_text().splitlines())
    return float(status["VmHWM"].split()[0]) / 1e3


CHILDREN = {"ours": with_ours, "pandas": with_pandas, "memory": peak_memory}


def child(task: str, path: Path, argument: int | str) -> float:
    """Run a task in a process of its own."""
    call = [sys.executable, __file__, "--child", task, str(path), str(argument)]
    return float(json.loads(subprocess.run(call, check=True, stdout=subprocess.PIPE, text=True).stdout))


# --------------------------------------------------------------------------------------------------------------
# Measurements


def speed(folder: Path, rows: int, rounds: int, runs: int) -> list[list[object]]:
    """Return the ratio of our time to that of pandas, clean and with bad rows."""
    table: list[list[object]] = []
    for name, share, form, aim in (
        ("three decimals", 0.0, "{:.3f}", 2),
        ("all digits of a float64", 0.0, "{!r}", 2),
        ("1 % bad rows", 0.01, "{:.3f}", 4),
    ):
        path = folder / "speed.csv"
        write_wide(path, rows, bad_share=share, form=form)
        size = path.stat().st_size / 1e6
        times: dict[str, list[float]] = {"ours": [], "pandas": []}
        for _ in range(rounds):
            for reader, taken in times.items():
                taken.append(child(reader, path, runs))
        ours, pandas = (min(taken) for taken in times.values())
        table.append([f"wide, {name}, {size:.0f} MB", ours, pandas, ours / pandas, f"at most {aim}"])
        path.unlink()
    return table


def memory(folder: Path, values: Sequence[int], cases: Iterable[str]) -> list[list[object]]:
    """Return the peak memory at two lengths."""
    table: list[list[object]] = []
    for case in cases:
        kind, shuffled = case.split()[0], "disordered" in case
        writer = write_long if kind == "long" else write_wide
        peaks = []
        for number in values:
            path = folder / f"{kind}.csv"
            writer(path, number // len(DEPTHS), shuffled=shuffled)
            peaks.append(child("memory", path, kind))
            for used in (path, path.with_suffix(".nc")):
                used.unlink()
        table.append([case, *peaks, peaks[1] / peaks[0], "at most 1.05"])
    return table


CASES = ("wide", "wide disordered", "long", "long disordered")


def main() -> None:
    """Measure and print."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--rows", type=int, default=400_000, help="of the files for speed")
    parser.add_argument("--rounds", type=int, default=3, help="how often the readers take turns")
    parser.add_argument("--runs", type=int, default=3, help="of a reader in one process")
    parser.add_argument("--values", default="10,50", help="millions, of the files for memory")
    parser.add_argument("--cases", default=",".join(CASES), help="kinds of file for memory; empty for none")
    parser.add_argument("--child", nargs=3, metavar=("TASK", "FILE", "ARGUMENT"), help=argparse.SUPPRESS)
    arguments = parser.parse_args()
    if arguments.child:
        task, path, argument = arguments.child
        print(json.dumps(CHILDREN[task](Path(path), int(argument) if argument.isdigit() else argument)))
        return
    with tempfile.TemporaryDirectory() as folder:
        if arguments.rows:
            table = speed(Path(folder), arguments.rows, arguments.rounds, arguments.runs)
            show("Reading, shortest run", ["file", "ours, s", "pandas, s", "ratio", "aim"], table)
        values = [int(float(number) * 1e6) for number in arguments.values.split(",")]
        cases = [case for case in arguments.cases.split(",") if case]
        if cases:
            head = ["file", *(f"{number / 1e6:g} million values, MB" for number in values), "ratio", "aim"]
            show("Peak memory of reading and writing in blocks", head, memory(Path(folder), values, cases))


if __name__ == "__main__":
    main()
