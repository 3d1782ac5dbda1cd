"""Depth from pressure against published values.

Sources: the check values that TEOS-10's reference library ships (three real casts with depth and pressure), and
Fofonoff and Millard (1983), UNESCO Technical Papers in Marine Science 44, p. 28: 10 000 dbar at 30 degrees north lie
at 9712.653 m (EOS-80; value from memory, so the tolerance is a thousandth).
"""

from importlib.resources import as_file, files

import gsw
import numpy as np
import pytest

from profiles.ingest.units import depth_of_pressure


@pytest.fixture(scope="module")
def casts():
    with as_file(files("gsw") / "tests" / "gsw_cv_v3_0.npz") as path, np.load(path) as content:
        return {name: content[name] for name in ("z_from_p", "p_chck_cast", "lat_chck_cast")}


def test_depths_of_the_check_casts_are_the_published_ones(casts):
    for cast, latitude in enumerate(casts["lat_chck_cast"].ravel()):
        pressure, height = casts["p_chck_cast"][:, cast], casts["z_from_p"][:, cast]
        there = np.isfinite(pressure)
        assert there.sum() >= 8
        np.testing.assert_allclose(depth_of_pressure(pressure[there], latitude), -height[there], atol=1e-6)


def test_depth_to_pressure_and_back_is_the_same(casts):
    pressure = np.array([10.0, 100.0, 300.0, 500.0, 750.0])
    back = gsw.p_from_z(-depth_of_pressure(pressure, 2.5), 2.5)
    np.testing.assert_allclose(back, pressure, rtol=1e-9)


def test_depth_agrees_with_the_older_standard():
    assert depth_of_pressure(10_000.0, 30.0) == pytest.approx(9712.653, rel=1e-3)
