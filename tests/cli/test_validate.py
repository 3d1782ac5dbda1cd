"""``thermotilt validate``: exit codes, what is printed where, what is written, and models that cannot be used."""

from __future__ import annotations

import json
import shutil
import sys
from pathlib import Path

import numpy as np
import pytest
import xarray as xr
from typer.testing import CliRunner, Result

from profiles import store
from profiles.cli import app
from profiles.vocabulary import CAUTION

MODEL = Path(__file__).parents[2] / "data_demo" / "model" / "simulated_model.nc"


def call(*arguments: str | Path) -> Result:
    result = CliRunner().invoke(app, ["validate", *(str(argument) for argument in arguments)])
    assert "Traceback" not in result.output
    return result


@pytest.fixture(scope="module")
def quick_model(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Half a year of the demo's model."""
    path = tmp_path_factory.mktemp("model") / "quick.nc"
    with xr.open_dataset(MODEL, decode_times=False, mask_and_scale=False) as whole:
        whole.isel(time=slice(0, 7)).to_netcdf(path)
    return path


@pytest.fixture(scope="module")
def shared(finished: Path, tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A run's folder for all calls of this module."""
    return shutil.copytree(finished, tmp_path_factory.mktemp("validate") / "out")


@pytest.fixture(scope="module")
def called(shared: Path, quick_model: Path) -> Result:
    return call(quick_model, "--against", shared)


def test_it_prints_every_quantity_with_its_interval_and_the_caution(called: Result, shared: Path) -> None:
    assert called.exit_code == 0
    lines = called.stdout.splitlines()
    assert lines[1].startswith(
        "quick, 2031-01 to 2031-07; potential temperature, K, salinity atlas; both sides averaged"
    )
    labels = [line.strip().split(":")[0] for line in lines if line.startswith("  ") and not line.startswith("    ")]
    assert labels == [
        "tilt",
        "warm water volume",
        "volume west of 155W",
        "volume east of 155W",
        "isotherm depth",
        "depth of the steepest gradient",
    ]
    assert lines[-2:] == [CAUTION, f"see {shared / 'validation.html'}"]
    assert called.stderr == "quick: computed\n"


def test_what_it_prints_of_the_depth_is_what_the_table_holds(called: Result, shared: Path) -> None:
    table = store.read_table(shared / "tables" / "model_scores.csv")
    row = table[(table["quantity"] == "isotherm_depth") & (table["place"] == "array")].iloc[0]
    (line,) = [line for line in called.stdout.splitlines() if line.startswith("  isotherm depth:")]
    numbers = f"{row['bias']:+.1f} m ({row['bias_low']:+.1f} to {row['bias_high']:+.1f})"
    assert line.startswith(f"  isotherm depth: {numbers}: ")
    told = row["bias_low"] > 0.0 or row["bias_high"] < 0.0
    assert told != line.endswith("smaller than the observation can tell")


def test_it_writes_file_tables_figures_and_page(called: Result, shared: Path) -> None:
    assert called.exit_code == 0
    figures = sorted(path.stem for path in (shared / "figures").glob("validation_*.png"))
    assert figures == [f"validation_{name}" for name in ("pattern", "section", "tilt", "time_longitude", "volume")]
    page = (shared / "validation.html").read_text(encoding="utf-8")
    assert "Models against Tropicbird Array" in page
    assert CAUTION in page
    assert page.count("data:image/png") == 5
    assert (shared / "tables" / "model_months.csv").is_file()
    with xr.open_dataset(shared / "validation.nc") as written:
        assert list(written["model"].values) == ["quick"]


def test_several_models_stand_under_their_names_and_a_bad_one_holds_up_none(
    shared: Path, quick_model: Path, tmp_path: Path
) -> None:
    broken = tmp_path / "broken.nc"
    broken.write_bytes(quick_model.read_bytes()[:5000])
    names = ("--name", "one", "--name", "two", "--name", "broken")
    result = call(quick_model, quick_model, broken, "--against", shared, *names, "--json")
    assert result.exit_code == 5
    assert result.stderr == ""
    document = json.loads(result.stdout)
    assert document["exit_code"] == 5
    assert [model["name"] for model in document["models"]] == ["one", "two"]
    assert [problem["model"] for problem in document["problems"]] == ["broken"]
    assert str(broken) in document["problems"][0]["message"]
    assert document["caution"] == CAUTION
    one, two = (model["findings"] for model in document["models"])
    assert one == two
    tilt = one[0]
    # difference = as seen - hidden, over the same months
    assert tilt["difference"] == pytest.approx(tilt["bias"] - tilt["hidden"], abs=1e-6)


def test_quiet_prints_nothing_but_what_could_not_be_used(shared: Path, quick_model: Path, tmp_path: Path) -> None:
    result = call(quick_model, tmp_path / "nowhere.nc", "--against", shared, "--quiet")
    assert result.exit_code == 5
    assert result.stdout == ""
    assert result.stderr == (
        f"thermotilt: nowhere not used: {tmp_path / 'nowhere.nc'}: no such model; "
        "expected NetCDF files, a pattern of them, or a Zarr store\n"
    )


def test_settings_of_a_configuration_are_used(shared: Path, quick_model: Path, array: Path) -> None:
    config = array / "array.toml"
    config.write_text(config.read_text(encoding="utf-8") + "\n[validation]\nleast_months = 8\n", encoding="utf-8")
    result = call(quick_model, "--against", shared, "--config", config)
    # The model has seven months.
    assert result.exit_code == 0
    assert "  tilt: too few independent months to say (7 months)" in result.stdout


# --------------------------------------------------------------------------------------------------------------
# What cannot be done


def test_a_model_alone_that_is_not_there_is_a_wrong_request(shared: Path, tmp_path: Path) -> None:
    result = call(tmp_path / "nowhere.nc", "--against", shared)
    assert result.exit_code == 2
    assert "no such model" in result.stderr


def test_a_model_alone_that_does_not_overlap_is_unfit_data(shared: Path, quick_model: Path, tmp_path: Path) -> None:
    late = tmp_path / "late.nc"
    with xr.open_dataset(quick_model, decode_times=False, mask_and_scale=False) as model:
        model["time"].attrs["units"] = "days since 2051-01-01"
        model.to_netcdf(late)
    result = call(late, "--against", shared)
    assert result.exit_code == 3
    assert "the model and the array do not overlap in time" in result.stderr


def test_a_folder_without_a_run_is_told(quick_model: Path, tmp_path: Path) -> None:
    result = call(quick_model, "--against", tmp_path)
    assert result.exit_code == 2
    assert str(tmp_path) in result.stderr


def test_a_folder_that_cannot_be_written_is_the_machines_failure(
    shared: Path, quick_model: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    def refuse(path: Path, *_: object) -> None:
        from profiles.errors import MachineError

        raise MachineError("cannot write", where=str(path))

    monkeypatch.setattr(store, "write_dataset", refuse)
    result = call(quick_model, "--against", shared)
    assert result.exit_code == 4
    assert "cannot write" in result.stderr


@pytest.mark.parametrize(
    ("names", "message"),
    [(("--name", "a"), "some models have no name"), (("--name", "a", "--name", "a"), "two models have one name")],
)
def test_names_must_fit_the_models(names: tuple[str, ...], message: str, quick_model: Path, tmp_path: Path) -> None:
    result = call(quick_model, MODEL, "--against", tmp_path, *names)
    assert result.exit_code == 2
    assert message in result.stderr


def test_models_of_one_file_name_need_names(quick_model: Path, tmp_path: Path) -> None:
    result = call(quick_model, tmp_path / "elsewhere" / "quick.nc", "--against", tmp_path)
    assert result.exit_code == 2
    assert "two models have one name" in result.stderr
    assert "quoted pattern" in result.stderr


def test_no_workers_is_a_wrong_request(shared: Path, quick_model: Path) -> None:
    result = call(quick_model, "--against", shared, "--workers", "0")
    assert (result.exit_code, "no such number of workers" in result.stderr) == (2, True)


def test_without_what_reads_models_it_says_how_to_install_it(
    shared: Path, quick_model: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(sys.modules["profiles.cli.validate"], "find_spec", lambda name: None)
    result = call(quick_model, "--against", shared)
    assert result.exit_code == 4
    assert result.stderr == (
        "thermotilt: cf_xarray: what reads models is not installed; expected the extra 'model'; "
        "in the folder of its source: pip install '.[model]'\n"
    )


def test_json_has_null_where_a_number_is_none(shared: Path, quick_model: Path, array: Path) -> None:
    config = array / "array.toml"
    config.write_text(config.read_text(encoding="utf-8") + "\n[validation]\nleast_months = 8\n", encoding="utf-8")
    result = call(quick_model, "--against", shared, "--config", config, "--json")
    finding = json.loads(result.stdout, parse_constant=lambda word: pytest.fail(word))["models"][0]["findings"][0]
    assert finding["bias"] is None
    assert np.isfinite(finding["array"])
