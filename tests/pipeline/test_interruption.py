"""A run that is cut off and started again ends with the same bytes as one that was not."""

from __future__ import annotations

import os
import random
import signal
import subprocess
import sys
import time
from collections.abc import Callable
from pathlib import Path

from profiles.config import load_config
from profiles.pipeline import run

PATIENCE = 60.0  # seconds until a run that does not get on fails the test
Contents = Callable[[Path], dict[str, bytes]]


def started(array: Path, out: Path, workers: int) -> subprocess.Popen[str]:
    """Start the command as the leader of a process group of its own."""
    call = "from profiles.cli import main; main()"
    arguments = ["run", str(array / "array.toml"), "--out", str(out), "--workers", str(workers), "--quiet"]
    arguments += ["--until", "section"]
    return subprocess.Popen(
        [sys.executable, "-c", call, *arguments],
        start_new_session=True,
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
    )


def wait_for_records(out: Path, count: int, process: subprocess.Popen[str]) -> None:
    """Wait until as many tasks have been recorded as finished."""
    deadline = time.monotonic() + PATIENCE
    while len(list((out / ".stages" / "records").glob("[!.]*.json"))) < count:
        assert process.poll() is None, process.communicate()
        assert time.monotonic() < deadline, "the run does not get on"
        time.sleep(0.005)


def assert_as_finished(out: Path, finished: Path, contents: Contents) -> None:
    resumed = contents(out)
    assert {"section.nc", "volume.nc", "chains/TB-28.nc", "tables/volume_and_tilt.csv"} <= set(resumed)
    assert resumed == {name: data for name, data in contents(finished).items() if name in resumed}


def test_run_killed_at_random_moments_ends_with_the_same_bytes(
    array: Path, tmp_path: Path, finished: Path, contents: Contents
) -> None:
    out = tmp_path / "out"
    moments = random.Random(20)
    targets = sorted(moments.sample(range(1, 12), 3))  # of the 12 tasks up to the section
    for target in targets:
        process = started(array, out, workers=1)
        wait_for_records(out, target, process)
        time.sleep(moments.uniform(0.0, 0.2))
        os.killpg(process.pid, signal.SIGKILL)
        process.communicate()
        assert process.returncode == -signal.SIGKILL
        assert not (out / "run.json").exists()
    outcome = run(load_config(array / "array.toml"), out, until="section", workers=1)
    assert outcome.kept >= targets[-1]
    assert_as_finished(out, finished, contents)


def test_interrupted_run_says_so_and_goes_on_from_what_was_finished(
    array: Path, tmp_path: Path, finished: Path, contents: Contents
) -> None:
    out = tmp_path / "out"
    process = started(array, out, workers=2)
    wait_for_records(out, 2, process)
    os.killpg(process.pid, signal.SIGINT)
    said, complaint = process.communicate(timeout=PATIENCE)
    assert process.returncode == 130
    assert said == ""
    assert complaint == "thermotilt: interrupted; the same command goes on from what was finished\n"
    outcome = run(load_config(array / "array.toml"), out, until="section", workers=1)
    assert outcome.kept >= 2
    assert_as_finished(out, finished, contents)


def test_workers_end_with_a_parent_that_is_killed(array: Path, tmp_path: Path) -> None:
    out = tmp_path / "out"
    process = started(array, out, workers=2)
    wait_for_records(out, 1, process)
    os.kill(process.pid, signal.SIGKILL)  # the parent alone
    process.communicate(timeout=PATIENCE)  # returns when the last process that holds the pipes has ended
    assert run(load_config(array / "array.toml"), out, until="ingest", workers=1).exit_code == 0
