"""Invented files of many layouts, each with its truth: the draft reads every value where and when it was."""

from __future__ import annotations

import gzip
import io
import zipfile
from collections.abc import Callable
from dataclasses import dataclass, field
from datetime import datetime, timedelta

import numpy as np
import pytest

from profiles.ingest import load_layout, read
from profiles.ingest.drafting import draft

START = datetime(2031, 3, 27, 21, 0)


@dataclass
class Case:
    """A file and its truth: times in UTC, depths (m), values (°C), (time, depth), NaN missing.

    ``unsure`` are words that must be among what the draft is unsure of, ``certain`` are ones that must not.
    """

    content: bytes
    times: list[datetime]
    depths: list[float]
    values: np.ndarray
    kind: str
    name: str = "unknown.txt"
    unsure: tuple[str, ...] = ()
    certain: tuple[str, ...] = ()
    given: tuple[float, ...] = ()
    quarantined: int = 0
    expected: dict = field(default_factory=dict)  # keys of [time] and [temperature] that must be so


CASES: dict[str, Callable[[], Case]] = {}


def case(make):
    CASES[make.__name__] = make
    return make


def ocean(times, depths, digits=2, seed=1):
    """Return temperatures that fall with depth and wander in time, rounded as they are written."""
    random = np.random.default_rng(seed)
    hours = np.array([(each - times[0]).total_seconds() / 3600.0 for each in times])
    surface = 27.0 + np.sin(hours / 17.0)[:, None]
    values = surface - 16.0 * np.tanh(np.array(depths) / 90.0) + 0.3 * random.standard_normal((len(times), len(depths)))
    return np.round(values, digits)


def stamps(count, minutes=60, start=START):
    return [start + timedelta(minutes=minutes * step) for step in range(count)]


def with_gaps(values, token_at=((2, 0), (5, 1), (5, 2), (-1, 0))):
    values = values.copy()
    for row, column in token_at:
        values[row, column % values.shape[1]] = np.nan
    return values


def cells(row, digits=2, missing="NaN", comma=False):
    texts = [missing if np.isnan(value) else f"{value:.{digits}f}" for value in row]
    return [text.replace(".", ",") for text in texts] if comma else texts


def lines(*parts, end="\n"):
    flat = [line for part in parts for line in ([part] if isinstance(part, str) else part)]
    return end.join(flat) + end


# --------------------------------------------------------------------------------------------------------------
# Wide: depth in the column name, in many spellings


LAKE = [0.5, 1.0, 2.5, 5.0, 10.0, 12.5]


def lake(header, time_text, *, missing="NA", separator="\t", count=60, minutes=30, **options):
    times = stamps(count, minutes)
    values = with_gaps(ocean(times, LAKE))
    rows = [
        separator.join([time_text(time), *cells(row, missing=missing)]) for time, row in zip(times, values, strict=True)
    ]
    return Case(lines(separator.join(header), rows).encode(), times, LAKE, values, "wide", **options)


@case
def lake_chain_padded_names():
    return lake(["dateTime", *(f"temp_{depth:04.1f}" for depth in LAKE)], lambda time: f"{time:%Y-%m-%d %H:%M:%S}")


@case
def lake_chain_dotted_names():
    return lake(
        ["datetime", *(f"wt_{depth}" for depth in LAKE)], lambda time: f"{time:%Y-%m-%d %H:%M}", unsure=("time zone",)
    )


@case
def lake_chain_names_with_blanks_and_units():
    names = [f"Temp {depth:g}m (°C)" for depth in LAKE]
    return lake(
        ["Time [UTC]", *names], lambda time: f"{time:%d/%m/%Y %H:%M}", certain=("time zone", "units"), name="lake.tsv"
    )


@case
def chain_with_at_sign_and_semicolons():
    return lake(
        ["Date/Time", *(f"T@{depth:g}m" for depth in LAKE)],
        lambda time: f"{time:%Y/%m/%d %H:%M:%S}",
        separator=";",
        missing="-9.99",
    )


@case
def depth_before_the_word():
    return lake(
        ["time", *(f"{depth:g} m water temperature" for depth in LAKE)],
        lambda time: f"{time:%Y%m%d%H%M}",
        missing="---",
    )


@case
def negative_depths_as_names():
    return lake(
        ["zeit", *(f"{-depth:g}" for depth in LAKE)],
        lambda time: f"{time:%d.%m.%Y %H:%M}",
        missing="1E35",
        unsure=("sign of depth",),
    )


@case
def decimal_mark_as_underscore():
    names = [f"t_{int(depth)}_{round(depth * 10) % 10}m" for depth in LAKE]
    return lake(
        ["datetime", *names], lambda time: f"{time:%Y-%m-%dT%H:%M:%SZ}", unsure=("depths",), certain=("time zone",)
    )


@case
def other_variables_beside():
    times = stamps(80, 10)
    depths = [1.0, 5.0, 10.0, 20.0]
    values = with_gaps(ocean(times, depths))
    salt, oxygen = 34.0 + 0.1 * ocean(times, depths), 6.0 + 0.1 * ocean(times, depths)
    names = [
        "Record",
        "Timestamp",
        "Battery_V",
        *(f"{word}_{depth:g}m" for depth in depths for word in ("Sal", "Temp", "DO")),
    ]
    rows = []
    for place, time in enumerate(times):
        row = [str(1001 + place), f"{time:%Y-%m-%d %H:%M:%S}", f"{12.6 - place / 100:.2f}"]
        for column in range(len(depths)):
            row += [
                f"{salt[place, column]:.3f}",
                *cells([values[place, column]], missing="-999"),
                f"{oxygen[place, column]:.2f}",
            ]
        rows.append(",".join(row))
    return Case(lines(",".join(names), rows).encode(), times, depths, values, "wide", unsure=("not used",))


