"""The standard error of any linear functional of a mapped field.

A field is the dataset that :func:`profiles.section.objective_map` returns. Where it also carries a climatology
(:mod:`profiles.section.climatology`), the error of the climatology counts: of the anomaly, because the climatology was
taken off the values at the sites; of the whole, because it was added to the map again, where much of it cancels.
"""

from __future__ import annotations

from typing import Any

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from profiles.config import ClimatologyPriorSettings
from profiles.section.climatology import correction_scales
from profiles.section.covariance import Gaussian, Solver, same_networks
from profiles.statistics import harmonic_design, year_fraction

Array = NDArray[np.float64]

#: What a field with a climatology is: its attribute ``quantity`` says which share of the climatology's error counts,
#: at the cells and at the sites.
QUANTITIES = {"whole": (1.0, -1.0), "anomaly": (0.0, -1.0), "climatology": (1.0, 0.0)}


def functional_error(field: xr.Dataset, weights: Array) -> Array:
    """Return the standard error of weighted sums over a mapped field.

    Parameters
    ----------
    field : xarray.Dataset
        As :func:`profiles.section.objective_map` returns it, on (time, latitude, longitude).
    weights : ndarray, shape (functional, latitude, longitude)
        0 where a cell does not count.

    Returns
    -------
    ndarray, shape (time, functional)
        In the unit of field times weight. It follows from the covariance of the map's error, so that errors of
        neighbouring cells count as the alike things they are.
    """
    rows, columns = field["latitude"].values, field["longitude"].values
    site_latitude, site_longitude = field["site_latitude"].values, field["site_longitude"].values
    signal_sd = field.attrs["signal_sd"]
    correlation = Gaussian(field.attrs["length_longitude"], field.attrs["length_latitude"])
    between = correlation.between(site_latitude, site_longitude, site_latitude, site_longitude)
    with_sites = signal_sd**2 * correlation.with_functionals(site_latitude, site_longitude, weights, rows, columns)
    prior = signal_sd**2 * correlation.of_functionals(weights, rows, columns)
    unknown_mean = field.attrs["mean_of_signal"] == "estimated"
    climatology = _ClimatologyError.of(field, weights) if "climatology_information" in field else None
    variance = np.empty((field.sizes["time"], weights.shape[0]))
    for network in same_networks(field["site_noise"].values):
        sites, times = network.sites, network.times
        solver = Solver.of(between[np.ix_(sites, sites)], signal_sd, network.noise)
        gains = solver.solve(with_sites[sites])
        variance[times] = prior - np.einsum("sf,sf->f", with_sites[sites], gains)
        if unknown_mean:
            variance[times] += _mean_variance(solver, weights, gains)
        if climatology is not None:
            variance[times] += climatology.variance(times, sites, gains)
    return np.sqrt(np.maximum(variance, 0.0))


def _mean_variance(solver: Solver, weights: Array, gains: Array) -> Array:
    if gains.shape[0] == 0:
        return np.full(weights.shape[0], np.nan)
    lacking = weights.sum(axis=(1, 2)) - gains.sum(axis=0)
    return np.asarray(lacking**2 / solver.solve(np.ones(gains.shape[0])).sum())


class _ClimatologyError:
    """The error of the climatology in a functional of one field.

    Parameters p = (site, harmonic) of the data; K their information; a functional weighs the correction field with q,
    at the cells and at the sites. Its error variance is q'Sq - v'Kv with v = S(p, .) q, S the prior covariance.
    """

    def __init__(self, field: xr.Dataset, weights: Array, at_cells: float, at_sites: float) -> None:
        self.at_sites = at_sites
        self.information = field["climatology_information"].values
        self.prior = field["climatology_prior_sd"].values ** 2
        self.design = harmonic_design(year_fraction(field["time"].values))
        prior = ClimatologyPriorSettings.model_validate_json(field.attrs["climatology_prior"])
        correlation = correction_scales(prior)
        cells: Any = (at_cells * weights, field["latitude"].values, field["longitude"].values)
        sites = field["site_latitude"].values, field["site_longitude"].values
        known = field["parameter_latitude"].values, field["parameter_longitude"].values
        self.cells_cells = correlation.of_functionals(*cells)
        self.sites_cells = correlation.with_functionals(*sites, *cells)
        self.known_cells = correlation.with_functionals(*known, *cells)
        self.sites_sites = correlation.between(*sites, *sites)
        self.known_sites = correlation.between(*known, *sites)

    @classmethod
    def of(cls, field: xr.Dataset, weights: Array) -> _ClimatologyError:
        return cls(field, weights, *QUANTITIES[field.attrs["quantity"]])

    def variance(self, times: NDArray[np.intp], sites: NDArray[np.intp], gains: Array) -> Array:
        """Return the variance at ``times`` under a network's ``gains`` (site, functional), as (time, functional)."""
        at_sites = self.at_sites * gains
        spatial = (
            self.cells_cells
            + 2.0 * np.einsum("sf,sf->f", self.sites_cells[sites], at_sites)
            + np.einsum("sf,st,tf->f", at_sites, self.sites_sites[np.ix_(sites, sites)], at_sites)
        )
        known = self.known_cells + self.known_sites[:, sites] @ at_sites
        design = self.design[times]
        prior = np.einsum("tk,k->t", design**2, self.prior)[:, None] * spatial
        seen = np.einsum("pf,tk->tpkf", known, design * self.prior)
        seen = seen.reshape(times.size, -1, known.shape[1])
        return np.asarray(prior - np.einsum("tpf,pq,tqf->tf", seen, self.information, seen, optimize=True))
