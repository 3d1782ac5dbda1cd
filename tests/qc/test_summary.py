from __future__ import annotations

import numpy as np
import pandas as pd
import pytest

from profiles.config import QualityControlSettings
from profiles.errors import DataError
from profiles.qc import data_return, fault_list, gap_list, quality_control
from profiles.vocabulary import TEST_BITS


def day(number: int) -> pd.Timestamp:
    return pd.Timestamp("2031-01-01") + pd.Timedelta(number, "D")


def with_flags(chain, flags, **masks):
    """Give a chain flags by hand; ``masks`` are of questionable and bad, by test name."""
    flags = np.asarray(flags, dtype=np.int8).reshape(chain["temperature"].shape)
    bits = {
        kind: sum(
            (np.asarray(masks.get(f"{kind}_{name}", 0)) != 0) * np.uint32(1 << bit) for name, bit in TEST_BITS.items()
        )
        for kind in ("questionable", "bad")
    }
    fields = {"temperature_qc": flags} | {
        f"temperature_qc_{kind}": np.zeros(flags.shape, np.uint32) + np.reshape(mask, (-1, 1)).astype(np.uint32)
        for kind, mask in bits.items()
    }
    return chain.assign({name: (("time", "depth"), values) for name, values in fields.items()})


def test_data_return_counts_each_flag_and_the_samples_that_never_came(make_chain):
    # Ten days of which days 4 and 5 never came: 8 samples, 10 expected.
    chain = make_chain(np.full((10, 2), 20.0)).isel(time=[0, 1, 2, 3, 6, 7, 8, 9])
    flags = np.column_stack([[1, 1, 2, 3, 4, 4, 9, 1], [9] * 8])
    table = data_return(with_flags(chain, flags))
    first, second = table.to_dict("records")
    # Usable: three good and one not evaluated of ten.
    assert first == {
        "mooring": "TB-01", "depth": 1.0, "samples": 8, "expected": 10, "good": 3, "not_evaluated": 1,
        "questionable": 1, "bad": 2, "missing": 1, "return_share": 0.4,
    }  # fmt: skip
    assert (second["missing"], second["return_share"]) == (8, 0.0)


def test_data_return_accounts_for_every_sample(make_chain):
    draw = np.random.default_rng(7)
    temperature = np.where(draw.random((200, 4)) < 0.2, np.nan, 10 + 20 * draw.random((200, 4)))
    table = data_return(quality_control(make_chain(temperature)))
    flags = table[["good", "not_evaluated", "questionable", "bad", "missing"]]
    assert (flags.sum(axis=1) == table["samples"]).all()
    assert table["return_share"].between(0.0, 1.0).all()


def test_data_return_of_a_single_sample(make_chain):
    table = data_return(quality_control(make_chain([[28.5]])))
    assert table[["samples", "expected", "good", "return_share"]].values.tolist() == [[1, 1, 1, 1.0]]


def test_faults_are_runs_that_one_unflagged_sample_does_not_end(make_chain):
    flags = [1, 3, 1, 4, 4, 1, 1, 3, 9, 1]
    spike = np.array([0, 1, 0, 1, 1, 0, 0, 0, 0, 0])
    climatology = np.array([0, 0, 0, 0, 0, 0, 0, 1, 0, 0])
    chain = with_flags(
        make_chain(np.full(10, 20.0)),
        flags,
        bad_spike=spike * [f == 4 for f in flags],
        questionable_spike=spike * [f == 3 for f in flags],
        questionable_climatology=climatology,
    )
    # Days 1 to 4 with day 2 unflagged are one run of three values; two unflagged days end it; day 7 is
    # another.
    assert fault_list(chain).values.tolist() == [
        ["TB-01", 1.0, "spike", 4, "spike", day(1), day(4), 3],
        ["TB-01", 1.0, "unlike the season", 3, "climatology", day(7), day(7), 1],
    ]


def test_a_fault_is_named_by_the_test_that_gave_the_worst_flag_to_most_values(make_chain):
    flags = [4, 4, 4, 3, 3, 3, 3]
    bad = np.array([1, 1, 1, 0, 0, 0, 0])
    chain = with_flags(
        make_chain(np.full(7, 20.0)),
        flags,
        bad_spike=bad * [1, 0, 0, 0, 0, 0, 0],
        bad_flat_line=bad,
        questionable_climatology=np.ones(7),
    )
    # Climatology has most values, but at 3; of those at 4, three are stuck and one is a spike.
    assert fault_list(chain)[["kind", "flag", "tests", "count"]].values.tolist() == [
        ["stuck", 4, "climatology, spike, flat_line", 7]
    ]


