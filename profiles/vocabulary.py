"""Every variable, flag, test bit and status once: names, dimensions, units, CF names.

Files and labelled results take their attributes from here, so a quantity is described alike wherever it appears.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from enum import IntEnum
from typing import Any

import numpy as np
import xarray as xr

#: Shown wherever a reader could lean on a number for a decision that matters.
CAUTION = "For research use. Official outlooks come from the national services. Not for navigation."

# --------------------------------------------------------------------------------------------------------------
# Flags, tests, statuses


class Flag(IntEnum):
    """Primary-level quality flags, IOC Manuals and Guides 54, volume 3 (2013)."""

    GOOD = 1
    NOT_EVALUATED = 2
    QUESTIONABLE = 3
    BAD = 4
    MISSING = 9


#: Our flag for each flag of an OceanSITES file, by the meanings in the Data Format Reference Manual 1.4 (2020), reference
#: table 2 (choice ours): probably good is good; nominal is a target, not a fault; interpolated was not observed.
OCEANSITES_TO_FLAG: Mapping[int, Flag] = {
    0: Flag.NOT_EVALUATED,  # unknown
    1: Flag.GOOD,  # good_data
    2: Flag.GOOD,  # probably_good_data
    3: Flag.QUESTIONABLE,  # potentially_correctable_bad_data
    4: Flag.BAD,  # bad_data
    7: Flag.GOOD,  # nominal_value
    8: Flag.QUESTIONABLE,  # interpolated_value
    9: Flag.MISSING,  # missing_value
}

#: The way back: of the flags that are read as one of ours, the one that is written for it.
FLAG_TO_OCEANSITES: Mapping[Flag, int] = {
    Flag.GOOD: 1,
    Flag.NOT_EVALUATED: 0,
    Flag.QUESTIONABLE: 3,
    Flag.BAD: 4,
    Flag.MISSING: 9,
}

#: Bit of each quality-control test in the masks ``temperature_qc_ran``, ``_questionable`` and ``_bad``.
TEST_BITS: Mapping[str, int] = {
    "gap": 0,
    "gross_range": 1,
    "climatology": 2,
    "spike": 3,
    "rate_of_change": 4,
    "flat_line": 5,
    "delivered_flag": 6,
    "water": 7,
    "inversion": 8,
    "repeated": 9,
}


class IsothermStatus(IntEnum):
    """Why an isotherm depth is, or is not, given."""

    FOUND = 1
    OUTCROPPED = 2  # the shallowest good sensor is near the surface and already colder: the depth is 0
    ABOVE_CHAIN = 3  # the shallowest good sensor is deeper than that and already colder: the depth is unknown
    BELOW_CHAIN = 4  # the deepest good sensor is still warmer
    GAP = 5  # the bracketing sensors are further apart than allowed
    SEVERAL_CROSSINGS = 6  # a depth is given, by the stated rule, but the profile crosses more than once
    TOO_FEW_SENSORS = 7  # fewer than two good sensors
    NOT_DELIVERED = 8  # a series from elsewhere has no value and does not say why
    NOT_USED = 9  # a series from elsewhere has a value with a quality flag that is not used


class MixedLayerStatus(IntEnum):
    """Why a mixed-layer depth is, or is not, given."""

    FOUND = 1
    BELOW_CHAIN = 2  # mixed down to the deepest good sensor
    NO_REFERENCE = 3  # no good sensors at or around the reference depth
    TOO_FEW_SENSORS = 4
    NOT_DELIVERED = 5  # as of the isotherm
    NOT_USED = 6


class LayerMeanStatus(IntEnum):
    """Why the mean temperature of a layer is, or is not, given."""

    FOUND = 1
    OPEN_TOP = 2  # no good sensor near the surface
    OPEN_BOTTOM = 3  # no good sensor at or below the bottom of the layer
    GAP = 4  # neighbouring good sensors further apart than allowed
    TOO_FEW_SENSORS = 5
    NOT_DELIVERED = 6  # as of the isotherm
    NOT_USED = 7


class MeanStatus(IntEnum):
    """Why a daily or monthly mean is, or is not, given."""

    GIVEN = 1
    TOO_FEW_VALUES = 2
    CENSORED = 3  # too many of the profiles only say that the isotherm lies outside the chain


class ColumnSource(IntEnum):
    """Where a mooring's column of a day or a month comes from."""

    NEITHER = 0
    CHAIN = 1
    SERIES = 2  # computed by somebody else


