"""Daily and monthly means: worked answers, when a mean is given, and what the mean's error is."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest
import xarray as xr

from profiles.config import MeansSettings
from profiles.errors import DataError
from profiles.section import daily_means, join_moorings, monthly_means
from profiles.vocabulary import Flag, IsothermStatus, MeanStatus

NAN = np.nan


def columns(times, depth, *, status=None, independent=1.0, persistent=2.0, deployment=1, questionable=0.0):
    """Return columns of one mooring with the isotherm at ``depth`` and a status to match."""
    depth = np.asarray(depth, dtype=np.float32)
    given = np.isfinite(depth)
    if status is None:
        status = np.where(given, IsothermStatus.FOUND, IsothermStatus.TOO_FEW_SENSORS)
    series = {
        "isotherm_depth": depth,
        "isotherm_depth_error_independent": np.where(given, independent, NAN),
        "isotherm_depth_error_persistent": np.where(given, persistent, NAN),
        "isotherm_status": np.broadcast_to(status, depth.shape).astype(np.int8),
        "mixed_layer_depth": depth / 2,
        "mean_temperature": np.full(depth.shape, 18.0),
        "questionable_share": np.broadcast_to(questionable, depth.shape).astype(float),
        "deployment": np.broadcast_to(deployment, depth.shape).astype(np.int16),
    }
    place = {"time": np.asarray(times, dtype="datetime64[ns]"), "mooring": "TB-01", "latitude": 0.0, "longitude": 190.0}
    return xr.Dataset({name: ("time", np.array(values)) for name, values in series.items()}, coords=place)


def six_hourly(count, start="2031-01-01T03"):
    return pd.date_range(start, periods=count, freq="6h")


def daily(count, start="2031-01-01T12"):
    return pd.date_range(start, periods=count, freq="D")


# --------------------------------------------------------------------------------------------------------------
# Daily


def test_daily_mean_of_six_hourly_values():
    # 100, 102, 104, 106 mean 103; error of four values of 1 m each: 1 / sqrt(4); persistent: the mean of 2, 2, 4, 4.
    found = daily_means(columns(six_hourly(4), [100, 102, 104, 106], persistent=np.array([2.0, 2, 4, 4])))
    assert found["time"].values == np.array(["2031-01-01T12"], dtype="datetime64[ns]")
    assert found["isotherm_depth"].item() == 103.0
    assert found["isotherm_depth_error_independent"].item() == 0.5
    assert found["isotherm_depth_error_persistent"].item() == 3.0
    assert found["isotherm_depth_error"].item() == pytest.approx(np.hypot(0.5, 3.0))
    assert found["mixed_layer_depth"].item() == 51.5
    assert found["isotherm_mean_status"].item() == MeanStatus.GIVEN


def test_a_day_with_less_than_half_its_values_has_no_mean():
    depth = [100, 100, 100, 100, 90, NAN, NAN, 110, 90, NAN, NAN, NAN]
    found = daily_means(columns(six_hourly(12), depth))
    np.testing.assert_array_equal(found["isotherm_depth"], np.float32([100, 100, NAN]))
    assert found["isotherm_mean_status"].values.tolist() == [1, 1, MeanStatus.TOO_FEW_VALUES]
    np.testing.assert_array_equal(found["isotherm_depth_error"].isnull(), [False, False, True])


def test_the_share_of_a_day_that_is_needed_can_be_set():
    found = daily_means(columns(six_hourly(4), [100, 104, NAN, NAN]), MeansSettings(daily_share=0.75))
    assert bool(found["isotherm_depth"].isnull()[0])


def test_a_day_without_any_row_is_there_and_empty():
    times = six_hourly(12).delete(slice(4, 8))
    found = daily_means(columns(times, [100.0] * 8))
    assert found.sizes["time"] == 3
    np.testing.assert_array_equal(found["isotherm_depth"], np.float32([100, NAN, 100]))
    assert int(found["isotherm_mean_status"][1]) == MeanStatus.TOO_FEW_VALUES
    assert int(found["isotherm_status"][1]) == IsothermStatus.TOO_FEW_SENSORS


def test_a_day_whose_isotherm_lies_outside_the_chain_too_often_is_censored():
    # Two of three profiles say only "below": the one found would be a biased sample.
    status = [IsothermStatus.BELOW_CHAIN, IsothermStatus.BELOW_CHAIN, IsothermStatus.FOUND, IsothermStatus.FOUND]
    found = daily_means(columns(six_hourly(4), [NAN, NAN, 190, 190], status=status))
    assert bool(found["isotherm_depth"].isnull()[0])
    assert found["isotherm_mean_status"].item() == MeanStatus.CENSORED
    assert found["isotherm_status"].item() == IsothermStatus.FOUND  # as many of each: the first in the vocabulary


def test_the_status_of_a_day_is_its_commonest():
    status = [IsothermStatus.FOUND, IsothermStatus.GAP, IsothermStatus.GAP, IsothermStatus.SEVERAL_CROSSINGS]
    found = daily_means(columns(six_hourly(4), [100, NAN, NAN, 100], status=status))
    assert found["isotherm_status"].item() == IsothermStatus.GAP


def test_outcrops_count_as_depth_zero():
    status = [IsothermStatus.OUTCROPPED, IsothermStatus.OUTCROPPED, IsothermStatus.FOUND, IsothermStatus.FOUND]
    found = daily_means(columns(six_hourly(4), [0, 0, 10, 10], status=status))
    assert found["isotherm_depth"].item() == 5.0
    assert found["isotherm_mean_status"].item() == MeanStatus.GIVEN


def test_daily_values_pass_through_unchanged():
    depth = [100, NAN, 104]
    found = daily_means(columns(daily(3), depth, independent=0.3))
    np.testing.assert_array_equal(found["isotherm_depth"], np.float32(depth))
    np.testing.assert_allclose(found["isotherm_depth_error_independent"], [0.3, NAN, 0.3])


def test_the_share_of_questionable_inputs_is_carried():
    found = daily_means(columns(six_hourly(4), [100] * 4, questionable=np.array([0, 0, 0.5, 0.5])))
    assert found["questionable_share"].item() == 0.25


# --------------------------------------------------------------------------------------------------------------
# Monthly


@pytest.mark.parametrize(("allowed", "flag"), [(0.25, Flag.GOOD), (0.24, Flag.QUESTIONABLE)])
def test_a_mean_is_questionable_only_above_the_stated_share(allowed, flag):
    settings = MeansSettings(questionable_share=allowed)
    doubtful = columns(six_hourly(4), [100] * 4, questionable=np.array([0, 0, 0.5, 0.5]))  # a quarter
    assert daily_means(doubtful, settings)["isotherm_depth_qc"].item() == flag


def test_a_mean_that_is_not_given_is_flagged_missing():
    assert daily_means(columns(six_hourly(4), [100, NAN, NAN, NAN]))["isotherm_depth_qc"].item() == Flag.MISSING


def test_monthly_mean_spread_and_error():
    # January 2031: 100, 102, 100, ... 31 days, 15 of 102: mean 100 + 30 / 31; variance 15 * 16 / 31 * 4 / 30.
    depth = np.tile([100, 102], 16)[:31]
    found = monthly_means(daily_means(columns(daily(31), depth, independent=0.31)))
    assert found["time"].values == np.array(["2031-01-16T12"], dtype="datetime64[ns]")
    assert found["isotherm_depth"].item() == pytest.approx(100 + 30 / 31)
    assert found["isotherm_day_spread"].item() == pytest.approx(np.sqrt(15 * 16 / 31 * 4 / 30))
    assert found["isotherm_day_count"].item() == 31
    assert found["isotherm_depth_error_independent"].item() == pytest.approx(0.31 / np.sqrt(31))
    assert found["isotherm_depth_error_persistent"].item() == 2.0  # what persists does not average out


@pytest.mark.parametrize(("days", "status"), [(15, MeanStatus.GIVEN), (14, MeanStatus.TOO_FEW_VALUES)])
def test_a_month_needs_fifteen_days(days, status):
    depth = np.where(np.arange(31) < days, 100.0, NAN)
    found = monthly_means(daily_means(columns(daily(31), depth)))
    assert found["isotherm_mean_status"].item() == status
    assert bool(found["isotherm_depth"].isnull()[0]) == (status is not MeanStatus.GIVEN)
    assert found["isotherm_day_count"].item() == days


@pytest.mark.parametrize(("outside", "status"), [(6, MeanStatus.GIVEN), (7, MeanStatus.CENSORED)])
@pytest.mark.parametrize("why", [IsothermStatus.BELOW_CHAIN, IsothermStatus.ABOVE_CHAIN])
def test_a_month_with_more_than_a_fifth_of_its_days_outside_the_chain_is_censored(outside, status, why):
    # 6 of 31 days is 19 %, 7 of 31 is 23 %.
    lost = np.arange(31) < outside
    found = monthly_means(
        daily_means(columns(daily(31), np.where(lost, NAN, 190.0), status=np.where(lost, why, IsothermStatus.FOUND)))
    )
    assert found["isotherm_mean_status"].item() == status
    assert bool(found["isotherm_depth"].isnull()[0]) == (status is MeanStatus.CENSORED)


def test_a_month_of_outcrops_has_the_mean_zero():
    found = monthly_means(daily_means(columns(daily(31), np.zeros(31), status=IsothermStatus.OUTCROPPED)))
    assert found["isotherm_depth"].item() == 0.0
    assert found["isotherm_mean_status"].item() == MeanStatus.GIVEN


def test_missing_sensors_do_not_censor_a_month():
    lost = np.arange(31) < 12
    status = np.where(lost, IsothermStatus.GAP, IsothermStatus.FOUND)
    found = monthly_means(daily_means(columns(daily(31), np.where(lost, NAN, 190.0), status=status)))
    assert found["isotherm_mean_status"].item() == MeanStatus.GIVEN


def test_every_month_from_first_to_last_is_there():
    times = daily(31).append(daily(31, "2031-03-01T12"))
    found = monthly_means(daily_means(columns(times, np.full(62, 100.0))))
    assert pd.DatetimeIndex(found["time"].values).strftime("%Y-%m-%dT%H").tolist() == [
        "2031-01-16T12",
        "2031-02-15T00",  # 28 days: the middle is the start of the 15th
        "2031-03-16T12",
    ]
    np.testing.assert_array_equal(found["isotherm_depth"], np.float32([100, NAN, 100]))
    assert found["isotherm_day_count"].values.tolist() == [31, 0, 31]


def test_the_deployment_of_a_month_is_its_last():
    deployment = np.where(np.arange(31) < 10, 3, 4)
    found = monthly_means(daily_means(columns(daily(31), np.full(31, 100.0), deployment=deployment)))
    assert found["deployment"].item() == 4


# --------------------------------------------------------------------------------------------------------------
# The array


def test_a_month_that_ends_without_a_sample_keeps_its_deployment():
    # 20 days of January, then nothing until February: the empty days in between are of no deployment
    time = daily(20).append(daily(1, "2031-02-05T12"))
    found = monthly_means(daily_means(columns(time, np.full(21, 100.0), deployment=3)))
    assert found["deployment"].values.tolist() == [3, 3]


def test_moorings_are_joined_on_all_their_times():
    early = monthly_means(daily_means(columns(daily(59), np.full(59, 100.0))))
    late = monthly_means(daily_means(columns(daily(59, "2031-02-01T12"), np.full(59, 120.0))))
    late = late.assign_coords(mooring="TB-02", latitude=2.5, longitude=203.0)
    joined = join_moorings({"TB-01": early, "TB-02": late})
    np.testing.assert_array_equal(joined["isotherm_depth"], np.float32([[100, 100, NAN], [NAN, 120, 120]]))
    assert joined["isotherm_mean_status"].values.tolist() == [[1, 1, 2], [2, 1, 1]]
    assert joined["isotherm_day_count"].values.tolist() == [[31, 28, 0], [0, 28, 31]]
    assert joined["mooring"].values.tolist() == ["TB-01", "TB-02"]
    assert joined["latitude"].values.tolist() == [0.0, 2.5]
    assert joined["isotherm_depth"].dims == ("mooring", "time")


def test_no_mooring_cannot_be_joined():
    with pytest.raises(DataError, match="no mooring to join"):
        join_moorings({})
