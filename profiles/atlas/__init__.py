"""Packaged published fields of the equatorial Pacific, 10S-10N, 115E-68W (sources in each file's attributes)."""

from profiles.atlas.fields import annual_mean, monthly_temperature, relief
from profiles.atlas.profiles import annual_profile, annual_salinity, seasonal_profile
from profiles.atlas.sea import sea_share

__all__ = [
    "annual_mean",
    "annual_profile",
    "annual_salinity",
    "monthly_temperature",
    "relief",
    "sea_share",
    "seasonal_profile",
]
