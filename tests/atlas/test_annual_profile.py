"""Annual-mean profiles at positions."""

from __future__ import annotations

import numpy as np
import pytest

from profiles.atlas import annual_mean, annual_profile
from profiles.errors import DataError


def test_annual_profile_gives_the_atlas_back_at_its_own_points() -> None:
    field = annual_mean()["temperature"].sel(latitude=0.5)
    ours = annual_profile([0.5, 0.5], [165.5, 250.5])
    np.testing.assert_allclose(ours, field.sel(longitude=[165.5, 250.5]).transpose(), rtol=0, atol=1e-5)
    assert ours.dims == ("position", "depth")


def test_annual_profile_takes_the_mean_of_the_four_points_around_a_corner() -> None:
    # 0N 200E is the corner of four 1-degree points: equal weights.
    around = annual_mean()["temperature"].sel(latitude=[-0.5, 0.5], longitude=[199.5, 200.5])
    np.testing.assert_allclose(annual_profile(0.0, 200.0)[0], around.mean(("latitude", "longitude")), rtol=0, atol=1e-5)


def test_annual_profile_holds_water_on_land() -> None:
    # 3S 142E lies in New Guinea: the nearest wet point stands in at every depth.
    assert np.isfinite(annual_profile(-3.0, 142.0)).all()


def test_annual_profile_refuses_a_position_beyond_the_atlas() -> None:
    with pytest.raises(DataError, match="outside the packaged atlas"):
        annual_profile(0.0, 10.0)
