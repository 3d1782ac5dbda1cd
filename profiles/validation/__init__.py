"""A model's gridded temperature against an array, like for like."""

from profiles.validation.comparison import compare_model
from profiles.validation.model import Model, open_model

__all__ = ["Model", "compare_model", "open_model"]
