"""Two published atlases as models of one another, against differences worked out from their profiles with NumPy.

Sources: Levitus, S. (1982), Climatological Atlas of the World Ocean, NOAA Professional Paper 13 (annual mean, 1 degree,
14 levels); Levitus, S. and T. P. Boyer (1994), World Ocean Atlas 1994, Volume 4, NOAA Atlas NESDIS 4 (monthly means,
2 degrees, 19 levels). Chains stand in one atlas, at sites and sensor depths of the demo array, and the other is the
model; then the other way round. What they are compared with is computed here: bilinear between the four points about
a site, linear between levels, and linear between sensors to 20 °C.
"""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
import xarray as xr

from profiles import compare_model
from profiles.drill.array import SITES, Site

REFERENCE = Path(__file__).parents[1] / "reference"
DAYS = np.datetime64("2031-01-01") + np.arange(365)
MIDDLES = np.arange("2031-01", "2032-01", dtype="datetime64[M]").astype("datetime64[ns]") + np.timedelta64(14, "D")
CHOSEN = tuple(site for site in SITES if site.longitude in (201.0, 227.0, 253.0) and abs(site.latitude) < 3.0)
METRES = {"units": "m", "positive": "down", "standard_name": "depth"}

Fields = dict[str, xr.DataArray]


@pytest.fixture(scope="module")
def atlases() -> Fields:
    """Both as (month, depth, latitude, longitude), the annual mean in every month."""
    with xr.open_dataset(REFERENCE / "levitus_equatorial_pacific.nc") as annual:
        older = annual["temperature"].astype(np.float64).expand_dims(month=np.arange(1, 13)).load()
    with xr.open_dataset(REFERENCE / "monthly_atlas_equatorial_pacific.nc") as monthly:
        return {"1982": older, "1994": monthly["temperature"].astype(np.float64).load()}


def at_sensors(field: xr.DataArray, site: Site) -> np.ndarray:
    """Return an atlas at the sensors of a site, (month, sensor)."""
    south, west = (
        int(np.searchsorted(field[name].values, place, side="right")) - 1
        for name, place in (("latitude", site.latitude), ("longitude", site.longitude))
    )
    row, column = field["latitude"].values, field["longitude"].values
    north = (site.latitude - row[south]) / (row[south + 1] - row[south])
    east = (site.longitude - column[west]) / (column[west + 1] - column[west])
    corners = field.values[:, :, south : south + 2, west : west + 2]
    assert np.isfinite(corners[:, : int((field["depth"] <= 500.0).sum())]).all(), site.id  # all of it water
    weights = np.outer([1.0 - north, north], [1.0 - east, east])
    profiles = (corners * weights).sum(axis=(2, 3))
    return np.array([np.interp(site.depths, field["depth"].values, profile) for profile in profiles])


def depth_of_20(temperature: np.ndarray, depth: np.ndarray) -> float:
    """Return the depth of 20 °C in a profile that cools downwards past it once, linear."""
    crossings = np.flatnonzero((temperature[:-1] >= 20.0) & (temperature[1:] < 20.0))
    if crossings.size == 0:
        return np.nan
    upper = int(crossings[0])
    share = (temperature[upper] - 20.0) / (temperature[upper] - temperature[upper + 1])
    return float(depth[upper] + share * (depth[upper + 1] - depth[upper]))


def chain_in(field: xr.DataArray, site: Site) -> xr.Dataset:
    """Return the flagged chain of perfect sensors in an atlas, a value a day, the same all through a month."""
    months = DAYS.astype("datetime64[M]").astype(int) % 12
    temperature = at_sensors(field, site)[months]
    both = ("time", "depth")
    return xr.Dataset(
        {
            "temperature": (both, temperature),
            "temperature_qc": (both, np.ones(temperature.shape, np.int8)),
            "temperature_uncertainty": ("depth", np.full(len(site.depths), 0.02)),
            "deployment": ("time", np.ones(DAYS.size, np.int16)),
        },
        coords={
            "time": DAYS.astype("datetime64[ns]") + np.timedelta64(12, "h"),
            "depth": np.array(site.depths, dtype=np.float64),
            "mooring": site.id,
            "latitude": site.latitude,
            "longitude": site.longitude,
        },
    )


def as_model(field: xr.DataArray) -> xr.Dataset:
    named = field.assign_coords(month=MIDDLES).rename(month="time")
    named = named.assign_coords(depth=("depth", field["depth"].values, METRES))
    named.attrs = {"standard_name": "sea_water_temperature", "units": "degree_Celsius"}
    return named.to_dataset(name="temperature")


@pytest.fixture(scope="module")
def compared(
    atlases: Fields,
    write_run: Callable[[Path, dict[str, xr.Dataset]], Path],
    tmp_path_factory: pytest.TempPathFactory,
) -> dict[str, xr.Dataset]:
    """Each atlas as a model of an array in the other, by the model's year."""
    found = {}
    for model, array in (("1982", "1994"), ("1994", "1982")):
        folder = tmp_path_factory.mktemp(f"array_{array}") / "out"
        out = write_run(folder, {site.id: chain_in(atlases[array], site) for site in CHOSEN})
        found[model] = compare_model(as_model(atlases[model]), out)
    return found


