"""The section on precursors: what it says, that it is safe, and how it gets into the page of a run."""

from __future__ import annotations

import re
from html.parser import HTMLParser
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
import xarray as xr
from PIL import Image

from profiles.report import PrecursorFacts, insert_precursor, precursor_section, write_page, write_precursor_page
from profiles.report.precursor_section import CAPTIONS, HEADING
from profiles.report.tables import LAYOUTS
from profiles.vocabulary import CAUTION

ATTACK = "<script>alert('x')</script>"
VOID = {"meta", "img", "br", "link"}


class Reader(HTMLParser):
    """Notes what does not close in order."""

    def __init__(self) -> None:
        super().__init__()
        self.open: list[str] = []
        self.tags: list[str] = []
        self.disorder: list[str] = []

    def handle_starttag(self, tag: str, attrs: object) -> None:
        self.tags.append(tag)
        if tag not in VOID:
            self.open.append(tag)

    def handle_endtag(self, tag: str) -> None:
        if not self.open or self.open.pop() != tag:
            self.disorder.append(tag)


@pytest.fixture(scope="module")
def figures(tmp_path_factory: pytest.TempPathFactory) -> dict[str, Path]:
    folder = tmp_path_factory.mktemp("figures")
    for name in CAPTIONS:
        Image.new("RGB", (700, 400)).save(folder / f"{name}.png")
    return {name: folder / f"{name}.png" for name in CAPTIONS}


@pytest.fixture
def facts() -> PrecursorFacts:
    leads = pd.DataFrame(
        {
            "predictor": ["western_volume", ATTACK],
            "peak_lead": [12.5, -3.0],
            "peak_lead_lower": [11.0, -4.0],
            "peak_lead_upper": [14.0, -2.0],
            "peak_correlation": [0.55, -0.3],
            "peak_effective_size": [45.0, 46.0],
            "peak_deciding_p_value": [0.0001, 0.04],
            "field_p_value": [0.002, 0.3],
        }
    )
    events = pd.DataFrame(
        {
            "kind": ["warm", "cold", "warm"],
            "onset": ["2031-04", "2033-08", "2036-01"],
            "peak": ["2031-11", "2033-12", "2036-05"],
            "end": ["2032-01", "2034-03", "2036-09"],
            "duration": [10, 8, 9],
            "peak_value": [2.1, -1.1, 0.9],
        }
    )
    rule = "mean of 3 months 0.5 degree_Celsius or more from zero in 5 months or more in a row"
    return PrecursorFacts("2031-01 to 2036-12", "index", rule, (f"said {ATTACK}",), {"leads": leads, "events": events})


def outlook(last_given: int) -> xr.Dataset:
    leads = np.arange(1, 4)
    given = leads <= last_given
    return xr.Dataset(
        {
            "forecast": ("lead", np.where(given, 0.4, np.nan)),
            "probability": (("lead", "category"), np.where(given[:, None], [0.1, 0.5, 0.4], np.nan)),
        },
        coords={
            "lead": leads,
            "target": ("lead", np.array(["2037-01-16", "2037-02-15", "2037-03-16"], dtype="M8[ns]")),
            "category": ["cold", "neutral", "warm"],
        },
        attrs={"forecaster": "combined"},
    )


def test_the_section_closes_what_it_opens_and_escapes_what_it_is_told(
    figures: dict[str, Path], facts: PrecursorFacts
) -> None:
    section = precursor_section(figures, facts)
    reader = Reader()
    reader.feed(section)
    assert reader.open == reader.disorder == []
    assert "script" not in reader.tags
    assert section.count("&lt;script&gt;") == 2
    assert reader.tags.count("img") == len(figures)
    assert not re.search(r"https?://", section)


def test_the_caution_stands_at_the_top_and_by_the_outlook(figures: dict[str, Path], facts: PrecursorFacts) -> None:
    section = precursor_section(figures, facts)
    assert section.index(CAUTION) < section.index('<dl class="found">')
    plate = section.index("<h3>Outlook</h3>")
    assert plate < section.index(CAUTION, plate) < section.index("<img", plate)


def test_findings_give_lead_events_and_outlook(facts: PrecursorFacts) -> None:
    section = precursor_section({}, facts, outlook=outlook(2))
    assert 'Lead of the western volume</dt><dd class="value">12.5 months' in section
    assert "2 warm, 1 cold" in section
    assert "Outlook for February 2037, 2 months ahead" in section
    assert "warm 40.0 %, neutral 50.0 %, cold 10.0 %" in section
    assert "0.5 °C or more from zero" in section


@pytest.mark.parametrize("given", [None, 0])
def test_an_outlook_that_is_withheld_is_said_to_be(facts: PrecursorFacts, given: int | None) -> None:
    section = precursor_section({}, facts, outlook=None if given is None else outlook(given))
    assert '<dt>Outlook</dt><dd class="value">withheld</dd>' in section


def test_an_oscillator_without_a_period_has_an_infinite_one(facts: PrecursorFacts) -> None:
    numbers = {"period": np.inf, "period_low": 30.0, "period_high": np.inf, "decay_time": 9.0, "decay_time_low": 7.0,
               "decay_time_high": 12.0, "decay_time_uncorrected": 8.0}  # fmt: skip
    section = precursor_section({}, facts, oscillator=xr.Dataset(numbers))
    assert "∞ months (95 % 30 to ∞)" in section
    assert "8 before the correction" in section


def test_a_record_without_events_says_so(facts: PrecursorFacts) -> None:
    empty = PrecursorFacts(
        facts.record, facts.index, facts.rule, (), {"leads": facts.tables["leads"], "events": pd.DataFrame()}
    )
    section = precursor_section({}, empty)
    assert "By this rule the record has no event." in section
    assert "0 warm, 0 cold" in section


def test_inserting_is_what_writing_the_page_with_it_gives(small_array, facts_of, facts, figures, tmp_path) -> None:  # type: ignore[no-untyped-def]
    arguments = {
        "facts": facts_of(),
        "section": small_array.section.section,
        "volume": small_array.section.volume,
        "figures": {},
        "mooring_figures": {},
        "tables": {name: small_array.tables[name] for name in LAYOUTS},
    }
    section = precursor_section(figures, facts)
    write_page(tmp_path / "with.html", **arguments, precursor=section)
    write_page(tmp_path / "without.html", **arguments)
    whole, bare = ((tmp_path / f"{name}.html").read_text(encoding="utf-8") for name in ("with", "without"))
    assert HEADING not in bare
    assert insert_precursor(bare, section) == whole
    # Again, and away again.
    assert insert_precursor(whole, section) == whole
    assert insert_precursor(whole, "") == bare
    assert whole.index('href="#precursor"') < whole.index('id="precursor"') < whole.index('id="tables"')


def test_a_page_of_its_own_is_whole(facts: PrecursorFacts, figures: dict[str, Path], tmp_path: Path) -> None:
    write_precursor_page(tmp_path / "page.html", precursor_section(figures, facts), ATTACK)
    page = (tmp_path / "page.html").read_text(encoding="utf-8")
    reader = Reader()
    reader.feed(page)
    assert reader.open == reader.disorder == []
    assert "script" not in reader.tags
    assert page.startswith("<!DOCTYPE html>")