@case
def serial_numbers_beside_the_depths():
    """Names that differ in a serial number too: no one pattern fits them."""
    times = stamps(60, 30)
    depths = [0.5, 2.0, 12.0]
    values = with_gaps(ocean(times, depths))
    names = ",".join(f'"Water temp, °C (unit S/N {7301 + 4 * place}; {d:g}m)"' for place, d in enumerate(depths))
    rows = [f"{place},{time:%Y-%m-%d %H:%M:%S}," + ",".join(cells(values[place])) for place, time in enumerate(times)]
    return Case(lines(f'"#","When, GMT",{names}', rows).encode(), times, depths, values, "wide", unsure=("not used",))


@case
def european_spreadsheet():
    """Byte order mark, semicolons, decimal comma, returns, a degree sign, day first."""
    times = stamps(50, 60)
    depths = [2.0, 7.5, 15.0]
    values = with_gaps(ocean(times, depths))
    header = "Datum;Uhrzeit;" + ";".join(f"Temperatur {depth:g} m [°C]".replace(".", ",") for depth in depths)
    rows = [
        f"{time:%d.%m.%Y};{time:%H:%M};" + ";".join(cells(row, missing="", comma=True))
        for time, row in zip(times, values, strict=True)
    ]
    return Case(
        b"\xef\xbb\xbf" + lines("Messkette Nord;;;;", header, rows, end="\r\n").encode(), times, depths, values, "wide"
    )


@case
def latin_letters_and_a_zip():
    times = stamps(40, 60)
    depths = [1.0, 3.0, 9.0]
    values = ocean(times, depths)
    header = "Fecha y hora (UTC-5)," + ",".join(f"Temperatura a {depth:g} m (°C)" for depth in depths)
    local = [time - timedelta(hours=5) for time in times]
    rows = [f"{time:%Y-%m-%d %H:%M}," + ",".join(cells(row)) for time, row in zip(local, values, strict=True)]
    packed = io.BytesIO()
    with zipfile.ZipFile(packed, "w") as archive:
        archive.writestr("leeme.txt", "perfil año 2031\n")
        archive.writestr("datos.csv", lines("Estación flotante n.º 3", header, rows).encode("latin-1"))
    return Case(
        packed.getvalue(),
        times,
        depths,
        values,
        "wide",
        name="datos.zip",
        unsure=("encoding", "member"),
        certain=("time zone",),
        expected={"zone": "-05:00"},
    )


@case
def sixteen_bits_and_gzip():
    times = stamps(40, 15)
    depths = [1.0, 4.0, 8.0]
    values = with_gaps(ocean(times, depths))
    rows = [
        f"{time:%m/%d/%Y %I:%M:%S %p}\t" + "\t".join(cells(row, missing=""))
        for time, row in zip(times, values, strict=True)
    ]
    text = lines("Time\t" + "\t".join(f"Water Temp {depth:.1f} ft" for depth in depths), rows, end="\r\n")
    metres = [depth * 0.3048 for depth in depths]
    return Case(gzip.compress(text.encode("utf-16")), times, metres, values, "wide", name="log.txt.gz")


# --------------------------------------------------------------------------------------------------------------
# Logger files: several header rows, quoted units


@case
def logger_with_four_header_rows():
    times = stamps(60, 10)
    depths = [0.5, 3.0, 9.0, 20.0]
    values = with_gaps(ocean(times, depths, 3))
    quoted = [
        ["STATION", "North raft", "box 7", "third season"],
        ["WHEN", "ROW", "Supply_lowest", *(f"Water_{depth:g}m" for depth in depths), "Air"],
        ["local", "no", "Volt", *("Deg C" for _ in depths), "Deg C"],
        ["", "", "lowest", *("mean" for _ in depths), "mean"],
    ]
    header = [",".join(f'"{cell}"' for cell in row) for row in quoted]
    rows = [
        f'"{time:%Y-%m-%d %H:%M:%S}",{place},12.7,' + ",".join(cells(row, 3, '"NAN"')) + ",21.5"
        for place, (time, row) in enumerate(zip(times, values, strict=True))
    ]
    return Case(
        lines(header, rows, end="\r\n").encode(),
        times,
        depths,
        values,
        "wide",
        unsure=("stamp of the means", "not used"),
        certain=("units",),
        expected={"mean_hours": round(1 / 6, 6)},
    )


@case
def logger_with_depths_in_their_own_row():
    times = stamps(60, 10)
    depths = [1.0, 2.0, 4.0, 8.0]
    values = ocean(times, depths)
    header = [
        "Station;Bay 4;;;;",
        "Time;T1;T2;T3;T4;Volt",
        "UTC;degC;degC;degC;degC;V",
        "depth;1.0;2.0;4.0;8.0;",
    ]
    rows = [f"{time:%Y-%m-%d %H:%M};" + ";".join(cells(row)) + ";3.6" for time, row in zip(times, values, strict=True)]
    return Case(
        lines(header, rows).encode(), times, depths, values, "wide", certain=("time zone", "units of temperature")
    )