def test_of_tests_that_say_the_same_the_more_telling_names_the_fault(make_chain):
    once = np.array([0, 1, 0])
    chain = with_flags(
        make_chain(np.full(3, 20.0)), [1, 4, 1], bad_spike=once, bad_gross_range=once, bad_delivered_flag=once
    )
    assert fault_list(chain)["kind"].tolist() == ["out of range"]


def test_a_flag_that_no_test_gave_is_listed_as_such(make_chain):
    chain = with_flags(make_chain(np.full(3, 20.0)), [1, 4, 1])
    assert fault_list(chain)[["kind", "tests"]].values.tolist() == [["flagged otherwise", ""]]


@pytest.mark.parametrize(
    ("spoil", "kind"),
    [
        (lambda record: record + 4.0 * (np.arange(60) == 30), "spike"),
        (lambda record: np.where((np.arange(60) >= 30) & (np.arange(60) < 45), record[30], record), "stuck"),
        (lambda record: np.where(np.arange(60) == 30, 50.0, record), "spike"),
        (
            lambda record: np.where((np.arange(60) >= 30) & (np.arange(60) < 45), 40.0 + record, record),
            "out of range",
        ),
        (
            lambda record: np.where(np.arange(60) >= 30, record - 0.3 * (np.arange(60) - 30), record),
            "unlike the season",
        ),
    ],
)
def test_planted_faults_are_listed_by_their_kind(make_chain, spoil, kind):
    quiet = 28.5 + 0.1 * np.random.default_rng(1).standard_normal(60)
    assert fault_list(quality_control(make_chain(quiet))).empty
    faults = fault_list(quality_control(make_chain(spoil(quiet))))
    longest = faults.loc[faults["count"].idxmax()]
    assert longest["kind"] == kind
    assert longest["end"] >= day(30)


def test_a_record_without_faults_or_gaps_gives_empty_tables(make_chain):
    chain = quality_control(make_chain(28.5 + 0.01 * np.arange(20)))
    for table in (fault_list(chain), gap_list(chain)):
        assert table.empty
        assert table["start"].dtype == "datetime64[ns]"


def test_sensors_that_fail_together_are_one_gap(make_chain):
    temperature = np.full((12, 4), 20.0)
    temperature[3:6, :2] = np.nan  # two together, days 3 to 5: from day 2 to day 6
    temperature[8, 2] = np.nan  # one alone, from day 7 to day 9
    temperature[:, 3] = np.nan  # one never spoke: the whole record, day 0 to day 11
    assert gap_list(make_chain(temperature)).values.tolist() == [
        ["TB-01", "300", 1, day(0), day(11), 11.0],
        ["TB-01", "1, 60", 2, day(2), day(6), 4.0],
        ["TB-01", "140", 1, day(7), day(9), 2.0],
    ]


def test_a_late_start_and_an_early_end_are_gaps(make_chain):
    temperature = np.full((10, 2), 20.0)
    temperature[:3, 0] = temperature[7:, 1] = np.nan
    # First value on day 3; last value on day 6 of a record to day 9.
    assert gap_list(make_chain(temperature))[["depths", "start", "end", "duration"]].values.tolist() == [
        ["1", day(0), day(3), 3.0],
        ["60", day(6), day(9), 3.0],
    ]


def test_samples_that_never_came_are_a_gap_of_all_sensors(make_chain):
    chain = make_chain(np.full((10, 2), 20.0)).isel(time=[0, 1, 2, 3, 7, 8, 9])
    assert gap_list(chain)[["depths", "sensors", "start", "end"]].values.tolist() == [["1, 60", 2, day(3), day(7)]]


def test_the_longest_interval_decides_what_is_a_gap(make_chain):
    chain = make_chain(np.array([20.0, 20.1, np.nan, 20.3, 20.4, 20.5]))
    patient = QualityControlSettings.model_validate({"gap": {"longest_interval": 2.0}})
    assert len(gap_list(chain)) == 1
    assert gap_list(chain, patient).empty


@pytest.mark.parametrize("summary", [data_return, fault_list])
def test_a_chain_without_flags_is_refused(make_chain, summary):
    with pytest.raises(DataError, match=r"carries no flags; expected temperature_qc, .*run quality_control first"):
        summary(make_chain([20.0, 20.1]))
