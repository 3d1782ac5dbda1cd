"""A chain in, the same chain with flags out: block by block, the flags the same whatever the blocks."""

from __future__ import annotations

from collections.abc import Iterator
from itertools import zip_longest
from typing import Any

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from profiles.config import QualityControlSettings
from profiles.errors import DataError, RequestError
from profiles.qc import (
    climatology,
    delivered_flag,
    flat_line,
    gap,
    gross_range,
    inversion,
    rate_of_change,
    repeated,
    spike,
    water,
)
from profiles.qc.check import Check, Outcomes, Segment, Survey, Times
from profiles.qc.neighbours import step_seconds
from profiles.qc.roll_up import roll_up
from profiles.statistics import SpreadSurvey
from profiles.store import TIME_BLOCK, padded_blocks
from profiles.vocabulary import Flag, describe

#: The tests, in the order of their bits.
CHECKS: tuple[Check, ...] = (
    gap.CHECK,
    gross_range.CHECK,
    climatology.CHECK,
    spike.CHECK,
    rate_of_change.CHECK,
    flat_line.CHECK,
    delivered_flag.CHECK,
    water.CHECK,
    inversion.CHECK,
    repeated.CHECK,
)

_INPUTS = ("temperature", "sensor_depth", "temperature_delivered_qc", "water_status")
#: Tests that judge a value whether or not it was measured in the water; the others see the water only.
_OF_ANY_VALUE = {delivered_flag.CHECK, water.CHECK}
#: Tests that compare sensors: one that another test doubts would cast doubt on those beside it.
_OF_TRUSTED_VALUES = {inversion.CHECK}


def quality_control(chain: xr.Dataset, settings: QualityControlSettings | None = None) -> xr.Dataset:
    """Flag every temperature of a chain.

    Parameters
    ----------
    chain : xarray.Dataset
        ``temperature(time, depth)``, °C; optional ``sensor_depth`` and ``temperature_delivered_qc`` (time,
        depth), ``water_status`` (time), scalar coordinates ``latitude`` and ``longitude`` (without them the
        climatology cannot judge). May be lazy.
    settings : QualityControlSettings, optional
        Thresholds; the defaults where None.

    Returns
    -------
    xarray.Dataset
        The chain with ``temperature_qc`` and the masks ``temperature_qc_ran``, ``_questionable`` and
        ``_bad``, in place of such as it had, and the settings as JSON in the attribute ``qc_settings``. A
        missing temperature is flagged 9. Lazy variables stay lazy; the flags are in memory.

    Raises
    ------
    DataError
        Where the chain is none: variables, dims, order of time or depth, position, delivered flags.
    RequestError
        Where an argument is of the wrong kind.
    """
    settings = _checked_settings(settings)
    check_chain(chain)
    inputs = chain[[name for name in _INPUTS if name in chain]]
    parts = [flags for _, flags in _flagged_pieces(inputs, settings, TIME_BLOCK)]
    return _label(chain, {name: np.concatenate([part[name] for part in parts]) for name in parts[0]}, settings)


def flag_blocks(
    chain: xr.Dataset, settings: QualityControlSettings | None = None, *, block_length: int = TIME_BLOCK
) -> Iterator[xr.Dataset]:
    """Flag a chain too long for memory: as :func:`quality_control`, but in successive blocks of time.

    Parameters
    ----------
    chain, settings
        As for :func:`quality_control`.
    block_length : int
        Samples of a block. The flags do not depend on it.

    Returns
    -------
    iterator of xarray.Dataset
        In memory, made for :func:`profiles.store.write_blocks`. The record is read twice: surveyed, then
        flagged.

    Raises
    ------
    DataError, RequestError
        As for :func:`quality_control`; before the first block, except for delivered flags.
    """
    settings = _checked_settings(settings)
    check_chain(chain)
    if block_length < 1:
        raise RequestError(
            "a block has no samples", where="block_length", expected="1 or more", found=str(block_length)
        )
    return (_label(piece, flags, settings) for piece, flags in _flagged_pieces(chain, settings, block_length))


