"""A flagged chain becomes one number per profile: isotherm, mixed layer, mean temperature."""

from profiles.column.columns import column_blocks, columns_of
from profiles.column.gradient import steepest_gradient_depth
from profiles.column.isotherm import isotherm_depth, isotherm_depth_error
from profiles.column.layer_mean import layer_mean_temperature
from profiles.column.mixed_layer import mixed_layer_depth
from profiles.column.series import columns_of_series

__all__ = [
    "column_blocks",
    "columns_of",
    "columns_of_series",
    "isotherm_depth",
    "isotherm_depth_error",
    "layer_mean_temperature",
    "mixed_layer_depth",
    "steepest_gradient_depth",
]
