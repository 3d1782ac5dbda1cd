"""Wide and long text through the readers."""

import gzip

import numpy as np
import pytest

from profiles.errors import DataError, MachineError, RequestError, ThermotiltError
from profiles.ingest import read, read_delivery, source
from profiles.ingest.record import Tally


def reasons(delivery):
    return dict(zip(delivery.quarantine["line"], delivery.quarantine["reason"], strict=True))


# ------------------------------------------------------------------------------------------------------------
# What is read


def test_a_wide_table_becomes_a_chain(write, wide):
    path = write("# note\n\ndate,T_25m,T_1m\n2031-01-02,20.5,29.5\n2031-01-01,-9.999,29\n")
    chain = read_delivery(path, wide, mooring="TB-01", latitude=2.5, longitude=-155.0)
    assert chain["temperature"].dims == ("time", "depth")
    np.testing.assert_array_equal(chain["time"], np.array(["2031-01-01", "2031-01-02"], "datetime64[ns]"))
    np.testing.assert_array_equal(chain["depth"], np.float32([1.0, 25.0]))
    np.testing.assert_array_equal(chain["temperature"], np.float32([[29.0, np.nan], [29.5, 20.5]]))
    assert chain["temperature"].dtype == np.float32
    np.testing.assert_array_equal(chain["temperature_uncertainty"], np.float32([0.02, 0.02]))
    np.testing.assert_array_equal(chain["deployment"], [1, 1])
    assert (chain["mooring"].item(), chain["latitude"].item(), chain["longitude"].item()) == ("TB-01", 2.5, 205.0)
    assert (chain.attrs["rows_read"], chain.attrs["rows_kept"], chain.attrs["rows_quarantined"]) == (2, 2, 0)
    assert chain["temperature"].attrs["reference_scale"] == "ITS-90"


def test_a_long_table_becomes_a_chain(write, long):
    path = write("time,depth,temp\n2031-01-01,25,20.5\n2031-01-01,1,29.5\n2031-01-02,1,NA\n")
    delivery = read(path, long)
    np.testing.assert_array_equal(delivery.chain["depth"], np.float32([1.0, 25.0]))
    # the second day has only a missing reading
    np.testing.assert_array_equal(delivery.chain["temperature"], np.float32([[29.5, 20.5], [np.nan, np.nan]]))
    assert (delivery.rows_read, delivery.rows_kept, delivery.rows_quarantined) == (3, 3, 0)
    assert delivery.chain["mooring"].item() == "delivery"
    assert "latitude" not in delivery.chain.coords


def test_gzip_is_told_by_content_not_by_name(write, wide):
    text = b"date,T_1m\n2031-01-01,29\n"
    plain, packed = write(text, "a.csv.gz"), write(gzip.compress(text), "b.csv")
    assert read_delivery(plain, wide, mooring="M").identical(read_delivery(packed, wide, mooring="M"))


def test_rows_out_of_order_are_sorted_and_counted(write, wide):
    # 3rd, 1st, 2nd, 4th: two rows are earlier than one before them
    path = write("date,T_1m\n" + "".join(f"2031-01-0{day},{day}\n" for day in (3, 1, 2, 4)))
    delivery = read(path, wide)
    np.testing.assert_array_equal(delivery.chain["temperature"][:, 0], [1, 2, 3, 4])
    assert (delivery.rows_reordered, delivery.rows_quarantined) == (2, 0)


def test_kelvin_and_ipts_68_are_converted_kelvin_first(write, layout_of, wide):
    layout = wide.model_copy(
        update={"temperature": wide.temperature.model_copy(update={"units": "kelvin", "scale": "IPTS-68"})}
    )
    chain = read_delivery(write("date,T_1m\n2031-01-01,293.15\n2031-01-02,-9.999\n"), layout)
    # 293.15 K = 20 °C on IPTS-68; t90 = 0.99976 * 20 = 19.9952 °C
    np.testing.assert_allclose(chain["temperature"][:, 0], [19.9952, np.nan], rtol=1e-6)
    np.testing.assert_allclose(chain["temperature_raw"][:, 0], [20.0, np.nan], rtol=1e-6)
    assert chain["temperature_raw"].attrs["reference_scale"] == "IPTS-68"


