"""Readings on deck, told from those in the water."""

import numpy as np
import pytest

from profiles.ingest import read
from profiles.ingest.water import spread
from profiles.vocabulary import Water

WET, AIR = Water.IN_WATER, Water.AIR_FOUND


def chain_of(write, wide, profiles):
    rows = [f"2031-01-{day:02}," + ",".join(f"{value:g}" for value in row) for day, row in enumerate(profiles, start=1)]
    text = "\n".join(["date,T_1m,T_100m,T_200m,T_300m", *rows]).replace("nan", "NA")
    return read(write(text), wide).chain


SEA, DECK, HALF = (29.0, 24.0, 15.0, 11.0), (27.0, 27.4, 26.9, 27.2), (28.0, 25.5, 21.0, 21.0)


def test_readings_alike_from_top_to_bottom_were_on_deck_also_between(write, wide):
    chain = chain_of(write, wide, [DECK, SEA, SEA, SEA, DECK, DECK, SEA, SEA, SEA, DECK])
    np.testing.assert_array_equal(chain["water_status"], [AIR, WET, WET, WET, AIR, AIR, WET, WET, WET, AIR])


def test_a_mean_over_deck_and_water_counts_as_deck_only_beside_it(write, wide):
    # HALF differs by 7 °C, less than half of the usual 18; far from any reading on deck it is water
    chain = chain_of(write, wide, [DECK, HALF, SEA, SEA, HALF, SEA, SEA, SEA, SEA])
    np.testing.assert_array_equal(chain["water_status"], [AIR, AIR, WET, WET, WET, WET, WET, WET, WET])


def test_nothing_is_trimmed_from_the_values(write, wide):
    chain = chain_of(write, wide, [DECK, SEA, SEA])
    np.testing.assert_array_equal(chain["temperature"][0], np.float32(DECK))


@pytest.mark.parametrize("profile", [(29.0, 28.9, 28.8, 28.7), (29.0, np.nan, np.nan, 28.0)])
def test_a_record_that_hardly_differs_with_depth_cannot_tell(write, wide, profile):
    chain = chain_of(write, wide, [profile] * 5 + [DECK])
    assert (chain["water_status"] == WET).all()


def test_few_or_crowded_sensors_do_not_tell():
    depth = np.array([1.0, 10.0, 20.0, 300.0])
    values = np.array([[27.0, 27.0, 27.0, np.nan], [27.0, np.nan, np.nan, 27.0], [27.0, 27.0, np.nan, 27.5]])
    np.testing.assert_array_equal(spread(values, depth), [np.nan, np.nan, 0.5])


def test_the_blocks_do_not_change_the_status(write, wide):
    profiles = [DECK, HALF, SEA, SEA, HALF, DECK, SEA, SEA, SEA]
    rows = [f"2031-01-{day:02}," + ",".join(map(str, row)) for day, row in enumerate(profiles, start=1)]
    delivery = read(write("\n".join(["date,T_1m,T_100m,T_200m,T_300m", *rows])), wide)
    pieces = [block["water_status"].values for block in delivery.blocks(2)]
    np.testing.assert_array_equal(np.concatenate(pieces), delivery.chain["water_status"])
