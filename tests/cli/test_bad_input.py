"""Bad input from end to end: a clear message, the right exit code, and the other deliveries finished."""

from __future__ import annotations

import csv
import gzip
import os
import subprocess
from collections.abc import Callable, Iterator
from pathlib import Path

import pytest
import xarray as xr
from typer.testing import CliRunner, Result

from profiles.cli import app

WIDE = "deliveries/halcyon/TB-07.csv.gz"
HEAD = 4  # lines above the first row of the wide delivery


def run(array: Path, out: Path, *options: str) -> Result:
    """Run up to the quality control, in this process."""
    arguments = ["run", array / "array.toml", "--out", out, "--workers", "1", "--until", "qc", *options]
    result = CliRunner().invoke(app, [str(argument) for argument in arguments])
    assert "Traceback" not in result.output
    return result


def lines_of(array: Path) -> list[str]:
    return gzip.decompress((array / WIDE).read_bytes()).decode().splitlines()


def write_lines(array: Path, lines: list[str]) -> None:
    (array / WIDE).write_bytes(gzip.compress("".join(f"{line}\n" for line in lines).encode(), mtime=0))


def edit(path: Path, old: str, new: str) -> None:
    text = path.read_text(encoding="utf-8")
    assert old in text
    path.write_text(text.replace(old, new, 1), encoding="utf-8")


def accounts(out: Path) -> dict[str, dict[str, str]]:
    """Read the table of deliveries, a row per mooring."""
    with (out / "tables" / "deliveries.csv").open(encoding="utf-8", newline="") as stream:
        return {row["mooring"]: row for row in csv.DictReader(stream)}


# --------------------------------------------------------------------------------------------------------------
# A delivery that cannot be used


def remove(array: Path) -> None:
    (array / WIDE).unlink()


def put_folder(array: Path) -> None:
    (array / WIDE).unlink()
    (array / WIDE).mkdir()


def put_binary(array: Path) -> None:
    (array / WIDE).write_bytes(bytes(range(256)) * 40)


def put_nothing(array: Path) -> None:
    (array / WIDE).write_bytes(b"")


def put_half_a_packed_file(array: Path) -> None:
    (array / WIDE).write_bytes((array / WIDE).read_bytes()[:5000])


def keep_header(array: Path) -> None:
    write_lines(array, lines_of(array)[:HEAD])


def repeat_depth(array: Path) -> None:
    lines = lines_of(array)
    assert ",T_40m," in lines[HEAD - 1]
    lines[HEAD - 1] = lines[HEAD - 1].replace(",T_40m,", ",T_10m,")
    write_lines(array, lines)


def repeat_depth_in_other_words(array: Path) -> None:
    lines = lines_of(array)
    lines[HEAD - 1] = lines[HEAD - 1].replace(",T_40m,", ",T_10.0m,")
    write_lines(array, lines)


def misspell_layout(array: Path) -> None:
    edit(array / "layouts" / "halcyon_wide.toml", "comment =", "coment =")


def remove_layout(array: Path) -> None:
    (array / "layouts" / "halcyon_wide.toml").unlink()


def deliver_another_site(array: Path) -> None:
    edit(array / "array.toml", WIDE, "deliveries/frigate/TB-28.nc")
    edit(array / "array.toml", "halcyon_wide", "frigate_netcdf")


