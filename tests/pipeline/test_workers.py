"""Tasks in spawned workers: deaths, errors, order."""

from __future__ import annotations

import math
import operator
import os
import signal
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from profiles.errors import DataError, MachineError, ThermotiltError
from profiles.pipeline.task import Task
from profiles.pipeline.workers import Workers, attempt
from profiles.store import make_folder, open_dataset


def task(name: str, work: Callable[..., Any], *arguments: Any) -> Task:
    """A task of a function that a spawned process can import."""
    return Task(stage="ingest", name=name, work=work, arguments=arguments, inputs=(), outputs=())


def raise_fault() -> None:
    raise ThermotiltError("rows were lost")


def lose_an_interrupt() -> str:
    """Interrupt this process, and lose what is raised, as a destructor does."""
    try:
        os.kill(os.getpid(), signal.SIGINT)
        time.sleep(60.0)
    except KeyboardInterrupt:
        return "lost"
    return "none came"


def test_an_interrupt_that_a_task_lost_ends_the_run_after_it() -> None:
    with Workers(1) as pool:
        results = pool.run([task("first", lose_an_interrupt), task("second", math.sqrt, 4.0)])
        assert next(results)[1] == "lost"
        with pytest.raises(KeyboardInterrupt, match=r"^$"):
            next(results)
    assert signal.getsignal(signal.SIGINT) is signal.default_int_handler


def test_worker_that_dies_is_the_machines_failure() -> None:
    tasks = [task("dies", os._exit, 9), task("lives", math.sqrt, 4.0)]
    with (
        pytest.raises(MachineError, match=r"a worker was killed.*--workers 1.*what was finished is kept"),
        Workers(2) as pool,
    ):
        list(pool.run(tasks))


def test_workers_return_every_result_with_its_task_and_errors_of_data_as_results(tmp_path: Path) -> None:
    tasks = [
        task("two", math.sqrt, 4.0),
        task("three", math.sqrt, 9.0),
        task("absent", open_dataset, tmp_path / "a.nc"),
    ]
    with Workers(2) as pool:
        found = {done.name: result for done, result in pool.run(tasks)}
    assert {name: found[name] for name in ("two", "three")} == {"two": 2.0, "three": 3.0}
    assert isinstance(found["absent"], DataError)
    assert found["absent"].where == str(tmp_path / "a.nc")


def test_one_worker_works_in_this_process() -> None:
    with Workers(1) as pool:
        results = [result for _, result in pool.run([task("one", os.getpid), task("two", os.getpid)])]
    assert results == [os.getpid()] * 2


def test_workers_are_ended_when_an_error_leaves_the_block() -> None:
    pids: list[Any] = []
    long = 120.0  # seconds, more than the test has
    work = [("one", os.getpid), ("two", os.getpid), ("fails", operator.truediv, 1.0, 0.0), ("sleeps", time.sleep, long)]
    tasks = [task(name, function, *arguments) for name, function, *arguments in work]
    began = time.monotonic()
    with pytest.raises(ZeroDivisionError, match="division"), Workers(2) as pool:
        pids.extend(result for _, result in pool.run(tasks))
    assert time.monotonic() - began < long / 2.0
    assert pids
    assert [pid for pid in pids if Path(f"/proc/{pid}").exists()] == []


def test_failure_of_the_machine_ends_the_run(tmp_path: Path) -> None:
    (tmp_path / "file").write_text("")
    with pytest.raises(MachineError, match="cannot be used as a folder"):
        attempt(task("writes", make_folder, tmp_path / "file"))


def test_fault_of_ours_is_no_fault_of_the_data() -> None:
    with pytest.raises(ThermotiltError, match="rows were lost"):
        attempt(task("loses", raise_fault))
