"""Summer time, leap days and temperature scales against zoneinfo, datetime and gsw."""

from __future__ import annotations

from datetime import UTC, datetime, timedelta
from itertools import pairwise
from zoneinfo import ZoneInfo

import gsw
import numpy as np
import pytest

from profiles.ingest import read
from profiles.ingest.layout import LongLayout, WideLayout

STEP = timedelta(minutes=30)
# Both hemispheres, half-hour offsets, a shift of half an hour (Lord Howe), a shift at midnight, and a zone without any.
ZONES = [
    "America/New_York", "Europe/Berlin", "Pacific/Auckland", "Australia/Lord_Howe", "America/St_Johns", "Asia/Kolkata",
    "Australia/Adelaide", "America/Santiago", "America/Havana", "Pacific/Easter", "Europe/Dublin", "Africa/Casablanca",
]  # fmt: skip


def moments(year=2031):
    """Return every half hour of a year in UTC."""
    first = datetime(year, 1, 1, tzinfo=UTC)
    return [first + place * STEP for place in range(365 * 48)]


def wide(**time):
    return WideLayout.model_validate({"kind": "wide", "time": {"column": "t"} | time, "depth": {"pattern": "T{depth}"}})


def write(path, stamps, values=None):
    rows = (f"{stamp},{value}" for stamp, value in zip(stamps, values or [20.0] * len(stamps), strict=True))
    path.write_text("t,T1\n" + "\n".join(rows) + "\n")
    return path


