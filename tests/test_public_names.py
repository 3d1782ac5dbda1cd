"""The public names that other people's scripts call, and what their import costs."""

from __future__ import annotations

import inspect
import subprocess
import sys

import pytest

import profiles

EMPTY = inspect.Parameter.empty

#: Parameter names and defaults as promised; those after "*" by keyword alone.
PROMISED = {
    "read_delivery": {"path": EMPTY, "layout": EMPTY},
    "quality_control": {"chain": EMPTY, "settings": None},
    "isotherm_depth": {
        "temperature": EMPTY,
        "*": EMPTY,
        "isotherm": 20.0,
        "method": "linear",
        "sensor_depth": None,
        "max_bracket": None,
        "crossing": "shallowest",
    },
    "mixed_layer_depth": {"temperature": EMPTY, "*": EMPTY, "threshold": 0.2, "reference_depth": 10.0},
    "objective_map": {
        "values": EMPTY,
        "latitude": EMPTY,
        "longitude": EMPTY,
        "grid_latitude": EMPTY,
        "grid_longitude": EMPTY,
        "*": EMPTY,
        "signal_sd": EMPTY,
        "noise_sd": EMPTY,
        "length_longitude": EMPTY,
        "length_latitude": EMPTY,
        "mean": "known",
    },
    "lead_lag": {"predictor": EMPTY, "target": EMPTY, "leads": tuple(range(-24, 25)), "*": EMPTY, "settings": None},
    "thermocline_slope": {"field": EMPTY, "*": EMPTY, "window": (165.0, 265.0)},
    "warm_water_volume": {"field": EMPTY, "*": EMPTY, "region": "total"},
    "compare_model": {"model": EMPTY, "array": EMPTY, "settings": None},
}

#: Imports that take long, or that only one room may make.
HEAVY = {
    "cf_units", "cf_xarray", "cmocean", "dask", "gsw", "jinja2", "matplotlib", "netCDF4", "numba", "numpy", "pandas",
    "pydantic", "rich", "scipy", "xarray",
}  # fmt: skip


def loaded_by(program: str) -> set[str]:
    """Return the top-level modules that a fresh interpreter holds after ``program``."""
    ending = "import sys; print('loaded', *sorted({name.partition('.')[0] for name in sys.modules}))"
    done = subprocess.run(
        [sys.executable, "-W", "error", "-c", f"{program}\n{ending}"], capture_output=True, text=True, check=True
    )
    return set(done.stdout.splitlines()[-1].split()[1:])


def test_the_public_names_are_these_and_no_others() -> None:
    assert sorted(profiles.__all__) == sorted(PROMISED)
    assert {name for name in dir(profiles) if not name.startswith("_")} == set(PROMISED)


@pytest.mark.parametrize("name", PROMISED)
def test_a_public_name_keeps_its_parameters(name: str) -> None:
    parameters = inspect.signature(getattr(profiles, name)).parameters
    by_place = [key for key, parameter in parameters.items() if parameter.kind is not parameter.KEYWORD_ONLY]
    promised = list(PROMISED[name])
    assert by_place == (promised[: promised.index("*")] if "*" in promised else promised)
    defaults = {key: parameters[key].default for key in promised if key != "*"}
    assert defaults == {key: value for key, value in PROMISED[name].items() if key != "*"}


@pytest.mark.parametrize("name", PROMISED)
def test_what_a_public_name_takes_besides_is_optional_and_by_keyword(name: str) -> None:
    parameters = inspect.signature(getattr(profiles, name)).parameters
    besides = [parameter for key, parameter in parameters.items() if key not in PROMISED[name]]
    assert all(parameter.kind is parameter.KEYWORD_ONLY and parameter.default is not EMPTY for parameter in besides)


@pytest.mark.parametrize("name", PROMISED)
def test_a_public_name_is_documented(name: str) -> None:
    text = inspect.getdoc(getattr(profiles, name)) or ""
    assert "Parameters\n" in text
    assert "Returns\n" in text
    parameters = inspect.signature(getattr(profiles, name)).parameters
    assert [
        key for key in parameters if f"{key} :" not in text and f"{key}," not in text and f", {key}" not in text
    ] == []


def test_an_unknown_name_is_an_attribute_error() -> None:
    with pytest.raises(AttributeError, match="isotherm_dept"):
        profiles.isotherm_dept  # noqa: B018


def test_importing_the_package_is_light() -> None:
    loaded = loaded_by("import profiles")
    assert "profiles" in loaded
    assert loaded & HEAVY == set()


def test_help_is_light() -> None:
    program = (
        "import sys\nsys.argv = ['thermotilt', '--help']\nfrom profiles.cli import main\n"
        "try:\n    main()\nexcept SystemExit as ended:\n    assert ended.code == 0"
    )
    loaded = loaded_by(program)
    assert "typer" in loaded
    assert loaded & HEAVY == set()


def test_a_public_name_brings_what_it_needs() -> None:
    # The other side of the two tests above: the names of HEAVY are the names under which modules are loaded.
    assert {"numpy", "xarray", "pandas"} <= loaded_by("import profiles; profiles.isotherm_depth") & HEAVY


def test_computing_draws_nothing_and_prints_nothing() -> None:
    program = "import profiles; [getattr(profiles, name) for name in profiles.__all__]"
    assert loaded_by(program) & {"matplotlib", "cmocean", "jinja2", "typer", "rich"} == set()
