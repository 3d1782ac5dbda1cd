"""The columns of an array become a climatology, a map, a tilt and a volume, each with its error."""

from profiles.section.array import Section, build_section
from profiles.section.delivered import first_given, monthly_means_delivered, over_days, without_days
from profiles.section.means import daily_means, join_moorings, monthly_means
from profiles.section.objective_map import objective_map
from profiles.section.tilt import thermocline_slope
from profiles.section.volume import warm_water_volume

__all__ = [
    "Section",
    "build_section",
    "daily_means",
    "first_given",
    "join_moorings",
    "monthly_means",
    "monthly_means_delivered",
    "objective_map",
    "over_days",
    "thermocline_slope",
    "warm_water_volume",
    "without_days",
]
