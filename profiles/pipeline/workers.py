"""Tasks in this process or in spawned workers, alike."""

from __future__ import annotations

import multiprocessing
import os
import signal
import threading
from collections.abc import Iterator, Sequence
from concurrent.futures import Future, ProcessPoolExecutor, as_completed
from concurrent.futures.process import BrokenProcessPool
from contextlib import contextmanager
from types import FrameType, TracebackType
from typing import Any, Self

from threadpoolctl import threadpool_limits

from profiles.errors import DataError, MachineError, RequestError, ThermotiltError
from profiles.pipeline.task import Report, Task

Result = Report | ThermotiltError


class Workers:
    """Run tasks, ``count`` at a time; one at a time means in this process.

    Workers are spawned, since netCDF4 is not safe in threads nor after a fork. Each uses one thread. An interrupt ends
    the tasks, at the latest when the one that is being done has ended.
    """

    def __init__(self, count: int) -> None:
        self.count = count
        self._pool: ProcessPoolExecutor | None = None
        self._interrupts = _Interrupts()

    def __enter__(self) -> Self:
        self._interrupts.watch()
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self._interrupts.leave()
        if self._pool is None:
            return
        if kind is not None:
            for process in list((self._pool._processes or {}).values()):
                process.terminate()
        # Whoever holds the folder next must find no worker that still writes.
        self._pool.shutdown(wait=True, cancel_futures=True)

    def run(self, tasks: Sequence[Task]) -> Iterator[tuple[Task, Result]]:
        """Yield each task with its report, or the error that ended it, as they end."""
        if self.count == 1 or len(tasks) < 2:
            for task in tasks:
                yield task, attempt(task)
                self._interrupts.raise_lost()
            return
        if self._pool is None:
            context = multiprocessing.get_context("spawn")
            self._pool = ProcessPoolExecutor(self.count, mp_context=context, initializer=_settle)
        with _interrupts_held():
            futures: dict[Future[Result], Task] = {self._pool.submit(attempt, task): task for task in tasks}
        try:
            for future in as_completed(futures):
                yield futures[future], future.result()
                self._interrupts.raise_lost()
        except BrokenProcessPool as error:
            raise MachineError(
                "a worker was killed",
                expected="enough memory for every worker",
                advice="run again with fewer workers (--workers 1): what was finished is kept",
            ) from error


class _Interrupts:
    """Remembers that there was an interrupt: what is raised within a destructor or a callback of a compiled library is
    lost."""

    def __init__(self) -> None:
        self._seen = False
        self._before: Any = None

    def watch(self) -> None:
        """Begin, if an interrupt is Python's to handle and this is the thread that gets it."""
        usual = signal.getsignal(signal.SIGINT) is signal.default_int_handler
        if usual and threading.current_thread() is threading.main_thread():
            self._before = signal.signal(signal.SIGINT, self._remember)

    def leave(self) -> None:
        """Give interrupts back to whom they belonged."""
        if self._before is not None:
            signal.signal(signal.SIGINT, self._before)
            self._before = None

    def raise_lost(self) -> None:
        """Raise the interrupt again, where it came and did not end what was being done."""
        if self._seen:
            raise KeyboardInterrupt

    def _remember(self, number: int, frame: FrameType | None) -> None:
        self._seen = True
        signal.default_int_handler(number, frame)


def attempt(task: Task) -> Result:
    """Do a task; an error of the data or the request is a result, one of the machine or of ours is raised."""
    with threadpool_limits(1):
        try:
            return task.work(*task.arguments)
        except (DataError, RequestError) as error:
            return error


@contextmanager
def _interrupts_held() -> Iterator[None]:
    """Hold interrupts back; processes that are started meanwhile never see one, from their first instruction on."""
    before = signal.pthread_sigmask(signal.SIG_BLOCK, {signal.SIGINT})
    try:
        yield
    finally:
        signal.pthread_sigmask(signal.SIG_SETMASK, before)


def _settle() -> None:
    """Prepare a worker: one thread, an end when the parent ends."""
    os.environ["NUMBA_NUM_THREADS"] = "1"
    threading.Thread(target=_end_with_parent, daemon=True).start()


def _end_with_parent() -> None:
    parent = multiprocessing.parent_process()
    if parent is not None:
        parent.join()
        os._exit(1)  # a killed parent reads no results, and a second run may already be writing
