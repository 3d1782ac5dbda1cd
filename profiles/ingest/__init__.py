"""A delivery's files to a chain: temperature(time, depth), and an account of every row."""

from profiles.ingest.delivery import Delivery, read, read_delivery
from profiles.ingest.joining import join
from profiles.ingest.layout import Layout, load_layout
from profiles.ingest.recovery_log import read_recovery_log
from profiles.ingest.series import Series, read_series
from profiles.ingest.series_joining import join_series

__all__ = [
    "Delivery",
    "Layout",
    "Series",
    "join",
    "join_series",
    "load_layout",
    "read",
    "read_delivery",
    "read_recovery_log",
    "read_series",
]
