"""What the variables of a comparison are, from the vocabulary's words for the quantity and for the side it is of."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import xarray as xr

from profiles.vocabulary import DEGREES, VARIABLES, describe

_SIDES: Mapping[str, str] = {
    "array_": "{}: the array, in the months and at the sensors that both sides have",
    "model_": "{}: the model as seen by the array's sensors",
    "seen_": "{}: the model as seen, mapped as the array is",
    "full_": "{}: the model on its own grid, without sampling",
}
_DIFFERENCES: Mapping[str, str] = {
    "_seen_difference": "{}: model as seen less array",
    "_hidden": "{}: model as seen less full model, which is what the sampling hides",
    "_difference": "{}: full model less array",
}
_ERROR = "_error"

#: Units of what is scored, by quantity.
UNITS: Mapping[str, str] = {
    "isotherm_depth": "m",
    "steepest_gradient_depth": "m",
    "mixed_layer_depth": "m",
    "mean_temperature": DEGREES,
    "thermocline_slope": "m (1000 km)-1",
    "warm_water_volume": "m3",
}

_OWN: Mapping[str, tuple[str, str | None]] = {
    "isotherm_depth_difference_error": ("standard error of model less array at a mooring, from measurement alone", "m"),
    "averaging_effect": (
        "isotherm depth of the array's temperature averaged over the model's steps, less the run's own monthly mean",
        "m",
    ),
    "nearest_wet_distance": ("distance of the model's point that stands for the mooring; 0 where interpolated", "km"),
    "latitude_of_mooring": ("latitude of the mooring", "degrees_north"),
    "longitude_of_mooring": ("longitude of the mooring", "degrees_east"),
    "understood": ("how the model was understood, by subject (JSON)", None),
    "quantity": ("what the series is of", None),
    "place": ("where the series is of: mooring, line, array, region", None),
    "kind": ("mooring, line (mean of its moorings), array (mean of all), or map", None),
    "units": ("units of the row's quantity; scores without units of their own have these", None),
    "verdict": ("what the interval of the bias says", None),
    "months": ("months that both sides have", "1"),
    "effective_count": ("effective number of independent months", "1"),
    "bias": ("mean of model as seen less array", None),
    "bias_sampling_error": ("standard error of the bias as an estimate of that of other years", None),
    "centred_rms": ("root mean square difference without the bias", None),
    "correlation": ("correlation of model as seen and array", "1"),
    "array_sd": ("standard deviation of the array's series", None),
    "model_sd": ("standard deviation of the model's series", None),
    "sd_ratio": ("ratio of standard deviations, model as seen to array", "1"),
    "array_annual_amplitude": ("amplitude of the array's annual cycle", None),
    "model_annual_amplitude": ("amplitude of the annual cycle of the model as seen", None),
    "annual_amplitude_difference": ("difference of annual amplitudes, model as seen less array", None),
    "annual_phase_difference": ("how much later the annual cycle of the model as seen is", "days"),
    "mean_hidden": ("mean of model as seen less full model", None),
    "mean_difference": ("mean of full model less array", None),
    "mean_difference_error": ("standard error of mean_difference, what the array's map cannot know included", None),
    "observation_noise": ("rms of a month's error of the array from measurement", None),
}
_LIMITS = {"_low": "lower end of the 95 % interval of {}", "_high": "upper end of the 95 % interval of {}"}


def worded(dataset: xr.Dataset) -> xr.Dataset:
    """Return a comparison with long names and units on every variable."""
    extra = {str(name): words for name in dataset.variables if (words := _words(str(name))) is not None}
    return describe(dataset, **extra)


def _words(name: str) -> dict[str, Any] | None:
    if name in _OWN:
        return _attributes(*_OWN[name])
    for ending, words in _LIMITS.items():
        stem = name.removesuffix(ending)
        if stem != name and stem in _OWN:
            return _attributes(words.format(stem), _OWN[stem][1])
    if name.endswith(_ERROR):
        of = _words(name.removesuffix(_ERROR))
        return None if of is None else of | {"long_name": f"standard error of {name.removesuffix(_ERROR)}"}
    return _of_side(name) or _of_difference(name)


def _of_side(name: str) -> dict[str, Any] | None:
    for start, words in _SIDES.items():
        quantity = name.removeprefix(start)
        if quantity != name:
            return _of_quantity(quantity, words)
    return None


def _of_difference(name: str) -> dict[str, Any] | None:
    for ending, words in _DIFFERENCES.items():
        quantity = name.removesuffix(ending)
        if quantity != name:
            return _of_quantity(quantity, words)
    return None


def _of_quantity(quantity: str, words: str) -> dict[str, Any] | None:
    known = VARIABLES.get(quantity.replace("equatorial_steepest_gradient_depth", "steepest_gradient_depth"))
    if known is None:
        return None
    return _attributes(words.format(known.long_name), known.units)


def _attributes(long_name: str, units: str | None) -> dict[str, Any]:
    return {"long_name": long_name} | ({"units": units} if units is not None else {})
