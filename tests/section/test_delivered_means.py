"""Means that somebody else made, means of several days, and the means of a mooring from several sources."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest
import xarray as xr

from profiles.section import daily_means, first_given, monthly_means, monthly_means_delivered, over_days, without_days
from profiles.vocabulary import ColumnSource, IsothermStatus, MeanStatus

NAN = np.nan
CHAIN, SERIES = ColumnSource.CHAIN, ColumnSource.SERIES


def columns(time, depth, *, status=IsothermStatus.FOUND, **more):
    """Return columns of one mooring; ``more`` replaces or adds variables."""
    depth = np.asarray(depth, np.float32)
    series = {
        "isotherm_depth": depth,
        "isotherm_depth_error_independent": np.where(np.isfinite(depth), 2.0, NAN),
        "isotherm_depth_error_persistent": np.where(np.isfinite(depth), 3.0, NAN),
        "isotherm_status": np.broadcast_to(status, depth.shape).astype(np.int8),
        "mixed_layer_depth": depth / 2,
        "mean_temperature": np.full(depth.shape, 18.0),
        "questionable_share": np.zeros(depth.shape),
        "deployment": np.ones(depth.shape, np.int16),
    } | {name: np.asarray(values) for name, values in more.items()}
    place = {"time": pd.DatetimeIndex(time).to_numpy(), "mooring": "TB-01", "latitude": 0.0, "longitude": 190.0}
    return xr.Dataset({name: ("time", values) for name, values in series.items()}, coords=place)


def days(first, count, depth):
    return daily_means(columns(pd.date_range(first, periods=count, freq="D"), np.full(count, depth)))


def months(first, depths, count, spread=5.0, **more):
    time = pd.date_range(first, periods=len(depths), freq="MS") + pd.Timedelta("14D")
    return monthly_means_delivered(
        columns(time, depths, isotherm_day_count=count, isotherm_day_spread=np.full(len(depths), spread), **more)
    )


# --------------------------------------------------------------------------------------------------------------
# Months that were delivered


def test_delivered_months_stand_in_the_middle_with_their_days_and_errors():
    found = months("2031-01-01", [100.0, 110.0], [31, 28])
    np.testing.assert_array_equal(found["time"], np.array(["2031-01-16T12", "2031-02-15T00"], "datetime64[ns]"))
    assert found["isotherm_depth"].values.tolist() == [100.0, 110.0]
    assert found["isotherm_day_count"].values.tolist() == [31, 28]
    assert found["isotherm_day_spread"].values.tolist() == [5.0, 5.0]
    # a mean is delivered with its own error: nothing averages out once more
    np.testing.assert_allclose(found["isotherm_depth_error"], np.hypot(2.0, 3.0), rtol=1e-6)


@pytest.mark.parametrize(
    ("depth", "count", "status", "expected"),
    [
        (100.0, 15, IsothermStatus.FOUND, MeanStatus.GIVEN),
        (100.0, 14, IsothermStatus.FOUND, MeanStatus.TOO_FEW_VALUES),
        (0.0, 31, IsothermStatus.OUTCROPPED, MeanStatus.GIVEN),
        (NAN, 31, IsothermStatus.NOT_DELIVERED, MeanStatus.TOO_FEW_VALUES),
        (NAN, 0, IsothermStatus.BELOW_CHAIN, MeanStatus.CENSORED),
        (NAN, 31, IsothermStatus.ABOVE_CHAIN, MeanStatus.CENSORED),
    ],
)
def test_a_delivered_month_is_given_as_one_of_ours_would_be(depth, count, status, expected):
    found = months("2031-01-01", [depth], [count], status=status)
    assert found["isotherm_mean_status"].item() == expected
    assert np.isfinite(found["isotherm_depth"].item()) == (expected == MeanStatus.GIVEN)


def test_months_between_are_there_and_empty():
    time = pd.to_datetime(["2031-01-15", "2031-03-15"])
    found = monthly_means_delivered(
        columns(time, [100.0, 90.0], isotherm_day_count=[31, 31], isotherm_day_spread=[0.0, 0.0])
    )
    assert found["isotherm_mean_status"].values.tolist() == [1, 2, 1]
    assert np.isnan(found["isotherm_depth"].values[1])
    assert found["isotherm_day_count"].values[1] == 0


# --------------------------------------------------------------------------------------------------------------
# Means of several days


def test_the_mean_of_five_days_stands_at_each_of_them_and_their_average_has_its_error():
    spread = over_days(columns(["2031-01-03T12", "2031-01-08T12"], [100.0, 110.0]), np.array([120.0, 120.0]))
    np.testing.assert_array_equal(spread["time"], pd.date_range("2031-01-01T12", periods=10, freq="D"))
    assert spread["isotherm_depth"].values.tolist() == [100.0] * 5 + [110.0] * 5
    # 2 sqrt(5) each; of the average of ten that is 2 sqrt(5) / sqrt(10) = 2 / sqrt(2), as of two values of 2 m
    error = spread["isotherm_depth_error_independent"].values
    assert np.sqrt((error**2).sum()) / 10 == pytest.approx(2.0 / np.sqrt(2.0))
    assert (spread["isotherm_depth_error_persistent"] == 3.0).all()


def test_an_even_number_of_days_is_cut_at_midnight():
    spread = over_days(columns(["2031-01-02T00"], [100.0]), np.array([48.0]))
    np.testing.assert_array_equal(spread["time"], pd.date_range("2031-01-01T12", periods=2, freq="D"))


def test_days_between_two_means_stay_empty():
    spread = over_days(columns(["2031-01-02T12", "2031-01-09T12"], [100.0, 110.0]), np.array([72.0, 72.0]))
    assert pd.DatetimeIndex(spread["time"].values).day.tolist() == [1, 2, 3, 8, 9, 10]


def test_running_means_keep_their_days_and_are_not_taken_for_independent():
    time = pd.date_range("2031-01-01T12", periods=20, freq="D")
    spread = over_days(columns(time, np.arange(20.0)), np.full(20, 120.0))
    own = spread.sel(time=time)
    np.testing.assert_array_equal(own["isotherm_depth"], np.arange(20.0))
    np.testing.assert_allclose(own["isotherm_depth_error_independent"], 2.0 * np.sqrt(5.0), rtol=1e-6)


@pytest.mark.parametrize("hours", [24.0, 0.0, NAN])
def test_values_of_a_day_or_less_stay_as_they_are(hours):
    before = columns(["2031-01-01T12", "2031-01-02T12"], [100.0, 110.0])
    xr.testing.assert_identical(over_days(before, np.full(2, hours)), before)


def test_values_of_a_day_come_before_means_of_several_on_the_same_day():
    both = columns(["2031-01-02T12", "2031-01-03T12"], [50.0, 100.0])
    spread = over_days(both, np.array([24.0, 120.0]))
    assert spread["isotherm_depth"].values.tolist() == [100.0, 50.0, 100.0, 100.0, 100.0]


# --------------------------------------------------------------------------------------------------------------
# Several sources


def test_a_month_is_of_the_first_source_that_gives_it():
    chain = days("2031-01-01T12", 41, 100.0)  # all of January, ten days of February
    series = days("2031-02-01T12", 59, 70.0)
    daily, monthly = first_given([(CHAIN, chain, monthly_means(chain)), (SERIES, series, monthly_means(series))])
    assert monthly["isotherm_depth"].values.tolist() == [100.0, 70.0, 70.0]
    assert monthly["column_source"].values.tolist() == [CHAIN, SERIES, SERIES]
    assert daily.sizes["time"] == 90
    assert daily["isotherm_depth"].values.tolist() == [100.0] * 31 + [70.0] * 59


def test_where_none_gives_the_month_the_first_that_has_it_says_why():
    chain = days("2031-01-01T12", 10, NAN)
    series = months("2031-01-01", [NAN], [0], status=IsothermStatus.BELOW_CHAIN)
    daily, monthly = first_given([(CHAIN, chain, monthly_means(chain)), (SERIES, None, series)])
    assert monthly["isotherm_mean_status"].item() == MeanStatus.TOO_FEW_VALUES
    assert monthly["column_source"].item() == CHAIN
    assert daily.sizes["time"] == 10


def test_the_days_of_a_month_that_only_months_give_stay_those_of_the_chain():
    chain = days("2031-01-01T12", 10, 100.0)
    daily, monthly = first_given(
        [(CHAIN, chain, monthly_means(chain)), (SERIES, None, months("2031-01-01", [70.0], [31]))]
    )
    assert monthly["isotherm_depth"].item() == 70.0
    assert daily["column_source"].values.tolist() == [CHAIN] * 10
    assert daily["isotherm_depth"].values.tolist() == [100.0] * 10


def test_months_alone_have_no_days():
    daily, monthly = first_given([(SERIES, None, months("2031-01-01", [70.0], [31]))])
    assert daily is None
    empty = without_days(monthly)
    assert empty.sizes["time"] == 0
    assert set(days("2031-01-01", 1, 1.0)) < set(empty)
