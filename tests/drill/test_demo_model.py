"""The model of the demo: read back without the package, its planted error, and the same bytes from the same seed."""

from __future__ import annotations

from pathlib import Path

import gsw
import netCDF4
import numpy as np
import pytest
import xarray as xr

from profiles.drill.demo import SEED, days
from profiles.drill.model import DEPTH, LATITUDE, LONGITUDE, displacement, make_model, model_dataset, model_truth
from profiles.drill.ocean import Ocean
from profiles.errors import DataError

DEMO = Path(__file__).parents[2] / "data_demo"
MODEL = DEMO / "model" / "simulated_model.nc"


@pytest.fixture(scope="module")
def ocean_truth() -> xr.Dataset:
    with xr.open_dataset(DEMO / "truth" / "array.nc") as stored:
        return stored.load()


def test_same_seed_gives_the_same_bytes(tmp_path: Path, ocean_truth: xr.Dataset) -> None:
    grid, time = (np.array([-0.5, 0.5]), np.array([199.0, 201.0])), days("2032-01-01", "2032-02-29")
    made = []
    for name in ("first", "again"):
        (tmp_path / name / "truth").mkdir(parents=True)
        (tmp_path / name / "truth" / "array.nc").write_bytes((DEMO / "truth" / "array.nc").read_bytes())
        make_model(tmp_path / name, time=time, grid=grid)
        files = sorted((tmp_path / name).rglob("*.nc"))
        made.append({path.relative_to(tmp_path / name).as_posix(): path.read_bytes() for path in files})
    assert list(made[0]) == ["model/simulated_model.nc", "truth/array.nc", "truth/model.nc"]
    assert made[0] == made[1]
    # The truth does not depend on the grid: it is the committed one.
    assert made[0]["truth/model.nc"] == (DEMO / "truth" / "model.nc").read_bytes()


def test_committed_model_is_the_one_that_the_code_makes(ocean_truth: xr.Dataset) -> None:
    rows, columns = [5, 6], [30, 31, 32]
    made = model_dataset(Ocean.simulate(days(), SEED), ocean_truth, LATITUDE[rows], LONGITUDE[columns])
    with netCDF4.Dataset(MODEL) as file:
        file.set_auto_maskandscale(False)
        stored = file["potential_temperature"][...][:, :, rows][..., columns]
        np.testing.assert_array_equal(file["time_bounds"][...], made["time_bounds"])
    np.testing.assert_array_equal(stored, made["potential_temperature"].values)


def test_isotherm_of_the_file_lies_deeper_by_the_planted_displacement(ocean_truth: xr.Dataset) -> None:
    with xr.open_dataset(MODEL, decode_times=False) as stored:
        model = stored["potential_temperature"].sel(latitude=[-0.5, 0.5]).load() - 273.15
    # Salinity moves the conversion by less than 0.001 degrees: 35 g/kg will do.
    pressure = gsw.p_from_z(-DEPTH, 0.5)[:, None, None]
    warm = gsw.pt_from_t(35.0, model.values, 0.0, pressure)
    depth = crossing(warm)
    for place in range(20, 77, 8):  # 159E to 89W; the truth's cells lie half a degree to either side
        east = LONGITUDE[place]
        truth = ocean_truth["isotherm_depth"].sel(latitude=[-0.5, 0.5], longitude=[east - 0.5, east + 0.5])
        planted = displacement(np.array([east]), ocean_truth["thermocline_slope"].values)[:, 0]
        wrong = depth[:, :, place].mean(axis=1) - truth.mean(["latitude", "longitude"]).values - planted
        # Between levels 15 m apart a straight line cuts the bend at the isotherm by up to a metre or two, and the mean
        # of a month's temperature bends it further. Planted are 2 m here in the west and 18 m in the east.
        assert abs(np.median(wrong)) < 3.0, east


def crossing(warm: np.ndarray) -> np.ndarray:
    """Depth of the shallowest 20 °C crossing by a straight line, of (time, depth, row, column)."""
    below = np.argmax(warm < 20.0, axis=1)[:, None]
    above = np.maximum(below - 1, 0)
    low, high = np.take_along_axis(warm, below, 1), np.take_along_axis(warm, above, 1)
    share = (high - 20.0) / np.where(high > low, high - low, 1.0)
    return np.asarray((DEPTH[above] + share * (DEPTH[below] - DEPTH[above]))[:, 0])


def test_truth_of_the_model_has_nine_tenths_of_the_tilt_and_the_volume_of_ten_metres(ocean_truth: xr.Dataset) -> None:
    made = model_truth(ocean_truth)
    # A straight line of slope -0.1 s added to the section takes a tenth off the slope s of its fit.
    np.testing.assert_allclose(made["thermocline_slope"], 0.9 * ocean_truth["thermocline_slope"], rtol=0, atol=0.001)
    moved = made["equatorial_isotherm_depth"] - ocean_truth["equatorial_isotherm_depth"]
    difference = (moved - made["displacement"]).values
    assert np.nanmax(np.abs(difference)) < 0.016  # three roundings to 0.01 m, one to 0.001 m
    # The sea of the box is 1.83e13 m2 (160 x 10 degrees of 111.19 km, less land): 10 m of it are 1.8e14 m3, and the
    # flattening about 145W, east of the box's middle, takes some of that back.
    grown = (made["warm_water_volume"] - ocean_truth["warm_water_volume"]).mean("time")
    assert 1.4e14 < float(grown.sel(region="total")) < 1.8e14
    parts = float(grown.sel(region="west") + grown.sel(region="east"))
    assert parts == pytest.approx(float(grown.sel(region="total")), rel=1e-6)


def test_times_of_the_file_are_months_of_a_calendar_without_leap_days() -> None:
    with netCDF4.Dataset(MODEL) as file:
        first, last = (
            netCDF4.num2date(file["time_bounds"][place], file["time"].units, file["time"].calendar)
            for place in (13, -1)  # February 2032, a leap year elsewhere
        )
    assert [f"{date:%Y-%m-%d}" for date in first] == ["2032-02-01", "2032-03-01"]
    assert (first[1] - first[0]).days == 28
    assert [f"{date:%Y-%m-%d}" for date in last] == ["2036-12-01", "2037-01-01"]


def test_a_leap_day_does_not_count(ocean_truth: xr.Dataset) -> None:
    grid = (np.array([-0.5, 0.5]), np.array([199.0, 201.0]))
    with_leap, without = (
        model_dataset(Ocean.simulate(days("2032-02-01", last), SEED), ocean_truth, *grid)
        for last in ("2032-02-29", "2032-02-28")
    )
    np.testing.assert_array_equal(with_leap["potential_temperature"], without["potential_temperature"])


def test_an_ocean_of_other_months_than_the_truth_is_refused(ocean_truth: xr.Dataset) -> None:
    with pytest.raises(DataError, match="the truth lacks a month of the ocean"):
        model_dataset(Ocean.simulate(days("2037-01-01", "2037-01-31"), SEED), ocean_truth)
