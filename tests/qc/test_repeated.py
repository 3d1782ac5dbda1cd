from __future__ import annotations

import numpy as np
import pytest

from profiles.config import QualityControlSettings
from profiles.qc import flag_blocks, quality_control
from profiles.qc.repeated import is_comparable, repeated_outcome, repeats, signatures
from profiles.vocabulary import TEST_BITS

BIT = np.uint32(1 << TEST_BITS["repeated"])


def found(letters: str, samples: int = 3, comparable: np.ndarray | None = None) -> str:
    """Profiles as letters, in the result as dashes but for those that are copies."""
    signature = np.array([ord(letter) for letter in letters])
    whole = np.ones(signature.size, bool) if comparable is None else comparable
    copies = repeats(signature, whole, samples)
    return "".join(letter if copy else "-" for letter, copy in zip(letters, copies, strict=True))


def test_a_stretch_that_stands_twice_is_found_where_it_stands_again():
    assert found("abcdefgbcdeh") == "-------bcde-"
    assert found("abcabc") == "---abc"


def test_a_stretch_that_stands_three_times_is_found_twice():
    assert found("abcdabcdxabcd") == "----abcd-abcd"


def test_a_shorter_stretch_than_asked_for_is_none():
    assert found("abxaby") == "------"
    assert found("abxaby", samples=2) == "---ab-"
    # The same profiles in another order are no stretch.
    assert found("abcxcba") == "-------"


def test_two_stretches_side_by_side_are_two():
    # "efg" from 4 before, then "abc" from 11 before: each by itself is long enough.
    assert found("abcdefghefgabc") == "--------efgabc"
    # Of "bcde" the last is not of the same stretch: e stood 5 before, the others 6.
    assert found("abcdxeybcde") == "-------bcd-"


def test_profiles_that_stand_often_say_nothing():
    assert found("abcabcabcabc") == "-" * 12
    assert found("abcabcabc") == "---abcabc"


def test_profiles_of_few_sensors_say_nothing():
    few = np.array([True] * 8 + [False] + [True] * 3)
    assert found("abcdefgbcdeh", comparable=few) == "-" * 12


def test_signatures_tell_profiles_apart_by_value_place_and_gap():
    profiles = np.array([[20.0, 10.0], [10.0, 20.0], [20.0, np.nan], [np.nan, 20.0], [20.0, 10.0], [20.0, np.nan]])
    same = signatures(profiles)[:, None] == signatures(profiles)
    np.testing.assert_array_equal(np.argwhere(np.triu(same, 1)), [[0, 4], [2, 5]])
    # A transposed array is read by profiles too.
    np.testing.assert_array_equal(signatures(np.asfortranarray(profiles)), signatures(profiles))


def test_is_comparable_counts_values():
    profiles = np.array([[20.0, 10.0, np.nan], [20.0, np.nan, np.nan], [np.nan] * 3])
    np.testing.assert_array_equal(is_comparable(profiles, 2), [True, False, False])


def test_copies_are_bad_missing_values_missing_and_lone_ones_not_judged():
    temperature = np.array([[20.0, 10.0], [20.0, np.nan], [21.0, 11.0]])
    outcome = repeated_outcome(np.array([True, False, False]), temperature, sensors=2)
    np.testing.assert_array_equal(outcome, [[4, 4], [2, 9], [1, 1]])


@pytest.fixture
def changing() -> np.ndarray:
    """Sixty profiles of four sensors, to a thousandth of a degree."""
    random = np.random.default_rng(8)
    return (np.array([28.5, 28.0, 21.0, 11.0]) + 0.1 * random.standard_normal((60, 4))).round(3)


def test_the_quality_control_finds_a_copied_stretch_whatever_the_blocks(make_chain, changing: np.ndarray):
    changing[20, 1] = np.nan
    changing[30:40] = changing[15:25]
    chain = make_chain(changing)
    flags = quality_control(chain)
    copies = (flags["temperature_qc_bad"].values & BIT) > 0
    present = ~np.isnan(changing)
    np.testing.assert_array_equal(copies, present & ((np.arange(60) >= 30) & (np.arange(60) < 40))[:, None])
    for length in (1, 7, 35):
        blocks = list(flag_blocks(chain, block_length=length))
        joined = np.concatenate([block["temperature_qc_bad"].values for block in blocks])
        np.testing.assert_array_equal(joined, flags["temperature_qc_bad"].values)


def test_readings_of_coarse_sensors_are_no_copies(make_chain):
    """Two deep sensors to a tenth of a degree come back to the same readings all the time."""
    random = np.random.default_rng(9)
    coarse = (np.array([11.0, 8.0]) + 0.2 * random.standard_normal((3000, 2))).round(1)
    flags = quality_control(make_chain(coarse, depth=(300.0, 500.0)), QualityControlSettings())
    assert not (flags["temperature_qc_bad"].values & BIT).any()