@case
def names_repeat_and_depths_have_a_unit():
    times = stamps(60, 10)
    depths = [1.0, 2.5, 4.0]
    values = ocean(times, depths)
    header = ["Date,Time,Temp,Temp,Temp", ",,1 m,2.5 m,4 m"]
    rows = [f"{time:%Y-%m-%d},{time:%H:%M:%S}," + ",".join(cells(row)) for time, row in zip(times, values, strict=True)]
    return Case(lines(header, rows).encode(), times, depths, values, "wide")


@case
def sensors_by_number_with_a_list_in_the_comments():
    times = stamps(60, 10)
    depths = [1.0, 5.0, 10.0, 25.0, 60.0]
    values = with_gaps(ocean(times, depths))
    header = [
        "% thermistor string, instantaneous values",
        "% sensor depths (m): 1, 5, 10, 25, 60",
        "time T1 T2 T3 T4 T5",
    ]
    rows = [
        f"{time:%Y-%m-%dT%H:%M:%S} " + " ".join(cells(row, missing="-99.99"))
        for time, row in zip(times, values, strict=True)
    ]
    return Case(
        lines(header, rows).encode(),
        times,
        depths,
        values,
        "wide",
        unsure=("depths",),
        certain=("mean or instantaneous",),
        expected={"mean_hours": 0},
    )


@case
def sensors_by_serial_number_with_a_table_of_depths():
    times = stamps(60, 10)
    depths = {"S40211": 3.0, "S39957": 12.0, "S40377": 30.0}
    values = ocean(times, list(depths.values()))
    header = [
        "# calibrated on ITS-90, stamps in GMT",
        *(f"# {name}: depth {depth:g} m" for name, depth in depths.items()),
    ]
    header.append(",".join(["stamp", *depths]))
    rows = [f"{time:%d-%b-%Y %H:%M:%S}," + ",".join(cells(row)) for time, row in zip(times, values, strict=True)]
    return Case(
        lines(header, rows).encode(), times, list(depths.values()), values, "wide", certain=("temperature scale",)
    )


@case
def sensors_by_number_with_depths_given():
    times = stamps(60, 10)
    depths = [2.0, 4.0, 8.0]
    values = ocean(times, depths)
    rows = [f"{time:%Y-%m-%d %H:%M}," + ",".join(cells(row)) for time, row in zip(times, values, strict=True)]
    return Case(lines("time,T101,T102,T103", rows).encode(), times, depths, values, "wide", given=(2.0, 4.0, 8.0))


@case
def sensor_numbers_that_could_be_depths():
    times = stamps(60, 10)
    depths = [1.0, 2.0, 3.0]
    values = ocean(times, depths)
    rows = [f"{time:%Y-%m-%d %H:%M}," + ",".join(cells(row)) for time, row in zip(times, values, strict=True)]
    return Case(
        lines("time,T1,T2,T3", rows).encode(), times, depths, values, "wide", unsure=("numbers of the sensors",)
    )


@case
def commented_names_and_comments_below():
    times = stamps(60, 10)
    depths = [1.0, 10.0, 30.0]
    values = ocean(times, depths)
    rows = [f"{time:%Y-%m-%d} {time:%H:%M:%S} " + " ".join(cells(row)) for time, row in zip(times, values, strict=True)]
    rows.insert(30, "# the battery was changed here")
    return Case(lines("# buoy 7", "# date time T1.0 T10.0 T30.0", rows).encode(), times, depths, values, "wide")


@case
def one_sensor_whose_depth_is_in_the_header():
    times = stamps(60, 10)
    values = ocean(times, [12.5])
    rows = [
        f"{place};{time:%d/%m/%y %H:%M:%S};" + cells(row)[0]
        for place, (time, row) in enumerate(zip(times, values, strict=True), 1)
    ]
    header = ["Serial;8812", "Sensor depth: 12.5 m", "No;Taken at GMT+10:00;Water °C"]
    utc = [time - timedelta(hours=10) for time in times]
    return Case(
        lines(header, rows).encode(), utc, [12.5], values, "wide", unsure=("depth", "century"), certain=("time zone",)
    )


# --------------------------------------------------------------------------------------------------------------
# Fixed width


@case
def fixed_width_with_blank_cells():
    times = stamps(50, 60)
    depths = [1.0, 10.0, 20.0, 40.0]
    values = with_gaps(ocean(times, depths))
    rows = [
        f"{time:%Y%m%d %H%M} " + "".join(f"{text:>8}" for text in cells(row, missing=""))
        for time, row in zip(times, values, strict=True)
    ]
    header = "DATE     HHMM " + "".join(f"{f'T{depth:g}':>8}" for depth in depths)
    return Case(lines(header, rows).encode(), times, depths, values, "wide")


@case
def fixed_width_without_blanks_between():
    times = stamps(50, 60)
    depths = [1.0, 10.0, 20.0, 40.0]
    values = with_gaps(ocean(times, depths, 3))
    rows = [
        f"{time:%Y-%m-%d %H:%M}" + "".join(f"{text:>7}" for text in cells(row, 3, missing="-99.999"))
        for time, row in zip(times, values, strict=True)
    ]
    header = f"{'date  time':<16}" + "".join(f"{f'{depth:g}m':>7}" for depth in depths)
    return Case(lines(header, rows).encode(), times, depths, values, "wide")


# --------------------------------------------------------------------------------------------------------------
# Time in many forms


