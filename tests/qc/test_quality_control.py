from __future__ import annotations

import tracemalloc
import warnings

import numpy as np
import pytest
import xarray as xr
from compliance_checker.base import BaseCheck
from compliance_checker.runner import CheckSuite
from hypothesis import given, settings
from hypothesis import strategies as st

from profiles.config import QualityControlSettings
from profiles.errors import DataError, RequestError
from profiles.qc import flag_blocks, quality_control
from profiles.qc.quality_control import CHECKS, nominal_interval, survey_record
from profiles.store import open_dataset, write_blocks
from profiles.vocabulary import TEST_BITS, describe

FLAGS = ["temperature_qc", "temperature_qc_ran", "temperature_qc_questionable", "temperature_qc_bad"]
DEPTHS = np.array([1.0, 60.0, 140.0, 300.0], dtype=np.float32)
STRICT = QualityControlSettings.model_validate({"gap": {"flag_after_gap": 3}})


def busy_chain(samples: int = 120, seed: int = 3) -> xr.Dataset:
    """A day-by-day record with every kind of trouble, some of it in the same places."""
    draw = np.random.default_rng(seed)
    temperature = np.array([28.5, 28.0, 21.0, 11.0]) + 0.2 * draw.standard_normal((samples, 4))
    temperature[20:34, 1] = 27.5  # flat
    temperature[50, 0] += 5.0  # spike, questionable
    temperature[51, 2] -= 12.0  # spike, bad
    temperature[60:64, 2] = np.nan  # gap
    temperature[64:80, 3] += 8.0  # unlike the season
    temperature[90, 1] = 45.0  # out of range
    temperature[97:101] = np.nan  # all silent
    temperature[draw.random((samples, 4)) < 0.03] = np.nan
    time = np.datetime64("2031-01-01", "ns") + np.arange(samples) * np.timedelta64(1, "D")
    place = {"mooring": "TB-01", "latitude": 0.0, "longitude": 180.0}
    variables = {
        "temperature": (("time", "depth"), temperature.astype(np.float32)),
        "temperature_raw": (("time", "depth"), temperature.astype(np.float32)),
        "temperature_uncertainty": ("depth", np.full(4, 0.02, dtype=np.float32)),
        "deployment": ("time", np.ones(samples, dtype=np.int16)),
        "temperature_delivered_qc": (("time", "depth"), draw.choice([1, 2, 3], (samples, 4)).astype(np.int8)),
    }
    chain = xr.Dataset(variables, coords={"time": time, "depth": DEPTHS} | place)
    kept = np.setdiff1d(np.arange(samples), [10, 11, 12, 33, 70, 71])  # absent samples, one of them in the flat run
    return describe(chain.isel(time=kept))


def joined(blocks) -> dict[str, np.ndarray]:
    blocks = list(blocks)
    return {name: np.concatenate([block[name].values for block in blocks]) for name in FLAGS}


def test_the_tests_are_those_of_the_vocabulary_in_the_order_of_their_bits():
    assert [check.name for check in CHECKS] == sorted(TEST_BITS, key=TEST_BITS.__getitem__)


def test_each_kind_of_trouble_is_flagged_by_its_test():
    chain = busy_chain().drop_vars("temperature_delivered_qc")
    flagged = quality_control(chain, STRICT)
    days = (chain["time"].values - np.datetime64("2031-01-01")) // np.timedelta64(1, "D")

    def tests_at(day, sensor, mask):
        bits = int(flagged[mask].values[np.searchsorted(days, day), sensor])
        return {name for name, bit in TEST_BITS.items() if bits >> bit & 1}

    assert tests_at(27, 1, "temperature_qc_bad") == {"flat_line"}
    assert tests_at(50, 0, "temperature_qc_questionable") >= {"spike", "rate_of_change"}
    assert tests_at(51, 2, "temperature_qc_bad") == {"spike"}
    assert tests_at(64, 2, "temperature_qc_questionable") == {"gap"}
    assert tests_at(75, 3, "temperature_qc_questionable") == {"climatology"}
    assert "gross_range" in tests_at(90, 1, "temperature_qc_bad")