def survey_record(chain: xr.Dataset, settings: QualityControlSettings, *, block_length: int = TIME_BLOCK) -> Survey:
    """Gather what the tests need to know of the whole record, block by block.

    Parameters
    ----------
    chain : xarray.Dataset
        As for :func:`quality_control`.
    settings : QualityControlSettings
    block_length : int
        Samples of a block. The survey does not depend on it.
    """
    interval = nominal_interval(chain["time"].values)
    surveys = {check: SpreadSurvey(chain.sizes["depth"]) for check in CHECKS if check.survey is not None}
    unknown = _no_value_yet(chain)
    profiles, comparable = [], []
    for block in padded_blocks(chain.sizes["time"], block_length, halo=1):
        wet = segment_of(chain.isel(time=block.padded).compute(), unknown).in_water()
        for check, spread in surveys.items():
            if check.survey is not None:
                spread.add(check.survey(wet, interval, settings)[block.inner])
        inner = wet.temperature[block.inner]
        profiles.append(repeated.signatures(inner))
        comparable.append(repeated.is_comparable(inner, settings.repeated.sensors))
    copies = repeated.repeats(np.concatenate(profiles), np.concatenate(comparable), settings.repeated.samples)
    return Survey(
        interval,
        {check.name: spread.sd() for check, spread in surveys.items()},
        chain["time"].values[copies].astype("datetime64[ns]"),
    )


def nominal_interval(time: Times) -> float:
    """Return the median time step, s; NaN for a single sample."""
    return float(np.median(step_seconds(time))) if time.size > 1 else float("nan")


def check_chain(chain: xr.Dataset) -> None:
    """Raise DataError where ``chain`` is not fit to be flagged, RequestError where it is no dataset."""
    if not isinstance(chain, xr.Dataset):
        raise RequestError("not a chain", where="chain", expected="an xarray.Dataset", found=type(chain).__name__)
    if "temperature" not in chain:
        found = ", ".join(sorted(str(name) for name in chain.data_vars)) or "no variable"
        raise DataError("the chain has no temperature", where="chain", expected="temperature(time, depth)", found=found)
    for name in _INPUTS:
        if name in chain:
            _check_dims(chain[name], ("time",) if name == "water_status" else ("time", "depth"))
    _check_temperature(chain["temperature"])
    _check_time(chain)
    _check_depth(chain)
    _check_position(chain)


def _check_dims(variable: xr.DataArray, dims: tuple[str, ...]) -> None:
    if variable.dims != dims:
        raise DataError(
            "the dimensions are not those of a chain",
            where=str(variable.name),
            expected=f"({', '.join(dims)})",
            found=f"({', '.join(str(dim) for dim in variable.dims)})",
            advice="rename or transpose them",
        )
    if 0 in variable.shape:
        raise DataError("the chain is empty", where=str(variable.name), found=f"shape {variable.shape}")


def _check_temperature(temperature: xr.DataArray) -> None:
    if temperature.dtype.kind != "f":
        raise DataError(
            "not floating-point numbers",
            where="temperature",
            expected="°C, NaN where missing",
            found=str(temperature.dtype),
        )


def _check_time(chain: xr.Dataset) -> None:
    time = chain["time"].values if "time" in chain.coords else np.empty(0)
    if not np.issubdtype(time.dtype, np.datetime64):
        found = str(time.dtype) if time.size else "no coordinate"
        raise DataError("time is not a coordinate of times", where="time", expected="datetime64, UTC", found=found)
    if np.isnat(time).any():
        raise DataError("a time is missing", where="time", found=f"NaT at sample {int(np.argmax(np.isnat(time)))}")
    backwards = np.diff(time) <= np.timedelta64(0)
    if backwards.any():
        at = int(np.argmax(backwards))
        raise DataError(
            "time does not increase",
            where=f"time, samples {at} and {at + 1}",
            expected="each time once, in order",
            found=f"{np.datetime_as_string(time[at])}, then {np.datetime_as_string(time[at + 1])}",
            advice="sort the record and settle the times that appear twice",
        )


def _check_depth(chain: xr.Dataset) -> None:
    depth = chain["depth"].values if "depth" in chain.coords else np.empty(0)
    if depth.size == 0 or depth.dtype.kind not in "fiu":
        found = str(depth.dtype) if depth.size else "no coordinate"
        raise DataError("depth is not a coordinate of depths", where="depth", expected="m, positive down", found=found)
    if not (np.isfinite(depth).all() and (np.diff(depth) > 0).all()):
        raise DataError(
            "depth does not increase",
            where="depth",
            expected="each depth once, ascending",
            found=", ".join(f"{value:g}" for value in depth),
            advice="sort the sensors by nominal depth",
        )


