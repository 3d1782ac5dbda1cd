"""Statistics that several rooms use."""

from profiles.statistics.harmonics import HARMONICS, harmonic_design, year_fraction
from profiles.statistics.spread import SpreadSurvey, robust_sd

__all__ = ["HARMONICS", "SpreadSurvey", "harmonic_design", "robust_sd", "year_fraction"]
