import numpy as np
import pytest

from profiles.ingest.units import (
    require_depth_units,
    require_temperature_units,
    to_celsius,
    to_downward,
    to_its90,
)


def test_kelvin_becomes_celsius_and_nan_stays():
    # 0 °C = 273.15 K by definition; 32 °F = 0 °C
    np.testing.assert_allclose(to_celsius([273.15, 300.0, np.nan], "kelvin"), [0.0, 26.85, np.nan], atol=1e-10)
    np.testing.assert_allclose(to_celsius([32.0, 212.0], "degree_Fahrenheit"), [0.0, 100.0], atol=1e-10)


def test_ipts_68_becomes_its_90():
    # t90 = 0.99976 t68 (CF standard name table, sea_water_temperature): 20 - 20 * 0.00024 = 19.9952
    np.testing.assert_allclose(to_its90(np.array([20.0, 0.0, np.nan]), "IPTS-68"), [19.9952, 0.0, np.nan])
    np.testing.assert_array_equal(to_its90(np.array([20.0]), "ITS-90"), [20.0])


def test_heights_and_other_units_become_metres_down():
    # 1 international foot = 0.3048 m
    np.testing.assert_allclose(to_downward([-10.0, 0.0], "m", "up"), [10.0, 0.0])
    np.testing.assert_allclose(to_downward([100.0], "cm", "down"), [1.0])
    np.testing.assert_allclose(to_downward([10.0], "international_foot", "down"), [3.048])


def test_input_is_left_alone():
    given = np.array([300.0])
    to_celsius(given, "kelvin")
    assert given[0] == 300.0


@pytest.mark.parametrize("units", ["bogus", "m", ""])
def test_units_that_are_no_temperature_are_refused(units):
    with pytest.raises(ValueError, match=f"unknown units: {units!r}"):
        require_temperature_units(units)


@pytest.mark.parametrize("units", ["kelvin", "s"])
def test_units_that_are_neither_length_nor_pressure_are_refused(units):
    with pytest.raises(ValueError, match=f"unknown units: {units!r}"):
        require_depth_units(units)
