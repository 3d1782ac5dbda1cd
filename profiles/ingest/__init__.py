"""A delivery's files to a chain: temperature(time, depth), and an account of every row."""

from profiles.ingest.delivery import Delivery, read, read_delivery
from profiles.ingest.joining import join
from profiles.ingest.layout import Layout, load_layout
from profiles.ingest.recovery_log import read_recovery_log

__all__ = ["Delivery", "Layout", "join", "load_layout", "read", "read_delivery", "read_recovery_log"]
