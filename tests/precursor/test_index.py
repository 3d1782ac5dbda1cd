"""Indices from grids, moorings and pressures: areas by hand, land, units, coverage, signs."""

from __future__ import annotations

import numpy as np
import pytest
import xarray as xr

from profiles.errors import DataError, RequestError
from profiles.precursor import (
    BOXES,
    Box,
    box_of,
    moored_temperature_index,
    pressure_difference_index,
    surface_temperature_index,
)

NAN = np.nan
MONTHS = np.arange("2001-01", "2006-01", dtype="datetime64[M]").astype("datetime64[ns]")
#: In mid-ocean: no land in the packaged relief.
OPEN = Box(-4.0, 4.0, 215.0, 235.0)


def grid(function, latitude, longitude, times=3, **attributes):
    latitude, longitude = np.asarray(latitude, dtype=float), np.asarray(longitude, dtype=float)
    rows, columns = np.meshgrid(latitude, longitude, indexing="ij")
    values = np.broadcast_to(function(rows, columns), (times, *rows.shape)).astype(float).copy()
    return xr.DataArray(
        values,
        dims=("time", "latitude", "longitude"),
        coords={"time": MONTHS[:times], "latitude": latitude, "longitude": longitude},
        name="sst",
        attrs=attributes,
    )


def test_boxes_are_the_published_ones():
    # Nino-1+2 0-10S, 90-80W; 3 5N-5S, 150-90W; 3.4 5N-5S, 170-120W; 4 5N-5S, 160E-150W.
    assert BOXES["nino12"] == Box(-10, 0, 270, 280)
    assert BOXES["nino3"] == Box(-5, 5, 210, 270)
    assert BOXES["nino34"] == Box(-5, 5, 190, 240)
    assert BOXES["nino4"] == Box(-5, 5, 160, 210)


@pytest.mark.parametrize("text", ["nino34", "Nino-3.4", "NINO3.4", "-5,5,190,240", "-5, 5, -170, -120"])
def test_a_box_is_told_by_name_or_edges(text):
    assert box_of(text) == BOXES["nino34"]


def test_a_box_across_greenwich_goes_on_eastward():
    assert box_of("-5,5,350,10") == Box(-5, 5, 350, 370)


@pytest.mark.parametrize("text", ["nino5", "1,2,3", "5,-5,190,240", "-95,5,190,240", ""])
def test_what_is_no_box_is_refused(text):
    with pytest.raises(RequestError, match="no such box; expected nino12, nino3, nino34, nino4 or south,north"):
        box_of(text)


def test_rows_count_by_their_area_on_the_sphere():
    # Two rows, 0 to 30N and 30 to 60N, with 1 and 2: sin 30 = 0.5, sin 60 = 0.866: (0.5 + 2 * 0.366) / 0.866 = 1.4226.
    field = grid(lambda row, column: np.where(row < 30, 1.0, 2.0), [15.0, 45.0], [185.0, 195.0, 205.0])
    found = surface_temperature_index(field, Box(0.0, 60.0, 190.0, 200.0))
    np.testing.assert_allclose(found.values, (0.5 + 2.0 * (np.sqrt(0.75) - 0.5)) / np.sqrt(0.75))


def test_cells_are_cut_at_the_edges_of_the_box():
    # Columns of 10 degrees with 0, 1, 2, ... by longitude; the box 214 to 226 takes 1, 10 and 1 degrees of three.
    field = grid(lambda row, column: (column - 200.0) / 10.0, np.arange(-4.5, 5.0), np.arange(200.0, 250.0, 10.0))
    found = surface_temperature_index(field, Box(-4.0, 4.0, 214.0, 226.0))
    np.testing.assert_allclose(found.values, (1.0 * 1 + 10.0 * 2 + 1.0 * 3) / 12.0)


@pytest.mark.parametrize("turn", ["south first", "north first", "-180 to 180", "other order", "other names"])
def test_the_shape_of_the_grid_does_not_matter(turn):
    field = grid(lambda row, column: 20.0 + row**2 + column / 10.0, np.arange(-9.5, 10), np.arange(0.5, 360.0))
    expected = surface_temperature_index(field, OPEN)
    if turn == "north first":
        field = field.isel(latitude=slice(None, None, -1))
    if turn == "-180 to 180":
        field = field.assign_coords(longitude=(field["longitude"] + 180.0) % 360.0 - 180.0).sortby("longitude")
    if turn == "other order":
        field = field.transpose("longitude", "time", "latitude")
    if turn == "other names":
        field = field.rename(latitude="yc", longitude="xc", time="when")
        field["yc"].attrs["units"], field["xc"].attrs["standard_name"] = "degrees_north", "longitude"
        field["when"].attrs["axis"] = "T"
    np.testing.assert_allclose(surface_temperature_index(field, OPEN).values, expected.values)