def test_heights_in_feet_become_depths(write, layout_of):
    layout = layout_of(
        'kind = "wide"\n[time]\ncolumn = "t"\n[depth]\npattern = "h{depth}"\nunits = "international_foot"\n'
        'positive = "up"\n'
    )
    chain = read_delivery(write("t,h-10,h-100.5\n2031-01-01,1,2\n"), layout)
    np.testing.assert_allclose(chain["depth"], [3.048, 30.6324], rtol=1e-6)  # 1 ft = 0.3048 m


def test_a_file_without_header_split_by_blanks_is_read(write, layout_of):
    layout = layout_of(
        'kind = "wide"\ndelimiter = "whitespace"\nheader_rows = 0\nnames = ["d", "c", "a", "b"]\n'
        '[time]\ncolumns = ["d", "c"]\nformat = "%d/%m/%Y %H:%M"\n[depth]\ncolumns = { b = 5, a = 2.5 }\n'
    )
    chain = read_delivery(write(" 31/01/2031  06:00   1.0 2.0\r\n"), layout)
    assert chain["time"].values[0] == np.datetime64("2031-01-31T06:00")
    np.testing.assert_array_equal(chain["temperature"], [[1.0, 2.0]])
    np.testing.assert_array_equal(chain["depth"], [2.5, 5.0])


def test_names_may_stand_in_another_header_row(write, wide):
    layout = wide.model_copy(update={"header_rows": 3, "names_row": 2})
    chain = read_delivery(write("some title\ndate,T_1m\nd,degC\n2031-01-01,29\n"), layout)
    assert chain.attrs["rows_read"] == 1


def test_depths_in_names_may_have_decimal_commas(write, wide):
    layout = wide.model_copy(update={"delimiter": ";", "decimal": ","})
    chain = read_delivery(write("date;T_2,5m\n2031-01-01;29,5\n"), layout)
    assert (chain["depth"].item(), chain["temperature"].item()) == (2.5, 29.5)


def test_a_byte_order_mark_and_quotes_are_read_through(write, wide):
    chain = read_delivery(write(b'\xef\xbb\xbf"date","T_1m"\n"2031-01-01","29"\n'), wide)
    assert chain["temperature"].item() == 29.0


def test_other_encodings_are_read(write, wide):
    content = "date,T_1m,Größe\n2031-01-01,29,ß\n"
    for encoding in ("latin-1", "utf-16"):
        layout = wide.model_copy(update={"encoding": encoding})
        assert read(write(content.encode(encoding)), layout).rows_quarantined == 0


def test_blocks_do_not_change_the_result(write, wide, long, monkeypatch):
    wide_path = write("date,T_1m\n" + "".join(f"2031-01-{day:02},{day}\n" for day in range(1, 20)) + "bad\n", "w")
    long_path = write("time,depth,temp\n" + "".join(f"2031-01-{d:02},1,{d}\n" for d in (5, 3, 5, 4)), "l")
    whole = [read(wide_path, wide), read(long_path, long)]
    monkeypatch.setattr(source, "BLOCK_BYTES", 7)
    for one, other in zip(whole, [read(wide_path, wide), read(long_path, long)], strict=True):
        assert one.chain.identical(other.chain)
        assert one.quarantine.equals(other.quarantine)


# ------------------------------------------------------------------------------------------------------------
# What goes to quarantine


