"""All columns of a flagged chain: which values count, and that blocks change nothing."""

from __future__ import annotations

import numpy as np
import pytest
import xarray as xr

from profiles.column import column_blocks, columns_of, isotherm_depth, isotherm_depth_error
from profiles.config import ColumnSettings
from profiles.errors import DataError
from profiles.vocabulary import Flag, IsothermStatus, describe

DEPTHS = np.array([1.0, 10.0, 60.0, 100.0, 140.0, 300.0], dtype=np.float32)


@pytest.fixture
def chain():
    """Sixty days of a thermocline about 110 m, all good, with uncertainties and two deployments."""
    random = np.random.default_rng(11)
    centre = 110.0 + random.normal(0.0, 15.0, (60, 1))
    temperature = (19.0 - 10.0 * np.tanh((DEPTHS - centre) / 40.0)).astype(np.float32)
    time = np.datetime64("2031-01-01T12", "ns") + np.arange(60) * np.timedelta64(1, "D")
    return describe(
        xr.Dataset(
            {
                "temperature": (("time", "depth"), temperature),
                "temperature_qc": (("time", "depth"), np.full(temperature.shape, Flag.GOOD, dtype=np.int8)),
                "temperature_uncertainty": ("depth", np.full(DEPTHS.size, 0.02, dtype=np.float32)),
                "deployment": ("time", np.repeat([1, 2], 30).astype(np.int16)),
            },
            coords={"time": time, "depth": DEPTHS, "mooring": "TB-01", "latitude": 0.0, "longitude": 190.0},
        )
    )


def flagged(chain, flag, time, depth):
    flags = chain["temperature_qc"].copy()
    flags[time, depth] = flag
    return chain.assign(temperature_qc=flags)


@pytest.mark.parametrize("flag", [Flag.QUESTIONABLE, Flag.BAD, Flag.MISSING])
def test_a_flagged_value_is_not_used(chain, flag):
    without = chain["temperature"].copy()
    without[3, 3] = np.nan
    columns = columns_of(flagged(chain, flag, 3, 3))
    expected = isotherm_depth(without, max_bracket=75.0)
    np.testing.assert_array_equal(columns["isotherm_depth"], expected["isotherm_depth"])
    np.testing.assert_array_equal(columns["isotherm_status"], expected["isotherm_status"])
    assert IsothermStatus(int(columns["isotherm_status"][3])) is IsothermStatus.GAP  # 60 m to 140 m


def test_values_not_evaluated_count_as_good_by_default(chain):
    columns = columns_of(flagged(chain, Flag.NOT_EVALUATED, slice(None), slice(None)))
    xr.testing.assert_identical(columns, columns_of(chain))


def test_use_flags_decides_what_counts(chain):
    doubtful = flagged(chain, Flag.QUESTIONABLE, slice(None), slice(None))
    assert (columns_of(doubtful)["isotherm_status"] == IsothermStatus.TOO_FEW_SENSORS).all()
    columns = columns_of(doubtful, ColumnSettings(use_flags=(1, 2, 3)))
    np.testing.assert_array_equal(columns["isotherm_depth"], columns_of(chain)["isotherm_depth"])


def test_the_share_of_questionable_values_is_that_among_the_used(chain):
    # Of six values two are questionable and one is bad: with flag 3 in use, 2 of 5; without it, 0 of 3.
    mixed = flagged(flagged(chain, Flag.QUESTIONABLE, 5, [0, 5]), Flag.BAD, 5, 1)
    used = columns_of(mixed, ColumnSettings(use_flags=(1, 2, 3)))["questionable_share"]
    assert float(used[5]) == pytest.approx(0.4)
    assert float(used[6]) == 0.0
    assert float(columns_of(mixed)["questionable_share"][5]) == 0.0


def test_a_profile_without_used_values_has_no_share(chain):
    assert bool(columns_of(flagged(chain, Flag.BAD, 5, slice(None)))["questionable_share"].isnull()[5])


def test_columns_are_those_of_the_single_functions(chain):
    columns = columns_of(chain)
    error = isotherm_depth_error(
        chain["temperature"],
        chain["temperature_uncertainty"],
        max_bracket=75.0,
        noise=0.005,
        depth_accuracy=1.0,
        motion=0.3,
    )
    np.testing.assert_array_equal(columns["isotherm_depth_error"], error["isotherm_depth_error"])
    assert columns["deployment"].values.tolist() == [1] * 30 + [2] * 30
    assert columns["isotherm_depth"].attrs["ancillary_variables"] == "isotherm_depth_error isotherm_status"
    assert "at most 75 m" in columns["isotherm_depth"].attrs["comment"]
    assert set(columns.coords) == {"time", "mooring", "latitude", "longitude"}


def test_known_sensor_depths_leave_no_error_of_the_line(chain):
    known = chain.assign(sensor_depth=chain["depth"].broadcast_like(chain["temperature"]).transpose("time", "depth"))
    still = columns_of(chain, ColumnSettings(motion_accuracy=0.0))
    np.testing.assert_allclose(columns_of(known)["isotherm_depth_error"], still["isotherm_depth_error"], rtol=1e-4)
    assert bool((columns_of(chain)["isotherm_depth_error"] > still["isotherm_depth_error"]).any())


def test_settings_reach_every_column(chain):
    settings = ColumnSettings(
        isotherm=24.0, mixed_layer_threshold=0.8, mean_temperature_bottom=100.0, sensor_noise=0.05
    )
    usual, other = columns_of(chain, ColumnSettings(mean_temperature_bottom=140.0)), columns_of(chain, settings)
    assert (other["isotherm_depth"] < usual["isotherm_depth"]).all()
    assert (other["mixed_layer_depth"] > usual["mixed_layer_depth"]).all()
    assert (other["mean_temperature"] > usual["mean_temperature"]).all()
    assert (other["isotherm_depth_error_independent"] > 2.0 * usual["isotherm_depth_error_independent"]).all()


def test_moved_sensors_move_the_isotherm(chain):
    places = (chain["depth"] + xr.zeros_like(chain["temperature"]) + 4.0).astype(np.float32)
    moved = columns_of(chain.assign(sensor_depth=places))["isotherm_depth"]
    np.testing.assert_allclose(moved, columns_of(chain)["isotherm_depth"] + 4.0, rtol=1e-6)


@pytest.mark.parametrize("length", [1, 7, 60, 100])
def test_columns_do_not_depend_on_the_blocks(chain, length):
    blocks = list(column_blocks(chain.chunk(time=13), block_length=length))
    assert len(blocks) == -(-60 // length)
    xr.testing.assert_identical(xr.concat(blocks, dim="time", coords="minimal", compat="override"), columns_of(chain))


@pytest.mark.parametrize("name", ["temperature", "temperature_qc", "temperature_uncertainty"])
def test_a_chain_without_flags_is_refused(chain, name):
    with pytest.raises(DataError, match=f"no {name}.*quality_control first"):
        columns_of(chain.drop_vars(name))
