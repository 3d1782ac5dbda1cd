"""Damaged files of every kind: a small part of what ``tests/bench/mutants.py`` runs, and damage in long files."""

from __future__ import annotations

import importlib.util
import sys
from pathlib import Path

import numpy as np
import pytest

from profiles.ingest import read

_SPEC = importlib.util.spec_from_file_location("mutants", Path(__file__).parents[1] / "bench" / "mutants.py")
mutants = importlib.util.module_from_spec(_SPEC)
sys.modules["mutants"] = mutants  # for its dataclasses
_SPEC.loader.exec_module(mutants)

SEED = 7
RECORDS = {"counted": 8_000}  # so many that three profiles are less than a thousandth
FEWER = 2_500
OF_A_HEADER = {"blocked": 30}  # readings of the ten rows under a header, which hang on it
ONE_RECORD = [
    "columns swapped in a line", "NUL", "a million characters", "1e999", "--3", "a date that does not exist",
    "a leap second", "a line deleted", "a line doubled", "a line garbled", "a line cut", "quotes", "delimiters",
    "byte order mark", "digits", "a character lost", "control characters",
]  # fmt: skip
PLAIN = [name for name, kind in mutants.CASES.items() if kind.packed is None]


def test_every_line_of_damaged_files_is_accounted_for_and_every_value_is_right():
    outcomes = [outcome for _, _, outcome in mutants.trials(300, SEED, 25)]
    assert len(outcomes) == 300
    assert set(outcomes) == set(mutants.OUTCOMES)


@pytest.mark.parametrize("name", PLAIN)
def test_sound_files_are_as_the_independent_reader_has_them(tmp_path, name):
    sound = mutants.make(name, np.random.default_rng(SEED), 300)
    _, found = mutants.judge(sound.content, sound, tmp_path)
    assert len(found.values) > 300


@pytest.fixture(scope="module")
def long_files(tmp_path_factory):
    """A long sound file of each kind, and the readings that it has, by time and depth."""
    folder = tmp_path_factory.mktemp("long")
    files = {}
    for name in PLAIN:
        sound = mutants.make(name, np.random.default_rng(SEED), RECORDS.get(name, FEWER))
        files[name] = sound, readings(sound.content, sound, folder)
    return files


def readings(content, sound, folder):
    path = folder / "file"
    path.write_bytes(content)
    delivery = read(path, sound.layout)
    rows = delivery.table.rows(0, delivery.table.count)
    times, depths = rows["time"].astype(np.int64).tolist(), delivery.depth.tolist()
    return {
        (time, depth): value
        for time, row in zip(times, rows["values"].tolist(), strict=True)
        for depth, value in zip(depths, row, strict=True)
        if value == value
    }


@pytest.mark.parametrize("name", PLAIN)
def test_damage_to_one_record_keeps_the_others(tmp_path, long_files, name):
    sound, before = long_files[name]
    for seed, way in enumerate(ONE_RECORD):
        body = sound.content.index(b"2031" if name != "counted" else b"2032")
        damaged = sound.content[:body] + mutants.MUTATIONS[way](sound.content[body:], np.random.default_rng(seed))
        after = readings(damaged, sound, tmp_path)
        same = sum(after.get(key) == value for key, value in before.items())
        assert same >= 0.999 * len(before) - OF_A_HEADER.get(name, 0), way