class Water(IntEnum):
    """Whether a chain was in the water."""

    IN_WATER = 1
    NOT_DEPLOYED = 2  # by the recovery log
    AIR_FOUND = 3  # its readings are alike from top to bottom, as on deck


# --------------------------------------------------------------------------------------------------------------
# Variables

DEGREES = "degree_Celsius"
ON_SCALE = {"units_metadata": "temperature: on_scale"}  # CF-1.11, section 3.1.2
DIFFERENCE = {"units_metadata": "temperature: difference"}


@dataclass(frozen=True)
class Variable:
    """One quantity as it stands in every file and every labelled result.

    ``content`` is the ACDD-1.3 ``coverage_content_type``. ``dtype`` is what a file stores.
    """

    name: str
    dims: tuple[str, ...]
    long_name: str
    units: str | None = None
    standard_name: str | None = None
    dtype: str = "float32"
    content: str = "physicalMeasurement"
    extra: Mapping[str, Any] = field(default_factory=dict)

    def attributes(self) -> dict[str, Any]:
        """Return the CF and ACDD attributes, in a fixed order."""
        named = {
            "long_name": self.long_name,
            "standard_name": self.standard_name,
            "units": self.units,
            "coverage_content_type": self.content,
        }
        return {key: value for key, value in named.items() if value is not None} | dict(self.extra)


def _flag_attributes(members: Iterable[IntEnum]) -> dict[str, Any]:
    members = list(members)
    return {
        "flag_values": np.array([int(member) for member in members], dtype=np.int8),
        "flag_meanings": " ".join(member.name.lower() for member in members),
    }


def _mask_attributes() -> dict[str, Any]:
    return {
        "flag_masks": np.array([1 << bit for bit in TEST_BITS.values()], dtype=np.uint32),
        "flag_meanings": " ".join(TEST_BITS),
    }


_QUALITY = "qualityInformation"
_AUXILIARY = "auxiliaryInformation"
_REFERENCE = "referenceInformation"
_CHAIN = ("time", "depth")
_MAP = ("time", "latitude", "longitude")

_COORDINATES = [
    Variable("time", ("time",), "time, UTC", None, "time", "float64", "coordinate", {"axis": "T"}),
    Variable("depth", ("depth",), "nominal sensor depth below the surface", "m", "depth", "float32", "coordinate",
             {"positive": "down", "axis": "Z"}),
    Variable("latitude", ("latitude",), "latitude", "degrees_north", "latitude", "float64", "coordinate", {"axis": "Y"}),
    Variable("longitude", ("longitude",), "longitude", "degrees_east", "longitude", "float64", "coordinate", {"axis": "X"}),
    Variable("mooring", ("mooring",), "mooring identifier", None, "platform_id", "str", "coordinate",
             {"cf_role": "timeseries_id"}),
    Variable("region", ("region",), "part of 5S-5N, 120E-80W: the whole, west or east of 155W", None, None, "str",
             "coordinate"),
    Variable("harmonic", ("harmonic",), "term of the seasonal cycle", None, None, "str", "coordinate"),
]  # fmt: skip

_CHAIN_VARIABLES = [
    Variable("temperature_raw", _CHAIN, "temperature as delivered, before corrections", DEGREES, "sea_water_temperature",
             extra=ON_SCALE),
    Variable("temperature", _CHAIN, "in situ temperature, ITS-90", DEGREES, "sea_water_temperature",
             extra=ON_SCALE | {"reference_scale": "ITS-90", "ancillary_variables":
                               "temperature_qc temperature_uncertainty"}),
    Variable("temperature_qc", _CHAIN, "quality flag of temperature, all tests together", None,
             "aggregate_quality_flag", "int8", _QUALITY, _flag_attributes(Flag)),
    Variable("temperature_qc_ran", _CHAIN, "tests that could judge the value", None, "status_flag", "uint32", _QUALITY,
             _mask_attributes()),
    Variable("temperature_qc_questionable", _CHAIN, "tests that found the value questionable", None, "status_flag",
             "uint32", _QUALITY, _mask_attributes()),
    Variable("temperature_qc_bad", _CHAIN, "tests that found the value bad", None, "status_flag", "uint32", _QUALITY,
             _mask_attributes()),
    Variable("temperature_delivered_qc", _CHAIN, "quality flag that came with the delivery", None, "quality_flag",
             "int8", _QUALITY, _flag_attributes(Flag)),
    Variable("temperature_uncertainty", ("depth",), "standard uncertainty of temperature from the sensor's accuracy",
             DEGREES, "sea_water_temperature standard_error", "float32", _QUALITY, DIFFERENCE),
    Variable("sensor_depth", _CHAIN, "depth at which the sensor really was", "m", "depth", "float32", _AUXILIARY,
             {"positive": "down"}),
    Variable("deployment", ("time",), "number of the deployment that measured", "1", None, "int16", _AUXILIARY),
    Variable("water_status", ("time",), "whether the chain was in the water", None, "status_flag", "int8", _QUALITY,
             _flag_attributes(Water)),
]  # fmt: skip

