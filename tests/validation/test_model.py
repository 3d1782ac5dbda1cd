"""How a model's metadata is understood, and what is said where it cannot be."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest
import xarray as xr

from profiles.config import ValidationSettings
from profiles.errors import EXIT_DATA, DataError
from profiles.validation import open_model
from profiles.validation.box import Reader, box_of
from profiles.validation.sources import open_source

LEVELS = np.array([5.0, 50.0, 150.0, 300.0])
ROWS, COLUMNS = np.arange(-6.0, 6.1, 2.0), np.arange(118.0, 283.0, 3.0)
DAYS = np.datetime64("2031-01-01T12", "ns") + np.arange(3) * np.timedelta64(1, "D")
MOORING = np.array([0.0]), np.array([200.0])


def model(**attributes: Any) -> xr.Dataset:
    """A model whose temperature falls by 0.05 °C per metre from 28, with the attributes of its temperature changed."""
    shape = (DAYS.size, LEVELS.size, ROWS.size, COLUMNS.size)
    warm = np.broadcast_to((28.0 - 0.05 * LEVELS)[None, :, None, None], shape)
    named = {"standard_name": "sea_water_temperature", "units": "degree_Celsius"} | attributes
    return xr.Dataset(
        {"temp": (("time", "lev", "lat", "lon"), warm.copy(), named)},
        coords={
            "time": ("time", DAYS),
            "lev": ("lev", LEVELS, {"units": "m", "positive": "down", "standard_name": "depth"}),
            "lat": ("lat", ROWS, {"units": "degrees_north"}),
            "lon": ("lon", COLUMNS, {"units": "degrees_east"}),
        },
    )


def read(dataset: xr.Dataset, settings: ValidationSettings | None = None) -> Any:
    """Return what the first block of a model holds: temperature (time, row, column, level) and depth."""
    settings = settings or ValidationSettings()
    opened = open_model(dataset, settings)
    return Reader(opened, box_of(opened, *MOORING, settings)).read(slice(0, 1))


def refused(dataset: xr.Dataset, match: str, **settings: Any) -> None:
    with pytest.raises(DataError, match=match) as caught:
        open_model(dataset, ValidationSettings(**settings), name="ocean")
    assert caught.value.exit_code == EXIT_DATA == 3
    assert str(caught.value).startswith("ocean")


# --------------------------------------------------------------------------------------------------------------
# Temperature


def test_a_model_without_a_temperature_lists_what_it_has() -> None:
    refused(
        model(standard_name="sea_water_salinity"), r"no temperature was found.*one variable with.*found temp; name it"
    )
    refused(model().drop_vars("temp"), r"no temperature was found in the model.*found nothing")


def test_two_temperatures_are_not_chosen_between() -> None:
    two = model()
    two["theta"] = two["temp"].assign_attrs(standard_name="sea_water_potential_temperature")
    refused(two, r"two temperatures or more.*found temp, theta; name it: temperature_variable")
    opened = open_model(two, ValidationSettings(temperature_variable="theta"))
    assert (opened.temperature.name, opened.kind) == ("theta", "potential")


def test_a_variable_that_is_named_but_not_there_is_an_error() -> None:
    refused(model(), r"no such variable.*expected 'tepm'.*found temp", temperature_variable="tepm")


def test_a_temperature_without_a_standard_name_needs_its_kind() -> None:
    nameless = model(standard_name="")
    match = r"does not say which temperature.*found none; declare temperature_kind"
    refused(nameless, match, temperature_variable="temp")
    declared = ValidationSettings(temperature_variable="temp", temperature_kind="conservative")
    assert open_model(nameless, declared).kind == "conservative"


@pytest.mark.parametrize(("units", "found"), [("psu2", "'psu2'"), ("m", "'m'"), ("", "no units")])
def test_units_that_are_not_of_temperature_are_refused(units: str, found: str) -> None:
    refused(model(units=units), rf"units cannot be converted; expected units of temperature.*found {found}")


@pytest.mark.parametrize("spelling", ["degC", "degrees_C", "celsius", "Celsius", "degree_C", "deg_C"])
def test_degrees_may_be_spelled_as_models_do(spelling: str) -> None:
    np.testing.assert_array_equal(read(model(units=spelling)).temperature[0, 0, 0], 28.0 - 0.05 * LEVELS)


def test_other_scales_become_celsius() -> None:
    # 28 °C = 301.15 K = 82.4 °F; 15 °C = 288.15 K = 59 °F.
    for units, factor, zero in (("K", 1.0, 273.15), ("degF", 1.8, 32.0)):
        other = model(units=units)
        other["temp"].values[:] = other["temp"].values * factor + zero
        np.testing.assert_allclose(read(other).temperature[0, 0, 0], 28.0 - 0.05 * LEVELS, atol=1e-9)


def test_integers_become_floating_point() -> None:
    whole = model(units="K").astype(np.int16)
    whole["temp"].values[:] = 300
    whole["temp"].attrs = model(units="K")["temp"].attrs
    assert read(whole).temperature[0, 0, 0, 0] == pytest.approx(26.85)


# --------------------------------------------------------------------------------------------------------------
# Dimensions


def test_several_members_are_a_dimension_too_many() -> None:
    five = model().expand_dims(member=3, axis=1)
    refused(five, r"a dimension too many.*of which member, lev are not explained.*choose one member first")
    assert open_model(five.isel(member=[1])).temperature.sizes == {"time": 3, "level": 4, "row": 7, "column": 55}


def test_a_surface_field_has_no_thermocline() -> None:
    # Without its level not even the depth is there; with the depth alone the dimension is not.
    refused(model().isel(lev=0, drop=True), r"the model's depth was not found")
    line = model().isel(lat=3, drop=True)
    refused(line, r"the model's latitude was not found.*coordinates .*lon")
    refused(model().isel(lat=3), r"lacks a dimension.*no row")


def test_times_that_are_missing_are_said_to_be() -> None:
    refused(model().drop_vars("time"), r"the model's time was not found.*found coordinates lev, lat, lon")


def test_an_axis_that_turns_back_is_refused() -> None:
    turned = model().isel(lat=[0, 2, 1, 3, 4, 5, 6])
    refused(turned, r"an axis of the model's grid is not in order.*finite, all ascending or all descending")


def test_one_level_and_one_time_are_dimensions_all_the_same() -> None:
    """CF lets a depth or a time of one value stand as a scalar coordinate."""
    scalar = model().isel(lev=0, time=0)
    opened = open_model(scalar, ValidationSettings(averaging_days=30.0))
    assert dict(opened.temperature.sizes) == {"time": 1, "level": 1, "row": 7, "column": 55}
    found = read(scalar, ValidationSettings(averaging_days=30.0))
    assert (found.temperature[0, 0, 0, 0], found.depth.ravel()) == (27.75, [5.0])


# --------------------------------------------------------------------------------------------------------------
# Levels


def without(dataset: xr.Dataset, *names: str) -> xr.Dataset:
    kept = {key: value for key, value in dataset["lev"].attrs.items() if key not in names}
    return dataset.assign_coords(lev=("lev", dataset["lev"].values, kept))


@pytest.mark.parametrize(("positive", "found"), [(None, "none"), ("upward", "'upward'"), ("", "none")])
def test_depth_needs_a_direction(positive: str | None, found: str) -> None:
    unsaid = without(model(), "positive")
    if positive is not None:
        unsaid["lev"].attrs["positive"] = positive
    refused(unsaid, rf"depth is not declared as positive up or down.*found {found}; declare depth_positive")


def test_a_declared_direction_is_taken() -> None:
    height = without(model(), "positive").assign_coords(lev=("lev", -LEVELS, {"units": "m", "standard_name": "depth"}))
    found = read(height, ValidationSettings(depth_positive="up"))
    np.testing.assert_array_equal(found.depth.ravel(), LEVELS)


def test_depths_may_be_of_any_length_or_of_pressure() -> None:
    kilometres = without(model(), "units").assign_coords(
        lev=("lev", LEVELS / 1000.0, {"units": "km", "positive": "down", "standard_name": "depth"})
    )
    np.testing.assert_allclose(read(kilometres).depth.ravel(), LEVELS)
    # 300 dbar at the equator by Fofonoff and Millard (1983): (9.72659 x 300 - 2.2512e-5 x 300^2) / 9.78065 = 298.14 m.
    pressure = model().assign_coords(lev=("lev", LEVELS * 1e4, {"units": "Pa", "standard_name": "sea_water_pressure"}))
    assert read(pressure).depth.ravel()[-1] == pytest.approx(298.14, abs=0.02)


def test_levels_that_are_only_numbered_are_no_depth() -> None:
    numbered = model().assign_coords(lev=("lev", np.arange(4), {"units": "1", "axis": "Z"}))
    refused(numbered, r"depth was not found.*vertical coordinates lev.*add standard_name = 'depth'")


@pytest.mark.parametrize("levels", [[5.0, 50.0, np.nan, 300.0], [5.0, 150.0, 50.0, 300.0], [5.0, 50.0, 50.0, 300.0]])
def test_a_level_that_is_missing_or_out_of_order_is_refused(levels: list[float]) -> None:
    refused(
        model().assign_coords(lev=("lev", levels, model()["lev"].attrs)), r"levels are not in order, or one is missing"
    )


def test_one_level_of_unknown_depth_is_refused() -> None:
    unknown = model().isel(lev=[1]).assign_coords(lev=("lev", [np.nan], model()["lev"].attrs))
    refused(unknown, r"levels are not in order, or one is missing")


def test_levels_that_move_are_found_before_those_that_are_nominal() -> None:
    moving = model()
    depth = moving["temp"].copy(data=moving["temp"] * 0.0 + LEVELS[:, None, None] + np.arange(3.0)[:, None, None, None])
    depth.attrs = {"standard_name": "depth", "units": "m", "positive": "down"}
    opened = open_model(moving.assign(z=depth))
    assert opened.depth.moving
    found = Reader(opened, box_of(opened, *MOORING, ValidationSettings())).read(slice(2, 3))
    np.testing.assert_array_equal(found.depth[0, 0, 0], LEVELS + 2.0)


def test_levels_that_follow_the_floor_are_computed_from_their_formula(tmp_path: Path) -> None:
    """Ocean sigma coordinate (CF conventions, appendix D): z = eta + sigma (depth + eta).

    With eta = 1 m and a floor at 599 m, sigma = -0.25 lies at 1 - 0.25 x 600 = -149 m, sigma = -0.5 at -299 m.
    """
    sigma = np.array([-0.01, -0.1, -0.25, -0.5])
    followed = model().assign_coords(
        lev=(
            "lev",
            sigma,
            {
                "standard_name": "ocean_sigma_coordinate",
                "positive": "up",
                "units": "1",
                "formula_terms": "sigma: lev eta: eta depth: floor",
            },
        )
    )
    eta, floor = {"standard_name": "sea_surface_height_above_geoid"}, {"standard_name": "sea_floor_depth_below_geoid"}
    flat = np.ones((ROWS.size, COLUMNS.size))
    followed["eta"] = (("time", "lat", "lon"), np.broadcast_to(flat, (3, *flat.shape)), {"units": "m"} | eta)
    followed["floor"] = (("lat", "lon"), 599.0 * flat, {"units": "m"} | floor)
    followed.to_netcdf(tmp_path / "followed.nc")
    for dataset in (followed, open_source(tmp_path / "followed.nc")):
        assert open_model(dataset).depth.moving
        np.testing.assert_allclose(read(dataset).depth[0, 3, 20], [5.0, 59.0, 149.0, 299.0])
    refused(followed.drop_vars("floor"), r"formula of the model's levels cannot be used.*expected formula_terms")


# --------------------------------------------------------------------------------------------------------------
# Names and notes


def test_a_model_is_called_what_its_title_says_or_what_it_is_told() -> None:
    assert open_model(model().assign_attrs(title="spring run")).name == "spring run"
    assert open_model(model()).name == "model"
    assert open_model(model(), name="other").name == "other"


def test_notes_say_how_a_model_was_understood() -> None:
    notes = open_model(model()).notes
    assert notes["model_temperature"] == "temp: in situ temperature, degree_Celsius"
    assert notes["model_salinity"] == "atlas"
    assert notes["model_grid"] == "regular, 3x4x7x55 (time, level, row, column)"
    assert notes["model_levels"] == "fixed"


def test_levels_below_what_is_compared_are_not_read_but_for_one() -> None:
    """Of levels at 5, 50, 150, 300 m those to 100 m are needed, and 150 m, so that 100 m lies between two."""
    opened = open_model(model())
    box = box_of(opened, *MOORING, ValidationSettings(deepest=100.0))
    assert (box.levels, box.flipped) == (slice(0, 3), False)
    turned = open_model(model().isel(lev=slice(None, None, -1)))
    box = box_of(turned, *MOORING, ValidationSettings(deepest=100.0))
    assert (box.levels, box.flipped) == (slice(1, 4), True)
