"""NetCDF files through the reader."""

import gzip
from pathlib import Path

import numpy as np
import pytest

from profiles.errors import DataError, RequestError
from profiles.ingest import read, read_delivery
from profiles.ingest.layout import NetcdfLayout
from profiles.vocabulary import FLAG_TO_OCEANSITES, OCEANSITES_TO_FLAG, Flag

PLAIN = NetcdfLayout(kind="netcdf")
NOON = np.array(["2031-01-01T12:00", "2031-01-02T12:00", "2031-01-03T12:00"], "datetime64[ns]")
# days since 1950-01-01 of 2031-01-01: 81 years of 365 days and 20 leap days (1952 to 2028) = 29585


def test_a_file_becomes_a_chain(write_netcdf):
    chain = read_delivery(write_netcdf(), PLAIN, mooring="TB-01")
    np.testing.assert_array_equal(chain["time"], NOON)
    np.testing.assert_array_equal(chain["depth"], np.float32([1.0, 10.0]))
    # written as 20, 21 | 22, 23 | 24, 25 with 10 m first
    np.testing.assert_array_equal(chain["temperature"], [[21, 20], [23, 22], [25, 24]])
    assert (chain["latitude"].item(), chain["longitude"].item()) == (0.0, 205.0)
    np.testing.assert_array_equal(chain["temperature_delivered_qc"], np.ones((3, 2)))
    assert chain["temperature_delivered_qc"].dtype == np.int8


def test_the_example_layout_reads_it_alike(write_netcdf):
    example = Path(__file__).parents[2] / "config" / "layouts" / "frigate_netcdf.toml"
    path = write_netcdf()
    assert read_delivery(path, example).identical(read_delivery(path, PLAIN))


def test_classic_files_are_read(write_netcdf):
    assert read(write_netcdf(file_format="NETCDF3_CLASSIC"), PLAIN).rows_kept == 3


def test_delivered_flags_go_through_the_published_table(write_netcdf):
    # OceanSITES Data Format Reference Manual 1.4, reference table 2: 0 unknown, 2 probably good, 3 potentially
    # correctable, 8 interpolated; a fill value says nothing, so 2 beside a value and 9 beside none
    def change(file):
        file["TEMP_QC"][:] = np.ma.masked_equal([[2, 0], [8, 3], [-128, -128]], -128)
        file["TEMP"][2, 0] = np.ma.masked

    chain = read_delivery(write_netcdf(change), PLAIN)
    np.testing.assert_array_equal(chain["temperature_delivered_qc"], [[2, 1], [3, 3], [2, 9]])
    assert np.isnan(chain["temperature"][2, 1])


def test_our_flags_survive_the_way_out_and_back():
    for flag in Flag:
        assert OCEANSITES_TO_FLAG[FLAG_TO_OCEANSITES[flag]] == flag


def test_a_flag_of_no_table_sends_its_time_step_to_quarantine_unless_the_layout_knows_it(write_netcdf):
    def change(file):
        file["TEMP_QC"][1, 0] = 5

    path = write_netcdf(change)
    delivery = read(path, PLAIN)
    entry = delivery.quarantine.iloc[0]
    assert (entry["line"], entry["text"]) == (2, "time step 2: 2031-01-02T12:00:00.000")
    assert "the flag 5 is in no table" in entry["reason"]
    known = read(path, PLAIN.model_copy(update={"flags": {"5": 3}}))
    assert known.rows_quarantined == 0
    assert known.chain["temperature_delivered_qc"].values[1, 1] == Flag.QUESTIONABLE


def test_time_steps_that_make_no_sense_are_quarantined(write_netcdf):
    def change(file):
        file["TIME"][2] = np.ma.masked
        file["TEMP"][3, 1] = np.inf

    delivery = read(write_netcdf(change, days=(29586.5, 29585.5, 0, 29587.5, 29586.5)), PLAIN)
    assert dict(zip(delivery.quarantine["line"], delivery.quarantine["reason"], strict=True)) == {
        3: "the time is missing",
        4: "a temperature is infinite",
        5: "the time is that of time step 1",
    }
    assert (delivery.rows_read, delivery.rows_kept, delivery.rows_reordered) == (5, 2, 1)
    np.testing.assert_array_equal(delivery.chain["time"], NOON[:2])


