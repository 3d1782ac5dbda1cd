"""Text for people: the nearest known name, and rows of files made fit to print."""

from __future__ import annotations

import difflib
from collections.abc import Iterable

NAME_LENGTH = 80  # letters of a name that a message shows
TEXT_LENGTH = 200  # characters of a row that a quarantine entry shows


def nearest(name: str, known: Iterable[str]) -> str:
    """Return ``"; did you mean ...?"`` with the known name that is nearest, or nothing."""
    folded = {candidate.casefold(): candidate for candidate in known}
    near = difflib.get_close_matches(name.casefold(), folded, n=1, cutoff=0.6)
    return f"; did you mean {folded[near[0]]!r}?" if near else ""


def listed(names: Iterable[str], most: int = 12) -> str:
    """Return names joined by commas, the rest counted."""
    shown = [repr(name if len(name) <= NAME_LENGTH else f"{name[:NAME_LENGTH]}...") for name in names]
    rest = f" and {len(shown) - most} more" if len(shown) > most else ""
    return ", ".join(shown[:most]) + rest


def printable(text: str) -> str:
    """Return a row of a file, cut to length, with undecodable bytes and control characters as escapes."""
    cut = text[:TEXT_LENGTH]
    decoded = cut.encode("utf-8", "surrogateescape").decode("utf-8", "backslashreplace")
    shown = "".join(
        letter if letter.isprintable() or letter == "\t" else letter.encode("unicode_escape").decode("ascii")
        for letter in decoded
    )
    return shown[:TEXT_LENGTH]
