"""Columns of series from elsewhere: which values are used, why others are not, and their errors."""

from __future__ import annotations

import numpy as np
import pytest
import xarray as xr

from profiles.column import columns_of_series
from profiles.config import ColumnSettings
from profiles.errors import DataError
from profiles.vocabulary import Flag, IsothermStatus, LayerMeanStatus, MixedLayerStatus

NAN = np.nan


def series(**changed):
    """Return one value a day, by default 150 m with errors of 1 and 3 m, and with nothing said of flag or status."""
    given = {
        "isotherm_depth": 150.0,
        "isotherm_depth_flag": int(Flag.NOT_EVALUATED),
        "isotherm_status": 0,
        "independent": 1.0,
        "persistent": 3.0,
        "mixed_layer_depth": 50.0,
        "mixed_layer_depth_flag": int(Flag.GOOD),
        "mean_temperature": 20.0,
        "mean_temperature_flag": int(Flag.GOOD),
        "deployment": 1,
    } | changed
    length = max(np.size(values) for values in given.values())
    time = np.datetime64("2031-01-01T12", "ns") + np.arange(length) * np.timedelta64(1, "D")
    data = {name: ("time", np.broadcast_to(values, length).copy()) for name, values in given.items()}
    return xr.Dataset(data, coords={"time": time, "mooring": "TB-01"})


@pytest.mark.parametrize(
    ("depth", "said", "flag", "expected", "status"),
    [
        (150.0, 0, Flag.NOT_EVALUATED, 150.0, IsothermStatus.FOUND),
        (NAN, 0, Flag.NOT_EVALUATED, NAN, IsothermStatus.NOT_DELIVERED),
        (0.0, 0, Flag.GOOD, 0.0, IsothermStatus.OUTCROPPED),
        (150.0, IsothermStatus.FOUND, Flag.GOOD, 150.0, IsothermStatus.FOUND),
        (NAN, IsothermStatus.FOUND, Flag.GOOD, NAN, IsothermStatus.NOT_DELIVERED),
        (NAN, IsothermStatus.OUTCROPPED, Flag.GOOD, 0.0, IsothermStatus.OUTCROPPED),
        (150.0, IsothermStatus.SEVERAL_CROSSINGS, Flag.GOOD, 150.0, IsothermStatus.SEVERAL_CROSSINGS),
        # the depth of the last sensor beside "below the chain" is a bound
        (500.0, IsothermStatus.BELOW_CHAIN, Flag.GOOD, NAN, IsothermStatus.BELOW_CHAIN),
        (NAN, IsothermStatus.GAP, Flag.MISSING, NAN, IsothermStatus.GAP),
        (150.0, 0, Flag.QUESTIONABLE, NAN, IsothermStatus.NOT_USED),
        (150.0, IsothermStatus.FOUND, Flag.BAD, NAN, IsothermStatus.NOT_USED),
    ],
)
def test_each_value_is_used_or_its_status_says_why_not(depth, said, flag, expected, status):
    found = columns_of_series(series(isotherm_depth=depth, isotherm_status=int(said), isotherm_depth_flag=int(flag)))
    np.testing.assert_array_equal(found["isotherm_depth"], [expected])
    assert found["isotherm_status"].item() == status


def test_questionable_values_count_where_the_settings_use_them():
    settings = ColumnSettings(use_flags=(1, 2, 3))
    found = columns_of_series(series(isotherm_depth=[150.0, 151.0], isotherm_depth_flag=[3, 1]), settings)
    assert found["isotherm_depth"].values.tolist() == [150.0, 151.0]
    assert found["questionable_share"].values.tolist() == [1.0, 0.0]


def test_errors_are_those_delivered_and_the_settings_fill_what_is_missing():
    settings = ColumnSettings(series_error_independent=2.0, series_error_persistent=5.0)
    found = columns_of_series(series(independent=[1.0, NAN, NAN], persistent=[3.0, 3.0, NAN]), settings)
    assert found["isotherm_depth_error_independent"].values.tolist() == [1.0, 2.0, 2.0]
    assert found["isotherm_depth_error_persistent"].values.tolist() == [3.0, 3.0, 5.0]
    np.testing.assert_allclose(found["isotherm_depth_error"], np.sqrt([10.0, 13.0, 29.0]), rtol=1e-6)
    assert found["isotherm_depth_error"].attrs["comment"].startswith("2 of 3 depths came without it: 2 m")
    assert columns_of_series(series())["isotherm_depth_error"].attrs["comment"] == "as delivered"


def test_what_is_not_given_has_no_error_and_what_outcropped_none_of_the_settings():
    found = columns_of_series(series(isotherm_depth=[NAN, 0.0, 0.0], independent=[1.0, NAN, 1.0]))
    np.testing.assert_array_equal(found["isotherm_depth_error_independent"], [NAN, NAN, 1.0])


def test_the_other_quantities_have_their_own_flags_and_statuses():
    found = columns_of_series(
        series(
            mixed_layer_depth=[50.0, 50.0, NAN],
            mixed_layer_depth_flag=[1, 4, 1],
            mean_temperature=[20.0, NAN, 20.0],
            mean_temperature_flag=[1, 1, 3],
        )
    )
    np.testing.assert_array_equal(found["mixed_layer_depth"], [50.0, NAN, NAN])
    layer = [MixedLayerStatus.FOUND, MixedLayerStatus.NOT_USED, MixedLayerStatus.NOT_DELIVERED]
    assert found["mixed_layer_status"].values.tolist() == layer
    np.testing.assert_array_equal(found["mean_temperature"], [20.0, NAN, NAN])
    mean = [LayerMeanStatus.FOUND, LayerMeanStatus.NOT_DELIVERED, LayerMeanStatus.NOT_USED]
    assert found["mean_temperature_status"].values.tolist() == mean


def test_months_carry_their_days():
    found = columns_of_series(series(days=[31.0, NAN], spread=[4.0, NAN]))
    assert found["isotherm_day_count"].values.tolist() == [31, 0]
    np.testing.assert_array_equal(found["isotherm_day_spread"], [4.0, NAN])
    assert "isotherm_day_count" not in columns_of_series(series())


def test_what_is_no_series_is_refused():
    with pytest.raises(DataError, match=r"the series lacks what its columns are made from.*found no independent"):
        columns_of_series(series().drop_vars("independent"))
