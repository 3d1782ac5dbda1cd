"""What is read off every column of a model on its own grid, and its monthly means."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

import numpy as np
import xarray as xr
from numpy.typing import NDArray
from scipy.sparse import csr_array

from profiles.column import isotherm_depth, layer_mean_temperature, mixed_layer_depth, steepest_gradient_depth
from profiles.config import ColumnSettings, MeansSettings
from profiles.section.grid import array_grid
from profiles.validation.box import Box, Water
from profiles.validation.stencils import spacing, stencil

Floats = NDArray[np.float64]

#: What is read off a column, in the order in which it stands in results.
QUANTITIES = ("isotherm_depth", "steepest_gradient_depth", "mixed_layer_depth", "mean_temperature")
LEAST_WET = 0.5  # share of a 1-degree cell's points that need a value (ours)
_MOST_POINTS = 12  # along a side of a cell, however fine the grid


def full_columns(water: Water, settings: ColumnSettings, *, top_reach: float) -> dict[str, NDArray[np.float32]]:
    """Return the :data:`QUANTITIES` of every column, each (time, row, column), with the settings of the array.

    A model's shallowest level no deeper than ``top_reach``, m, stands for the surface.
    """
    dims = ("time", "row", "column", "depth")
    temperature = xr.DataArray(water.temperature, dims=dims)
    still = water.depth.size == water.depth.shape[-1]
    places = None
    if still:
        temperature = temperature.assign_coords(depth=water.depth.ravel())
    else:
        spread = np.broadcast_to(water.depth, water.temperature.shape)
        places = xr.DataArray(spread, dims=dims)
    surface = max(settings.surface_reach, top_reach)
    found: Mapping[str, xr.Dataset] = {
        "isotherm_depth": isotherm_depth(
            temperature,
            isotherm=settings.isotherm,
            sensor_depth=places,
            max_bracket=settings.max_bracket,
            crossing=settings.crossing,
            surface_reach=surface,
        ),
        "steepest_gradient_depth": steepest_gradient_depth(temperature, sensor_depth=places),
        "mixed_layer_depth": mixed_layer_depth(
            temperature,
            threshold=settings.mixed_layer_threshold,
            reference_depth=settings.mixed_layer_reference,
            sensor_depth=places,
        ),
        "mean_temperature": layer_mean_temperature(
            temperature,
            bottom=settings.mean_temperature_bottom,
            surface_reach=surface,
            max_gap=settings.max_bracket,
            sensor_depth=places,
        ),
    }
    return {name: found[name][name].values.astype(np.float32) for name in QUANTITIES}


@dataclass
class MonthlySums:
    """Sums and counts of fields by month, of which blocks are added as they come."""

    totals: dict[tuple[str, np.datetime64], tuple[Floats, NDArray[np.int32]]] = field(default_factory=dict)

    def add(self, name: str, month: NDArray[np.datetime64], values: NDArray[Any]) -> None:
        """Add ``values`` (time, ...) that belong to ``month`` (time,); NaN does not count."""
        for one in np.unique(month):
            part = values[month == one]
            present = np.isfinite(part)
            self._put((name, one), np.where(present, part, 0.0).sum(axis=0, dtype=np.float64), present.sum(axis=0))

    def _put(self, key: tuple[str, np.datetime64], total: Floats, count: NDArray[Any]) -> None:
        before = self.totals.get(key)
        whole = (total, count.astype(np.int32)) if before is None else (before[0] + total, before[1] + count)
        self.totals[key] = whole

    def mean(self, name: str, month: np.datetime64, least: float) -> Floats | None:
        """Return the mean of a month where it has ``least`` values at least, NaN elsewhere; None for no month."""
        if (name, month) not in self.totals:
            return None
        total, count = self.totals[name, month]
        return np.where(count >= max(least, 1.0), total / np.maximum(count, 1), np.nan)


def least_steps(days: float, settings: MeansSettings) -> float:
    """Return how many steps of ``days`` a month needs: as many days as the array's months do."""
    return max(1.0, np.ceil(settings.monthly_days / days - 1e-9))


@dataclass(frozen=True)
class ToCells:
    """From a model's points to the 1-degree cells of the waters, by the mean of evenly spaced points in each cell.

    ``weights`` is (cell times point, row times column); the points are as far apart as the model's, so that a model on
    the cells' own centres is taken as it is.
    """

    weights: csr_array
    points: int

    @classmethod
    def of(cls, box: Box, wet: NDArray[np.bool_]) -> ToCells:
        """Return the way from a box's wet points."""
        rows, columns = array_grid()
        steps = spacing(box.latitude, box.longitude)
        down, right = (int(np.clip(np.round(1.0 / step), 1, _MOST_POINTS)) for step in steps)
        latitude = (rows[:, None] + _within_cell(down)).ravel()
        longitude = (columns[:, None] + _within_cell(right)).ravel()
        places = np.meshgrid(latitude, longitude, indexing="ij")
        found = stencil(box.latitude, box.longitude, wet, places[0].ravel(), places[1].ravel(), nearest_wet=0.0)
        cell_row, cell_column = np.divmod(np.arange(latitude.size * longitude.size), longitude.size)
        cell = (cell_row // down) * columns.size + cell_column // right
        point = found.row * wet.shape[1] + found.column
        entries = (found.weight.ravel() / (down * right), (np.repeat(cell, 4), point.ravel()))
        return cls(csr_array(entries, shape=(rows.size * columns.size, wet.size)), down * right)

    def __call__(self, values: Floats) -> Floats:
        """Return the means over the cells, (10, 160), of ``values`` (row, column); NaN where too few have one."""
        flat = values.ravel()
        present = np.isfinite(flat)
        share = self.weights @ present.astype(np.float64)
        total = self.weights @ np.where(present, flat, 0.0)
        rows, columns = array_grid()
        with np.errstate(invalid="ignore", divide="ignore"):
            means = np.where(share >= LEAST_WET, total / share, np.nan)
        return np.asarray(means).reshape(rows.size, columns.size)


def _within_cell(points: int) -> Floats:
    return (np.arange(points) + 0.5) / points - 0.5
