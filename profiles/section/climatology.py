"""The seasonal climatology of the isotherm depth: harmonics of the record, shrunk towards the packaged atlas.

The climatology is the atlas plus a correction. Each harmonic coefficient of the correction is a Gaussian field of known
variance about 0; the records at the sites see it through noise and through interannual anomalies, which do not average
out over a few years and are shared by neighbouring sites. The estimate is the mean of the correction given the records,
at the sites and at every cell, and its error follows from the same covariance.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import xarray as xr
from numpy.typing import NDArray
from scipy.linalg import cho_factor, cho_solve

from profiles.atlas import seasonal_profile
from profiles.column import isotherm_depth
from profiles.config import ClimatologyPriorSettings, SectionSettings
from profiles.section.covariance import Gaussian, TwoScales
from profiles.statistics import HARMONICS, harmonic_design, year_fraction

Array = NDArray[np.float64]

MINIMUM_MONTHS = 12  # a shorter record does not enter; its site takes the climatology that its neighbours give
_STEPS = 24  # times of the year at which the atlas's isotherm is found


@dataclass(frozen=True)
class Records:
    """Monthly means at the sites of an array.

    ``values`` (time, site) is the isotherm depth, m, NaN where missing; ``independent`` and ``persistent`` (time, site)
    the standard deviations of what changes from month to month and of what stays through a ``deployment`` (time, site).
    """

    time: NDArray[np.datetime64]
    latitude: Array
    longitude: Array
    values: Array
    independent: Array
    persistent: Array
    deployment: NDArray[np.integer]


@dataclass(frozen=True)
class Climatology:
    """A climatology at the sites (site, harmonic) and at the cells (harmonic, latitude, longitude), and its error.

    ``gain`` (parameter, parameter) times what the records say of their departures from the atlas, ``projected`` (known
    site, time, harmonic) times the departures, are the weights of the correction.
    """

    at_sites: Array
    at_cells: Array
    cell_error: Array
    known: NDArray[np.intp]
    information: Array
    prior_sd: Array
    gain: Array
    projected: Array

    def sites_at(self, time: NDArray[np.datetime64]) -> Array:
        """Return the isotherm depth at the sites, m, (time, site)."""
        return harmonic_design(year_fraction(time)) @ self.at_sites.T

    def cells_at(self, time: NDArray[np.datetime64]) -> Array:
        """Return the isotherm depth at the cells, m, (time, latitude, longitude)."""
        return np.einsum("th,hrc->trc", harmonic_design(year_fraction(time)), self.at_cells)


def atlas_isotherm(latitude: Array, longitude: Array, isotherm: float) -> Array:
    """Return the harmonics of the isotherm's depth in the packaged atlas, m, (position, harmonic)."""
    design = harmonic_design((np.arange(_STEPS) + 0.5) / _STEPS)
    profile = seasonal_profile(latitude, longitude)
    through_year = xr.dot(
        xr.DataArray(design, dims=("step", "harmonic")), profile.drop_vars("harmonic"), dim="harmonic"
    )
    depth = isotherm_depth(through_year.astype(np.float64), isotherm=isotherm)["isotherm_depth"]
    return np.asarray(depth.transpose("position", "step").values @ np.linalg.pinv(design).T)


def correction_scales(prior: ClimatologyPriorSettings) -> TwoScales:
    """Return the correlation in space of the correction to the atlas."""
    return TwoScales(
        prior.broad_share,
        Gaussian(prior.broad_longitude, prior.broad_latitude),
        Gaussian(prior.narrow_longitude, prior.narrow_latitude),
    )


def estimate_climatology(
    records: Records, rows: Array, columns: Array, isotherm: float, settings: SectionSettings
) -> Climatology:
    """Estimate the climatology at the sites and at the cells of a grid.

    Parameters
    ----------
    records : Records
        The array's monthly means.
    rows, columns : ndarray
        Latitudes and longitudes of the cells.
    isotherm : float
        °C, the isotherm that the records are of.
    settings : SectionSettings
        Priors and scales.
    """
    prior = settings.climatology
    prior_sd = np.array([prior.mean_sd, *[prior.annual_sd] * 2, *[prior.semiannual_sd] * 2])
    correlation = correction_scales(prior)
    sites = records.latitude, records.longitude
    atlas_sites = atlas_isotherm(*sites, isotherm)
    known = np.flatnonzero(np.isfinite(records.values).sum(axis=0) >= MINIMUM_MONTHS)
    departures, operators, errors = _summaries(records, known, atlas_sites, settings)
    places = records.latitude[known], records.longitude[known]
    prior_known = _parameters(correlation.between(*places, *places), prior_sd)
    total = operators @ prior_known @ operators.T + errors
    solved = _solve(total, np.column_stack([departures, operators]))
    weights, information = operators.T @ solved[:, 0], operators.T @ solved[:, 1:]
    grid = np.meshgrid(rows, columns, indexing="ij")
    cells = grid[0].ravel(), grid[1].ravel()
    known_cells = correlation.between(*places, *cells)
    atlas_cells = atlas_isotherm(*cells, isotherm)
    shape = (len(HARMONICS), rows.size, columns.size)
    return Climatology(
        at_sites=atlas_sites + _correction(correlation.between(*places, *sites), weights, prior_sd),
        at_cells=(atlas_cells + _correction(known_cells, weights, prior_sd)).T.reshape(shape),
        cell_error=_cell_error(known_cells, information, prior_sd).reshape(shape),
        known=known,
        information=information,
        prior_sd=prior_sd,
        gain=solved[:, 1:].T,
        projected=_projected(records, known),
    )


