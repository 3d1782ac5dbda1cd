from __future__ import annotations

from itertools import product

import numpy as np
import pytest

from profiles.qc.roll_up import bit_mask, roll_up
from profiles.vocabulary import TEST_BITS

# Two tests, every pair of outcomes: 4 over 3 over 1 over 2.
TABLE = {
    (1, 1): 1, (1, 2): 1, (1, 3): 3, (1, 4): 4,
    (2, 1): 1, (2, 2): 2, (2, 3): 3, (2, 4): 4,
    (3, 1): 3, (3, 2): 3, (3, 3): 3, (3, 4): 4,
    (4, 1): 4, (4, 2): 4, (4, 3): 4, (4, 4): 4,
    (9, 9): 9,
}  # fmt: skip


@pytest.mark.parametrize(("pair", "flag"), TABLE.items())
def test_the_roll_up_takes_4_over_3_over_1_over_2(pair, flag):
    spike, gap = (np.array([[outcome]], dtype=np.int8) for outcome in pair)
    assert roll_up({"spike": spike, "gap": gap})["temperature_qc"].item() == flag


def test_the_roll_up_of_three_tests_does_not_depend_on_their_order():
    for triple in product((1, 2, 3, 4), repeat=3):
        flags = {
            roll_up(dict(zip(names, np.array(triple, dtype=np.int8)[:, None], strict=True)))["temperature_qc"].item()
            for names in (("gap", "spike", "flat_line"), ("flat_line", "gap", "spike"))
        }
        # 1 outranks 2, so the greatest of what is not 2, or 2.
        assert flags == {max((outcome for outcome in triple if outcome != 2), default=2)}


def test_the_masks_say_which_tests_found_what():
    outcomes = {
        "gap": np.array([1, 1, 2, 9], dtype=np.int8),
        "spike": np.array([2, 3, 2, 9], dtype=np.int8),
        "flat_line": np.array([4, 3, 2, 9], dtype=np.int8),
    }
    rolled = roll_up(outcomes)
    # Bits: gap 1, spike 8, flat_line 32.
    np.testing.assert_array_equal(rolled["temperature_qc"], [4, 3, 2, 9])
    np.testing.assert_array_equal(rolled["temperature_qc_ran"], [1 + 32, 1 + 8 + 32, 0, 0])
    np.testing.assert_array_equal(rolled["temperature_qc_questionable"], [0, 8 + 32, 0, 0])
    np.testing.assert_array_equal(rolled["temperature_qc_bad"], [32, 0, 0, 0])
    assert {name: values.dtype.name for name, values in rolled.items()} == {
        "temperature_qc": "int8",
        "temperature_qc_ran": "uint32",
        "temperature_qc_questionable": "uint32",
        "temperature_qc_bad": "uint32",
    }


def test_every_test_has_a_bit_of_its_own():
    masks = bit_mask({name: np.arange(len(TEST_BITS)) == place for place, name in enumerate(TEST_BITS)})
    np.testing.assert_array_equal(masks, [1, 2, 4, 8, 16, 32, 64, 128, 256, 512])