def plain(time_names, time_cells, *, times=None, separator=",", **options):
    times = times or stamps(70, 60)
    depths = [1.0, 5.0, 20.0]
    values = ocean(times, depths)
    rows = [separator.join([*time_cells(time), *cells(row)]) for time, row in zip(times, values, strict=True)]
    header = separator.join([*time_names, *(f"temp_{depth:g}m" for depth in depths)])
    return Case(lines(header, rows).encode(), times, depths, values, "wide", **options)


@case
def parts_of_the_date():
    return plain(
        ["YY", "MM", "DD", "hh", "mm"], lambda time: [str(each) for each in time.timetuple()[:5]], separator=" "
    )


@case
def day_of_year_and_hour():
    return plain(["year", "doy", "hour"], lambda time: [f"{time.year}", f"{time:%j}".lstrip("0"), str(time.hour)])


@case
def day_of_year_and_clock_without_zeros():
    times = stamps(90, 30)
    return plain(
        ["year", "jday", "hhmm"],
        lambda time: [f"{time.year}", f"{time:%j}", str(time.hour * 100 + time.minute)],
        times=times,
    )


@case
def date_as_one_number_and_clock_without_zeros():
    times = stamps(90, 30)
    return plain(["date", "time"], lambda time: [f"{time:%Y%m%d}", str(time.hour * 100 + time.minute)], times=times)


@case
def epoch_seconds():
    return plain(
        ["time"], lambda time: [str(int((time - datetime(1970, 1, 1)).total_seconds()))], certain=("time zone",)
    )


@case
def spreadsheet_days():
    # from 1899-12-30, which is the 25569th day before 1970
    def day(time):
        return [f"{(time - datetime(1970, 1, 1)).total_seconds() / 86400 + 25569:.8f}"]

    return plain(["Date"], day, unsure=("form of the stamps",))


@case
def days_since_a_stated_date():
    def day(time):
        return [f"{(time - datetime(2031, 1, 1)).total_seconds() / 86400:.8f}"]

    return plain(["time (days since 2031-01-01 00:00:00)"], day)


@case
def julian_days():
    def day(time):  # 2440587.5 is the beginning of 1970
        return [f"{(time - datetime(1970, 1, 1)).total_seconds() / 86400 + 2440587.5:.8f}"]

    return plain(["Julian day"], day)


@case
def decimal_day_of_a_year_in_the_name_of_the_file():
    def day(time):
        return [f"{(time - datetime(2031, 1, 1)).total_seconds() / 86400 + 1:.8f}"]

    return plain(["doy"], day, name="chain_2031.txt", unsure=("year",))


@case
def month_first_told_by_a_later_day():
    return plain(["when"], lambda time: [f"{time:%m/%d/%Y %H:%M}"], certain=("day or month first",))


@case
def day_or_month_first_stays_open():
    times = [datetime(2031, 4, 1) + timedelta(days=step) for step in range(12)]
    return plain(["date"], lambda time: [f"{time:%d/%m/%Y}"], times=times, unsure=("day or month first",))


@case
def summer_time_in_a_named_zone():
    times = stamps(70, 60, datetime(2031, 6, 1, 4))
    return plain(
        ["time Europe/Berlin"],
        lambda time: [f"{time + timedelta(hours=2):%Y-%m-%d %H:%M}"],
        times=times,
        certain=("time zone",),
        expected={"zone": "Europe/Berlin"},
    )


@case
def offset_in_the_stamp():
    return plain(["t"], lambda time: [f"{time + timedelta(hours=9):%Y-%m-%dT%H:%M:%S}+09:00"], certain=("time zone",))


# --------------------------------------------------------------------------------------------------------------
# Units, quality


@case
def kelvin_by_size_and_pressure_by_name():
    times = stamps(40, 60)
    depths = [1.0, 10.0, 50.0]
    values = ocean(times, depths)
    rows = [
        f"{time:%Y-%m-%d %H:%M}," + ",".join(f"{value + 273.15:.2f}" for value in row)
        for time, row in zip(times, values, strict=True)
    ]
    return Case(
        lines("time,temp_1m,temp_10m,temp_50m", rows).encode(), times, depths, values, "wide", unsure=("kelvin",)
    )


@case
def fahrenheit_stated():
    times = stamps(40, 60)
    depths = [1.0, 10.0, 50.0]
    values = ocean(times, depths)
    rows = [
        f"{time:%Y-%m-%d %H:%M}," + ",".join(f"{value * 1.8 + 32:.3f}" for value in row)
        for time, row in zip(times, values, strict=True)
    ]
    return Case(
        lines("time,1m_degF,10m_degF,50m_degF", rows).encode(),
        times,
        depths,
        values,
        "wide",
        certain=("units of temperature",),
    )


@case
def old_scale():
    times = stamps(40, 60, datetime(1986, 5, 1))
    depths = [1.0, 10.0, 50.0]
    values = ocean(times, depths, 3)
    rows = [f"{time:%Y-%m-%d %H:%M}," + ",".join(cells(row, 3)) for time, row in zip(times, values, strict=True)]
    # t90 = 0.99976 t68
    return Case(
        lines("* IPTS-68", "time,t1m,t10m,t50m", rows).encode(),
        times,
        depths,
        values * 0.99976,
        "wide",
        certain=("temperature scale",),
        expected={"scale": "IPTS-68"},
    )


