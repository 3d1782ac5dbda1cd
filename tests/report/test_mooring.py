"""One mooring's figure: what is averaged, filled and marked."""

import numpy as np
import pytest

from profiles.config import ColumnSettings
from profiles.report import mooring_figure, write_mooring_figure
from profiles.report.mooring import MOST_COLUMNS, binned_mean, commonest, fill_depths, time_bins
from profiles.vocabulary import Flag, IsothermStatus

START = np.datetime64("2031-01-01", "ns")
DAY = np.timedelta64(1, "D")


def test_bins_are_whole_steps_and_no_more_than_allowed():
    # 10 days in at most 4 bins: 3 steps each, bins of 3, 3, 3 and 1 day
    bins = time_bins(START + np.arange(10) * DAY, 4)
    assert bins.index.tolist() == [0, 0, 0, 1, 1, 1, 2, 2, 2, 3]
    assert bins.edges[0] == START - np.timedelta64(12, "h")
    assert (np.diff(bins.edges) == 3 * DAY).all()


def test_a_gap_leaves_its_bins_empty():
    bins = time_bins(START + np.array([0, 1, 2, 6, 7]) * DAY, 100)
    assert bins.count == 8
    means = binned_mean(np.array([1.0, 2.0, 3.0, 4.0, 5.0]), bins)
    np.testing.assert_array_equal(means, [1.0, 2.0, 3.0, np.nan, np.nan, np.nan, 4.0, 5.0])


def test_a_single_time_has_one_bin():
    assert time_bins(np.array([START]), 100).count == 1


def test_binned_mean_is_that_of_the_finite_values():
    bins = time_bins(START + np.arange(4) * DAY, 2)
    values = np.array([[1.0, np.nan], [np.nan, np.nan], [2.0, 5.0], [4.0, 7.0]])
    # (1), none; (2 + 4) / 2, (5 + 7) / 2
    np.testing.assert_array_equal(binned_mean(values, bins), [[1.0, np.nan], [3.0, 6.0]])


def test_the_commonest_status_stands_for_a_bin():
    bins = time_bins(START + np.array([0, 1, 2, 6, 7, 8]) * DAY, 3)
    assert commonest(np.array([1, 5, 5, 2, 2, 1]), bins).tolist() == [5, 0, 2]


def test_temperature_is_linear_between_sensors_with_values():
    values, depth = np.array([[20.0, 10.0, np.nan]]), np.array([[0.0, 100.0, 200.0]])
    levels = np.array([25.0, 75.0, 100.0, 149.0, 151.0, 250.0])
    # 20 - 0.1 z; at 100 m 10; the upper half of the way to the missing sensor holds 10, the lower half nothing
    expected = [17.5, 12.5, 10.0, 10.0, np.nan, np.nan]
    np.testing.assert_allclose(fill_depths(values, depth, levels)[:, 0], expected)


@pytest.mark.parametrize(("shallowest", "given"), [(1.0, True), (20.0, False)])
def test_the_first_sensor_stands_for_the_surface_if_shallow(shallowest, given):
    filled = fill_depths(np.array([[20.0, 10.0]]), np.array([[shallowest, 100.0]]), np.array([0.5]))
    assert np.isfinite(filled[0, 0]) == given


def test_sensors_that_moved_are_drawn_where_they_were():
    values, depth = np.array([[20.0, 10.0], [20.0, 10.0]]), np.array([[0.0, 100.0], [0.0, 50.0]])
    # at 25 m: a quarter of the way down, then half of it
    np.testing.assert_allclose(fill_depths(values, depth, np.array([25.0]))[0], [17.5, 15.0])


def test_a_single_sensor_is_drawn():
    filled = fill_depths(np.array([[20.0]]), np.array([[1.0]]), np.array([0.5, 1.5]))
    np.testing.assert_array_equal(filled[:, 0], [20.0, np.nan])


def test_the_figure_names_units_and_turns_depth_downward(small_array):
    figure = mooring_figure(small_array.chains["TB-01"], small_array.columns["TB-01"])
    panel, strip, scale = figure.axes
    assert panel.yaxis_inverted()
    assert panel.get_ylabel().startswith("depth (m)")
    assert strip.get_xlabel() == "time (UTC)"
    assert scale.get_ylabel() == "temperature (°C)"
    assert panel.get_title(loc="left") == "TB-01, 0° 165°E, 2031-01-01 to 2031-03-31"