def _parameters(spatial: Array, prior_sd: Array) -> Array:
    """Return the prior covariance of (site, harmonic) parameters, harmonics independent of one another."""
    return np.kron(spatial, np.diag(prior_sd**2)).astype(np.float64)


def _summaries(
    records: Records, known: NDArray[np.intp], atlas_sites: Array, settings: SectionSettings
) -> tuple[Array, Array, Array]:
    """Return what the records say of the correction: b = H p + e with the covariance of e.

    b = X'(y - X atlas) / n and H = X'X / n for each site with n months and design X, so that nothing need be inverted
    where a record has gaps. e holds the anomalies and the noise of the months, projected likewise.
    """
    design = harmonic_design(year_fraction(records.time))
    present = np.isfinite(records.values[:, known])
    projected = _projected(records, known)
    residual = np.where(present, records.values[:, known] - design @ atlas_sites[known].T, 0.0)
    departures = np.einsum("sth,ts->sh", projected, residual).ravel()
    blocks = np.einsum("sth,tk->shk", projected, design)
    errors = _record_error(records, known, projected, settings)
    return np.asarray(departures, dtype=np.float64), _block_diagonal(blocks), errors


def _projected(records: Records, known: NDArray[np.intp]) -> Array:
    """Return X / n of each site, 0 where a month is missing, (known site, time, harmonic)."""
    present = np.isfinite(records.values[:, known])
    design = harmonic_design(year_fraction(records.time))
    return np.where(present.T[..., None], design, 0.0) / np.maximum(present.sum(axis=0), 1)[:, None, None]


def _record_error(records: Records, known: NDArray[np.intp], projected: Array, settings: SectionSettings) -> Array:
    places = records.latitude[known], records.longitude[known]
    signal = Gaussian(settings.length_longitude, settings.length_latitude).between(*places, *places)
    together = memory(records.time, settings.climatology)
    smoothed = np.einsum("tu,suk->stk", together, projected, optimize=True)
    shared = np.einsum("sth,ptk->shpk", projected, smoothed, optimize=True)
    shared *= settings.signal_sd**2 * signal[:, None, :, None]
    own = np.zeros((known.size, len(HARMONICS), len(HARMONICS)))
    for number, site in enumerate(known):
        own[number] = _own_error(records, site, projected[number])
    size = known.size * len(HARMONICS)
    return shared.reshape(size, size) + _block_diagonal(own)


def _own_error(records: Records, site: int, projected: Array) -> Array:
    """Return the error covariance of one site's summaries from what no other site shares, (harmonic, harmonic)."""
    independent = np.nan_to_num(records.independent[:, site])[:, None] * projected
    persistent = np.nan_to_num(records.persistent[:, site])[:, None] * projected
    total = independent.T @ independent
    for deployment in np.unique(records.deployment[:, site]):
        together = persistent[records.deployment[:, site] == deployment].sum(axis=0)
        total += np.outer(together, together)
    return np.asarray(total)


def memory(time: NDArray[np.datetime64], prior: ClimatologyPriorSettings) -> Array:
    """Return the correlation of interannual anomalies in time."""
    months = (time - time[0]) / np.timedelta64(1, "D") / 30.4375
    return np.exp(-np.abs(months[:, None] - months) / prior.decorrelation_months)


def _block_diagonal(blocks: Array) -> Array:
    sites, size = blocks.shape[0], blocks.shape[1]
    whole = np.zeros((sites, size, sites, size))
    whole[np.arange(sites), :, np.arange(sites), :] = blocks
    return whole.reshape(sites * size, sites * size)


def _solve(covariance: Array, right: Array) -> Array:
    if covariance.shape[0] == 0:
        return right
    # Twelve months from two seasons determine five harmonics badly; the jitter, 1e-10 of the largest variance, keeps
    # the factor defined and changes no depth by a micrometre.
    jitter = 1e-10 * np.diag(covariance).max() * np.eye(covariance.shape[0])
    return np.asarray(cho_solve(cho_factor(covariance + jitter, lower=True), right))


def _correction(spatial: Array, weights: Array, prior_sd: Array) -> Array:
    """Return the correction (position, harmonic) from ``spatial`` (known site, position)."""
    return np.asarray(spatial.T @ (weights.reshape(-1, prior_sd.size) * prior_sd**2))


def _cell_error(spatial: Array, information: Array, prior_sd: Array) -> Array:
    """Return the standard error of each coefficient at each cell, (harmonic, cell)."""
    size, harmonics = spatial.shape[0], prior_sd.size
    blocks = information.reshape(size, harmonics, size, harmonics)
    errors = []
    for harmonic, sd in enumerate(prior_sd):
        explained = sd**4 * np.einsum("sc,sp,pc->c", spatial, blocks[:, harmonic, :, harmonic], spatial, optimize=True)
        errors.append(np.sqrt(np.maximum(sd**2 - explained, 0.0)))
    return np.stack(errors)
