"""The web page: whole, safe, findable, the same bytes."""

import re
from dataclasses import replace
from html.parser import HTMLParser

import numpy as np
import pandas as pd
import pytest

from profiles.errors import MachineError
from profiles.report import write_array_figures, write_mooring_figure, write_page
from profiles.report.tables import LAYOUTS, LONGEST_TEXT, text, views
from profiles.store import read_table, write_table
from profiles.vocabulary import CAUTION

ATTACK = "<script>alert('x')</script>"
VOID = {"meta", "img", "br", "link", "input", "hr"}


class Reader(HTMLParser):
    """Collects the tags, their attributes and whether they close in order."""

    def __init__(self):
        super().__init__()
        self.open, self.tags, self.words, self.disorder = [], [], [], []

    def handle_starttag(self, tag, attributes):
        self.tags.append((tag, dict(attributes)))
        if tag not in VOID:
            self.open.append(tag)

    def handle_endtag(self, tag):
        if not self.open or self.open.pop() != tag:
            self.disorder.append((tag, self.getpos()))

    def handle_data(self, words):
        self.words.append(words)

    def named(self, tag):
        return [attributes for name, attributes in self.tags if name == tag]


def _read(path):
    reader = Reader()
    reader.feed(path.read_text(encoding="utf-8"))
    reader.close()
    return reader


@pytest.fixture(scope="session")
def pictures(small_array, tmp_path_factory):
    folder = tmp_path_factory.mktemp("figures")
    figures = write_array_figures(
        folder,
        monthly=small_array.monthly,
        data_return=small_array.tables["data_return"],
        section=small_array.section.section,
        volume=small_array.section.volume,
    )
    moorings = {
        name: write_mooring_figure(folder / f"{name}.png", chain, small_array.columns[name])
        for name, chain in small_array.chains.items()
    }
    return figures, moorings


@pytest.fixture
def write(small_array, pictures, facts_of, tmp_path):
    figures, moorings = pictures

    def make(name="report.html", **changes):
        arguments = {
            "facts": facts_of(),
            "section": small_array.section.section,
            "volume": small_array.section.volume,
            "figures": figures,
            "mooring_figures": moorings,
            "tables": small_array.tables,
        }
        write_page(tmp_path / name, **(arguments | changes))
        return tmp_path / name

    return make


def test_the_page_parses_and_closes_what_it_opens(write):
    reader = _read(write())
    assert reader.disorder == []
    assert reader.open == []
    assert reader.named("html")[0]["lang"] == "en"


def test_the_page_refers_to_nothing_outside_it(write):
    path = write()
    assert not re.search(r"https?://", path.read_text(encoding="utf-8"))
    reader = _read(path)
    assert all(image["src"].startswith("data:image/png;base64,") for image in reader.named("img"))
    assert not {"script", "link", "iframe", "object"} & {tag for tag, _ in reader.tags}
    anchors = {attributes["id"] for _, attributes in reader.tags if "id" in attributes}
    assert {link["href"].removeprefix("#") for link in reader.named("a")} <= anchors


def test_every_figure_is_there_with_a_text_in_its_place(write, pictures):
    images = _read(write()).named("img")
    figures, moorings = pictures
    assert len(images) == len(figures) + len(moorings)
    assert all(len(image["alt"]) > 20 for image in images)
    assert all(int(image["width"]) >= 600 and int(image["height"]) >= 300 for image in images)


def test_headings_are_in_order(write):
    levels = [int(tag[1]) for tag, _ in _read(write()).tags if re.fullmatch("h[1-6]", tag)]
    assert levels[0] == 1
    assert levels.count(1) == 1
    assert max(np.diff(levels)) == 1


def test_every_table_heading_has_a_scope(write):
    assert all(heading["scope"] in ("col", "row") for heading in _read(write()).named("th"))


def test_the_caution_stands_at_the_top_and_by_the_volume(write):
    page = write().read_text(encoding="utf-8")
    assert page.index(CAUTION) < page.index("What was found</h2>")
    volume = page.index("<h3>Volume of warm water</h3>")
    assert volume < page.index(CAUTION, volume) < page.index("<img", volume)


