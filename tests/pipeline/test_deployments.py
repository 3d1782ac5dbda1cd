"""Several deliveries of one mooring, its recovery log and its clocks, through the check and the ingest stage."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pandas as pd
import pytest
import xarray as xr

from profiles.config import Config, load_config
from profiles.errors import ConfigError
from profiles.pipeline import Outcome, run, survey

CONFIG = """\
{head}
[array]
name = "Two files"
[[moorings]]
id = "M1"
latitude = 0.0
longitude = 200.0
deliveries = [
  {{ path = "sent.csv", layout = "wide.toml", mode = "real-time"{sent} }},
  {{ path = "recovered.csv", layout = "wide.toml"{recovered} }},
]
"""
LAYOUT = 'kind = "wide"\n[time]\ncolumn = "date"\n[depth]\npattern = "T{depth}"\n'
SENT = "date,T1,T200\n" + "".join(f"2031-01-0{day},{20 + day},10\n" for day in range(1, 6))
RECOVERED = "date,T1,T200\n" + "".join(f"2031-01-0{day},{25 + day / 10},11\n" for day in range(2, 5))


@pytest.fixture
def configured(tmp_path: Path):
    """Return a function that writes the two deliveries and their configuration, and loads it."""

    def write(head: str = "", sent: str = "", recovered: str = "", log: str = "") -> Config:
        for name, text in {
            "array.toml": CONFIG.format(head=head, sent=sent, recovered=recovered),
            "wide.toml": LAYOUT,
            "sent.csv": SENT,
            "recovered.csv": RECOVERED,
            "log.csv": log,
        }.items():
            (tmp_path / name).write_text(text, encoding="utf-8")
        return load_config(tmp_path / "array.toml")

    return write


def ingested(config: Config, tmp_path: Path) -> tuple[Outcome, xr.Dataset, pd.DataFrame]:
    out = tmp_path / "out"
    outcome = run(config, out, until="qc", workers=1)
    with xr.open_dataset(out / "chains" / "M1.nc") as chain:
        return outcome, chain.load(), pd.read_csv(out / "tables" / "deliveries.csv")


def test_what_was_recovered_comes_before_what_was_sent_wherever_it_is_listed(configured, tmp_path):
    outcome, chain, table = ingested(configured(), tmp_path)
    np.testing.assert_allclose(chain["temperature"][:, 0], [21, 25.2, 25.3, 25.4, 25], rtol=1e-6)
    np.testing.assert_array_equal(chain["deployment"], [1, 2, 2, 2, 1])
    assert outcome.rows == {"rows_read": 8, "rows_kept": 5, "rows_quarantined": 3, "rows_reordered": 0}
    counts = table.set_index("file")[["rows_read", "rows_kept", "rows_quarantined"]]
    assert counts.loc["sent.csv"].tolist() == [5, 2, 3]
    assert counts.loc["recovered.csv"].tolist() == [3, 3, 0]
    lost = pd.read_csv(tmp_path / "out" / "tables" / "quarantine.csv")
    assert lost["file"].tolist() == ["sent.csv"] * 3
    assert lost["line"].tolist() == [3, 4, 5]


def test_both_modes_of_one_deployment_carry_its_number(configured, tmp_path):
    _, chain, _ = ingested(configured(sent=", deployment = 4", recovered=", deployment = 4"), tmp_path)
    np.testing.assert_array_equal(chain["deployment"], [4] * 5)


def test_a_clock_is_corrected_before_deliveries_are_joined(configured, tmp_path):
    # the logger ran a day fast: its days 2 to 4 are 1 to 3
    _, chain, _ = ingested(configured(recovered=", clock = { fast_seconds = 86400 }"), tmp_path)
    np.testing.assert_allclose(chain["temperature"][:, 0], [25.2, 25.3, 25.4, 24, 25], rtol=1e-6)
    said = "deployment 2 had its stamps corrected for a clock 86400 s fast throughout"
    assert said in chain["temperature_raw"].attrs["comment"]


def test_the_log_numbers_deployments_and_trims_what_was_not_in_the_water(configured, tmp_path):
    log = "mooring,deployment,deployed,recovered\nM1,8,2031-01-02,2031-01-03\nM1,9,2031-01-04T12:00Z,\n"
    _, chain, _ = ingested(configured(head='recovery_log = "log.csv"', log=log), tmp_path)
    np.testing.assert_array_equal(chain["deployment"], [8, 8, 8, 8, 9])
    np.testing.assert_array_equal(chain["water_status"], [2, 1, 1, 2, 1])
    np.testing.assert_array_equal(chain["temperature_qc"][[0, 3]], np.full((2, 2), 4))
    assert chain["temperature"].notnull().all()


def test_a_log_that_is_wrong_stops_the_run_before_any_work(configured, tmp_path):
    config = configured(head='recovery_log = "log.csv"', log="mooring,deployment,deployed,recovered\nM1,1,soon,\n")
    with pytest.raises(ConfigError, match=r"(?s)log.csv.*line 2: the time of deployment cannot be read; found soon"):
        run(config, tmp_path / "out", until="qc", workers=1)
    assert not (tmp_path / "out").exists()
    with pytest.raises(ConfigError, match="line 2: the time of deployment"):
        survey(config)


def test_the_log_is_an_input_of_the_run(configured, tmp_path):
    log = "mooring,deployment,deployed,recovered\nM1,8,2031-01-01,\n"
    config = configured(head='recovery_log = "log.csv"', log=log)
    run(config, tmp_path / "out", until="qc", workers=1)
    assert run(config, tmp_path / "out", until="qc", workers=1).computed == 0
    (tmp_path / "log.csv").write_text(log.replace("M1,8", "M1,9"), encoding="utf-8")
    _, chain, _ = ingested(config, tmp_path)
    np.testing.assert_array_equal(chain["deployment"], [9] * 5)


def test_the_check_joins_the_deliveries_and_tells_what_loses(configured):
    log = "mooring,deployment,deployed,recovered\nM2,1,2031-01-01,\n"
    sent, recovered = survey(configured(head='recovery_log = "log.csv"', log=log))
    assert (sent.outcome, sent.rows_read, sent.rows_kept) == ("rows quarantined", 5, 2)
    assert sent.message == "3 rows are of times that a delivery before it has; they go to quarantine"
    assert (recovered.outcome, recovered.rows_kept) == ("clean", 3)
    assert recovered.message == "the recovery log does not have this mooring"


def test_the_check_tells_what_was_not_in_the_water(configured):
    log = "mooring,deployment,deployed,recovered\nM1,1,2031-01-03,\n"
    _, last = survey(configured(head='recovery_log = "log.csv"', log=log))
    expected = "2 times are outside the deployments of the recovery log; they are kept and flagged bad"
    assert last.message == expected


@pytest.mark.parametrize(
    ("part", "message"),
    [
        ({"sent": ", clock = { fast_second = 1 }"}, r"clock.fast_second: this key is not known; did you mean 'fast_s"),
        ({"sent": ", deployment = 0"}, "deliveries #1.deployment: Input should be greater than or equal to 1"),
        ({"recovered": ', mode = "realtime"'}, "deliveries #2.mode: Input should be 'delayed' or 'real-time'"),
        (
            {"recovered": ", clock = { fast_seconds = 1, set = 2031-01-01T00:00:00, checked = 2031-02-01T00:00:00Z }"},
            "clock.set: a time without its zone: 2031-01-01T00:00:00; add Z where it is UTC",
        ),
    ],
)
def test_a_wrong_key_of_a_delivery_says_where_and_what(configured, part, message):
    with pytest.raises(ConfigError, match=message):
        configured(**part)
