"""How tilt and volume answer to single values, against the map itself."""

from __future__ import annotations

import runpy
from pathlib import Path

import numpy as np
import pytest

from profiles.config import SectionSettings
from profiles.drill.array import SITES
from profiles.section import build_section
from profiles.section.grid import array_grid, sea_area
from profiles.section.response import ErrorsOfValues, Response
from profiles.section.tilt import tilt_weights

BENCH = runpy.run_path(str(Path(__file__).parents[1] / "bench" / "section_coverage.py"))
FEW_LINES = tuple(site for site in SITES if site.longitude in (149.0, 188.0, 227.0, 266.0))
SETTINGS = SectionSettings()


@pytest.fixture(scope="module")
def monthly():
    random = np.random.default_rng(6)
    oceans = BENCH["Oceans"](FEW_LINES, 15)
    return oceans.monthly(oceans.draw(random)[0], random)


@pytest.fixture(scope="module")
def response(monthly):
    rows, columns = array_grid()
    return Response.of(monthly, np.stack([tilt_weights(rows, columns), sea_area(rows, columns)]), SETTINGS)


def estimates(monthly):
    built = build_section(monthly, SETTINGS)
    return np.stack([built.section["thermocline_slope"], built.volume["warm_water_volume"].sel(region="total")])


def test_the_kernels_are_what_the_map_does_to_a_change_of_the_values(monthly, response):
    random = np.random.default_rng(1)
    values = monthly["isotherm_depth"].astype(np.float64)
    change = random.normal(size=values.shape)
    moved = estimates(monthly.assign(isotherm_depth=values + change)) - estimates(monthly.assign(isotherm_depth=values))
    present = np.where(np.isfinite(values), change, 0.0).T
    told = np.stack([(kernel * present).sum(axis=(1, 2)) for _, kernel in response.kernels()], axis=1)
    size = abs(moved).max(axis=1, keepdims=True)
    np.testing.assert_allclose(told / size, moved / size, atol=1e-7)


def test_the_mean_kernel_is_the_mean_of_the_kernels(response):
    mean = np.mean([kernel for _, kernel in response.kernels()], axis=0)
    np.testing.assert_allclose(response.mean_kernel, mean)


def test_errors_of_values_add_up_as_they_are_alike():
    """Two months, two sites, weights 1: independent 3 four times, persistent 2 doubled at a site, common 1 fourfold."""
    kernel, ones = np.ones((1, 2, 2)), np.ones((2, 2))
    deployment = np.ones((2, 2), np.int64)
    nothing = 0.0 * ones
    assert ErrorsOfValues(3.0 * ones, nothing, deployment).variance(kernel) == 4 * 9.0
    assert ErrorsOfValues(nothing, 2.0 * ones, deployment).variance(kernel) == 2 * (2 * 2.0) ** 2
    assert ErrorsOfValues(nothing, 2.0 * ones, np.array([[1, 1], [2, 2]])).variance(kernel) == 4 * 4.0
    assert ErrorsOfValues(nothing, nothing, deployment, ones).variance(kernel) == (4 * 1.0) ** 2
    assert (
        ErrorsOfValues(3.0 * ones, np.nan * ones, deployment).with_persistent(4.0).variance(kernel) == 36.0 + 2 * 64.0
    )


def test_the_error_of_the_mean_holds_on_oceans_of_the_maps_own_assumptions(monthly):
    """Sixteen oceans: z of the mean tilt and volume has an rms about 1, uncertain by 1 / sqrt(32) = 0.18."""
    random = np.random.default_rng(12)
    oceans = BENCH["Oceans"](FEW_LINES, 15)
    rows, columns = array_grid()
    weights = np.stack([tilt_weights(rows, columns), sea_area(rows, columns)])
    seasons = BENCH["harmonic_design"](BENCH["year_fraction"](oceans.time)) @ oceans.atlas.T
    departures = []
    for _ in range(16):
        whole, _ = oceans.draw(random)
        drawn = oceans.monthly(whole, random)
        response = Response.of(drawn, weights, SETTINGS)
        # The estimate is the atlas plus the kernel times what the sites depart from it.
        departed = drawn["isotherm_depth"].values.T - seasons[:, -len(FEW_LINES) :]
        found = (response.mean_kernel * np.nan_to_num(departed)).sum(axis=(1, 2))
        true = np.einsum("frc,trc->tf", weights, cells_of(whole - seasons, rows, columns)).mean(axis=0)
        departures.append((found - true) / response.mean_error())
    rms = np.sqrt((np.array(departures) ** 2).mean(axis=0))
    assert ((rms > 0.55) & (rms < 1.5)).all(), rms


def cells_of(field, rows, columns):
    """The drawn field at the cells; the sites stand behind them."""
    return np.asarray(field)[:, : rows.size * columns.size].reshape(-1, rows.size, columns.size)
