"""The figures of the array: axes, units, what is drawn at the ends of the range of inputs."""

import numpy as np
import pytest
from matplotlib.collections import PolyCollection

from profiles.report import write_array_figures
from profiles.report.array import (
    WEAK_SHARE,
    equatorial_section,
    return_by_depth,
    site_map,
    tilt_and_anomaly,
    time_longitude,
    time_longitude_anomaly,
    volume_and_anomaly,
)
from profiles.report.style import HALF_WIDTH_95

NAMES = ["map", "volume", "tilt", "section", "time_longitude", "time_longitude_anomaly", "data_return"]


def _write(array, folder):
    return write_array_figures(
        folder,
        monthly=array.monthly,
        data_return=array.tables["data_return"],
        section=array.section.section,
        volume=array.section.volume,
    )


@pytest.mark.parametrize("which", ["small_array", "single_month"])
def test_every_figure_is_drawn(which, request, tmp_path):
    files = _write(request.getfixturevalue(which), tmp_path)
    assert list(files) == NAMES
    assert all(file.read_bytes().startswith(b"\x89PNG") for file in files.values())


def test_the_same_array_gives_the_same_bytes(single_month, tmp_path):
    for name in ("a", "b"):
        (tmp_path / name).mkdir()
    first, second = (_write(single_month, tmp_path / name) for name in ("a", "b"))
    assert all(first[name].read_bytes() == second[name].read_bytes() for name in NAMES)


def test_the_map_gives_the_share_of_each_mooring(small_array):
    axis = site_map(small_array.monthly, small_array.tables["data_return"]).axes[0]
    numbers = [text.get_text() for text in axis.texts]
    # TB-03 never gave a value
    assert "0" in numbers
    assert axis.get_ylabel() == "latitude"
    assert axis.get_xlabel() == "longitude"


def test_a_mooring_without_a_chain_gets_a_mark_of_its_own_and_no_share(small_array):
    table = small_array.tables["data_return"].query("mooring != 'TB-01'")
    axis = site_map(small_array.monthly, table).axes[0]
    # TB-03 never gave a value; TB-01 stands for one that only a series has
    assert [text.get_text() for text in axis.texts].count("0") == 1
    (legend,) = axis.get_legend().get_texts()
    assert legend.get_text() == "series from elsewhere, no data return known"
    assert site_map(small_array.monthly, small_array.tables["data_return"]).axes[0].get_legend() is None


def test_an_array_without_a_chain_has_no_return_to_draw(small_array):
    empty = small_array.tables["data_return"].iloc[:0]
    assert [text.get_text() for text in return_by_depth(empty).axes[0].texts] == ["no mooring has a chain"]


def test_the_section_is_drawn_downward_with_the_window_of_the_tilt(small_array):
    axis = equatorial_section(small_array.section.section, small_array.monthly).axes[0]
    assert axis.yaxis_inverted()
    assert axis.get_ylabel() == "depth of the 20 °C isotherm (m)"
    assert "tilt: line from 165°E to 95°W" in [text.get_text() for text in axis.texts]


def test_the_section_shows_the_moorings_of_the_equator_alone(small_array):
    axis = equatorial_section(small_array.section.section, small_array.monthly).axes[0]
    points = next(line for line in axis.lines if str(line.get_label()).startswith("moorings"))
    assert points.get_xdata().tolist() == [165.0, 200.0]


def test_a_long_record_has_its_last_year_apart(small_array):
    section, monthly = (
        part.isel(time=np.arange(18) % 3) for part in (small_array.section.section, small_array.monthly)
    )
    labels = equatorial_section(section, monthly).axes[0].get_legend_handles_labels()[1]
    assert "last 12 months" in labels
    assert "whole record, 18 months" in labels


def test_time_against_longitude_has_units_and_depth_downward(small_array):
    axis, scale = time_longitude(small_array.section.section).axes
    assert axis.get_ylabel() == "time (UTC)"
    assert scale.get_ylabel() == "depth of the 20 °C isotherm (m)"
    assert scale.yaxis_inverted()


def test_the_anomaly_is_hatched_where_its_error_is_large(small_array):
    section = small_array.section.section.copy(deep=True)
    error = section["equatorial_isotherm_depth_anomaly_error"]
    error[:] = 0.0
    error[0, 10:20] = WEAK_SHARE * section.attrs["signal_sd"] + 0.1
    error[2, 30:31] = WEAK_SHARE * section.attrs["signal_sd"] + 0.1
    axis = time_longitude_anomaly(section).axes[0]
    hatched = next(part for part in axis.collections if isinstance(part, PolyCollection))
    # cells are 1 degree wide and begin at 120°E
    runs = [(path.vertices[:, 0].min(), path.vertices[:, 0].max()) for path in hatched.get_paths()]
    assert runs == [(130.0, 140.0), (150.0, 151.0)]


def test_the_anomaly_has_its_zero_in_the_middle_of_the_colours(small_array):
    low, high = time_longitude_anomaly(small_array.section.section).axes[0].collections[0].get_clim()
    assert low == -high


def test_tilt_and_volume_carry_their_units(small_array):
    above, below = tilt_and_anomaly(small_array.section.section).axes
    assert "m per 1000 km" in above.get_ylabel()
    assert "m per 1000 km" in below.get_ylabel()
    assert "165°E to 95°W" in above.get_title(loc="left")
    above, below = volume_and_anomaly(small_array.section.volume).axes
    assert "10$^{14}$ m$^{3}$" in above.get_ylabel()
    assert "10$^{14}$ m$^{3}$" in below.get_ylabel()


def test_the_band_is_the_95_percent_interval(small_array):
    section = small_array.section.section
    band = tilt_and_anomaly(section).axes[0].collections[0].get_paths()[0].vertices[:, 1]
    low = (section["thermocline_slope"] - HALF_WIDTH_95 * section["thermocline_slope_error"]).values
    high = (section["thermocline_slope"] + HALF_WIDTH_95 * section["thermocline_slope_error"]).values
    assert band.min() == pytest.approx(low.min())
    assert band.max() == pytest.approx(high.max())


def test_volume_is_drawn_in_1e14_cubic_metres(small_array):
    volume = small_array.section.volume
    line = next(line for line in volume_and_anomaly(volume).axes[0].lines if line.get_label() == "whole")
    expected = volume["warm_water_volume"].sel(region="total").values / 1e14
    np.testing.assert_allclose(line.get_ydata(), expected)


def test_data_return_has_a_bar_for_each_sensor(small_array):
    table = small_array.tables["data_return"]
    axis = return_by_depth(table).axes[0]
    assert len(axis.patches) == len(table)
    assert axis.yaxis_inverted()
    assert axis.get_ylabel().startswith("depth (m)")
    assert [label.get_text() for label in axis.get_xticklabels()] == ["TB-01", "TB-02", "TB-03"]
