"""Published fields of models on curvilinear grids, read and put at positions.

Source: the package iris-sample-data (Open Government Licence): a monthly mean of potential temperature at 5 m on a
global 2-degree grid whose northern part is turned (``orca2_votemper.nc``, calendar of 360 days, year 1), and the
surface temperature of three months on a 1-degree grid of that kind (``NEMO``, three files, the same calendar). They
hold one level, so that there is no isotherm to compare; what is tested is that metadata, grid, dates and positions are
understood. What is found is compared with SciPy's interpolation on triangles between the file's own points.
"""

from __future__ import annotations

from pathlib import Path

import cftime
import gsw
import iris_sample_data
import numpy as np
import pytest
import xarray as xr
from scipy.interpolate import LinearNDInterpolator

from profiles.config import ValidationSettings
from profiles.errors import DataError
from profiles.validation import open_model
from profiles.validation.box import Reader, box_of
from profiles.validation.calendars import MONTHLY
from profiles.validation.model import Model
from profiles.validation.sampling import sample
from profiles.validation.sources import open_source
from profiles.validation.stencils import spacing, stencil

FOLDER = Path(iris_sample_data.path)
MONTHS = [FOLDER / "NEMO" / f"nemo_1m_2015{month:02d}01-2015{month + 1:02d}01_grid-T.nc" for month in (1, 2, 3)]
MONTH = ValidationSettings(averaging_days=30.0)
LATITUDE, LONGITUDE = (
    axis.ravel() for axis in np.meshgrid([-7.9, -4.9, -2.1, 0.1, 2.1, 5.1, 7.9], np.arange(147.3, 270.0, 11.1))
)


def at_positions(model: Model, depth: float, settings: ValidationSettings) -> tuple[np.ndarray, np.ndarray]:
    """Return in situ temperature at the positions and a depth, (time, position), and where all corners are wet."""
    box = box_of(model, LATITUDE, LONGITUDE, settings)
    reader = Reader(model, box)
    water = reader.read(slice(0, model.time.step.size))
    wet = np.isfinite(water.temperature).any(axis=(0, 3))
    where = stencil(box.latitude, box.longitude, wet, LATITUDE, LONGITUDE, nearest_wet=settings.nearest_wet)
    places = np.full((water.temperature.shape[0], LATITUDE.size, 1), depth)
    return sample(water.temperature, water.depth, where, places, top_reach=settings.top_reach)[..., 0], (
        where.weight > 0.0
    ).all(axis=1)


def on_triangles(field: xr.DataArray, latitude: xr.DataArray, longitude: xr.DataArray) -> np.ndarray:
    """Return the same by linear interpolation between the file's wet points, (position,)."""
    east = longitude.values % 360.0
    near = (np.abs(latitude.values) < 15.0) & (east > 125.0) & (east < 290.0) & np.isfinite(field.values)
    points = np.stack([latitude.values[near], east[near]], axis=-1)
    return LinearNDInterpolator(points, field.values[near])(np.stack([LATITUDE, LONGITUDE], axis=-1))


# --------------------------------------------------------------------------------------------------------------
# Potential temperature at 5 m


@pytest.fixture(scope="module")
def potential() -> xr.Dataset:
    """The published field, its year 1 called 2031."""
    dataset = open_source(FOLDER / "orca2_votemper.nc")
    return dataset.assign_coords(time_counter=((), cftime.Datetime360Day(2031, 1, 16), dataset["time_counter"].attrs))


def test_a_year_before_all_arrays_is_refused() -> None:
    with pytest.raises(DataError, match=r"orca2_votemper: the model's years are out of range.*found 1;"):
        open_model(FOLDER / "orca2_votemper.nc", MONTH)


def test_one_time_does_not_say_that_it_is_a_month() -> None:
    with pytest.raises(DataError, match=r"one time alone does not say what it is the mean of.*declare averaging_days"):
        open_model(FOLDER / "orca2_votemper.nc")


