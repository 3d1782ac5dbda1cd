"""What the sensors make of the water."""

from __future__ import annotations

import gsw
import numpy as np
import pytest
import xarray as xr

from profiles.drill.array import SITES, Site
from profiles.drill.demo import days
from profiles.drill.instruments import MAKES, PRESSURE_DEPTHS, Make, ageing, moor, sensor_errors, with_pressure
from profiles.drill.ocean import Columns, Ocean
from profiles.drill.service import Outage, visits

TIME = days("2031-01-01", "2033-12-31")
SITE = next(site for site in SITES if (site.latitude, site.longitude) == (0.0, 214.0))
YEARLY = np.array([-100.0, 265.0, 630.0, 995.0, 1360.0])  # days
Moored = tuple[xr.Dataset, xr.Dataset, tuple[Outage, ...]]


@pytest.fixture(scope="module")
def columns() -> Columns:
    return Ocean.simulate(TIME, 5).columns([SITE.latitude], [SITE.longitude])


@pytest.fixture(scope="module")
def moored(columns: Columns) -> Moored:
    return moor(columns, 0, SITE, TIME, YEARLY, seed=5)


def test_chain_keeps_the_contract(moored: Moored) -> None:
    chain, truth, _ = moored
    assert chain["temperature"].dims == ("time", "depth")
    assert chain["mooring"].item() == SITE.id
    assert (chain["latitude"].item(), chain["longitude"].item()) == (SITE.latitude, SITE.longitude)
    assert (np.diff(chain["depth"]) > 0.0).all()
    assert set(SITE.depths) <= set(chain["depth"].values.tolist())
    assert chain["deployment"].dtype == np.int16
    assert set(np.diff(chain["deployment"])) == {0, 1}
    assert chain["deployment"].values[0] == 1
    assert truth.sizes["number"] == chain["deployment"].values[-1]
    assert chain["pressure"].attrs["units"] == "dbar"


def test_readings_are_the_water_at_the_true_depths_within_the_stated_accuracy(columns: Columns, moored: Moored) -> None:
    chain, truth, _ = moored
    water = columns.temperature(0, truth["sensor_depth"].values.astype(float))
    error = (chain["temperature"].values - water)[np.isfinite(chain["temperature"].values)]
    # Published field accuracy, drift included: 0.0181 °C (Freitag et al. 2005), and 0.005 °C of noise; about 60
    # deployed sensors say that to a tenth or two. Depths are rounded to 0.01 m.
    assert error.std() == pytest.approx(np.hypot(0.0181, 0.005), rel=0.3)


def test_error_is_made_of_the_parts_that_the_truth_states(columns: Columns, moored: Moored) -> None:
    chain, truth, _ = moored
    number = truth["number"].values[1]
    inside = chain["deployment"].values == number
    water = columns.temperature(0, truth["sensor_depth"].values.astype(float))
    error = (chain["temperature"].values - water)[inside]
    months = (np.arange(TIME.size)[inside] - YEARLY[number - 1]) / 30.4375
    of_sensor = truth.sel(number=number)
    stated = of_sensor["calibration_offset"].values + of_sensor["calibration_drift"].values * months[:, None]
    rest = error - stated
    # What is left: noise of 0.005 °C, rounding, 0.005 m of rounded depth, six days of drift at the exchange.
    assert np.nanstd(rest) == pytest.approx(0.005, rel=0.15)
    assert np.nanmax(np.abs(np.nanmean(rest, axis=0))) < 0.002


def test_sensors_hang_shallower_the_deeper_they_are(moored: Moored) -> None:
    _, truth, _ = moored
    departure = truth["sensor_depth"] - truth["depth"] - truth["depth_offset"].sel(number=moored[0]["deployment"])
    mean = departure.mean("time").sel(depth=[10.0, 100.0, 300.0, 500.0]).values
    assert (np.diff(mean) < 0.0).all()
    assert departure.max() < 0.01


