"""The simulated ocean with known truth, faults planted on purpose, and the demo data made from both."""

from profiles.drill.fault_catalogue import CATALOGUE, Fault
from profiles.drill.faults import Event, as_delivered, event_table, plant
from profiles.drill.ocean import Columns, Ocean

__all__ = ["CATALOGUE", "Columns", "Event", "Fault", "Ocean", "as_delivered", "event_table", "plant"]