@case
def a_mark_for_each_depth():
    times = stamps(40, 60)
    depths = [1.0, 10.0, 50.0]
    values = ocean(times, depths)
    header = "time," + ",".join(f"T_{depth:g}m,T_{depth:g}m_QC" for depth in depths)
    rows = [
        f"{time:%Y-%m-%d %H:%M}," + ",".join(f"{value:.2f},{1 if place % 7 else 4}" for value in row)
        for place, (time, row) in enumerate(zip(times, values, strict=True))
    ]
    return Case(lines(header, rows).encode(), times, depths, values, "wide", unsure=("quality marks",))


@case
def marks_glued_together():
    times = stamps(40, 60)
    depths = [1.0, 10.0, 50.0]
    values = ocean(times, depths)
    rows = [
        f"{time:%Y-%m-%d %H:%M}\t" + "\t".join(cells(row)) + "\t113" for time, row in zip(times, values, strict=True)
    ]
    return Case(
        lines("time\tT1.0\tT10.0\tT50.0\tQuality", rows).encode(),
        times,
        depths,
        values,
        "wide",
        unsure=("quality marks",),
    )


# --------------------------------------------------------------------------------------------------------------
# Long


def long(header, row_text, *, depths=(1.0, 10.0, 25.0), times=None, **options):
    times = times or stamps(40, 60)
    values = with_gaps(ocean(times, depths))
    rows = [
        row_text(time, depth, values[place, column])
        for place, time in enumerate(times)
        for column, depth in enumerate(depths)
    ]
    return Case(lines(header, rows).encode(), times, list(depths), values, "long", **options)


@case
def long_with_station():
    return long(
        "station,time,depth,temp",
        lambda time, depth, value: f"A1,{time:%Y-%m-%dT%H:%M:%SZ},{depth},{cells([value])[0]}",
        unsure=("units of depth",),
    )


@case
def long_negative_upward():
    return long(
        "time z_m temp_degC salinity",
        lambda time, depth, value: f"{time:%Y-%m-%dT%H:%M} {-depth} {cells([value], missing='-99.9')[0]} 34.5",
        unsure=("sign of depth", "not used"),
    )


@case
def long_pressure_with_marks_and_decimal_comma():
    from profiles.ingest.units import depth_of_pressure

    found = long(
        "Zeit;Druck [dbar];Temp [°C];Temp QF",
        lambda time, depth, value: (
            f"{time:%d.%m.%Y %H:%M};{depth:g};{cells([value], missing='', comma=True)[0]};{9 if np.isnan(value) else 1}"
        ),
        unsure=("quality marks",),
    )
    found.depths = depth_of_pressure(np.array(found.depths), 0.0).tolist()
    return found


@case
def long_without_names():
    return long(
        "sonde 4, 2031", lambda time, depth, value: f"{time:%Y-%m-%d %H:%M:%S}\t{depth:.1f}\t{cells([value])[0]}"
    )


# --------------------------------------------------------------------------------------------------------------
# Blocked and counted


def blocked(header_of, row_of, *, sets=((1.0, 10.0, 25.0), (1.0, 20.0, 25.0, 60.0), (5.0, 20.0)), before=(), **options):
    times = stamps(60, 360)
    depths = sorted({depth for each in sets for depth in each})
    values = np.full((60, len(depths)), np.nan)
    text = list(before)
    for number, each in enumerate(sets):
        part = times[number * 20 : number * 20 + 20]
        found = with_gaps(ocean(part, list(each)), ((2, 0), (5, 1)))
        text += header_of(number + 1, each)
        text += [row_of(time, row) for time, row in zip(part, found, strict=True)]
        values[number * 20 : number * 20 + 20, [depths.index(depth) for depth in each]] = found
    return Case(lines(text).encode(), times, depths, values, "blocked", **options)


@case
def blocks_with_a_line_of_depths():
    return blocked(
        lambda number, depths: [
            f"DEPLOYMENT {number} of mooring 12",
            "Depth(m) " + " ".join(f"{depth:.1f}" for depth in depths),
        ],
        lambda time, row: f"{time:%Y%m%d %H%M} " + " ".join(cells(row, missing="-9.99")),
        before=["Mooring archive, daily values, UTC", ""],
    )


@case
def blocks_with_marks_at_the_end():
    return blocked(
        lambda number, depths: [f"BLOCK {number}", "DATE TIME " + " ".join(f"{depth:g}" for depth in depths) + " QUAL"],
        lambda time, row: (
            f"{time:%Y-%m-%d %H:%M} "
            + " ".join(cells(row, missing="-9.99"))
            + " "
            + "".join("9" if np.isnan(each) else "1" for each in row)
        ),
        unsure=("quality marks",),
    )


@case
def blocks_with_commented_headers_and_commas():
    return blocked(
        lambda number, depths: ["# depths," + ",".join(f"{depth:g}m" for depth in depths)],
        lambda time, row: f"{time:%Y-%m-%dT%H:%M:%S}," + ",".join(cells(row, missing="NaN")),
    )


@case
def blocks_of_repeated_headers_by_name():
    return blocked(
        lambda number, depths: ["time;" + ";".join(f"T{depth:.1f}" for depth in depths)],
        lambda time, row: f"{time:%d.%m.%Y %H:%M};" + ";".join(cells(row, missing="", comma=True)),
    )