def test_rows_that_make_no_sense_are_quarantined_whole(write, wide):
    path = write(
        b"date,T_1m,T_10m\n"
        b"2031-01-01,1,2\n"
        b"2031-01-02,1\n"  # 3
        b"2031-01-03,1,2,3\n"  # 4
        b"31-01-04,1,2\n"  # 5
        b"2031-01-05,x,2\n"  # 6
        b"2031-01-06,1,1e999\n"  # 7
        b"2031-01-07,1\x00,2\n"  # 8
        b"2031-01-08,\xff1,2\n"  # 9
        b'2031-01-09,"1,2\n'  # 10
        b"2031-01-01,3,4\n"  # 11
        b"# a comment\n\n"
        b"2031-01-12,,2\n"  # 14
        b"2031-01-13,3,4\n"
        b"not a time,x,y\n"
    )
    delivery = read(path, wide)
    assert reasons(delivery) == {
        3: "2 cells where there are 3 columns",
        4: "4 cells where there are 3 columns",
        5: "the time cannot be read",
        6: "column 'T_1m': 'x' is neither a number nor a missing token",
        7: "column 'T_10m': '1e999' is beyond any number that can be stored",
        8: "the row holds a NUL byte",
        9: "the row holds bytes that are not utf-8-sig",
        10: "the quotes do not pair",
        11: "the time is that of line 2",
        16: "the time cannot be read",
        14: "column 'T_1m': '' is neither a number nor a missing token",
    }
    assert (delivery.rows_read, delivery.rows_kept, delivery.rows_quarantined) == (13, 2, 11)
    np.testing.assert_array_equal(delivery.chain["temperature"], [[1, 2], [3, 4]])
    assert set(delivery.quarantine["file"]) == {str(path)}
    texts = dict(zip(delivery.quarantine["line"], delivery.quarantine["text"], strict=True))
    assert (texts[8], texts[9], texts[11]) == ("2031-01-07,1\\x00,2", "2031-01-08,\\xff1,2", "2031-01-01,3,4")


def test_long_rows_that_make_no_sense_are_quarantined(write, long):
    layout = long.model_copy(
        update={"station": "id", "depth": long.depth.model_copy(update={"values": (1.0, 10.0, 50.0)})}
    )
    path = write(
        "id,time,depth,temp\n"
        "A,2031-01-01,1,29\n"
        "A,2031-01-01,1,28\n"  # 3
        "A,2031-01-01,11,28\n"  # 4
        "A,2031-01-01,-1,28\n"  # 5
        "A,2031-01-01,NA,28\n"  # 6
        "B,2031-01-01,10,28\n"  # 7
        "A,2031-01-01,10,28\n"
    )
    delivery = read(path, layout)
    assert reasons(delivery) == {
        3: "time and depth are those of line 2",
        4: "the depth is not among those that the layout declares",
        5: "the depth is not between 0 and 12000 m",
        6: "the depth is missing",
        7: "the station is not 'A', of which this file has most rows",
    }
    # a declared sensor without any row stays, empty
    np.testing.assert_array_equal(delivery.chain["temperature"], [[29, 28, np.nan]])
    assert delivery.chain["mooring"].item() == "A"


def test_quarantined_text_is_cut(write, wide):
    delivery = read(write("date,T_1m\n2031-01-01,1\n" + "y" * 5000 + "\n"), wide)
    assert delivery.quarantine["text"].item() == "y" * 200


def test_a_repeat_of_a_quarantined_row_is_kept(write, wide):
    delivery = read(write("date,T_1m\n2031-01-01,x\n2031-01-01,5\n"), wide)
    assert reasons(delivery).keys() == {2}
    assert delivery.chain["temperature"].item() == 5.0


def test_lost_rows_are_a_fault_of_ours():
    tally = Tally(rows_read=3, rows_kept=1)
    tally.reject([2], ["reason"], ["text"])
    with pytest.raises(
        ThermotiltError, match=r"rows were lost.*expected 3 rows; found 1 kept and 1 quarantined"
    ) as caught:
        tally.settle("file")
    assert caught.value.exit_code == 70


# ------------------------------------------------------------------------------------------------------------
# What cannot be read


def test_a_missing_file_names_its_neighbour(write, wide):
    path = write("date,T_1m\n", "mooring_07.csv")
    with pytest.raises(RequestError, match=r"no such file; expected a delivery; .*'mooring_07.csv'\?"):
        read(path.with_name("mooring_7.csv"), wide)


