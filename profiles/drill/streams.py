"""Streams of random numbers that do not depend on each other."""

from __future__ import annotations

import zlib

import numpy as np


def stream(seed: int, *names: str) -> np.random.Generator:
    """Return the generator that belongs to ``seed`` and ``names``: unrelated to any other's."""
    return np.random.default_rng([seed, *(zlib.crc32(name.encode()) for name in names)])
