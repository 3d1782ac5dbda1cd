"""The error of an area mean: simulated, and against figures worked out for a whole array beforehand.

Source of the formulas: Bretherton, Davis and Fandry (1976), Deep-Sea Res. 23, 559-582.
"""

from __future__ import annotations

import numpy as np
import pytest

from profiles import objective_map
from profiles.section.functional import functional_error
from profiles.section.grid import array_grid, cell_area


@pytest.mark.parametrize("mean", ["known", "estimated"])
def test_nine_observations_on_a_line_against_simulation(mean):
    """The pattern of the design's own check: 9 places on 0-100, Gaussian scale 15, noise variance 0.3 of the signal's,
    20 000 draws. The estimate of each draw comes from matrices formed here; the mean of the truth, 5, is to be found
    where it is not known. Sampling error of a variance from 20 000 draws: 1 %."""
    random = np.random.default_rng(1976)
    places = np.sort(random.uniform(0, 100, 9))
    line = np.arange(0.5, 100.0)
    everywhere = np.concatenate([line, places])
    prior = np.exp(-((np.subtract.outer(everywhere, everywhere) / 15.0) ** 2))
    root = np.linalg.cholesky(prior + 1e-9 * np.eye(everywhere.size))
    inverse = np.linalg.inv(prior[100:, 100:] + 0.3 * np.eye(9))
    level = 0.0 if mean == "known" else 5.0
    truth = level + root @ random.normal(size=(everywhere.size, 20_000))
    seen = truth[100:] + np.sqrt(0.3) * random.normal(size=(9, 20_000))
    guess = inverse.sum(axis=0) @ seen / inverse.sum() if mean == "estimated" else 0.0
    mapped = guess + prior[:100, 100:] @ inverse @ (seen - guess)
    simulated = (mapped.mean(axis=0) - truth[:100].mean(axis=0)).std()

    field = objective_map(
        np.zeros((1, 9)),
        np.zeros(9),
        places,
        [0.0],
        line,
        signal_sd=1.0,
        noise_sd=np.sqrt(0.3),
        length_longitude=15.0,
        length_latitude=1.0,
        mean=mean,
    )
    stated = functional_error(field, np.full((1, 1, 100), 0.01)).item()
    assert stated == pytest.approx(simulated, rel=0.03)
    single = np.zeros((1, 1, 100))
    single[0, 0, 37] = 1.0
    assert functional_error(field, single).item() == pytest.approx((mapped[37] - truth[37]).std(), rel=0.03)


@pytest.mark.parametrize(
    ("noise_share", "mean", "expected"),
    [(0.1, "known", 0.8), (0.1, "estimated", 0.8), (0.3, "known", 1.1), (0.3, "estimated", 1.15), (1.78, "known", 1.9)],
)
def test_the_error_of_the_box_mean_from_55_sites(noise_share, mean, expected):
    """Worked out for the design: 55 sites, 11 longitudes by 5 latitudes within 5 degrees, scales 15 by 3 degrees,
    signal 12 m. The longitudes are not recorded; evenly spaced from 137E to 95W as here,
    the table holds within a fifth."""
    latitude, longitude = (
        axis.ravel() for axis in np.meshgrid([-5.0, -2.0, 0.0, 2.0, 5.0], np.linspace(137.0, 265.0, 11), indexing="ij")
    )
    rows, columns = array_grid()
    field = objective_map(
        np.zeros((1, 55)),
        latitude,
        longitude,
        rows,
        columns,
        signal_sd=12.0,
        noise_sd=12.0 * np.sqrt(noise_share),
        length_longitude=15.0,
        length_latitude=3.0,
        mean=mean,
    )
    area = cell_area(np.arange(-5.0, 6.0), np.arange(120.0, 281.0))
    assert functional_error(field, (area / area.sum())[None]).item() == pytest.approx(expected, rel=0.2)


def test_without_data_the_box_mean_varies_by_3_2_m():
    """Worked out for the design: 3.2 m under that covariance."""
    rows, columns = array_grid()
    scales = {"signal_sd": 12.0, "length_longitude": 15.0, "length_latitude": 3.0}
    field = objective_map([[np.nan]], [0.0], [180.0], rows, columns, noise_sd=1.0, **scales)
    area = cell_area(np.arange(-5.0, 6.0), np.arange(120.0, 281.0))
    assert functional_error(field, (area / area.sum())[None]).item() == pytest.approx(3.2, abs=0.1)