def test_the_published_field_is_understood(potential: xr.Dataset) -> None:
    model = open_model(potential, MONTH)
    assert model.kind == "potential"
    assert model.units == "degree_Celsius"
    assert dict(model.temperature.sizes) == {"time": 1, "level": 1, "row": 148, "column": 180}
    assert model.latitude.shape == (148, 180)
    assert (model.time.calendar, model.time.averaging) == ("360_day", MONTHLY)
    assert spacing(*(axis[60:87, 18:104] for axis in (model.latitude, model.longitude)))[1] == pytest.approx(2.0)


def test_the_published_field_is_put_at_positions(potential: xr.Dataset) -> None:
    """Bilinear and linear on triangles differ by the curvature of the field: 0.1 K within cells of 2 degrees."""
    found, open_water = at_positions(open_model(potential, MONTH), 2.0, MONTH)
    expected = on_triangles(potential["votemper"], potential["nav_lat"], potential["nav_lon"])
    assert open_water.mean() > 0.8
    np.testing.assert_allclose(found[0, open_water], expected[open_water], atol=0.25)
    assert np.sqrt(np.mean((found[0, open_water] - expected[open_water]) ** 2)) < 0.06
    assert np.ptp(expected[open_water]) > 5.0


def test_on_its_own_points_it_is_what_the_file_holds(potential: xr.Dataset) -> None:
    """But for the warming from the surface to 5 m, with the salinity of the open ocean: 1 mK."""
    model = open_model(potential, MONTH)
    box = box_of(model, LATITUDE, LONGITUDE, MONTH)
    read = Reader(model, box).read(slice(0, 1)).temperature[0, :, :, 0]
    rows, columns = box.rows, box.columns[0]
    own = potential["votemper"].values[rows, columns].astype(np.float64)
    np.testing.assert_array_equal(np.isnan(read), np.isnan(own))
    np.testing.assert_allclose(read, gsw.pt_from_t(35.0, own, 0.0, 5.03), atol=1e-4)
    wet = np.isfinite(read)
    inner = [(5, 40), (13, 50), (20, 71)]
    places = np.array([(box.latitude[at], box.longitude[at]) for at in inner]).T
    where = stencil(box.latitude, box.longitude, wet, *places, nearest_wet=100.0)
    np.testing.assert_allclose((read[where.row, where.column] * where.weight).sum(axis=1), [read[at] for at in inner])


# --------------------------------------------------------------------------------------------------------------
# Surface temperature of three months


def test_a_surface_file_has_no_temperature_of_the_water_column() -> None:
    with pytest.raises(DataError, match=r"no temperature was found.*found tos; name it: temperature_variable"):
        open_model(MONTHS[0])
    named = ValidationSettings(temperature_variable="tos", temperature_kind="in situ")
    with pytest.raises(DataError, match=r"tos: the model's depth was not found"):
        open_model(MONTHS[0], named)


def test_three_files_with_a_level_added_are_read_at_positions() -> None:
    """Their dimension of time is numbered 0 in every file; the dates stand beside it, with bounds."""
    surface = open_source(MONTHS[::-1])
    tos = (
        surface["tos"]
        .expand_dims(level=1)
        .assign_coords(depth=("level", [0.5], {"units": "m", "positive": "down", "standard_name": "depth"}))
    )
    settings = ValidationSettings(temperature_variable="tos", temperature_kind="in situ")
    model = open_model(surface.assign(tos=tos), settings)
    assert model.time.averaging == MONTHLY
    assert list(model.time.month.astype(str)) == ["2015-01", "2015-02", "2015-03"]
    found, open_water = at_positions(model, 0.5, settings)
    assert open_water.mean() > 0.8
    for number, path in enumerate(MONTHS):
        with xr.open_dataset(path, decode_times=False) as single:
            expected = on_triangles(single["tos"][0].load(), single["nav_lat"], single["nav_lon"])
        np.testing.assert_allclose(found[number, open_water], expected[open_water], atol=0.25)
        assert np.sqrt(np.mean((found[number, open_water] - expected[open_water]) ** 2)) < 0.05
    assert np.abs(found[0] - found[2])[open_water].max() > 0.5  # the months differ
