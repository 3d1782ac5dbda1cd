"""Every kind of text against readers that share nothing with ours: the csv module, pandas and NumPy.

Each file has missing readings, rows out of order and rows that come twice, of which the first is to stay.
"""

from __future__ import annotations

import csv
import io
import zipfile

import numpy as np
import pandas as pd
import pytest

from profiles.ingest import read
from profiles.ingest.layout import BlockedLayout, CountedLayout, LongLayout, WideLayout

DEPTHS = [1.0, 10.0, 25.5, 60.0, 120.0]
ROWS = 3_000


@pytest.fixture
def table():
    """Ten-minute readings, one in twenty missing, in disorder, with repeats that carry other readings."""
    random = np.random.default_rng(17)
    time = pd.date_range("2031-02-20", periods=ROWS, freq="10min").to_numpy()
    values = (20.0 + random.normal(0.0, 8.0, (ROWS, len(DEPTHS)))).round(3)
    values[random.random(values.shape) < 0.05] = np.nan
    order = np.concatenate([np.arange(ROWS), random.integers(0, ROWS, 60)])
    order[100:160] = random.permutation(order[100:160])
    values = np.concatenate([values, values[:60] + 1.0])
    return pd.DataFrame(values, index=pd.DatetimeIndex(time[order], name="time"), columns=DEPTHS)


def settled(frame):
    """Return what ought to be read: the first row of each time, in order."""
    return frame[~frame.index.duplicated(keep="first")].sort_index()


def check(delivery, frame, repeats=60):
    expected = settled(frame)
    np.testing.assert_array_equal(delivery.chain["time"], expected.index.to_numpy())
    np.testing.assert_array_equal(delivery.chain["depth"], np.float32(expected.columns))
    np.testing.assert_array_equal(delivery.chain["temperature"], expected.to_numpy(np.float32))
    assert delivery.rows_read == delivery.rows_kept + delivery.rows_quarantined
    assert delivery.rows_quarantined == repeats


@pytest.mark.parametrize("packed", [None, "gzip", "zip"])
def test_wide_text_against_pandas(tmp_path, table, packed):
    path = tmp_path / "wide.csv"
    frame = table.rename(columns="T_{:g}m".format).assign(note='a, "b"')
    frame.to_csv(path, na_rep="-9.999", lineterminator="\r\n", compression=packed)
    layout = {"kind": "wide", "missing": ["-9.999"], "time": {"column": "time"}, "depth": {"pattern": "T_{depth}m"}}
    other = pd.read_csv(path, index_col="time", parse_dates=True, na_values=["-9.999"], compression=packed)
    other = other.drop(columns="note").rename(columns=lambda name: float(name[2:-1]))
    check(read(path, WideLayout.model_validate(layout)), other)


def test_wide_text_with_decimal_commas_and_marks_against_pandas(tmp_path, table):
    random = np.random.default_rng(3)
    path = tmp_path / "wide.txt"
    marks = ["".join(row) for row in random.choice(["1", "2", "4"], (len(table), len(DEPTHS)))]
    frame = table.assign(q=marks, day=table.index.strftime("%d.%m.%Y"), clock=table.index.strftime("%H:%M"))
    frame.to_csv(path, sep="\t", decimal=",", index=False, na_rep="°", encoding="latin-1")
    layout = {
        "kind": "wide", "delimiter": "\t", "decimal": ",", "encoding": "latin-1", "missing": ["°"],
        "time": {"columns": ["day", "clock"], "format": "%d.%m.%Y %H:%M"}, "depth": {"pattern": "{depth}"},
        "quality": {"column": "q", "flags": {"1": 1, "2": 3, "4": 4}},
    }  # fmt: skip
    delivery = read(path, WideLayout.model_validate(layout))
    other = pd.read_csv(path, sep="\t", decimal=",", encoding="latin-1", na_values=["°"], dtype={"q": str})
    other.index = pd.to_datetime(other["day"] + " " + other["clock"], format="%d.%m.%Y %H:%M")
    values = other[[str(depth) for depth in DEPTHS]].rename(columns=float)
    check(delivery, values)
    ours = {"1": 1, "2": 3, "4": 4}
    flags = pd.DataFrame([[ours[mark] for mark in row] for row in other["q"]], other.index, DEPTHS).where(
        values.notna(), 9
    )
    np.testing.assert_array_equal(delivery.chain["temperature_delivered_qc"], settled(flags).to_numpy())


