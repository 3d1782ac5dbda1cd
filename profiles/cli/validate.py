"""``thermotilt validate MODEL... --against OUT``: models compared with the array, like for like."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from importlib.util import find_spec
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer

from profiles.cli.console import ending, print_json

if TYPE_CHECKING:
    import xarray as xr

    from profiles.pipeline.validate import Validated

_NEEDED = "cf_xarray"


def validate(
    models: Annotated[
        list[str],
        typer.Argument(help="Each a NetCDF file, a Zarr store, or a quoted pattern of one model's files."),
    ],
    against: Annotated[Path, typer.Option(help="The folder of a finished run.", show_default=False)],
    name: Annotated[
        list[str] | None, typer.Option(help="Name of a model, in their order, once each; default its file's name.")
    ] = None,
    config: Annotated[
        Path | None, typer.Option(help="Configuration whose [validation] is used; default the run's.")
    ] = None,
    workers: Annotated[int, typer.Option(help="Processes that read the models.")] = 1,
    quiet: Annotated[bool, typer.Option("--quiet", help="Print nothing but errors.")] = False,
    as_json: Annotated[bool, typer.Option("--json", help="Print one JSON document instead of text.")] = False,
) -> None:
    """Compare models with the array, and say how much of the difference is the model's.

    Writes validation.nc, validation.html, tables and figures into the run's folder.
    """
    with ending(as_json=as_json):
        from profiles.config import load_config
        from profiles.pipeline.validate import validate as compare
        from profiles.pipeline.validation_report import write_validation_report

        sources = _named(models, name or [])
        _check_reader()
        settings = load_config(config).validation if config is not None else None
        progress = None if quiet or as_json else lambda model, outcome: typer.echo(f"{model}: {outcome}", err=True)
        validated = compare(sources, against, settings, workers=workers, progress=progress)
        page = write_validation_report(validated.out, validated.comparison)
        if as_json:
            print_json(_document(validated, page))
        else:
            _print(validated, page, quiet=quiet)
        raise typer.Exit(validated.exit_code)


def _check_reader() -> None:
    """Say what is missing where the part that reads models was not installed."""
    from profiles.errors import MachineError

    if find_spec(_NEEDED) is None:
        raise MachineError(
            "what reads models is not installed",
            where=_NEEDED,
            expected="the extra 'model'",
            advice="in the folder of its source: pip install '.[model]'",
        )


def _named(models: list[str], names: list[str]) -> dict[str, str]:
    """Return the models by name.

    Raises
    ------
    RequestError
        Where there are other numbers of names and models, or two have one name.
    """
    from profiles.errors import RequestError

    if names and len(names) != len(models):
        raise RequestError(
            "some models have no name, or some names no model",
            where="--name",
            expected=f"none, or {len(models)} in the order of the models",
            found=str(len(names)),
        )
    called = names or [_stem(model) for model in models]
    twice = sorted({one for one in called if called.count(one) > 1})
    if twice:
        raise RequestError(
            "two models have one name",
            where="--name" if names else "MODEL",
            expected="a name for each",
            found=", ".join(twice),
            advice="name them by --name, and one model's many files by a quoted pattern",
        )
    return dict(zip(called, models, strict=True))


def _stem(model: str) -> str:
    return Path(model).name.removesuffix(".nc").removesuffix(".zarr").replace("*", "").strip("_-.") or "model"


# --------------------------------------------------------------------------------------------------------------
# What is printed


def _each(validated: Validated) -> Iterator[tuple[str, xr.Dataset]]:
    for model in validated.comparison["model"].values:
        yield str(model), validated.comparison.sel(model=model)


def _print(validated: Validated, page: Path, *, quiet: bool) -> None:
    for problem in validated.problems:
        typer.echo(f"thermotilt: {problem.model} not used: {problem.message}", err=True)
    if not quiet:
        typer.echo("\n".join(_summary(validated, page)))


def _summary(validated: Validated, page: Path) -> Iterator[str]:
    from profiles.report.model_findings import in_words, model_findings, readings
    from profiles.vocabulary import CAUTION

    yield "model as seen less array, means over the months of both, with 95 % intervals:"
    for model, one in _each(validated):
        yield f"{model}, {readings(one)}"
        for finding in model_findings(one):
            first, *more = in_words(finding)
            yield f"  {first}"
            yield from (f"    {line}" for line in more)
    yield CAUTION
    yield f"see {page}"


def _document(validated: Validated, page: Path) -> Mapping[str, Any]:
    import json

    from profiles.report.model_findings import model_findings
    from profiles.vocabulary import CAUTION

    models = [
        {
            "name": model,
            "understood": json.loads(str(one["understood"].item())),
            "findings": [_plain(vars(finding)) for finding in model_findings(one)],
        }
        for model, one in _each(validated)
    ]
    return {
        "out": str(validated.out),
        "exit_code": validated.exit_code,
        "models": models,
        "problems": [vars(problem) for problem in validated.problems],
        "page": str(page),
        "caution": CAUTION,
    }


def _plain(values: Mapping[str, Any]) -> dict[str, Any]:
    """Return what JSON can hold: a number that is none becomes null."""
    return {key: None if isinstance(value, float) and value != value else value for key, value in values.items()}
