"""Values from a chain that was not in the water."""

import numpy as np
import pandas as pd
import xarray as xr

from profiles.qc import fault_list, quality_control
from profiles.vocabulary import TEST_BITS, Flag, Water

BIT = np.uint32(1 << TEST_BITS["water"])


def chain(status, temperature):
    time = pd.date_range("2031-01-01T12:00", periods=len(status))
    return xr.Dataset(
        {
            "temperature": (("time", "depth"), np.array(temperature, np.float32)),
            "water_status": ("time", np.array(status, np.int8)),
        },
        coords={"time": time, "depth": [1.0, 100.0], "mooring": "TB-07"},
    )


def test_what_was_not_measured_in_the_water_is_bad_and_no_other_test_judges_it():
    # 40 °C on deck would fail the gross range; the values beside it would make spikes of one another
    flagged = quality_control(
        chain([3, 1, 1, 2, 1], [[40.0, 40.0], [28.0, 20.0], [28.1, np.nan], [15.0, np.nan], [28.2, 20.1]])
    )
    np.testing.assert_array_equal(flagged["temperature_qc"], [[4, 4], [1, 1], [1, 9], [4, 9], [1, 1]])
    np.testing.assert_array_equal(
        flagged["temperature_qc_bad"], BIT * np.array([[1, 1], [0, 0], [0, 0], [1, 0], [0, 0]])
    )
    assert (flagged["temperature_qc_ran"].values[0] == BIT).all()


def test_water_beside_a_haul_out_is_judged_as_if_nothing_stood_between():
    wet = [[28.0 + 0.01 * day, 20.0 + 0.01 * day] for day in range(9)]
    hauled = [row if day != 4 else [18.0, 18.0] for day, row in enumerate(wet)]
    missing = [row if day != 4 else [np.nan, np.nan] for day, row in enumerate(wet)]
    status = [1, 1, 1, 1, 3, 1, 1, 1, 1]
    there, away = quality_control(chain(status, hauled)), quality_control(chain([1] * 9, missing))
    kept = np.arange(9) != 4
    np.testing.assert_array_equal(there["temperature_qc"][kept], away["temperature_qc"][kept])


def test_a_chain_without_the_status_is_not_judged():
    bare = chain([1, 1], [[28.0, 20.0], [28.1, 20.1]]).drop_vars("water_status")
    assert not (quality_control(bare)["temperature_qc_ran"].values & BIT).any()
    assert (quality_control(bare)["temperature_qc"] == Flag.GOOD).all()


def test_the_fault_list_calls_it_in_air():
    faults = fault_list(quality_control(chain([Water.AIR_FOUND, 1, 1], [[27.0, 27.0], [28.0, 20.0], [28.1, 20.1]])))
    assert list(faults["kind"]) == ["in air"] * 2
    assert list(faults["flag"]) == [4, 4]