def test_text_from_files_is_escaped(write, small_array, pictures, facts_of):
    _, moorings = pictures
    tables = dict(small_array.tables)
    tables["quarantine"] = pd.DataFrame({"file": [ATTACK], "line": [3], "reason": [ATTACK], "text": [ATTACK]})
    tables["deliveries"] = tables["deliveries"].assign(file=ATTACK, outcome=ATTACK, problem=ATTACK)
    for name in ("faults", "gaps", "data_return"):
        tables[name] = tables[name].replace({"mooring": {"TB-01": ATTACK}})
    description = {key: ATTACK for key in ("summary", "institution", "license", "acknowledgement")}
    facts = replace(facts_of(ATTACK, **description), versions={ATTACK: ATTACK}, date=ATTACK)
    path = write(facts=facts, tables=tables, mooring_figures={ATTACK: moorings["TB-01"]})
    reader = _read(path)
    assert not reader.named("script")
    assert reader.disorder == []
    assert "<script" not in path.read_text(encoding="utf-8").lower()
    # title, heading, summary, date, institution, license, acknowledgement, versions (2), mooring, quarantine (3),
    # deliveries (3 rows of 3), and one or more of each of the three lists
    assert "".join(reader.words).count(ATTACK) >= 9 + 1 + 3 + 9 + 3


def test_the_summary_gives_the_last_month_with_its_interval(write, small_array):
    words = "".join(_read(write()).words)
    section = small_array.section.section
    slope = float(section["thermocline_slope"][-1])
    half = 1.959964 * float(section["thermocline_slope_error"][-1])
    assert f"{slope:.1f} ± {half:.1f} m per 1000 km".replace("-", "−") in words
    assert "March 2031" in words
    assert "2 of 3" in words
    # three deliveries of 30 rows, 28 kept and 2 in quarantine each
    assert "84 kept, 6 in quarantine" in words


def test_the_window_and_the_settings_are_stated(write):
    words = "".join(_read(write()).words)
    assert "from 165°E to 95°W" in words
    assert "section.tilt_window" in words
    assert "qc.spike.threshold_low" in words


def test_a_run_without_faults_says_so(write, single_month):
    words = "".join(_read(write(tables=single_month.tables)).words)
    assert LAYOUTS["faults"].empty in words
    assert LAYOUTS["quarantine"].empty in words


def test_a_long_table_is_cut_and_says_where_the_rest_is(small_array):
    tables = dict(small_array.tables)
    tables["quarantine"] = pd.DataFrame(
        {"file": "a.csv", "line": np.arange(1, 5001), "reason": "no number", "text": "x"}
    )
    view = views(tables)["quarantine"]
    assert [row[1] for row in view.rows] == [str(line) for line in range(1, 41)]
    assert view.cut == "The first 40 of 5\u202f000; all stand in tables/quarantine.csv."


def test_what_is_cut_is_the_least(small_array):
    tables = dict(small_array.tables)
    table = pd.concat([tables["gaps"].head(1)] * 50, ignore_index=True)
    tables["gaps"] = table.assign(duration=np.arange(50.0))
    assert [row[-1] for row in views(tables)["gaps"].rows] == [f"{days}" for days in range(49, 9, -1)]
    many = pd.concat([tables["deliveries"]] * 50, ignore_index=True)
    many.loc[140, "problem"] = "empty file"
    tables["deliveries"] = many
    assert views(tables)["deliveries"].rows[0][-1] == "empty file"


def test_tables_read_back_from_csv_are_shown_alike(small_array, tmp_path):
    tables = small_array.tables
    for name, table in tables.items():
        write_table(tmp_path / f"{name}.csv", table)
    read = {name: read_table(tmp_path / f"{name}.csv") for name in tables}
    assert {name: view.rows for name, view in views(read).items()} == {
        name: view.rows for name, view in views(tables).items()
    }


def test_unprintable_text_is_replaced_and_long_text_cut():
    assert text("a\x00b\udcff") == "a\ufffdb\ufffd"
    assert text("x" * 1000) == "x" * LONGEST_TEXT + "…"
    assert text(np.nan) == ""


def test_the_same_run_gives_the_same_bytes(write):
    assert write("a.html").read_bytes() == write("b.html").read_bytes()


def test_a_page_that_cannot_be_written_is_an_error_of_the_machine(write):
    with pytest.raises(MachineError, match="cannot be written"):
        write("missing/report.html")
