"""The objective map: two sites by hand, missing values, noise, an unknown mean, what is refused."""

from __future__ import annotations

import numpy as np
import pytest
import xarray as xr

from profiles import objective_map
from profiles.errors import DataError, RequestError

NAN = np.nan
SCALES = {"signal_sd": 12.0, "length_longitude": 15.0, "length_latitude": 3.0}


def at_one_point(values, latitude, longitude, point=(0.0, 180.0), **settings):
    """Return the map and its error at one point, through time."""
    field = objective_map(values, latitude, longitude, [point[0]], [point[1]], **(SCALES | settings))
    return field["mean"].values[:, 0, 0], field["error"].values[:, 0, 0]


def test_two_sites_by_hand():
    # s = 2, sites at 170E and 190E on the equator, length 10: r = exp(-4) between them, c = exp(-1) with 180E between.
    # A = [[4 + 1, 4 r], [4 r, 4 + 1]]; by symmetry A^-1 (1, 1) = (1, 1) / (5 + 4 r), so both weights are
    # w = 4 c / (5 + 4 r) = 0.29005; the map is 3 w = 0.8702 and its variance 4 - 2 w 4 c = 3.1464.
    r, c = np.exp(-4.0), np.exp(-1.0)
    weight = 4 * c / (5 + 4 * r)
    mapped, error = at_one_point(
        [[1.0, 2.0]], [0, 0], [170, 190], signal_sd=2.0, noise_sd=1.0, length_longitude=10.0, length_latitude=3.0
    )
    assert mapped[0] == pytest.approx(3 * weight)
    assert mapped[0] == pytest.approx(0.8702, abs=5e-5)
    assert error[0] ** 2 == pytest.approx(4 - 8 * c * weight)
    assert error[0] ** 2 == pytest.approx(3.1464, abs=5e-5)


def test_two_sites_with_an_unknown_mean_by_hand():
    # As above with values 1 and 2: by symmetry the mean is 1.5 and its variance (5 + 4 r) / 2.
    # The weights lack 1 - 2 w of it.
    r, c = np.exp(-4.0), np.exp(-1.0)
    weight = 4 * c / (5 + 4 * r)
    mapped, error = at_one_point(
        [[1.0, 2.0]],
        [0, 0],
        [170, 190],
        signal_sd=2.0,
        noise_sd=1.0,
        length_longitude=10.0,
        length_latitude=3.0,
        mean="estimated",
    )
    assert mapped[0] == pytest.approx(3 * weight + 1.5 * (1 - 2 * weight))
    assert error[0] ** 2 == pytest.approx(4 - 8 * c * weight + (1 - 2 * weight) ** 2 * (5 + 4 * r) / 2)


def test_a_site_without_noise_is_mapped_to_its_value_without_error():
    mapped, error = at_one_point([[7.0, -3.0]], [0.0, 2.5], [180.0, 190.0], noise_sd=0.0)
    assert mapped[0] == pytest.approx(7.0)
    assert error[0] == pytest.approx(0.0, abs=1e-6)


def test_far_from_every_site_the_map_is_zero_with_the_error_of_the_signal():
    mapped, error = at_one_point([[7.0]], [0.0], [120.0], point=(0.0, 280.0), noise_sd=1.0)
    assert mapped[0] == pytest.approx(0.0, abs=1e-12)
    assert error[0] == pytest.approx(12.0)


def test_one_noisy_site_shrinks_its_value():
    # 144 / (144 + 36) = 0.8; error^2 = 144 (1 - 0.8) = 28.8.
    mapped, error = at_one_point([[10.0]], [0.0], [180.0], noise_sd=6.0)
    assert mapped[0] == pytest.approx(8.0)
    assert error[0] ** 2 == pytest.approx(28.8)


def test_a_missing_value_is_as_if_the_site_were_not_there():
    values = np.array([[5.0, NAN, -2.0], [5.0, 1.0, -2.0]])
    latitude, longitude = np.array([0.0, 2.5, -2.5]), np.array([175.0, 180.0, 188.0])
    mapped, error = at_one_point(values, latitude, longitude, noise_sd=2.0)
    alone = at_one_point(values[:1, [0, 2]], latitude[[0, 2]], longitude[[0, 2]], noise_sd=2.0)
    assert mapped[0] == pytest.approx(alone[0][0])
    assert error[0] == pytest.approx(alone[1][0])
    assert error[1] < error[0]


def test_noise_may_change_from_time_to_time():
    mapped, error = at_one_point([[10.0], [10.0], [NAN]], [0.0], [180.0], noise_sd=[[6.0], [12.0], [NAN]])
    # 144 / 180 and 144 / 288 of the value; no site in the last: 0 with the signal's standard deviation.
    np.testing.assert_allclose(mapped, [8.0, 5.0, 0.0])
    np.testing.assert_allclose(error, [np.sqrt(28.8), np.sqrt(72.0), 12.0])


