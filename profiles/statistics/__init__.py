"""Statistics that several rooms use."""

from profiles.statistics.harmonics import HARMONICS, harmonic_design, year_fraction
from profiles.statistics.persistence import effective_count, lag_one
from profiles.statistics.spread import SpreadSurvey, robust_sd

__all__ = [
    "HARMONICS",
    "SpreadSurvey",
    "effective_count",
    "harmonic_design",
    "lag_one",
    "robust_sd",
    "year_fraction",
]