def counted(head_of, row_of, *, before=(), end="\n", **options):
    random = np.random.default_rng(4)
    times = stamps(50, 720)
    depths = [1.0, 5.0, 10.0, 20.0, 50.0, 75.0]
    values = ocean(times, depths, 3)
    text = list(before)
    for place, time in enumerate(times):
        chosen = sorted(random.choice(len(depths), size=random.integers(3, 7), replace=False))
        values[place, [column for column in range(len(depths)) if column not in chosen]] = np.nan
        text.append(head_of(time, len(chosen)))
        text += [row_of(depths[column], values[place, column]) for column in chosen]
    return Case(lines(text, end=end).encode(), times, depths, values, "counted", **options)


@case
def profiles_with_a_count_at_the_end():
    return counted(
        lambda time, count: f"{time:%Y-%m-%d %H:%M:%S} -2.50 149.00 {count}",
        lambda depth, value: f"{depth:8.1f} {value:8.3f}",
        before=["profiles of mooring 3"],
    )


@case
def profiles_with_a_count_first_and_commas():
    return counted(
        lambda time, count: f"{count},{time:%Y},{time.month},{time.day},{time.hour}",
        lambda depth, value: f"{depth:g},{value:.3f}",
        end="\r\n",
    )


@case
def profiles_with_a_word_and_marks():
    return counted(
        lambda time, count: f"PROFILE 12 {time:%Y%m%d} {time:%H%M} {count}",
        lambda depth, value: f"  {-depth:.1f} {value:.3f} 1",
        unsure=("sign of depth", "not used"),
    )


@case
def archive_blocks_with_two_strings_of_marks():
    sets = ((1.0, 25.0, 50.0, 75.0), (1.0, 10.0, 20.0, 40.0, 60.0, 80.0), (5.0, 25.0, 50.0))
    return blocked(
        lambda number, depths: [
            f" Part {number} of 3 from the raft",
            " Levels below surface:  " + " ".join(f"{depth:5.0f}" for depth in depths) + "  CHECK ORIGIN",
            " day hour " + " ".join("water" for _ in depths),
        ],
        lambda time, row: (
            f" {time:%Y%m%d %H%M} "
            + " ".join(f"{text:>6}" for text in cells(row, missing="-9.99"))
            + " "
            + "".join("9" if np.isnan(each) else "2" for each in row)
            + " "
            + "5" * len(row)
        ),
        sets=sets,
        before=[" Raft north of the pier, 3 parts", " Temperature in deg C; -9.99 stands for none"],
        unsure=("quality marks", "which marks"),
    )


@case
def a_block_for_each_sensor():
    times = stamps(30, 60)
    depths = [1.0, 5.0, 12.0]
    values = ocean(times, depths)
    text = []
    for column, depth in enumerate(depths):
        text += [f"Sensor {column + 1} at depth {depth:g} m".removesuffix(" m"), "time temp"]
        text += [f"{time:%Y-%m-%d %H:%M} {values[place, column]:.2f}" for place, time in enumerate(times)]
    return Case(lines(text).encode(), times, depths, values, "blocked")


@case
def profiles_with_blank_lines_between():
    times = stamps(30, 60)
    depths = [1.0, 5.0, 12.0, 30.0]
    values = ocean(times, depths)
    text = []
    for place, time in enumerate(times):
        text.append(f"{len(depths)} {time:%d/%m/%Y} {time:%H:%M}")
        text += [*(f"{depth:g}\t{values[place, column]:.2f}" for column, depth in enumerate(depths)), ""]
    return Case(lines(text).encode(), times, depths, values, "counted")


# --------------------------------------------------------------------------------------------------------------
# What stands beside the readings


def beside(names, row_text, *, depths=(1.0, 5.0, 10.0, 20.0), **options):
    times = stamps(60, 60)
    values = with_gaps(ocean(times, depths))
    rows = [row_text(time, row) for time, row in zip(times, values, strict=True)]
    return Case(lines(names, rows).encode(), times, list(depths), values, "wide", **options)


@case
def lines_of_facts_before_the_names():
    facts = [
        "Site Name: North basin",
        "Latitude: 46.1, Longitude: 8.7",
        "Operator: someone, else",
        "Serials: 1,2,3,4",
        "[data]",
    ]
    return beside(
        [*facts, "Date;Hour;T1m;T5m;T10m;T20m"],
        lambda time, row: f"{time:%Y-%m-%d};{time.hour};" + ";".join(cells(row, missing="")),
    )


@case
def marks_behind_all_readings():
    return beside(
        "DateTime,Temp_1,Temp_5,Temp_10,Temp_20,Flag_1,Flag_5,Flag_10,Flag_20",
        lambda time, row: (
            f"{time:%Y-%m-%d %H:%M},{','.join(cells(row, missing=''))},"
            + ",".join("M" if np.isnan(each) else "A" for each in row)
        ),
        unsure=("quality marks", "units of depth"),
    )


@case
def extremes_and_spread_beside_the_means():
    names = [f"Temp{depth}m_{what}" for depth in (1, 5, 10, 20) for what in ("Min", "Avg", "Max", "Std")]
    return beside(
        "Time," + ",".join(names),
        lambda time, row: (
            f"{time:%Y-%m-%d %H:%M},"
            + ",".join(
                f"{each - 0.1:.2f},{text},{each + 0.1:.2f},0.05"
                for each, text in zip(row, cells(row, missing="nan"), strict=True)
            )
        ),
        unsure=("stamp of the means", "not used"),
        expected={"mean_hours": 1},
    )


