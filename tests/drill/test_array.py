"""The Tropicbird Array as data, and the configuration file beside it."""

from __future__ import annotations

from collections import Counter
from pathlib import Path

import numpy as np
import pytest

from profiles.config import Config, load_config
from profiles.drill.array import CHAINS, SITES, Site
from profiles.drill.configuration import FORMS, configuration_text, delivery_path
from profiles.drill.supplements import FAST_SITE
from profiles.ingest.layout import load_layout

ROOT = Path(__file__).parents[2]

# m, depth of the isotherm on the equator in the packaged monthly atlas, as the array's design states it.
ATLAS_EQUATOR = {149.0: 180, 175.0: 180, 201.0: 155, 214.0: 125, 227.0: 110, 240.0: 72, 253.0: 52, 266.0: 38}
LAYOUTS = {
    "halcyon": "halcyon_wide",
    "marlin": "marlin_long",
    "frigate": "frigate_netcdf",
    "shearwater": "shearwater_wide",
}


@pytest.fixture(scope="module")
def config() -> Config:
    return load_config(ROOT / "config" / "tropicbird.toml")


def test_array_has_forty_moorings_on_ten_lines_13_degrees_apart() -> None:
    # 10 lines of 3, and 2 more on each of the 5 lines 162, 188, 214, 240, 266: 30 + 10.
    assert len(SITES) == 40
    assert [site.id for site in SITES] == [f"TB-{number:02d}" for number in range(1, 41)]
    assert sorted({site.longitude for site in SITES}) == [149.0 + 13.0 * line for line in range(10)]
    outer = {site.longitude for site in SITES if abs(site.latitude) == 4.5}
    assert outer == {162.0, 188.0, 214.0, 240.0, 266.0}


def test_moorings_are_numbered_from_west_to_east_and_south_to_north() -> None:
    places = [(site.longitude, site.latitude) for site in SITES]
    assert places == sorted(places)


@pytest.mark.parametrize("longitude", CHAINS)
def test_chain_reaches_from_1_to_500_m_with_14_sensors(longitude: float) -> None:
    depths = CHAINS[longitude]
    assert len(depths) == 14
    assert list(depths) == sorted(set(depths))
    assert {1, 10, 300, 500} <= set(depths)


@pytest.mark.parametrize("longitude", ATLAS_EQUATOR)
def test_sensors_stand_closest_where_the_thermocline_lives(longitude: float) -> None:
    depths = np.array(CHAINS[longitude], dtype=float)
    spacing = np.diff(depths)
    bracket = int(np.searchsorted(depths, ATLAS_EQUATOR[longitude])) - 1
    assert spacing[bracket] <= (10.0 if longitude > 230.0 else 20.0)
    below = (depths[:-1] > ATLAS_EQUATOR[longitude] + 60.0) & (depths[1:] <= 300.0)
    assert np.all((spacing[below] >= 40.0) & (spacing[below] <= 60.0))


def test_four_institutes_deliver_ten_moorings_each() -> None:
    assert Counter(site.institute for site in SITES) == dict.fromkeys(LAYOUTS, 10)


def test_configuration_lists_the_array(config: Config) -> None:
    listed = [(mooring.id, mooring.latitude, mooring.longitude) for mooring in config.moorings]
    assert listed == [(site.id, site.latitude, site.longitude) for site in SITES]


@pytest.mark.parametrize("site", SITES, ids=lambda site: site.id)
def test_configuration_names_the_delivery_and_its_layout(config: Config, site: Site) -> None:
    (mooring,) = [mooring for mooring in config.moorings if mooring.id == site.id]
    (delivery,) = mooring.deliveries
    assert config.resolve(delivery.path) == ROOT / "data_demo" / delivery_path(site)
    assert config.resolve(delivery.layout) == ROOT / "config" / "layouts" / f"{LAYOUTS[site.institute]}.toml"
    assert config.resolve(delivery.path).is_file()
    assert config.resolve(delivery.layout).is_file()


def test_layouts_beside_a_demo_say_what_the_commented_ones_say(tmp_path: Path) -> None:
    for form in FORMS.values():
        (tmp_path / form.layout).write_text(form.text, encoding="utf-8")
        assert load_layout(tmp_path / form.layout) == load_layout(ROOT / "config" / "layouts" / form.layout)


@pytest.mark.parametrize(
    ("name", "sites", "log"), [("tropicbird", SITES, "recovery_log.csv"), ("tropicbird_fast", (FAST_SITE,), "")]
)
def test_committed_configuration_is_the_one_that_the_code_writes(name: str, sites: tuple[Site, ...], log: str) -> None:
    committed = (ROOT / "config" / f"{name}.toml").read_text(encoding="utf-8")
    head = "".join(line for line in committed.splitlines(keepends=True) if line.startswith("#"))
    assert committed == configuration_text(sites, head=f"{head}\n", below="../data_demo/", log=log)
