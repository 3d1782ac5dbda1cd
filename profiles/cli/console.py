"""What the commands share: how errors end a command, and how progress is shown."""

from __future__ import annotations

import json
import sys
import traceback
from collections.abc import Callable, Iterator, Mapping
from contextlib import contextmanager
from typing import TYPE_CHECKING, Any

import typer

from profiles.errors import EXIT_FAULT, EXIT_INTERRUPTED, ThermotiltError

if TYPE_CHECKING:
    from profiles.pipeline import Event


@contextmanager
def ending(*, as_json: bool) -> Iterator[None]:
    """Turn what a command raises into a message and an exit code."""
    try:
        yield
    except ThermotiltError as error:
        _print_error(str(error), error.exit_code, as_json=as_json)
        raise typer.Exit(error.exit_code) from None
    except KeyboardInterrupt:
        message = "interrupted; the same command goes on from what was finished"
        _print_error(message, EXIT_INTERRUPTED, as_json=as_json)
        raise typer.Exit(EXIT_INTERRUPTED) from None
    except typer.Exit:
        raise
    except Exception as error:  # the last boundary: whatever else comes here is a fault of ours, and says so
        traceback.print_exc()
        _print_error(f"a fault of ours: {error!r}; please report it with the lines above", EXIT_FAULT, as_json=as_json)
        raise typer.Exit(EXIT_FAULT) from None


def _print_error(message: str, exit_code: int, *, as_json: bool) -> None:
    if as_json:
        print_json({"error": message, "exit_code": exit_code})
    else:
        typer.echo(f"thermotilt: {message}", err=True)


def print_json(document: Mapping[str, Any]) -> None:
    """Print one JSON document."""
    typer.echo(json.dumps(document, indent=1, ensure_ascii=False))


@contextmanager
def progress(*, silent: bool) -> Iterator[Callable[[Event], None]]:
    """Yield a callback that shows progress: bars on a terminal, a line per stage elsewhere, nothing if silent."""
    if silent:
        yield lambda event: None
    elif sys.stderr.isatty():
        with _bars() as show:
            yield show
    else:
        yield _lines()


@contextmanager
def _bars() -> Iterator[Callable[[Event], None]]:
    from rich.console import Console
    from rich.progress import BarColumn, MofNCompleteColumn, Progress, TextColumn, TimeElapsedColumn

    columns = (TextColumn("{task.description:<8}"), BarColumn(), MofNCompleteColumn(), TimeElapsedColumn())
    with Progress(*columns, TextColumn("{task.fields[name]}"), console=Console(stderr=True)) as bars:
        tasks: dict[str, Any] = {}

        def show(event: Event) -> None:
            if event.stage not in tasks:
                tasks[event.stage] = bars.add_task(event.stage, total=event.total, name="")
            bars.update(tasks[event.stage], total=event.total, completed=event.done, name=event.name)

        yield show


def _lines() -> Callable[[Event], None]:
    counts: dict[str, int] = {}

    def show(event: Event) -> None:
        counts[event.outcome] = counts.get(event.outcome, 0) + 1
        if event.done == event.total:
            detail = ", ".join(f"{count} {outcome}" for outcome, count in counts.items())
            typer.echo(f"{event.stage}: {detail}", err=True)
            counts.clear()

    return show
