"""The map against scikit-learn's Gaussian-process regression with the same covariance.

Source: Pedregosa et al. (2011), J. Machine Learning Research 12, 2825-2830; GaussianProcessRegressor with a fixed
anisotropic RBF kernel, whose exp(-d^2 / (2 l^2)) is our exp(-(d / L)^2) for l = L / sqrt(2).
"""

from __future__ import annotations

import numpy as np
import pytest
from sklearn.gaussian_process import GaussianProcessRegressor
from sklearn.gaussian_process.kernels import RBF, ConstantKernel

from profiles import objective_map

SIGNAL_SD, LENGTH_LONGITUDE, LENGTH_LATITUDE = 12.0, 15.0, 3.0
ROWS, COLUMNS = np.arange(-4.5, 5.0, 1.5), np.arange(125.5, 280.0, 7.0)


@pytest.mark.parametrize("missing", [0.0, 0.4])
def test_map_and_error_are_those_of_gaussian_process_regression(missing):
    random = np.random.default_rng(17)
    latitude, longitude = random.uniform(-5, 5, 30), random.uniform(140, 270, 30)
    values, noise = random.normal(0, 12, (3, 30)), random.uniform(1, 8, (3, 30))
    values[random.random(values.shape) < missing] = np.nan
    field = objective_map(
        values,
        latitude,
        longitude,
        ROWS,
        COLUMNS,
        signal_sd=SIGNAL_SD,
        noise_sd=noise,
        length_longitude=LENGTH_LONGITUDE,
        length_latitude=LENGTH_LATITUDE,
    )
    kernel = ConstantKernel(SIGNAL_SD**2, "fixed") * RBF(
        np.array([LENGTH_LATITUDE, LENGTH_LONGITUDE]) / np.sqrt(2.0), "fixed"
    )
    points = np.array([(row, column) for row in ROWS for column in COLUMNS])
    for time, (value, sd) in enumerate(zip(values, noise, strict=True)):
        seen = np.isfinite(value)
        process = GaussianProcessRegressor(kernel, alpha=sd[seen] ** 2, optimizer=None)
        process.fit(np.column_stack([latitude, longitude])[seen], value[seen])
        mean, error = process.predict(points, return_std=True)
        np.testing.assert_allclose(field["mean"].values[time].ravel(), mean, atol=1e-8)
        np.testing.assert_allclose(field["error"].values[time].ravel(), error, atol=1e-8)
