import re
from pathlib import Path

import numpy as np
import pytest

from profiles.errors import ConfigError, RequestError
from profiles.ingest import load_layout, read
from profiles.ingest.layout import KINDS, BlockedLayout, CountedLayout, LongLayout, NetcdfLayout, WideLayout
from profiles.ingest.layout.parts import WideQuality

LAYOUTS = Path(__file__).parents[2] / "config" / "layouts"
WIDE = 'kind = "wide"\n[time]\ncolumn = "date"\n[depth]\npattern = "T_{depth}m"\n'


@pytest.mark.parametrize(
    ("name", "model"),
    [
        ("halcyon_wide", WideLayout),
        ("marlin_long", LongLayout),
        ("frigate_netcdf", NetcdfLayout),
        ("shearwater_wide", WideLayout),
        ("heron_fixed", WideLayout),
        ("petrel_blocked", BlockedLayout),
        ("curlew_counted", CountedLayout),
    ],
)
def test_the_example_layouts_load(name, model):
    assert isinstance(load_layout(LAYOUTS / f"{name}.toml"), model)


def keys_of(model):
    """Return the keys of a layout, those of its tables among them."""
    for key, field in model.model_fields.items():
        yield key
        annotation = field.annotation
        yield from keys_of(annotation) if hasattr(annotation, "model_fields") else ()


@pytest.mark.parametrize(
    ("name", "models"),
    [
        ("halcyon_wide", [WideLayout, WideQuality]),
        ("petrel_blocked", [BlockedLayout]),
        ("curlew_counted", [CountedLayout]),
    ],
)
def test_every_key_of_a_kind_stands_in_its_example(name, models):
    common = (LAYOUTS / "halcyon_wide.toml").read_text(encoding="utf-8")
    text = common + (LAYOUTS / f"{name}.toml").read_text(encoding="utf-8")
    for model in models:
        for key in keys_of(model):
            assert key in text, key


def example(name):
    """Return the delivery that stands in a layout's first comment, and how many rows of data it shows."""
    text = (LAYOUTS / f"{name}.toml").read_text(encoding="utf-8")
    shown = text.split("#\n", 2)[2].split("\n\n", 1)[0].splitlines()
    return [line.removeprefix("#   ") for line in shown]


@pytest.mark.parametrize(
    ("name", "kept", "depths", "first", "last"),
    [
        ("halcyon_wide", 1, [1, 10, 25], [29.312, 29.27, None], "2031-01-01T12:00"),
        ("marlin_long", 2, [1, 10], [29.312, None], "2031-01-01T12:00"),
        ("heron_fixed", 2, [1, 10, 25.5], [29.312, 29.27, 28.115], "2031-01-01T00:10"),
        # the first and the second block have 1 m in common, and headers of two lines each
        ("petrel_blocked", 7, [1, 10, 12, 25.5], [29.312, 29.27, None, 28.115], "2031-01-02T07:00"),
        ("curlew_counted", 7, [1, 10, 25.5], [29.312, 29.27, 28.115], "2031-01-01T01:30"),
    ],
)
def test_each_example_reads_the_delivery_that_stands_in_it(write, name, kept, depths, first, last):
    delivery = read(write("\n".join(example(name))), LAYOUTS / f"{name}.toml")
    assert (delivery.rows_kept, delivery.rows_quarantined) == (kept, 0)
    np.testing.assert_array_equal(delivery.chain["depth"], np.float32(depths))
    np.testing.assert_array_equal(delivery.chain["temperature"][0], np.array(first, np.float32))
    assert delivery.chain["time"].values[-1] == np.datetime64(last)


GUIDE = (LAYOUTS.parents[1] / "DEVELOPERS.md").read_text(encoding="utf-8")
WORKED = re.findall(r"```text\n(.*?)```\n\n```toml\n(.*?)```", GUIDE, flags=re.DOTALL)


@pytest.mark.parametrize(("delivery", "layout"), WORKED)
def test_the_worked_examples_of_the_guide_are_read(write, layout_of, delivery, layout):
    read_back = read(write(delivery), layout_of(layout))
    assert read_back.rows_quarantined == 0
    coldest = {"wide": 28.1, "long": 28.1, "blocked": 28.1, "counted": 29.2}[layout_of(layout).kind]
    assert read_back.chain["temperature"].min().item() == pytest.approx(coldest)


def test_the_guide_has_a_worked_example_of_each_kind_of_text(layout_of):
    assert {layout_of(layout).kind for _, layout in WORKED} == KINDS.keys() - {"netcdf", "series"}


def test_pressures_and_kelvin_of_the_example_are_converted(write):
    path = write("\n".join(line.replace("  ", "\t") for line in example("shearwater_wide")[:2]))
    rows = [line.split() for line in example("shearwater_wide")[2:]]
    path.write_text(path.read_text() + "\n" + "\n".join("\t".join(row) for row in rows))
    chain = read(path, LAYOUTS / "shearwater_wide.toml", latitude=0.0).chain
    # 298.012 K = 24.862 °C; 5 dbar are 4.97 m at the equator (gsw.z_from_p)
    np.testing.assert_allclose(chain["temperature"][0], [24.862, 24.72, np.nan], rtol=1e-6)
    np.testing.assert_allclose(chain["depth"], [0.995, 4.973, 10.044], atol=2e-3)


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
            r"no known kind.*expected wide, long, blocked, counted, netcdf, series; found 'wied'.*'wide'\?",
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