@pytest.mark.parametrize(
    ("spoil", "file", "parts"),
    [
        (remove, WIDE, ("no such file", "expected a delivery", "check the path")),
        (put_folder, WIDE, ("is a folder", "expected a file", "name the file in it")),
        (put_binary, WIDE, ("is a binary file", "expected text", "found it begins with", "give the layout")),
        (put_nothing, WIDE, ("the file is empty", "expected a delivery", "found 0 bytes", "fetch it again")),
        (
            put_half_a_packed_file,
            WIDE,
            ("the compressed file is damaged", "found Compressed file ended", "fetch it again"),
        ),
        (keep_header, WIDE, ("there are no data rows", "expected at least one", "found only a header")),
        (repeat_depth, WIDE, ("there are 2 columns of this name", "T_10m", "found 'date', 'T_1m'", "layout")),
        (repeat_depth_in_other_words, WIDE, ("depth", "found", "10")),
        (misspell_layout, "layouts/halcyon_wide.toml", ("this key is not known", "did you mean 'comment'?")),
        (remove_layout, "layouts/halcyon_wide.toml", ("no such file", "expected a TOML file")),
        (deliver_another_site, "deliveries/frigate/TB-28.nc", ("of another l", "expected", "found", "check that")),
    ],
    ids=lambda value: getattr(value, "__name__", ""),
)
def test_unusable_delivery_is_explained_and_the_others_are_finished(
    array: Path, tmp_path: Path, spoil: Callable[[Path], None], file: str, parts: tuple[str, ...]
) -> None:
    spoil(array)
    out = tmp_path / "out"
    result = run(array, out)
    assert result.exit_code == 5
    told = result.stderr.split("thermotilt: ")
    assert len(told) == 2  # one message
    assert told[1].startswith("TB-07 not used (ingest): ")
    for part in (file, *parts):
        assert part in told[1]
    assert "2 of 3 moorings used" in result.stdout
    assert sorted(path.name for path in (out / "chains").iterdir()) == ["TB-18.nc", "TB-28.nc"]
    assert [accounts(out)[mooring]["outcome"] for mooring in ("TB-07", "TB-18", "TB-28")] == [
        "not used",
        "used",
        "used",
    ]


def test_one_of_two_deliveries_of_a_mooring_is_enough_for_it(array: Path, tmp_path: Path) -> None:
    layout = "layouts/halcyon_wide.toml"
    edit(
        array / "array.toml",
        f'deliveries = [{{ path = "{WIDE}", layout = "{layout}" }}]',
        f'deliveries = [{{ path = "{WIDE}", layout = "{layout}" }}, {{ path = "late.csv", layout = "{layout}" }}]',
    )
    result = run(array, tmp_path / "out")
    assert result.exit_code == 5
    assert "TB-07 not used (ingest): late.csv: no such file" in result.stderr
    assert (tmp_path / "out" / "chains" / "TB-07.nc").is_file()


# --------------------------------------------------------------------------------------------------------------
# Rows that make no sense, or stand in the wrong place


def test_times_out_of_order_are_sorted_and_told(array: Path, tmp_path: Path, finished: Path) -> None:
    lines = lines_of(array)
    rows = lines[HEAD:]
    write_lines(array, lines[:HEAD] + rows[400:] + rows[:400])
    result = run(array, tmp_path / "out")
    assert result.exit_code == 0
    moved = int(accounts(tmp_path / "out")["TB-07"]["rows_reordered"])
    damaged = 4  # rows that are quarantined, all of them among the first 400 or not
    assert 400 - damaged <= moved <= 400
    assert f"{moved} rows stood out of order and were sorted: tables/deliveries.csv" in result.stdout
    with (
        xr.open_dataset(tmp_path / "out" / "chains" / "TB-07.nc") as chain,
        xr.open_dataset(finished / "chains" / "TB-07.nc") as expected,
    ):
        xr.testing.assert_equal(chain["temperature"], expected["temperature"])


def test_duplicated_times_are_quarantined_with_their_lines(array: Path, tmp_path: Path) -> None:
    lines = lines_of(array)
    write_lines(array, [*lines[: HEAD + 10], lines[HEAD + 9], *lines[HEAD + 10 :]])
    result = run(array, tmp_path / "out")
    assert result.exit_code == 0
    with (tmp_path / "out" / "tables" / "quarantine.csv").open(encoding="utf-8", newline="") as stream:
        entries = [row for row in csv.DictReader(stream) if row["file"] == WIDE and int(row["line"]) == HEAD + 11]
    assert len(entries) == 1
    assert entries[0]["text"] == lines[HEAD + 9]
    assert f"line {HEAD + 10}" in entries[0]["reason"]


def test_check_tells_of_sorted_rows(array: Path) -> None:
    lines = lines_of(array)
    write_lines(array, [*lines[:HEAD], lines[HEAD + 1], lines[HEAD], *lines[HEAD + 2 :]])
    result = CliRunner().invoke(app, ["check", str(array / "array.toml")])
    assert "1 rows are earlier than a row before them; they are sorted" in result.stdout


# --------------------------------------------------------------------------------------------------------------
# A request that is wrong