def as_utc(chain):
    return [datetime.fromtimestamp(second, UTC) for second in (chain["time"].values.astype(np.int64) // 10**9).tolist()]


def is_twice(local):
    """Tell whether the clock showed a time twice: both readings of it are the same time of the clock."""
    both = [local.replace(fold=fold) for fold in (0, 1)]
    return both[0].utcoffset() > both[1].utcoffset()


def is_skipped(local):
    """Tell whether the clock never showed a time: going to UTC and back changes it."""
    return local.astimezone(UTC).astimezone(local.tzinfo).replace(tzinfo=None) != local.replace(tzinfo=None)


@pytest.mark.parametrize("zone", ZONES)
def test_a_year_of_local_stamps_comes_back_to_utc_by_order(tmp_path, zone):
    utc = moments()
    path = write(tmp_path / "f", [moment.astimezone(ZoneInfo(zone)).strftime("%Y-%m-%d %H:%M") for moment in utc])
    delivery = read(path, wide(zone=zone, format="%Y-%m-%d %H:%M", repeated_hour="by_order"))
    assert as_utc(delivery.chain) == utc
    assert delivery.rows_quarantined == 0


@pytest.mark.parametrize("zone", ZONES)
def test_without_an_order_just_the_times_that_the_clock_showed_twice_are_quarantined(tmp_path, zone):
    utc = moments()
    local = [moment.astimezone(ZoneInfo(zone)) for moment in utc]
    delivery = read(write(tmp_path / "f", [moment.strftime("%Y-%m-%dT%H:%M") for moment in local]), wide(zone=zone))
    once = [moment for moment, shown in zip(utc, local, strict=True) if not is_twice(shown)]
    assert as_utc(delivery.chain) == once
    shifts = sum(one.utcoffset() > other.utcoffset() for one, other in pairwise(local))
    assert delivery.rows_quarantined == len(utc) - len(once)
    assert (delivery.rows_quarantined > 0) == (shifts > 0) == (zone != "Asia/Kolkata")


@pytest.mark.parametrize("zone", ZONES)
@pytest.mark.parametrize("rule", ["quarantine", "by_order"])
def test_times_that_the_clock_skips_are_quarantined(tmp_path, zone, rule):
    # a logger that does not know of summer time, read as if it did
    clock = [(moment.replace(tzinfo=None), moment.replace(tzinfo=ZoneInfo(zone))) for moment in moments()]
    delivery = read(
        write(tmp_path / "f", [f"{stamp:%Y-%m-%dT%H:%M}" for stamp, _ in clock]), wide(zone=zone, repeated_hour=rule)
    )
    wrong = [place for place, (_, local) in enumerate(clock)
             if is_skipped(local) or (rule == "quarantine" and is_twice(local))]  # fmt: skip
    assert delivery.quarantine["line"].tolist() == [place + 2 for place in wrong]
    assert bool(wrong) == (zone != "Asia/Kolkata")


@pytest.mark.parametrize("by_sensor", [False, True])
def test_long_text_comes_back_by_the_order_of_each_sensor(tmp_path, by_sensor):
    zone = ZoneInfo("Australia/Lord_Howe")
    april = [moment for moment in moments() if moment.month == 4][:500]  # summer time ends on the 6th
    keys = [(moment, depth) for moment in april for depth in (1, 25)]
    if by_sensor:
        keys.sort(key=lambda key: (key[1], key[0]))
    rows = [f"{moment.astimezone(zone):%Y-%m-%dT%H:%M},{depth},20" for moment, depth in keys]
    path = tmp_path / "f"
    path.write_text("t,z,v\n" + "\n".join(rows) + "\n")
    layout = LongLayout.model_validate(
        {"kind": "long", "time": {"column": "t", "zone": zone.key, "repeated_hour": "by_order"},
         "depth": {"column": "z"}, "temperature": {"column": "v"}}
    )  # fmt: skip
    delivery = read(path, layout)
    assert as_utc(delivery.chain) == april
    assert delivery.rows_quarantined == 0


YEARS = [1696, 1700, 1896, 1900, 1904, 1999, 2000, 2004, 2031, 2032, 2100, 2200, 2260]


@pytest.mark.parametrize("way", ["format", "parts", "number"])
def test_days_of_the_year_are_those_of_datetime(tmp_path, way):
    days = [datetime(year, 1, 1) + timedelta(days=day - 1) for year in YEARS for day in (1, 59, 60, 61, 365, 366)]
    stamps = [(year, day) for year in YEARS for day in (1, 59, 60, 61, 365, 366)]
    # the 366th day of a common year is none; by number it is the first of the next year
    exist = [moment.year == year for moment, (year, _) in zip(days, stamps, strict=True)]
    zero = datetime(1600, 1, 1)
    text = {
        "format": lambda place: "{} {:03}".format(*stamps[place]),
        "parts": lambda place: "{} {}".format(*stamps[place]),
        "number": lambda place: str((days[place] - zero).days),
    }[way]
    time = {
        "format": {"column": "t", "format": "%Y %j"},
        "parts": {"parts": {"year": "y", "day_of_year": "d"}},
        "number": {"column": "t", "units": "days since 1600-01-01"},
    }[way]
    names = "y d T1" if way == "parts" else "t;T1"
    mark = " " if way == "parts" else ";"
    path = tmp_path / "f"
    path.write_text("\n".join([names, *(f"{text(place)}{mark}20" for place in range(len(days)))]))
    layout = WideLayout.model_validate(
        {"kind": "wide", "delimiter": mark, "time": time, "depth": {"pattern": "T{depth}"}}
    )
    delivery = read(path, layout)
    wanted = sorted({day for day, real in zip(days, exist, strict=True) if real or way == "number"})
    assert delivery.chain["time"].values.astype("M8[us]").astype(datetime).tolist() == wanted
    assert delivery.rows_quarantined == len(days) - len(wanted)


def test_calendar_days_are_those_of_datetime(tmp_path):
    stamps = [(year, month, day) for year in YEARS for month in range(1, 13) for day in (1, 28, 29, 30, 31)]
    real = []
    for stamp in stamps:
        try:
            real.append(datetime(*stamp))
        except ValueError:
            continue
    for name, time, form in (
        ("iso", {"column": "t"}, "{:04}-{:02}-{:02}"),
        ("format", {"column": "t", "format": "%d.%m.%Y"}, "{2:02}.{1:02}.{0:04}"),
        ("slow", {"column": "t", "format": "%Y-%m-%d %p"}, "{:04}-{:02}-{:02} AM"),
    ):
        path = write(tmp_path / name, [form.format(*stamp) for stamp in stamps])
        layout = WideLayout.model_validate({"kind": "wide", "time": time, "depth": {"pattern": "T{depth}"}})
        delivery = read(path, layout)
        assert delivery.chain["time"].values.astype("M8[us]").astype(datetime).tolist() == sorted(real)
        assert delivery.rows_quarantined == len(stamps) - len(real)


def test_temperatures_on_ipts_68_come_to_its_90_as_published(tmp_path):
    delivered = np.arange(-2.0, 35.0, 0.125)
    stamps = [f"2031-01-01T{place // 60:02}:{place % 60:02}" for place in range(delivered.size)]
    layout = WideLayout.model_validate(
        {"kind": "wide", "time": {"column": "t"}, "depth": {"pattern": "T{depth}"}, "temperature": {"scale": "IPTS-68"}}
    )
    chain = read(write(tmp_path / "f", stamps, delivered.tolist()), layout).chain
    found = chain["temperature"].values[:, 0].astype(float)
    # Saunders (1990), WOCE Newsletter 10: t90 = 0.99976 t68; float32 at 35 °C is good to 2e-6 °C
    np.testing.assert_allclose(found, 0.99976 * delivered, atol=2e-6)
    # gsw divides by 1.00024, which is 1.7e-6 °C more at 30 °C
    np.testing.assert_allclose(found, gsw.t90_from_t68(delivered), atol=5e-6)
    np.testing.assert_array_equal(chain["temperature_raw"].values[:, 0], delivered.astype(np.float32))
    # Preston-Thomas (1990), Metrologia 27, table 1, t90 - t68 to the mK (from memory): -2, -5, -7 mK at 10, 20, 30 °C
    at = np.isin(delivered, [10.0, 20.0, 30.0])
    np.testing.assert_allclose((found - delivered)[at], [-0.002, -0.005, -0.007], atol=6e-4)
