import numpy as np
import pytest

from profiles.errors import DataError, RequestError
from profiles.ingest import join, read
from profiles.ingest.layout import NetcdfLayout


def table(depths, days):
    head = "date," + ",".join(f"T_{depth}m" for depth in depths)
    return "\n".join([head, *(f"2031-01-{day:02}," + ",".join(str(100 * day + d) for d in depths) for day in days)])


@pytest.fixture
def delivered(write, wide):
    """Return a function that reads a wide table whose values are 100 times the day plus the depth."""

    def read_table(name, depths, days, **options):
        return read(write(table(depths, days), name), wide, mooring="TB-01", **options)

    return read_table


def test_deliveries_follow_one_another(delivered):
    joined = join([delivered("b", (1, 25), (3, 4), latitude=0.1), delivered("a", (1, 10), (2, 1))])
    np.testing.assert_array_equal(joined.chain["depth"], [1, 10, 25])
    np.testing.assert_array_equal(
        joined.chain["temperature"],
        [[101, 110, np.nan], [201, 210, np.nan], [301, np.nan, 325], [401, np.nan, 425]],
    )
    np.testing.assert_array_equal(joined.chain["deployment"], [2, 2, 1, 1])
    assert joined.chain["deployment"].dtype == np.int16
    assert (joined.rows_read, joined.rows_kept, joined.rows_quarantined, joined.rows_reordered) == (4, 4, 0, 1)
    assert joined.chain["latitude"].item() == 0.1


def test_the_first_listed_wins_a_common_time_and_the_loser_is_quarantined(delivered):
    first, second = delivered("a", (1, 10), (1, 2)), delivered("b", (1, 25), (2, 3))
    joined = join([first, second])
    np.testing.assert_array_equal(
        joined.chain["temperature"], [[101, 110, np.nan], [201, 210, np.nan], [301, np.nan, 325]]
    )
    entry = joined.quarantine.iloc[0]
    assert (entry["line"], entry["text"]) == (2, "2031-01-02,201,225")
    assert entry["reason"] == "an earlier delivery has this time and comes first; this is number 2"
    assert (joined.rows_read, joined.rows_kept, joined.rows_quarantined) == (4, 3, 1)
    other = join([second, first])
    np.testing.assert_array_equal(other.chain["temperature"][1], [201, np.nan, 225])


def test_different_sensors_of_the_same_times_complete_each_other(delivered):
    joined = join([delivered("a", (1, 10), (1, 2)), delivered("b", (25,), (2, 3))])
    np.testing.assert_array_equal(
        joined.chain["temperature"], [[101, 110, np.nan], [201, 210, 225], [np.nan, np.nan, 325]]
    )
    np.testing.assert_array_equal(joined.chain["deployment"], [1, 1, 2])
    assert joined.rows_quarantined == 0


def test_a_row_that_lost_takes_no_time_from_a_third_delivery(delivered):
    # the second loses day 1 to the first by 10 m; the third shares 25 m with the second only, so its day 1 stands
    parts = [delivered("a", (10,), (1,)), delivered("b", (10, 25), (1, 2)), delivered("c", (25,), (1, 2))]
    joined = join(parts)
    np.testing.assert_array_equal(joined.chain["temperature"], [[110, 125], [210, 225]])
    np.testing.assert_array_equal(joined.chain["deployment"], [1, 2])
    assert [(entry.file[-1], entry.line) for entry in joined.quarantine.itertuples()] == [("b", 2), ("c", 3)]


def test_all_readings_of_a_lost_time_are_quarantined(delivered, write, long):
    path = write("time,depth,temp\n2031-01-01,1,7\n2031-01-01,2,8\n2031-01-05,1,9\n", "long.csv")
    joined = join([delivered("a", (1, 10), (1,)), read(path, long, mooring="TB-01")])
    assert list(joined.quarantine["line"]) == [2, 3]
    assert (joined.rows_read, joined.rows_kept) == (4, 2)


def test_joined_deliveries_join_again(delivered):
    parts = [delivered(name, (1,), days) for name, days in (("a", (1,)), ("b", (1, 2)), ("c", (2, 3)))]
    once = join(parts)
    again = join([join(parts[:2]), parts[2]])
    np.testing.assert_array_equal(once.chain["temperature"], again.chain["temperature"])
    assert sorted(once.quarantine["file"]) == sorted(again.quarantine["file"])
    assert again.rows_read == 5


def test_flags_and_uncertainty_are_filled_by_their_rules(delivered, write_netcdf):
    text = delivered("a", (1, 25), (1,), sensor_accuracy=0.1)
    flagged = read(write_netcdf(), NetcdfLayout(kind="netcdf"), mooring="TB-01")  # noon of days 1 to 3, 1 and 10 m
    joined = join([text, flagged]).chain
    np.testing.assert_array_equal(joined["temperature_delivered_qc"], [[2, 9, 2], [1, 1, 9], [1, 1, 9], [1, 1, 9]])
    np.testing.assert_array_equal(joined["temperature_uncertainty"], np.float32([0.1, 0.02, 0.1]))


def test_lost_time_steps_of_a_netcdf_file_are_named(delivered, write_netcdf):
    flagged = read(write_netcdf(), NetcdfLayout(kind="netcdf"), mooring="TB-01")
    joined = join([flagged, flagged])
    assert list(joined.quarantine["text"]) == [f"time step {n}: 2031-01-0{n}T12:00:00.000" for n in (1, 2, 3)]
    assert (joined.rows_read, joined.rows_kept, joined.rows_quarantined) == (6, 3, 3)


def test_scales_are_told_apart(delivered, write, wide):
    old = wide.model_copy(update={"temperature": wide.temperature.model_copy(update={"scale": "IPTS-68"})})
    before = read(write(table((1,), (1,)), "old"), old, mooring="TB-01")
    attributes = join([before, delivered("new", (1,), (2,))]).chain["temperature_raw"].attrs
    assert attributes["comment"] == "deployment 1 on IPTS-68; deployment 2 on ITS-90"
    assert "reference_scale" not in attributes


def test_one_delivery_stays_as_it_is(delivered):
    only = delivered("a", (1,), (1,))
    assert join([only]) is only


def test_what_does_not_belong_together_is_refused(delivered, write, wide):
    here = delivered("a", (1,), (1,), latitude=0.0, longitude=359.9)
    with pytest.raises(RequestError, match="there is no delivery to join"):
        join([])
    with pytest.raises(RequestError, match="different moorings; expected one mooring; found TB-01, TB-02"):
        join([here, read(write(table((1,), (2,)), "b"), wide, mooring="TB-02")])
    with pytest.raises(DataError, match=r"differ in latitude; expected 0 degrees as in .*a, within 0.25; found 0.5"):
        join([here, delivered("c", (1,), (2,), latitude=0.5)])
    near = join([here, delivered("d", (1,), (2,), longitude=0.1)])  # 0.2 degrees the short way round
    assert near.chain["longitude"].item() == 359.9
