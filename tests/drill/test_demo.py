"""The demo data: deliveries read back without the package, truth, and the same bytes from the same seed."""

from __future__ import annotations

import csv
import gzip
import hashlib
from collections import Counter
from datetime import datetime, timedelta
from pathlib import Path

import netCDF4
import numpy as np
import pandas as pd
import pytest
import xarray as xr

from profiles.drill.__main__ import main
from profiles.drill.array import SITES, Site
from profiles.drill.configuration import delivery_path
from profiles.drill.demo import SEED as COMMITTED_SEED
from profiles.drill.demo import days, demo_config, make_demo, simulated_chains, write_deliveries
from profiles.drill.fault_catalogue import CATALOGUE
from profiles.drill.faults import Event
from profiles.drill.ocean import Ocean
from profiles.drill.planting import FAULTS as ALL_FAULTS
from profiles.drill.planting import catalogue_of, plant_over_array
from profiles.drill.truth import site_columns
from profiles.ingest import read_delivery

ROOT = Path(__file__).parents[2]
SEED = 3
TIME = days("2031-01-01", "2031-12-31")
SMALL = tuple(site for site in SITES if site.id in ("TB-02", "TB-18", "TB-30", "TB-37", "TB-38"))
FAULTS = {"spike": 3, "stuck value": 2, "fill value": 2, "offset": 1}
WIDE, LONG, NETCDF, SHALLOW, KELVIN = SMALL


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    made = tmp_path_factory.mktemp("demo")
    make_demo(made, seed=SEED, time=TIME, sites=SMALL, faults=FAULTS)
    return made


@pytest.fixture(scope="module")
def simulated() -> dict[str, xr.Dataset]:
    ocean = Ocean.simulate(TIME, SEED)
    _, whole = site_columns(ocean, SMALL)
    chains, _ = plant_over_array(list(simulated_chains(ocean, SMALL, whole, SEED)), SMALL, FAULTS, SEED)
    return {site.id: chain for site, chain in zip(SMALL, chains, strict=True)}


def rows_of(folder: Path, site: Site, delimiter: str, header: int) -> list[list[str]]:
    """Rows below the head that the truth does not name as damaged, by csv."""
    damaged = pd.read_csv(folder / "truth" / "damaged_rows.csv")
    bad = set(damaged["line"][damaged["file"] == delivery_path(site)])
    with gzip.open(folder / delivery_path(site), "rt", encoding="utf-8") as stream:
        lines = list(csv.reader(stream, delimiter=delimiter))
    return [row for number, row in enumerate(lines, start=1) if number > header and number not in bad]


def test_same_seed_gives_the_same_bytes(tmp_path: Path) -> None:
    first, again = tmp_path / "first", tmp_path / "again"
    for folder in (first, again):
        make_demo(folder, seed=SEED, time=TIME[:90], sites=SMALL, faults={"spike": 3, "stuck value": 2})
    files = sorted(path.relative_to(first) for path in first.rglob("*") if path.is_file())
    # The truth is four files, and the configuration stands beside four layouts and the recovery log.
    assert len(files) == len(SMALL) + 4 + 6
    for name in files:
        digests = [hashlib.sha256((folder / name).read_bytes()).hexdigest() for folder in (first, again)]
        assert digests[0] == digests[1], name


def test_another_seed_gives_other_deliveries(tmp_path: Path) -> None:
    sites = SMALL[:1]
    for seed in (1, 2):
        ocean = Ocean.simulate(TIME[:90], seed)
        _, whole = site_columns(ocean, sites)
        write_deliveries(tmp_path / str(seed), sites, list(simulated_chains(ocean, sites, whole, seed)), seed)
    assert (tmp_path / "1" / delivery_path(WIDE)).read_bytes() != (tmp_path / "2" / delivery_path(WIDE)).read_bytes()


def test_wide_delivery_holds_what_was_simulated(folder: Path, simulated: dict[str, xr.Dataset]) -> None:
    values = simulated[WIDE.id]["temperature"]
    rows = rows_of(folder, WIDE, ",", header=4)
    assert len(rows) > 200
    for day, *fields in rows:
        expected = values.sel(time=np.datetime64(day) + np.timedelta64(12, "h")).values
        read = np.array([np.nan if field == "-9.999" else float(field) for field in fields])
        np.testing.assert_allclose(read, expected, rtol=0, atol=1e-9)


