"""A model against an array: zero where the model is the ocean, and what was planted where something was."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
import xarray as xr

from profiles import compare_model
from profiles.config import ValidationSettings
from profiles.errors import DataError
from profiles.validation import FUNCTIONALS, open_model


@pytest.fixture(scope="module")
def zero(truth: xr.Dataset, perfect: Path) -> xr.Dataset:
    return compare_model(truth, perfect)


@pytest.fixture(scope="module")
def by_months(monthly_truth: xr.Dataset, perfect: Path) -> xr.Dataset:
    return compare_model(monthly_truth, perfect)


def test_a_model_that_is_the_ocean_has_no_error_as_seen(zero: xr.Dataset) -> None:
    """Sensors lie on the model's points and levels, and both are of one float32 value: nothing is left to differ."""
    for name in ("isotherm_depth", "steepest_gradient_depth", "mixed_layer_depth", "mean_temperature"):
        assert zero[f"array_{name}"].notnull().sum() > 100, name
        np.testing.assert_array_equal(zero[f"model_{name}"], zero[f"array_{name}"], err_msg=name)
    for name in FUNCTIONALS:
        difference = zero[f"{name}_seen_difference"]
        assert difference.notnull().any(), name
        assert float(abs(difference).max()) == 0.0, name


def test_the_split_adds_up(zero: xr.Dataset) -> None:
    for name in FUNCTIONALS:
        split = zero[f"{name}_seen_difference"] - zero[f"{name}_hidden"]
        size = float(abs(zero[f"array_{name}"]).max())
        np.testing.assert_allclose(zero[f"{name}_difference"], split, atol=1e-9 * size)


def test_the_error_as_seen_is_smaller_than_that_of_the_whole(zero: xr.Dataset) -> None:
    for name in ("thermocline_slope", "warm_water_volume"):
        assert (zero[f"{name}_seen_difference_error"] < zero[f"{name}_difference_error"]).all(), name


def test_the_error_at_an_outcrop_is_not_known(
    truth: xr.Dataset,
    perfect_chains: dict[str, xr.Dataset],
    write_run: Callable[[Path, dict[str, xr.Dataset]], Path],
    tmp_path: Path,
) -> None:
    """One mooring's water is colder than 20 °C all June: the depth is 0, and how well that is known nobody can say."""
    cold, warmer = next(iter(perfect_chains.items()))
    june = warmer["time"].dt.month == 6
    chilled = warmer.assign(temperature=warmer["temperature"].where(~june, warmer["temperature"] - 15.0))
    chains = perfect_chains | {cold: chilled}
    found = compare_model(truth, write_run(tmp_path / "out", chains))
    depth, error = found["array_isotherm_depth"], found["isotherm_depth_difference_error"]
    at = {"mooring": cold, "time": slice("2031-06", "2031-06")}
    assert depth.sel(at).item() == 0.0
    assert np.isnan(error.sel(at).item())
    assert error.notnull().sum() == depth.notnull().sum() - 1
    assert (error.where(error.notnull(), 1.0) > 0.0).all()


def test_a_deepening_is_found_at_every_mooring(truth: xr.Dataset, perfect: Path) -> None:
    """The levels are named 10 m too deep, so that all water is 10 m deeper; 300 m and 500 m stay within reach."""
    deeper = truth.assign_coords(lev=("lev", truth["lev"].values + 10.0, truth["lev"].attrs))
    found = compare_model(deeper, perfect)
    rows = found.isel(series=np.flatnonzero((found["quantity"] == "isotherm_depth") & (found["kind"] == "mooring")))
    # The straight lines between sensors 15 to 20 m apart bend a moved profile differently, by a metre or so.
    np.testing.assert_allclose(rows["bias"], 10.0, atol=1.5)
    whole = found.isel(series=np.flatnonzero((found["quantity"] == "isotherm_depth") & (found["kind"] == "array")))
    assert whole["bias"].item() == pytest.approx(10.0, abs=0.5)
    assert whole["verdict"].item() == "model differs"


def test_a_monthly_model_meets_the_isotherm_of_the_mean_temperature(by_months: xr.Dataset, zero: xr.Dataset) -> None:
    assert "averaged over monthly steps" in by_months.attrs["averaging"]
    # Means of float32 are taken in another order on either side: rounding, far below a centimetre.
    difference = by_months["model_isotherm_depth"] - by_months["array_isotherm_depth"]
    assert float(abs(difference).max()) < 0.01
    # And it is not the mean of the days' isotherms, which the effect of averaging reports.
    effect = by_months["averaging_effect"]
    assert 0.05 < float(np.sqrt((effect**2).mean())) < 5.0
    assert float(abs(zero["averaging_effect"]).max()) < 1e-3


def test_any_order_of_dimensions_and_of_levels_gives_the_same(
    monthly_truth: xr.Dataset, perfect: Path, by_months: xr.Dataset
) -> None:
    turned = monthly_truth.transpose("lon", "lat", "time", "lev").isel(
        lev=slice(None, None, -1), lat=slice(None, None, -1)
    )
    assert_same(compare_model(turned, perfect), by_months)


