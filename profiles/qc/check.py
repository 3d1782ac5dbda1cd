"""What a test of the quality control is: an object that declares its name, halo, survey and rule."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field, replace

import numpy as np
from numpy.typing import NDArray

from profiles.config import QualityControlSettings
from profiles.vocabulary import Flag, Water

Floats = NDArray[np.float64]
Mask = NDArray[np.bool_]
Outcomes = NDArray[np.int8]
Times = NDArray[np.datetime64]


@dataclass(frozen=True)
class Segment:
    """A piece of a record, its halo included, as plain arrays: time first, depth last.

    Parameters
    ----------
    time : ndarray of datetime64[ns], shape (time,)
        UTC, strictly increasing.
    temperature : ndarray, shape (time, depth)
        °C, NaN where missing.
    depth : ndarray, shape (time or 1, depth)
        Metres below the surface, positive down: where the sensor was if that is known, else nominal.
    previous : ndarray of datetime64[ns], shape (depth,)
        Time of each sensor's last value before the segment, NaT where there was none.
    position : (float, float), optional
        Degrees north and degrees east, 0-360.
    delivered : ndarray of int, shape (time, depth), optional
        Flags that came with the delivery.
    water : ndarray of int, shape (time,), optional
        :class:`profiles.vocabulary.Water`.
    """

    time: Times
    temperature: Floats
    depth: Floats
    previous: Times
    position: tuple[float, float] | None = None
    delivered: NDArray[np.integer] | None = None
    water: NDArray[np.integer] | None = None

    def in_water(self) -> Segment:
        """Return the segment without the values that were not measured in the water."""
        if self.water is None or (self.water == Water.IN_WATER).all():
            return self
        return self.without((self.water != Water.IN_WATER)[:, None])

    def without(self, unseen: Mask) -> Segment:
        """Return the segment without some of its values; ``unseen`` broadcasts to (time, depth)."""
        return replace(self, temperature=np.where(unseen, np.nan, self.temperature))


@dataclass(frozen=True)
class Survey:
    """What the tests need to know of the whole record.

    Parameters
    ----------
    nominal_interval : float
        Median time step, s; NaN for a single sample.
    spread : mapping of str to ndarray, shape (depth,)
        For each test that surveys, the robust standard deviation of what it surveys; NaN where there was
        nothing.
    repeated : ndarray of datetime64[ns]
        Times of the profiles that are copies of earlier ones.
    """

    nominal_interval: float
    spread: Mapping[str, Floats] = field(default_factory=dict)
    repeated: Times = field(default_factory=lambda: np.empty(0, dtype="datetime64[ns]"))


def no_halo(settings: QualityControlSettings) -> int:
    """Return the halo of a test that judges each sample by itself."""
    return 0


def one_neighbour(settings: QualityControlSettings) -> int:
    """Return the halo of a test that looks at the samples before and after."""
    return 1


@dataclass(frozen=True)
class Check:
    """One test.

    Parameters
    ----------
    name : str
        A key of :data:`profiles.vocabulary.TEST_BITS`.
    outcome : callable
        Takes a segment, the survey and the settings; returns an outcome per datum, int8 (time, depth): a
        :class:`profiles.vocabulary.Flag`, 9 exactly where the datum is missing, 2 where the test cannot
        judge.
    halo : callable
        Takes the settings; returns how many samples on either side the outcome of one depends on.
    survey : callable, optional
        Takes a segment, the nominal interval in s and the settings; returns a quantity (time, depth) whose
        robust spread over the record the test needs. May depend on the sample before, NaN where undefined.
    """

    name: str
    outcome: Callable[[Segment, Survey, QualityControlSettings], Outcomes]
    halo: Callable[[QualityControlSettings], int] = no_halo
    survey: Callable[[Segment, float, QualityControlSettings], Floats] | None = None


def outcomes(present: Mask, judged: Mask | np.bool_, questionable: Mask | np.bool_, bad: Mask | np.bool_) -> Outcomes:
    """Turn what a test found into flags: 9 where missing, 2 where not judged, else 4 over 3 over 1.

    Parameters
    ----------
    present, judged, questionable, bad : ndarray of bool
        Shapes that broadcast to that of ``present``.
    """
    flags = np.where(bad, Flag.BAD, np.where(questionable, Flag.QUESTIONABLE, Flag.GOOD))
    return np.where(present, np.where(judged, flags, Flag.NOT_EVALUATED), Flag.MISSING).astype(np.int8)