def test_fixed_width_against_pandas_and_numpy(tmp_path, table):
    path = tmp_path / "fixed.txt"
    lines = [
        f"{time:%Y%m%d%H%M}" + "".join("-999.999" if np.isnan(value) else f"{value:8.3f}" for value in row)
        for time, row in zip(table.index, table.to_numpy(), strict=True)
    ]
    path.write_text("a title\n" + "\n".join(lines) + "\n")
    edges = [(0, 12), *((12 + 8 * place, 20 + 8 * place) for place in range(len(DEPTHS)))]
    names = ["time", *(f"t{place}" for place in range(len(DEPTHS)))]
    layout = {
        "kind": "wide", "missing": ["-999.999"], "depth": {"values": DEPTHS, "first": "t0"},
        "fixed": {name: [start + 1, stop] for name, (start, stop) in zip(names, edges, strict=True)},
        "time": {"column": "time", "format": "%Y%m%d%H%M"},
    }  # fmt: skip
    delivery = read(path, WideLayout.model_validate(layout))
    other = pd.read_fwf(path, colspecs=edges, skiprows=1, names=names, na_values=["-999.999"], dtype={"time": str})
    other.index = pd.to_datetime(other.pop("time"), format="%Y%m%d%H%M")
    other.columns = DEPTHS
    check(delivery, other)
    numbers = np.genfromtxt(path, delimiter=[12, *[8] * len(DEPTHS)], skip_header=1)[:, 1:]
    numbers[numbers == -999.999] = np.nan
    check(delivery, pd.DataFrame(numbers, other.index, DEPTHS))


def test_long_text_against_pandas(tmp_path, table):
    path = tmp_path / "long.txt"
    frame = table.melt(var_name="z", value_name="t", ignore_index=False).reset_index()
    frame["q"] = np.random.default_rng(5).choice(["good", "bad"], len(frame))
    frame.sample(frac=1.0, random_state=1).to_csv(path, sep=";", decimal=",", index=False, na_rep="NA")
    layout = {
        "kind": "long", "delimiter": ";", "decimal": ",", "missing": ["NA"], "time": {"column": "time"},
        "depth": {"column": "z"}, "temperature": {"column": "t"},
        "quality": {"column": "q", "flags": {"good": 1, "bad": 4}},
    }  # fmt: skip
    delivery = read(path, LongLayout.model_validate(layout))
    other = pd.read_csv(path, sep=";", decimal=",", parse_dates=["time"]).drop_duplicates(["time", "z"], keep="first")
    pivoted = other.pivot(index="time", columns="z", values="t")
    check(delivery, pivoted, repeats=60 * len(DEPTHS))
    flags = other.replace({"q": {"good": 1, "bad": 4}}).pivot(index="time", columns="z", values="q").astype(int)
    np.testing.assert_array_equal(delivery.chain["temperature_delivered_qc"], flags.where(pivoted.notna(), 9))


