"""The climatology: conditional means by brute force, and what it becomes with perfect data and with none."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest

from profiles.config import ClimatologyPriorSettings, SectionSettings
from profiles.section.climatology import Records, atlas_isotherm, estimate_climatology

SETTINGS = SectionSettings()
ROWS, COLUMNS = np.array([-0.5, 0.5]), np.array([175.5, 176.5, 205.5])
CELLS = tuple(axis.ravel() for axis in np.meshgrid(ROWS, COLUMNS, indexing="ij"))
PRIOR_SD = np.array([7.5, 5.0, 5.0, 3.0, 3.0])


def middles(months, start="2031-01"):
    begin = pd.date_range(start, periods=months + 1, freq="MS")
    return (begin[:-1] + (begin[1:] - begin[:-1]) / 2).to_numpy().astype("datetime64[ns]")


def seasonal_terms(time):
    """Return 1, cos, sin, cos, sin of the time of year, (time, 5), from the calendar."""
    stamps = pd.DatetimeIndex(time)
    year = stamps.year.map(lambda number: 366 if number % 4 == 0 else 365).to_numpy()
    day = (stamps.day_of_year + stamps.hour / 24.0).to_numpy() - 1.0
    angle = 2 * np.pi * day / year
    return np.stack([np.ones_like(angle), np.cos(angle), np.sin(angle), np.cos(2 * angle), np.sin(2 * angle)], axis=-1)


def records(values, latitude, longitude, *, months=None, independent=4.0, persistent=2.0, deployment=None):
    values = np.asarray(values, dtype=float)
    present = np.isfinite(values)
    return Records(
        time=middles(len(values)) if months is None else months,
        latitude=np.asarray(latitude, dtype=float),
        longitude=np.asarray(longitude, dtype=float),
        values=values,
        independent=np.where(present, independent, np.nan),
        persistent=np.where(present, persistent, np.nan),
        deployment=np.ones(values.shape, dtype=int) if deployment is None else deployment,
    )


def estimate(given, settings=SETTINGS):
    return estimate_climatology(given, ROWS, COLUMNS, 20.0, settings)


def correlation(one, other, length_longitude, length_latitude):
    north = np.subtract.outer(one[0], other[0]) / length_latitude
    east = np.subtract.outer(one[1], other[1]) / length_longitude
    return np.exp(-(north**2) - east**2)


def correction(one, other):
    """The correlation of the correction that the defaults state."""
    return 0.57 * correlation(one, other, 34.0, 14.0) + 0.43 * correlation(one, other, 6.0, 2.5)


def test_the_estimate_is_the_conditional_mean_of_a_gaussian():
    """Brute force: the joint Gaussian of every value of two records and the coefficients at sites and cells.

    values = terms (atlas + p) + anomaly + deployment offset + noise, with the covariances that the settings state.
    """
    random = np.random.default_rng(4)
    places = np.array([0.0, 2.0]), np.array([170.0, 180.0])
    atlas = atlas_isotherm(*places, 20.0)
    time, terms = middles(20), seasonal_terms(middles(20))
    deployment = np.where(np.arange(20)[:, None] < [8, 12], 1, 2)
    values = terms @ atlas.T + random.normal(0, 12, (20, 2)) + [10.0, -5.0]
    values[3, 0] = values[10:13, 1] = np.nan
    found = estimate(records(values, *places, deployment=deployment))

    month, site = np.nonzero(np.isfinite(values))
    days = (time - time[0]) / np.timedelta64(1, "D")
    apart = np.abs(np.subtract.outer(days[month], days[month])) / 30.4375
    near = correlation(places, places, 15.0, 3.0)[np.ix_(site, site)]
    same_site = np.equal.outer(site, site)
    same_deployment = same_site & np.equal.outer(deployment[month, site], deployment[month, site])
    noise = 144.0 * np.exp(-apart / 4.0) * near + 4.0 * same_deployment + 16.0 * np.eye(month.size)

    everywhere = tuple(np.concatenate(axis) for axis in zip(places, CELLS, strict=True))
    prior = np.kron(correction(everywhere, everywhere), np.diag(PRIOR_SD**2))
    seen = np.zeros((month.size, prior.shape[0]))
    for row, (m, s) in enumerate(zip(month, site, strict=True)):
        seen[row, 5 * s : 5 * s + 5] = terms[m]
    gain = prior @ seen.T @ np.linalg.inv(seen @ prior @ seen.T + noise)
    # The room condenses each record to its 5 projections, of which nothing is lost for a white error; for anomalies
    # with memory the projections hold a little less, so its error may not be below that of all values together.
    all_values = prior - gain @ seen @ prior
    projected = np.zeros((10, month.size))
    for s in range(2):
        projected[5 * s : 5 * s + 5, site == s] = terms[month[site == s]].T / (site == s).sum()
    condensed = projected @ seen
    gain = prior @ condensed.T @ np.linalg.inv(condensed @ prior @ condensed.T + projected @ noise @ projected.T)
    departure = projected @ (values - terms @ atlas.T)[month, site]
    mean, covariance = (gain @ departure).reshape(-1, 5), prior - gain @ condensed @ prior

    np.testing.assert_allclose(found.at_sites, atlas + mean[:2], rtol=1e-6)
    at_cells = (atlas_isotherm(*CELLS, 20.0) + mean[2:]).T.reshape(5, 2, 3)
    np.testing.assert_allclose(found.at_cells, at_cells, rtol=1e-6)
    error = np.sqrt(np.diag(covariance).reshape(-1, 5)[2:].T.reshape(5, 2, 3))
    np.testing.assert_allclose(found.cell_error, error, rtol=1e-6)
    best = np.sqrt(np.diag(all_values).reshape(-1, 5)[2:].T.reshape(5, 2, 3))
    assert (found.cell_error >= best - 1e-9).all()
    assert (found.cell_error < 1.1 * best).all()


def test_perfect_records_give_their_own_harmonics():
    """Five years without noise, anomalies of a micrometre: the records' coefficients, whatever the atlas says."""
    perfect = SectionSettings(signal_sd=1e-6, small_scale_sd=0.0)
    coefficients = np.array([[140.0, 6.0, -4.0, 2.0, 1.0], [90.0, -3.0, 5.0, 1.0, -2.0]])
    terms = seasonal_terms(middles(60))
    given = records(terms @ coefficients.T, [0.0, 0.0], [170.0, 220.0], independent=1e-6, persistent=0.0)
    np.testing.assert_allclose(estimate(given, perfect).at_sites, coefficients, atol=0.02)


