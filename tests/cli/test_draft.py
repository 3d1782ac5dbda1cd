"""``thermotilt draft``: what it prints, what it writes, and how it ends."""

from __future__ import annotations

import json
from pathlib import Path

import pytest
from typer.testing import CliRunner, Result

from profiles.cli import app
from profiles.ingest import load_layout, read

ROWS = [f"2031-01-{day:02d} 12:00;{28 - day / 10:.1f};{24 - day / 10:.1f}".replace(".", ",") for day in range(1, 31)]
TEXT = "\n".join(["Zeit;T 1 m;T 12,5 m", *ROWS, "30.1.2031;x"]) + "\n"


def call(*arguments: str | Path) -> Result:
    result = CliRunner().invoke(app, ["draft", *(str(argument) for argument in arguments)])
    assert "Traceback" not in result.output
    return result


@pytest.fixture
def unknown(tmp_path: Path) -> Path:
    path = tmp_path / "unknown.txt"
    path.write_text(TEXT, encoding="utf-8")
    return path


def test_the_screen_shows_header_rows_doubts_account_and_layout(unknown: Path) -> None:
    result = call(unknown)
    assert (result.exit_code, result.stderr) == (0, "")
    lines = result.stdout.splitlines()
    assert lines[0] == f"{unknown}: plain, utf-8, 32 lines; cells between semicolons, decimal comma"
    assert lines[1] == "kind: wide"
    assert "  line 1: Zeit;T 1 m;T 12,5 m    <- names of the columns" in lines
    assert "  1 'Zeit': time" in lines
    assert "  2-3 'T 1 m' ...: temperature at 1, 12.5" in lines
    shown = lines.index("  line 2: 2031-01-01 12:00;27,9;23,9")
    assert lines[shown + 1] == "    2031-01-01T12:00:00Z  1: 27.9  12.5: 23.9"
    shown = lines.index("  line 31: 2031-01-30 12:00;25,0;21,0")
    assert lines[shown + 1] == "    2031-01-30T12:00:00Z  1: 25  12.5: 21"
    assert "  - time zone: UTC (the file does not state it)" in lines
    assert "rows read 31 = kept 30 + quarantined 1" in lines
    assert "  1 quarantined, the first in line 32: 2 cells where there are 3 columns" in lines
    assert 'pattern = "T {depth} m"' in lines


def test_json_is_one_document_and_nothing_else(unknown: Path) -> None:
    result = call(unknown, "--json")
    document = json.loads(result.stdout)
    assert (result.exit_code, result.stderr, document["exit_code"]) == (0, "", 0)
    assert document["layout"]["depth"]["pattern"] == "T {depth} m"
    assert document["first"][0]["time"] == "2031-01-01T12:00:00Z"
    assert document["first"][0]["readings"] == [
        {"depth": 1.0, "temperature": 27.9},
        {"depth": 12.5, "temperature": 23.9},
    ]
    assert document["rows"] == {"read": 31, "kept": 30, "quarantined": 1}
    assert {doubt["about"] for doubt in document["unsure"]} >= {"time zone", "temperature scale"}


def test_quiet_prints_only_what_is_unsure_or_wrong(unknown: Path) -> None:
    lines = call(unknown, "--quiet").stdout.splitlines()
    assert lines[0] == "unsure"
    assert all(line.startswith("  ") for line in lines[1:])
    assert lines[-1] == "  1 quarantined, the first in line 32: 2 cells where there are 3 columns"


def test_the_written_layout_reads_the_file(unknown: Path, tmp_path: Path) -> None:
    target = tmp_path / "layout.toml"
    result = call(unknown, "--write", target)
    assert result.exit_code == 0
    assert f"layout written to {target}" in result.stdout.splitlines()
    assert read(unknown, load_layout(target)).rows_kept == 30
    assert sorted(path.name for path in tmp_path.iterdir()) == ["layout.toml", "unknown.txt"]


def test_a_file_that_is_there_is_replaced_only_when_told(unknown: Path, tmp_path: Path) -> None:
    target = tmp_path / "layout.toml"
    target.write_text("mine", encoding="utf-8")
    result = call(unknown, "--write", target)
    assert result.exit_code == 2
    assert "this file is already there" in result.stderr
    assert "--overwrite" in result.stderr
    assert target.read_text(encoding="utf-8") == "mine"
    assert call(unknown, "--write", target, "--overwrite").exit_code == 0
    assert target.read_text(encoding="utf-8").startswith("# Drafted from unknown.txt")


def test_the_delivery_is_never_the_target(unknown: Path) -> None:
    result = call(unknown, "--write", unknown, "--overwrite")
    assert result.exit_code == 2
    assert "is the file that is looked at" in result.stderr
    assert unknown.read_text(encoding="utf-8") == TEXT


@pytest.mark.parametrize(
    ("options", "code", "words"),
    [
        (["--depths", "1,x"], 2, "no list of numbers"),
        (["--depths", "-1,5"], 2, "no depths of sensors"),
        (["--write", "absent/layout.toml"], 2, "no such folder"),
    ],
)
def test_wrong_requests_end_with_2(unknown: Path, options: list[str], code: int, words: str) -> None:
    result = call(unknown, *options)
    assert (result.exit_code, result.stdout) == (code, "")
    assert words in result.stderr


def test_a_file_that_is_not_there_ends_with_2_and_one_without_a_layout_with_3(tmp_path: Path) -> None:
    assert call(tmp_path / "absent.txt").exit_code == 2
    letter = tmp_path / "letter.txt"
    letter.write_text("Dear all,\nthere is no data here.\n", encoding="utf-8")
    result = call(letter, "--write", tmp_path / "layout.toml", "--json")
    assert (result.exit_code, json.loads(result.stdout)["exit_code"]) == (3, 3)
    assert "no layout is found that fits" in json.loads(result.stdout)["error"]
    assert not (tmp_path / "layout.toml").exists()


def test_depths_complete_a_file_that_has_none(tmp_path: Path) -> None:
    path = tmp_path / "unknown.txt"
    path.write_text(TEXT.replace("T 1 m;T 12,5 m", "oben;unten"), encoding="utf-8")
    assert call(path).exit_code == 3
    result = call(path, "--depths", "2,30")
    assert result.exit_code == 0
    assert "    2031-01-01T12:00:00Z  2: 27.9  30: 23.9" in result.stdout.splitlines()