def test_quiet_values_are_good_and_missing_ones_missing():
    chain = busy_chain().drop_vars("temperature_delivered_qc").isel(time=slice(30, 45))  # a stretch without trouble
    flagged = quality_control(chain)
    missing = np.isnan(chain["temperature"].values)
    assert missing.any()
    np.testing.assert_array_equal(flagged["temperature_qc"].values, np.where(missing, 9, 1))
    assert (flagged["temperature_qc_ran"].values[missing] == 0).all()


@settings(max_examples=20, deadline=None)
@given(length=st.integers(1, 130), repeats_bad=st.integers(4, 30), seed=st.integers(0, 5))
def test_flags_do_not_depend_on_the_blocks(length, repeats_bad, seed):
    strict = STRICT.model_copy(update={"flat_line": STRICT.flat_line.model_copy(update={"repeats_bad": repeats_bad})})
    chain = busy_chain(seed=seed)
    whole = quality_control(chain, strict)
    blocks = joined(flag_blocks(chain, strict, block_length=length))
    for name in FLAGS:
        np.testing.assert_array_equal(blocks[name], whole[name].values, err_msg=name)


@settings(max_examples=20, deadline=None)
@given(
    record=st.lists(st.sampled_from([np.nan, 20.0, 20.0, 20.0, 20.2, 26.0, 31.0]), min_size=1, max_size=40),
    skipped=st.sets(st.integers(0, 39), max_size=15),
    length=st.integers(1, 41),
    later=st.integers(0, 10),
)
def test_flags_of_any_record_do_not_depend_on_the_blocks(record, skipped, length, later):
    """Two sensors, of which the lower reads the same some samples later: they are often out of order."""
    kept = [place for place in range(len(record)) if place not in skipped] or [0]
    time = np.datetime64("2031-01-01", "ns") + np.array(kept) * np.timedelta64(10, "m")
    upper = np.array(record, dtype=np.float32)[kept]
    values = np.stack([upper, np.roll(upper, later)], axis=-1)
    coords = {"time": time, "depth": DEPTHS[1:3], "latitude": 0.0, "longitude": 180.0}
    chain = xr.Dataset({"temperature": (("time", "depth"), values)}, coords=coords)
    whole = quality_control(chain, STRICT)
    blocks = joined(flag_blocks(chain, STRICT, block_length=length))
    for name in FLAGS:
        np.testing.assert_array_equal(blocks[name], whole[name].values, err_msg=name)


def test_the_survey_does_not_depend_on_the_blocks():
    chain = busy_chain()
    surveys = [survey_record(chain, QualityControlSettings(), block_length=length) for length in (1, 7, 1000)]
    assert {survey.nominal_interval for survey in surveys} == {86400.0}
    assert len({survey.spread["rate_of_change"].tobytes() for survey in surveys}) == 1


def test_nominal_interval_is_the_median_step():
    # Steps 1, 1, 1, 5 h.
    time = np.datetime64("2031-01-01", "ns") + np.array([0, 1, 2, 3, 8]) * np.timedelta64(1, "h")
    assert nominal_interval(time) == 3600.0
    assert np.isnan(nominal_interval(time[:1]))


def test_the_last_tests_see_what_the_others_say_near_the_ends_of_a_block():
    """The upper sensor is colder than the lower in samples 1 to 3, too short to count, and sticks until sample 6. What
    is stuck casts no doubt on the lower. Sample 1 looks as far as sample 4, which sticks by what sample 6 says."""
    given = {"flat_line": {"repeats_questionable": 3, "repeats_bad": 4}, "inversion": {"reach": 3}}
    longer = QualityControlSettings.model_validate(given)
    upper = np.array([26.9, 25.2, 25.1, *[25.0] * 4, 26.8, 26.7, 26.8, 26.9, 27.0, 26.9, 26.8, 26.7, 26.8])
    lower = 26.0 - 0.01 * np.arange(16)
    place = {"depth": DEPTHS[1:3], "latitude": 0.0, "longitude": 180.0}
    time = np.datetime64("2031-01-01", "ns") + np.arange(16) * np.timedelta64(10, "m")
    values = np.stack([upper, lower], axis=-1).astype(np.float32)
    chain = xr.Dataset({"temperature": (("time", "depth"), values)}, coords={"time": time} | place)
    whole = quality_control(chain, longer)["temperature_qc_questionable"].values
    inversion = np.uint32(1 << TEST_BITS["inversion"])
    assert not (whole & inversion).any()
    for length in range(1, 17):
        np.testing.assert_array_equal(joined(flag_blocks(chain, longer, block_length=length))[FLAGS[2]], whole)


