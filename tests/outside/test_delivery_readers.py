"""Each kind of delivery against a reader that shares nothing with ours.

Text: Python's csv module and datetime; NetCDF: netCDF4 and cftime. The example layouts of the project are used as they
stand, so that a user's copy starts from one that is checked.
"""

from __future__ import annotations

import csv
import gzip
from datetime import UTC, datetime, timedelta, timezone
from pathlib import Path

import netCDF4
import numpy as np
import pytest

from profiles.ingest import read, read_delivery

LAYOUTS = Path(__file__).parents[2] / "config" / "layouts"
DEPTHS = [1.0, 10.0, 25.0, 50.0, 120.0]
DAYS = 400


@pytest.fixture
def temperatures():
    """Temperatures in the shape of a thermocline, three decimals, one in twenty missing; (day, depth)."""
    random = np.random.default_rng(41)
    values = 29.0 - 9.0 * np.tanh(np.array(DEPTHS) / 100.0) + random.normal(0.0, 0.5, (DAYS, len(DEPTHS)))
    values = values.round(3)
    values[random.random(values.shape) < 0.05] = np.nan
    return values


def stamps(chain):
    return [datetime.fromtimestamp(int(time) / 1e9, UTC) for time in chain["time"].values.astype(np.int64)]


def test_wide_text_against_csv(tmp_path, temperatures):
    path = tmp_path / "halcyon.csv.gz"
    first = datetime(2031, 1, 1, tzinfo=UTC)
    with gzip.open(path, "wt", newline="") as file:
        file.write("# Halcyon\n# daily means\n# -9.999 is missing\n")
        writer = csv.writer(file)
        writer.writerow(["date", *(f"T_{depth:g}m" for depth in DEPTHS)])
        for day, row in enumerate(temperatures):
            cells = ["-9.999" if np.isnan(value) else f"{value:.3f}" for value in row]
            writer.writerow([(first + timedelta(days=day)).strftime("%Y-%m-%d"), *cells])

    chain = read_delivery(path, LAYOUTS / "halcyon_wide.toml")

    with gzip.open(path, "rt") as file:
        rows = list(csv.DictReader(line for line in file if not line.startswith("#")))
    noon = timedelta(hours=12)  # the centre of the day that the stamp names
    assert stamps(chain) == [datetime.fromisoformat(row["date"]).replace(tzinfo=UTC) + noon for row in rows]
    for depth in DEPTHS:
        expected = [float(row[f"T_{depth:g}m"]) for row in rows]
        expected = np.float32([np.nan if value == -9.999 else value for value in expected])
        np.testing.assert_array_equal(chain["temperature"].sel(depth=depth), expected)


def test_long_text_against_csv(tmp_path, temperatures):
    path = tmp_path / "marlin.csv.gz"
    zone = timezone(timedelta(hours=10))
    first = datetime(2031, 1, 1, 0, 10, tzinfo=zone)
    with gzip.open(path, "wt", newline="") as file:
        writer = csv.writer(file, delimiter=";")
        writer.writerow(["station", "time_local", "depth_m", "temp_c"])
        for step, row in enumerate(temperatures):
            local = (first + timedelta(minutes=10 * step)).strftime("%d.%m.%Y %H:%M")
            for depth, value in zip(DEPTHS, row, strict=True):
                cell = "NA" if np.isnan(value) else f"{value:.3f}".replace(".", ",")
                writer.writerow(["TB-12", local, f"{depth:g}", cell])

    delivery = read(path, LAYOUTS / "marlin_long.toml")

    assert delivery.rows_read == delivery.rows_kept == DAYS * len(DEPTHS)
    assert delivery.chain["mooring"].item() == "TB-12"
    expected = {}
    with gzip.open(path, "rt") as file:
        for row in csv.DictReader(file, delimiter=";"):
            local = datetime.strptime(row["time_local"], "%d.%m.%Y %H:%M").replace(tzinfo=zone)
            value = np.nan if row["temp_c"] == "NA" else float(row["temp_c"].replace(",", "."))
            expected[local.astimezone(UTC), float(row["depth_m"])] = np.float32(value)
    times = stamps(delivery.chain)
    assert times == sorted({time for time, _ in expected})
    table = [[expected[time, depth] for depth in DEPTHS] for time in times]
    np.testing.assert_array_equal(delivery.chain["temperature"], table)


def test_oceansites_netcdf_against_netcdf4(tmp_path, temperatures):
    path = tmp_path / "OS_TB-20_203101_D_TEMP.nc"
    with netCDF4.Dataset(path, "w") as file:
        file.setncatts({"site_code": "TB-20", "platform_code": "TB-20", "data_mode": "D"})
        for name, size in (("TIME", None), ("DEPTH", len(DEPTHS)), ("LATITUDE", 1), ("LONGITUDE", 1)):
            file.createDimension(name, size)
            kind = "f8" if name == "TIME" else "f4"
            file.createVariable(name, kind, (name,)).standard_name = name.lower()
        file["TIME"].units = "days since 1950-01-01T00:00:00Z"
        file["DEPTH"].setncatts({"units": "meters", "positive": "down"})
        file.createVariable("TEMP", "f4", ("TIME", "DEPTH"), fill_value=99999.0).setncatts(
            {"standard_name": "sea_water_temperature", "units": "degree_Celsius", "reference_scale": "ITS-90"}
        )
        file.createVariable("TEMP_QC", "i1", ("TIME", "DEPTH"), fill_value=-128)
        file["TIME"][:] = 29585.5 + np.arange(DAYS)
        file["DEPTH"][:] = DEPTHS
        file["LATITUDE"][:], file["LONGITUDE"][:] = -2.5, -125.0
        file["TEMP"][:] = np.ma.masked_invalid(temperatures)
        file["TEMP_QC"][:] = np.where(np.isnan(temperatures), 9, np.arange(DAYS)[:, None] % 5)

    chain = read_delivery(path, LAYOUTS / "frigate_netcdf.toml")

    with netCDF4.Dataset(path) as file:
        times = netCDF4.num2date(file["TIME"][:], file["TIME"].units, only_use_cftime_datetimes=False)
        temperature, flags = file["TEMP"][:].filled(np.nan), np.asarray(file["TEMP_QC"][:])
        position = (float(file["LATITUDE"][0]), float(file["LONGITUDE"][0]) + 360.0)
    assert [time.replace(tzinfo=None) for time in stamps(chain)] == list(times)
    np.testing.assert_array_equal(chain["temperature"], temperature)
    np.testing.assert_array_equal(chain["depth"], np.float32(DEPTHS))
    assert (chain["latitude"].item(), chain["longitude"].item(), chain["mooring"].item()) == (*position, "TB-20")
    # OceanSITES Data Format Reference Manual 1.4 (2020), reference table 2: 0 unknown, 1 and 2 good, 3 correctable
    # bad, 4 bad, 9 missing; in the scheme of IOC Manuals and Guides 54: 2, 1, 1, 3, 4, 9
    ours = {0: 2, 1: 1, 2: 1, 3: 3, 4: 4, 9: 9}
    np.testing.assert_array_equal(chain["temperature_delivered_qc"], np.vectorize(ours.get)(flags))