def test_blocked_text_against_numpy(tmp_path, table):
    path = tmp_path / "blocked.txt"
    sets = [DEPTHS, DEPTHS[1:4], [1.0, 60.0]]
    with path.open("w") as file:
        for place, start in enumerate(range(0, len(table), 97)):
            depths, rows = sets[place % 3], table.iloc[start : start + 97]
            file.write("DEPTHS " + " ".join(f"{depth:g}" for depth in depths) + "\n")
            for time, row in zip(rows.index, rows[depths].to_numpy(), strict=True):
                file.write(f"{time:%Y %j %H%M} " + " ".join("99.9" if np.isnan(v) else f"{v:.3f}" for v in row) + "\n")
    layout = {
        "kind": "blocked", "delimiter": "whitespace", "missing": ["99.9"],
        "block": {"begins": "DEPTHS", "before": ["year", "day", "clock"]},
        "time": {"parts": {"year": "year", "day_of_year": "day", "hour_minute": "clock"}},
    }  # fmt: skip
    delivery = read(path, BlockedLayout.model_validate(layout))
    parts = []
    for block in path.read_text().split("DEPTHS ")[1:]:
        head, _, body = block.partition("\n")
        numbers = np.loadtxt(io.StringIO(body), ndmin=2)
        year, day, clock = numbers[:, :3].astype(int).T
        times = (year - 1970).astype("M8[Y]").astype("M8[m]") + (day - 1) * 1440 + clock // 100 * 60 + clock % 100
        values = np.where(numbers[:, 3:] == 99.9, np.nan, numbers[:, 3:])
        parts.append(pd.DataFrame(values, times, np.array(head.split(), float)))
    # Of rows of one time the first stays; another completes it only where it has none of its depths.
    taken, kept, lost = {}, {}, 0
    for part in parts:
        for time, row in part.iterrows():
            depths = set(part.columns)
            if taken.get(time, set()) & depths:
                lost += 1
                continue
            taken[time] = taken.get(time, set()) | depths
            kept.setdefault(time, {}).update(row.to_dict())
    expected = pd.DataFrame.from_dict(kept, orient="index").reindex(columns=DEPTHS).sort_index()
    np.testing.assert_array_equal(delivery.chain["time"], expected.index.to_numpy())
    np.testing.assert_array_equal(delivery.chain["temperature"], expected.to_numpy(np.float32))
    assert delivery.rows_quarantined == lost > 0
    assert delivery.rows_read == len(table) + len(parts)


def test_profiles_one_after_another_against_csv(tmp_path, table):
    path = tmp_path / "counted.txt"
    with path.open("w", newline="") as file:
        writer = csv.writer(file, delimiter=" ")
        for time, row in zip(table.index, table.to_numpy(), strict=True):
            present = [(depth, value) for depth, value in zip(DEPTHS, row, strict=True) if not np.isnan(value)]
            writer.writerow([f"{time.timestamp():.0f}", len(present)])
            writer.writerows((f"{depth:g}", f"{value:.3f}") for depth, value in present)
    layout = {
        "kind": "counted", "delimiter": "whitespace", "record": {"names": ["seconds", "count"], "count": "count"},
        "names": ["z", "t"], "time": {"column": "seconds", "units": "seconds since 1970-01-01"},
        "depth": {"column": "z"}, "temperature": {"column": "t"},
    }  # fmt: skip
    delivery = read(path, CountedLayout.model_validate(layout))
    readings, lines = {}, 0
    with path.open(newline="") as file:
        rows = csv.reader(file, delimiter=" ")
        for seconds, count in rows:
            lines += 1 + int(count)
            for _ in range(int(count)):
                depth, value = next(rows)
                readings.setdefault((pd.Timestamp(int(seconds), unit="s"), float(depth)), float(value))
    expected = pd.Series(readings).unstack().sort_index()
    np.testing.assert_array_equal(delivery.chain["time"], expected.index.to_numpy().astype("M8[ns]"))
    np.testing.assert_array_equal(delivery.chain["temperature"], expected.to_numpy(np.float32))
    assert delivery.rows_read == lines
    # kept: the line that begins each profile, and one reading for each time and depth
    assert delivery.rows_kept == len(table) + len(readings)


def test_a_member_of_an_archive_against_zipfile(tmp_path, table):
    path = tmp_path / "two.zip"
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as archive:
        archive.writestr("read.me", "not this")
        archive.writestr("data/chain.csv", table.to_csv(na_rep="NA"))
    layout = {
        "kind": "wide", "missing": ["NA"], "member": "*.csv", "time": {"column": "time"},
        "depth": {"pattern": "{depth}"},
    }  # fmt: skip
    delivery = read(path, WideLayout.model_validate(layout))
    with zipfile.ZipFile(path) as archive, archive.open("data/chain.csv") as file:
        other = pd.read_csv(file, index_col="time", parse_dates=True).rename(columns=float)
    check(delivery, other)