def test_a_box_across_greenwich_is_averaged_whole():
    field = grid(lambda row, column: (column + 180.0) % 360.0 / 10.0, np.arange(-44.5, -39.0), np.arange(0.5, 360.0))
    # 350 to 10 degrees east is 17 to 19 here, in the mean 18. The sea there is open (South Atlantic).
    np.testing.assert_allclose(surface_temperature_index(field, Box(-44.0, -40.0, 350.0, 370.0)).values, 18.0)


def test_kelvin_that_is_stated_is_converted():
    field = grid(lambda row, column: 300.0 + 0 * row, np.arange(-9.5, 10), np.arange(200.5, 250), units="K")
    found = surface_temperature_index(field, OPEN)
    np.testing.assert_allclose(found.values, 26.85)
    assert (found.attrs["units"], found.attrs["units_read"]) == ("degree_Celsius", "K")


def test_kelvin_that_is_not_stated_is_refused():
    field = grid(lambda row, column: 300.0 + 0 * row, np.arange(-9.5, 10), np.arange(200.5, 250))
    with pytest.raises(DataError, match=r"sst: the temperatures are not in °C; .*looks like kelvin"):
        surface_temperature_index(field, OPEN)


def test_land_is_left_out_by_nan_and_by_the_relief():
    # The box reaches the coast of Peru: 4 to 6S, 81 to 80W lies inland (Sullana, Chulucanas). Land cells hold 1000
    # where the file has a value there, or NaN.
    field = grid(lambda row, column: 24.0 + 0 * row, np.arange(-14.5, 5), np.arange(265.5, 285))
    land = (field["longitude"] == 279.5) & field["latitude"].isin([-4.5, -5.5])
    assert int(land.sum()) == 2
    filled = field.where(~land, 1000.0)
    np.testing.assert_allclose(surface_temperature_index(filled, "nino12").values, 24.0)
    np.testing.assert_allclose(surface_temperature_index(field.where(~land), "nino12").values, 24.0)


def test_a_month_with_too_little_of_the_box_is_missing():
    field = grid(lambda row, column: 24.0 + column / 100.0, np.arange(-9.5, 10), np.arange(200.5, 250), times=4)
    field[1, :, 15:20] = NAN  # 215 to 220 of 215 to 235: a quarter
    field[2, :, 15:17] = NAN  # a tenth
    found = surface_temperature_index(field, OPEN)
    assert np.isfinite(found.values).tolist() == [True, False, True, True]


def test_a_field_that_does_not_reach_the_box_is_refused():
    field = grid(lambda row, column: 24.0 + 0 * row, np.arange(-9.5, 10), np.arange(200.5, 230))
    with pytest.raises(
        DataError, match=r"does not reach the box; expected -5 to 5 .*found -9.5 to 9.5 .*, 200.5 to 229.5"
    ):
        surface_temperature_index(field, "nino34")


def test_what_is_no_map_or_no_temperature_is_refused():
    field = grid(lambda row, column: 24.0 + 0 * row, np.arange(-9.5, 10), np.arange(200.5, 250))
    with pytest.raises(DataError, match="the field has no latitude"):
        surface_temperature_index(field.isel(latitude=0, drop=True), OPEN)
    with pytest.raises(DataError, match=r"no map of months; .*found time \(3\), member \(2\)"):
        surface_temperature_index(field.expand_dims(member=2).transpose("time", "member", ...), OPEN)
    with pytest.raises(DataError, match="units are not of temperature; expected °C or K; found m"):
        surface_temperature_index(field.assign_attrs(units="m"), OPEN)
    with pytest.raises(DataError, match=r"no month has enough values in the box; .*found at most 0.00"):
        surface_temperature_index(field.where(field["longitude"] < 210.0), OPEN)
    with pytest.raises(DataError, match="times are not of the standard calendar"):
        surface_temperature_index(field.assign_coords(time=[1, 2, 3]), OPEN)


# --------------------------------------------------------------------------------------------------------------
# Moorings


