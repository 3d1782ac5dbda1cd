"""``thermotilt precursor``: exit codes, what is printed where, and in which form."""

from __future__ import annotations

import importlib
import json

import numpy as np
import pandas as pd
import pytest
from typer.testing import CliRunner

from profiles import pipeline
from profiles.cli import app
from profiles.pipeline import PrecursorOutcome
from profiles.vocabulary import CAUTION


def call(*arguments):
    return CliRunner().invoke(app, ["precursor", *(str(argument) for argument in arguments)])


@pytest.fixture
def undrawn(monkeypatch):
    """Leave out the figures and the page, which take the longest and have tests of their own."""
    module = importlib.import_module("profiles.pipeline.precursor")
    monkeypatch.setattr(module, "write_precursor_report", lambda *arguments: None)


@pytest.fixture(scope="module")
def files(tmp_path_factory):
    """Six years of an oscillation of 30 months: long enough for a correlation, too short for an outlook."""
    folder = tmp_path_factory.mktemp("series")
    months = np.arange("2031-01", "2037-01", dtype="datetime64[M]").astype(str)
    generator = np.random.default_rng(1)
    angle = 2.0 * np.pi * np.arange(72) / 30.0
    index, volume = (
        wave(angle) + generator.standard_normal(72) for wave in (np.sin, lambda value: np.sin(value + 1.5))
    )
    table = pd.DataFrame(
        {
            "month": months,
            "warm_water_volume_total": 2.3e15 + 1e14 * volume,
            "warm_water_volume_west": 1.4e15 + 5e13 * (volume - index),
            "thermocline_slope": -11.0 + index,
        }
    )
    table.to_csv(folder / "series.csv", index=False)
    pd.DataFrame({"month": months, "sst": 26.5 + index}).to_csv(folder / "sst.csv", index=False)
    return folder


def test_summary_says_leads_events_and_why_no_outlook(files, tmp_path):
    out = tmp_path / "out"
    result = call(out, "--series", files / "series.csv", "--sst", files / "sst.csv")
    assert result.exit_code == 0
    lines = result.stdout.splitlines()
    assert lines[:3] == [
        "record of the index: 2031-01 to 2036-12",
        "  volume and tilt: series.csv",
        "  index: sst.csv, a series as it stands",
    ]
    volume = next(line for line in lines if line.startswith("  volume: "))
    assert "effective months, p" in volume
    assert "months (" in volume
    assert any(line.startswith("events (mean of 3 months 0.5 degree_Celsius or more from zero") for line in lines)
    withheld = next(line for line in lines if line.startswith("outlook withheld: "))
    assert "6.0 years" in withheld
    assert lines[-2:] == [CAUTION, f"see {out / 'precursor.nc'} and {out / 'tables'}"]
    steps = ("series", "lead-lag", "events", "hindcast", "files", "report")
    assert result.stderr.splitlines() == [f"precursor: {step}" for step in steps]


@pytest.mark.usefixtures("undrawn")
def test_json_is_one_document_and_nothing_else(files, tmp_path):
    result = call(tmp_path, "--series", files / "series.csv", "--sst", files / "sst.csv", "--json")
    document = json.loads(result.stdout)
    assert result.stderr == ""
    assert document["exit_code"] == result.exit_code == 0
    assert document["caution"] == CAUTION
    assert [row["predictor"] for row in document["leads"]] == ["volume", "western_volume", "tilt"]
    assert {row["forecast"] for row in document["outlook"]} == {None}  # withheld: no number, and no NaN in JSON


@pytest.mark.usefixtures("undrawn")
def test_quiet_prints_nothing(files, tmp_path):
    result = call(tmp_path, "--series", files / "series.csv", "--sst", files / "sst.csv", "--quiet")
    assert (result.exit_code, result.stdout, result.stderr) == (0, "", "")


def outcome(tmp_path):
    """What an analysis of forty years would hand back."""
    row = {
        "predictor": "volume", "peak_lead": 7.0, "peak_lead_lower": 5.5, "peak_lead_upper": 9.4,
        "peak_correlation": 0.7,
        "peak_correlation_lower": 0.5, "peak_correlation_upper": 0.8, "peak_effective_size": 44.0,
        "peak_deciding_p_value": 1e-8, "precursor_lead": 7.0, "precursor_lead_lower": 5.5, "precursor_lead_upper": 9.4,
        "precursor_correlation": 0.7, "precursor_correlation_lower": 0.5, "precursor_correlation_upper": 0.8,
        "precursor_effective_size": 44.0, "precursor_deciding_p_value": 1e-8, "field_p_value": 0.012,
    }  # fmt: skip
    behind = row | {"predictor": "western_volume", "peak_lead": -5.0, "peak_correlation": -0.7}
    names = ("correlation", "skill_climatology", "skill_damped_persistence", "probability_skill")
    score = {f"{name}{end}": 0.5 for name in names for end in ("", "_low", "_high")}
    forecast = {
        "lead": 1, "month": "2071-01", "forecast": -0.9, "spread": 0.4, "status": 0, "quantile_0.05": -1.5,
        "quantile_0.95": -0.3, "probability_cold": 0.88, "probability_neutral": 0.12, "probability_warm": 0.0,
    }  # fmt: skip
    nothing = dict.fromkeys(forecast, float("nan")) | {"lead": 2, "month": "2071-02", "status": 2}
    return PrecursorOutcome(
        out=tmp_path,
        record="2031-01 to 2070-12",
        notes=(),
        leads=(row, behind),
        events=({"kind": "warm"}, {"kind": "cold"}, {"kind": "warm"}),
        rule="a rule",
        oscillator={
            "period": 44.0, "period_low": 38.0, "period_high": 54.0, "decay_time": 17.0, "decay_time_low": 12.0,
            "decay_time_high": 26.0,
        },
        forecaster="combined",
        scores=({"lead": 1} | score, {"lead": 2} | score),
        outlook=(forecast, nothing),
        withheld="no skill at 2 months",
    )  # fmt: skip