def test_long_delivery_holds_what_was_simulated(folder: Path, simulated: dict[str, xr.Dataset]) -> None:
    values = simulated[LONG.id]["temperature"]
    rows = rows_of(folder, LONG, ";", header=1)
    read = np.full(values.shape, np.nan)
    for station, stamp, depth, temperature in rows:
        utc = datetime.strptime(stamp, "%d.%m.%Y %H:%M") - timedelta(hours=10)
        place = (utc - datetime(2031, 1, 1)).days, list(values["depth"].values).index(float(depth))
        assert (station, utc.hour) == ("TB-18", 12)
        read[place] = np.nan if temperature == "NA" else float(temperature.replace(",", "."))
    lost = np.isnan(read) & np.isfinite(values.values)
    # Only readings whose row was damaged are lost: the truncated one and the one with a letter.
    assert lost.sum() == 2
    np.testing.assert_allclose(read[~lost], values.values[~lost], rtol=0, atol=1e-9)


def test_netcdf_delivery_holds_what_was_simulated(folder: Path, simulated: dict[str, xr.Dataset]) -> None:
    chain = simulated[NETCDF.id]
    expected = chain["temperature"].values
    with netCDF4.Dataset(folder / delivery_path(NETCDF)) as file:
        read = np.ma.filled(file["TEMP"][...].astype(float), np.nan)
        quality = file["TEMP_QC"][...].filled()
        pressure = np.ma.filled(file["PRES"][...].astype(float), np.nan)
        time = netCDF4.num2date(file["TIME"][...], file["TIME"].units)
        assert (file["LATITUDE"][0], file["LONGITUDE"][0]) == (0.0, -120.0)
        np.testing.assert_array_equal(file["DEPTH"][...], chain["depth"])
    # Half the spacing of float32 is 6e-8 of a value: 1e35 is among the planted fill values.
    np.testing.assert_allclose(read, expected, rtol=6e-8, atol=0)
    np.testing.assert_array_equal(quality == 9, np.isnan(expected))
    np.testing.assert_allclose(pressure, chain["pressure"].values, rtol=0, atol=1e-4)
    # Sensors at or nearest to 100, 300 and 500 m have pressure, the others none.
    assert list(chain["depth"].values[np.isfinite(pressure).any(axis=0)]) == [100.0, 300.0, 500.0]
    assert (time[0].isoformat(), time[-1].isoformat()) == ("2031-01-01T12:00:00", "2031-12-31T12:00:00")


def test_kelvin_delivery_holds_what_was_simulated(folder: Path, simulated: dict[str, xr.Dataset]) -> None:
    values = simulated[KELVIN.id]["temperature"]
    rows = rows_of(folder, KELVIN, "\t", header=3)
    assert len(rows) > 200
    for year, day, *fields in rows:
        noon = datetime.strptime(f"{year} {day}", "%Y %j") + timedelta(hours=12)
        read = np.array([np.nan if field == "-99.99" else float(field) - 273.15 for field in fields])
        np.testing.assert_allclose(read, values.sel(time=noon).values, rtol=0, atol=1e-9)


def test_kelvin_delivery_names_its_sensors_by_pressure(folder: Path) -> None:
    with gzip.open(folder / delivery_path(KELVIN), "rt", encoding="utf-8") as stream:
        names = stream.read().splitlines()[2].split("\t")
    # Computed with gsw: 300 dbar are 298.1 m and 500 dbar 496.7 m at the equator, so 1.0063 and 1.0066 dbar/m.
    assert names[:3] == ["year", "day", "P1.0"]
    assert names[-2:] == ["P301.9", "P503.4"]


def test_configuration_of_a_demo_finds_its_deliveries(folder: Path) -> None:
    config = demo_config(folder)
    assert [mooring.id for mooring in config.moorings] == [site.id for site in SMALL]
    for mooring in config.moorings:
        (delivery,) = mooring.deliveries
        chain = read_delivery(
            config.resolve(delivery.path),
            config.resolve(delivery.layout),
            latitude=mooring.latitude,
            longitude=mooring.longitude,
        )
        assert chain.sizes["time"] > 200
        assert float(chain["depth"][-1]) == pytest.approx(500.0, abs=0.1)


def test_packed_text_names_neither_file_nor_time(folder: Path) -> None:
    # RFC 1952, section 2.3: byte 3 holds the flags (8 is a file name), bytes 4 to 7 the time.
    head = (folder / delivery_path(WIDE)).read_bytes()[:8]
    assert head[:2] == b"\x1f\x8b"
    assert head[3] == 0
    assert head[4:8] == b"\x00\x00\x00\x00"


def test_each_text_delivery_with_damage_has_each_kind_once(folder: Path) -> None:
    damaged = pd.read_csv(folder / "truth" / "damaged_rows.csv")
    for site in (WIDE, LONG, SHALLOW, KELVIN):
        kinds = list(damaged["kind"][damaged["file"] == delivery_path(site)])
        assert sorted(kinds) == ["duplicated row", "letter in a number", "no such day", "truncated line"]


