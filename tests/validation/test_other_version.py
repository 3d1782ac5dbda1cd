"""A run of another version of the program as the array's side."""

from __future__ import annotations

import json
from pathlib import Path

import pytest

from profiles.errors import DataError
from profiles.validation import open_array


def test_settings_that_this_version_does_not_know_are_told(out: Path) -> None:
    account = json.loads((out / "run.json").read_text(encoding="utf-8"))
    account["configuration"]["column"]["of_tomorrow"] = 1.0
    (out / "run.json").write_text(json.dumps(account), encoding="utf-8")
    message = r"run.json: the run was made with settings that this version does not know; found of_tomorrow; run the"
    with pytest.raises(DataError, match=message):
        open_array(out)