_COLUMN_VARIABLES = [
    Variable("isotherm_depth", ("time",), "depth of the isotherm of in situ temperature", "m",
             extra={"positive": "down", "ancillary_variables": "isotherm_depth_error isotherm_status isotherm_depth_qc"}),
    Variable("isotherm_depth_error", ("time",), "standard error of isotherm_depth", "m", None, "float32", _QUALITY),
    Variable("isotherm_depth_error_independent", ("time",),
             "part of isotherm_depth_error that is independent from day to day", "m", None, "float32", _QUALITY),
    Variable("isotherm_depth_error_persistent", ("time",),
             "part of isotherm_depth_error that persists through a deployment", "m", None, "float32", _QUALITY),
    Variable("isotherm_status", ("time",), "why isotherm_depth is or is not given", None, "status_flag", "int8", _QUALITY,
             _flag_attributes(IsothermStatus)),
    Variable("steepest_gradient_depth", ("time",), "depth of the steepest fall of temperature", "m",
             extra={"positive": "down"}),
    Variable("bracket", ("time",), "distance between the sensors that bracket the isotherm", "m", None, "float32",
             _QUALITY),
    Variable("mixed_layer_depth", ("time",), "mixed layer depth", "m",
             "ocean_mixed_layer_thickness_defined_by_temperature",
             extra={"ancillary_variables": "mixed_layer_status"}),
    Variable("mixed_layer_status", ("time",), "why mixed_layer_depth is or is not given", None, "status_flag", "int8",
             _QUALITY, _flag_attributes(MixedLayerStatus)),
    Variable("mean_temperature", ("time",), "mean temperature of the layer from the surface", DEGREES,
             "sea_water_temperature",
             extra=ON_SCALE | {"ancillary_variables": "mean_temperature_status"}),
    Variable("mean_temperature_status", ("time",), "why mean_temperature is or is not given", None, "status_flag", "int8",
             _QUALITY, _flag_attributes(LayerMeanStatus)),
    Variable("questionable_share", ("time",), "share of questionable values among the inputs", "1", None, "float32",
             _QUALITY),
    Variable("isotherm_depth_qc", ("time",), "quality flag of the mean of isotherm_depth", None, "quality_flag", "int8",
             _QUALITY, _flag_attributes((Flag.GOOD, Flag.QUESTIONABLE, Flag.MISSING))),
    Variable("isotherm_mean_status", ("time",), "why the mean of isotherm_depth is or is not given", None, "status_flag",
             "int8", _QUALITY, _flag_attributes(MeanStatus)),
    Variable("isotherm_day_count", ("time",), "number of daily means in the monthly mean of isotherm_depth", "1",
             "number_of_observations", "int16", _QUALITY),
    Variable("isotherm_day_spread", ("time",), "standard deviation of the daily means of isotherm_depth in the month",
             "m", None, "float32", _QUALITY),
    Variable("column_source", ("time",), "where the columns of the day or month come from", None, "status_flag", "int8",
             _AUXILIARY, _flag_attributes(ColumnSource)),
]  # fmt: skip

