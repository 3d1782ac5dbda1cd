"""The command line: exit codes, what is printed where, and in which form."""

from __future__ import annotations

import json
import subprocess
import sys
from importlib.metadata import version
from pathlib import Path

import pytest
from typer.testing import CliRunner, Result

from profiles import pipeline
from profiles.cli import app
from profiles.errors import MachineError
from profiles.vocabulary import CAUTION


def call(*arguments: str | Path) -> Result:
    return CliRunner().invoke(app, [str(argument) for argument in arguments])


@pytest.fixture
def lame_array(array: Path) -> Path:
    """The small array, one of its deliveries absent."""
    (array / "deliveries" / "marlin" / "TB-18.csv.gz").unlink()
    return array


# --------------------------------------------------------------------------------------------------------------
# run


def test_run_over_finished_work_prints_rows_tasks_results_and_the_caution(small_array: Path, out: Path) -> None:
    result = call("run", small_array / "array.toml", "--out", out, "--workers", "1")
    assert result.exit_code == 0
    account = json.loads((out / "run.json").read_text(encoding="utf-8"))
    rows, latest = account["rows"], account["latest"]
    lines = result.stdout.splitlines()
    assert lines[0] == "Tropicbird Array: 3 of 3 moorings used"
    assert lines[1] == (
        f"rows read {rows['rows_read']} = kept {rows['rows_kept']} + quarantined {rows['rows_quarantined']}"
    )
    assert lines[2].startswith(f"{rows['rows_quarantined']} rows were not understood: tables/quarantine.csv")
    assert lines[3] == "tasks computed 0, kept from an earlier run 17"
    assert lines[4] == "2032-06, with 95 % intervals:"
    # volume in 10^14 m3, half-widths 1.96 standard errors
    volume, error = latest["warm_water_volume"] / 1e14, latest["warm_water_volume_error"] / 1e14
    assert lines[5] == f"  warm water volume {volume:.2f} ± {1.96 * error:.2f} × 10^14 m3 (5S-5N, 120E-80W)"
    slope, error = latest["thermocline_slope"], latest["thermocline_slope_error"]
    assert lines[6] == (f"  thermocline slope {slope:.2f} ± {1.96 * error:.2f} m per 1000 km eastward (165E to 265E)")
    assert lines[7:] == [CAUTION, f"see {out / 'report.html'}"]
    assert result.stderr.splitlines() == [
        "ingest: 3 kept",
        "qc: 3 kept",
        "column: 3 kept",
        "section: 1 kept",
        "report: 4 kept",
    ]


def test_json_is_one_document_and_nothing_else(small_array: Path, out: Path) -> None:
    result = call("run", small_array / "array.toml", "--out", out, "--workers", "1", "--json")
    document = json.loads(result.stdout)
    assert result.stderr == ""
    assert document["exit_code"] == result.exit_code == 0
    assert document["tasks"] == {"computed": 0, "kept": 17}
    assert document["moorings"] == ["TB-07", "TB-18", "TB-28"]
    assert document["out"] == str(out)


def test_quiet_prints_nothing(small_array: Path, out: Path) -> None:
    result = call("run", small_array / "array.toml", "--out", out, "--workers", "1", "--quiet")
    assert (result.exit_code, result.output) == (0, "")


def test_quiet_still_tells_what_could_not_be_used(lame_array: Path, out: Path) -> None:
    result = call("run", lame_array / "array.toml", "--out", out, "--until", "qc", "--workers", "1", "--quiet")
    assert result.exit_code == 5
    assert result.stdout == ""
    assert result.stderr == (
        "thermotilt: TB-18 not used (ingest): deliveries/marlin/TB-18.csv.gz: no such file; "
        "expected a delivery; check the path\n"
    )


def test_until_ends_early_and_points_at_the_folder(small_array: Path, tmp_path: Path) -> None:
    out = tmp_path / "out"
    result = call("run", small_array / "array.toml", "--out", out, "--until", "ingest", "--workers", "1")
    assert result.exit_code == 0
    assert result.stdout.splitlines()[-1] == f"see {out}"
    assert not list((out / "chains").iterdir())


