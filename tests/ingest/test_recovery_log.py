"""The log of what was deployed and recovered when."""

import numpy as np
import pytest

from profiles.errors import ConfigError, DataError, RequestError
from profiles.ingest import read, read_recovery_log
from profiles.vocabulary import Water

LOG = (
    "mooring,deployment,deployed,recovered,remarks\n"
    "# the ship was late\n"
    "TB-01,1,2031-01-02T06:00:00Z,2031-01-04T06:00+00:00,\n"
    'TB-01,2,2031-01-06,,"not yet, or lost"\n'
    "TB-02,7,2031-02-01,2031-03-01,\n"
)


def test_deployments_are_by_mooring_in_order_of_time(write):
    log = read_recovery_log(write(LOG, "log.csv"))
    assert list(log) == ["TB-01", "TB-02"]
    np.testing.assert_array_equal(log["TB-01"].number, [1, 2])
    days = np.array(
        ["2031-01-01", "2031-01-02T06:00", "2031-01-04T06:00", "2031-01-05", "2031-01-07"], "datetime64[ns]"
    )
    np.testing.assert_array_equal(log["TB-01"].deployment_at(days), [1, 1, 1, 1, 2])
    np.testing.assert_array_equal(log["TB-01"].is_out(days), [False, True, True, False, True])


def test_a_mooring_never_recovered_is_out_until_the_next_one(write):
    text = "mooring,deployment,deployed,recovered\nA,2,2031-06-01,\nA,1,2031-01-01,\n"
    service = read_recovery_log(write(text, "log.csv"))["A"]
    np.testing.assert_array_equal(service.number, [1, 2])
    assert service.is_out(np.array(["2031-03-01", "2039-01-01"], "datetime64[ns]")).all()


def test_a_chain_takes_deployments_and_water_from_the_log(write, wide):
    rows = "".join(f"2031-01-0{day},{20 + day}\n" for day in range(1, 8))
    delivery = read(write("date,T_1m\n" + rows), wide, mooring="TB-01")
    chain = delivery.with_service(read_recovery_log(write(LOG, "log.csv"))["TB-01"]).chain
    np.testing.assert_array_equal(chain["deployment"], [1, 1, 1, 1, 1, 2, 2])
    wet, dry = Water.IN_WATER, Water.NOT_DEPLOYED
    np.testing.assert_array_equal(chain["water_status"], [dry, dry, wet, wet, dry, wet, wet])
    np.testing.assert_array_equal(chain["temperature"][:, 0], np.arange(21, 28))  # kept, all of them


@pytest.mark.parametrize(
    ("text", "error", "message"),
    [
        ("mooring,deployed,recovered\n", DataError, "lacks columns.*add 'deployment'"),
        (LOG.replace("2031-01-06", "soon"), ConfigError, "line 4: the time of deployment cannot be read; found soon"),
        (LOG.replace("2031-03-01", "2031-01-01"), ConfigError, "line 5: recovered before it was deployed"),
        (LOG.replace("TB-02,7", "TB-02,x"), ConfigError, "line 5: the number of the deployment is no whole number"),
        (LOG + "TB-03,1\n", ConfigError, "line 6: a row of another length; expected 5 cells; found 2"),
        (LOG.replace("2031-01-06", "2031-01-04"), DataError, "lines 3 and 4: a mooring is deployed before the one at"),
        ('mooring,"deployment\n', DataError, "is no table; expected CSV"),
    ],
)
def test_a_wrong_log_says_which_line_and_what(write, text, error, message):
    with pytest.raises(error, match=f"(?s)log.csv.*{message}"):
        read_recovery_log(write(text, "log.csv"))


def test_a_log_that_is_not_there_is_a_wrong_request(tmp_path):
    with pytest.raises(RequestError, match="no such file"):
        read_recovery_log(tmp_path / "log.csv")
