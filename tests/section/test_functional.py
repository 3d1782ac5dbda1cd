"""The error of a functional against the full covariance matrix, with a known and an unknown mean and a climatology.

The references here form every matrix of the joint Gaussian and condition it; they share no code with the room.
"""

from __future__ import annotations

import numpy as np
import pytest

from profiles import objective_map
from profiles.config import ClimatologyPriorSettings
from profiles.section.functional import functional_error

ROWS, COLUMNS = np.array([-1.5, -0.5, 0.5, 1.5]), np.array([170.5, 175.5, 180.5, 185.5, 190.5])
LATITUDE, LONGITUDE = np.array([0.0, 2.0, -2.0, 0.0]), np.array([168.0, 181.0, 181.0, 195.0])
SIGNAL = {"signal_sd": 12.0, "length_longitude": 15.0, "length_latitude": 3.0}
SCALES = ((0.7, 10.0, 7.0), (0.3, 4.0, 2.0))  # of the correction: share, degrees of longitude, of latitude
PRIOR_SD = np.array([7.5, 5.0, 5.0, 3.0, 3.0])
NOISE = np.array([[4.0, 5.0, 6.0, 4.0], [4.0, np.nan, 6.0, 4.0], [np.nan] * 4, [1.0, 1.0, np.nan, np.nan]])
TIME = np.array(["2031-01-16", "2031-05-16", "2031-08-16", "2031-11-16"], dtype="datetime64[ns]")


def correlation(latitude, longitude, latitude_, longitude_, length_longitude, length_latitude):
    """Return the correlation of every position with every other, element by element."""
    return np.array(
        [
            [
                np.exp(-(((x - x_) / length_longitude) ** 2) - ((y - y_) / length_latitude) ** 2)
                for x_, y_ in zip(longitude_, latitude_, strict=True)
            ]
            for x, y in zip(longitude, latitude, strict=True)
        ]
    )


def seasonal_terms(time):
    """Return 1, cos, sin, cos, sin of the time of year, for the middle of a day of 2031."""
    angle = 2 * np.pi * (time - np.datetime64("2031-01-01")) / np.timedelta64(365, "D")
    return np.array([1.0, np.cos(angle), np.sin(angle), np.cos(2 * angle), np.sin(2 * angle)])


CELLS = tuple(axis.ravel() for axis in np.meshgrid(ROWS, COLUMNS, indexing="ij"))
ALL = np.concatenate([CELLS[0], LATITUDE]), np.concatenate([CELLS[1], LONGITUDE])
PRIOR = 144.0 * correlation(*ALL, *ALL, 15.0, 3.0)
SIZE = CELLS[0].size


@pytest.fixture
def weights():
    drawn = np.random.default_rng(7).normal(size=(3, ROWS.size, COLUMNS.size))
    drawn[0] = 1.0 / drawn[0].size  # the area mean
    drawn[2, :2] = 0.0
    return drawn


@pytest.fixture(params=["known", "estimated"])
def mean(request):
    return request.param


def mapped(mean="known"):
    values = np.where(np.isfinite(NOISE), 1.0, np.nan)
    field = objective_map(
        values, LATITUDE, LONGITUDE, ROWS, COLUMNS, noise_sd=np.nan_to_num(NOISE), mean=mean, **SIGNAL
    )
    return field.assign_coords(time=TIME)


def map_matrix(time, mean):
    """Return the matrix that takes the sites' values to the map, (cell, site), 0 for a site that is missing."""
    here = np.flatnonzero(np.isfinite(NOISE[time]))
    sites = SIZE + here
    inverse = np.linalg.inv(PRIOR[np.ix_(sites, sites)] + np.diag(NOISE[time, here] ** 2))
    matrix = np.zeros((SIZE, LATITUDE.size))
    gain = PRIOR[:SIZE, sites] @ inverse
    if mean == "estimated":
        level = inverse.sum(axis=0) / inverse.sum()
        gain = gain + np.outer(1.0 - gain.sum(axis=1), level)
    matrix[:, here] = gain
    return matrix


def error_covariance(time, mean):
    """Return the covariance of map minus truth: (G H - 1) P (G H - 1)' + G N G'. A mean of any size drops out."""
    gain = map_matrix(time, mean)
    from_truth = np.hstack([-np.eye(SIZE), gain])
    return from_truth @ PRIOR @ from_truth.T + gain @ np.diag(np.nan_to_num(NOISE[time]) ** 2) @ gain.T


