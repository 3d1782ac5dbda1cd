"""How tilt, volume and section answer to what the sites read: the part of their errors that is measurement alone.

The estimate of a functional of the map is linear in the monthly values d: the climatology's correction is gain times
X'(d - atlas) / n, the map takes the rest to the cells. So F(t) = sum over months t' and sites s of K(t; t', s) d(t', s)
plus a constant, and an error of the values comes out as K times it. What :mod:`profiles.section.functional` states
counts besides what the sites cannot see; here that is left out, or, for a mean over the whole record, added up.
"""

from __future__ import annotations

from collections.abc import Iterator
from copy import copy
from dataclasses import dataclass
from functools import cached_property

import numpy as np
import xarray as xr
from numpy.typing import NDArray
from scipy.sparse import csr_array

from profiles.config import SectionSettings
from profiles.section.array import map_records
from profiles.section.climatology import Climatology, Records, correction_scales, memory
from profiles.section.covariance import Gaussian, Solver, same_networks
from profiles.statistics import harmonic_design, year_fraction

Array = NDArray[np.float64]


@dataclass(frozen=True)
class Response:
    """The answer of weighted sums over the map of one array to its monthly values.

    ``weights`` is (functional, latitude, longitude). Make it with :meth:`of`.
    """

    weights: Array
    records: Records
    climatology: Climatology
    field: xr.Dataset
    settings: SectionSettings

    @classmethod
    def of(cls, monthly: xr.Dataset, weights: Array, settings: SectionSettings, *, isotherm: float = 20.0) -> Response:
        """Return the response of the array that :func:`profiles.section.build_section` would map."""
        records, climatology, field = map_records(monthly, settings, isotherm)
        return cls(np.asarray(weights, dtype=np.float64), records, climatology, field, settings)

    def kernels(self) -> Iterator[tuple[int, Array]]:
        """Yield each month's place and its K, (functional, month, site)."""
        gains = self._gains()
        at_cells = self._correlation(self.weights)
        at_sites = self._known_to_sites()
        design = harmonic_design(year_fraction(self.records.time))
        shape = (len(self.weights), *self.climatology.projected.shape[::2])
        for time, gain in enumerate(gains):
            # (functional, known site, harmonic): what a weight of the correction adds to the functional.
            added = (at_cells - at_sites @ gain).T[:, :, None] * design[time] * self.climatology.prior_sd**2
            through = (added.reshape(len(self.weights), -1) @ self.climatology.gain).reshape(shape)
            kernel = np.zeros((len(self.weights), *self.records.values.shape))
            kernel[:, :, self.climatology.known] = np.einsum(
                "fsh,sth->fts", through, self.climatology.projected, optimize=True
            )
            kernel[:, time] += gain.T
            yield time, kernel

    @cached_property
    def mean_kernel(self) -> Array:
        """The K of the mean over all months, (functional, month, site)."""
        total = np.zeros((len(self.weights), *self.records.values.shape))
        for _, kernel in self.kernels():
            total += kernel
        return total / self.records.time.size

    def measurement_error(self, errors: ErrorsOfValues) -> Array:
        """Return the standard error that errors of the values bring, (month, functional)."""
        return np.sqrt(np.stack([errors.variance(kernel) for _, kernel in self.kernels()]))

    def mean_measurement_error(self, errors: ErrorsOfValues) -> Array:
        """Return the same of the mean over all months, (functional,)."""
        return np.sqrt(errors.variance(self.mean_kernel))

    def mean_error(self) -> Array:
        """Return the standard error of the functionals' means over all months, (functional,).

        With K of the mean: errors of the values; the anomalies, which K sees at the sites and which have a memory of
        the settings' months; the climatology's departure from the atlas, which does not average out.
        """
        kernel = self.mean_kernel
        records = self.records
        errors = ErrorsOfValues(records.independent, records.persistent, records.deployment)
        return np.sqrt(errors.variance(kernel) + self._unseen_anomalies(kernel) + self._unseen_climatology(kernel))

    def _unseen_anomalies(self, kernel: Array) -> Array:
        together = memory(self.records.time, self.settings.climatology)
        signal = Gaussian(self.settings.length_longitude, self.settings.length_latitude)
        sites = self.records.latitude, self.records.longitude
        between = signal.between(*sites, *sites)
        with_cells = signal.with_functionals(*sites, self.weights, *self._axes())
        months = self.records.time.size
        seen = np.einsum("ftp,tu,fus,ps->f", kernel, together, kernel, between, optimize=True)
        shared = np.einsum("fts,t,sf->f", kernel, together.mean(axis=1), with_cells, optimize=True)
        whole = signal.of_functionals(self.weights, *self._axes()) * together.sum() / months**2
        return np.asarray(self.settings.signal_sd**2 * (seen - 2.0 * shared + whole))

    def _unseen_climatology(self, kernel: Array) -> Array:
        design = harmonic_design(year_fraction(self.records.time))
        scales = correction_scales(self.settings.climatology)
        sites = self.records.latitude, self.records.longitude
        between = scales.between(*sites, *sites)
        with_cells = scales.with_functionals(*sites, self.weights, *self._axes())
        seen = np.einsum("fts,th->fsh", kernel, design)
        mean = design.mean(axis=0)
        variance = (
            np.einsum("fph,ps,fsh->fh", seen, between, seen, optimize=True)
            - 2.0 * mean * np.einsum("fsh,sf->fh", seen, with_cells)
            + mean**2 * scales.of_functionals(self.weights, *self._axes())[:, None]
        )
        return np.asarray(variance @ self.climatology.prior_sd**2)

    def _axes(self) -> tuple[Array, Array]:
        return self.field["latitude"].values, self.field["longitude"].values

    def _correlation(self, weights: Array) -> Array:
        """Return the correlation of the climatology at known sites with the functionals, (known site, functional)."""
        known = self.climatology.known
        places = self.records.latitude[known], self.records.longitude[known]
        return correction_scales(self.settings.climatology).with_functionals(*places, weights, *self._axes())

    def _known_to_sites(self) -> Array:
        known = self.climatology.known
        sites = self.records.latitude, self.records.longitude
        return correction_scales(self.settings.climatology).between(sites[0][known], sites[1][known], *sites)

    def _gains(self) -> Array:
        """Return the weights of the anomalies at the sites in the functionals, (month, site, functional)."""
        field = self.field
        sites = self.records.latitude, self.records.longitude
        signal = Gaussian(field.attrs["length_longitude"], field.attrs["length_latitude"])
        signal_sd = field.attrs["signal_sd"]
        between = signal.between(*sites, *sites)
        with_cells = signal_sd**2 * signal.with_functionals(*sites, self.weights, *self._axes())
        gains = np.zeros((self.records.time.size, sites[0].size, len(self.weights)))
        for network in same_networks(field["site_noise"].values):
            solver = Solver.of(between[np.ix_(network.sites, network.sites)], signal_sd, network.noise)
            gains[np.ix_(network.times, network.sites)] = solver.solve(with_cells[network.sites])
        return gains


