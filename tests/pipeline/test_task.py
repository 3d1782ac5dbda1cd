"""Keys and records of tasks."""

from __future__ import annotations

from pathlib import Path

import pytest

from profiles.pipeline.task import Checksums, Task, forget, keep_report, kept_report, record_path, recorded
from profiles.store import make_folder


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    make_folder(record_path(tmp_path, "qc", "A").parent)
    (tmp_path / "in.csv").write_text("1")
    (tmp_path / "out.csv").write_text("2")
    return tmp_path


def task(folder: Path, **settings: float) -> Task:
    return Task("qc", "A", len, (), (folder / "in.csv",), (folder / "out.csv",), settings)


def test_key_follows_settings_and_input_and_nothing_else(folder: Path) -> None:
    first = task(folder, limit=1.0).key(Checksums())
    assert task(folder, limit=1.0).key(Checksums()) == first
    assert task(folder, limit=2.0).key(Checksums()) != first
    (folder / "out.csv").write_text("3")
    assert task(folder, limit=1.0).key(Checksums()) == first
    (folder / "in.csv").write_text("4")
    assert task(folder, limit=1.0).key(Checksums()) != first


def test_missing_input_has_a_key_of_its_own(folder: Path) -> None:
    first = task(folder).key(Checksums())
    (folder / "in.csv").unlink()
    assert Checksums().of(folder / "in.csv") == "missing"
    assert task(folder).key(Checksums()) != first


def test_checksum_of_text_is_the_published_one(folder: Path) -> None:
    (folder / "in.csv").write_bytes(b"abc")
    # FIPS 180-4, example "abc" of SHA-256
    assert Checksums().of(folder / "in.csv") == "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad"


def test_checksum_is_read_again_after_a_change(folder: Path) -> None:
    checksums = Checksums()
    before = checksums.of(folder / "in.csv")
    (folder / "in.csv").write_text("longer")
    assert checksums.of(folder / "in.csv") != before


def test_report_is_kept_while_key_and_outputs_stand(folder: Path) -> None:
    keep_report(task(folder), folder, "key", {"count": 3}, Checksums())
    assert kept_report(task(folder), folder, "key", Checksums()) == {"count": 3}
    assert kept_report(task(folder), folder, "another key", Checksums()) is None
    (folder / "out.csv").write_text("damaged")
    assert kept_report(task(folder), folder, "key", Checksums()) is None


def test_forgetting_removes_record_and_outputs(folder: Path) -> None:
    keep_report(task(folder), folder, "key", {}, Checksums())
    assert recorded(folder) == [("qc", "A")]
    forget(folder, "qc", "A")
    assert recorded(folder) == []
    assert not (folder / "out.csv").exists()
    assert (folder / "in.csv").exists()


def test_name_with_a_point_is_recorded_whole(folder: Path) -> None:
    record_path(folder, "qc", "A.1").write_text("{}")
    assert recorded(folder) == [("qc", "A.1")]
