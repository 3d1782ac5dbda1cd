"""The whole job: what it writes, what it keeps, what it does again, what it accounts for."""

from __future__ import annotations

import csv
import gzip
import hashlib
import json
import os
import shutil
from collections.abc import Callable
from pathlib import Path

import netCDF4
import pandas as pd
import pytest

from profiles.config import load_config
from profiles.errors import DataError, MachineError, RequestError
from profiles.pipeline import STAGES, Event, Outcome, run

MOORINGS = ("TB-07", "TB-18", "TB-28")
WIDE = "deliveries/halcyon/TB-07.csv.gz"
LONG = "deliveries/marlin/TB-18.csv.gz"
NETCDF = "deliveries/frigate/TB-28.nc"
Contents = Callable[[Path], dict[str, bytes]]


def ran(array: Path, out: Path, until: str = "section", workers: int = 1) -> tuple[Outcome, list[Event]]:
    events: list[Event] = []
    outcome = run(load_config(array / "array.toml"), out, until=until, workers=workers, progress=events.append)
    return outcome, events


def computed(events: list[Event]) -> set[tuple[str, str]]:
    return {(event.stage, event.name) for event in events if event.outcome == "computed"}


def shorten(delivery: Path) -> None:
    """Take the last row of a gzipped delivery away."""
    lines = gzip.decompress(delivery.read_bytes()).splitlines(keepends=True)
    delivery.write_bytes(gzip.compress(b"".join(lines[:-1]), mtime=0))


# --------------------------------------------------------------------------------------------------------------
# What is written


def test_full_run_writes_the_files_of_the_design_and_no_others(finished: Path) -> None:
    found = {
        path.relative_to(finished).as_posix()
        for path in finished.rglob("*")
        if path.is_file() and ".stages" not in path.parts
    }
    array_figures = ("data_return", "map", "section", "tilt", "time_longitude", "time_longitude_anomaly", "volume")
    tables = ("data_return", "deliveries", "faults", "gaps", "quarantine", "volume_and_tilt")
    assert found == {
        "columns.nc",
        "columns_monthly.nc",
        "section.nc",
        "volume.nc",
        "report.html",
        "run.json",
        *(f"chains/{mooring}.nc" for mooring in MOORINGS),
        *(f"columns/{mooring}.nc" for mooring in MOORINGS),
        *(f"figures/mooring_{mooring}.png" for mooring in MOORINGS),
        *(f"figures/{name}.png" for name in array_figures),
        *(f"tables/{name}.csv" for name in tables),
    }


def test_same_inputs_elsewhere_give_the_same_bytes(
    array: Path, finished: Path, tmp_path: Path, contents: Contents
) -> None:
    ran(array, tmp_path / "elsewhere")
    elsewhere = contents(tmp_path / "elsewhere")
    kinds = (".nc", ".csv")
    assert elsewhere == {name: data for name, data in contents(finished).items() if name.endswith(kinds)}


def test_unusable_delivery_is_described_in_the_same_bytes_wherever_it_lies(array: Path, tmp_path: Path) -> None:
    (array / WIDE).unlink()
    moved = shutil.copytree(array, tmp_path / "moved")
    for folder in (array, moved):
        outcome, _ = ran(folder, folder / "out", until="ingest")
        assert outcome.exit_code == 5
    table = (moved / "out" / "tables" / "deliveries.csv").read_bytes()
    assert table == (array / "out" / "tables" / "deliveries.csv").read_bytes()
    assert f"{WIDE}: no such file".encode() in table


def test_two_workers_give_the_same_bytes_as_one(
    array: Path, finished: Path, tmp_path: Path, contents: Contents
) -> None:
    ran(array, tmp_path / "two", workers=2)
    two = contents(tmp_path / "two")
    assert len(two) > 30
    assert two == {name: data for name, data in contents(finished).items() if name in two}


def test_one_mooring_alone_is_mapped(array: Path, tmp_path: Path) -> None:
    text = (array / "array.toml").read_text(encoding="utf-8").split("[[moorings]]")
    (array / "array.toml").write_text("[[moorings]]".join(text[:2]), encoding="utf-8")
    outcome, _ = ran(array, tmp_path / "one")
    assert outcome.latest is not None
    assert outcome.latest["warm_water_volume_error"] > 0.0


# --------------------------------------------------------------------------------------------------------------
# What is kept and what is done again


def test_second_run_computes_nothing(array: Path, out: Path, contents: Contents) -> None:
    before = contents(out)
    times = {path: path.stat().st_mtime_ns for path in out.rglob("*.nc")}
    outcome, events = ran(array, out, until="report")
    assert outcome.computed == 0
    assert {event.outcome for event in events} == {"kept"}
    assert contents(out) == before
    assert {path: path.stat().st_mtime_ns for path in out.rglob("*.nc")} == times


def test_changed_delivery_is_followed_through_and_no_further(
    array: Path, out: Path, tmp_path: Path, contents: Contents
) -> None:
    shorten(array / WIDE)
    _, events = ran(array, out, until="report")
    per_mooring = {(stage, "TB-07") for stage in ("ingest", "qc", "column", "report")}
    assert computed(events) == per_mooring | {("section", "array"), ("report", "array")}
    ran(array, tmp_path / "fresh")
    fresh = contents(tmp_path / "fresh")
    assert {name: data for name, data in contents(out).items() if name in fresh} == fresh