def test_height_in_kelvin_from_minus_180_gives_the_same(
    monthly_truth: xr.Dataset, perfect: Path, by_months: xr.Dataset
) -> None:
    kelvin = monthly_truth.astype(np.float64) + 273.15
    kelvin["temp"].attrs = monthly_truth["temp"].attrs | {"units": "K"}
    longitude = (monthly_truth["lon"].values + 180.0) % 360.0 - 180.0
    other = kelvin.assign_coords(
        lev=("lev", -monthly_truth["lev"].values, monthly_truth["lev"].attrs | {"positive": "up"}),
        lon=("lon", longitude, monthly_truth["lon"].attrs),
    ).sortby("lon")
    assert_same(compare_model(other, perfect), by_months)


def test_a_curvilinear_grid_with_moving_levels_gives_the_same(
    monthly_truth: xr.Dataset, perfect: Path, by_months: xr.Dataset
) -> None:
    latitude, longitude = np.meshgrid(monthly_truth["lat"], monthly_truth["lon"], indexing="ij")
    values = monthly_truth["temp"].values
    depth = np.broadcast_to(monthly_truth["lev"].values[None, :, None, None], values.shape)
    curvilinear = xr.Dataset(
        {
            "temp": (("time", "k", "y", "x"), values, monthly_truth["temp"].attrs),
            "z": (("time", "k", "y", "x"), depth, monthly_truth["lev"].attrs),
        },
        coords={
            "time": monthly_truth["time"],
            "nav_lat": (("y", "x"), latitude, monthly_truth["lat"].attrs),
            "nav_lon": (("y", "x"), longitude, monthly_truth["lon"].attrs),
        },
    )
    opened = open_model(curvilinear)
    assert opened.depth.moving
    assert opened.latitude.shape == latitude.shape
    assert_same(compare_model(opened, perfect), by_months)


def assert_same(found: xr.Dataset, expected: xr.Dataset) -> None:
    """Alike but for the rounding of float32 temperatures: 1e-6 °C over gradients of 0.01 °C per m and more."""
    for name in ("model_isotherm_depth", "model_mean_temperature", "full_isotherm_depth", "seen_thermocline_slope"):
        assert expected[name].notnull().any(), name
        np.testing.assert_allclose(found[name], expected[name], atol=1e-3, err_msg=name)


def test_blocks_of_any_length_give_the_same(truth: xr.Dataset, perfect: Path, zero: xr.Dataset) -> None:
    # A step of 13 x 5 columns and 30-odd levels of float32 is 8 kB: blocks of 7 days or so.
    found = compare_model(truth, perfect, ValidationSettings(block_megabytes=0.06))
    np.testing.assert_array_equal(found["model_isotherm_depth"], zero["model_isotherm_depth"])
    np.testing.assert_allclose(found["full_isotherm_depth"], zero["full_isotherm_depth"], rtol=1e-6)


def test_a_sensor_that_the_array_lacks_is_not_seen_in_the_model(truth: xr.Dataset, perfect: Path) -> None:
    """The model covers 2031 alone, the array both years: months of 2032 are in neither."""
    found = compare_model(truth.sel(time="2031"), perfect)
    assert found.sizes["time"] == 12


def test_a_model_of_other_years_is_refused(truth: xr.Dataset, perfect: Path) -> None:
    later = truth.assign_coords(time=("time", truth["time"].values + np.timedelta64(3653, "D"), truth["time"].attrs))
    with pytest.raises(DataError, match=r"do not overlap in time.*2031-01-01 to 2032-03-01.*found 2041-01-01"):
        compare_model(later, perfect)


def test_a_model_of_other_waters_is_refused(truth: xr.Dataset, perfect: Path) -> None:
    north = truth.assign_coords(lat=("lat", truth["lat"].values + 40.0, truth["lat"].attrs))
    with pytest.raises(DataError, match=r"does not reach the array.*found 35 to 45 degrees north"):
        compare_model(north, perfect)


def test_moorings_on_the_models_land_are_left_out(truth: xr.Dataset, perfect: Path) -> None:
    """The columns about 201E are land: its three moorings are 13 degrees, 1446 km, from water."""
    land = truth.where(truth["lon"] != 201.0)
    land["temp"].attrs = truth["temp"].attrs
    found = compare_model(land, perfect)
    dry = found["longitude_of_mooring"] == 201.0
    np.testing.assert_allclose(found["nearest_wet_distance"][dry.values], 1445.6, atol=2.0)
    assert found["model_isotherm_depth"].isel(mooring=dry.values).isnull().all()
    assert found["model_isotherm_depth"].isel(mooring=~dry.values).notnull().all()


def test_a_model_that_is_all_land_at_the_moorings_is_refused(truth: xr.Dataset, perfect: Path) -> None:
    land = truth.where(~truth["lon"].isin([175.0, 201.0, 227.0]))
    land["temp"].attrs = truth["temp"].attrs
    with pytest.raises(DataError, match=r"every mooring lies on the model's land.*within 100 km"):
        compare_model(land, perfect)


def test_a_level_without_values_is_refused(truth: xr.Dataset, perfect: Path) -> None:
    holed = truth.where(truth["lev"] != 100.0)
    holed["temp"].attrs = truth["temp"].attrs
    number = int(np.flatnonzero(truth["lev"].values == 100.0)[0]) + 1
    with pytest.raises(DataError, match=rf"a level of the model is missing.*none at level {number}"):
        compare_model(holed, perfect)
