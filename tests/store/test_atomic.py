"""Files appear whole or not at all."""

from __future__ import annotations

import ctypes
import errno
import hashlib
import os
from collections.abc import Iterator
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
import xarray as xr

from profiles import store
from profiles.errors import MachineError
from profiles.store import checksum, clear_leftovers, make_folder, replacing, write_text


def contents(folder: Path) -> dict[str, bytes]:
    return {path.name: path.read_bytes() for path in folder.iterdir()}


def fail_halfway(path: Path, error: Exception) -> None:
    with replacing(path) as temporary:
        temporary.write_text("half")
        raise error


@pytest.fixture
def small_disk(tmp_path: Path) -> Iterator[Path]:
    """Yield a file system of 256 kB; one that a user without the right to mount does not get."""
    folder = tmp_path / "disk"
    folder.mkdir()
    libc = ctypes.CDLL(None, use_errno=True)
    if libc.mount(b"tmpfs", os.fsencode(folder), b"tmpfs", 0, b"size=256k") != 0:
        pytest.skip(f"no small file system can be mounted here: {os.strerror(ctypes.get_errno())}")
    yield folder
    # MNT_DETACH = 2: the file library keeps a file open that it failed to write.
    assert libc.umount2(os.fsencode(folder), 2) == 0


def test_a_replaced_file_is_the_only_one_left(tmp_path: Path) -> None:
    write_text(tmp_path / "a.txt", "old")
    write_text(tmp_path / "a.txt", "new")
    assert contents(tmp_path) == {"a.txt": b"new"}


def test_the_old_file_stands_until_the_new_one_is_complete(tmp_path: Path) -> None:
    path = tmp_path / "a.txt"
    path.write_text("old")
    with replacing(path) as temporary:
        temporary.write_text("new")
        assert temporary.parent == path.parent  # a rename is atomic only within one file system
        assert path.read_text() == "old"
    assert path.read_text() == "new"


def test_a_failing_write_keeps_the_old_file_and_leaves_nothing(tmp_path: Path) -> None:
    path = tmp_path / "a.txt"
    path.write_text("old")
    with pytest.raises(ZeroDivisionError, match="halfway"):
        fail_halfway(path, ZeroDivisionError("halfway"))
    assert contents(tmp_path) == {"a.txt": b"old"}


def test_a_file_that_fails_its_verification_does_not_appear(tmp_path: Path) -> None:
    seen = []

    def refuse(finished: Path) -> None:
        seen.append(finished.read_text())
        raise ValueError("not what was written")

    with pytest.raises(ValueError, match="not what was written"), replacing(tmp_path / "a.txt", verify=refuse) as part:
        part.write_text("new")
    assert seen == ["new"]
    assert contents(tmp_path) == {}


