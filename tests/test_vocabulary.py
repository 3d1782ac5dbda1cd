"""The vocabulary: names, units, flags and CF attributes, held against the published tables."""

from __future__ import annotations

from collections.abc import Iterable
from enum import IntEnum
from importlib.resources import files
from xml.etree import ElementTree

import cf_units
import numpy as np
import pytest
import xarray as xr

from profiles import vocabulary
from profiles.vocabulary import (
    FLAG_TO_OCEANSITES,
    OCEANSITES_TO_FLAG,
    TEST_BITS,
    VARIABLES,
    Flag,
    IsothermStatus,
    LayerMeanStatus,
    MeanStatus,
    MixedLayerStatus,
    Variable,
    describe,
)


def every(members: Iterable[Variable]) -> pytest.MarkDecorator:
    return pytest.mark.parametrize("variable", members, ids=lambda variable: variable.name)


MEASURED = [variable for variable in VARIABLES.values() if variable.units is not None]
NAMED = [variable for variable in VARIABLES.values() if variable.standard_name is not None]
DEPTHS = [variable for variable in NAMED if variable.standard_name == "depth"] + [VARIABLES["isotherm_depth"]]
TEMPERATURES = [variable for variable in MEASURED if variable.units == "degree_Celsius"]
LINKED = [variable for variable in VARIABLES.values() if "ancillary_variables" in variable.extra]
FLAGGED = [variable for variable in VARIABLES.values() if "flag_values" in variable.extra]
MASKED = [variable for variable in VARIABLES.values() if "flag_masks" in variable.extra]

#: ISO 19115-1 codes that ACDD-1.3 names for coverage_content_type.
CONTENT_TYPES = {
    "image", "thematicClassification", "physicalMeasurement", "auxiliaryInformation", "qualityInformation",
    "referenceInformation", "modelResult", "coordinate",
}  # fmt: skip


@pytest.fixture(scope="module")
def standard_names() -> dict[str, str]:
    """Canonical units by standard name, CF Standard Name Table as the standards checker carries it."""
    table = ElementTree.fromstring((files("compliance_checker") / "data/cf-standard-name-table.xml").read_bytes())
    return {str(entry.get("id")): entry.findtext("canonical_units") or "" for entry in table.iter("entry")}


@every(VARIABLES.values())
def test_a_variable_is_described(variable: Variable) -> None:
    assert variable.long_name == variable.long_name.strip() != ""
    assert variable.content in CONTENT_TYPES
    assert variable.attributes()["long_name"] == variable.long_name
    assert all(value is not None for value in variable.attributes().values())


def test_no_variable_stands_twice() -> None:
    lists = [getattr(vocabulary, name) for name in dir(vocabulary) if name.endswith(("_VARIABLES", "_COORDINATES"))]
    names = [variable.name for variables in lists for variable in variables]
    assert len(lists) == 6
    assert sorted(names) == sorted(VARIABLES)


def test_long_names_tell_variables_apart() -> None:
    long_names = [variable.long_name for variable in VARIABLES.values()]
    assert sorted(long_names) == sorted(set(long_names))


@every(MEASURED)
def test_units_are_understood_by_udunits(variable: Variable) -> None:
    assert not cf_units.Unit(variable.units).is_unknown()


def test_a_numeric_variable_has_units_unless_it_is_a_flag_or_the_time() -> None:
    # CF-1.11, section 3.1: units are required for all variables that represent dimensional quantities. Time takes its
    # own when it is written; flags and text have none.
    bare = {name for name, variable in VARIABLES.items() if variable.units is None and variable.dtype != "str"}
    times = {"time", "window", "window_first", "window_last", "onset", "end", "peak"}
    assert bare == times | {variable.name for variable in [*FLAGGED, *MASKED]}