def test_noise_per_site_is_shared_by_all_times():
    values = np.array([[4.0, 1.0], [2.0, -1.0]])
    shared = at_one_point(values, [0, 2], [175, 188], noise_sd=[1.0, 5.0])
    spelled = at_one_point(values, [0, 2], [175, 188], noise_sd=[[1.0, 5.0], [1.0, 5.0]])
    np.testing.assert_array_equal(shared, spelled)


def test_without_any_site_an_unknown_mean_leaves_nothing():
    mapped, error = at_one_point([[NAN, NAN]], [0, 2], [175, 188], noise_sd=1.0, mean="estimated")
    assert np.isnan(mapped).all()
    assert np.isnan(error).all()


def test_an_unknown_mean_follows_a_shift_of_all_values():
    values = np.array([[4.0, 1.0, -6.0]])
    settings = {"noise_sd": 3.0, "mean": "estimated"}
    here, error = at_one_point(values, [0, 2, -2], [165, 188, 230], **settings)
    higher, same = at_one_point(values + 50.0, [0, 2, -2], [165, 188, 230], **settings)
    np.testing.assert_allclose(higher, here + 50.0)
    np.testing.assert_allclose(same, error)
    _, known_error = at_one_point(values, [0, 2, -2], [165, 188, 230], noise_sd=3.0)
    assert error[0] > known_error[0]


def test_the_order_of_sites_does_not_matter():
    random = np.random.default_rng(3)
    values, latitude, longitude = random.normal(size=(4, 6)), random.uniform(-5, 5, 6), random.uniform(150, 260, 6)
    values[1, 2] = NAN
    order = random.permutation(6)
    straight = at_one_point(values, latitude, longitude, noise_sd=0.5)
    shuffled = at_one_point(values[:, order], latitude[order], longitude[order], noise_sd=0.5)
    np.testing.assert_allclose(shuffled, straight)


def test_sites_at_one_place_with_noise_count_as_two_readings():
    # Two readings of noise 6 are as good as their mean with noise 6 / sqrt 2.
    both = at_one_point([[8.0, 12.0]], [0, 0], [180, 180], noise_sd=6.0)
    mean = at_one_point([[10.0]], [0], [180], noise_sd=6.0 / np.sqrt(2.0))
    np.testing.assert_allclose(both, mean)


def test_sites_at_one_place_without_noise_are_refused():
    with pytest.raises(DataError, match="cannot be told apart"):
        at_one_point([[8.0, 12.0]], [0, 0], [180, 180], noise_sd=0.0)


def test_labels_and_what_an_error_needs_are_carried():
    time = np.array(["2031-01-16", "2031-02-15"], dtype="datetime64[ns]")
    values = xr.DataArray([[1.0, 2.0], [NAN, 3.0]], dims=("time", "site"), coords={"time": time})
    field = objective_map(
        values.transpose(), [0.0, 2.5], [170.0, 190.0], [-0.5, 0.5], [175.5, 176.5, 177.5], noise_sd=2.0, **SCALES
    )
    assert field["mean"].dims == ("time", "latitude", "longitude")
    assert field["mean"].shape == (2, 2, 3)
    np.testing.assert_array_equal(field["time"], time)
    np.testing.assert_array_equal(field["site_noise"], [[2.0, 2.0], [NAN, 2.0]])
    assert field["site_longitude"].values.tolist() == [170.0, 190.0]
    assert field.attrs == SCALES | {"mean_of_signal": "known"}
    assert field["error"].attrs["units"] == "m"


@pytest.mark.parametrize("scale", ["signal_sd", "length_longitude", "length_latitude"])
@pytest.mark.parametrize("value", [0.0, -1.0, NAN])
def test_a_scale_that_is_none_is_refused(scale, value):
    with pytest.raises(RequestError, match=f"{scale}: not a scale"):
        at_one_point([[1.0]], [0], [180], noise_sd=1.0, **{scale: value})


def test_a_mean_that_is_neither_known_nor_estimated_is_refused():
    with pytest.raises(RequestError, match="mean: no such choice"):
        at_one_point([[1.0]], [0], [180], noise_sd=1.0, mean="guessed")


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ({"values": [1.0, 2.0]}, "the values do not fit"),
        ({"latitude": [0.0]}, "latitude: the sites do not fit.*2 finite numbers"),
        ({"longitude": [170.0, NAN]}, "longitude: the sites do not fit.*1 missing"),
        ({"longitude": [170.0, -170.0]}, "longitude is out of range"),
        ({"point": (0.0, -90.0)}, "longitude is out of range"),
        ({"noise_sd": [1.0, 1.0, 1.0]}, "the noise does not fit"),
        ({"noise_sd": [1.0, NAN]}, "a value without its noise"),
        ({"noise_sd": [1.0, -1.0]}, "a value without its noise"),
    ],
)
def test_what_does_not_fit_is_refused(change, message):
    usual = {"values": [[1.0, 2.0]], "latitude": [0.0, 0.0], "longitude": [170.0, 190.0], "noise_sd": 1.0}
    with pytest.raises(DataError, match=message):
        at_one_point(**(usual | change))
