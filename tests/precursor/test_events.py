"""Warm and cold events by the rule, and what came before them."""

from __future__ import annotations

import numpy as np
import pytest

from profiles.config import EventSettings
from profiles.errors import DataError, RequestError
from profiles.precursor import before_events, event_composites, find_events
from profiles.precursor.events import runs_beyond

NAN = np.nan
PLAIN = EventSettings(running_mean=1)


def months(events, name):
    return [str(month) for month in events[name].values.astype("datetime64[M]")]


def test_runs_by_hand():
    values = np.array([1, 1, 0, 1, 1, 1, NAN, 1, 1, 1, 1, 0, 1.0])
    assert runs_beyond(values, 1.0, 3) == [(3, 5), (7, 10)]
    assert runs_beyond(values, 1.0, 1) == [(0, 1), (3, 5), (7, 10), (12, 12)]
    assert runs_beyond(values, 1.1, 1) == []


@pytest.fixture
def index(monthly):
    """Warm for six months with its peak in the fourth, cold for five, warm for four: too short."""
    values = np.zeros(40)
    values[5:11] = 0.5, 0.7, 1.0, 1.4, 0.8, 0.6
    values[18:23] = -0.6, -0.9, -0.7, -0.5, -0.5
    values[28:32] = 2.0
    return monthly(values, start="2031-01", name="index_anomaly", units="degree_Celsius")


def test_events_by_hand(index):
    found = find_events(index, PLAIN)
    assert found["kind"].values.tolist() == ["warm", "cold"]
    assert months(found, "onset") == ["2031-06", "2032-07"]
    assert months(found, "peak") == ["2031-09", "2032-08"]
    assert months(found, "end") == ["2031-11", "2032-11"]
    np.testing.assert_allclose(found["peak_value"], [1.4, -0.9])
    assert found["duration"].values.tolist() == [6, 5]
    assert found["whole"].values.tolist() == [1, 1]
    assert "0.5 degree_Celsius or more from zero in 5 months or more in a row" in found.attrs["rule"]


def test_warm_and_cold_are_mirror_images(index):
    one, other = find_events(index, PLAIN), find_events(-index, PLAIN)
    assert other["kind"].values.tolist() == ["cold", "warm"]
    np.testing.assert_allclose(other["peak_value"], -one["peak_value"])
    assert months(one, "peak") == months(other, "peak")


def test_the_mean_of_three_months_is_what_counts(monthly):
    # One month of 3.0 makes a running mean of 1.0 in three months; five in a row above 0.5 need more.
    spike = np.zeros(20)
    spike[8] = 3.0
    assert find_events(monthly(spike)).sizes["event"] == 0
    plateau = np.zeros(20)
    plateau[6:11] = 0.8
    found = find_events(monthly(plateau, start="2031-01"))
    # Means: 0.27 at 5, 0.53 at 6, 0.8 at 7, 8, 9, 0.53 at 10.
    assert months(found, "onset") == ["2031-07"]
    assert found["duration"].values.tolist() == [5]


def test_other_rules_can_be_asked_for(index):
    # Four months of 2.0 are an event where three are enough; 0.5 is none where 0.6 is asked for.
    found = find_events(index, EventSettings(running_mean=1, threshold=0.6, persistence=3))
    assert found["kind"].values.tolist() == ["warm", "cold", "warm"]
    assert months(found, "onset") == ["2031-07", "2032-07", "2033-05"]


def test_an_event_at_the_edge_of_the_record_or_of_a_gap_is_not_whole(monthly):
    values = np.zeros(30)
    values[:6] = values[12:18] = values[24:] = 1.0
    values[18] = NAN
    found = find_events(monthly(values), PLAIN)
    assert found["whole"].values.tolist() == [0, 0, 0]
    values[18] = 0.0
    assert find_events(monthly(values), PLAIN)["whole"].values.tolist() == [0, 1, 0]


def test_a_missing_month_ends_an_event(monthly):
    values = np.ones(12)
    values[4] = NAN
    assert find_events(monthly(values), PLAIN)["duration"].values.tolist() == [7]


def test_a_quiet_record_has_no_event_and_no_composite(monthly):
    quiet = monthly(np.zeros(40))
    found = find_events(quiet)
    assert found.sizes["event"] == 0
    assert before_events(found, {"volume": quiet})["before_onset"].shape == (1, 0, 5)
    assert np.isnan(event_composites(found, {"volume": quiet})["composite"]).all()


def test_what_came_before_by_hand(index, monthly):
    ramp = monthly(np.arange(40.0), start="2031-01", name="volume", units="m3")
    late = monthly(np.arange(10.0), start="2032-06", name="tilt", units="m")
    found = before_events(find_events(index, PLAIN), {"volume": ramp, "tilt": late}, [0, 3, 12])
    # Onsets are months 5 and 18 of the ramp; 2032-07 is month 1 of the other.
    np.testing.assert_array_equal(found["before_onset"], [[[5, 2, NAN], [18, 15, 6]], [[NAN, NAN, NAN], [1, NAN, NAN]]])
    assert found["before_onset"].attrs["predictor_units"] == "volume: m3; tilt: m"


def test_nothing_is_said_before_an_onset_that_the_record_does_not_hold(monthly):
    values = np.concatenate([np.ones(8), np.zeros(20)])
    events = find_events(monthly(values), PLAIN)
    found = before_events(events, {"volume": monthly(np.arange(40.0), start="2000-01")}, [6])
    assert np.isnan(found["before_onset"]).all()


def test_composites_by_hand(monthly):
    # Three warm events with peaks at months 10, 30, 50; a predictor with 1, 2, 6 four months before them.
    values, predictor = np.zeros(70), np.zeros(70)
    for peak, before in ((10, 1.0), (30, 2.0), (50, 6.0)):
        values[peak - 2 : peak + 3] = 1.0, 1.0, 2.0, 1.0, 1.0
        predictor[peak - 4] = before
    events = find_events(monthly(values), PLAIN)
    found = event_composites(events, {"volume": monthly(predictor)}, [-4, 4, 20])
    warm = found.sel(predictor="volume", composite_kind="warm")
    # Mean 3, deviations -2, -1, 3: standard error sqrt(14 / 2 / 3) = 1.5275.
    assert warm["composite"].sel(lead=4) == pytest.approx(3.0)
    assert warm["composite_error"].sel(lead=4) == pytest.approx(np.sqrt(7.0 / 3.0))
    assert warm["composite"].sel(lead=-4) == 0.0
    assert warm["composite_count"].values.tolist() == [3, 3, 2]  # 20 months before month 10 is no month
    assert np.isnan(warm["composite_error"].sel(lead=20))
    assert found.sel(composite_kind="cold")["composite_count"].sum() == 0


def test_composites_of_nothing_are_refused(index):
    with pytest.raises(DataError, match="there is no predictor to average"):
        event_composites(find_events(index, PLAIN), {})


def test_an_even_running_mean_is_refused(index):
    with pytest.raises(RequestError, match="odd where it is centred; found 4"):
        find_events(index, EventSettings(running_mean=4))
