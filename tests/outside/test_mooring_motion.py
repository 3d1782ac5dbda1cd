"""The simulated moorings' motion beside what was measured at sea.

McCarty, M. E., L. J. Mangum and M. J. McPhaden, 1997: Temperature errors in TAO data induced by mooring motion, NOAA
Technical Memorandum ERL PMEL-108: taut-line tropical moorings, rms temperature error 0.15 to 0.45 °C, largest in the
upper thermocline.
"""

from __future__ import annotations

import numpy as np
import pytest

from profiles.drill.array import SITES
from profiles.drill.demo import days
from profiles.drill.motion import rise, temperature_error
from profiles.drill.ocean import Ocean
from profiles.drill.streams import stream

PUBLISHED = (0.15, 0.45)  # °C


def test_error_of_nominal_depths_is_that_of_taut_line_moorings(capsys: pytest.CaptureFixture[str]) -> None:
    time = days("2031-01-01", "2032-12-31")
    sites = [site for site in SITES if site.latitude == 0.0 and site.longitude > 155.0]
    columns = Ocean.simulate(time, 11).columns([0.0] * len(sites), [site.longitude for site in sites])
    worst, rows = [], []
    for position, site in enumerate(sites):
        risen = rise(np.arange(float(time.size)), site.depths, 0.0, site.longitude, stream(11, "motion", site.id))
        error = temperature_error(columns, position, site.depths, risen)
        deepest_third = np.asarray(site.depths) >= 250.0
        worst.append(error.max())
        rows.append(f"{site.longitude:5g}E  {error.max():.2f} °C at {site.depths[error.argmax()]:g} m")
        assert error[deepest_third].max() < error.max(), "the upper thermocline has the largest error"
    with capsys.disabled():
        print("\nrms error of nominal depths on the equator, published 0.15 to 0.45 °C:", *rows, sep="\n  ")
    assert PUBLISHED[0] < np.median(worst) < PUBLISHED[1]
    assert np.mean((np.array(worst) > 0.1) & (np.array(worst) < 0.6)) == 1.0
