"""The whole job, stage by stage; what is done already is kept."""

from __future__ import annotations

import os
import time
from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

from profiles import store
from profiles.config import Config, Mooring
from profiles.errors import EXIT_DONE, EXIT_PARTIAL, DataError, RequestError, ThermotiltError
from profiles.pipeline import stages
from profiles.pipeline.listed import read_log
from profiles.pipeline.paths import CHAIN, SERIES, Folder
from profiles.pipeline.series import NOTHING, series_notes, series_task
from profiles.pipeline.task import (
    STAGES,
    Checksums,
    Event,
    Report,
    Task,
    forget,
    keep_report,
    kept_report,
    recorded,
)
from profiles.pipeline.workers import Workers

Progress = Callable[[Event], None]


@dataclass(frozen=True)
class Problem:
    """A delivery or a mooring that could not be used, and why."""

    mooring: str
    stage: str
    message: str


@dataclass(frozen=True)
class Outcome:
    """What a run did: ``rows`` and ``latest`` are what the closing lines of the command say.

    ``notes`` are by file of a series what somebody should know of it; ``months`` by mooring how many monthly means come
    from its chain and how many from series.
    """

    out: Path
    stages: tuple[str, ...]
    moorings: tuple[str, ...]
    rows: dict[str, int]
    problems: tuple[Problem, ...]
    seconds: dict[str, float]
    computed: int
    kept: int
    latest: dict[str, Any] | None
    notes: dict[str, list[str]] = field(default_factory=dict)
    months: dict[str, dict[str, int]] = field(default_factory=dict)

    @property
    def exit_code(self) -> int:
        """0, or 5 where some deliveries could not be used."""
        return EXIT_PARTIAL if self.problems else EXIT_DONE


def run(
    config: Config,
    out: Path,
    *,
    until: str = STAGES[-1],
    workers: int | None = None,
    progress: Progress | None = None,
) -> Outcome:
    """Run the stages up to ``until`` into a folder.

    Parameters
    ----------
    config : Config
        What to run.
    out : Path
        The folder; it is made where there is none. What an earlier run finished there is kept where its inputs and
        settings are the same.
    until : str
        The last stage, one of :data:`profiles.pipeline.STAGES`.
    workers : int, optional
        Processes; default as many as there are processors.
    progress : callable, optional
        Called with an :class:`Event` when a task ends.

    Raises
    ------
    RequestError
        Where the stage is unknown, or another run holds the folder.
    DataError
        Where no delivery can be used.
    MachineError
        Where the folder cannot be written.
    """
    _check_request(until, workers)
    read_log(config)  # what is wrong with it is told before any work that needs it
    folder = Folder(out)
    for path in folder.folders():
        store.make_folder(path)
    with store.folder_lock(folder.folders()[1]), Workers(workers or os.cpu_count() or 1) as pool:
        store.clear_leftovers(out)
        outcome = _Run(config, folder, pool, progress or (lambda event: None)).through(until)
    return outcome


def _check_request(until: str, workers: int | None) -> None:
    if until not in STAGES:
        raise RequestError("no such stage", where="--until", expected=", ".join(STAGES), found=repr(until))
    if workers is not None and workers < 1:
        raise RequestError("no such number of workers", where="--workers", expected="1 or more", found=str(workers))