def test_damaged_rows_are_what_the_truth_calls_them(folder: Path) -> None:
    damaged = pd.read_csv(folder / "truth" / "damaged_rows.csv")
    for file, line, kind in damaged.itertuples(index=False):
        with gzip.open(folder / file, "rt", encoding="utf-8") as stream:
            lines = stream.read().splitlines()
        row, before = lines[line - 1], lines[line - 2]
        separators = {",", ";", "\t"} & set(row)
        assert {
            "duplicated row": row == before,
            "letter in a number": row[-1].isalpha() and row.count("x") == 1,
            "no such day": "-02-30" in row or "30.02." in row or "\t399\t" in row,
            "truncated line": bool(separators) and len(row) < 0.7 * len(before),
        }[kind], (file, line, kind)


def test_no_fault_looks_like_the_missing_value_of_its_delivery() -> None:
    ocean = Ocean.simulate(TIME, SEED)
    _, whole = site_columns(ocean, SMALL[:1])
    chains = list(simulated_chains(ocean, SMALL[:1], whole, SEED))
    planted, events = plant_over_array(chains, SMALL[:1], {"fill value": 12}, SEED)
    assert {event.size for event in events} <= {-99.0, 99.99, 1e35}
    assert not (planted[0]["temperature"] == -9.999).any()
    # As text in kelvin: -9.999, -99.000, 99.990 and 1e35, none of which is the missing value -99.99.
    sizes = catalogue_of("shearwater")["fill value"].sizes
    assert sizes == pytest.approx((-283.149, -372.15, -173.16, 1e35))


def test_faults_go_where_the_delivery_tells_of_them(every_fault: tuple[list[xr.Dataset], list[Event]]) -> None:
    institutes = {site.id: site.institute for site in SITES}
    for event in every_fault[1]:
        if event.variable == "pressure":
            assert institutes[event.mooring] == "frigate"
        if event.variable == "time":
            assert institutes[event.mooring] in ("marlin", "frigate")


def test_every_kind_of_fault_is_planted_several_times(every_fault: tuple[list[xr.Dataset], list[Event]]) -> None:
    counts = Counter(event.name for event in every_fault[1])
    assert set(counts) == set(CATALOGUE)
    assert min(counts.values()) >= 3
    assert counts == ALL_FAULTS


def test_most_delivered_values_are_good(every_fault: tuple[list[xr.Dataset], list[Event]]) -> None:
    chains = every_fault[0]
    delivered = sum(int(np.isfinite(chain["temperature"]).sum()) for chain in chains)
    faulty = sum(int((chain["temperature_fault"] > 0).sum()) for chain in chains if "temperature_fault" in chain)
    assert 0.005 < faulty / delivered < 0.05


def test_a_clock_fault_is_delivered_as_the_clock_had_it(tmp_path: Path) -> None:
    ocean = Ocean.simulate(TIME, SEED)
    sites = (NETCDF,)
    _, whole = site_columns(ocean, sites)
    planted, (event,) = plant_over_array(
        list(simulated_chains(ocean, sites, whole, SEED)), sites, {"clock offset": 1}, SEED
    )
    write_deliveries(tmp_path, sites, planted, SEED)
    with netCDF4.Dataset(tmp_path / delivery_path(NETCDF)) as file:
        stamps = np.asarray(file["TIME"][...])
    true = (TIME - np.datetime64("1950-01-01", "ns")) / np.timedelta64(1, "D")
    late = 24.0 * (stamps - true)
    start, end = event.start.to_datetime64(), event.end.to_datetime64()
    within = (start <= TIME) & (end >= TIME)
    np.testing.assert_allclose(late[within], event.size, rtol=0, atol=0.001)
    np.testing.assert_array_equal(late[~within], 0.0)


@pytest.fixture(scope="module")
def every_fault() -> tuple[list[xr.Dataset], list[Event]]:
    ocean = Ocean.simulate(days(), SEED)
    _, whole = site_columns(ocean, SITES)
    return plant_over_array(list(simulated_chains(ocean, SITES, whole, SEED)), SITES, ALL_FAULTS, SEED)


def test_truth_at_a_site_is_the_isotherm_between_its_sensors(folder: Path, simulated: dict[str, xr.Dataset]) -> None:
    with xr.open_dataset(folder / "truth" / "sites.nc") as truth:
        depth = truth["isotherm_depth"].sel(mooring=WIDE.id).values
    values, sensors = simulated[WIDE.id]["temperature"].values, simulated[WIDE.id]["depth"].values
    errors = []
    for day, profile in enumerate(values):
        below = int(np.searchsorted(sensors, depth[day]))
        pair = profile[below - 1 : below + 1]
        if np.isfinite(pair).all() and pair[0] > 20.0 > pair[1]:
            errors.append(np.interp(20.0, pair[::-1], sensors[below - 1 : below + 1][::-1]) - depth[day])
    # 20 m between sensors, calibration 0.02 °C at about 0.08 °C/m, nominal depths 1 m: a metre or two.
    assert len(errors) > 150
    assert np.median(np.abs(errors)) < 2.0


