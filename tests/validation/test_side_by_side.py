"""Several comparisons in one dataset: months and words of each, and what all have in common once."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest
import xarray as xr

from profiles import compare_model
from profiles.errors import EXIT_REQUEST, RequestError
from profiles.validation import open_model, side_by_side, understood
from profiles.vocabulary import CAUTION


@pytest.fixture(scope="module")
def two(monthly_truth: xr.Dataset, perfect: Path) -> list[xr.Dataset]:
    """The ocean itself over 2031, and 1 °C warmer from July 2031 on."""
    warmer = monthly_truth.isel(time=slice(6, None)) + 1.0
    warmer["temp"].attrs = monthly_truth["temp"].attrs
    first = open_model(monthly_truth.isel(time=slice(0, 12)), name="itself")
    return [compare_model(first, perfect), compare_model(open_model(warmer, name="warmer"), perfect)]


@pytest.fixture(scope="module")
def joined(two: list[xr.Dataset]) -> xr.Dataset:
    return side_by_side(two)


def test_every_month_of_either_is_there(joined: xr.Dataset) -> None:
    months = joined["time"].values.astype("datetime64[M]").astype(str)
    assert list(months) == [f"2031-{month:02d}" for month in range(1, 13)] + ["2032-01", "2032-02"]
    assert list(joined["model"].values) == ["itself", "warmer"]
    given = joined["seen_thermocline_slope"].notnull().values
    assert given[0].tolist() == [True] * 12 + [False] * 2
    assert given[1].tolist() == [False] * 6 + [True] * 8


def test_the_values_are_those_of_each(joined: xr.Dataset, two: list[xr.Dataset]) -> None:
    for number, one in enumerate(two):
        part = joined.isel(model=number)
        for name in ("bias", "verdict", "nearest_wet_distance"):
            np.testing.assert_array_equal(part[name].values, one[name].values)
        common = part.sel(time=one["time"])
        for name in ("model_isotherm_depth", "full_warm_water_volume", "array_thermocline_slope"):
            assert one[name].notnull().any(), name
            np.testing.assert_array_equal(common[name].transpose(*one[name].dims).values, one[name].values)


def test_a_warmer_model_is_told_from_the_ocean(joined: xr.Dataset) -> None:
    rows = joined.isel(series=np.flatnonzero((joined["quantity"] == "mean_temperature") & (joined["kind"] == "array")))
    np.testing.assert_allclose(rows["bias"].values.ravel(), [0.0, 1.0], atol=1e-3)
    steepest = joined.isel(
        series=np.flatnonzero((joined["quantity"] == "steepest_gradient_depth") & (joined["kind"] == "array"))
    )
    np.testing.assert_allclose(steepest["bias"].values.ravel(), [0.0, 0.0], atol=0.05)


def test_what_does_not_depend_on_the_model_stands_once(joined: xr.Dataset) -> None:
    for name in ("latitude_of_mooring", "longitude_of_mooring", "quantity", "place", "kind", "units"):
        assert "model" not in joined[name].dims, name
    assert "model" in joined["array_isotherm_depth"].dims  # what both have differs from model to model


def test_every_variable_has_its_words(joined: xr.Dataset) -> None:
    wordless = [name for name in joined.data_vars if "long_name" not in joined[name].attrs]
    assert wordless == []
    assert joined.attrs["comment"] == CAUTION


def test_it_says_how_each_was_understood(joined: xr.Dataset, two: list[xr.Dataset]) -> None:
    notes = [json.loads(str(text)) for text in joined["understood"].values]
    assert notes == [understood(one) for one in two]
    assert notes[0]["temperature"] == "temp: in situ temperature, degree_Celsius"
    assert set(notes[0]) == {"temperature", "salinity", "grid", "levels", "times", "averaging"}


def test_names_must_differ(two: list[xr.Dataset]) -> None:
    with pytest.raises(
        RequestError, match=r"cannot stand side by side.*each with a name of its own; found itself, itself"
    ) as c:
        side_by_side([two[0], two[0]])
    assert c.value.exit_code == EXIT_REQUEST


def test_one_model_at_least(two: list[xr.Dataset]) -> None:
    with pytest.raises(RequestError, match=r"expected one or more.*found none"):
        side_by_side([])
