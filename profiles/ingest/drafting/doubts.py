"""What a draft is unsure of."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class Doubt:
    """One thing that the file does not settle.

    Attributes
    ----------
    about : str
        The question, in a few words.
    taken : str
        What the draft says.
    why : str
        Why that is not certain.
    other : str
        The runner-up, and what it would give; empty for none.
    """

    about: str
    taken: str
    why: str
    other: str = ""

    def __str__(self) -> str:
        other = f"; or else {self.other}" if self.other else ""
        return f"{self.about}: {self.taken} ({self.why}){other}"
