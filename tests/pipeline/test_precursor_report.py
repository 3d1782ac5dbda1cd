"""The precursors' section in the report of a run: put there, kept, and dropped when its series change."""

from __future__ import annotations

from pathlib import Path

import pytest

from profiles import store
from profiles.pipeline import precursor_report
from profiles.pipeline.paths import Folder
from profiles.pipeline.precursor_report import kept_section, write_precursor_report
from profiles.report.precursor_section import HEADING


@pytest.fixture
def folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Folder:
    """A folder with a run's page, volume and section, in which any section is one sentence."""
    folder = Folder(tmp_path)
    store.make_folder(folder.precursor_section.parent)
    page = (
        "<main>\n<!-- precursor link -->\n<!-- /precursor link -->\n<!-- precursor -->\n<!-- /precursor -->\n</main>\n"
    )
    folder.page.write_text(page, encoding="utf-8")
    folder.account.write_text("{}", encoding="utf-8")
    for path in (folder.volume, folder.section):
        path.write_bytes(path.name.encode())
    monkeypatch.setattr(precursor_report, "_section", lambda folder, notes: f"<h2>{HEADING}</h2>{'; '.join(notes)}\n")
    return folder


def test_the_section_goes_into_the_page_of_a_run(folder: Folder) -> None:
    write_precursor_report(folder, (folder.volume, folder.section), ["one"])
    page = folder.page.read_text(encoding="utf-8")
    assert f"<!-- precursor -->\n<h2>{HEADING}</h2>one\n<!-- /precursor -->" in page
    assert page.startswith("<main>")
    write_precursor_report(folder, (folder.volume, folder.section), ["two"])
    page = folder.page.read_text(encoding="utf-8")
    assert "two" in page
    assert "one" not in page


def test_the_section_is_kept_while_volume_and_tilt_are_the_same(folder: Folder) -> None:
    write_precursor_report(folder, (folder.volume, folder.section), ["one"])
    assert HEADING in kept_section(folder)
    folder.volume.write_bytes(b"other")
    assert kept_section(folder) == ""


def test_a_section_of_other_files_is_kept_whatever_the_run_does(folder: Folder, tmp_path: Path) -> None:
    write_precursor_report(folder, (tmp_path / "series.csv",), ["one"])
    folder.volume.write_bytes(b"other")
    assert HEADING in kept_section(folder)


def test_without_an_analysis_there_is_no_section(folder: Folder) -> None:
    assert kept_section(folder) == ""


def test_without_a_run_the_section_is_a_page_of_its_own(folder: Folder) -> None:
    folder.account.unlink()
    write_precursor_report(folder, (), ["one"])
    page = folder.page.read_text(encoding="utf-8")
    assert page.startswith("<!DOCTYPE html>")
    assert HEADING in page