_SECTION_VARIABLES = [
    Variable("mean", _MAP, "objective map", "m"),
    Variable("error", _MAP, "standard error of the objective map", "m", None, "float32", _QUALITY),
    Variable("isotherm_depth_anomaly", _MAP, "anomaly of the isotherm depth from the climatology of this record", "m"),
    Variable("isotherm_depth_anomaly_error", _MAP, "standard error of isotherm_depth_anomaly as a map", "m", None,
             "float32", _QUALITY),
    Variable("isotherm_depth_climatology", ("harmonic", "latitude", "longitude"),
             "climatology of the isotherm depth: mean, annual and semi-annual terms", "m", None, "float32", _REFERENCE),
    Variable("isotherm_depth_climatology_error", ("harmonic", "latitude", "longitude"),
             "standard error of isotherm_depth_climatology", "m", None, "float32", _QUALITY),
    Variable("equatorial_isotherm_depth", ("time", "longitude"), "isotherm depth, mean of the mapped 2.5S-2.5N", "m"),
    Variable("equatorial_isotherm_depth_error", ("time", "longitude"), "standard error of equatorial_isotherm_depth", "m",
             None, "float32", _QUALITY),
    Variable("equatorial_isotherm_depth_anomaly", ("time", "longitude"),
             "anomaly of the isotherm depth, mean of the mapped 2.5S-2.5N", "m"),
    Variable("equatorial_isotherm_depth_anomaly_error", ("time", "longitude"),
             "standard error of equatorial_isotherm_depth_anomaly", "m", None, "float32", _QUALITY),
    Variable("thermocline_slope", ("time",),
             "slope of the isotherm depth along the equator, negative where it shoals eastward", "m (1000 km)-1",
             None, "float64"),
    Variable("thermocline_slope_error", ("time",), "standard error of thermocline_slope", "m (1000 km)-1", None,
             "float64", _QUALITY),
    Variable("thermocline_slope_anomaly", ("time",), "anomaly of thermocline_slope", "m (1000 km)-1", None, "float64"),
    Variable("thermocline_slope_anomaly_error", ("time",), "standard error of thermocline_slope_anomaly",
             "m (1000 km)-1", None, "float64", _QUALITY),
    Variable("warm_water_volume", ("time", "region"), "volume of water above the isotherm", "m3", None, "float64"),
    Variable("warm_water_volume_error", ("time", "region"), "standard error of warm_water_volume", "m3", None, "float64",
             _QUALITY),
    Variable("warm_water_volume_anomaly", ("time", "region"), "anomaly of warm_water_volume", "m3", None, "float64"),
    Variable("warm_water_volume_anomaly_error", ("time", "region"), "standard error of warm_water_volume_anomaly", "m3",
             None, "float64", _QUALITY),
    Variable("covered_share", ("time", "region"), "share of the region's sea area where the field has a value", "1", None,
             "float64", _QUALITY),
    Variable("sea_share", ("latitude", "longitude"), "share of the cell that is sea", "1", "sea_area_fraction", "float32",
             _REFERENCE),
    Variable("site_latitude", ("site",), "latitude of the site that was mapped", "degrees_north", "latitude", "float64",
             _REFERENCE),
    Variable("site_longitude", ("site",), "longitude of the site that was mapped", "degrees_east", "longitude",
             "float64", _REFERENCE),
    Variable("site_noise", ("time", "site"),
             "standard deviation of the noise of the mapped value, NaN where there was none", "m", None, "float64",
             _QUALITY),
    Variable("parameter_latitude", ("parameter_site",), "latitude of a site whose record made the climatology",
             "degrees_north", "latitude", "float64", _REFERENCE),
    Variable("parameter_longitude", ("parameter_site",), "longitude of a site whose record made the climatology",
             "degrees_east", "longitude", "float64", _REFERENCE),
    Variable("climatology_prior_sd", ("harmonic",), "standard deviation of the climatology about the atlas", "m", None,
             "float64", _REFERENCE),
    Variable("climatology_information", ("parameter", "parameter_"),
             "inverse covariance of the sites' climatologies as the records alone give them, site by harmonic", "m-2", None, "float64",
             _REFERENCE),
]  # fmt: skip

_LEAD = ("lead",)
_EVENT = ("event",)

