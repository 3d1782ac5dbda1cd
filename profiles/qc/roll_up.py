"""The outcomes of all tests on one datum, rolled up into one flag and three bit masks."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np
from numpy.typing import NDArray

from profiles.qc.check import Mask, Outcomes, outcomes
from profiles.vocabulary import TEST_BITS, Flag


def bit_mask(found: Mapping[str, Mask]) -> NDArray[np.uint32]:
    """Set the bit of each test where it is True; shape as the arrays of ``found``."""
    bits = [where * np.uint32(1 << TEST_BITS[name]) for name, where in found.items()]
    return np.asarray(np.bitwise_or.reduce(bits), dtype=np.uint32)


def roll_up(by_test: Mapping[str, Outcomes]) -> dict[str, NDArray[Any]]:
    """Combine the tests: 9 where the datum is missing, else 4 over 3 over 1 over 2.

    Common practice, from memory; unlike the plain maximum, a good value stands though a test did not run.

    Parameters
    ----------
    by_test : mapping of str to ndarray of int8
        Outcomes by test name, all of one shape, at least one.

    Returns
    -------
    dict of str to ndarray
        ``temperature_qc`` int8, and uint32 masks ``temperature_qc_ran`` (the test could judge the value),
        ``temperature_qc_questionable`` and ``temperature_qc_bad``, all of that shape.
    """
    questionable = bit_mask({name: flags == Flag.QUESTIONABLE for name, flags in by_test.items()})
    bad = bit_mask({name: flags == Flag.BAD for name, flags in by_test.items()})
    ran = bit_mask({name: flags == Flag.GOOD for name, flags in by_test.items()}) | questionable | bad
    present = np.logical_and.reduce([flags != Flag.MISSING for flags in by_test.values()])
    return {
        "temperature_qc": outcomes(present, ran != 0, questionable != 0, bad != 0),
        "temperature_qc_ran": ran,
        "temperature_qc_questionable": questionable,
        "temperature_qc_bad": bad,
    }