@dataclass
class _Run:
    """One run under way."""

    config: Config
    folder: Folder
    workers: Workers
    progress: Progress
    checksums: Checksums = field(default_factory=Checksums)
    planned: set[tuple[str, str]] = field(default_factory=set)
    problems: list[Problem] = field(default_factory=list)
    seconds: dict[str, float] = field(default_factory=dict)
    rows: dict[str, int] = field(default_factory=dict)
    latest: dict[str, Any] | None = None
    computed: int = 0
    kept: int = 0

    def __post_init__(self) -> None:
        self.moorings: Sequence[Mooring] = self.config.moorings
        self.sources: dict[str, list[str]] = {}  # by mooring: where its columns come from, in the order of precedence
        self.notes: dict[str, list[str]] = {}
        self.months: dict[str, dict[str, int]] = {}

    @property
    def chained(self) -> list[Mooring]:
        """The moorings that have a chain."""
        return [mooring for mooring in self.moorings if CHAIN in self.sources[mooring.id]]

    def through(self, until: str) -> Outcome:
        """Run the stages up to ``until`` and write the account."""
        started = datetime.now(tz=UTC)
        done = STAGES[: STAGES.index(until) + 1]
        work = {
            "ingest": self._ingest,
            "qc": self._qc,
            "column": self._column,
            "section": self._section,
            "report": self._report,
        }
        for stage in done:
            before = time.perf_counter()
            work[stage]()
            self.seconds[stage] = round(time.perf_counter() - before, 3)
        self._forget_stale(done)
        outcome = Outcome(
            out=self.folder.out,
            stages=done,
            moorings=tuple(mooring.id for mooring in self.moorings),
            rows=self.rows,
            problems=tuple(self.problems),
            seconds=self.seconds,
            computed=self.computed,
            kept=self.kept,
            latest=self.latest,
            notes=self.notes,
            months=self.months,
        )
        store.write_record(self.folder.account, _account(self.config, outcome, started, self.checksums))
        return outcome

    def _ingest(self) -> None:
        delivered = [mooring for mooring in self.moorings if mooring.deliveries]
        reports = self._do("ingest", [stages.ingest_task(self.config, m, self.folder) for m in delivered])
        self.sources = {name: [CHAIN] for name, report in reports.items() if report["usable"]}
        if self.config.series:
            reports |= self._do("ingest", [series_task(self.config, self.folder)], shown=False)
            self.notes = series_notes(reports[SERIES]["deliveries"])
            for name, kinds in reports[SERIES]["moorings"].items():
                self.sources.setdefault(name, []).extend(kinds)
        for name, report in reports.items():
            self.problems += [Problem(name, "ingest", row["problem"]) for row in report["deliveries"] if row["problem"]]
        stages.check_usable(reports, [problem.message for problem in self.problems])
        self._tell_of_the_missing(delivered)
        self.rows = _count_rows(reports.values())
        self._do("ingest", [stages.gather_task("ingest", list(reports), self.folder)], shown=False)
        self._go_on_with(self.sources)

    def _tell_of_the_missing(self, delivered: Sequence[Mooring]) -> None:
        without = [mooring for mooring in self.moorings if mooring not in delivered and mooring.id not in self.sources]
        self.problems += [Problem(mooring.id, "ingest", NOTHING) for mooring in without]

    def _qc(self) -> None:
        flagged = self._do("qc", [stages.qc_task(self.config, m, self.folder) for m in self.chained])
        self._do("qc", [stages.gather_task("qc", list(flagged), self.folder)], shown=False)
        for name, sources in self.sources.items():
            self.sources[name] = [source for source in sources if source != CHAIN or name in flagged]
        self._go_on_with(name for name, sources in self.sources.items() if sources)

    def _column(self) -> None:
        tasks = [stages.column_task(self.config, m, self.folder, self.sources[m.id]) for m in self.moorings]
        reports = self._do("column", tasks)
        self.months = {name: report["months"] for name, report in reports.items()}
        self._go_on_with(reports)

    def _section(self) -> None:
        reports = self._do("section", [stages.section_task(self.config, self.moorings, self.folder)])
        self.latest = reports["array"]["latest"]

    def _report(self) -> None:
        figures, page = stages.report_tasks(self.config, self.moorings, self.folder, self.chained)
        self._do("report", figures)
        self._do("report", page, shown=False)

    def _do(self, stage: str, tasks: Sequence[Task], *, shown: bool = True) -> dict[str, Report]:
        """Do what has to be done of tasks that do not need one another; return the reports by name."""
        keys = {task.name: task.key(self.checksums) for task in tasks}
        self.planned |= {(stage, task.name) for task in tasks}
        reports = self._kept(tasks, keys)
        ended = 0
        for name, report in reports.items():
            ended += 1
            self._tell(Event(stage, name, ended, len(tasks), _outcome(report, "kept")), shown)
        for task, result in self.workers.run([task for task in tasks if task.name not in reports]):
            ended += 1
            self.computed += 1
            if isinstance(result, ThermotiltError):
                self._go_on_without(task, result)
                self._tell(Event(stage, task.name, ended, len(tasks), "failed"), shown)
                continue
            keep_report(task, self.folder.out, keys[task.name], result, self.checksums)
            reports[task.name] = result
            self._tell(Event(stage, task.name, ended, len(tasks), _outcome(result, "computed")), shown)
        return {task.name: reports[task.name] for task in tasks if task.name in reports}

    def _kept(self, tasks: Sequence[Task], keys: Mapping[str, str]) -> dict[str, Report]:
        """Return the reports of the tasks that need not be done again."""
        found = {task.name: kept_report(task, self.folder.out, keys[task.name], self.checksums) for task in tasks}
        reports = {name: report for name, report in found.items() if report is not None}
        self.kept += len(reports)
        return reports

    def _tell(self, event: Event, shown: bool) -> None:
        if shown:
            self.progress(event)

    def _go_on_without(self, task: Task, error: ThermotiltError) -> None:
        """Leave out a mooring whose data is unfit; where the task is not one mooring's, nothing can go on."""
        if task.stage == "report" or task.name not in {mooring.id for mooring in self.moorings}:
            raise error
        self.problems.append(Problem(task.name, task.stage, str(error)))

    def _go_on_with(self, names: Iterable[str]) -> None:
        chosen = set(names)
        self.moorings = [mooring for mooring in self.moorings if mooring.id in chosen]
        if not self.moorings:
            raise DataError("no mooring is left", found="\n".join(problem.message for problem in self.problems))

    def _forget_stale(self, done: Sequence[str]) -> None:
        """Remove what earlier runs left that this one no longer stands for.

        That is what tasks wrote that are no longer planned; and, where this run ended early and anything changed, all
        that later stages wrote.
        """
        for stage, name in recorded(self.folder.out):
            later = stage not in done
            if (later and self.computed) or (not later and (stage, name) not in self.planned):
                forget(self.folder.out, stage, name)


