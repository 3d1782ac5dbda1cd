"""Decimal commas between commas, which only quotes tell apart."""

from __future__ import annotations

import numpy as np
import pytest
from pydantic import ValidationError

from profiles.ingest import read
from profiles.ingest.layout import WideLayout

LAYOUT = {"kind": "wide", "decimal": ",", "time": {"column": "day"}, "depth": {"pattern": "T{depth}"}}


def test_a_decimal_mark_that_is_the_delimiter_needs_quotes():
    with pytest.raises(ValidationError, match="delimiter and decimal are the same"):
        WideLayout.model_validate(LAYOUT)


def test_numbers_in_quotes_are_read_and_others_quarantined(write):
    layout = WideLayout.model_validate(LAYOUT | {"quoted": True})
    # the second row has no quotes: 29,5 are two cells then
    text = 'day,T1,T2\n2031-01-01,"29,5","28,25"\n2031-01-02,29,5,28,25\n2031-01-03,"",28\n'
    delivery = read(write(text), layout)
    np.testing.assert_array_equal(delivery.chain["temperature"], np.float32([[29.5, 28.25], [np.nan, 28.0]]))
    assert delivery.quarantine[["line", "reason"]].to_numpy().tolist() == [[3, "5 cells where there are 3 columns"]]