def by_hand(field: xr.DataArray, site: Site) -> np.ndarray:
    return np.array([depth_of_20(row, np.array(site.depths)) for row in at_sensors(field, site)])


@pytest.mark.parametrize("year", ["1982", "1994"])
def test_either_side_is_what_its_profiles_give_by_hand(
    compared: dict[str, xr.Dataset], atlases: Fields, year: str
) -> None:
    """To the rounding of float32 temperatures: 2e-6 K over a gradient of 0.02 K/m and more."""
    other = {"1982": "1994", "1994": "1982"}[year]
    for site in CHOSEN:
        for side, field in (("model", atlases[year]), ("array", atlases[other])):
            found = compared[year][f"{side}_isotherm_depth"].sel(mooring=site.id).values
            np.testing.assert_allclose(found, by_hand(field, site), atol=2e-3, err_msg=f"{side} at {site.id}")


def test_biases_are_the_differences_by_hand(compared: dict[str, xr.Dataset], atlases: Fields) -> None:
    found = compared["1994"]
    differences = {site.id: by_hand(atlases["1994"], site) - by_hand(atlases["1982"], site) for site in CHOSEN}
    for name, difference in differences.items():
        here = (found["quantity"] == "isotherm_depth") & (found["place"] == name)
        row = found.isel(series=int(np.flatnonzero(here)[0]))
        assert float(row["bias"]) == pytest.approx(difference.mean(), abs=2e-3)
        assert float(row["centred_rms"]) == pytest.approx(difference.std(), abs=2e-3)
    whole = (found["quantity"] == "isotherm_depth") & (found["kind"] == "array")
    expected = np.mean(list(differences.values()))
    assert float(found["bias"].isel(series=int(np.flatnonzero(whole)[0]))) == pytest.approx(expected, abs=2e-3)
    assert 1.0 < np.abs(list(differences.values())).max() < 60.0  # there is something to find


def test_changing_sides_changes_the_sign(compared: dict[str, xr.Dataset]) -> None:
    one, other = compared["1982"], compared["1994"]
    for name in ("isotherm_depth", "steepest_gradient_depth", "mean_temperature", "mixed_layer_depth"):
        np.testing.assert_allclose(one[f"model_{name}"], other[f"array_{name}"], atol=2e-2, err_msg=name)
    for name in ("thermocline_slope", "warm_water_volume", "equatorial_isotherm_depth"):
        first, second = (part[f"{name}_seen_difference"] for part in (one, other))
        size = float(np.sqrt((first**2).mean()))
        # Not to rounding: each month is mapped with the errors of whichever atlas the array stands in, and in October
        # those of 1994 are several times as large at 227E, where its profile bends at 20 °C.
        assert 0.0 < float(np.sqrt(((first + second) ** 2).mean())) < 0.1 * size, name


def test_the_full_atlas_is_what_its_own_columns_give(compared: dict[str, xr.Dataset], atlases: Fields) -> None:
    """The atlas of 1982 stands on the middles of the map's cells, so that nothing is interpolated sideways."""
    field, full = atlases["1982"], compared["1982"]["full_isotherm_depth"].isel(time=0)
    levels = field["depth"].values
    wrong = []
    for latitude in full["latitude"].values:
        for longitude in full["longitude"].values:
            profile = field.isel(month=0).sel(latitude=latitude, longitude=longitude).values
            found, deep = float(full.sel(latitude=latitude, longitude=longitude)), np.isfinite(profile)
            if not np.isfinite(found) or deep.sum() < 2:
                continue
            wrong.append(found - depth_of_20(profile[deep], levels[deep]))
    assert len(wrong) > 1200
    np.testing.assert_allclose(wrong, 0.0, atol=2e-3)


def test_the_full_tilt_is_that_of_the_atlas_by_hand(compared: dict[str, xr.Dataset]) -> None:
    """Mean of 2.5S-2.5N, where the outer rows lie half within, then a line against distance from 165E to 265E."""
    full = compared["1982"].isel(time=0)
    band = full["full_isotherm_depth"].sel(latitude=[-2.5, -1.5, -0.5, 0.5, 1.5, 2.5], longitude=slice(165.0, 265.0))
    section = np.average(band.values, axis=0, weights=[0.5, 1.0, 1.0, 1.0, 1.0, 0.5])
    megametres = band["longitude"].values * 6.371 * np.pi / 180.0
    slope = np.polyfit(megametres, section, 1)[0]
    assert -20.0 < slope < -5.0  # m per 1000 km: shoaling eastward
    assert float(full["full_thermocline_slope"]) == pytest.approx(slope, rel=2e-3)