def test_newer_date_of_the_same_delivery_gives_what_a_fresh_run_gives(
    array: Path, out: Path, tmp_path: Path, contents: Contents
) -> None:
    later = (array / WIDE).stat().st_mtime + 86400.0
    os.utime(array / WIDE, (later, later))
    _, events = ran(array, out)
    assert computed(events) == {("qc", "TB-07"), ("column", "TB-07"), ("section", "array")}
    ran(array, tmp_path / "fresh")
    fresh = contents(tmp_path / "fresh")
    assert {name: data for name, data in contents(out).items() if name in fresh} == fresh


@pytest.mark.parametrize(
    ("setting", "first"),
    [
        ("[column]\nsensor_accuracy = 0.03\n", "ingest"),
        ("[qc.spike]\nthreshold_low = 2.0\n", "qc"),
        ("[column]\nmax_bracket = 45.0\n", "column"),
        ("[section]\nsignal_sd = 10.0\n", "section"),
    ],
)
def test_changed_setting_computes_from_its_stage_on(array: Path, out: Path, setting: str, first: str) -> None:
    with (array / "array.toml").open("a", encoding="utf-8") as stream:
        stream.write(setting)
    _, events = ran(array, out)
    before = STAGES[: STAGES.index(first)]
    assert {event.outcome for event in events if event.stage in before} <= {"kept"}
    assert {event.outcome for event in events if event.stage not in before} == {"computed"}


def test_damaged_and_removed_outputs_are_made_again(array: Path, out: Path, contents: Contents) -> None:
    before = contents(out)
    chain = out / "chains" / "TB-18.nc"
    chain.write_bytes(chain.read_bytes()[:1000])
    (out / "volume.nc").unlink()
    (out / ".stages" / "records" / "column.TB-07.json").write_text("{", encoding="utf-8")
    _, events = ran(array, out, until="report")
    assert computed(events) == {("qc", "TB-18"), ("column", "TB-07"), ("section", "array")}
    assert contents(out) == before


def test_mooring_that_left_the_configuration_takes_its_files_away(
    array: Path, out: Path, tmp_path: Path, contents: Contents
) -> None:
    text = (array / "array.toml").read_text(encoding="utf-8").split("[[moorings]]")
    (array / "array.toml").write_text("[[moorings]]".join([text[0], text[1], text[3]]), encoding="utf-8")
    ran(array, out)
    ran(array, tmp_path / "fresh")
    assert not [path for path in out.rglob("*TB-18*")]
    assert contents(out) == contents(tmp_path / "fresh")


def test_mooring_whose_delivery_is_gone_takes_its_files_away_and_is_reported(array: Path, out: Path) -> None:
    (array / LONG).unlink()
    outcome, _ = ran(array, out)
    assert outcome.exit_code == 5
    assert outcome.moorings == ("TB-07", "TB-28")
    assert [(problem.mooring, problem.stage) for problem in outcome.problems] == [("TB-18", "ingest")]
    assert not (out / "chains" / "TB-18.nc").exists()
    assert not (out / "columns" / "TB-18.nc").exists()


def test_leftovers_of_a_cut_off_run_are_cleared(array: Path, out: Path) -> None:
    leftovers = [out / "chains" / ".part-1-TB-07.nc", out / ".stages" / "records" / ".part-2-qc.TB-07.json"]
    for leftover in leftovers:
        leftover.write_bytes(b"half")
    ran(array, out, until="ingest")
    assert not [leftover for leftover in leftovers if leftover.exists()]


# --------------------------------------------------------------------------------------------------------------
# Until


def test_until_ends_after_the_named_stage(array: Path, tmp_path: Path) -> None:
    out = tmp_path / "out"
    outcome, events = ran(array, out, until="qc")
    assert outcome.stages == ("ingest", "qc")
    assert [event.stage for event in events] == ["ingest"] * 3 + ["qc"] * 3
    written = {path.relative_to(out).as_posix() for path in out.rglob("*") if path.is_file() and path.suffix == ".nc"}
    assert written == {f"{folder}/{mooring}.nc" for folder in ("chains", ".stages/ingest") for mooring in MOORINGS}


def test_ending_early_keeps_later_results_unless_something_changed(array: Path, out: Path) -> None:
    ran(array, out, until="qc")
    assert (out / "section.nc").exists()
    shorten(array / WIDE)
    ran(array, out, until="qc")
    assert not (out / "section.nc").exists()
    assert not (out / "report.html").exists()


def test_unknown_stage_is_refused(array: Path, tmp_path: Path) -> None:
    with pytest.raises(RequestError, match=r"--until: no such stage; expected ingest, qc, .*; found 'map'"):
        ran(array, tmp_path / "out", until="map")
    assert not (tmp_path / "out").exists()


def test_no_workers_are_refused(array: Path, tmp_path: Path) -> None:
    with pytest.raises(RequestError, match="--workers: no such number of workers; expected 1 or more; found 0"):
        ran(array, tmp_path / "out", workers=0)


