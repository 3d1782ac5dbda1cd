"""A model too large for memory, block by block of time: seen as the array saw, and read off on its own grid."""

from __future__ import annotations

import threading
from dataclasses import dataclass
from typing import Any

import numba
import numpy as np
from numpy.typing import NDArray

from profiles.config import ColumnSettings, ValidationSettings
from profiles.errors import DataError
from profiles.validation.box import Box, Reader, Water
from profiles.validation.full_model import MonthlySums, full_columns
from profiles.validation.model import Model
from profiles.validation.sampling import sample
from profiles.validation.stencils import Stencil

Floats = NDArray[np.float64]

_ONE_AT_A_TIME = threading.Lock()  # the compiled kernels use threads of their own and must not be called by several


@dataclass(frozen=True)
class Part:
    """What one block gives: the temperature at sensors (step, mooring, sensor), and sums by month on the own grid."""

    steps: slice
    seen: Floats
    sums: MonthlySums


class Job:
    """What every block needs. No dataclass, so that dask hands it on as it is and does not look for arrays in it."""

    def __init__(self, reader: Reader, where: Stencil, column: ColumnSettings, settings: ValidationSettings) -> None:
        self.reader = reader
        self.where = where
        self.column = column
        self.settings = settings

    def do(self, steps: slice, sensor_depth: Floats, *, own_threads: bool) -> Part:
        """Read, sample and read off the values of some steps."""
        with _ONE_AT_A_TIME:
            before = numba.get_num_threads()
            numba.set_num_threads(before if own_threads else 1)
            try:
                return self._do(steps, sensor_depth)
            finally:
                numba.set_num_threads(before)

    def _do(self, steps: slice, sensor_depth: Floats) -> Part:
        time = self.reader.model.time
        values = np.flatnonzero((time.step >= steps.start) & (time.step < steps.stop))
        water = self.reader.read(slice(int(values[0]), int(values[-1]) + 1))
        water = _averaged(water, time.step[values[0] : values[-1] + 1], steps)
        reach = self.settings.top_reach
        seen = sample(water.temperature, water.depth, self.where, sensor_depth, top_reach=reach)
        sums = MonthlySums()
        month = time.month[steps]
        for name, field in full_columns(water, self.column, top_reach=reach).items():
            sums.add(name, month, field)
        return Part(steps, seen, sums)


def _averaged(water: Water, step: NDArray[np.int64], steps: slice) -> Water:
    """Return the mean of the values of each step; most models have one value a step."""
    wanted = np.arange(steps.start, steps.stop)
    if np.array_equal(step, wanted):
        return water
    parts = [step == one for one in wanted]
    warm = np.stack([water.temperature[part].mean(axis=0, dtype=np.float64) for part in parts])
    if water.depth.shape[0] == 1:
        return Water(warm.astype(water.temperature.dtype), water.depth)
    return Water(warm.astype(water.temperature.dtype), np.stack([water.depth[part].mean(axis=0) for part in parts]))


def blocks_of(model: Model, box: Box, wanted: slice, megabytes: float) -> list[slice]:
    """Cut the wanted steps into runs whose temperature is no larger than ``megabytes``, a step at least."""
    levels = box.levels.stop - box.levels.start
    columns = sum(run.stop - run.start for run in box.columns)
    a_value = levels * columns * (box.rows.stop - box.rows.start) * max(model.temperature.dtype.itemsize, 4)
    a_step = a_value * max(1.0, float(np.bincount(model.time.step[model.time.step >= 0]).max()))
    length = max(1, int(megabytes * 1e6 / a_step))
    return [slice(start, min(start + length, wanted.stop)) for start in range(wanted.start, wanted.stop, length)]


def run_blocks(job: Job, blocks: list[slice], sensor_depth: Floats, first: int, scheduler: Any) -> list[Part]:
    """Do all blocks: on a dask scheduler, or one after the other in this process where that is None.

    ``sensor_depth`` (step, mooring, sensor) starts at step ``first``.
    """
    if scheduler is None:
        return [job.do(block, _depths(sensor_depth, block, first), own_threads=True) for block in blocks]
    from dask.base import compute
    from dask.delayed import delayed

    do = delayed(_do, pure=False)
    carried = delayed(job, pure=False, traverse=False)
    tasks = [do(carried, block, _Opaque(_depths(sensor_depth, block, first))) for block in blocks]
    return list(compute(*tasks, scheduler=scheduler))  # type: ignore[no-untyped-call]


def _depths(sensor_depth: Floats, block: slice, first: int) -> Floats:
    return sensor_depth[block.start - first : block.stop - first]


class _Opaque:
    """Something that dask hands on without looking into it."""

    def __init__(self, content: Any) -> None:
        self.content = content


def _do(job: Job, steps: slice, sensor_depth: _Opaque) -> Part:
    return job.do(steps, sensor_depth.content, own_threads=False)


def wet_points(reader: Reader, first: int) -> NDArray[np.bool_]:
    """Return which points of the box hold water, (row, column), from the model's first value.

    Raises
    ------
    DataError
        Where nothing is wet, or a level is missing between others that are there.
    """
    temperature = reader.read(slice(first, first + 1)).temperature[0]
    wet = np.isfinite(temperature)
    if not wet.any():
        raise DataError(
            "the model has no water at the array",
            where=reader.model.name,
            expected="temperatures in 5S-5N, 120E-80W",
            found="every value missing",
        )
    here = wet.any(axis=(0, 1))
    missing = np.flatnonzero(~here[: np.flatnonzero(here)[-1] + 1])
    if missing.size:
        raise DataError(
            "a level of the model is missing",
            where=reader.model.name,
            expected="values at every level down to the deepest that has any",
            found=f"none at level {', '.join(str(level + 1) for level in missing[:5])}, counted from the surface",
            advice="give the whole output, or leave the level out of the file",
        )
    return np.asarray(wet.any(axis=-1))