def test_output_folder_is_named_after_the_configuration(
    small_array: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(tmp_path)
    assert call("run", small_array / "array.toml", "--until", "ingest", "--workers", "1").exit_code == 0
    assert (tmp_path / "out" / "array" / "run.json").is_file()


# --------------------------------------------------------------------------------------------------------------
# Exit codes


def test_unknown_stage_exits_2(small_array: Path, tmp_path: Path) -> None:
    result = call("run", small_array / "array.toml", "--out", tmp_path / "out", "--until", "map")
    assert result.exit_code == 2
    assert result.stderr == (
        "thermotilt: --until: no such stage; expected ingest, qc, column, section, report; found 'map'\n"
    )


@pytest.mark.parametrize("arguments", [["run"], ["sail"], ["run", "a.toml", "--workers", "many"], ["run", "--sail"]])
def test_wrong_usage_exits_2(arguments: list[str]) -> None:
    result = call(*arguments)
    assert result.exit_code == 2
    assert "Usage: " in result.stderr
    assert "Traceback" not in result.output


def test_no_usable_delivery_exits_3(array: Path, tmp_path: Path) -> None:
    for delivery in (array / "deliveries").glob("*/TB-*"):
        delivery.unlink()
    result = call("run", array / "array.toml", "--out", tmp_path / "out", "--workers", "1", "--quiet")
    assert result.exit_code == 3
    assert result.stderr.startswith("thermotilt: no delivery could be used; expected at least one mooring")
    assert result.stderr.count("no such file") == 3
    assert "`thermotilt check` lists everything" in result.stderr


def test_failure_of_the_machine_exits_4(small_array: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def fail(*arguments: object, **settings: object) -> None:
        raise MachineError("cannot be written", where="chains/TB-07.nc", found="the disk is full")

    monkeypatch.setattr(pipeline, "run", fail)
    result = call("run", small_array / "array.toml", "--out", tmp_path / "out")
    assert result.exit_code == 4
    assert result.stderr == "thermotilt: chains/TB-07.nc: cannot be written; found the disk is full\n"


def test_fault_of_ours_exits_70_with_what_is_needed_to_find_it(
    small_array: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    def fail(*arguments: object, **settings: object) -> None:
        raise ZeroDivisionError("a slip")

    monkeypatch.setattr(pipeline, "run", fail)
    result = call("run", small_array / "array.toml", "--out", tmp_path / "out")
    assert result.exit_code == 70
    assert result.stdout == ""
    assert "Traceback" in result.stderr
    assert result.stderr.endswith(
        "thermotilt: a fault of ours: ZeroDivisionError('a slip'); please report it with the lines above\n"
    )


def test_interrupt_exits_130(small_array: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def interrupt(*arguments: object, **settings: object) -> None:
        raise KeyboardInterrupt

    monkeypatch.setattr(pipeline, "run", interrupt)
    result = call("run", small_array / "array.toml", "--out", tmp_path / "out", "--json")
    assert result.exit_code == 130
    assert json.loads(result.stdout)["exit_code"] == 130


def test_error_is_one_json_document_where_json_was_asked_for(tmp_path: Path) -> None:
    result = call("run", tmp_path / "absent.toml", "--json")
    document = json.loads(result.stdout)
    assert result.stderr == ""
    assert document["exit_code"] == result.exit_code == 2
    assert document["error"].startswith(f"{tmp_path / 'absent.toml'}: no such file; expected a TOML file")


# --------------------------------------------------------------------------------------------------------------
# check


def test_check_reports_everything_at_once_and_writes_nothing(lame_array: Path) -> None:
    wide = lame_array / "deliveries" / "halcyon" / "TB-07.csv.gz"
    wide.write_bytes(b"")
    before = sorted(lame_array.rglob("*"))
    result = call("check", lame_array / "array.toml")
    assert result.exit_code == 5
    assert "TB-07: not usable: deliveries/halcyon/TB-07.csv.gz\n    " in result.stdout
    assert "TB-18: not usable: deliveries/marlin/TB-18.csv.gz\n    " in result.stdout
    assert "deliveries: 1 clean, 0 rows sorted, 0 rows quarantined, 2 not usable\n" in result.stdout
    assert sorted(lame_array.rglob("*")) == before


def test_check_counts_rows_and_names_lines(small_array: Path) -> None:
    result = call("check", small_array / "array.toml")
    assert result.exit_code == 0
    assert "TB-07: rows quarantined: " in result.stdout
    assert "    line " in result.stdout
    last = result.stdout.splitlines()[-1].split()
    read, kept, quarantined = int(last[2]), int(last[5]), int(last[8])
    assert read == kept + quarantined > kept


def test_check_exits_3_where_nothing_can_be_used(array: Path) -> None:
    for delivery in (array / "deliveries").glob("*/TB-*"):
        delivery.unlink()
    assert call("check", array / "array.toml", "--quiet").exit_code == 3


def test_check_as_json_has_an_entry_per_delivery(lame_array: Path) -> None:
    result = call("check", lame_array / "array.toml", "--json")
    document = json.loads(result.stdout)
    assert result.stderr == ""
    assert document["exit_code"] == result.exit_code == 5
    assert [entry["outcome"] for entry in document["deliveries"]] == ["rows quarantined", "not usable", "clean"]


def test_check_lists_every_problem_of_a_configuration(array: Path) -> None:
    path = array / "array.toml"
    text = path.read_text(encoding="utf-8").replace("latitude = 2.5", "latitude = 95.0").replace("TB-28", "TB-18", 1)
    path.write_text(text + "[sections]\nsignal_sd = 3.0\n", encoding="utf-8")
    result = call("check", path)
    assert result.exit_code == 2
    assert result.stderr.startswith(f"thermotilt: {path}: 3 problems in this file\n")
    for part in ("moorings #1.latitude", "this id is given to more than one mooring", "did you mean 'section'?"):
        assert part in result.stderr


# --------------------------------------------------------------------------------------------------------------
# The command itself


def test_version_is_the_distributions() -> None:
    result = call("--version")
    assert (result.exit_code, result.stdout) == (0, f"thermotilt {version('thermotilt')}\n")


def test_help_lists_the_commands_and_imports_nothing_heavy() -> None:
    script = (
        "import sys\n"
        "from typer.testing import CliRunner\n"
        "before = set(sys.modules)\n"
        "from profiles.cli import app\n"
        "print(CliRunner().invoke(app, ['--help']).stdout)\n"
        "heavy = {'numpy', 'xarray', 'pandas', 'matplotlib', 'numba', 'netCDF4', 'pydantic', 'dask', 'scipy'}\n"
        "print('heavy:', sorted(heavy & (set(sys.modules) - before)))\n"
    )
    done = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True, check=True)
    assert "heavy: []" in done.stdout
    for command in ("draft", "check", "run", "precursor", "validate"):
        assert f"\n  {command} " in done.stdout


def test_real_command_leaves_with_the_exit_code_of_the_error(tmp_path: Path) -> None:
    script = "from profiles.cli import main; main()"
    done = subprocess.run(
        [sys.executable, "-c", script, "run", str(tmp_path)], capture_output=True, text=True, check=False
    )
    assert done.returncode == 2
    assert done.stderr == (f"thermotilt: {tmp_path}: is a folder; expected a TOML file; name the file in it\n")