def test_outlook_is_printed_as_a_research_figure_and_what_is_withheld_is_said(tmp_path, monkeypatch):
    monkeypatch.setattr(pipeline, "precursor", lambda *arguments, **settings: outcome(tmp_path))
    lines = call(tmp_path).stdout.splitlines()
    peak = "+0.70 (+0.50 to +0.80) at +7.0 months (+5.5 to +9.4), 44 effective months, p < 0.001"
    assert f"  volume: {peak}; field p 0.012" in lines
    assert f"    first: {peak}" in lines  # of the western volume, whose strongest lead is behind
    assert sum("first:" in line for line in lines) == 1
    assert "events (a rule): 2 warm, 1 cold" in lines
    oscillator = next(line for line in lines if line.startswith("recharge oscillator"))
    assert "period 44 months (38 to 54), damped over 17 months (12 to 26); such fits lean towards damping" in oscillator
    assert [line[:12] for line in lines if "over damped persistence" in line] == ["   1 months:"]
    at = lines.index("outlook from the last month, a research figure:")
    assert lines[at + 1] == "  2071-01: -0.90 (-1.50 to -0.30, 90 %), warm 0%, neutral 12%, cold 88%"
    assert lines[at + 2] == "outlook withheld in part: no skill at 2 months"
    assert lines[at + 3] == CAUTION


@pytest.mark.parametrize(
    ("arguments", "code", "message"),
    [
        ([], 2, "there is no run with a section in this folder"),
        (["--series", "nothing.csv"], 2, "nothing.csv: no such file"),
        (["--series", "{series}"], 2, "--sst: there is no surface temperature"),
        (["--series", "{series}", "--sst", "{sst}", "--box", "nino5"], 2, "no such box"),
        (["--series", "{series}", "--sst", "{series}"], 2, "which column is meant?"),
        (["--series", "{sst}", "--sst", "{sst}"], 2, "no such column"),
        (["--series", "{series}", "--sst", "{kelvin}"], 3, "which looks like kelvin"),
        (["--series", "{series}", "--sst", "{filled}"], 3, "stands for 'missing' was left among the data"),
        (["--series", "{series}", "--sst", "{constant}"], 3, "the series is constant"),
        (["--series", "{series}", "--sst", "{gappy}"], 3, "months are left out"),
        (["--series", "{series}", "--sst", "{yearly}"], 3, "steps of the series are not monthly"),
    ],
)
def test_a_mistake_says_what_and_shows_no_traceback(files, tmp_path, arguments, code, message):
    good = pd.read_csv(files / "sst.csv")
    bad = {
        "kelvin": good.assign(sst=good["sst"] + 273.15),
        "filled": good.assign(sst=good["sst"].where(good.index != 5, -99.99)),
        "constant": good.assign(sst=20.0),
        "gappy": good.drop(index=[7]),
        "yearly": good.iloc[::12],
    }
    for name, table in bad.items():
        table.to_csv(tmp_path / f"{name}.csv", index=False)
    paths = {name: tmp_path / f"{name}.csv" for name in bad} | {
        name: files / f"{name}.csv" for name in ("series", "sst")
    }
    result = call(tmp_path / "out", *(argument.format(**paths) for argument in arguments))
    assert result.exit_code == code
    assert message in result.stderr
    assert "Traceback" not in result.stderr
    assert result.stdout == ""


@pytest.mark.usefixtures("undrawn")
def test_a_declared_missing_value_is_accepted(files, tmp_path):
    good = pd.read_csv(files / "sst.csv")
    good.assign(sst=good["sst"].where(good.index != 5, -99.99)).to_csv(tmp_path / "filled.csv", index=False)
    series = ("--series", files / "series.csv", "--sst", tmp_path / "filled.csv")
    assert call(tmp_path / "out", *series, "--missing", "-99.99", "--quiet").exit_code == 0


@pytest.mark.usefixtures("undrawn")
def test_settings_come_from_the_configuration_named(files, tmp_path):
    config = tmp_path / "array.toml"
    config.write_text(
        '[array]\nname = "A"\n[[moorings]]\nid = "M"\nlatitude = 0.0\nlongitude = 200.0\n'
        'deliveries = [{path = "a.csv", layout = "b.toml"}]\n[precursor.events]\nthreshold = 0.9\n',
        encoding="utf-8",
    )
    series = ("--series", files / "series.csv", "--sst", files / "sst.csv")
    result = call(tmp_path / "out", *series, "--config", config)
    assert result.exit_code == 0
    assert "events (mean of 3 months 0.9 degree_Celsius" in result.stdout
