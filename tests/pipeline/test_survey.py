"""What is found in deliveries before any work."""

from __future__ import annotations

from pathlib import Path

import pandas as pd

from profiles.config import load_config
from profiles.pipeline import Finding, survey


def test_every_delivery_is_read_and_counted(small_array: Path) -> None:
    told: list[Finding] = []
    findings = survey(load_config(small_array / "array.toml"), told.append)
    assert told == findings
    assert [finding.mooring for finding in findings] == ["TB-07", "TB-18", "TB-28"]
    damaged = pd.read_csv(small_array / "damaged.csv")["file"].value_counts()
    for finding in findings:
        assert finding.rows_read - finding.rows_kept == damaged.get(finding.file.as_posix(), 0)
        assert finding.outcome == ("rows quarantined" if finding.file.as_posix() in damaged else "clean")


def test_rows_that_were_not_understood_are_told_with_their_lines(small_array: Path) -> None:
    wide = survey(load_config(small_array / "array.toml"))[0]
    lines = sorted(pd.read_csv(small_array / "damaged.csv").query("file.str.contains('TB-07')")["line"])
    assert all(f"line {line}: " in wide.message for line in lines[:3])
    assert wide.message.endswith("and 1 more")


def test_unusable_delivery_is_named_as_the_configuration_names_it(array: Path) -> None:
    (array / "deliveries" / "marlin" / "TB-18.csv.gz").unlink()
    finding = survey(load_config(array / "array.toml"))[1]
    assert finding.outcome == "not usable"
    assert finding.message.startswith("deliveries/marlin/TB-18.csv.gz: no such file")


def test_survey_writes_nothing(array: Path) -> None:
    before = sorted(array.rglob("*"))
    survey(load_config(array / "array.toml"))
    assert sorted(array.rglob("*")) == before