def test_a_sensors_flags_do_not_depend_on_others_in_order():
    chain = busy_chain()
    whole = quality_control(chain)
    for sensor in range(4):
        alone = quality_control(chain.isel(depth=[sensor]))
        np.testing.assert_array_equal(alone["temperature_qc"].values[:, 0], whole["temperature_qc"].values[:, sensor])


def test_all_missing_is_all_missing(make_chain):
    flagged = quality_control(make_chain(np.full((5, 3), np.nan)))
    assert (flagged["temperature_qc"] == 9).all()
    assert (flagged["temperature_qc_ran"] == 0).all()


def test_a_single_sample_is_judged_by_what_needs_no_neighbour(make_chain):
    flagged = quality_control(make_chain([[28.5, np.nan, 99.0]]))
    np.testing.assert_array_equal(flagged["temperature_qc"].values, [[1, 9, 4]])
    ran = {name for name, bit in TEST_BITS.items() if int(flagged["temperature_qc_ran"].values[0, 0]) >> bit & 1}
    assert ran == {"gap", "gross_range", "climatology", "repeated"}


def test_the_chain_that_came_in_is_left_alone():
    chain = busy_chain()
    chain["temperature"].attrs["comment"] = "as it came"
    before = chain.copy(deep=True)
    flagged = quality_control(chain)
    xr.testing.assert_identical(chain, before)
    xr.testing.assert_equal(flagged[list(chain.data_vars)], before)
    assert flagged["temperature"].attrs["comment"] == "as it came"
    assert flagged["temperature"].attrs["ancillary_variables"] == "temperature_qc temperature_uncertainty"


def test_a_flagged_chain_is_flagged_anew():
    chain = busy_chain()
    once = quality_control(chain)
    spoiled = once.assign(temperature_qc=xr.full_like(once["temperature_qc"], 4))
    xr.testing.assert_identical(quality_control(spoiled), once)


def test_the_settings_used_travel_with_the_chain():
    flagged = quality_control(busy_chain(), STRICT)
    assert QualityControlSettings.model_validate_json(flagged.attrs["qc_settings"]) == STRICT


def test_a_lazy_chain_gives_the_same_flags_and_stays_lazy():
    chain = busy_chain()
    flagged = quality_control(chain.chunk({"time": 25}))
    assert flagged["temperature"].chunks is not None
    xr.testing.assert_identical(flagged.compute(), quality_control(chain))


def test_the_written_file_holds_the_same_flags_and_conforms_to_cf(tmp_path):
    chain, file = busy_chain(), tmp_path / "TB-01.nc"
    write_blocks(file, flag_blocks(chain, block_length=50), {"title": "a mooring of the Tropicbird Array"})
    written, whole = open_dataset(file), quality_control(chain)
    for name in FLAGS:
        assert written[name].dtype == whole[name].dtype
        np.testing.assert_array_equal(written[name].values, whole[name].values, err_msg=name)
    assert cf_errors(file) == []


def cf_errors(file) -> list[str]:
    """Return what the independent standards checker finds against CF-1.11 at its highest weight, errors."""
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")  # the checker's own, on loading its other suites
        suite = CheckSuite()
        suite.load_all_available_checkers()
        results = suite.run_all(suite.load_dataset(str(file)), ["cf:1.11"])
    groups, failures = results["cf:1.11"]
    wrong = [group for group in groups if group.weight == BaseCheck.HIGH and not passed(group.value)]
    return [message for group in wrong for message in group.msgs] + [str(failure) for failure in failures]


