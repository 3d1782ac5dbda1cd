"""The simulated ocean as a whole."""

from __future__ import annotations

from hashlib import sha256

import numpy as np
import pytest

from profiles.drill.array import SITES, positions
from profiles.drill.demo import days
from profiles.drill.ocean import Columns, Ocean
from profiles.drill.truth import LATITUDE as ROWS
from profiles.drill.truth import LONGITUDE as COLUMNS
from profiles.drill.truth import monthly_means
from profiles.errors import DataError

TIME = days("2031-01-01", "2032-12-31")
LATITUDE, LONGITUDE = np.array([-2.5, 0.0, 4.5, -2.5]), np.array([149.0, 201.0, 240.0, 266.0])
BOX = tuple(grid.ravel() for grid in np.meshgrid(ROWS, COLUMNS, indexing="ij"))
FAR_EAST = np.array([-2.5, 0.0, -4.5, -2.5]), np.array([266.0, 266.0, 272.0, 276.0])


@pytest.fixture(scope="module")
def ocean() -> Ocean:
    return Ocean.simulate(TIME, 5)


@pytest.fixture(scope="module")
def columns(ocean: Ocean) -> Columns:
    return ocean.columns(LATITUDE, LONGITUDE, small_scales=True)


@pytest.fixture(scope="module")
def far_east() -> list[Columns]:
    return [Ocean.simulate(days(), seed).columns(*FAR_EAST, small_scales=True) for seed in (1, 2, 3)]


def crossing(temperature: np.ndarray, depth: np.ndarray) -> float:
    """Shallowest depth of 20 °C, by numpy.interp on the two levels around it."""
    if temperature[0] < 20.0:
        return 0.0
    below = int(np.argmax(temperature < 20.0))
    pair = slice(below - 1, below + 1)
    return float(np.interp(20.0, temperature[pair][::-1], depth[pair][::-1]))


@pytest.mark.parametrize("position", range(4))
def test_true_isotherm_depth_is_the_crossing_of_the_true_temperature(columns: Columns, position: int) -> None:
    depth = np.arange(0.0, 250.0, 0.1)
    expected = [crossing(profile, depth) for profile in columns.temperature(position, depth)]
    np.testing.assert_allclose(columns.isotherm_depth()[position], expected, rtol=0, atol=0.05)


def test_isotherm_moves_by_its_displacement_where_it_is_deep(ocean: Ocean) -> None:
    large = ocean.columns(LATITUDE, LONGITUDE)
    np.testing.assert_allclose(large.isotherm_depth()[0], (large.base + large.displacement)[0], rtol=0, atol=1e-6)


def test_quick_depths_are_those_of_the_columns(ocean: Ocean) -> None:
    quick = ocean.isotherm_depth(LATITUDE, LONGITUDE)
    np.testing.assert_allclose(quick, ocean.columns(LATITUDE, LONGITUDE).isotherm_depth(), rtol=0, atol=1e-9)


def test_far_east_outcrops_at_its_cold_extremes(far_east: list[Columns]) -> None:
    depth = np.concatenate([columns.isotherm_depth() for columns in far_east])
    displacement = np.concatenate([columns.displacement for columns in far_east])
    outcropped = depth == 0.0
    assert 0.0005 < outcropped.mean() < 0.05
    # Never on a day when the thermocline is no shallower than usual.
    assert np.median(displacement[outcropped]) < np.quantile(displacement, 0.1)
    assert displacement[outcropped].max() < 0.0


def test_outcrops_begin_and_end_without_a_jump(far_east: list[Columns]) -> None:
    # The depth of the state passes through the surface from one day to the next by metres, not tens of metres.
    for columns in far_east:
        outcropped = columns.isotherm_depth() == 0.0
        edge = outcropped[:, 1:] & ~outcropped[:, :-1] & (columns.passages()[:, :-1] == 1)
        assert columns.isotherm_depth()[:, :-1][edge].max(initial=0.0) < 12.0


def test_far_east_passes_the_isotherm_several_times_at_its_cold_extremes(far_east: list[Columns]) -> None:
    passages = np.concatenate([columns.passages() for columns in far_east])
    isotherm = np.concatenate([columns.state.isotherm for columns in far_east])
    assert 0.0005 < np.mean(passages > 1) < 0.05
    assert isotherm[passages > 1].max() < 30.0


def test_surface_of_the_western_pool_is_warm() -> None:
    # Common practice, no source: above 27 °C throughout, 29 in the mean, never above 32.
    surface = Ocean.simulate(TIME, 8).surface_temperature([0.0, 2.5, -2.5], [149.0, 149.0, 162.0])
    assert surface.min() > 27.0
    assert surface.mean() == pytest.approx(29.0, abs=0.7)
    assert surface.max() < 32.0


def test_surface_temperature_is_that_of_the_column(ocean: Ocean, columns: Columns) -> None:
    np.testing.assert_array_equal(columns.surface_temperature()[2], columns.temperature(2, [0.0])[:, 0])
    surface = ocean.surface_temperature(LATITUDE, LONGITUDE)
    np.testing.assert_allclose(surface[1], columns.temperature(1, [0.0])[:, 0], atol=1.0)


def test_west_has_inversions_for_some_weeks_a_year(columns: Columns) -> None:
    # Warmer at 30 to 60 m than at 5 m by a tenth of a degree and more.
    values = columns.temperature(0, [5.0, 30.0, 40.0, 50.0, 60.0])
    inverted = values[:, 1:].max(axis=1) > values[:, 0] + 0.1
    assert 14 < inverted.sum() < 365
    assert (values[:, 1:].max(axis=1) - values[:, 0]).max() < 1.0


