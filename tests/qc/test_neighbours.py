from __future__ import annotations

import numpy as np

from profiles.qc.neighbours import after, before, count_around, is_linked, step_seconds

HOURS = np.datetime64("2031-01-01", "ns") + np.array([0, 1, 2, 4, 5]) * np.timedelta64(1, "h")


def test_step_seconds_counts_seconds():
    np.testing.assert_array_equal(step_seconds(HOURS), [3600, 3600, 7200, 3600])


def test_a_step_longer_than_allowed_breaks_the_link():
    # Steps 1, 1, 2, 1 h; allowed 1.5 h. The first sample follows nothing.
    np.testing.assert_array_equal(is_linked(HOURS, 3600.0, 1.5), [False, True, True, False, True])


def test_a_step_as_long_as_allowed_still_links():
    np.testing.assert_array_equal(is_linked(HOURS, 3600.0, 2.0), [False, True, True, True, True])


def test_a_single_sample_has_no_neighbour():
    assert not is_linked(HOURS[:1], float("nan"), 1.5).any()


def test_before_and_after_stop_at_gaps_and_ends():
    values = np.array([[1.0, 10.0], [2.0, np.nan], [3.0, 30.0]])
    linked = np.array([False, True, False])
    np.testing.assert_array_equal(before(values, linked), [[np.nan] * 2, [1, 10], [np.nan] * 2])
    np.testing.assert_array_equal(after(values, linked), [[2, np.nan], [np.nan] * 2, [np.nan] * 2])


def test_count_around_stops_at_gaps_and_ends():
    found = np.array([[True, False], [True, True], [False, True], [True, True], [True, False]])
    linked = np.array([False, True, True, False, True])  # a gap before sample 3
    # Column 0: samples 0-2 hold two, samples 3-4 two. Column 1: one step about 0, 1, 2 sees 1, 2, 2; about 3, 4 sees 1.
    np.testing.assert_array_equal(count_around(found, linked, 2), [[2, 2], [2, 2], [2, 2], [2, 1], [2, 1]])
    np.testing.assert_array_equal(count_around(found, linked, 1), [[2, 1], [2, 2], [1, 2], [2, 1], [2, 1]])


def test_count_around_of_a_short_record_counts_what_there_is():
    np.testing.assert_array_equal(count_around(np.ones((2, 1), bool), np.array([False, True]), 5), [[2], [2]])
    np.testing.assert_array_equal(count_around(np.ones((1, 3), bool), np.array([False]), 2), [[1, 1, 1]])