def test_ten_minute_stamps_in_days_come_out_on_the_minute(write_netcdf):
    # 1/144 day is no binary fraction; a float64 of 29585 days resolves 0.3 microseconds
    chain = read_delivery(write_netcdf(days=29585 + np.arange(1000) / 144), PLAIN)
    expected = np.datetime64("2031-01-01", "ns") + np.arange(1000) * np.timedelta64(10, "m")
    np.testing.assert_array_equal(chain["time"], expected)


def test_stamps_a_microsecond_off_come_out_on_the_second(write_netcdf):
    # from 1800, 2031-01-01 is 84371 days: 231 years of 365 days and 56 leap days (57 from 1804 to 2028, less 1900)
    seconds = 613 * np.arange(1000)
    path = write_netcdf(attribute("TIME", "units", "days since 1800-01-01"), days=84371 + seconds / 86400)
    expected = np.datetime64("2031-01-01", "ns") + seconds.astype("timedelta64[s]")
    np.testing.assert_array_equal(read_delivery(path, PLAIN)["time"], expected)


def test_units_sign_and_scale_come_from_the_file(write_netcdf):
    def change(file):
        file["TEMP"].units, file["TEMP"].reference_scale = "kelvin", "IPTS-68"
        file["TEMP"][:] = 293.15
        file["DEPTH"].positive = "up"
        file["DEPTH"][:] = [-10, -1]

    chain = read_delivery(write_netcdf(change), PLAIN)
    np.testing.assert_allclose(chain["temperature"], 19.9952, rtol=1e-6)  # 0.99976 * 20
    np.testing.assert_array_equal(chain["depth"], [1, 10])
    assert chain["temperature_raw"].attrs["reference_scale"] == "IPTS-68"


def test_four_dimensions_and_one_sensor_are_read(write_netcdf):
    def add(file):
        file.createDimension("NORTH", 1)
        file.createDimension("EAST", 1)
        file.createVariable("SST", "f4", ("TIME", "DEPTH", "NORTH", "EAST"))[:] = 25.0
        file["SST"].units = "degree_Celsius"
        file.createVariable("SURFACE", "f4", ("TIME",))[:] = 26.0
        file["SURFACE"].units = "degree_Celsius"
        file.createVariable("NEAR", "f4", ())[...] = 1.5
        file["NEAR"].setncatts({"units": "m", "positive": "down"})

    path = write_netcdf(add)
    wide = PLAIN.model_copy(update={"variables": PLAIN.variables.model_copy(update={"temperature": "SST"})})
    assert read_delivery(path, wide)["temperature"].shape == (3, 2)
    names = PLAIN.variables.model_copy(update={"temperature": "SURFACE", "depth": "NEAR"})
    one = read_delivery(path, PLAIN.model_copy(update={"variables": names}))
    np.testing.assert_array_equal(one["temperature"], [[26.0]] * 3)
    np.testing.assert_array_equal(one["depth"], [1.5])


def test_an_argument_wins_over_the_files_position_when_they_agree(write_netcdf):
    chain = read_delivery(write_netcdf(), PLAIN, latitude=0.1, longitude=205.2)
    assert (chain["latitude"].item(), chain["longitude"].item()) == (0.1, 205.2)


def test_a_file_of_another_place_is_refused(write_netcdf):
    path = write_netcdf()
    with pytest.raises(DataError, match=r"of another latitude; expected 0.3 degrees, within 0.25; found 0 degrees"):
        read(path, PLAIN, latitude=0.3)
    with pytest.raises(DataError, match=r"of another longitude; expected 155 degrees.*found -155 degrees"):
        read(path, PLAIN, longitude=155.0)


def test_a_mooring_at_the_prime_meridian_keeps_together(write_netcdf):
    def change(file):
        file.renameVariable("LONGITUDE", "OLD")
        file["OLD"].standard_name = "old"
        file.createVariable("LONGITUDE", "f8", ("TIME",))[:] = [359.9, 0.1, 359.95]
        file["LONGITUDE"].standard_name = "longitude"

    # about 359.9 the three are 0, +0.2 and +0.05 degrees; the median is +0.05
    chain = read_delivery(write_netcdf(change), PLAIN, latitude=0.0)
    np.testing.assert_allclose(chain["longitude"], 359.95)