@case
def air_and_logger_temperatures_beside():
    return beside(
        "Timestamp,AirTemp_C,WaterTemp_0.5m,WaterTemp_2m,WaterTemp_5m,LoggerTemp",
        lambda time, row: f"{time:%Y-%m-%d %H:%M},18.2," + ",".join(cells(row)) + ",25.1",
        depths=(0.5, 2.0, 5.0),
        unsure=("not used",),
    )


@case
def names_with_blanks_between_blanks():
    return beside(
        "Date        Time      Temp 1m   Temp 5m  Temp 10m  Temp 20m",
        lambda time, row: (
            f"{time:%Y/%m/%d}  {time:%H:%M:%S}" + "".join(f"{text:>10}" for text in cells(row, missing="-99.9"))
        ),
    )


@case
def decimal_commas_in_quotes_between_commas():
    return beside(
        "time,T1m,T5m,T10m,T20m",
        lambda time, row: (
            f"{time:%Y-%m-%d %H:%M:%S}," + ",".join(f'"{text}"' for text in cells(row, missing="", comma=True))
        ),
    )


@case
def rows_that_end_with_a_delimiter_more():
    return beside(
        "time,t1m,t5m,t10m,t20m",
        lambda time, row: f"{time:%Y-%m-%dT%H:%M:%S}.000Z," + ",".join(cells(row, missing="")) + ",",
        certain=("time zone",),
    )


@case
def years_of_two_digits_in_columns():
    return beside(
        "YY MM DD HH T1 T5 T10 T20",
        lambda time, row: f"{time:%y %m %d %H} " + " ".join(cells(row, missing="-9.99")),
        unsure=("century",),
    )


@case
def half_days_and_an_offset_in_the_name():
    found = beside(
        '"No.","Taken at (GMT-07:00)","Water °C (sensor 99, 5m)","Docked"',
        lambda time, row: f"1,{time - timedelta(hours=7):%m/%d/%y %I:%M:%S %p},{cells(row, missing='')[0]},",
        depths=(5.0,),
        unsure=("century",),
        certain=("time zone", "units"),
        expected={"zone": "-07:00"},
    )
    return found


@case
def sensors_that_move_about_their_depths():
    random = np.random.default_rng(0)
    times, depths = stamps(60, 60), [2.0, 10.0, 20.0, 50.0]
    values = ocean(times, depths)
    rows = [
        f"{time:%Y-%m-%d %H:%M:%S};{depth + random.uniform(-0.4, 0.4):.2f};{values[place, column]:.2f}"
        for place, time in enumerate(times)
        for column, depth in enumerate(depths)
    ]
    return Case(
        lines("time;depth_m;temp", rows).encode(), times, depths, values, "long", unsure=("depths of the sensors",)
    )


@case
def sensor_after_sensor():
    times, depths = stamps(60, 60), [1.0, 5.0, 10.0]
    values = with_gaps(ocean(times, depths))
    rows = [
        f"S{column},{depth:g},{time:%m/%d/%Y %H:%M},{cells([values[place, column]])[0]},3.6"
        for column, depth in enumerate(depths)
        for place, time in enumerate(times)
    ]
    header = "Sensor,DepthBelowSurface(m),SampleTime,WaterTemp(C),Battery(V)"
    return Case(lines(header, rows).encode(), times, depths, values, "long", certain=("units",))


@case
def blocks_with_commas_between_the_depths_only():
    return blocked(
        lambda number, depths: [f"Deployment {number}", "Depths: " + ", ".join(map(str, depths))],
        lambda time, row: f"{time:%Y-%m-%d %H:%M} " + " ".join(cells(row, missing="-9.99")),
    )


@case
def blocks_that_count_their_depths():
    return blocked(
        lambda number, depths: ["SENSORS " + " ".join(map(str, [len(depths), *depths]))],
        lambda time, row: f"{time:%Y%m%d} {time:%H%M} " + " ".join(cells(row, missing="-9.99")),
        sets=((5.0, 10.0, 25.0), (5.0, 20.0, 25.0, 60.0), (3.0, 20.0)),
    )


@case
def an_archive_of_one_block():
    times, depths = stamps(30, 1440), [1.0, 25.0, 50.0, 75.0]
    values = with_gaps(ocean(times, depths))
    header = [
        " Raft north of the pier",
        " Temperature in deg C; -9.99 stands for none",
        " Part: 2100 to 0200 (rows 1 to 30)",
        " Level (M):     1    25    50    75  CHECK ORIGIN",
        " day hour water water water water",
    ]
    rows = [
        f" {time:%Y%m%d %H%M} " + " ".join(f"{text:>6}" for text in cells(row, missing="-9.99")) + " 2222 5555"
        for time, row in zip(times, values, strict=True)
    ]
    return Case(lines(header, rows).encode(), times, depths, values, "wide")


@case
def profiles_with_a_place_and_a_date_in_parts():
    return counted(
        lambda time, count: (
            f"{count:5d} {46.123:8.3f} {8.7:8.3f} {time.year} {time.month:2d} {time.day:2d} {time.hour:2d}"
        ),
        lambda depth, value: f"{depth:8.1f}{value:8.3f}",
        before=["# Each profile begins with levels, latitude, longitude, date", "# then: depth(m), temperature(degC)"],
        certain=("units of depth", "units of temperature"),
    )