def passed(value: bool | tuple[int, int]) -> bool:
    return value[0] == value[1] if isinstance(value, tuple) else value


def test_memory_does_not_grow_with_the_record():
    def peak(samples: int) -> int:
        time = np.datetime64("2031-01-01", "ns") + np.arange(samples) * np.timedelta64(10, "m")
        lazy = xr.DataArray(np.float32(20.0)).expand_dims(time=samples, depth=14).chunk({"time": 1024})
        coords = {"time": time, "depth": np.arange(1, 15, dtype=np.float32)}
        chain = xr.Dataset({"temperature": lazy}, coords=coords)
        tracemalloc.start()
        for _ in flag_blocks(chain, block_length=1024):
            pass
        top = tracemalloc.get_traced_memory()[1]
        tracemalloc.stop()
        return top

    # The time axis itself, a few int64 per sample, stays in memory: less than a tenth of 14 sensors' float64.
    assert peak(16384) < 1.3 * peak(8192)


def turned(chain):
    return chain.assign(temperature=chain["temperature"].transpose("depth", "time"))


def with_latitude_per_time(chain):
    return chain.assign_coords(latitude=("time", np.zeros(chain.sizes["time"])))


def with_missing_time(chain):
    return chain.assign_coords(time=chain["time"].where(chain["time"] != chain["time"][3]))


def with_whole_numbers(chain):
    return chain.assign(temperature=chain["temperature"].fillna(0).astype(int))


def with_times_as_numbers(chain):
    return chain.assign_coords(time=np.arange(chain.sizes["time"]))


@pytest.mark.parametrize(
    ("spoil", "message"),
    [
        (lambda chain: chain.drop_vars("temperature"), "no temperature; expected temperature"),
        (turned, r"not those of a chain; expected \(time, depth\); found \(depth, time\)"),
        (lambda chain: chain.isel(time=slice(0)), "the chain is empty"),
        (lambda chain: chain.isel(depth=slice(0)), "the chain is empty"),
        (with_whole_numbers, "not floating-point numbers"),
        (lambda chain: chain.drop_vars("time"), r"not a coordinate of times; .* found no coordinate"),
        (with_times_as_numbers, r"not a coordinate of times.*int"),
        (with_missing_time, "found NaT at sample 3"),
        (lambda chain: chain.isel(time=[0, 2, 1]), "samples 1 and 2: time does not increase"),
        (lambda chain: chain.isel(time=[0, 1, 1]), r"time does not increase.*appear twice"),
        (lambda chain: chain.drop_vars("depth"), "not a coordinate of depths"),
        (lambda chain: chain.isel(depth=[1, 0]), r"depth does not increase; .*found 60, 1"),
        (lambda chain: chain.isel(depth=[1, 1]), "depth does not increase"),
        (
            lambda chain: chain.assign_coords(latitude=95.0),
            r"latitude: not a position; .*-90 to 90; found 95",
        ),
        (lambda chain: chain.assign_coords(longitude=-110.0), r"longitude: not a .*found -110; add 360"),
        (lambda chain: chain.assign_coords(latitude=np.nan), r"latitude: not a position.*found nan"),
        (with_latitude_per_time, r"latitude: not a position.*found shape"),
    ],
)
def test_what_is_no_chain_is_refused_with_the_reason(spoil, message):
    with pytest.raises(DataError, match=message):
        quality_control(spoil(busy_chain()))


@pytest.mark.parametrize(
    ("call", "message"),
    [
        (lambda chain: quality_control(chain["temperature"]), r"expected an xarray.Dataset; found DataArray"),
        (
            lambda chain: quality_control(chain, {"spike": {}}),
            r"expected a QualityControlSettings.*found dict",
        ),
        (lambda chain: flag_blocks(chain, block_length=0), r"block_length: a block has no samples.*found 0"),
    ],
)
def test_arguments_of_the_wrong_kind_are_refused(call, message):
    with pytest.raises(RequestError, match=message):
        call(busy_chain())
