"""Drafts of layouts: what settles a question, what stays unsure, and what is refused."""

from __future__ import annotations

import gzip
import io
import random
import zipfile

import numpy as np
import pytest

from profiles.errors import DataError, RequestError, ThermotiltError
from profiles.ingest import load_layout
from profiles.ingest.drafting import draft
from profiles.ingest.drafting.content import sort_of
from profiles.ingest.drafting.counts import best_walk
from profiles.ingest.drafting.encodings import Bytes, marked
from profiles.ingest.drafting.fixed_places import find_places
from profiles.ingest.drafting.readings import stands_for_missing
from profiles.ingest.drafting.sample import HEAD_LINES, TAIL_LINES, take_sample
from profiles.ingest.drafting.time_forms import formats_of
from profiles.ingest.drafting.words import temperature_units, temperature_worth


def table(rows, *, header="time,T_1m,T_10m"):
    return "\n".join([header, *rows]) + "\n"


def days(count, form="{:04d}-{:02d}-{:02d}", values="{:.2f},{:.2f}"):
    """Return daily rows from 2031-01-01, of a year of months of 28 days."""
    return [
        form.format(2031 + day // 336, day // 28 % 12 + 1, day % 28 + 1)
        + ","
        + values.format(28.0 - day % 7 / 10, 24.0 - day % 5 / 10)
        for day in range(count)
    ]


def doubts(drafted):
    return {doubt.about: doubt for doubt in drafted.proposal.doubts}


# --------------------------------------------------------------------------------------------------------------
# What a draft is


def test_the_layout_that_is_written_is_the_one_that_was_tried(write, tmp_path):
    drafted = draft(write(table(days(20))))
    path = tmp_path / "layout.toml"
    path.write_text(drafted.toml, encoding="utf-8")
    assert load_layout(path) == drafted.layout


def test_names_that_need_escapes_survive_the_writing(write, tmp_path):
    drafted = draft(write(table(days(20), header='"time ""local""","T\\1m","T\\10m"')))
    path = tmp_path / "layout.toml"
    path.write_text(drafted.toml, encoding="utf-8")
    assert load_layout(path).time.column == 'time "local"'
    assert load_layout(path).depth.pattern == "T\\{depth}m"


def test_first_and_last_rows_are_shown_in_utc_by_depth(write):
    drafted = draft(write(table(days(20), header="time (UTC+10),T_1m,T_10m")))
    first = drafted.first[0]
    assert (first.line, first.text, str(first.time)) == (2, "2031-01-01,28.00,24.00", "2030-12-31T14:00:00.000000000")
    assert first.readings == ((1.0, 28.0), (10.0, 24.0))
    assert [row.line for row in drafted.last] == [19, 20, 21]


def test_every_row_is_accounted_for_and_the_reasons_are_counted(write):
    rows = days(20)
    rows[4] = "2031-01-05,28.1"
    rows[7] = rows[6]
    drafted = draft(write(table(rows)))
    assert (drafted.rows_read, drafted.rows_kept, drafted.rows_quarantined) == (20, 18, 2)
    assert set(drafted.reasons) == {("2 cells where there are 3 columns", 1, 6), ("the time is that of line 8", 1, 9)}


# --------------------------------------------------------------------------------------------------------------
# What the whole file settles


def long_file(form):
    """Return a row a minute, so many that all days of beginning and end are below 13."""
    start, count = np.datetime64("2031-01-01T00:00"), HEAD_LINES + 60 * 24 * 14 + TAIL_LINES
    stamps = start + np.arange(count).astype("timedelta64[m]")
    # the end lies in the first days of the month after
    stamps = np.concatenate([stamps, np.datetime64("2031-02-01T00:00") + np.arange(300).astype("timedelta64[m]")])
    texts = [form.format(*str(stamp).replace("T", "-").split("-")) for stamp in stamps]
    return table([f"{text},28.1,{20 + place % 7}.5" for place, text in enumerate(texts)])


@pytest.mark.parametrize(
    ("form", "time_format"), [("{2}/{1}/{0} {3}", "%d/%m/%Y %H:%M"), ("{1}/{2}/{0} {3}", "%m/%d/%Y %H:%M")]
)
def test_days_in_the_middle_settle_which_comes_first(write, form, time_format):
    drafted = draft(write(long_file(form)))
    assert drafted.layout.time.format == time_format
    assert drafted.rows_quarantined == 0
    assert "day or month first" not in doubts(drafted)


def test_a_doubt_about_the_order_names_both_readings(write):
    doubt = doubts(draft(write(table([f"{day:02d}/02/2031,28.{day},20" for day in range(1, 11)]))))[
        "day or month first"
    ]
    assert "%d/%m/%Y, which gives 2031-02-01T00:00 to 2031-02-10T00:00" in doubt.taken
    assert "%m/%d/%Y" in doubt.why
    assert doubt.other == "2031-01-02T00:00 to 2031-10-02T00:00"


def test_monthly_rows_are_read_month_first(write):
    # the first of each month, one step of about a month as the other way round it would be a day
    rows = [f"{month:02d}/01/2031,28.{month},20" for month in range(1, 13)]
    doubt = doubts(draft(write(table(rows))))["day or month first"]
    assert "2031-01-01" in doubt.taken + doubt.other  # both are said, whichever is taken
    assert "2031-12-01" in doubt.taken + doubt.other


def test_tokens_and_marks_that_only_stand_in_the_middle_are_found(write):
    rows = [f"{row},1,1" for row in days(HEAD_LINES + 600)]
    rows[HEAD_LINES + 100] = rows[HEAD_LINES + 100][:10] + ",-99.99,NaN,9,9"
    rows[HEAD_LINES + 101] = rows[HEAD_LINES + 101][:10] + ",28.5,1e35,4,3"
    drafted = draft(write(table(rows, header="time,T_1m,T_10m,Q_1m,Q_10m")))
    assert drafted.rows_quarantined == 0
    assert set(drafted.layout.missing) >= {"NaN", "-99.99"}
    assert drafted.layout.quality.flags == {"1": 1, "3": 3, "4": 4, "9": 9}
    assert any(float(token) > 9e34 for token in drafted.layout.missing if token not in {"", "NaN"})


def test_a_single_spike_is_no_missing_token(write):
    rows = days(40)
    rows[20] = rows[20][:10] + ",61.37,24.0"
    assert draft(write(table(rows))).layout.missing == ("",)


def test_a_word_that_comes_often_is_taken_with_a_doubt_and_a_rare_one_quarantined(write):
    rows = days(40)
    for place in (5, 6, 7, 8):
        rows[place] = rows[place][:10] + ",Umbau,24.0"
    rows[20] = rows[20][:10] + ",oops,24.0"
    drafted = draft(write(table(rows)))
    assert drafted.layout.missing == ("", "Umbau")
    assert "'Umbau'" in doubts(drafted)["missing token"].taken
    assert [line for _, _, line in drafted.reasons] == [22]


# --------------------------------------------------------------------------------------------------------------
# What is said


@pytest.mark.parametrize(
    ("header", "about", "word"),
    [
        ("time,T_1m,T_10m", "time zone", "does not state"),
        ("time_local,T_1m,T_10m", "time zone", "local"),
        ("time (EST),T_1m,T_10m", "time zone", "EST is a name of more than one zone"),
        ("time,T_1m,T_10m", "temperature scale", "does not state"),
        ("time,T_1m,T_10m", "mean or instantaneous", "does not state"),
        ("time,T_1,T_10", "units of depth", "does not state"),
        ("time,T_1m,T_10m", "units of temperature", "half of which are above"),
        ("time,T1,T2", "depths", "may be the numbers of the sensors"),
        ("time,P1.0 temp,P10.0 temp", "units of depth", "does not state"),
        ("time,T_1dbar,T_10dbar", "depths shown here", "latitude"),
    ],
)
def test_what_the_file_does_not_settle_is_said(write, header, about, word):
    assert word in doubts(draft(write(table(days(20), header=header))))[about].why


def test_zeros_far_from_all_readings_are_doubted_and_kept(write):
    rows = days(60)
    for place in range(10, 20):
        rows[place] = rows[place][:10] + ",0.00,24.0"
    drafted = draft(write(table(rows)))
    assert 'add "0" to missing' in doubts(drafted)["zeros"].other
    assert drafted.layout.missing == ("",)


def test_a_second_group_of_temperatures_is_named_as_the_runner_up(write):
    rows = [f"{row},{row[11:]}" for row in days(20)]
    drafted = draft(write(table(rows, header="time,Tlow_1m,Tlow_10m,Thigh_1m,Thigh_10m")))
    assert "Thigh" in str(doubts(drafted)["which columns are temperatures, and how deep"])


def test_means_that_are_stated_are_taken_and_their_stamp_doubted(write):
    drafted = draft(write("# daily means\n" + table(days(20))))
    assert drafted.layout.time.mean_hours == 24.0
    assert drafted.layout.time.stamp == "centre"
    assert "stamp of the means" in doubts(drafted)


# --------------------------------------------------------------------------------------------------------------
# What is refused


@pytest.mark.parametrize(
    ("content", "found"),
    [
        ("This is a letter.\nIt says: 3 moorings, and no more.\nBye.\n", "no layout"),
        ("time,T_1m,T_10m\n", "no layout"),
        (table(days(20), header="time,alpha,beta"), r"2 can be temperatures \('alpha', 'beta'\).*--depths"),
        ("a,b\n1,2\n3,4\n5,6\n", "none of which can be read as a time"),
        ("depth,2031-01-01,2031-01-02,2031-01-03\n1,28,28,28\n10,24,24,24\n50,20,20,20\n", "turn rows into columns"),
        ("\n\n \n", "blank lines only"),
    ],
)
def test_where_no_layout_fits_it_is_said_how_far_the_file_was_understood(write, content, found):
    with pytest.raises(DataError, match=f"(?s){found}"):
        draft(write(content))


def test_depths_that_are_given_complete_a_draft(write):
    drafted = draft(write(table(days(20), header="time,alpha,beta")), depths=[2.5, 7.0])
    assert [depth for depth, _ in drafted.first[0].readings] == [2.5, 7.0]
    with pytest.raises(DataError, match="and 3 were given"):
        draft(write(table(days(20), header="time,alpha,beta")), depths=[2.5, 7.0, 9.0])


@pytest.mark.parametrize("depths", [[-1.0, 5.0], [5.0, 5.0], [1e5]])
def test_depths_that_are_none_are_refused(write, depths):
    with pytest.raises(RequestError, match="no depths of sensors"):
        draft(write(table(days(20))), depths=depths)


def test_other_files_are_refused_by_what_they_are(write, tmp_path):
    with pytest.raises(RequestError, match="no such file"):
        draft(tmp_path / "absent.csv")
    with pytest.raises(DataError, match="binary"):
        draft(write(bytes(range(32)) * 200))
    with pytest.raises(DataError, match="damaged"):
        draft(write(gzip.compress(table(days(20)).encode())[:-20]))
    book = io.BytesIO()
    with zipfile.ZipFile(book, "w") as archive:
        archive.writestr("[Content_Types].xml", "<Types/>")
        archive.writestr("sheet1.xml", "<sheet/>")
    with pytest.raises(DataError, match="workbook"):
        draft(write(book.getvalue()))


def test_netcdf_needs_no_more_than_its_kind(write_netcdf):
    drafted = draft(write_netcdf())
    assert dict(drafted.proposal.content) == {"kind": "netcdf"}
    assert (drafted.rows_read, drafted.rows_kept) == (3, 3)


def test_netcdf_without_standard_names_gets_the_names_that_look_right(write_netcdf):
    def strip(file):
        for name in ("TIME", "DEPTH", "TEMP"):
            file[name].delncattr("standard_name")

    drafted = draft(write_netcdf(strip))
    assert drafted.proposal.content["variables"] == {"temperature": "TEMP", "time": "TIME", "depth": "DEPTH"}
    assert "names of the variables" in doubts(drafted)


def damaged(content, chance):
    """Return a file with a few bytes cut, doubled or replaced, or its lines shuffled or cut off."""
    data = bytearray(content)
    for _ in range(chance.choice([1, 2, 5])):
        place, what = chance.randrange(len(data) + 1), chance.randrange(6)
        if what == 0:
            del data[place : place + chance.randrange(40)]
        elif what == 1:
            data[place:place] = data[place : place + 30]
        elif what == 2:
            data[place:place] = chance.choice(
                [b"\0", b'"', b"\r", b"1e999", b"--3", b",,,", b"{depth}", b"x" * 9000, b"\xff"]
            )
        elif what == 3:
            data = data[:place]
        elif what == 4:
            lines = bytes(data).split(b"\n")
            chance.shuffle(lines)
            data = bytearray(b"\n".join(lines))
        else:
            data = bytearray(
                bytes(data).replace(chance.choice([b",", b" ", b"-", b"2"]), chance.choice([b";", b"", b"9"]))
            )
    return bytes(data)


@pytest.mark.parametrize("seed", range(40))
def test_damage_ends_in_a_draft_with_an_account_or_in_an_error_that_explains(write, seed):
    chance = random.Random(seed)
    path = write(damaged(table(days(30)).encode(), chance))
    try:
        drafted = draft(path)
    except ThermotiltError as error:
        code, message, lost = error.exit_code, str(error), 0
    else:
        code, message = 0, str(path)
        lost = drafted.rows_read - drafted.rows_kept - drafted.rows_quarantined
    assert (code in {0, 2, 3}, str(path) in message, lost) == (True, True, 0)


# --------------------------------------------------------------------------------------------------------------
# The detectors alone


def test_the_sample_is_the_beginning_and_the_end(write):
    sample = take_sample(write("".join(f"{line}\n\n" for line in range(HEAD_LINES + 1000))))
    assert (sample.count, len(sample.head), len(sample.tail)) == (2 * (HEAD_LINES + 1000), HEAD_LINES, TAIL_LINES)
    # every second line is blank: line n of the text has the number 2n + 1
    assert (sample.head[-1].number, sample.tail[-1].number) == (2 * HEAD_LINES - 1, 2 * (HEAD_LINES + 1000) - 1)


@pytest.mark.parametrize(
    ("head", "encoding"),
    [
        (b"\xef\xbb\xbfa", "utf-8"),
        ("a,b".encode("utf-16"), "utf-16"),
        ("time,T1\n2031".encode("utf-16-le"), "utf-16-le"),
        ("time,T1\n2031".encode("utf-16-be"), "utf-16-be"),
        (b"time", None),
    ],
)
def test_marks_of_encodings(head, encoding):
    assert marked(head) == encoding


@pytest.mark.parametrize(
    ("text", "encoding"),
    [
        ("Temp (°C) naïve".encode(), "utf-8"),
        ("Temp (°C)".encode("latin-1"), "latin-1"),
        ("Temp (°C) – “x”".encode("cp1252"), "cp1252"),
        ("Temp (°C)".encode("cp850"), "cp850"),
        ("Temp (°C)".encode("mac-roman"), "mac-roman"),
        ("année".encode("latin-1"), "latin-1"),
        ("°C °C °C".encode() + b"\xff", "utf-8"),  # one damaged byte among good characters
    ],
)
def test_encodings_without_a_mark(text, encoding):
    foreign = Bytes()
    foreign.add(text)
    assert foreign.encoding()[0] == encoding


@pytest.mark.parametrize(
    ("cell", "decimal", "sort"),
    [
        ("-1.5e3", ".", "number"),
        ("1,5", ",", "number"),
        ("1,5", ".", "odd"),
        ("", ".", "missing"),
        ("---", ".", "missing"),
        ("2031-01-01 00:00", ".", "stamp"),
        ("13:45:00", ".", "stamp"),
        ("1.2.2031", ".", "stamp"),
        ("12.5 13.5", ".", "odd"),
        ("Jan 3, 2031", ".", "stamp"),
        ("deg C", ".", "word"),
        ("a;b", ".", "odd"),
    ],
)
def test_sorts_of_cells(cell, decimal, sort):
    assert sort_of(cell, decimal) == sort


@pytest.mark.parametrize(
    ("stamp", "formats"),
    [
        ("2031-01-02T03:04:05Z", ["iso8601", "%Y-%m-%dT%H:%M:%S%z"]),
        ("01/02/2031 13:45", ["%d/%m/%Y %H:%M", "%m/%d/%Y %H:%M"]),
        ("31-01-02", ["%y-%m-%d", "%d-%m-%y", "%m-%d-%y"]),
        ("2 January 2031 3:04 PM", ["%d %B %Y %I:%M %p"]),
        ("2031-001 03:04", ["%Y-%j %H:%M"]),
        ("20310102 0304", ["%Y%m%d %H%M", "%d%m%Y %H%M", "%m%d%Y %H%M"]),
        ("12.34", []),
        ("Temp 12.5m", []),
    ],
)
def test_formats_of_stamps(stamp, formats):
    assert formats_of(stamp) == formats


def test_fixed_places_are_told_from_numbers_that_touch():
    # 1234567890123456789012
    texts = ["2031-01-01  9.50-99.99", "2031-01-02 10.25  9.75", "2031-01-03-99.99 10.00"]
    assert find_places(texts, ".") == [(1, 10), (11, 16), (17, 22)]


def test_lines_that_count_are_told_from_columns_that_happen_to():
    profiles = [
        ["2031-01-01", "2"],
        ["1.0", "28.1"],
        ["5.0", "27.1"],
        ["2031-01-02", "1"],
        ["1.0", "28.0"],
        ["2031-01-03", "2"],
        ["1.0", "28.1"],
        ["9.0", "26.1"],
    ]
    walk = best_walk(profiles, ".", is_whole=True)
    assert (walk.heads, walk.count) == ((0, 3, 5), 1)
    numbered = [[f"2031-01-{day:02d}", str(day), f"{28 - day / 10}"] for day in range(1, 29)]
    assert best_walk(numbered, ".", is_whole=True) is None


@pytest.mark.parametrize(
    ("text", "count", "stands"),
    [
        ("-9.99", 1, True),
        ("-99.990", 1, True),
        ("1e35", 1, True),
        ("99.9", 1, True),
        ("-999", 1, True),
        ("61.37", 1, False),
        ("61.37", 5, True),
        ("-9", 1, False),
    ],
)
def test_numbers_that_stand_for_no_reading(text, count, stands):
    assert stands_for_missing(text, count) is stands


def test_words_speak_for_or_against_a_temperature():
    for_it = ["wt_", "Temp", "WaterTemp_C", "T@m", "Temperatura (°C)", "thermistor", "degC"]
    against = ["Sal_", "AirTemp_C", "Temp_QC", "DO_mg", "Batt_V", "Temp_Std", "Depth", "Record"]
    assert min(temperature_worth(text) for text in for_it) > max(temperature_worth(text) for text in against)


@pytest.mark.parametrize(
    ("text", "units"),
    [
        ("Deg C", "degree_Celsius"),
        ("Temp (°F)", "degree_Fahrenheit"),
        ("K", "kelvin"),
        ("T [K]", "kelvin"),
        ("Volts", None),
        ("Temp", None),
    ],
)
def test_units_that_are_stated(text, units):
    assert temperature_units(text) == units
