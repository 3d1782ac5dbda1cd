"""A model's gridded temperature against an array, like for like."""

from profiles.validation.comparison import FUNCTIONALS, compare_model
from profiles.validation.model import Model, open_model
from profiles.validation.observed import Array, open_array
from profiles.validation.seen_months import COMPARED
from profiles.validation.side_by_side import side_by_side, understood

__all__ = [
    "COMPARED",
    "FUNCTIONALS",
    "Array",
    "Model",
    "compare_model",
    "open_array",
    "open_model",
    "side_by_side",
    "understood",
]
