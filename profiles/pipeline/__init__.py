"""Which stage reads and writes what; resume; workers; progress through a callback."""

from profiles.pipeline.precursor import PrecursorOutcome, precursor
from profiles.pipeline.precursor_inputs import Sources
from profiles.pipeline.run import Outcome, Problem, run
from profiles.pipeline.survey import Finding, survey
from profiles.pipeline.task import STAGES, Event

__all__ = [
    "STAGES",
    "Event",
    "Finding",
    "Outcome",
    "PrecursorOutcome",
    "Problem",
    "Sources",
    "precursor",
    "run",
    "survey",
]
