"""Planted faults and what is written down of them."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
import pandas as pd
import pytest
import xarray as xr

from profiles.drill.faults import CATALOGUE, FLOODING_DAYS, Event, Fault, plant
from profiles.errors import DataError

DEPTHS = [1.0, 50.0, 120.0, 300.0]


def record(days: int = 1500, *, missing: float = 0.0) -> xr.Dataset:
    random = np.random.default_rng(3)
    values = np.array([29.0, 27.0, 20.0, 11.0]) + random.normal(0.0, 0.2, (days, 4)).round(3)
    values[random.random(values.shape) < missing] = np.nan
    time = pd.date_range("2031-01-01T12:00", periods=days, freq="D").values.astype("datetime64[ns]")
    return xr.Dataset(
        {"temperature": (("time", "depth"), values)}, coords={"time": time, "depth": DEPTHS, "mooring": "TB-07"}
    )


def window(chain: xr.Dataset, event: Event) -> np.ndarray:
    values = chain["temperature"].sel(depth=event.depth, time=slice(event.start, event.end)).values
    return values[np.isfinite(values)]


@pytest.mark.parametrize("name", CATALOGUE)
def test_nothing_changes_outside_the_event_that_is_written_down(name: str) -> None:
    chain = record(missing=0.02)
    planted, events = plant(chain, [name] * 3, np.random.default_rng(1))
    before, after = chain["temperature"], planted["temperature"]
    inside = xr.zeros_like(before, dtype=bool)
    for event in events:
        inside.loc[{"depth": event.depth, "time": slice(event.start, event.end)}] = True
    np.testing.assert_array_equal(before.where(~inside), after.where(~inside))
    np.testing.assert_array_equal(np.isnan(before), np.isnan(after))
    assert int((inside & before.notnull()).sum()) == sum(event.values for event in events)


@pytest.mark.parametrize("name", CATALOGUE)
def test_event_starts_and_ends_on_a_value_and_lasts_as_long_as_its_kind(name: str) -> None:
    planted, events = plant(record(missing=0.02), [name] * 3, np.random.default_rng(2))
    shortest, longest = CATALOGUE[name].days
    for event in events:
        assert event.kind == CATALOGUE[name].kind
        assert event.mooring == "TB-07"
        assert shortest <= (event.end - event.start).days + 1 <= longest
        assert window(planted, event).size == event.values


def one_event(name: str) -> tuple[Event, np.ndarray, np.ndarray]:
    chain = record()
    planted, (event,) = plant(chain, [name], np.random.default_rng(4))
    return event, window(chain, event), window(planted, event)


def test_spike_and_offset_add_their_size() -> None:
    for name in ("spike", "offset"):
        event, before, after = one_event(name)
        np.testing.assert_allclose(after - before, event.size, rtol=0, atol=1e-9)


def test_stuck_value_repeats_the_value_it_starts_with() -> None:
    event, before, after = one_event("stuck value")
    assert event.values >= 8
    np.testing.assert_array_equal(after, before[0])


def test_fill_value_stands_instead_of_the_temperature() -> None:
    event, _, after = one_event("fill value")
    assert event.size in (-9.999, 99.99)
    np.testing.assert_array_equal(after, event.size)


def test_flooded_sensor_nears_its_extreme() -> None:
    event, before, after = one_event("flooded sensor")
    # After one e-folding time, 4 days, the fourth value has kept 1/e of its distance.
    kept = (after[3] - event.size) / (before[3] - event.size)
    assert FLOODING_DAYS == 4.0
    assert kept == pytest.approx(np.exp(-1.0), abs=1e-3)
    assert abs(after[-1] - event.size) < 0.5


def test_drift_grows_evenly_to_its_size() -> None:
    event, before, after = one_event("drift")
    # Without gaps, day k of n carries k/n of the size; written to 0.001 °C.
    expected = event.size * np.arange(1, event.values + 1) / event.values
    np.testing.assert_allclose(after - before, expected, rtol=0, atol=6e-4)


def test_events_of_one_sensor_never_touch() -> None:
    _, events = plant(record(4000), ["spike", "stuck value", "offset"] * 6, np.random.default_rng(5))
    for depth in DEPTHS:
        own = sorted((event for event in events if event.depth == depth), key=lambda event: event.start)
        for earlier, later in pairwise(own):
            assert (later.start - earlier.end).days >= 2


def test_raw_temperature_gets_the_faults_too() -> None:
    chain = record()
    chain["temperature_raw"] = chain["temperature"].copy()
    planted, _ = plant(chain, ["offset"], np.random.default_rng(6))
    np.testing.assert_array_equal(planted["temperature_raw"], planted["temperature"])
    assert not planted["temperature_raw"].equals(chain["temperature_raw"])


def test_given_chain_is_left_alone() -> None:
    chain = record()
    before = chain.copy(deep=True)
    plant(chain, ["drift", "spike"], np.random.default_rng(7))
    assert chain.identical(before)


def test_catalogue_of_the_caller_is_used() -> None:
    own = {"bump": Fault("bump", CATALOGUE["spike"].kernel, (3, 3), sizes=(0.25,))}
    _, (event,) = plant(record(), ["bump"], np.random.default_rng(8), catalogue=own)
    assert (event.kind, event.size, event.values) == ("bump", 0.25, 3)


def test_record_too_short_for_a_fault_is_an_error() -> None:
    with pytest.raises(DataError, match="no room for another fault"):
        plant(record(100), ["drift"], np.random.default_rng(9))


def test_empty_record_is_an_error() -> None:
    with pytest.raises(DataError, match="no room for another fault"):
        plant(record(50, missing=1.0), ["spike"], np.random.default_rng(10))
