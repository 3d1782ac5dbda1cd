"""The covariance that the map assumes, and the errors of linear functionals that follow from it."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import LinAlgError, cho_factor, cho_solve

from profiles.errors import DataError

Array = NDArray[np.float64]


@dataclass(frozen=True)
class Gaussian:
    """The correlation exp(-(dlon / length_longitude)^2 - (dlat / length_latitude)^2), lengths in degrees."""

    length_longitude: float
    length_latitude: float

    def along(self, latitude: Array, latitude_: Array) -> Array:
        """Return the factor in latitude, (positions, positions_)."""
        return np.exp(-(((latitude[:, None] - latitude_) / self.length_latitude) ** 2))

    def across(self, longitude: Array, longitude_: Array) -> Array:
        """Return the factor in longitude, (positions, positions_)."""
        return np.exp(-(((longitude[:, None] - longitude_) / self.length_longitude) ** 2))

    def between(self, latitude: Array, longitude: Array, latitude_: Array, longitude_: Array) -> Array:
        """Return the correlation of every position with every other, (positions, positions_)."""
        return self.along(latitude, latitude_) * self.across(longitude, longitude_)

    def with_functionals(self, latitude: Array, longitude: Array, weights: Array, rows: Array, columns: Array) -> Array:
        """Return the correlation of positions with weighted sums over a grid, (positions, functional).

        ``weights`` is (functional, rows, columns), 0 where a cell does not count.
        """
        return np.einsum(
            "pr,frc,pc->pf", self.along(latitude, rows), weights, self.across(longitude, columns), optimize=True
        )

    def of_functionals(self, weights: Array, rows: Array, columns: Array) -> Array:
        """Return the variance of weighted sums over a grid whose cells have variance 1, (functional,)."""
        smoothed = np.einsum(
            "rs,fsd,cd->frc", self.along(rows, rows), weights, self.across(columns, columns), optimize=True
        )
        return np.einsum("frc,frc->f", weights, smoothed)


@dataclass(frozen=True)
class TwoScales:
    """A correlation of which ``broad_share`` is that of ``broad`` and the rest that of ``narrow``; methods as
    :class:`Gaussian` has."""

    broad_share: float
    broad: Gaussian
    narrow: Gaussian

    @property
    def _parts(self) -> tuple[tuple[float, Gaussian], ...]:
        return (self.broad_share, self.broad), (1.0 - self.broad_share, self.narrow)

    def between(self, latitude: Array, longitude: Array, latitude_: Array, longitude_: Array) -> Array:
        """Return the correlation of every position with every other, (positions, positions_)."""
        places = latitude, longitude, latitude_, longitude_
        return np.asarray(sum(share * part.between(*places) for share, part in self._parts))

    def with_functionals(self, latitude: Array, longitude: Array, weights: Array, rows: Array, columns: Array) -> Array:
        """Return the correlation of positions with weighted sums over a grid, (positions, functional)."""
        arguments = latitude, longitude, weights, rows, columns
        return np.asarray(sum(share * part.with_functionals(*arguments) for share, part in self._parts))

    def of_functionals(self, weights: Array, rows: Array, columns: Array) -> Array:
        """Return the variance of weighted sums over a grid whose cells have variance 1, (functional,)."""
        return np.asarray(sum(share * part.of_functionals(weights, rows, columns) for share, part in self._parts))


@dataclass(frozen=True)
class Observed:
    """Times at which the same sites reported with the same noise."""

    times: NDArray[np.intp]
    sites: NDArray[np.intp]
    noise: Array


def same_networks(noise: Array) -> Iterator[Observed]:
    """Group the rows of ``noise`` (time, site), NaN where a site gave nothing, into equal networks."""
    comparable = np.where(np.isfinite(noise), noise, -1.0)
    networks, group = np.unique(comparable, axis=0, return_inverse=True)
    for number, network in enumerate(networks):
        sites = np.flatnonzero(network >= 0.0)
        yield Observed(np.flatnonzero(group.ravel() == number), sites, network[sites])


@dataclass(frozen=True)
class Solver:
    """The data covariance of one network, factored."""

    factor: tuple[Array, bool]

    @classmethod
    def of(cls, correlation: Array, signal_sd: float, noise: Array) -> Solver:
        """Factor signal_sd^2 correlation + noise^2; raise DataError where that is singular."""
        covariance = signal_sd**2 * correlation + np.diag(noise**2)
        try:
            return cls(cho_factor(covariance, lower=True))
        except LinAlgError:
            raise DataError(
                "the sites cannot be told apart by the map",
                where="noise_sd",
                expected="noise above 0, or no two sites at one place",
                found="a singular data covariance",
                advice="give the noise of the values, or join the sites that coincide",
            ) from None

    def solve(self, right: Array) -> Array:
        """Return the inverse of the data covariance times ``right`` (site, ...)."""
        if right.shape[0] == 0:
            return right
        return np.asarray(cho_solve(self.factor, right), dtype=np.float64)