def _check_position(chain: xr.Dataset) -> None:
    for name, least, most in (("latitude", -90.0, 90.0), ("longitude", 0.0, 360.0)):
        if name not in chain.coords:
            continue
        value = chain[name].values
        if value.ndim or not least <= value <= most:
            found = f"shape {value.shape}" if value.ndim else f"{value:g}"
            advice = "add 360 to western longitudes" if name == "longitude" else None
            raise DataError(
                "not a position",
                where=name,
                expected=f"one number, {least:g} to {most:g}",
                found=found,
                advice=advice,
            )


def _checked_settings(settings: QualityControlSettings | None) -> QualityControlSettings:
    if settings is None:
        return QualityControlSettings()
    if not isinstance(settings, QualityControlSettings):
        raise RequestError(
            "not settings of the quality control",
            where="settings",
            expected="a QualityControlSettings, or None for the defaults",
            found=type(settings).__name__,
        )
    return settings


def _flagged_pieces(
    chain: xr.Dataset, settings: QualityControlSettings, block_length: int
) -> Iterator[tuple[xr.Dataset, dict[str, NDArray[Any]]]]:
    survey = survey_record(chain[[name for name in _INPUTS if name in chain]], settings, block_length=block_length)
    halo = _halo(settings)
    blocks = list(padded_blocks(chain.sizes["time"], block_length, halo))
    previous = _no_value_yet(chain)
    for block, following in zip_longest(blocks, blocks[1:]):
        piece = chain.isel(time=block.padded).compute()
        segment = segment_of(piece, previous)
        found = {name: flags[block.inner] for name, flags in _outcomes(segment, survey, settings).items()}
        yield piece.isel(time=block.inner), roll_up(found)
        if following is not None:
            present = ~np.isnan(segment.in_water().temperature)
            previous = gap.last_value_times(segment.time, present, previous)[following.first - block.first]


def _halo(settings: QualityControlSettings) -> int:
    """Return on how many samples on either side the flags of one depend."""
    own = {check: check.halo(settings) for check in CHECKS}
    last = max(own[check] for check in _OF_TRUSTED_VALUES)
    return last + max(halo for check, halo in own.items() if check not in _OF_TRUSTED_VALUES)


def _outcomes(segment: Segment, survey: Survey, settings: QualityControlSettings) -> dict[str, Outcomes]:
    """Return what every test says."""
    wet, found = segment.in_water(), dict[str, Outcomes]()
    for check in sorted(CHECKS, key=_OF_TRUSTED_VALUES.__contains__):
        seen = segment if check in _OF_ANY_VALUE else wet
        if check in _OF_TRUSTED_VALUES:
            seen = wet.without(np.logical_or.reduce([flags >= Flag.QUESTIONABLE for flags in found.values()]))
        flags = check.outcome(seen, survey, settings)
        unseen = np.isnan(seen.temperature) & ~np.isnan(segment.temperature)
        found[check.name] = np.where(unseen, np.int8(Flag.NOT_EVALUATED), flags)
    return found


def _no_value_yet(chain: xr.Dataset) -> Times:
    return np.full(chain.sizes["depth"], np.datetime64("NaT", "ns"))


def segment_of(piece: xr.Dataset, previous: Times) -> Segment:
    """Return a piece of a chain as plain arrays; ``previous`` as in :class:`profiles.qc.check.Segment`."""
    nominal = piece["depth"].values.astype(np.float64)[None, :]
    depth = nominal
    if "sensor_depth" in piece:
        measured = piece["sensor_depth"].values.astype(np.float64)
        depth = np.where(np.isnan(measured), nominal, measured)
    known = "latitude" in piece.coords and "longitude" in piece.coords
    return Segment(
        time=piece["time"].values.astype("datetime64[ns]"),
        temperature=piece["temperature"].values.astype(np.float64),
        depth=depth,
        previous=previous,
        position=(float(piece["latitude"]), float(piece["longitude"])) if known else None,
        delivered=piece["temperature_delivered_qc"].values if "temperature_delivered_qc" in piece else None,
        water=piece["water_status"].values if "water_status" in piece else None,
    )


def _label(chain: xr.Dataset, flags: dict[str, NDArray[Any]], settings: QualityControlSettings) -> xr.Dataset:
    """Put the flags into the chain; attributes it already has stand, but for what the flags change."""
    bare = chain.drop_vars(list(flags), errors="ignore")
    flagged = describe(bare.assign({name: (("time", "depth"), values) for name, values in flags.items()}))
    for name in bare.variables:
        described = flagged[name].attrs
        ancillary = {key: described[key] for key in ("ancillary_variables",) if key in described}
        flagged[name].attrs = described | bare[name].attrs | ancillary
    flagged.attrs["qc_settings"] = settings.model_dump_json()
    return flagged
