"""The simulated ocean with known truth, faults planted on purpose, and the demo data made from both."""

from profiles.drill.faults import CATALOGUE, Event, Fault, plant
from profiles.drill.ocean import Columns, Ocean

__all__ = ["CATALOGUE", "Columns", "Event", "Fault", "Ocean", "plant"]
