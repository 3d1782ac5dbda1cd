"""Every kind of file that a run writes, through the standards checker.

Source: compliance-checker (the community's checker of CF and ACDD), suites cf:1.11 and acdd:1.3.
"""

from __future__ import annotations

from pathlib import Path

import netCDF4
import numpy as np
import pytest
from compliance_checker.runner import CheckSuite

from profiles.config import load_config
from profiles.pipeline import run

CONFIG = Path(__file__).parents[2] / "config" / "tropicbird.toml"
MOORINGS = ("TB-06", "TB-22", "TB-34")  # one of each kind of delivery
FILES = (
    *(f"{kind}/{mooring}.nc" for kind in ("chains", "columns") for mooring in MOORINGS),
    "columns.nc",
    "columns_monthly.nc",
    "section.nc",
    "volume.nc",
)

#: A check of the checker that takes the difference of labels (moorings, sites, regions, harmonics) and breaks. What it
#: would say of the numeric coordinates is tested here instead.
BREAKS_ON_LABELS = {"check_coordinate_variables_strict_monotonicity"}

#: ACDD attributes that a run leaves out, each with its reason.
ALLOWED_MISSING = {
    "contributor_name": "the configuration names one creator, no contributors",
    "contributor_role": "as contributor_name",
    "creator_type": "a person or a group: the configuration does not ask",
    "creator_institution": "the same as institution",
    "publisher_type": "as creator_type",
    "publisher_institution": "the same as institution",
    "program": "the configuration has a project, no programme above it",
    "platform": "the moorings are named by the coordinate of that name",
    "platform_vocabulary": "invented moorings are in no vocabulary",
    "instrument": "source says thermistor chains; deliveries do not state the model",
    "instrument_vocabulary": "as instrument",
    "metadata_link": "there is no page to link to",
    "references": "methods are cited where they are computed, not in each file",
    "product_version": "history names the program; the files have no editions of their own",
    "date_issued": "a run does not publish",
    "date_modified": "files are replaced, never modified",
    "date_metadata_modified": "as date_modified",
    "geospatial_lat_resolution": "moorings stand at no regular spacing; on grids the coordinate says it",
    "geospatial_lon_resolution": "as geospatial_lat_resolution",
    "geospatial_vertical_resolution": "sensors stand at no regular spacing",
}
#: Further ones where the file has no such axis: no depth beside chains, no position in the totals of regions.
NO_DEPTH = {f"geospatial_vertical_{name}" for name in ("min", "max", "units", "positive")} | {
    "geospatial_bounds_vertical_crs"
}
NO_POSITION = {f"geospatial_{axis}_{name}" for axis in ("lat", "lon") for name in ("min", "max", "units")} | {
    "geospatial_bounds",
    "geospatial_bounds_crs",
    "geospatial_lat_min/max",
    "geospatial_lon_min/max",
}
#: Quantities for which the CF table has no name, which a file must then leave out.
NO_STANDARD_NAME = {
    "deployment",
    "bracket",
    "questionable_share",
    "covered_share",
    "site_noise",
    "climatology_information",
    "climatology_prior_sd",
    "isotherm_day_spread",
}
NO_STANDARD_NAME_FOR = ("isotherm_depth", "equatorial_isotherm_depth", "thermocline_slope", "warm_water_volume")


@pytest.fixture(scope="module")
def written(tmp_path_factory):
    """Run three moorings of the demo array as far as the section."""
    config = load_config(CONFIG)
    chosen = tuple(mooring for mooring in config.moorings if mooring.id in MOORINGS)
    out = tmp_path_factory.mktemp("run")
    outcome = run(config.model_copy(update={"moorings": chosen}), out, until="section", workers=1)
    assert outcome.problems == ()
    CheckSuite.load_all_available_checkers()
    return out


def findings(results):
    """Return what a suite's results complain of, innermost results only."""
    for result in results:
        if result.children:
            yield from findings(result.children)
        elif result.value != () and (
            result.value[0] != result.value[1] if isinstance(result.value, tuple) else not result.value
        ):
            yield from ((result.name, message) for message in result.msgs or [""])


@pytest.mark.parametrize("name", FILES)
@pytest.mark.filterwarnings("ignore:Problem fetching standard name table")  # the packaged one is then used
@pytest.mark.filterwarnings("ignore:Passing the dataset to every single check:DeprecationWarning")  # the checker's own
def test_a_written_file_has_no_cf_error_and_only_allowed_acdd_findings(written, name):
    suite = CheckSuite()
    done = suite.run_all(suite.load_dataset(str(written / name)), ["cf:1.11", "acdd:1.3"])
    cf, broken = done["cf:1.11"]
    assert list(findings(cf)) == []
    assert set(broken) <= BREAKS_ON_LABELS
    acdd, broken = done["acdd:1.3"]
    assert broken == {}
    assert [finding for finding in findings(acdd) if not allowed(name, *finding)] == []


def allowed(name, check, message):
    """Tell whether an ACDD finding is one of those that are left on purpose."""
    if message == "standard_name":
        variable = check.split('"')[1]
        return variable in NO_STANDARD_NAME or variable.startswith(NO_STANDARD_NAME_FOR)
    if not (message.endswith((" not present", " is not present")) or " not found" in message):
        return False
    attribute = message.removeprefix("Attr ").split()[0]
    left_out = set(ALLOWED_MISSING)
    left_out |= set() if name.startswith("chains/") else NO_DEPTH
    left_out |= NO_POSITION if name == "volume.nc" else set()
    return attribute in left_out


@pytest.mark.parametrize("name", FILES)
def test_numeric_coordinates_ascend(written, name):
    with netCDF4.Dataset(written / name) as file:
        axes = [variable for label, variable in file.variables.items() if variable.dimensions == (label,)]
        numeric = [variable for variable in axes if variable.dtype is not str]
        assert numeric
        for variable in numeric:
            assert (np.diff(variable[:]) > 0).all(), variable.name


@pytest.mark.parametrize("name", ["columns.nc", "columns_monthly.nc"])
def test_positions_of_moorings_belong_to_the_data(written, name):
    """CF-1.11, section 5: auxiliary coordinates are named by the data variables they go with."""
    with netCDF4.Dataset(written / name) as file:
        assert file["isotherm_depth"].coordinates.split() == ["mooring", "latitude", "longitude"]
        assert file["time"].units_metadata == "leap_seconds: none"