def test_a_folder_is_no_file(tmp_path, wide):
    with pytest.raises(RequestError, match="is a folder; expected a file"):
        read(tmp_path, wide)


def test_a_file_that_may_not_be_read_is_the_machines_fault(write, wide, monkeypatch):
    path = write("date,T_1m\n2031-01-01,1\n")

    def refuse(*_args, **_options):
        raise PermissionError(13, "Permission denied")

    monkeypatch.setattr(type(path), "open", refuse)
    with pytest.raises(MachineError, match="cannot be read; found Permission denied"):
        read(path, wide)


@pytest.mark.parametrize(
    ("content", "message"),
    [
        (b"", "the file is empty; expected a delivery; found 0 bytes"),
        (gzip.compress(b""), "the file is empty; expected text"),
        (b"# only\n# comments\n", "the file ends before its header does; expected 1 header rows; found 0"),
        (b"date,T_1m\n", "there are no data rows"),
        (bytes(range(256)) * 20, "is a binary file; expected text"),
        (b"\x89HDF\r\n\x1a\n" + bytes(4000), r"is a binary file.*kind = \"netcdf\""),
        (gzip.compress(b"date,T_1m\n" * 99)[:-12], "the compressed file is damaged"),
        (b"date,depth\n2031-01-01,1\n", r"no column matches the pattern.*expected columns like 'T_100m'.*'depth'"),
        (b"dates,T_1m\n2031-01-01,1\n", r"the time column is missing; expected a column 'date'.*mean 'dates'\?"),
        (b"date,T_1m,T_1m\n2031-01-01,1,2\n", "there are 2 columns of this name"),
        (b"date,T_1m,T_1.0m\n2031-01-01,1,2\n", r"a sensor depth appears twice.*1 m in column 'T_1m' and in column"),
        (b"date,T_-1m\n2031-01-01,1\n", r"column 'T_-1m': this is no depth below the surface.*found -1 m.*positive"),
        (
            b"date,T_1m\nx,1\n2031-01-01,y\nz,1\nz,1\n",
            "no row could be understood; found line 2: the time.*line 3: .*'y'",
        ),
    ],
)
def test_a_file_that_is_not_what_the_layout_says_is_refused(write, wide, content, message):
    path = write(content)
    with pytest.raises(DataError, match=f"(?s)delivery.csv.*{message}"):
        read(path, wide)


def test_a_declared_column_that_is_missing_names_the_nearest(write, layout_of, long):
    wide = layout_of('kind = "wide"\n[time]\ncolumn = "date"\n[depth]\ncolumns = { upper = 1.0 }\n')
    with pytest.raises(DataError, match=r"the temperature column is missing; expected a column 'upper'.*'uper'\?"):
        read(write("date,uper\n2031-01-01,1\n"), wide)
    with pytest.raises(DataError, match=r"the depth column is missing; expected a column 'depth'.*'Depth'\?"):
        read(write("time,Depth,temp\n2031-01-01,1,2\n"), long)


def test_a_wrong_encoding_is_told(write, wide):
    layout = wide.model_copy(update={"encoding": "utf-16"})
    with pytest.raises(DataError, match="not in the layout's encoding; expected utf-16"):
        read(write("date,T_1m\n2031-01-01,1\n"), layout)


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        ({"latitude": 95.0}, "latitude: no latitude; expected -90 to 90 degrees north; found 95"),
        ({"latitude": float("nan")}, "latitude: no latitude"),
        ({"longitude": 361.0}, "longitude: no longitude"),
        ({"sensor_accuracy": 0.0}, "sensor_accuracy: no accuracy"),
    ],
)
def test_impossible_arguments_are_refused(write, wide, arguments, message):
    with pytest.raises(RequestError, match=message):
        read(write("date,T_1m\n2031-01-01,1\n"), wide, **arguments)
