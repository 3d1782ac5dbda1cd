"""Labels, the depth axis and the file of a figure."""

import numpy as np
import pytest
from matplotlib import rcParams
from matplotlib.figure import Figure
from PIL import Image
from scipy.stats import norm

from profiles.errors import MachineError
from profiles.report import style


@pytest.mark.parametrize(
    ("longitude", "label"), [(165.0, "165°E"), (265.0, "95°W"), (180.0, "180°"), (0.0, "0°"), (149.5, "149.5°E")]
)
def test_longitude_is_written_east_and_west(longitude, label):
    assert style.longitude_label(longitude) == label


@pytest.mark.parametrize(("latitude", "label"), [(-2.5, "2.5°S"), (0.0, "0°"), (5.0, "5°N")])
def test_latitude_is_written_north_and_south(latitude, label):
    assert style.latitude_label(latitude) == label


def test_half_width_is_the_normal_quantile():
    # scipy.stats.norm is the outside reference
    assert pytest.approx(norm.ppf(0.975), abs=1e-6) == style.HALF_WIDTH_95


def test_depth_scale_is_closer_below_300_m_and_turns_back():
    depth = np.array([0.0, 150.0, 300.0, 500.0])
    # below 300 m a metre is 0.3 as long: 300 + 0.3 * 200 = 360
    np.testing.assert_allclose(style.depth_scale(depth), [0.0, 150.0, 300.0, 360.0])
    np.testing.assert_allclose(style.scaled_depth(style.depth_scale(depth)), depth)


@pytest.mark.parametrize(("days", "label"), [(12, "05 Jan"), (200, "Feb 2031"), (3000, "2033")])
def test_dates_of_any_span_can_be_placed(days, label):
    figure = Figure()
    axis = figure.add_axes((0.1, 0.1, 0.8, 0.8))
    style.time_axis(axis)
    axis.set_xlim(*(np.datetime64("2031-01-01") + np.array([0, days])))
    assert label in [tick.get_text() for tick in axis.get_xticklabels()]


def test_round_limits_hold_all_but_the_outermost_values():
    low, high = style.round_limits(np.append(np.linspace(12.3, 27.8, 1000), np.nan))
    assert low <= 12.5
    assert high >= 27.6
    assert (low * 2, high * 2) == (round(low * 2), round(high * 2))
    assert style.round_limits(np.array([np.nan])) == (0.0, 1.0)


def test_plain_text_keeps_a_dollar_sign_from_becoming_a_formula():
    assert style.plain("A$1$") == r"A\$1\$"


@style.styled
def _drawing() -> Figure:
    figure = Figure(figsize=(3.0, 2.0))
    axis = figure.add_axes((0.1, 0.1, 0.8, 0.8))
    axis.imshow(np.random.default_rng(3).random((60, 60, 3)))
    axis.plot(30, 30, "s", color=style.SKY, markersize=5)
    return figure


@pytest.mark.parametrize("palette", [False, True])
def test_the_same_figure_gives_the_same_bytes(tmp_path, palette):
    first, second = (style.save(_drawing(), tmp_path / name, palette=palette).read_bytes() for name in ("a", "b"))
    assert first == second
    assert b"matplotlib" not in first.lower()


def test_a_palette_keeps_the_colours_with_a_meaning(tmp_path):
    pixels = np.asarray(Image.open(style.save(_drawing(), tmp_path / "a.png", palette=True)).convert("RGB"))
    sky = [int(style.SKY[place : place + 2], 16) for place in (1, 3, 5)]
    # a square of 5 points is 7 pixels wide at 100 dots per inch, 5 or more of them inside its soft edges
    assert (pixels == sky).all(axis=-1).sum() >= 25


def test_drawing_leaves_the_users_settings_alone():
    before = dict(rcParams)
    rcParams["font.size"] = 33.0
    try:
        _drawing()
        assert rcParams["font.size"] == 33.0
    finally:
        rcParams["font.size"] = before["font.size"]


def test_a_figure_that_cannot_be_written_is_an_error_of_the_machine(tmp_path):
    with pytest.raises(MachineError, match="cannot be written"):
        style.save(_drawing(), tmp_path / "missing" / "a.png")