def attribute(variable, name, value):
    return lambda file: file[variable].setncattr(name, value)


@pytest.mark.parametrize(
    ("change", "message"),
    [
        (attribute("TEMP", "units", "bogus"), r"TEMP:units: unknown units: 'bogus'"),
        (attribute("DEPTH", "units", "kelvin"), r"DEPTH:units: unknown units: 'kelvin'"),
        (attribute("TEMP", "standard_name", "other"), r"no variable is the temperature; expected.*'TEMP'"),
        (attribute("LATITUDE", "standard_name", "sea_water_temperature"), "several variables could be the temp"),
        (attribute("TIME", "standard_name", "other"), "TEMP has no time coordinate"),
        (attribute("TIME", "units", "days"), "TIME holds no times"),
        (attribute("TIME", "calendar", "360_day"), "TIME holds no times.*'360_day'"),
        (attribute("TEMP", "reference_scale", "ITS-27"), "unknown temperature scale.*found ITS-27"),
        (lambda file: file["DEPTH"].__setitem__(slice(None), 5.0), r"a sensor depth appears twice.*DEPTH\[0\]"),
        (lambda file: file["LATITUDE"].__setitem__(..., 95.0), "no latitude; expected -90 to 90 degrees; found 95"),
    ],
)
def test_a_file_without_what_is_needed_is_refused(write_netcdf, change, message):
    with pytest.raises(DataError, match=f"(?s)delivery.nc.*{message}"):
        read(write_netcdf(change), PLAIN)


def test_file_and_layout_must_agree_on_the_scale(write_netcdf):
    layout = PLAIN.model_copy(update={"temperature": PLAIN.temperature.model_copy(update={"scale": "IPTS-68"})})
    path = write_netcdf(attribute("TEMP", "reference_scale", "ITS-90"))
    with pytest.raises(DataError, match="disagree on the temperature scale; expected IPTS-68"):
        read(path, layout)
    assert read_delivery(write_netcdf(), layout)["temperature_raw"].attrs["reference_scale"] == "IPTS-68"


def test_a_declared_variable_that_is_missing_names_the_nearest(write_netcdf):
    layout = PLAIN.model_copy(update={"variables": PLAIN.variables.model_copy(update={"temperature": "TEMPS"})})
    with pytest.raises(DataError, match=r"the temperature variable is missing; expected a variable 'TEMPS'.*'TEMP'\?"):
        read(write_netcdf(), layout)


@pytest.mark.parametrize("share", [0.2, 0.6, 0.99])
@pytest.mark.parametrize("file_format", ["NETCDF4", "NETCDF3_CLASSIC", "NETCDF3_64BIT_OFFSET"])
def test_a_truncated_file_is_refused(write_netcdf, file_format, share):
    path = write_netcdf(file_format=file_format, days=29585 + np.arange(500))
    content = path.read_bytes()
    path.write_bytes(content[: int(share * len(content))])
    with pytest.raises(DataError, match=r"delivery.nc: is (damaged|cut short).*fetch the file again|fetch it again"):
        read(path, PLAIN)


@pytest.mark.parametrize(
    ("content", "message"),
    [
        (b"", "the file is empty"),
        (b"date,T_1m\n2031-01-01,29\n", 'is no NetCDF file.*found it begins with .*kind = "wide"'),
        (gzip.compress(b"CDF\x01"), "is compressed; expected a NetCDF file; found gzip"),
        (b"CDF\x05" + bytes(100), "64-bit data.*nccopy"),
    ],
)
def test_what_is_no_netcdf_file_is_refused(write, content, message):
    with pytest.raises(DataError, match=message):
        read(write(content, "delivery.nc"), PLAIN)


def test_a_missing_file_is_a_wrong_request(tmp_path):
    with pytest.raises(RequestError, match="no such file"):
        read(tmp_path / "none.nc", PLAIN)


def test_a_file_without_time_steps_is_refused(write_netcdf):
    with pytest.raises(DataError, match="there are no data rows"):
        read(write_netcdf(days=()), PLAIN)
