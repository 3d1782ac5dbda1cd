"""Statistics that several rooms use."""

from profiles.statistics.autoregression import (
    autocorrelation_of,
    burg_reflection,
    coefficients_of,
    fit_reflection,
    simulate,
    supported_order,
)
from profiles.statistics.bootstrap import block_length, block_weights, weighted_correlation
from profiles.statistics.harmonics import HARMONICS, harmonic_design, year_fraction
from profiles.statistics.pairs import PairedStatistics, paired_statistics
from profiles.statistics.persistence import effective_count, lag_one
from profiles.statistics.spread import SpreadSurvey, robust_sd

__all__ = [
    "HARMONICS",
    "PairedStatistics",
    "SpreadSurvey",
    "autocorrelation_of",
    "block_length",
    "block_weights",
    "burg_reflection",
    "coefficients_of",
    "effective_count",
    "fit_reflection",
    "harmonic_design",
    "lag_one",
    "paired_statistics",
    "robust_sd",
    "simulate",
    "supported_order",
    "weighted_correlation",
    "year_fraction",
]
