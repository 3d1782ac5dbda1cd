"""The numbers at the top of the report."""

import numpy as np
import pandas as pd
import pytest

from profiles.report.summary import count, findings, fit_of_errors, mooring_return, number, percent, window_label


def test_data_return_of_a_mooring_weighs_its_sensors_by_what_was_expected():
    counts = {"questionable": 0, "bad": 0, "missing": 0}
    table = pd.DataFrame(
        [
            {"mooring": "A", "expected": 100, "good": 90, "not_evaluated": 10, **counts},
            {"mooring": "A", "expected": 300, "good": 0, "not_evaluated": 0, **counts},
            {"mooring": "B", "expected": 10, "good": 5, "not_evaluated": 0, **counts},
        ]
    )
    # A: (90 + 10 + 0) / 400; B: 5 / 10
    assert mooring_return(table).to_dict() == {"A": 0.25, "B": 0.5}


@pytest.mark.parametrize(
    ("value", "meaning"),
    [(0.3, "wider than"), (1.0, "the stated errors fit"), (2.5, "too small"), (np.nan, "not possible")],
)
def test_leave_one_out_is_put_in_words(value, meaning):
    assert meaning in fit_of_errors(value)


def test_numbers_are_written_with_true_signs_and_dashes():
    assert number(-17.64, 1) == "−17.6"
    assert number(np.nan, 1) == "–"
    assert count(1234567) == "1\u202f234\u202f567"
    assert percent(0.8885) == "88.8 %"
    assert window_label((165.0, 265.0)) == "165°E to 95°W"


def test_months_without_a_value_are_passed_over(small_array):
    section = small_array.section.section.copy(deep=True)
    section["thermocline_slope"][-1] = np.nan
    found = {
        finding.label: finding for finding in findings(section, small_array.section.volume, 1.0, small_array.tables)
    }
    assert "February 2031" in found["Tilt of the thermocline"].note
    assert "March 2031" in found["Volume of warm water"].note
    section["thermocline_slope"][:] = np.nan
    found = {
        finding.label: finding for finding in findings(section, small_array.section.volume, 1.0, small_array.tables)
    }
    assert found["Tilt of the thermocline"].value == "–"
