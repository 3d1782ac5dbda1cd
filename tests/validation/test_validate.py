"""Models against a finished run, written into its folder: one that cannot be used holds up no other."""

from __future__ import annotations

import shutil
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
import xarray as xr

from profiles import store
from profiles.config import ValidationSettings
from profiles.errors import EXIT_DATA, EXIT_DONE, EXIT_PARTIAL, EXIT_REQUEST, DataError, RequestError
from profiles.pipeline.validate import validate


@pytest.fixture
def out(perfect: Path, tmp_path: Path) -> Path:
    return Path(shutil.copytree(perfect, tmp_path / "out"))


@pytest.fixture(scope="module")
def files(monthly_truth: xr.Dataset, tmp_path_factory: pytest.TempPathFactory) -> list[Path]:
    """The ocean as monthly means in four files of 3 to 4 months."""
    folder = tmp_path_factory.mktemp("model")
    paths = [folder / f"ocean_{number}.nc" for number in range(4)]
    for number, path in enumerate(paths):
        monthly_truth.isel(time=slice(4 * number, 4 * number + 4)).to_netcdf(path)
    return paths


def nameless(ocean: xr.Dataset) -> xr.Dataset:
    other = ocean.copy()
    other["temp"].attrs = {"units": "degree_Celsius"}
    return other


def of_other_years(ocean: xr.Dataset) -> xr.Dataset:
    return ocean.assign_coords(time=("time", ocean["time"].values + np.timedelta64(3653, "D"), ocean["time"].attrs))


def of_land(ocean: xr.Dataset) -> xr.Dataset:
    return ocean.assign(
        temp=ocean["temp"].where(~ocean["lon"].isin([175.0, 201.0, 227.0])).assign_attrs(ocean["temp"].attrs)
    )


def in_metres(ocean: xr.Dataset) -> xr.Dataset:
    return ocean.assign(temp=ocean["temp"].assign_attrs(units="m"))


def of_members(ocean: xr.Dataset) -> xr.Dataset:
    return ocean.expand_dims(member=2)


def upward_or_downward(ocean: xr.Dataset) -> xr.Dataset:
    return ocean.assign_coords(lev=("lev", ocean["lev"].values, {"standard_name": "depth", "units": "m"}))


SPOILT = [
    (nameless, "no temperature was found"),
    (of_other_years, "do not overlap in time"),
    (of_land, "every mooring lies on the model's land"),
    (in_metres, "units cannot be converted"),
    (of_members, "a dimension too many"),
    (upward_or_downward, "not declared as positive up or down"),
]


def test_bad_models_among_good_ones_are_told_and_the_others_are_finished(
    out: Path, monthly_truth: xr.Dataset, files: list[Path]
) -> None:
    cut = files[2].with_name("cut_2.nc")
    cut.write_bytes(files[2].read_bytes()[:20_000])
    bad = {f"bad{number}": spoil(monthly_truth) for number, (spoil, _) in enumerate(SPOILT)}
    bad |= {"cut": [files[0], files[1], cut], "gone": "gone_*.nc"}
    told: list[tuple[str, str]] = []
    found = validate(
        {"first": monthly_truth, **bad, "last": files}, out, progress=lambda name, state: told.append((name, state))
    )
    assert found.exit_code == EXIT_PARTIAL == 5
    assert list(found.comparison["model"].values) == ["first", "last"]
    assert told == [("first", "computed"), *((name, "failed") for name in bad), ("last", "computed")]
    messages = {problem.model: problem.message for problem in found.problems}
    assert list(messages) == list(bad)
    for (_, words), message in zip(SPOILT, messages.values(), strict=False):
        assert words in message
        assert "; expected " in message
    assert f"{cut}: the model's file cannot be read" in messages["cut"]
    assert "gone_*.nc: no such model" in messages["gone"]
    # The ocean in one piece and in four files is one ocean.
    both = found.comparison["model_isotherm_depth"]
    np.testing.assert_array_equal(both.sel(model="first"), both.sel(model="last"))
    with store.open_dataset(out / "validation.nc") as written:
        assert list(written["model"].values) == ["first", "last"]


@pytest.mark.parametrize(("spoil", "words"), SPOILT)
def test_a_bad_model_alone_ends_with_its_own_error(
    out: Path, monthly_truth: xr.Dataset, spoil: Callable[[xr.Dataset], xr.Dataset], words: str
) -> None:
    with pytest.raises(DataError, match=words) as caught:
        validate({"ocean": spoil(monthly_truth)}, out)
    assert caught.value.exit_code == EXIT_DATA
    assert str(caught.value).startswith("ocean")
    assert not (out / "validation.nc").exists()


def test_where_no_model_can_be_used_all_are_told(out: Path, monthly_truth: xr.Dataset) -> None:
    bad = {"one": nameless(monthly_truth), "other": in_metres(monthly_truth)}
    match = r"no model could be compared.*\n  - one: no temperature.*\n  - other, temp: the temperature's units"
    with pytest.raises(DataError, match=match):
        validate(bad, out)


def test_the_folder_must_be_that_of_a_run(tmp_path: Path, monthly_truth: xr.Dataset) -> None:
    with pytest.raises(RequestError, match=r"run the array first: thermotilt run CONFIG --out FOLDER") as caught:
        validate({"ocean": monthly_truth}, tmp_path)
    assert caught.value.exit_code == EXIT_REQUEST


def test_workers_are_one_or_more(out: Path, monthly_truth: xr.Dataset) -> None:
    with pytest.raises(RequestError, match="no such number of workers; expected 1 or more; found 0"):
        validate({"ocean": monthly_truth}, out, workers=0)


def test_what_is_written_is_what_is_returned_and_the_same_bytes_again(
    out: Path, monthly_truth: xr.Dataset, files: list[Path]
) -> None:
    settings = ValidationSettings(block_megabytes=0.02)  # several blocks, so that workers have something to share
    found = validate({"ocean": files}, out, settings)
    assert found.exit_code == EXIT_DONE
    with store.open_dataset(out / "validation.nc") as written:
        for name in ("model_isotherm_depth", "warm_water_volume_difference", "bias"):
            np.testing.assert_allclose(written[name].values, found.comparison[name].values, rtol=1e-6, err_msg=name)
        assert written.attrs["comment"]
        assert written.attrs["title"].startswith("Perfect Array")
    written_files = {
        name: out / name for name in ("validation.nc", "tables/model_scores.csv", "tables/model_months.csv")
    }
    before = {name: path.read_bytes() for name, path in written_files.items()}
    validate({"ocean": files}, out, settings, workers=2)
    assert {name: path.read_bytes() for name, path in written_files.items()} == before

    scores = pd.read_csv(out / "tables" / "model_scores.csv")
    assert len(scores) == found.comparison.sizes["series"]
    assert list(scores.columns[:5]) == ["model", "quantity", "place", "kind", "units"]
    np.testing.assert_allclose(scores["bias"], found.comparison["bias"].values.ravel(), rtol=1e-4, atol=1e-9)
    months = pd.read_csv(out / "tables" / "model_months.csv")
    assert list(months["month"]) == [f"2031-{month:02d}" for month in range(1, 13)] + ["2032-01", "2032-02"]
    np.testing.assert_allclose(
        months["seen_warm_water_volume_total"],
        found.comparison["seen_warm_water_volume"].sel(region="total", model="ocean"),
        rtol=1e-4,
    )