@pytest.mark.parametrize(
    ("old", "new", "parts"),
    [
        (
            'name = "Tropicbird Array"',
            'name = "Tropicbird Array"\ninstitusion = "X"',
            ("array.institusion: this key is not known", "did you mean 'institution'?"),
        ),
        (
            'id = "TB-18"',
            'id = "TB-07"',
            (
                "moorings: this id is given to more than one mooring",
                "expected each id once",
                "found TB-07",
                "rename one",
            ),
        ),
        ("latitude = 2.5", "latitude = 95.0", ("moorings #1.latitude", "less than or equal to 90", "found 95.0")),
        ("latitude = 2.5", "", ("moorings #1.latitude: this key is missing", "add it")),
        ("latitude = 2.5", "latitude = ", ("not TOML", "line 15")),
    ],
    ids=["unknown key", "two moorings with one id", "latitude 95", "no latitude", "no TOML"],
)
def test_wrong_configuration_exits_2_before_any_work(
    array: Path, tmp_path: Path, old: str, new: str, parts: tuple[str, ...]
) -> None:
    edit(array / "array.toml", old, new)
    result = run(array, tmp_path / "out")
    assert result.exit_code == 2
    assert result.stdout == ""
    for part in (f"thermotilt: {array / 'array.toml'}: 1 problem in this file\n", *parts):
        assert part in result.stderr
    assert not (tmp_path / "out").exists()


def test_missing_configuration_names_its_neighbour(array: Path, tmp_path: Path) -> None:
    result = CliRunner().invoke(app, ["run", str(array / "arrays.toml"), "--out", str(tmp_path / "out")])
    assert result.exit_code == 2
    assert result.stderr == (
        f"thermotilt: {array / 'arrays.toml'}: no such file; expected a TOML file; "
        f"did you mean {array / 'array.toml'}?\n"
    )


# --------------------------------------------------------------------------------------------------------------
# A machine that fails


@pytest.mark.parametrize("below", ["array.toml", "array.toml/out"])
def test_output_folder_that_cannot_be_written_exits_4(array: Path, below: str) -> None:
    result = run(array, array / below)
    assert result.exit_code == 4
    assert result.stderr.startswith(f"thermotilt: {array / below}: ")
    for part in ("found ", "name another output folder"):
        assert part in result.stderr


@pytest.mark.skipif(not Path("/proc/self").exists(), reason="there is no folder that nobody can write to")
def test_output_folder_of_the_kernel_exits_4(array: Path) -> None:
    result = run(array, Path("/proc/out"))
    assert result.exit_code == 4
    assert "/proc/out: the folder cannot be made; found " in result.stderr


@pytest.fixture
def small_disk(tmp_path: Path) -> Iterator[Path]:
    """A file system of 300 kB; the deliveries of the small array fit on it as ingested, the flagged chains do not."""
    disk = tmp_path / "disk"
    disk.mkdir()
    mounted = os.geteuid() == 0 and _done("mount", "-t", "tmpfs", "-o", "size=300k", "tmpfs", str(disk))
    if not mounted:
        pytest.skip("no file system can be mounted here: that takes the rights of the administrator")
    yield disk
    # Lazily: the file library keeps a file open that it failed to write.
    assert _done("umount", "--lazy", str(disk))


def _done(*command: str) -> bool:
    return subprocess.run(command, capture_output=True, check=False).returncode == 0


def test_full_disk_is_called_so_and_the_run_goes_on_after_space_is_made(
    array: Path, small_disk: Path, finished: Path, contents: Callable[[Path], dict[str, bytes]]
) -> None:
    out = small_disk / "out"
    result = run(array, out)
    assert result.exit_code == 4
    assert "cannot be written; found the disk is full; free some space" in result.stderr
    assert f"{out}/" in result.stderr
    assert not list(out.rglob(".part-*"))
    assert not (out / "run.json").exists()
    assert _done("mount", "-o", "remount,size=40m", str(small_disk))
    again = run(array, out)
    assert again.exit_code == 0
    assert "kept from an earlier run 0" not in again.stdout
    written = contents(out)
    assert written == {name: data for name, data in contents(finished).items() if name in written}
    assert "chains/TB-28.nc" in written
