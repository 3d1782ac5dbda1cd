"""Monthly series become lead times, a hindcast score and an outlook, with the statistics done right."""

from profiles.precursor.anomaly import Anomaly, anomalies, fit_anomaly, running_mean
from profiles.precursor.events import before_events, event_composites, find_events
from profiles.precursor.hindcast import hindcast
from profiles.precursor.index import (
    BOXES,
    Box,
    box_of,
    moored_temperature_index,
    pressure_difference_index,
    surface_temperature_index,
)
from profiles.precursor.lead_lag import lead_lag
from profiles.precursor.outlook import outlook
from profiles.precursor.patterns import Patterns, fit_patterns
from profiles.precursor.reading import read_series
from profiles.precursor.recharge import recharge_oscillator
from profiles.precursor.series import monthly_series, overlap
from profiles.precursor.verification import reliability, verify

__all__ = [
    "BOXES",
    "Anomaly",
    "Box",
    "Patterns",
    "anomalies",
    "before_events",
    "box_of",
    "event_composites",
    "find_events",
    "fit_anomaly",
    "fit_patterns",
    "hindcast",
    "lead_lag",
    "monthly_series",
    "moored_temperature_index",
    "outlook",
    "overlap",
    "pressure_difference_index",
    "read_series",
    "recharge_oscillator",
    "reliability",
    "running_mean",
    "surface_temperature_index",
    "verify",
]