def test_small_scales_leave_the_large_scale_alone(ocean: Ocean, columns: Columns) -> None:
    difference = columns.isotherm_depth() - ocean.columns(LATITUDE, LONGITUDE).isotherm_depth()
    np.testing.assert_allclose(difference.mean(axis=1), 0.0, atol=1.5)
    assert np.all((difference.std(axis=1) > 1.0) & (difference.std(axis=1) < 5.0))


def test_small_scales_hold_internal_waves_and_fine_structure(ocean: Ocean, columns: Columns) -> None:
    large = ocean.columns(LATITUDE, LONGITUDE)
    assert (columns.displacement - large.displacement).std(axis=1).min() > 1.0
    # Internal waves move the state; the steps move the crossing away from it, by a metre or so.
    steps = (columns.isotherm_depth() - columns.state.isotherm)[:3]
    assert np.all((steps.std(axis=1) > 0.3) & (steps.std(axis=1) < 2.5))


def test_a_third_and_more_of_the_variance_lies_in_basin_wide_patterns() -> None:
    latitude, longitude = (grid.ravel() for grid in np.meshgrid(ROWS[::3], COLUMNS[2::8], indexing="ij"))
    months = np.arange("2000-01", "2040-01", dtype="datetime64[M]").astype("datetime64[ns]") + np.timedelta64(15, "D")
    for seed in (1, 2):
        monthly = Ocean.simulate(months, seed)
        parts = monthly.oscillator.displacement(latitude, longitude)
        whole = monthly.isotherm_depth(latitude, longitude)
        season = whole.reshape(len(whole), -1, 12).mean(axis=1)
        anomaly = whole - np.tile(season, 40)
        assert parts.var(axis=1).sum() / anomaly.var(axis=1).sum() > 1.0 / 3.0
        power = np.linalg.svd(anomaly, compute_uv=False) ** 2
        assert power[:2].sum() / power.sum() > 1.0 / 3.0


def test_eastern_anomalies_are_skewed_towards_warm_and_deep() -> None:
    # Fifty years of one ocean leave an uncertainty of 0.4: six oceans are taken together.
    months = np.arange("1990-01", "2040-01", dtype="datetime64[M]").astype("datetime64[ns]") + np.timedelta64(15, "D")
    skewness = []
    for seed in range(1, 7):
        ocean = Ocean.simulate(months, seed)
        series = np.concatenate([ocean.surface_temperature([0.0], [250.0]), ocean.isotherm_depth([0.0], [250.0])])
        anomaly = series - np.tile(series.reshape(2, -1, 12).mean(axis=1), 50)
        skewness.append(np.mean(anomaly**3, axis=1) / anomaly.std(axis=1) ** 3)
    assert np.all(np.mean(skewness, axis=0) > 0.3)


def test_days_are_means_of_their_minutes() -> None:
    step = np.timedelta64(10, "m")
    minutes = np.arange("2031-03-01", "2031-03-15", step, dtype="datetime64[m]").astype("datetime64[ns]")
    fine = Ocean.simulate(minutes, 5).columns([0.0], [175.0], small_scales=True)
    daily = Ocean.simulate(days("2031-03-01", "2031-03-14"), 5).columns([0.0], [175.0], small_scales=True)
    isotherm = fine.state.isotherm[0].reshape(14, 144)
    assert isotherm.std(axis=1).mean() > 2.0
    np.testing.assert_allclose(isotherm.mean(axis=1), daily.state.isotherm[0], atol=0.1)
    # The steps of the fine structure bend the mean: by metres, when a wave passes one.
    depth = fine.isotherm_depth()[0].reshape(14, 144)
    np.testing.assert_allclose(depth.mean(axis=1), daily.isotherm_depth()[0], atol=2.5)
    surface = fine.surface_temperature()[0].reshape(14, 144)
    assert np.ptp(surface, axis=1).max() > 0.3
    np.testing.assert_allclose(surface.mean(axis=1), daily.surface_temperature()[0], atol=0.15)


def test_months_are_means_of_their_days(ocean: Ocean) -> None:
    middle, means = monthly_means(TIME, ocean.isotherm_depth(LATITUDE, LONGITUDE))
    monthly = Ocean.simulate(middle, 5).isotherm_depth(LATITUDE, LONGITUDE)
    # Months differ in length, and the season bends: a metre or two.
    assert np.sqrt(np.mean((monthly - means) ** 2)) < 1.5


def test_same_seed_gives_the_same_bytes_and_another_seed_another_ocean() -> None:
    where = positions(SITES[:6])

    def mark(seed: int) -> str:
        columns = Ocean.simulate(TIME[:60], seed).columns(*where, small_scales=True)
        return sha256(
            columns.isotherm_depth().round(2).tobytes() + columns.temperature(3, [1.0, 120.0]).round(3).tobytes()
        ).hexdigest()

    assert mark(1) == mark(1)
    assert mark(1) != mark(2)


def test_positions_do_not_depend_on_their_company(ocean: Ocean, columns: Columns) -> None:
    alone = ocean.columns(LATITUDE[2:3], LONGITUDE[2:3], small_scales=True)
    np.testing.assert_allclose(alone.isotherm_depth()[0], columns.isotherm_depth()[2], rtol=0, atol=1e-6)


def test_the_whole_box_with_its_ends_can_be_read() -> None:
    ocean = Ocean.simulate(TIME[::200], 1)
    assert np.all(np.isfinite(ocean.isotherm_depth(*BOX)))
    assert np.all(np.isfinite(ocean.isotherm_depth([-5.0, -5.0, 5.0, 5.0], [120.0, 280.0, 120.0, 280.0])))


def test_columns_beyond_the_box_are_refused() -> None:
    with pytest.raises(DataError, match="outside the simulated ocean"):
        Ocean.simulate(TIME[:2], 1).columns([0.0], [20.0])