def moored(anomaly, offset, longitude):
    season = 2.0 * np.cos(2.0 * np.pi * np.arange(60) / 12.0)
    values = np.array([25.0 + step + season + anomaly for step in offset])
    return xr.DataArray(
        values,
        dims=("mooring", "time"),
        coords={
            "mooring": [f"M{n}" for n in range(len(offset))],
            "time": MONTHS,
            "latitude": ("mooring", np.zeros(len(offset))),
            "longitude": ("mooring", np.asarray(longitude, dtype=float)),
        },
    )


def test_a_mooring_that_drops_out_leaves_no_step():
    anomaly = np.sin(np.arange(60.0) / 7.0)
    whole = moored(anomaly, [0.0, 3.0, -1.0], [195.0, 215.0, 235.0])
    gappy = whole.copy()
    gappy[1, 20:24] = NAN
    one, other = (moored_temperature_index(values, "nino34") for values in (whole, gappy))
    np.testing.assert_allclose(one.values, whole.mean("mooring").values)
    assert np.abs(other.values - one.values).max() < 0.15  # a plain mean of those present would step by 1.2
    assert other.attrs["moorings"] == 3


def test_moorings_outside_the_box_do_not_count():
    values = moored(np.zeros(60), [0.0, 100.0], [-165.0, 170.0])
    np.testing.assert_allclose(moored_temperature_index(values, "nino34").values, values[0].values)


def test_a_month_with_fewer_than_half_of_the_moorings_is_missing():
    values = moored(np.zeros(60), [0.0, 1.0, 2.0], [195.0, 215.0, 235.0])
    values[1:, 30] = NAN
    values[2, 31] = NAN
    found = moored_temperature_index(values, "nino34")
    assert np.flatnonzero(np.isnan(found.values)).tolist() == [30]


def test_a_mooring_too_short_for_a_climatology_is_left_out_and_counted():
    values = moored(np.zeros(60), [0.0, 5.0], [195.0, 215.0])
    values[1, 20:] = NAN
    found = moored_temperature_index(values, "nino34")
    np.testing.assert_allclose(found.values, values[0].values)
    assert (found.attrs["moorings"], found.attrs["moorings_too_short"]) == (1, 1)
    with pytest.raises(DataError, match="too short for a climatology"):
        moored_temperature_index(values[1:], "nino34")


def test_a_box_without_moorings_is_refused():
    with pytest.raises(
        DataError, match=r"no mooring with a sensor near the surface lies in the box; .*found 1 moorings"
    ):
        moored_temperature_index(moored(np.zeros(60), [0.0], [170.0]), "nino34")


# --------------------------------------------------------------------------------------------------------------
# Pressure


@pytest.fixture
def pressures(monthly):
    generator = np.random.default_rng(1)
    season = np.tile(np.arange(12.0), 20)
    swing = generator.standard_normal(240)
    east = monthly(1012.0 + season + swing + 0.3 * generator.standard_normal(240), name="east")
    west = monthly(1009.0 - season - swing + 0.3 * generator.standard_normal(240), name="west")
    return east, west, swing


@pytest.mark.parametrize("scaling", ["standardised", "troup"])
def test_high_pressure_in_the_east_is_positive(pressures, scaling):
    east, west, swing = pressures
    found = pressure_difference_index(east, west, scaling=scaling)
    assert np.corrcoef(found.values, swing)[0, 1] > 0.9
    assert "negative in warm events" in found.attrs["sign"]
    assert found.attrs["scaling"].startswith(scaling)


def test_scalings_differ_by_about_ten(pressures):
    east, west, _ = pressures
    one, other = (pressure_difference_index(east, west, scaling=scaling) for scaling in ("standardised", "troup"))
    assert one.values.std(ddof=1) == pytest.approx(1.0, abs=0.01)
    assert other.values.std(ddof=1) == pytest.approx(10.0, abs=0.3)


def test_larger_scaling_by_hand(monthly):
    # Differences in January 1, 2, 3 in three years: mean 2, standard deviation 1: -10, 0, 10.
    east = np.ones(36)
    east[[0, 12, 24]] = 1.0, 2.0, 3.0
    generator = np.random.default_rng(2)
    others = np.delete(np.arange(36), [0, 12, 24])
    east[others] = generator.standard_normal(33)
    found = pressure_difference_index(monthly(east), monthly(np.zeros(36) + 1e-9), scaling="troup")
    np.testing.assert_allclose(found.values[[0, 12, 24]], [-10.0, 0.0, 10.0], atol=1e-6)


def test_no_such_scaling_is_refused(pressures):
    with pytest.raises(RequestError, match="no such scaling; expected standardised or troup"):
        pressure_difference_index(*pressures[:2], scaling="other")