_SERIES_VARIABLES = [
    Variable("surface_temperature_index", ("time",), "mean sea surface temperature of a box", DEGREES,
             "sea_surface_temperature", "float64", extra=ON_SCALE),
    Variable("surface_temperature_index_anomaly", ("time",), "anomaly of surface_temperature_index", DEGREES, None,
             "float64", extra=DIFFERENCE),
    Variable("pressure_difference_index", ("time",), "sea-level pressure of the eastern minus the western Pacific, standardised",
             "1", None, "float64"),
    Variable("pressure_difference_index_anomaly", ("time",), "anomaly of pressure_difference_index", "1", None, "float64"),
    Variable("warm_water_volume_total", ("time",), "volume of water above the isotherm, 5S-5N, 120E-80W", "m3", None,
             "float64"),
    Variable("warm_water_volume_west", ("time",), "volume of water above the isotherm, 5S-5N, 120E-155W", "m3", None,
             "float64"),
    Variable("predictor", ("predictor",), "series that may come before the index", None, None, "str", "coordinate"),
    Variable("predictor_anomaly", ("predictor", "time"), "anomaly of the predictor", "1", None, "float64"),
    Variable("pattern", ("pattern",), "number of the pattern, by the variance it explains", "1", None, "int32", "coordinate"),
    Variable("pattern_loading", ("pattern", "longitude"),
             "isotherm depth of one standard deviation of a leading pattern along the equator", "m", None, "float64"),
    Variable("pattern_share", ("pattern",), "share of variance that the pattern explains", "1", None, "float64"),
    Variable("pattern_share_error", ("pattern",), "sampling error of pattern_share", "1", None, "float64", _QUALITY),
    Variable("lead", _LEAD, "months by which the predictor comes before the target", "1", None, "int32", "coordinate"),
    Variable("starting_month", ("starting_month",), "calendar month of the predictor", "1", None, "int32", "coordinate"),
    Variable("sign", ("sign",), "sign of the predictor's anomaly", None, None, "str", "coordinate"),
    Variable("window", ("window",), "middle of the moving window", None, "time", "float64", "coordinate"),
    Variable("window_first", ("window",), "first month of the moving window", None, None, "float64", "coordinate"),
    Variable("window_last", ("window",), "last month of the moving window", None, None, "float64", "coordinate"),
    Variable("regression_slope_by_sign", ("sign", "lead"),
             "slope of the target on positive and on negative anomalies of the predictor", "1", None, "float64"),
    Variable("regression_slope_error_by_sign", ("sign", "lead"), "standard error of regression_slope_by_sign", "1", None,
             "float64", _QUALITY),
    Variable("bootstrap_lower", _LEAD, "lower end of the correlation's interval by the block bootstrap, shown beside", "1",
             None, "float64", _QUALITY),
    Variable("bootstrap_upper", _LEAD, "upper end of the correlation's interval by the block bootstrap, shown beside", "1",
             None, "float64", _QUALITY),
    Variable("bootstrap_p_value", _LEAD, "p-value of the block bootstrap, shown beside the one that decides", "1", None,
             "float64", _QUALITY),
    Variable("peak_correlation", (), "correlation at its strongest, of either sign", "1", None, "float64"),
    Variable("precursor_correlation", (), "correlation at its strongest where the predictor comes first", "1", None, "float64"),
    Variable("kind", _EVENT, "warm or cold", None, None, "str"),
    Variable("onset", _EVENT, "first month beyond the threshold", None, None, "float64"),
    Variable("end", _EVENT, "last month beyond the threshold, or of the record", None, None, "float64"),
    Variable("peak", _EVENT, "month of the largest smoothed anomaly", None, None, "float64"),
    Variable("peak_value", _EVENT, "smoothed anomaly at the peak", DEGREES, None, "float64", extra=DIFFERENCE),
    Variable("duration", _EVENT, "months from onset to end, both counted", "1", None, "int32"),
    Variable("whole", _EVENT, "1 where both onset and end lie within the record", "1", None, "int8", _QUALITY),
    Variable("months_before", ("months_before",), "months before the onset of the event", "1", None, "int32", "coordinate"),
    Variable("before_onset", ("predictor", "event", "months_before"),
             "anomaly of the predictor so many months before the onset", "1", None, "float64"),
    Variable("composite", ("predictor", "composite_kind", "lead"),
             "mean anomaly of the predictor so many months before the peak of events", "1", None, "float64"),
    Variable("composite_error", ("predictor", "composite_kind", "lead"), "standard error of composite, from event to event", "1", None,
             "float64", _QUALITY),
    Variable("composite_count", ("predictor", "composite_kind", "lead"), "number of events in composite", "1", None, "int32", _QUALITY),
]  # fmt: skip