def test_slope_units_are_metres_per_thousand_kilometres() -> None:
    # 1 m per 1000 km is 1 m over 1e6 m.
    assert cf_units.Unit(VARIABLES["thermocline_slope"].units).convert(1.0, "1") == pytest.approx(1e-6, rel=1e-12)


@pytest.mark.parametrize(
    "name",
    ["temperature", "isotherm_depth", "thermocline_slope", "warm_water_volume", "isotherm_depth_anomaly",
     "equatorial_isotherm_depth", "isotherm_depth_climatology"],
)  # fmt: skip
def test_an_error_has_the_units_and_dims_of_what_it_belongs_to(name: str) -> None:
    error = VARIABLES.get(f"{name}_error", VARIABLES["temperature_uncertainty"])
    assert error.units == VARIABLES[name].units
    assert set(error.dims) <= set(VARIABLES[name].dims)
    assert error.content == "qualityInformation"


@every(NAMED)
def test_a_standard_name_is_in_the_published_table(variable: Variable, standard_names: dict[str, str]) -> None:
    name, _, modifier = str(variable.standard_name).partition(" ")
    assert name in standard_names
    assert modifier in ("", "standard_error")  # CF-1.11, appendix C
    if variable.units is not None:
        assert cf_units.Unit(variable.units).is_convertible(standard_names[name])


def test_the_table_of_standard_names_can_refuse(standard_names: dict[str, str]) -> None:
    assert "depth_of_the_isotherm" not in standard_names
    assert not cf_units.Unit("m").is_convertible(standard_names["sea_water_temperature"])


@every(DEPTHS)
def test_a_variable_with_the_standard_name_depth_is_positive_down(variable: Variable) -> None:
    assert variable.extra["positive"] == "down"


@every(TEMPERATURES)
def test_a_temperature_says_whether_it_is_on_the_scale_or_a_difference(variable: Variable) -> None:
    # CF-1.11, section 3.1.2: units_metadata for temperatures in degrees Celsius.
    is_error = (variable.standard_name or "").endswith(" standard_error")
    is_anomaly = variable.name in ("surface_temperature_index_anomaly", "peak_value")
    expected = "temperature: difference" if is_error or is_anomaly else "temperature: on_scale"
    assert variable.extra["units_metadata"] == expected


@every(LINKED)
def test_ancillary_variables_are_known(variable: Variable) -> None:
    assert [name for name in variable.extra["ancillary_variables"].split() if name not in VARIABLES] == []


@every(FLAGGED)
def test_flag_values_and_meanings_match(variable: Variable) -> None:
    values, meanings = variable.extra["flag_values"], variable.extra["flag_meanings"].split()
    assert len(values) == len(meanings) == len(set(values)) == len(set(meanings))
    # CF-1.11, section 3.5: flag_values are of the type of their variable.
    assert values.dtype == np.dtype(variable.dtype)


@every(MASKED)
def test_flag_masks_are_single_bits_and_match_their_meanings(variable: Variable) -> None:
    masks, meanings = variable.extra["flag_masks"], variable.extra["flag_meanings"].split()
    assert [int(mask).bit_count() for mask in masks] == [1] * len(meanings)
    assert len(set(masks)) == len(masks)
    assert masks.dtype == np.dtype(variable.dtype)
    assert {meaning: int(mask) for meaning, mask in zip(meanings, masks, strict=True)} == {
        test: 2**bit for test, bit in TEST_BITS.items()
    }


def test_the_masks_are_three_and_the_flags_every_status() -> None:
    assert [variable.name for variable in MASKED] == [
        "temperature_qc_ran",
        "temperature_qc_questionable",
        "temperature_qc_bad",
    ]
    shown = {variable.extra["flag_meanings"] for variable in FLAGGED}
    for kind in (Flag, IsothermStatus, MixedLayerStatus, LayerMeanStatus, MeanStatus):
        assert " ".join(member.name.lower() for member in kind) in shown