def test_pressure_is_that_of_the_true_depth_with_its_published_accuracy(moored: Moored) -> None:
    chain, truth, _ = moored
    recorded = chain["pressure"].notnull()
    error = (chain["pressure"] - gsw.p_from_z(-truth["sensor_depth"], SITE.latitude)).where(recorded)
    # 0.98 dbar in the field (Freitag et al. 2005); a dozen deployed sensors say that to a third.
    assert float(error.std()) == pytest.approx(0.98, rel=0.5)
    within = error.groupby(chain["deployment"]).map(lambda part: part - part.mean("time"))
    assert float(within.std()) < 0.4
    assert int(recorded.any("time").sum()) == 3


def test_pressure_stands_nearest_to_the_depths_that_are_stated() -> None:
    assert PRESSURE_DEPTHS == (100.0, 300.0, 500.0)
    np.testing.assert_array_equal(with_pressure((1.0, 80.0, 130.0, 300.0, 500.0)), [1, 3, 4])
    np.testing.assert_array_equal(with_pressure((1.0, 80.0)), [1])


def test_readings_have_the_resolution(moored: Moored) -> None:
    values = moored[0]["temperature"].values * 1000.0
    np.testing.assert_allclose(values, np.rint(values), rtol=0, atol=1e-6)


def test_nothing_is_read_in_an_outage_or_a_turn_around(moored: Moored) -> None:
    chain, _, outages = moored
    day = (TIME - TIME[0]) / np.timedelta64(1, "D")
    assert {"turn-around"} <= {outage.cause for outage in outages}
    for outage in outages:
        silent = chain["temperature"].values[(day >= outage.start) & (day < outage.end)]
        assert np.isnan(silent[:, np.isin(chain["depth"].values, outage.depths)]).all()


def test_same_seed_gives_the_same_chain_and_another_another(columns: Columns, moored: Moored) -> None:
    again = moor(columns, 0, SITE, TIME, YEARLY, seed=5)
    other = moor(columns, 0, SITE, TIME, YEARLY, seed=6)
    xr.testing.assert_identical(again[0], moored[0])
    xr.testing.assert_identical(again[1], moored[1])
    assert again[2] == moored[2]
    assert not other[0]["temperature"].equals(moored[0]["temperature"])


def test_sensor_stays_in_the_water(columns: Columns) -> None:
    surface = Site("TB-22", 0.0, 214.0, (0.5, 1.0, 100.0), "marlin")
    _, truth, _ = moor(columns, 0, surface, TIME, visits(TIME.size, np.random.default_rng(3)), seed=4)
    assert float(truth["sensor_depth"].min()) == pytest.approx(0.2)


def test_ageing_starts_with_the_offset_and_drifts_by_the_month() -> None:
    # 0.01 °C and 0.002 °C a month: after 30.4375 days 0.012; the second deployment starts anew.
    found = ageing(
        np.array([[0.01], [0.0]]),
        np.array([[0.002], [0.001]]),
        np.array([0.0, 30.4375, 60.875]),
        np.array([0.0, 60.875]),
        np.array([0, 0, 1]),
    )
    np.testing.assert_allclose(found, [[0.01], [0.012], [0.0]], atol=1e-12)


@pytest.mark.parametrize(
    ("name", "total"),
    # Field accuracy 0.0181 (Freitag et al. 2005); 0.09 to 0.1 (from memory); a logger's 0.002 and 0.0002 a month.
    [("chain", 0.0181), ("old chain", 0.09), ("logger", np.sqrt(0.002**2 + 0.0024**2 / 3.0))],
)
def test_makes_have_their_published_accuracy_over_a_year(name: str, total: float) -> None:
    make: Make = MAKES[name]
    errors = sensor_errors(4000, (1.0, 2.0), make, np.random.default_rng(6))
    month = np.random.default_rng(7).uniform(0.0, 12.0, (4000, 2))
    over_a_year = errors["calibration_offset"] + errors["calibration_drift"] * month
    assert over_a_year.std() == pytest.approx(total, rel=0.06)