def test_truth_of_a_site_differs_by_its_small_scales_alone(folder: Path) -> None:
    with xr.open_dataset(folder / "truth" / "sites.nc") as truth:
        small = (truth["isotherm_depth"] - truth["isotherm_depth_large_scale"]).sel(mooring=[WIDE.id, LONG.id])
        # Waves of days are 2.5 m, of which a daily mean keeps 2 m and more; tide and continuum leave some tenths.
        assert small.std("time").values == pytest.approx(2.5, rel=0.25)


def test_truth_of_a_site_is_0_where_the_isotherm_outcrops() -> None:
    with xr.open_dataset(ROOT / "data_demo" / "truth" / "sites.nc") as truth:
        outcropped = truth["outcropped"].values == 1
        np.testing.assert_array_equal(truth["isotherm_depth"].values == 0.0, outcropped)
        east = (truth["longitude"] > 250.0).values
    # Common practice, no source: only the cold tongue in the far east gets that cold, and seldom.
    assert outcropped[east].any()
    assert not outcropped[~east].any()


def test_several_passages_are_rare_and_none_is_an_outcrop() -> None:
    with xr.open_dataset(ROOT / "data_demo" / "truth" / "sites.nc") as truth:
        passages, outcropped = truth["passages"].values, truth["outcropped"].values
    # A profile that begins warmer than 20 °C falls through it once more often than it rises through it.
    assert passages[outcropped == 0].min() == 1
    assert 0 < (passages > 1).mean() < 0.02


def test_truth_of_the_array_agrees_with_that_of_its_sites(folder: Path) -> None:
    with (
        xr.open_dataset(folder / "truth" / "sites.nc") as sites,
        xr.open_dataset(folder / "truth" / "array.nc") as array,
    ):
        site = sites["isotherm_depth_large_scale"].sel(mooring=LONG.id).resample(time="MS").mean().values
        cells = array["isotherm_depth"].sel(latitude=[-0.5, 0.5], longitude=[200.5, 201.5])
        around = cells.mean(("latitude", "longitude")).values
    # The site is the corner of the four cells; half a degree of curvature is less than a metre or two.
    np.testing.assert_allclose(site, around, rtol=0, atol=2.5)


def test_truth_of_the_array_is_an_ordinary_pacific(folder: Path) -> None:
    with xr.open_dataset(folder / "truth" / "array.nc") as array:
        # Common practice, no source: deep in the west, shallow in the east. About 23e14 m3 (from memory).
        assert array.sizes == {"time": 12, "latitude": 10, "longitude": 160, "region": 3}
        assert (array["thermocline_slope"] < -5.0).all()
        assert array["warm_water_volume"].sel(region="total").mean() == pytest.approx(23e14, rel=0.15)
        assert np.isnan(array["isotherm_depth"].sel(latitude=-4.5, longitude=142.5)).all()


def test_flat_tilt_goes_with_the_warm_phase(folder: Path) -> None:
    # Common practice, no source. The committed demo, 72 months: departures from the calendar month's mean.
    time = days()
    warmth = (
        pd.Series(Ocean.simulate(time, COMMITTED_SEED).oscillator.warmth, index=pd.DatetimeIndex(time))
        .resample("MS")
        .mean()
    )
    with xr.open_dataset(ROOT / "data_demo" / "truth" / "array.nc") as array:
        slopes = array["thermocline_slope"]
        anomaly = (slopes.groupby("time.month") - slopes.groupby("time.month").mean()).values
    assert np.corrcoef(anomaly, warmth)[0, 1] > 0.8


def test_committed_demo_is_small() -> None:
    sizes = [path.stat().st_size for path in (ROOT / "data_demo").rglob("*") if path.is_file()]
    assert sum(sizes) < 15e6
    assert max(sizes) < 2e6


@pytest.mark.parametrize("site", [SITES[0], SITES[20], SITES[39]], ids=lambda site: site.id)
def test_committed_demo_is_the_one_that_the_code_makes(site: Site) -> None:
    committed = pd.read_csv(ROOT / "data_demo" / "truth" / "faults.csv")
    with xr.open_dataset(ROOT / "data_demo" / "truth" / "sites.nc") as truth:
        ours = Ocean.simulate(days(), COMMITTED_SEED).columns([site.latitude], [site.longitude]).isotherm_depth()[0]
        stated = truth["isotherm_depth_large_scale"].sel(mooring=site.id).values
    np.testing.assert_allclose(stated, ours, rtol=0, atol=0.006)
    assert len(committed) == sum(ALL_FAULTS.values()) == 120


def test_command_refuses_a_folder_that_is_a_file(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    target = tmp_path / "file"
    target.write_text("")
    assert main([str(target)]) == 4
    assert "cannot be used as a folder" in capsys.readouterr().err
