from __future__ import annotations

import numpy as np
import pytest

from profiles.errors import DataError
from profiles.qc import quality_control
from profiles.qc.delivered_flag import delivered_flag_outcome
from profiles.vocabulary import TEST_BITS

BIT = 1 << TEST_BITS["delivered_flag"]


def test_the_senders_flags_are_taken_over():
    delivered = np.array([[1, 2, 3, 4, 9], [1, 2, 3, 4, 9]])
    present = np.array([[True] * 5, [False] * 5])
    # A value that the sender calls missing stands for none; a datum that is missing is missing, whatever the
    # flag.
    np.testing.assert_array_equal(delivered_flag_outcome(delivered, present), [[1, 2, 3, 4, 4], [9] * 5])


def test_the_test_does_not_run_without_delivered_flags(make_chain):
    assert not (quality_control(make_chain([28.0, 28.1]))["temperature_qc_ran"].values & BIT).any()


def test_the_test_runs_where_the_sender_judged(make_chain):
    chain = make_chain([28.0, 28.1, 28.2, 28.3])
    chain["temperature_delivered_qc"] = (("time", "depth"), np.array([[1], [2], [3], [4]], dtype=np.int8))
    flagged = quality_control(chain)
    np.testing.assert_array_equal(flagged["temperature_qc"].values[:, 0], [1, 1, 3, 4])
    np.testing.assert_array_equal((flagged["temperature_qc_ran"].values[:, 0] & BIT) != 0, [True, False, True, True])


def test_codes_of_another_scheme_are_refused(make_chain):
    chain = make_chain([28.0, 28.1])
    chain["temperature_delivered_qc"] = (("time", "depth"), np.array([[0], [7]], dtype=np.int8))
    with pytest.raises(DataError, match="no primary-level flag; expected 1, 2, 3, 4 or 9; found 0, 7"):
        quality_control(chain)