def test_a_missing_summer_does_not_bias_a_perfect_record():
    perfect = SectionSettings(signal_sd=1e-6, small_scale_sd=0.0)
    coefficients = np.array([140.0, 6.0, -4.0, 2.0, 1.0])
    values = (seasonal_terms(middles(60)) @ coefficients)[:, None]
    values[5:8] = np.nan
    given = records(values, [0.0], [170.0], independent=1e-6, persistent=0.0)
    np.testing.assert_allclose(estimate(given, perfect).at_sites[0], coefficients, atol=0.02)


def test_without_a_long_record_the_climatology_is_the_atlas():
    values = np.full((24, 2), 100.0)
    values[11:, 0] = np.nan  # eleven months
    values[:, 1] = np.nan
    found = estimate(records(values, [0.0, 0.0], [170.0, 220.0]))
    assert found.known.size == 0
    np.testing.assert_allclose(found.at_sites, atlas_isotherm(np.zeros(2), np.array([170.0, 220.0]), 20.0))
    np.testing.assert_allclose(found.at_cells, atlas_isotherm(*CELLS, 20.0).T.reshape(5, 2, 3))
    np.testing.assert_allclose(found.cell_error, np.broadcast_to(PRIOR_SD[:, None, None], (5, 2, 3)))


@pytest.mark.parametrize(("months", "known"), [(11, [1]), (12, [0, 1])])
def test_a_record_enters_from_twelve_months_on(months, known):
    values = np.full((24, 2), 150.0)
    values[months:, 0] = np.nan
    assert estimate(records(values, [0.0, 0.0], [170.0, 220.0])).known.tolist() == known


def test_a_site_without_a_record_takes_what_its_neighbours_give():
    places = np.zeros(2), np.array([170.0, 172.0])
    atlas = atlas_isotherm(*places, 20.0)
    values = seasonal_terms(middles(72)) @ atlas.T + 8.0
    values[:, 1] = np.nan
    shift = (estimate(records(values, *places)).at_sites - atlas)[:, 0]
    # Its neighbour lies 2 degrees off: the correction falls off as 0.57 exp(-(2 / 34)^2) + 0.43 exp(-(2 / 6)^2).
    assert 3.0 < shift[0] < 8.0
    assert shift[1] == pytest.approx(shift[0] * (0.57 * np.exp(-((2 / 34) ** 2)) + 0.43 * np.exp(-1 / 9)))


def test_the_error_is_nowhere_above_the_prior_and_less_with_a_longer_record():
    values = np.full((72, 1), 150.0)
    long, short = (estimate(records(values[:n], [0.0], [176.0])).cell_error for n in (72, 24))
    assert (long <= PRIOR_SD[:, None, None] + 1e-9).all()
    assert (long[:, :, 0] < short[:, :, 0]).all()
    assert (long[:, :, 0] < long[:, :, 2]).all()  # 30 degrees away


def test_the_atlas_isotherm_is_deep_in_the_west_and_shallow_in_the_east():
    # Common practice, no source: about 150 to 180 m at 165E, 40 to 60 m at 95W.
    mean = atlas_isotherm(np.zeros(2), np.array([165.0, 265.0]), 20.0)[:, 0]
    assert 140.0 < mean[0] < 190.0
    assert 30.0 < mean[1] < 75.0


def test_a_tight_prior_holds_on_to_the_atlas():
    tight = SectionSettings(climatology=ClimatologyPriorSettings(mean_sd=0.01, annual_sd=0.01, semiannual_sd=0.01))
    places = np.zeros(1), np.array([170.0])
    found = estimate(records(np.full((72, 1), 250.0), *places), tight)
    np.testing.assert_allclose(found.at_sites, atlas_isotherm(*places, 20.0), atol=0.01)


def test_the_seasonal_values_are_those_of_the_coefficients():
    found = estimate(records(np.full((24, 1), 150.0), [0.0], [170.0]))
    time = middles(5, "2033-04")
    np.testing.assert_allclose(found.sites_at(time), seasonal_terms(time) @ found.at_sites.T)
    np.testing.assert_allclose(found.cells_at(time), np.einsum("th,hrc->trc", seasonal_terms(time), found.at_cells))