def test_flags_are_the_primary_level_of_the_published_scheme() -> None:
    # IOC Manuals and Guides 54, volume 3 (2013): 1 good, 2 not evaluated, not available or unknown,
    # 3 questionable or suspect, 4 bad, 9 missing data.
    assert {flag.name: int(flag) for flag in Flag} == {
        "GOOD": 1,
        "NOT_EVALUATED": 2,
        "QUESTIONABLE": 3,
        "BAD": 4,
        "MISSING": 9,
    }


@pytest.mark.parametrize("kind", [IsothermStatus, MixedLayerStatus, LayerMeanStatus, MeanStatus])
def test_zero_is_no_status(kind: type[IntEnum]) -> None:
    # An array of zeros that nobody filled must not read as a status.
    assert [int(member) for member in kind] == list(range(1, len(kind) + 1))


def test_a_flag_written_as_oceansites_reads_back_as_itself() -> None:
    assert set(FLAG_TO_OCEANSITES) == set(Flag)
    assert {flag: OCEANSITES_TO_FLAG[written] for flag, written in FLAG_TO_OCEANSITES.items()} == {
        flag: flag for flag in Flag
    }


def test_no_flag_of_another_scheme_becomes_better_by_reading() -> None:
    # OceanSITES Data Format Reference Manual 1.4, reference table 2: 3 and 4 are bad data, 9 is missing.
    assert [OCEANSITES_TO_FLAG[code] for code in (3, 4, 9)] == [Flag.QUESTIONABLE, Flag.BAD, Flag.MISSING]
    # Codes 5 and 6 are not used in version 1.4, so their meaning is not guessed.
    assert {5, 6} & set(OCEANSITES_TO_FLAG) == set()


def test_describe_names_only_ancillary_variables_that_are_there() -> None:
    chain = xr.Dataset({"temperature": (("time", "depth"), np.zeros((1, 1)))})
    assert "ancillary_variables" not in describe(chain)["temperature"].attrs
    with_flags = chain.assign(temperature_qc=(("time", "depth"), np.ones((1, 1), np.int8)))
    assert describe(with_flags)["temperature"].attrs["ancillary_variables"] == "temperature_qc"
    complete = with_flags.assign(temperature_uncertainty=("depth", np.zeros(1)))
    assert describe(complete)["temperature"].attrs["ancillary_variables"] == "temperature_qc temperature_uncertainty"


def test_describe_gives_coordinates_and_variables_their_attributes() -> None:
    chain = xr.Dataset({"sensor_depth": (("time", "depth"), np.zeros((1, 1)))}, coords={"depth": [10.0]})
    described = describe(chain)
    assert described["depth"].attrs == VARIABLES["depth"].attributes()
    assert described["sensor_depth"].attrs == VARIABLES["sensor_depth"].attributes()


def test_describe_adds_what_is_known_only_at_run_time() -> None:
    columns = xr.Dataset({"isotherm_depth": ("time", np.zeros(1))})
    described = describe(columns, isotherm_depth={"comment": "20 °C"})
    assert described["isotherm_depth"].attrs["comment"] == "20 °C"
    assert described["isotherm_depth"].attrs["units"] == "m"


def test_describe_leaves_its_argument_and_unknown_variables_alone() -> None:
    dataset = xr.Dataset({"temperature": ((), 1.0), "wind": ((), 2.0, {"units": "m s-1"})})
    described = describe(dataset)
    assert dataset["temperature"].attrs == {}
    assert described["wind"].attrs == {"units": "m s-1"}
    described["wind"].attrs["units"] = "knots"
    assert dataset["wind"].attrs == {"units": "m s-1"}


def test_describe_does_not_share_attributes_with_the_vocabulary() -> None:
    dataset = describe(xr.Dataset({"temperature": ((), 1.0)}))
    dataset["temperature"].attrs["reference_scale"] = "IPTS-68"
    assert VARIABLES["temperature"].attributes()["reference_scale"] == "ITS-90"
