"""The exception tree and the exit codes.

::

    ThermotiltError          70  a fault of ours
    ├── RequestError          2  the request is wrong: a path, an option, an argument
    │   └── ConfigError       2  ... a configuration or layout file, all its problems at once
    ├── DataError             3  the data is unfit for what was asked
    └── MachineError          4  the machine failed: disk, permission

An error says what, where, what was expected, what was found and what to do. A run in which some deliveries
could not be used is no error: it ends with :data:`EXIT_PARTIAL`.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

EXIT_DONE = 0
EXIT_REQUEST = 2
EXIT_DATA = 3
EXIT_MACHINE = 4
EXIT_PARTIAL = 5
EXIT_FAULT = 70
EXIT_INTERRUPTED = 130  # 128 + SIGINT, the custom of the shells


class ThermotiltError(Exception):
    """Base of all errors that the package raises on purpose.

    Parameters
    ----------
    what : str
        The problem, one clause.
    where : str, optional
        File and line, or table and key, or argument.
    expected, found : str, optional
        The two sides of the disagreement.
    advice : str, optional
        What to do about it.
    """

    exit_code = EXIT_FAULT

    def __init__(
        self,
        what: str,
        *,
        where: str | None = None,
        expected: str | None = None,
        found: str | None = None,
        advice: str | None = None,
    ) -> None:
        super().__init__(what)
        self.what = what
        self.where = where
        self.expected = expected
        self.found = found
        self.advice = advice

    def __str__(self) -> str:
        head = f"{self.where}: {self.what}" if self.where else self.what
        tail = [
            f"{label} {text}"
            for label, text in (("expected", self.expected), ("found", self.found))
            if text is not None
        ]
        if self.advice is not None:
            tail.append(self.advice)
        return "; ".join([head, *tail])

    def __reduce__(self) -> tuple[Any, ...]:
        # Keyword-only arguments do not survive the default pickling, and errors cross process borders.
        return (_rebuild, (type(self), self.what, self.where, self.expected, self.found, self.advice))


def _rebuild(
    kind: type[ThermotiltError],
    what: str,
    where: str | None,
    expected: str | None,
    found: str | None,
    advice: str | None,
) -> ThermotiltError:
    return kind(what, where=where, expected=expected, found=found, advice=advice)


class RequestError(ThermotiltError):
    """The request is wrong."""

    exit_code = EXIT_REQUEST


class ConfigError(RequestError):
    """A configuration or layout file is wrong; ``problems`` lists everything that is."""

    def __init__(self, file: str, problems: Sequence[RequestError]) -> None:
        count = f"{len(problems)} problem{'s' if len(problems) != 1 else ''}"
        super().__init__(f"{count} in this file", where=file)
        self.file = file
        self.problems = tuple(problems)

    def __str__(self) -> str:
        return "\n".join([super().__str__(), *(f"  - {problem}" for problem in self.problems)])

    def __reduce__(self) -> tuple[Any, ...]:
        return (ConfigError, (self.file, self.problems))


class DataError(ThermotiltError):
    """The data is unfit for what was asked."""

    exit_code = EXIT_DATA


class MachineError(ThermotiltError):
    """The machine failed."""

    exit_code = EXIT_MACHINE