def _outcome(report: Report, usual: Any) -> Any:
    return usual if report.get("usable", True) else "failed"


def _count_rows(reports: Iterable[Report]) -> dict[str, int]:
    """Add up the rows of all deliveries; a fault of ours where they do not add up."""
    names = ("rows_read", "rows_kept", "rows_quarantined", "rows_reordered")
    rows = [row for report in reports for row in report["deliveries"]]
    total = {name: sum(row[name] for row in rows) for name in names}
    if total["rows_read"] != total["rows_kept"] + total["rows_quarantined"]:
        raise ThermotiltError(
            "rows were lost",
            expected=f"{total['rows_read']} rows kept or quarantined",
            found=f"{total['rows_kept']} kept and {total['rows_quarantined']} quarantined",
            advice="please report this",
        )
    return total


def _account(config: Config, outcome: Outcome, started: datetime, checksums: Checksums) -> dict[str, Any]:
    return {
        "command": "thermotilt run",
        "started": started.isoformat(timespec="seconds"),
        "ended": datetime.now(tz=UTC).isoformat(timespec="seconds"),
        "seconds": outcome.seconds,
        "tasks": {"computed": outcome.computed, "kept": outcome.kept},
        "rows": outcome.rows,
        "moorings": list(outcome.moorings),
        "problems": [vars(problem) for problem in outcome.problems],
        "latest": outcome.latest,
        "months": outcome.months,
        "series_notes": outcome.notes,
        "versions": stages.versions(),
        "inputs": {path.as_posix(): checksums.of(config.resolve(path)) for path in _inputs(config)},
        "configuration": config.model_dump(mode="json", exclude={"file"}),
    }


def _inputs(config: Config) -> list[Path]:
    delivered = [delivery.path for mooring in config.moorings for delivery in mooring.deliveries]
    return [*delivered, *(listed.path for listed in config.series)]