class ErrorsOfValues:
    """The covariance of the errors of monthly values.

    Parameters
    ----------
    independent, persistent, common : ndarray, shape (month, site)
        Standard deviation of what is independent from month to month and from site to site; of what stays through a
        site's deployment; and of what all sites and months have in common. NaN is 0.
    deployment : ndarray of int, shape (month, site)
    """

    def __init__(
        self, independent: Array, persistent: Array, deployment: NDArray[np.integer], common: Array | None = None
    ) -> None:
        self.independent = np.nan_to_num(independent)
        self.persistent = np.nan_to_num(persistent)
        self.common = np.zeros_like(self.persistent) if common is None else np.nan_to_num(common)
        months, sites = deployment.shape
        of_site = deployment.astype(np.int64) + np.arange(sites) * (int(deployment.max()) + 1)
        _, group = np.unique(of_site.ravel(), return_inverse=True)
        ones = (np.ones(months * sites), (np.arange(months * sites), group.ravel()))
        self.groups = csr_array(ones, shape=(months * sites, int(group.max()) + 1))

    def with_persistent(self, sd: float) -> ErrorsOfValues:
        """Return the same errors with another of ``sd`` that stays through a deployment, at every site."""
        added = copy(self)
        added.persistent = np.hypot(self.persistent, sd)
        return added

    @property
    def of_values(self) -> Array:
        """The standard deviation of each value, (month, site)."""
        return np.sqrt(self.independent**2 + self.persistent**2 + self.common**2)

    def variance(self, kernel: Array) -> Array:
        """Return the variance of sums of the values with ``kernel`` (functional, month, site), (functional,)."""
        own = ((kernel * self.independent) ** 2).sum(axis=(1, 2))
        lasting = (kernel * self.persistent).reshape(len(kernel), -1)
        together = (self.groups.T @ lasting.T).T
        alike = (kernel * self.common).sum(axis=(1, 2))
        return np.asarray(own + (together**2).sum(axis=1) + alike**2)
