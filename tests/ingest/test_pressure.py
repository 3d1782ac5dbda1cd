"""Sensor places delivered as pressure."""

import numpy as np
import pytest

from profiles.errors import DataError
from profiles.ingest import read_delivery

LAYOUT = """
kind = "wide"

[time]
column = "time"

[temperature]

[depth]
pattern = "P{depth}"
units = "kPa"
"""


@pytest.fixture
def delivery(tmp_path):
    """Sensors at 1000, 2000 and 5000 kPa, which are 100, 200 and 500 dbar."""
    file, layout = tmp_path / "chain.csv", tmp_path / "layout.toml"
    file.write_text("time,P1000,P2000,P5000\n2031-01-01T00:00:00Z,28.1,15.2,8.3\n", encoding="utf-8")
    layout.write_text(LAYOUT, encoding="utf-8")
    return file, layout


def test_pressures_become_depths_at_the_latitude(delivery):
    # At the equator 100, 200 and 500 dbar lie at 99.4, 198.8 and 496.7 m (computed with gsw 3.6.23).
    chain = read_delivery(*delivery, latitude=0.0)
    np.testing.assert_allclose(chain["depth"], [99.4, 198.8, 496.7], atol=0.05)


def test_pressures_without_a_latitude_are_refused(delivery):
    with pytest.raises(DataError, match="cannot be told from a pressure without the latitude"):
        read_delivery(*delivery)