def _lead_lag_variables() -> list[Variable]:
    """Return what a lead-lag analysis gives: over all months, by starting month and in moving windows."""
    places = {
        "": (_LEAD, ""),
        "_by_month": (("starting_month", "lead"), ", by starting month"),
        "_in_window": (("window", "lead"), ", in moving windows"),
    }
    quantities = {
        "correlation": ("correlation of predictor and target", "float64", "physicalMeasurement", "1"),
        "correlation_lower": ("lower end of the interval of correlation, effective size", "float64", _QUALITY, "1"),
        "correlation_upper": ("upper end of the interval of correlation, effective size", "float64", _QUALITY, "1"),
        "regression_slope": ("slope of the target on the predictor", "float64", "physicalMeasurement", "1"),
        "regression_slope_error": ("standard error of regression_slope, effective size", "float64", _QUALITY, "1"),
        "pair_count": ("number of months with both values", "int32", _QUALITY, "1"),
        "effective_size": ("effective number of independent months", "float64", _QUALITY, "1"),
        "deciding_p_value": ("p-value of the t-test with the effective size, which decides", "float64", _QUALITY, "1"),
        "significant": ("1 where the t-test with the effective size finds a correlation", "int8", _QUALITY, "1"),
    }
    field = {
        "field_p_value": ("probability that independent series are anywhere as significant", "float64", "1"),
        "significant_count": ("how many correlations are significant one by one", "int32", "1"),
        "field_p_value_of_count": ("probability that of independent series as many are significant", "float64", "1"),
    }
    ends = {"": "", "_lower": ", lower end of its interval", "_upper": ", upper end of its interval"}
    return [
        *(
            Variable(f"{name}{suffix}", dims, text + where, units, None, dtype, content)
            for suffix, (dims, where) in places.items()
            for name, (text, dtype, content, units) in quantities.items()
        ),
        *(
            Variable(f"{name}{suffix}", (), text + where, units, None, dtype, _QUALITY)
            for suffix, where in (("", ", over all leads"), ("_by_month", ", over all leads and starting months"))
            for name, (text, dtype, units) in field.items()
        ),
        *(
            Variable(f"{name}{end}", dims, f"months of lead at which the correlation is strongest{where}{text}", "1", None,
                     "float64")
            for name, dims, where in (("peak_lead", (), ""), ("precursor_lead", (), ", predictor first"))
            for end, text in ends.items()
        ),
        *(
            Variable(f"peak_lead{end}_in_window", ("window",),
                     f"months of lead at which the correlation is strongest in the window{text}", "1", None, "float64")
            for end, text in ends.items()
        ),
    ]  # fmt: skip


_LEAD_LAG_VARIABLES = _lead_lag_variables()

VARIABLES: Mapping[str, Variable] = {
    variable.name: variable
    for variable in [
        *_COORDINATES,
        *_CHAIN_VARIABLES,
        *_COLUMN_VARIABLES,
        *_SECTION_VARIABLES,
        *_SERIES_VARIABLES,
        *_LEAD_LAG_VARIABLES,
    ]
}


def describe(dataset: xr.Dataset, **extra: Mapping[str, Any]) -> xr.Dataset:
    """Return ``dataset`` with the attributes of the vocabulary on every variable it knows.

    Parameters
    ----------
    dataset : xarray.Dataset
        Any dims.
    **extra : mapping
        Further attributes by variable name, for what is known only at run time (``isotherm_depth={"comment": ...}``).

    Returns
    -------
    xarray.Dataset
        A shallow copy. Variables the vocabulary does not know are left as they are.
    """
    described = dataset.copy(deep=False)
    for name in described.variables:
        known = VARIABLES.get(str(name))
        attributes = known.attributes() if known is not None else dict(described[name].attrs)
        described[name].attrs = _present_only(attributes | dict(extra.get(str(name), {})), described)
    return described


def _present_only(attributes: dict[str, Any], dataset: xr.Dataset) -> dict[str, Any]:
    """Leave out of ``ancillary_variables`` what the dataset does not hold (CF-1.11, section 3.4)."""
    ancillary = attributes.pop("ancillary_variables", "")
    present = [name for name in ancillary.split() if name in dataset.variables]
    return attributes | ({"ancillary_variables": " ".join(present)} if present else {})
