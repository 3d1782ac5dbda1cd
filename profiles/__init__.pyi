from .column import isotherm_depth as isotherm_depth
from .column import mixed_layer_depth as mixed_layer_depth
from .ingest import read_delivery as read_delivery
from .precursor import lead_lag as lead_lag
from .qc import quality_control as quality_control
from .section import objective_map as objective_map
from .section import thermocline_slope as thermocline_slope
from .section import warm_water_volume as warm_water_volume
from .validation import compare_model as compare_model

__all__ = [
    "compare_model",
    "isotherm_depth",
    "lead_lag",
    "mixed_layer_depth",
    "objective_map",
    "quality_control",
    "read_delivery",
    "thermocline_slope",
    "warm_water_volume",
]
