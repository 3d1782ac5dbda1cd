"""Planted faults and what is written down of them."""

from __future__ import annotations

from dataclasses import replace
from itertools import combinations

import numpy as np
import pandas as pd
import pytest
import xarray as xr
from hypothesis import given, settings
from hypothesis import strategies as st

from profiles.drill.fault_catalogue import CATALOGUE, DBAR_PER_METRE, Fault, on_temperature
from profiles.drill.fault_kernels import added
from profiles.drill.faults import Event, as_delivered, delivered_time, event_table, plant
from profiles.errors import DataError, RequestError

DEPTHS = np.array([1.0, 10.0, 50.0, 90.0, 120.0, 160.0, 300.0], dtype=np.float32)
MOVES_THE_MISSING = {"swapped sensors", "repeated block", "lost upper sensors"}
OF_TIME = [name for name, fault in CATALOGUE.items() if fault.touches == ("time",)]
OF_PRESSURE = [name for name, fault in CATALOGUE.items() if fault.touches == ("pressure",)]
OF_TEMPERATURE = [name for name in CATALOGUE if name not in (*OF_TIME, *OF_PRESSURE)]


def record(days: int = 1500, *, missing: float = 0.02, seed: int = 3, step: str = "1D") -> xr.Dataset:
    """A chain of yearly deployments with ten days between them, pressure at 90 and 300 m."""
    random = np.random.default_rng(seed)
    time = pd.date_range("2031-01-01T12:00", periods=days, freq=step).values.astype("datetime64[ns]")
    values = np.array([29.0, 28.8, 27.0, 23.0, 20.0, 15.0, 11.0]) + random.normal(0.0, 0.2, (days, 7)).round(3)
    values[random.random(values.shape) < missing] = np.nan
    day = ((time - time[0]) / np.timedelta64(1, "D")).astype(int)
    values[day % 365 > 354] = np.nan
    pressure = np.full(values.shape, np.nan)
    pressure[:, [3, 6]] = np.array([90.5, 301.9]) + random.normal(0.0, 0.1, (days, 2)).round(2)
    return xr.Dataset(
        {
            "temperature": (("time", "depth"), values.astype(np.float32)),
            "pressure": (("time", "depth"), np.where(np.isnan(values), np.nan, pressure).astype(np.float32)),
            "deployment": ("time", (day // 365).astype(np.int16)),
        },
        coords={"time": time, "depth": DEPTHS, "mooring": "TB-07", "latitude": 0.0, "longitude": 214.0},
    )


def box(chain: xr.Dataset, event: Event) -> xr.DataArray:
    """The rows from start to end at the event's depths."""
    inside = xr.zeros_like(chain["temperature"], dtype=bool)
    inside.loc[{"time": slice(event.start, event.end), "depth": np.float32(event.depths)}] = True
    return inside


def differs(before: np.ndarray, after: np.ndarray) -> np.ndarray:
    return ~((before == after) | (np.isnan(before) & np.isnan(after)))


def one_event(name: str, seed: int = 4, chain: xr.Dataset | None = None) -> tuple[Event, xr.Dataset, xr.Dataset]:
    chain = record(missing=0.0) if chain is None else chain
    planted, (event,) = plant(chain, [name], np.random.default_rng(seed))
    return event, chain, planted


def window(chain: xr.Dataset, event: Event, name: str = "temperature") -> np.ndarray:
    return chain[name].sel(time=slice(event.start, event.end), depth=np.float32(event.depths)).values


# ------------------------------------------------------------------------------------------------------------
# What is recorded is what changed


@settings(max_examples=40, deadline=None)
@given(
    names=st.lists(st.sampled_from(list(CATALOGUE)), min_size=1, max_size=3),
    seed=st.integers(0, 2**32 - 1),
    missing=st.sampled_from([0.0, 0.05]),
)
def test_what_is_recorded_is_exactly_what_changed(names: list[str], seed: int, missing: float) -> None:
    chain = record(2200, missing=missing)
    planted, events = plant(chain, names, np.random.default_rng(seed))
    assert [event.name for event in events] == names
    for variable in ("temperature", "pressure"):
        changed = differs(chain[variable].values, planted[variable].values)
        np.testing.assert_array_equal(changed, planted[f"{variable}_fault"].values > 0)
    late = delivered_time(planted) != chain["time"].values
    np.testing.assert_array_equal(late, planted["time_fault"].values > 0 if late.any() else False)
    for event in events:
        mark = planted[f"{event.variable}_fault"] == event.number
        assert int(mark.sum()) == event.values > 0
        if event.variable != "time":
            assert not (mark & ~box(chain, event)).any()


@pytest.mark.parametrize("name", OF_TEMPERATURE)
def test_event_starts_and_ends_with_what_it_changed(name: str) -> None:
    planted, events = plant(record(), [name], np.random.default_rng(2))
    (event,) = events
    mark = (planted["temperature_fault"] == event.number) | (planted["pressure_fault"] == event.number)
    rows = planted["time"].values[mark.any("depth").values]
    assert (event.start, event.end) == (pd.Timestamp(rows[0]), pd.Timestamp(rows[-1]))
    assert event.depths == tuple(float(depth) for depth in DEPTHS[mark.any("time").values])
    assert (event.depth == event.depths[0]) if len(event.depths) == 1 else np.isnan(event.depth)


@pytest.mark.parametrize("name", CATALOGUE)
def test_event_says_what_the_catalogue_says(name: str) -> None:
    event, chain, _ = one_event(name)
    fault = CATALOGUE[name]
    assert (event.kind, event.unit, event.variable, event.mooring) == (
        fault.kind,
        fault.unit,
        fault.touches[0],
        "TB-07",
    )
    if fault.span is None:
        assert event.size in fault.sizes
    else:
        assert fault.span[0] <= abs(event.size) <= fault.span[1]
    days = (event.end - event.start).days + 1
    if fault.samples is not None:
        assert days <= fault.samples[1]
    else:
        assert days <= fault.days[1]
    number = chain["deployment"].sel(time=slice(event.start, event.end)).values
    assert number[0] == number[-1], "no event crosses an exchange"


@pytest.mark.parametrize("name", [name for name in CATALOGUE if name not in MOVES_THE_MISSING])
def test_missing_values_stay_missing(name: str) -> None:
    chain = record(missing=0.05)
    planted, _ = plant(chain, [name], np.random.default_rng(8))
    for variable in ("temperature", "pressure"):
        np.testing.assert_array_equal(np.isnan(chain[variable]), np.isnan(planted[variable]))


@pytest.mark.parametrize("name", [name for name, fault in CATALOGUE.items() if fault.extent == "rest"])
def test_rest_of_a_deployment_lasts_to_its_last_value(name: str) -> None:
    event, chain, _ = one_event(name)
    number = int(chain["deployment"].sel(time=event.start))
    held = chain["time"].values[
        (chain["deployment"] == number).values & chain["temperature"].notnull().any("depth").values
    ]
    assert event.end == pd.Timestamp(held[-1])


@pytest.mark.parametrize("name", ["calibration error", "swapped sensors", "wrong nominal depth", "clock offset"])
def test_whole_deployment_is_befallen(name: str) -> None:
    event, chain, _ = one_event(name)
    number = int(chain["deployment"].sel(time=event.start))
    held = chain["time"].values[
        (chain["deployment"] == number).values & chain["temperature"].notnull().any("depth").values
    ]
    assert pd.Timestamp(held[-1]) - event.end <= pd.Timedelta("2D")
    assert event.start - pd.Timestamp(held[0]) <= pd.Timedelta("2D")


# ------------------------------------------------------------------------------------------------------------
# Each kind


@pytest.mark.parametrize("name", ["spike", "offset", "calibration error"])
def test_spike_offset_and_calibration_error_add_their_size(name: str) -> None:
    event, before, after = one_event(name)
    change = window(after, event) - window(before, event)
    np.testing.assert_allclose(change, event.size, rtol=0, atol=6e-4)
    assert (name == "spike") == (event.values == 1)


def test_stuck_value_repeats_the_value_before_its_start() -> None:
    event, before, after = one_event("stuck value")
    first = before["temperature"].sel(time=event.start - pd.Timedelta("1D"), depth=np.float32(event.depth)).item()
    np.testing.assert_array_equal(window(after, event), np.float32(first))


def test_fill_values_stand_instead_of_the_temperature() -> None:
    sizes = set()
    for seed in range(25):
        event, _, after = one_event("fill value", seed)
        np.testing.assert_array_equal(window(after, event), np.float32(event.size))
        sizes.add(event.size)
    # The kinds seen in delivered records (mostly from memory).
    assert sizes == {-9.999, -99.0, 99.99, 1e35}


def test_digit_rollover_takes_its_size_from_some_values_and_leaves_the_others() -> None:
    event, before, after = one_event("digit rollover")
    change = (window(after, event) - window(before, event)).ravel()
    assert set(np.unique(change.astype(float).round(2))) == {0.0, -round(event.size, 2)}
    assert event.values == int((change != 0.0).sum())


def test_flooded_sensor_nears_its_extreme() -> None:
    event, _, after = one_event("flooded sensor")
    assert abs(window(after, event)[-1, 0] - event.size) < 0.5


def test_drift_grows_to_its_size() -> None:
    event, before, after = one_event("drift")
    change = (window(after, event) - window(before, event))[:, 0]
    assert change[-1] == pytest.approx(event.size, abs=6e-4)
    assert (np.diff(change / event.size) > -2e-3).all()


def test_bio_fouling_is_small_slow_and_in_the_light() -> None:
    event, before, after = one_event("bio-fouling")
    change = np.abs(window(after, event) - window(before, event))
    assert event.depth <= 100.0
    assert change.max() <= abs(event.size) + 6e-4 <= 0.11
    assert np.abs(np.diff(change[:, 0])).max() < 0.005


def test_swapped_sensors_read_each_other() -> None:
    event, before, after = one_event("swapped sensors")
    assert len(event.depths) == 2
    places = [int(np.flatnonzero(depth == DEPTHS)[0]) for depth in event.depths]
    assert places[1] - places[0] == event.size
    np.testing.assert_array_equal(window(after, event), window(before, event)[:, ::-1])


def test_wrong_nominal_depth_reads_what_is_there_and_its_pressure_says_so() -> None:
    chain = record(missing=0.0)
    chain["temperature"][:] = np.float32(30.0 - 0.05 * DEPTHS)
    chain["pressure"][:] = np.float32(DBAR_PER_METRE) * DEPTHS
    event, before, after = one_event("wrong nominal depth", 6, chain)
    assert event.unit == "m"
    # 0.05 °C per metre, all linear.
    np.testing.assert_allclose(window(after, event) - window(before, event), -0.05 * event.size, atol=2e-3)
    deeper = window(after, event, "pressure") - window(before, event, "pressure")
    np.testing.assert_allclose(deeper, DBAR_PER_METRE * event.size, atol=0.01)


def test_fault_that_cannot_show_in_temperature_leaves_pressure_alone() -> None:
    # Deeper than the deepest sensor there is nothing to read: its temperature stays, so no event is planted.
    deepest = Fault(
        "wrong depth",
        CATALOGUE["wrong nominal depth"].act,
        sizes=(10.0,),
        sensors=lambda draft, size, random: np.array([6]),
        extent="whole",
        touches=("temperature", "pressure"),
        least_share=0.5,
    )
    shallow = replace(deepest, sizes=(10.0, -10.0))
    with pytest.raises(DataError, match="no room for another fault: deepest"):
        plant(record(60, missing=0.0), ["deepest"], np.random.default_rng(1), catalogue={"deepest": deepest})
    for seed in range(6):
        chain = record(60, missing=0.0)
        planted, (event,) = plant(chain, ["either"], np.random.default_rng(seed), catalogue={"either": shallow})
        changed = differs(chain["pressure"].values, planted["pressure"].values)
        assert event.size == -10.0
        np.testing.assert_array_equal(changed, planted["pressure_fault"].values > 0)


def test_pressure_offset_adds_its_size_to_pressure_alone() -> None:
    event, before, after = one_event("pressure offset")
    assert event.depth in (90.0, 300.0)
    change = window(after, event, "pressure") - window(before, event, "pressure")
    np.testing.assert_allclose(change, event.size, atol=0.011)
    xr.testing.assert_equal(before["temperature"], after["temperature"])


def test_failed_pressure_nears_an_extreme() -> None:
    event, _, after = one_event("pressure failure")
    assert window(after, event, "pressure")[-1, 0] == pytest.approx(event.size, rel=0.05)


def test_mooring_adrift_changes_all_depths_together_and_leaves_its_place() -> None:
    event, before, after = one_event("mooring adrift")
    change = window(after, event) - window(before, event)
    assert len(event.depths) == DEPTHS.size
    assert np.ptp(change, axis=1).max() < 2e-3
    # It grows by 1 - 1/e in ten days, and lasts that at least.
    assert 0.6 < change[-1, 0] / event.size <= 1.001
    away = np.hypot(after["delivered_latitude"], after["delivered_longitude"] - 214.0)
    inside = (after["time"] > event.start) & (after["time"] <= event.end)
    # The first value is still in its place; then 0.4 degrees a day, where a watch circle is a few km (from memory).
    assert (away.where(inside, drop=True) > 0.39).all()
    assert (away.where(~inside, drop=True) == 0.0).all()


def test_on_deck_all_sensors_read_air_at_an_end_of_a_deployment() -> None:
    ends, chain = set(), record(4 * 365, missing=0.0)
    for seed in range(8):
        event, before, after = one_event("on deck", seed, chain)
        values = window(after, event)
        assert np.ptp(values, axis=1).max() < 1.0
        assert abs(values.mean() - event.size) < 3.0
        day = (pd.DatetimeIndex([event.start, event.end]) - pd.Timestamp(before["time"].values[0])).days % 365
        ends.add("first" if day[0] == 0 else "last" if day[1] == 354 else "elsewhere")
    assert ends == {"first", "last"}


def test_knock_down_warms_below_the_surface_and_lowers_pressure() -> None:
    smooth = record(missing=0.0)
    smooth["temperature"][:] = np.float32(30.0 - 0.05 * DEPTHS)
    event, before, after = one_event("knock-down", 4, smooth)
    change = (after["temperature"] - before["temperature"]).sel(time=slice(event.start, event.end))
    assert (change.sel(depth=[50.0, 90.0, 120.0, 160.0, 300.0]) >= 0.0).all()
    # At the middle of the pulse 300 m has risen by nearly the size; 0.05 °C per metre.
    assert float(change.sel(depth=300.0).max()) == pytest.approx(0.05 * event.size, rel=0.25)
    fall = (after["pressure"] - before["pressure"]).sel(time=slice(event.start, event.end), depth=300.0).min()
    assert float(fall) == pytest.approx(-DBAR_PER_METRE * event.size, rel=0.25)


def test_part_of_the_day_is_noisy_at_all_depths() -> None:
    event, before, after = one_event("part of the day")
    change = window(after, event) - window(before, event)
    assert len(event.depths) == DEPTHS.size
    # 0.04 to 0.12 °C per metre around 90 to 160 m, heave of the size.
    assert 0.03 * event.size < change[:, 4].std() < 0.15 * event.size


def test_repeated_block_is_the_block_before_it() -> None:
    chain = record(missing=0.05)
    event, _, after = one_event("repeated block", 5, chain)
    rows = np.flatnonzero((chain["time"] >= np.datetime64(event.start)) & (chain["time"] <= np.datetime64(event.end)))
    length = next(
        lag
        for lag in range(1, 12)
        if np.array_equal(after["temperature"].values[rows], after["temperature"].values[rows - lag], equal_nan=True)
    )
    assert 2 <= length <= 10
    assert rows.size <= length


def test_lost_upper_sensors_are_missing_from_the_top() -> None:
    event, before, after = one_event("lost upper sensors")
    assert event.depths == tuple(float(depth) for depth in DEPTHS[: int(event.size)])
    assert np.isnan(window(after, event)).all()
    assert event.values == int(np.isfinite(window(before, event)).sum())


def test_clock_offset_is_its_hours_and_leaves_the_values() -> None:
    event, before, after = one_event("clock offset")
    late = (delivered_time(after) - before["time"].values) / np.timedelta64(1, "h")
    assert set(np.round(late[after["time_fault"].values > 0], 3)) == {event.size}
    assert event.values == int((late != 0.0).sum())
    xr.testing.assert_equal(before["temperature"], after["temperature"])
    xr.testing.assert_equal(before["time"], after["time"])


def test_clock_drift_reaches_its_hours() -> None:
    event, before, after = one_event("clock drift")
    late = (delivered_time(after) - before["time"].values) / np.timedelta64(1, "h")
    assert late[np.abs(late).argmax()] == pytest.approx(event.size, abs=1e-3)
    grown = late[after["time_fault"].values > 0] / event.size
    assert (np.diff(grown) > 0.0).all()


def test_duplicated_timestamps_repeat_one() -> None:
    event, _, after = one_event("duplicated timestamps")
    stamps = delivered_time(after)
    assert stamps.size - np.unique(stamps).size == event.values
    assert 1 <= event.values <= 4


# ------------------------------------------------------------------------------------------------------------
# As delivered


@pytest.mark.parametrize("seed", range(4))
@pytest.mark.parametrize("name", OF_TIME)
def test_delivered_chain_has_increasing_times_and_true_values(name: str, seed: int) -> None:
    _, before, after = one_event(name, seed)
    delivered = as_delivered(after)
    assert (np.diff(delivered["time"].values) > np.timedelta64(0)).all()
    assert "delivered_time" not in delivered
    np.testing.assert_array_equal(
        delivered["temperature"].values, before["temperature"].sel(time=delivered["true_time"].values).values
    )
    assert set(delivered["time"].values) == set(delivered_time(after))


def test_chain_without_a_clock_fault_is_delivered_as_it_is() -> None:
    _, _, after = one_event("spike")
    assert as_delivered(after) is after
    assert "delivered_time" not in after
    assert "time_fault" not in after


# ------------------------------------------------------------------------------------------------------------
# Several events


def test_events_of_one_sensor_never_touch() -> None:
    names = ["spike", "stuck value", "offset", "digit rollover", "knock-down"] * 5
    planted, events = plant(record(4000), names, np.random.default_rng(5))
    for one, other in combinations(events, 2):
        if set(one.depths) & set(other.depths):
            earlier, later = sorted((one, other), key=lambda event: event.start)
            assert (later.start - earlier.end).days >= 2
    assert set(np.unique(planted["temperature_fault"])) == set(range(len(names) + 1))


def test_planting_again_goes_on_counting_and_keeps_clear_of_what_stands() -> None:
    chain = record()
    once, first = plant(chain, ["digit rollover", "clock offset"] * 2, np.random.default_rng(6))
    twice, second = plant(once, ["spike", "offset", "clock offset"] * 2, np.random.default_rng(7))
    assert [event.number for event in (*first, *second)] == list(range(1, 11))
    for event in first:
        name = f"{event.variable}_fault"
        np.testing.assert_array_equal(once[name] == event.number, twice[name] == event.number)
    inside = {event.number: box(chain, event) for event in first if event.variable == "temperature"}
    later = twice["temperature_fault"] > 4
    assert not any((held & later).any() for held in inside.values())


def test_planting_again_keeps_out_of_a_fault_that_left_values_between() -> None:
    # One sensor, 100 days, 90 of them rolled over, half the values unchanged: ten days are left, less one beside it.
    lasting = {**CATALOGUE, "digit rollover": replace(CATALOGUE["digit rollover"], days=(90, 90))}
    chain = record(100, missing=0.0).isel(depth=[3])
    once, (rollover,) = plant(chain, ["digit rollover"], np.random.default_rng(1), catalogue=lasting)
    for seed in range(5):
        _, spikes = plant(once, ["spike"] * 2, np.random.default_rng(seed))
        assert all(spike.end < rollover.start or spike.start > rollover.end for spike in spikes)


def test_event_lasts_as_long_as_is_drawn_though_values_are_missing_around_it() -> None:
    ten = {"ten days": replace(CATALOGUE["offset"], days=(10, 10))}
    chain = record(missing=0.08)
    _, events = plant(chain, ["ten days"] * 30, np.random.default_rng(2), catalogue=ten)
    assert {(event.end - event.start).days for event in events} == {9}
    assert all(event.values >= 9 for event in events)


def test_faults_of_temperature_pressure_and_time_may_coincide() -> None:
    chain = record(360, missing=0.0)
    _, events = plant(chain, ["calibration error", "pressure offset", "clock offset"], np.random.default_rng(8))
    assert len({event.variable for event in events}) == 3


def test_whole_catalogue_fits_into_six_years() -> None:
    planted, events = plant(record(6 * 365), list(CATALOGUE), np.random.default_rng(9))
    assert [event.name for event in events] == list(CATALOGUE)
    assert float((planted["temperature_fault"] > 0).mean()) < 0.5


@settings(max_examples=10, deadline=None)
@given(seed=st.integers(0, 2**32 - 1))
def test_same_random_numbers_give_the_same_faults(seed: int) -> None:
    chain, names = record(), ["part of the day", "mooring adrift", "swapped sensors", "on deck"]
    once, first = plant(chain, names[:2], np.random.default_rng(seed))
    again, second = plant(chain, names[:2], np.random.default_rng(seed))
    pd.testing.assert_frame_equal(event_table(first), event_table(second))
    xr.testing.assert_identical(once, again)


def test_raw_temperature_gets_the_faults_too() -> None:
    chain = record()
    chain["temperature_raw"] = chain["temperature"].copy()
    planted, _ = plant(chain, ["offset"], np.random.default_rng(6))
    np.testing.assert_array_equal(planted["temperature_raw"], planted["temperature"])
    assert not planted["temperature_raw"].equals(chain["temperature_raw"])


def test_given_chain_is_left_alone() -> None:
    chain = record()
    before = chain.copy(deep=True)
    plant(chain, list(CATALOGUE), np.random.default_rng(7))
    assert chain.identical(before)


def test_order_of_dimensions_does_not_matter() -> None:
    chain = record()
    planted, _ = plant(chain, ["offset", "knock-down"], np.random.default_rng(11))
    turned, _ = plant(chain.transpose("depth", "time"), ["offset", "knock-down"], np.random.default_rng(11))
    np.testing.assert_array_equal(planted["temperature"], turned["temperature"].transpose("time", "depth"))


def test_dense_record_has_spikes_of_one_sample_and_stretches_of_days() -> None:
    chain = record(80 * 144, step="10min")
    _, (spike, stuck) = plant(chain, ["spike", "stuck value"], np.random.default_rng(12))
    assert spike.values == 1
    assert spike.start == spike.end
    assert 7.9 <= (stuck.end - stuck.start) / pd.Timedelta("1D") <= 60.0


def test_catalogue_of_the_caller_is_used() -> None:
    own = {"bump": Fault("bump", on_temperature(added), days=(3, 3), sizes=(0.25,))}
    _, (event,) = plant(record(missing=0.0), ["bump"], np.random.default_rng(8), catalogue=own)
    assert (event.kind, event.size, event.values) == ("bump", 0.25, 3)


def test_table_has_a_row_an_event_and_depths_as_text() -> None:
    _, events = plant(record(), ["spike", "swapped sensors", "clock drift"], np.random.default_rng(13))
    table = event_table(events)
    assert list(table["name"]) == ["spike", "swapped sensors", "clock drift"]
    assert table["depths"][0] == f"{events[0].depth:g}"
    assert np.isnan(table["depth"][1])
    assert [float(text) for text in table["depths"][1].split()] == list(events[1].depths)
    assert list(event_table(())) == list(table)


# ------------------------------------------------------------------------------------------------------------
# What cannot be planted


def test_record_too_short_for_a_fault_is_an_error() -> None:
    with pytest.raises(
        DataError, match=r"TB-07: the record has no room for another fault: drift; expected 100 to 350 days"
    ):
        plant(record(60), ["drift"], np.random.default_rng(9))


def test_record_with_too_many_gaps_is_an_error() -> None:
    with pytest.raises(DataError, match="free of other faults, 90% of it with temperature"):
        plant(record(missing=0.5), ["offset"], np.random.default_rng(9))


def test_full_record_is_an_error() -> None:
    with pytest.raises(DataError, match="no room for another fault: clock offset"):
        plant(record(360), ["clock offset"] * 2, np.random.default_rng(9))


def test_empty_record_is_an_error() -> None:
    with pytest.raises(DataError, match=r"no room for another fault: spike.*found no value at all"):
        plant(record(50, missing=1.0), ["spike"], np.random.default_rng(10))


def test_pressure_fault_without_pressure_is_an_error() -> None:
    with pytest.raises(DataError, match="pressure offset"):
        plant(record().drop_vars("pressure"), ["pressure offset"], np.random.default_rng(10))


@pytest.mark.parametrize("name", ["swapped sensors", "lost upper sensors"])
def test_fault_of_several_sensors_in_a_chain_of_one_is_an_error(name: str) -> None:
    with pytest.raises(DataError, match=f"no room for another fault: {name}"):
        plant(record().isel(depth=[3]), [name], np.random.default_rng(10))


def test_unknown_fault_is_an_error() -> None:
    with pytest.raises(RequestError, match=r"no such fault.*spike.*found gremlin"):
        plant(record(), ["gremlin"], np.random.default_rng(10))


def test_dataset_without_temperature_is_an_error() -> None:
    with pytest.raises(RequestError, match="found without temperature"):
        plant(record().drop_vars("temperature"), ["spike"], np.random.default_rng(10))


def test_chain_without_pressure_deployment_or_place_takes_every_other_fault() -> None:
    bare = record(3000).drop_vars(["pressure", "deployment", "latitude", "longitude"])
    for name in (*OF_TEMPERATURE, *OF_TIME):
        planted, (event,) = plant(bare, [name], np.random.default_rng(14))
        assert event.values > 0
        assert "delivered_latitude" not in planted


def test_bounds_of_the_catalogue_are_in_order() -> None:
    for fault in CATALOGUE.values():
        assert fault.days[0] <= fault.days[1]
        assert replace(fault, sizes=(1.0,), span=None).draw_size(np.random.default_rng(1)) == 1.0