@pytest.mark.parametrize("time", [0, 1, 3])
def test_the_error_is_that_of_the_full_covariance_matrix(weights, mean, time):
    flat = weights.reshape(3, -1)
    expected = np.sqrt(np.diag(flat @ error_covariance(time, mean) @ flat.T))
    np.testing.assert_allclose(functional_error(mapped(mean), weights)[time], expected, rtol=1e-8)


def test_without_any_site_the_error_is_that_of_the_signal(weights, mean):
    flat = weights.reshape(3, -1)
    expected = np.sqrt(np.diag(flat @ PRIOR[:SIZE, :SIZE] @ flat.T)) if mean == "known" else np.full(3, np.nan)
    np.testing.assert_allclose(functional_error(mapped(mean), weights)[2], expected)


def test_the_error_of_one_cell_is_the_error_of_the_map(mean):
    field = mapped(mean)
    single = np.eye(SIZE).reshape(SIZE, ROWS.size, COLUMNS.size)
    np.testing.assert_allclose(functional_error(field, single), field["error"].values.reshape(4, -1), rtol=1e-7)


def test_the_error_of_an_area_mean_is_less_than_the_mean_of_the_errors(weights):
    field = mapped()
    area_mean = functional_error(field, weights[:1])[:, 0]
    assert (area_mean < field["error"].mean(("latitude", "longitude")).values).all()


# --------------------------------------------------------------------------------------------------------------
# With a climatology


KNOWN = np.array([0, 1, 3])
OBSERVED = np.array([2.0, 1.0, 0.8, 0.7, 0.9] * 3)  # m, error of each known site's coefficients, as if each were seen


def joint_correction():
    """Condition the correction of the atlas at all positions, (position, harmonic), on being seen at known sites."""
    spatial = sum(share * correlation(*ALL, *ALL, *lengths) for share, *lengths in SCALES)
    prior = np.kron(spatial, np.diag(PRIOR_SD**2))
    seen = (SIZE + KNOWN)[:, None] * 5 + np.arange(5)
    seen = seen.ravel()
    information = np.linalg.inv(prior[np.ix_(seen, seen)] + np.diag(OBSERVED**2))
    return prior - prior[:, seen] @ information @ prior[seen], information


def with_climatology(quantity):
    _, information = joint_correction()
    field = mapped().assign(
        parameter_latitude=("parameter_site", LATITUDE[KNOWN]),
        parameter_longitude=("parameter_site", LONGITUDE[KNOWN]),
        climatology_prior_sd=("harmonic", PRIOR_SD),
        climatology_information=(("parameter", "parameter_"), information),
    )
    (share, *broad), (_, *narrow) = SCALES
    prior = ClimatologyPriorSettings(
        broad_share=share,
        broad_longitude=broad[0],
        broad_latitude=broad[1],
        narrow_longitude=narrow[0],
        narrow_latitude=narrow[1],
    )
    field.attrs |= {"quantity": quantity, "climatology_prior": prior.model_dump_json()}
    return field


@pytest.mark.parametrize("quantity", ["whole", "anomaly", "climatology"])
@pytest.mark.parametrize("time", [0, 1, 2, 3])
def test_the_error_with_a_climatology_is_that_of_the_joint_gaussian(weights, quantity, time):
    """Error of the whole: map error + (cells - G sites) of the climatology's error; of the anomaly: - G sites of it.

    The climatology's error is the seasonal sum of the conditioned correction at cells and sites.
    """
    correction, _ = joint_correction()
    season = np.kron(np.eye(SIZE + LATITUDE.size), seasonal_terms(TIME[time]))
    climatology = season @ correction @ season.T
    gain = map_matrix(time, "known") if np.isfinite(NOISE[time]).any() else np.zeros((SIZE, LATITUDE.size))
    at_cells = np.eye(SIZE) if quantity in ("whole", "climatology") else np.zeros((SIZE, SIZE))
    at_sites = -gain if quantity in ("whole", "anomaly") else np.zeros_like(gain)
    carried = np.hstack([at_cells, at_sites])
    total = error_covariance(time, "known") + carried @ climatology @ carried.T
    flat = weights.reshape(3, -1)
    expected = np.sqrt(np.diag(flat @ total @ flat.T))
    np.testing.assert_allclose(functional_error(with_climatology(quantity), weights)[time], expected, rtol=1e-7)
