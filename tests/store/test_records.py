"""Records, the lock of a run's folder, and the date that stands for the version of the data."""

from __future__ import annotations

import os
import subprocess
import sys
import time
from collections.abc import Iterator
from pathlib import Path

import pytest

from profiles.errors import MachineError, RequestError
from profiles.store import date_of, folder_lock, read_record, write_record

HOLD = """
import sys
from pathlib import Path
from profiles.store import folder_lock

with folder_lock(Path(sys.argv[1])):
    print("held", flush=True)
    sys.stdin.read()
"""


def test_a_record_comes_back_with_its_keys_in_order(tmp_path: Path) -> None:
    record = {"z": 1, "a": [1.5, None, "20 °C"], "m": {"k": True}}
    write_record(tmp_path / "run.json", record)
    back = read_record(tmp_path / "run.json")
    assert back == record
    assert list(back) == ["z", "a", "m"]
    assert (tmp_path / "run.json").read_bytes().endswith(b"}\n")
    assert "20 °C" in (tmp_path / "run.json").read_text(encoding="utf-8")


@pytest.mark.parametrize("value", [float("nan"), float("inf")])
def test_a_record_holds_no_number_that_json_does_not_know(tmp_path: Path, value: float) -> None:
    with pytest.raises(ValueError, match="not JSON compliant"):
        write_record(tmp_path / "run.json", {"share": value})
    assert list(tmp_path.iterdir()) == []


@pytest.mark.parametrize("content", [b"", b'{"a": 1', b"[1, 2]", b"\xff\xfe", b"3"])
def test_a_record_that_cannot_be_read_is_none(tmp_path: Path, content: bytes) -> None:
    (tmp_path / "run.json").write_bytes(content)
    assert read_record(tmp_path / "run.json") is None


def test_a_missing_record_is_none(tmp_path: Path) -> None:
    assert read_record(tmp_path / "run.json") is None


def test_a_second_holder_of_a_folder_is_refused_until_the_first_ends(tmp_path: Path) -> None:
    folder = tmp_path / "out" / "state"
    folder.mkdir(parents=True)
    with subprocess.Popen(
        [sys.executable, "-c", HOLD, str(folder)], stdin=subprocess.PIPE, stdout=subprocess.PIPE, text=True
    ) as holder:
        assert holder.stdout is not None
        assert holder.stdin is not None
        assert holder.stdout.readline() == "held\n"
        message = f"^{folder.parent}: another run is writing to this folder; .*--out"
        with pytest.raises(RequestError, match=message), folder_lock(folder):
            pass
        holder.stdin.close()
    with folder_lock(folder):
        pass


def test_the_lock_of_a_killed_run_holds_nobody_up(tmp_path: Path) -> None:
    holder = subprocess.Popen(
        [sys.executable, "-c", HOLD, str(tmp_path)], stdin=subprocess.PIPE, stdout=subprocess.PIPE, text=True
    )
    with holder:
        assert holder.stdout is not None
        assert holder.stdout.readline() == "held\n"
        holder.kill()
    assert (tmp_path / "lock").exists()
    with folder_lock(tmp_path):
        pass


def test_the_lock_is_given_back_after_an_error(tmp_path: Path) -> None:
    with pytest.raises(ZeroDivisionError, match="in the run"), folder_lock(tmp_path):
        raise ZeroDivisionError("in the run")
    with folder_lock(tmp_path):
        pass


def test_a_lock_in_no_folder_is_a_fault_of_the_machine(tmp_path: Path) -> None:
    with (
        pytest.raises(MachineError, match="lock: cannot be written; found No such file"),
        folder_lock(tmp_path / "none"),
    ):
        pass


def test_what_fails_in_the_run_is_not_laid_at_the_lock(tmp_path: Path) -> None:
    with pytest.raises(FileNotFoundError, match="gone"), folder_lock(tmp_path):
        raise FileNotFoundError("gone")


@pytest.fixture
def far_from_greenwich(monkeypatch: pytest.MonkeyPatch) -> Iterator[None]:
    with monkeypatch.context() as patch:
        patch.setenv("TZ", "FAR-14")  # 14 hours ahead of UTC, in the notation of POSIX
        time.tzset()
        yield
    time.tzset()


@pytest.mark.usefixtures("far_from_greenwich")
def test_the_date_of_files_is_their_last_change_in_utc(tmp_path: Path) -> None:
    files = [tmp_path / name for name in "abc"]
    # 2001-09-09T01:46:40Z is the second 1 000 000 000 of the clock that counts from 1970.
    for file, second in zip(files, (1e9 - 5.0, 1e9 + 0.9, 0.0), strict=True):
        file.touch()
        os.utime(file, (second, second))
    assert date_of(files) == date_of(reversed(files)) == "2001-09-09T01:46:40Z"
    assert date_of(iter(files[2:])) == "1970-01-01T00:00:00Z"
