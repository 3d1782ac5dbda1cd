"""A model too large for memory, block by block of time: seen as the array saw, and read off on its own grid."""

from __future__ import annotations

import itertools
import threading
import uuid
from dataclasses import dataclass
from typing import Any

import numba
import numpy as np
from numpy.typing import NDArray

from profiles.config import ColumnSettings, ValidationSettings
from profiles.errors import DataError
from profiles.validation.box import Box, Reader, Water
from profiles.validation.full_model import QUANTITIES, MonthlySums, ToCells, full_columns
from profiles.validation.model import Model
from profiles.validation.sampling import sample
from profiles.validation.stencils import Stencil

Floats = NDArray[np.float64]

_ONE_AT_A_TIME = threading.Lock()  # the compiled kernels use threads of their own and must not be called by several
_MOST_READ = 6.0  # a block that ends with a piece of the file may be so many times as large as what is held at a time


Cells = dict[str, Floats]


@dataclass(frozen=True)
class Part:
    """What one block gives: the temperature at sensors (step, mooring, sensor), and by month what was read off the
    model's own grid, on the cells of the array's map."""

    seen: Floats
    cells: dict[np.datetime64, Cells]


class Job:
    """What every block needs. No dataclass, so that dask hands it on as it is and does not look for arrays in it.

    ``to_cells`` brings the means of a month of ``least`` steps or more onto the cells of the array's map.
    """

    def __init__(
        self,
        reader: Reader,
        where: Stencil,
        to_cells: ToCells,
        least: float,
        column: ColumnSettings,
        settings: ValidationSettings,
    ) -> None:
        self.reader = reader
        self.where = where
        self.to_cells = to_cells
        self.least = least
        self.column = column
        self.settings = settings
        self.token = uuid.uuid4().hex  # by which a worker knows it again

    def do(self, steps: slice, sensor_depth: Floats, *, own_threads: bool) -> Part:
        """Read, sample and read off the values of whole months, from step ``steps.start`` on."""
        with _ONE_AT_A_TIME:
            before = numba.get_num_threads()
            numba.set_num_threads(before if own_threads else 1)
            try:
                return self._do(steps, sensor_depth)
            finally:
                numba.set_num_threads(before)

    def _do(self, steps: slice, sensor_depth: Floats) -> Part:
        """Work through a block piece by piece; what is held beside a piece is the sums of its months."""
        model, held = self.reader.model, self.settings.block_megabytes
        sums, seen = MonthlySums(), []
        for run in reads_of(model, self.reader.box, steps, held):
            values = values_of(model, run)
            pieces = _cut(run, _steps_within(model, self.reader.box, held))
            reader, first = (self.reader, 0) if len(pieces) == 1 else (self.reader.loaded(values), values.start)
            for piece in pieces:
                wanted = values_of(model, piece)
                water = reader.read(slice(wanted.start - first, wanted.stop - first))
                depths = sensor_depth[piece.start - steps.start : piece.stop - steps.start]
                seen.append(self._work(_averaged(water, model.time.step[wanted], piece), piece, depths, sums))
        months = np.unique(model.time.month[steps])
        return Part(np.concatenate(seen), {month: self._on_cells(month, sums) for month in months})

    def _work(self, water: Water, steps: slice, sensor_depth: Floats, sums: MonthlySums) -> Floats:
        reach = self.settings.top_reach
        month = self.reader.model.time.month[steps]
        for name, field in full_columns(water, self.column, top_reach=reach).items():
            sums.add(name, month, field)
        return sample(water.temperature, water.depth, self.where, sensor_depth, top_reach=reach)

    def _on_cells(self, month: np.datetime64, sums: MonthlySums) -> Cells:
        means = {name: sums.mean(name, month, self.least) for name in QUANTITIES}
        return {name: self.to_cells(mean) for name, mean in means.items() if mean is not None}


def values_of(model: Model, steps: slice) -> slice:
    """Return the values that belong to some steps, and what lies between them."""
    step = model.time.step
    values = np.flatnonzero((step >= steps.start) & (step < steps.stop))
    return slice(int(values[0]), int(values[-1]) + 1)


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


def _steps_within(model: Model, box: Box, megabytes: float) -> int:
    """Return how many steps have a temperature no larger than ``megabytes``, one at least."""
    levels = box.levels.stop - box.levels.start
    columns = sum(run.stop - run.start for run in box.columns)
    a_value = levels * columns * (box.rows.stop - box.rows.start) * max(model.temperature.dtype.itemsize, 4)
    return max(1, int(megabytes * 1e6 / (a_value * _values_a_step(model))))


