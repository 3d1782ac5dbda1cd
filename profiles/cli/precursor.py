"""``thermotilt precursor OUT``: lead times, a hindcast score and an outlook."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer

from profiles.cli.console import ending, print_json

if TYPE_CHECKING:
    from profiles.pipeline import PrecursorOutcome

_SHOWN_LEADS = (1, 3, 6, 9, 12)


def precursor(
    out: Annotated[Path, typer.Argument(help="The folder of a run; with --series any folder.", show_default=False)],
    sst: Annotated[
        Path | None,
        typer.Option(
            help="Surface temperature: NetCDF (grid or series), CSV, or rows of a year and twelve months. "
            "Default: the array's shallowest sensors."
        ),
    ] = None,
    sst_variable: Annotated[str | None, typer.Option(help="Variable or column of --sst.")] = None,
    box: Annotated[
        str | None,
        typer.Option(help="nino12, nino3, nino34, nino4, or south,north,west,east in degrees; default nino34."),
    ] = None,
    series: Annotated[
        Path | None,
        typer.Option(
            help="Volume and tilt from a file in place of a run: NetCDF of a run or of monthly isotherm depths "
            "of moorings, or CSV."
        ),
    ] = None,
    wind: Annotated[Path | None, typer.Option(help="A wind index as one more predictor.")] = None,
    wind_variable: Annotated[str | None, typer.Option(help="Variable or column of --wind.")] = None,
    pressure: Annotated[
        Path | None,
        typer.Option(help="A pressure-difference index, or CSV with columns 'east' and 'west' of sea-level pressure."),
    ] = None,
    missing: Annotated[
        float | None, typer.Option(help="What stands for 'missing' in text files, such as -99.99.")
    ] = None,
    config: Annotated[
        Path | None, typer.Option(help="Configuration whose [precursor] is used; default the run's.")
    ] = None,
    quiet: Annotated[bool, typer.Option("--quiet", help="Print nothing but errors.")] = False,
    as_json: Annotated[bool, typer.Option("--json", help="Print one JSON document instead of text.")] = False,
) -> None:
    """Give lead times, a hindcast score and a cautious outlook from volume and tilt.

    Writes precursor.nc, precursor_*.nc and tables into the folder.
    """
    with ending(as_json=as_json):
        from profiles import pipeline
        from profiles.config import load_config

        settings = load_config(config).precursor if config is not None else None
        sources = pipeline.Sources(
            sst=sst,
            sst_variable=sst_variable,
            series=series,
            wind=wind,
            wind_variable=wind_variable,
            pressure=pressure,
            missing=missing,
        )
        outcome = pipeline.precursor(out, sources, settings=settings, box=box, progress=_steps(silent=quiet or as_json))
        if as_json:
            print_json(_document(outcome))
        elif not quiet:
            typer.echo("\n".join(_summary(outcome)))


def _steps(*, silent: bool) -> Any:
    return (lambda step: None) if silent else (lambda step: typer.echo(f"precursor: {step}", err=True))


def _document(outcome: PrecursorOutcome) -> dict[str, Any]:
    from profiles.vocabulary import CAUTION

    return {key: _plain(value) for key, value in vars(outcome).items()} | {"caution": CAUTION, "exit_code": 0}


def _plain(value: Any) -> Any:
    """Return what JSON can hold: a number that is none becomes null."""
    if isinstance(value, dict):
        return {key: _plain(part) for key, part in value.items()}
    if isinstance(value, list | tuple):
        return [_plain(part) for part in value]
    if isinstance(value, float):
        return value if abs(value) < float("inf") else None
    return str(value) if isinstance(value, Path) else value


def _summary(outcome: PrecursorOutcome) -> Iterator[str]:
    from profiles.vocabulary import CAUTION

    yield f"record of the index: {outcome.record}"
    yield from (f"  {note}" for note in outcome.notes)
    yield "strongest correlation with the index, and the strongest where the predictor comes first (95 % intervals):"
    for row in outcome.leads:
        yield from _lead_lines(row)
    kinds = [row["kind"] for row in outcome.events]
    yield f"events ({outcome.rule}): {kinds.count('warm')} warm, {kinds.count('cold')} cold"
    yield from _oscillator_lines(outcome)
    yield from _score_lines(outcome)
    yield from _outlook_lines(outcome)
    yield CAUTION
    yield f"see {outcome.out / 'precursor.nc'} and {outcome.out / 'tables'}"


def _lead_lines(row: dict[str, Any]) -> Iterator[str]:
    yield f"  {row['predictor']}: {_peak(row, 'peak')}; field {_p(row['field_p_value'])}"
    if row["precursor_lead"] == row["precursor_lead"] and row["precursor_lead"] != row["peak_lead"]:
        yield f"    first: {_peak(row, 'precursor')}"


def _peak(row: dict[str, Any], kind: str) -> str:
    part = {name.removeprefix(f"{kind}_"): value for name, value in row.items() if name.startswith(f"{kind}_")}
    return (
        f"{part['correlation']:+.2f} ({part['correlation_lower']:+.2f} to {part['correlation_upper']:+.2f}) at "
        f"{part['lead']:+.1f} months ({part['lead_lower']:+.1f} to {part['lead_upper']:+.1f}), "
        f"{part['effective_size']:.0f} effective months, {_p(part['deciding_p_value'])}"
    )


def _p(value: float) -> str:
    return "p < 0.001" if value < 0.001 else f"p {value:.3f}"


def _oscillator_lines(outcome: PrecursorOutcome) -> Iterator[str]:
    found = outcome.oscillator
    if found:
        yield (
            f"recharge oscillator: period {_months(found, 'period')}, damped over {_months(found, 'decay_time')}; such "
            "fits lean towards damping"
        )


def _months(found: dict[str, float], name: str) -> str:
    return f"{found[name]:.0f} months ({found[f'{name}_low']:.0f} to {found[f'{name}_high']:.0f})"


def _score_lines(outcome: PrecursorOutcome) -> Iterator[str]:
    if outcome.scores:
        yield f"hindcast ({outcome.forecaster}), out of sample:"
    for row in outcome.scores:
        if row["lead"] in _SHOWN_LEADS:
            yield (
                f"  {row['lead']:2d} months: correlation {_with_interval(row, 'correlation')}, "
                f"skill over climatology {_with_interval(row, 'skill_climatology')}, "
                f"over damped persistence {_with_interval(row, 'skill_damped_persistence')}"
            )


def _with_interval(row: dict[str, Any], name: str) -> str:
    return f"{row[name]:.2f} ({row[f'{name}_low']:.2f} to {row[f'{name}_high']:.2f})"


def _outlook_lines(outcome: PrecursorOutcome) -> Iterator[str]:
    given = [row for row in outcome.outlook if row["forecast"] == row["forecast"]]
    if given:
        yield "outlook from the last month, a research figure:"
    for row in given:
        yield (
            f"  {row['month']}: {row['forecast']:+.2f} "
            f"({row['quantile_0.05']:+.2f} to {row['quantile_0.95']:+.2f}, 90 %), "
            f"warm {row['probability_warm']:.0%}, neutral {row['probability_neutral']:.0%}, "
            f"cold {row['probability_cold']:.0%}"
        )
    if outcome.withheld:
        yield f"outlook {'withheld in part' if given else 'withheld'}: {outcome.withheld}"