def test_a_write_is_flushed_to_disk_before_the_rename(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    steps: list[str] = []
    monkeypatch.setattr(os, "fsync", lambda descriptor: steps.append(Path(f"/dev/fd/{descriptor}").resolve().name))
    rename = Path.replace
    monkeypatch.setattr(Path, "replace", lambda self, other: (steps.append("rename"), rename(self, other))[1])
    write_text(tmp_path / "a.txt", "new")
    assert [step.rpartition("-")[2] for step in steps] == ["a.txt", "rename", tmp_path.name.rpartition("-")[2]]


@pytest.mark.parametrize(
    ("number", "reason"),
    [
        (errno.ENOSPC, "the disk is full"),
        (errno.EACCES, "no permission to write there"),
        (errno.EROFS, "a read-only file system"),
        (errno.EDQUOT, "the disk quota is used up"),
        (errno.EIO, "Input/output error"),
    ],
)
def test_what_the_machine_refuses_is_said_in_words(tmp_path: Path, number: int, reason: str) -> None:
    path = tmp_path / "a.txt"
    path.write_text("old")
    with pytest.raises(MachineError, match=f"a.txt: cannot be written; found {reason}"):
        fail_halfway(path, OSError(number, os.strerror(number)))
    assert contents(tmp_path) == {"a.txt": b"old"}


def test_a_refused_flush_is_a_fault_of_the_machine(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def refuse(descriptor: int) -> None:
        raise OSError(errno.ENOSPC, "No space left on device")

    monkeypatch.setattr(os, "fsync", refuse)
    with pytest.raises(MachineError, match="the disk is full"):
        write_text(tmp_path / "a.txt", "new")
    assert contents(tmp_path) == {}


def test_a_bare_failure_of_the_file_library_is_a_fault_of_the_machine(tmp_path: Path) -> None:
    with pytest.raises(MachineError, match=r"a\.nc: cannot be written; found NetCDF: HDF error; free some space"):
        fail_halfway(tmp_path / "a.nc", RuntimeError("NetCDF: HDF error"))
    assert contents(tmp_path) == {}


def test_another_runtime_error_is_not_called_a_fault_of_the_machine(tmp_path: Path) -> None:
    with pytest.raises(RuntimeError, match=r"^a bug$"):
        fail_halfway(tmp_path / "a.nc", RuntimeError("a bug"))


@pytest.mark.parametrize("name", ["a.txt", "a.csv", "a.nc"])
def test_a_path_below_a_file_cannot_be_written(tmp_path: Path, name: str) -> None:
    (tmp_path / "file").touch()
    with pytest.raises(MachineError, match=f"{name}: cannot be written; found Not a directory"):
        write(tmp_path / "file" / name)
    assert contents(tmp_path) == {"file": b""}


@pytest.mark.parametrize("name", ["a.txt", "a.csv", "a.nc"])
def test_a_file_in_no_folder_cannot_be_written(tmp_path: Path, name: str) -> None:
    with pytest.raises(MachineError, match=f"{name}: cannot be written; found No such file or directory"):
        write(tmp_path / "none" / name)
    assert contents(tmp_path) == {}


@pytest.mark.parametrize("name", ["a.txt", "a.csv", "a.nc"])
def test_a_full_disk_is_said_and_keeps_the_old_file(small_disk: Path, name: str) -> None:
    path = small_disk / name
    path.write_bytes(b"old")
    with pytest.raises(MachineError, match=f"{name}: cannot be written; found the disk is full; free some") as caught:
        write(path)
    assert caught.value.exit_code == 4
    assert contents(small_disk) == {name: b"old"}


def write(path: Path) -> None:
    """Write about 800 kB that do not compress."""
    noise = np.random.default_rng(5).random(100_000)
    if path.suffix == ".txt":
        write_text(path, str(noise.tolist()))
    elif path.suffix == ".csv":
        store.write_table(path, pd.DataFrame({"noise": noise}))
    else:
        store.write_dataset(path, xr.Dataset({"noise": ("sample", noise)}), {})


def test_make_folder_makes_parents_and_accepts_what_is_there(tmp_path: Path) -> None:
    assert make_folder(tmp_path / "a" / "b").is_dir()
    assert make_folder(tmp_path / "a" / "b") == tmp_path / "a" / "b"


def test_a_folder_that_is_a_file_is_refused(tmp_path: Path) -> None:
    (tmp_path / "out").touch()
    with pytest.raises(MachineError, match=r"out: cannot be used as a folder; .*found a file; name another output"):
        make_folder(tmp_path / "out")


def test_a_folder_below_a_file_is_refused(tmp_path: Path) -> None:
    (tmp_path / "out").touch()
    with pytest.raises(MachineError, match="the folder cannot be made; found Not a directory"):
        make_folder(tmp_path / "out" / "chains")


def test_a_folder_without_permission_is_refused(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def refuse(self: Path, *_: object, **__: object) -> None:
        raise PermissionError(errno.EACCES, "Permission denied", str(self))

    monkeypatch.setattr(Path, "mkdir", refuse)  # the tests may run as a user whom no permission stops
    with pytest.raises(
        MachineError, match="the folder cannot be made; found no permission to write there; name another"
    ):
        make_folder(tmp_path / "out")


def test_leftovers_of_a_killed_run_are_cleared_and_nothing_else(tmp_path: Path) -> None:
    # A process that is killed inside the block leaves its temporary file, as this one does by never leaving it.
    unfinished = replacing(make_folder(tmp_path / "chains") / "a.nc")
    unfinished.__enter__().write_text("half")
    kept = tmp_path / "chains" / "b.nc"
    kept.write_text("whole")
    assert len(contents(tmp_path / "chains")) == 2
    clear_leftovers(tmp_path)
    assert contents(tmp_path / "chains") == {"b.nc": b"whole"}
    with pytest.raises(ZeroDivisionError, match="ended"):
        unfinished.gen.throw(ZeroDivisionError("ended"))


def test_a_leftover_cannot_be_taken_for_a_result(tmp_path: Path) -> None:
    with replacing(tmp_path / "a.nc") as temporary:
        temporary.write_text("half")
        assert list(tmp_path.glob("[!.]*.nc")) == []


def test_a_checksum_is_the_sha256_of_the_bytes(tmp_path: Path) -> None:
    path = tmp_path / "a.txt"
    path.write_bytes(b"abc")
    # NIST FIPS 180-2, appendix B.1: the digest of "abc".
    assert checksum(path) == "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad"
    path.write_bytes(b"abc" * 1_000_000)
    assert checksum(path) == hashlib.sha256(b"abc" * 1_000_000).hexdigest()