def _labels(figure):
    return [text.get_text() for legend in figure.legends for text in legend.get_texts()]


def test_flags_are_told_apart_by_shape_and_only_named_where_there_are_any(small_array, single_month):
    chain = small_array.chains["TB-01"].copy(deep=True)
    chain["temperature_qc"][30, 1] = int(Flag.QUESTIONABLE)
    lines = mooring_figure(chain, small_array.columns["TB-01"]).axes[0].lines
    looks = {line.get_label(): (line.get_marker(), line.get_color()) for line in lines}
    questionable, bad = looks["questionable value"], looks["bad value"]
    assert questionable[0] != bad[0]
    assert questionable[1] != bad[1]
    clean = mooring_figure(single_month.chains["TB-01"], single_month.columns["TB-01"])
    assert "bad value" not in _labels(clean)
    assert "questionable value" not in _labels(clean)


def test_flagged_values_have_no_colour(small_array):
    chain, columns = small_array.chains["TB-01"], small_array.columns["TB-01"]
    # the only value of 45 °C is bad: the colours end far below it
    mesh = mooring_figure(chain, columns).axes[0].collections[0]
    assert float(chain["temperature"].max()) == 45.0
    assert mesh.get_array().max() < 30.0


def test_an_isotherm_status_is_named_and_outcrops_are_marked(small_array):
    columns = small_array.columns["TB-01"].copy(deep=True)
    columns["isotherm_status"][10:20] = int(IsothermStatus.OUTCROPPED)
    columns["isotherm_depth"][10:20] = 0.0
    labels = _labels(mooring_figure(small_array.chains["TB-01"], columns))
    assert "outcropped" in labels
    assert "isotherm outcropped" in labels


def test_the_isotherm_breaks_where_there_is_none(small_array):
    columns = small_array.columns["TB-01"].copy(deep=True)
    columns["isotherm_depth"][40:50] = np.nan
    figure = mooring_figure(small_array.chains["TB-01"], columns)
    line = next(line for line in figure.axes[0].lines if line.get_label() == "20 °C isotherm")
    assert np.isnan(line.get_ydata()[40:50]).all()
    assert np.isfinite(line.get_ydata()[[39, 50]]).all()


def test_the_isotherm_is_called_by_its_temperature(small_array):
    figure = mooring_figure(small_array.chains["TB-01"], small_array.columns["TB-01"], ColumnSettings(isotherm=18.5))
    assert "18.5 °C isotherm" in _labels(figure)


def test_a_mooring_without_a_value_says_so(small_array):
    figure = mooring_figure(small_array.chains["TB-03"], small_array.columns["TB-03"])
    assert "no value could be used" in [text.get_text() for text in figure.axes[0].texts]
    assert "too few sensors" in _labels(figure)
    assert len(figure.axes) == 2


def test_sensors_that_moved_and_a_chain_without_position_are_drawn(small_array, tmp_path):
    chain = small_array.chains["TB-01"].drop_vars(["latitude", "longitude", "mooring"])
    place = np.broadcast_to(chain["depth"].values * 0.9, chain["temperature"].shape).copy()
    place[5, 3] = np.nan
    chain["sensor_depth"] = (("time", "depth"), place)
    assert write_mooring_figure(tmp_path / "a.png", chain, small_array.columns["TB-01"]).stat().st_size > 10_000


def test_a_long_record_is_thinned(small_array):
    chain, columns = (part["TB-01"] for part in (small_array.chains, small_array.columns))
    many = np.arange(12_000)
    times = START + many * np.timedelta64(10, "m")
    figure = mooring_figure(
        chain.isel(time=many % 90).assign_coords(time=times), columns.isel(time=many % 90).assign_coords(time=times)
    )
    assert figure.axes[0].collections[0].get_array().shape[1] <= MOST_COLUMNS


def test_the_same_mooring_gives_the_same_bytes(small_array, tmp_path):
    chain, columns = small_array.chains["TB-01"], small_array.columns["TB-01"]
    first, second = (write_mooring_figure(tmp_path / name, chain, columns).read_bytes() for name in ("a", "b"))
    assert first == second
