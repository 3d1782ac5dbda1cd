"""The strongest lead between whole months, and its interval."""

from __future__ import annotations

import numpy as np
import pytest

from profiles.precursor.peak import RESOLUTION, peak, strongest_lead
from profiles.precursor.shifting import shifted

NAN = np.nan
LEADS = np.arange(-3, 4)


def test_a_parabola_is_found_between_leads():
    # 1 - (lead - 1.3)^2 / 100 is a parabola, so three points give its top exactly.
    np.testing.assert_allclose(strongest_lead(1.0 - (LEADS - 1.3) ** 2 / 100.0, LEADS), 1.3)


@pytest.mark.parametrize("at", [0, 6])
def test_at_an_end_it_is_the_lead_itself(at):
    curve = -np.abs(LEADS - LEADS[at]).astype(float)
    assert strongest_lead(curve, LEADS) == LEADS[at]


def test_missing_leads_are_passed_over():
    curve = np.array([0.1, NAN, 0.3, 0.9, NAN, 0.2, NAN])
    assert strongest_lead(curve, LEADS) == 0.0
    assert np.isnan(strongest_lead(np.full(7, NAN), LEADS))


def test_uneven_leads_are_not_interpolated():
    assert strongest_lead(np.array([0.1, 0.8, 0.7]), np.array([-6, 0, 1])) == 0.0


@pytest.mark.parametrize(("curve", "leads"), [([0.3], [5]), ([0.2, 0.4], [5, 6])])
def test_one_or_two_leads_are_enough(curve, leads):
    assert strongest_lead(np.array(curve), np.array(leads)) == leads[-1]


def test_interval_is_that_of_the_resampled_peaks_and_the_resolution():
    curve = 1.0 - np.abs(LEADS - 1.0) / 10.0
    resampled = np.stack([1.0 - np.abs(LEADS - top) / 10.0 for top in (0, 1, 1, 1, 2)])
    found = peak(curve, resampled, LEADS, 0.5)
    assert (found.lead, found.correlation) == (1.0, 1.0)
    assert (found.lower, found.upper) == (1.0 - RESOLUTION, 1.0 + RESOLUTION)
    wide = peak(curve, resampled, LEADS, 0.999)
    assert wide.lower < 0.1 < 1.9 < wide.upper


def test_a_negative_correlation_has_its_peak_too():
    curve = -(1.0 - np.abs(LEADS + 2.0) / 10.0)
    found = peak(curve, np.stack([curve, curve]), LEADS, 0.95)
    assert (found.lead, found.correlation) == (-2.0, -1.0)


def test_the_interval_stays_within_the_leads_tried():
    curve = np.arange(7.0) / 10.0
    found = peak(curve, np.stack([curve, curve]), LEADS, 0.95)
    assert found.upper == 3.0


def test_nothing_has_no_peak():
    found = peak(np.full(7, NAN), np.full((3, 7), NAN), LEADS, 0.95)
    assert np.isnan([found.lead, found.lower, found.upper, found.correlation]).all()


def test_shifted_by_hand():
    expected = [[NAN, 1.0, 2.0], [1.0, 2.0, 3.0], [3.0, NAN, NAN], [NAN, NAN, NAN]]
    np.testing.assert_array_equal(shifted(np.array([1.0, 2.0, 3.0]), [-1, 0, 2, 5]), expected)