def _values_a_step(model: Model) -> int:
    return max(1, int(np.bincount(model.time.step[model.time.step >= 0]).max()))


def _cut(steps: slice, length: int) -> list[slice]:
    return [slice(at, min(at + length, steps.stop)) for at in range(steps.start, steps.stop, length)]


def blocks_of(model: Model, box: Box, wanted: slice, megabytes: float) -> list[slice]:
    """Cut the wanted steps into runs of whole months: as many as have a temperature no larger than ``megabytes``, one
    at least. What a block gives is small then, however large the model is."""
    length = _steps_within(model, box, megabytes)
    changes = np.flatnonzero(np.diff(model.time.month[wanted]) != np.timedelta64(0, "M"))
    ends = [*(wanted.start + changes + 1).tolist(), wanted.stop]
    blocks, start = [], wanted.start
    for end, following in itertools.zip_longest(ends, ends[1:]):
        if following is None or following - start > length:
            blocks.append(slice(start, end))
            start = end
    return blocks


def reads_of(model: Model, box: Box, steps: slice, megabytes: float) -> list[slice]:
    """Cut steps into the runs that are read at once, no larger than ``megabytes``.

    Where the file holds more times than that in one piece, to read one of them is to read the whole piece: then a run
    ends where the piece does, if that is not much larger.
    """
    length, piece = _steps_within(model, box, megabytes), _times_a_piece(model)
    if piece == 1 or piece > _MOST_READ * length or _values_a_step(model) > 1:
        return _cut(steps, length)
    length = max(piece, length // piece * piece)
    shift = values_of(model, steps).start - steps.start  # a step is a value, but for where they begin
    first = steps.start + length - (steps.start + shift) % length
    edges = [steps.start, *range(first, steps.stop, length), steps.stop]
    return list(itertools.starmap(slice, itertools.pairwise(edges)))


def _times_a_piece(model: Model) -> int:
    """Return how many times the file holds in one piece (a chunk), 1 where it does not say."""
    encoding, data = model.temperature.encoding, model.temperature
    sizes = encoding.get("chunks") or encoding.get("chunksizes")
    if not sizes or len(sizes) != data.ndim:
        return 1
    return max(1, int(sizes[data.get_axis_num("time")]))


def run_blocks(
    job: Job, blocks: list[slice], sensor_depth: Floats, first: int, scheduler: Any
) -> tuple[Floats, dict[np.datetime64, Cells]]:
    """Do all blocks: on a dask scheduler, or one after the other in this process where that is None.

    ``sensor_depth`` (step, mooring, sensor) starts at step ``first``. Returns the model's temperature at the sensors,
    and by month what was read off its own grid, on the map's cells.
    """
    depths = [sensor_depth[block.start - first : block.stop - first] for block in blocks]
    if scheduler is None:
        parts = [job.do(block, own, own_threads=True) for block, own in zip(blocks, depths, strict=True)]
    else:
        parts = _on_scheduler(job, blocks, depths, scheduler)
    cells = {month: cells for part in parts for month, cells in part.cells.items()}
    return np.concatenate([part.seen for part in parts]), cells


def _on_scheduler(job: Job, blocks: list[slice], depths: list[Floats], scheduler: Any) -> list[Part]:
    import dask
    from dask.delayed import delayed

    do = delayed(_do, pure=False)
    carried = delayed(job, pure=False, traverse=False)
    tasks = [do(carried, block, _Opaque(own)) for block, own in zip(blocks, depths, strict=True)]
    # One block at a time to a worker: dask would hand over six, and leave one worker idle at the end.
    with dask.config.set(chunksize=1):
        return list(dask.base.compute(*tasks, scheduler=scheduler))  # type: ignore[no-untyped-call]


class _Opaque:
    """Something that dask hands on without looking into it."""

    def __init__(self, content: Any) -> None:
        self.content = content


_KEPT: dict[str, Job] = {}  # the job of this worker, so that what it read once for all blocks is not read again


def _do(job: Job, steps: slice, sensor_depth: _Opaque) -> Part:
    if job.token not in _KEPT:
        _KEPT.clear()
        _KEPT[job.token] = job
    return _KEPT[job.token].do(steps, sensor_depth.content, own_threads=False)


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