# --------------------------------------------------------------------------------------------------------------
# Progress and account


def test_progress_counts_up_to_the_total_of_each_stage(array: Path, out: Path) -> None:
    _, kept = ran(array, out, until="report")
    shorten(array / WIDE)
    _, mixed = ran(array, out)
    for events, stages in ((kept, STAGES), (mixed, STAGES[:-1])):
        for stage, total in zip(stages, (3, 3, 3, 1, 4), strict=False):
            counts = [(event.done, event.total) for event in events if event.stage == stage]
            assert counts == [(done, total) for done in range(1, total + 1)]


def rows_delivered(array: Path) -> int:
    """Count the rows without the package: lines below the heads, and time steps."""
    rows = 0
    for name, head in ((WIDE, 4), (LONG, 1)):
        with gzip.open(array / name, "rt", encoding="utf-8") as stream:
            rows += sum(1 for _ in stream) - head
    with netCDF4.Dataset(array / NETCDF) as file:
        return rows + int(file.dimensions["TIME"].size)


def test_every_row_is_kept_or_quarantined(small_array: Path, finished: Path) -> None:
    rows = json.loads((finished / "run.json").read_text(encoding="utf-8"))["rows"]
    assert rows["rows_read"] == rows_delivered(small_array)
    assert rows["rows_read"] == rows["rows_kept"] + rows["rows_quarantined"]
    with (finished / "tables" / "quarantine.csv").open(encoding="utf-8", newline="") as stream:
        quarantined = [(row["file"], int(row["line"])) for row in csv.DictReader(stream)]
    damaged = pd.read_csv(small_array / "damaged.csv")
    assert len(quarantined) == rows["rows_quarantined"] > 0
    assert sorted(quarantined) == sorted(zip(damaged["file"], damaged["line"], strict=True))


def test_account_holds_inputs_versions_counts_timings_and_settings(small_array: Path, finished: Path) -> None:
    account = json.loads((finished / "run.json").read_text(encoding="utf-8"))
    assert account["inputs"] == {
        name: hashlib.sha256((small_array / name).read_bytes()).hexdigest() for name in (WIDE, LONG, NETCDF)
    }
    assert account["versions"]["netCDF4"] == netCDF4.__version__
    # 3 moorings in ingest, qc and column, 2 gatherings of tables, the section, 4 sheets of figures and the page
    assert account["tasks"] == {"computed": 17, "kept": 0}
    assert list(account["seconds"]) == list(STAGES)
    assert all(seconds >= 0.0 for seconds in account["seconds"].values())
    assert account["configuration"]["qc"]["spike"]["threshold_low"] == 3.0
    assert [mooring["id"] for mooring in account["configuration"]["moorings"]] == list(MOORINGS)
    assert account["started"] <= account["ended"]


def test_settings_used_stand_in_every_netcdf_file(array: Path, out: Path) -> None:
    with (array / "array.toml").open("a", encoding="utf-8") as stream:
        stream.write("[column]\nmixed_layer_threshold = 0.3\n[section]\nsignal_sd = 10.0\n")
    ran(array, out)
    for name in ("columns/TB-07.nc", "columns.nc", "section.nc", "volume.nc"):
        with netCDF4.Dataset(out / name) as file:
            settings = json.loads(file.settings)
        assert settings["column" if "columns" in name else "section"]
        assert settings.get("column", {}).get("mixed_layer_threshold", 0.3) == 0.3
        assert settings.get("section", {}).get("signal_sd", 10.0) == 10.0


# --------------------------------------------------------------------------------------------------------------
# What ends a run


def test_second_run_in_the_same_folder_is_refused(array: Path, out: Path) -> None:
    config = load_config(array / "array.toml")
    refused: list[str] = []

    def start_another(event: Event) -> None:
        with pytest.raises(RequestError, match=r"another run is writing to this folder.*name another folder"):
            run(config, out, until="ingest", workers=1)
        refused.append(event.name)

    run(config, out, until="ingest", workers=1, progress=start_another)
    assert refused == list(MOORINGS)
    assert run(config, out, until="ingest", workers=1).exit_code == 0


def test_no_usable_delivery_ends_the_run_and_lists_the_reasons(array: Path, tmp_path: Path) -> None:
    for name in (WIDE, LONG, NETCDF):
        (array / name).unlink()
    with pytest.raises(DataError, match="no delivery could be used") as raised:
        ran(array, tmp_path / "out")
    assert [name in str(raised.value) for name in (WIDE, LONG, NETCDF)] == [True] * 3
    assert not (tmp_path / "out" / "run.json").exists()


def test_folder_below_a_file_cannot_be_written(array: Path) -> None:
    with pytest.raises(MachineError, match=r"array.toml.*cannot be (made|used).*name another output folder"):
        ran(array, array / "array.toml" / "out")


def test_folder_that_is_a_file_is_refused(array: Path) -> None:
    with pytest.raises(MachineError, match=r"array.toml: cannot be used as a folder; .*found a file"):
        ran(array, array / "array.toml")