@case
def depth_row_above_the_names():
    return beside(
        "Depth (m),0.5,1.0,2.0,4.0\nDate/Time,Temp (C),Temp (C),Temp (C),Temp (C)",
        lambda time, row: f"{time:%m/%d/%Y %H:%M}," + ",".join(cells(row, missing="")),
        depths=(0.5, 1.0, 2.0, 4.0),
    )


@case
def depths_in_the_description_of_channels():
    header = [
        '"Buoy","LOG 7"',
        '"Date and time","Channel 1","Channel 2","Channel 3","Channel 4"',
        '"dd/mm/yyyy hh:mm:ss","°C","°C","°C","°C"',
        '"","Water temperature 1 m","Water temperature 5 m","Water temperature 10 m","Water temperature 20 m"',
    ]
    return beside(
        "\n".join(header),
        lambda time, row: f'"{time:%d/%m/%Y %H:%M:%S}",' + ",".join(f'"{text}"' for text in cells(row, missing="")),
        certain=("units",),
    )


@case
def three_digits_and_two_decimals_as_a_line():
    return beside(
        "Date\tTime\tTEMP_000_50\tTEMP_001_00\tTEMP_010_00\tTEMP_020_00",
        lambda time, row: f"{time:%d-%m-%Y}\t{time:%H:%M}\t" + "\t".join(cells(row, missing="")),
        depths=(0.5, 1.0, 10.0, 20.0),
        unsure=("depths",),
    )


@case
def a_temperature_without_a_depth_beside():
    return beside(
        "timestamp\tTemp_surface\tTemp_5m\tTemp_10m\tTemp_20m",
        lambda time, row: f"{time:%Y-%m-%d %H:%M:%S}\t27.11\t" + "\t".join(cells(row, missing="")),
        depths=(5.0, 10.0, 20.0),
        unsure=("temperatures that are not used: 'Temp_surface'",),
    )


@case
def year_day_and_hours_with_hundreds():
    return beside(
        "jahr4\tday_no\thour\twater_1\twater_5\twater_10\twater_20",
        lambda time, row: (
            f"{time.year}\t{int(f'{time:%j}')}\t{time.hour * 100}\t" + "\t".join(cells(row, missing="NA"))
        ),
        unsure=("stamp",),
    )


@case
def long_with_a_clock_of_four_digits_and_sparse_marks():
    return long(
        "taken_on\ttaken_at\twater_temp\tdepth\tflag_water_temp",
        lambda time, depth, value: (
            f"{time:%Y-%m-%d}\t{time:%H%M}\t{cells([value], missing='')[0]}\t{depth}\t{'C' if np.isnan(value) else ''}"
        ),
        unsure=("quality marks",),
    )


# --------------------------------------------------------------------------------------------------------------
# The claim


@pytest.mark.parametrize("name", CASES)
def test_a_draft_reads_every_value_where_and_when_it_was(name, tmp_path):
    made = CASES[name]()
    path = tmp_path / made.name
    path.write_bytes(made.content)
    drafted = draft(path, depths=made.given)
    layout = tmp_path / "layout.toml"
    layout.write_text(drafted.toml, encoding="utf-8")
    delivery = read(path, load_layout(layout), latitude=0.0)
    assert delivery.quarantine["reason"].tolist() == []
    assert drafted.proposal.kind == made.kind
    chain = delivery.chain
    keep = ~np.isnan(made.values).all(axis=1)
    times = np.array(made.times, "datetime64[ns]")
    order = np.argsort(made.depths)
    reach = 0.1 if "tolerance" in drafted.proposal.content["depth"] else 1e-4  # found from depths that scatter
    np.testing.assert_allclose(chain["depth"], np.array(made.depths)[order], atol=reach)
    found = chain["temperature"].sel(time=times[keep])
    np.testing.assert_allclose(found, made.values[keep][:, order], atol=6e-4 if name == "fahrenheit_stated" else 1e-5)
    assert chain.sizes["time"] == (times.size if made.kind != "counted" else keep.sum())
    doubts = "\n".join(map(str, drafted.proposal.doubts))
    assert [word for word in made.unsure if word not in doubts] == []
    assert [word for word in made.certain if word + ":" in doubts or f"\n{word}" in doubts] == []
    content = drafted.proposal.content
    stated = {**content["time"], "scale": content["temperature"]["scale"]}
    assert {key: stated.get(key) for key in made.expected} == made.expected
    assert drafted.rows_read == drafted.rows_kept + drafted.rows_quarantined


@pytest.mark.parametrize("name", [name for name in CASES if "zip" not in name])
def test_a_row_cut_short_changes_nothing_but_itself(name, tmp_path):
    made = CASES[name]()
    if made.kind not in {"wide", "long"}:
        pytest.skip("a lost line takes its profile with it, and a header its block")
    plain = gzip.decompress(made.content).decode("utf-16") if made.name.endswith("gz") else made.content.decode()
    whole, cut = tmp_path / "whole" / made.name.removesuffix(".gz"), tmp_path / "cut" / made.name.removesuffix(".gz")
    rows = plain.splitlines()
    place = 3 * len(rows) // 4
    short = [*rows[:place], rows[place][:13], *rows[place + 1 :]]
    for path, part in ((whole, rows), (cut, short)):
        path.parent.mkdir()
        path.write_text("\n".join(part) + "\n", encoding="utf-8")
    before, after = draft(whole, depths=made.given), draft(cut, depths=made.given)
    assert after.proposal.content == before.proposal.content
    assert after.rows_kept == before.rows_kept - 1
    assert after.rows_read == before.rows_read
