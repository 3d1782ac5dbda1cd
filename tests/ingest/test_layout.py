from pathlib import Path

import pytest

from profiles.errors import ConfigError, RequestError
from profiles.ingest import load_layout
from profiles.ingest.layout import LongLayout, NetcdfLayout, WideLayout

LAYOUTS = Path(__file__).parents[2] / "config" / "layouts"
WIDE = 'kind = "wide"\n[time]\ncolumn = "date"\n[depth]\npattern = "T_{depth}m"\n'


@pytest.mark.parametrize(
    ("name", "model"),
    [
        ("halcyon_wide", WideLayout),
        ("marlin_long", LongLayout),
        ("frigate_netcdf", NetcdfLayout),
        ("shearwater_wide", WideLayout),
    ],
)
def test_the_example_layouts_load(name, model):
    assert isinstance(load_layout(LAYOUTS / f"{name}.toml"), model)


def test_every_key_of_a_wide_layout_stands_in_its_example():
    text = (LAYOUTS / "halcyon_wide.toml").read_text(encoding="utf-8")
    table = load_layout(LAYOUTS / "halcyon_wide.toml")
    for part in (table, table.time, table.depth, table.temperature):
        for key in type(part).model_fields:
            assert key in text, key


def test_defaults_are_those_the_examples_state(layout_of):
    layout = layout_of(WIDE)
    assert (layout.delimiter, layout.comment, layout.header_rows, layout.names_row) == (",", "", 1, 1)
    assert (layout.decimal, layout.missing, layout.time.format, layout.time.zone) == (".", ("",), "iso8601", "UTC")
    assert (layout.depth.units, layout.depth.positive) == ("m", "down")
    assert (layout.temperature.units, layout.temperature.scale) == ("degree_Celsius", "ITS-90")


@pytest.mark.parametrize(
    ("wrong", "message"),
    [
        ("delimeter = ';'\n" + WIDE, r"delimeter: this key is not known; did you mean 'delimiter'\?"),
        (WIDE + "patern = 'x'\n", r"depth.patern: this key is not known; did you mean 'pattern'\?"),
        (
            WIDE.replace('"wide"', '"wied"'),
            r"no known kind.*expected wide, long, blocked, counted, netcdf; found 'wied'.*'wide'\?",
        ),
        (WIDE.replace('kind = "wide"', ""), r"kind: this key is missing"),
        (WIDE.replace('column = "date"', ""), "time: expected either column or columns"),
        (WIDE.replace("{depth}", "x"), r"depth.pattern: expected \{depth\} once in pattern"),
        (WIDE + "columns = { a = 1.0, b = 1.0 }\n", "depth: expected either pattern or columns"),
        (WIDE.replace('pattern = "T_{depth}m"', "columns = { a = 1.0, b = 1.0 }"), "depth that appears twice: 1"),
        (WIDE + "units = 'furlongs per day'\n", "depth.units: unknown units: 'furlongs per day'"),
        (WIDE + "[temperature]\nunits = 'm'\n", "temperature.units: unknown units: 'm'"),
        (WIDE + "[temperature]\nscale = 'ITS-27'\n", "temperature.scale: Input should be 'ITS-90' or 'IPTS-68'"),
        (WIDE.replace("[depth]", "zone = 'Pacific/Guamm'\n[depth]"), r"time.zone: no such.*'Pacific/Guam'\?"),
        (WIDE.replace("[depth]", "zone = '+1'\n[depth]"), r"time.zone: no offset from UTC: '\+1'"),
        (WIDE.replace("[depth]", "format = '%d %m %H'\n[depth]"), "does not give year, month and day"),
        (WIDE.replace("[depth]", "format = '%Y-%m-%d %Q'\n[depth]"), "time.format"),
        ("encoding = 'utf-9'\n" + WIDE, "encoding: no such encoding: 'utf-9'"),
        ("delimiter = ';;'\n" + WIDE, "delimiter: expected one character"),
        ("decimal = ','\n" + WIDE, "delimiter and decimal are the same"),
        ("names_row = 2\n" + WIDE, "expected names_row among the header_rows"),
        ("header_rows = '1'\n" + WIDE, "header_rows: Input should be a valid integer; found '1'"),
    ],
)
def test_a_wrong_layout_says_where_and_what(layout_of, wrong, message):
    with pytest.raises(ConfigError, match=f"(?s)layout.toml: .*{message}"):
        layout_of(wrong)


def test_all_problems_are_reported_at_once(layout_of):
    with pytest.raises(ConfigError, match="2 problems") as caught:
        layout_of("decimall = ','\n" + WIDE + "units = 'bogus'\n")
    assert len(caught.value.problems) == 2


def test_a_missing_layout_is_a_wrong_request(tmp_path):
    with pytest.raises(RequestError, match="no such file"):
        load_layout(tmp_path / "none.toml")
