"""The configuration file: what is refused, how it is said, and the file of the defaults."""

from __future__ import annotations

import tomllib
from pathlib import Path
from typing import Any

import pydantic
import pytest

from profiles.config import (
    ColumnSettings,
    Config,
    Delivery,
    PrecursorSettings,
    QualityControlSettings,
    SectionSettings,
    Settings,
    ValidationSettings,
    defaults_text,
    load_config,
)
from profiles.errors import ConfigError, RequestError

DEFAULTS = Path(__file__).parents[1] / "config" / "defaults.toml"
ARRAY = '[array]\nname = "Boobyfish Array"\n'
MOORING = '[[moorings]]\nid = "{id}"\nlatitude = {latitude}\nlongitude = {longitude}\ndeliveries = [{deliveries}]\n'
MODELS: dict[str, type[Settings]] = {
    "qc": QualityControlSettings,
    "column": ColumnSettings,
    "section": SectionSettings,
    "validation": ValidationSettings,
    "precursor": PrecursorSettings,
}
DELIVERY = '{ path = "a.csv", layout = "a.toml" }'


def mooring(**changed: object) -> str:
    return MOORING.format(**{"id": "B-1", "latitude": 0.0, "longitude": 165.0, "deliveries": DELIVERY} | changed)


@pytest.fixture
def load(tmp_path: Path) -> Any:
    def write_and_load(text: str) -> Config:
        file = tmp_path / "array.toml"
        file.write_text(text, encoding="utf-8")
        return load_config(file)

    return write_and_load


def problems(load: Any, text: str) -> list[str]:
    with pytest.raises(ConfigError, match="in this file") as caught:
        load(text)
    return [str(problem) for problem in caught.value.problems]


def test_a_small_file_takes_every_default(load: Any) -> None:
    config = load(ARRAY + mooring())
    assert config.moorings[0].deliveries == (Delivery(path=Path("a.csv"), layout=Path("a.toml")),)
    assert (config.qc, config.column, config.section) == (
        QualityControlSettings(),
        ColumnSettings(),
        SectionSettings(),
    )


def test_a_setting_in_the_file_replaces_its_default_alone(load: Any) -> None:
    config = load(ARRAY + mooring() + "[column]\nisotherm = 18\nuse_flags = [1]\n")
    assert config.column == ColumnSettings(isotherm=18.0, use_flags=(1,))
    assert config.section == SectionSettings()


def test_paths_are_seen_from_the_folder_of_the_file(load: Any, tmp_path: Path) -> None:
    config = load(ARRAY + mooring())
    assert config.resolve(Path("../raw/a.csv")) == tmp_path.parent / "raw" / "a.csv"


def test_a_file_with_a_byte_order_mark_and_windows_line_ends_is_read(tmp_path: Path) -> None:
    file = tmp_path / "array.toml"
    file.write_bytes(b"\xef\xbb\xbf" + (ARRAY + mooring()).replace("\n", "\r\n").encode())
    assert load_config(file).array.name == "Boobyfish Array"


def test_everything_wrong_is_said_at_once_with_its_place(load: Any) -> None:
    text = (
        ARRAY
        + mooring(id="B-1", latitude=95)
        + mooring(id="b-1", longitude=-10.0)
        + mooring(id="B-2", deliveries="")
        + "[qc.spike]\nthreshold_lo = 1.0\n[column]\nisotherm = 'warm'\n[section]\ntilt_window = [265.0, 165.0]\n"
    )
    found = problems(load, text)
    for begin, content in [
        ("moorings:", "found B-1"),
        ("moorings:", "found b-1"),
        ("moorings #1.latitude:", "found 95"),
        ("moorings #2.longitude:", "found -10.0"),
        ("moorings #3.deliveries:", "at least 1 item"),
        ("qc.spike.threshold_lo:", "did you mean 'threshold_low'?"),
        ("column.isotherm:", "found 'warm'"),
        ("section:", "western end first"),
    ]:
        assert any(problem.startswith(begin) and content in problem for problem in found), (begin, content, found)
    assert len(found) == 8


def test_the_message_names_the_file_and_counts(load: Any, tmp_path: Path) -> None:
    with pytest.raises(ConfigError, match="1 problem in this file") as caught:
        load(ARRAY)
    assert (
        str(caught.value)
        == f"{tmp_path / 'array.toml'}: 1 problem in this file\n  - moorings: this key is missing; add it"
    )


@pytest.mark.parametrize(
    ("text", "advice"),
    [
        ("[secton]\nsignal_sd = 1.0\n", "did you mean 'section'?"),
        ("[section.mean]\n", "did you mean 'means'?"),
        ("[section.means]\nmonthly_day = 3\n", "did you mean 'monthly_days'?"),
        ("[qc.spike]\nzzz = 1\n", "known here: threshold_high, threshold_low"),
    ],
)
def test_an_unknown_key_names_the_nearest_or_all_of_its_table(load: Any, text: str, advice: str) -> None:
    (found,) = problems(load, ARRAY + mooring() + text)
    assert "this key is not known" in found
    assert advice in found


def test_an_unknown_key_of_a_mooring_names_the_nearest(load: Any) -> None:
    (found,) = problems(load, ARRAY + mooring() + "latitud = 3.0\n")
    assert found == "moorings #1.latitud: this key is not known; did you mean 'latitude'?"


@pytest.mark.parametrize(
    "wrong",
    [
        '[column]\nisotherm = "20"',
        "[column]\nisotherm = true",
        "[column]\nisotherm = nan",
        "[column]\nmax_bracket = inf",
        "[column]\nisotherm = 2031-05-27",
        "[column]\nuse_flags = 1",
        "[column]\nuse_flags = []",
        "[column]\nuse_flags = [9]",
        "[section.means]\nmonthly_days = 2.5",
        "[section.means]\nmonthly_days = true",
        "[section.means]\ndaily_share = 1.01",
        "[section]\nsignal_sd = 0.0",
        "[section]\nsignal_sd = -1.0",
        "[section]\ntilt_window = [165.0]",
        "[section]\ntilt_window = [165.0, 360.0]",
        "[section]\ntilt_window = [265.0, 165.0]",
        "[section]\ntilt_window = [165.0, 165.0]",
        "[qc]\nspike = 3",
        "[qc.spike]\nthreshold_low = 8.0",
        "[qc.flat_line]\nrepeats_questionable = 5",
        "[qc.gross_range]\nuser_max = 41.0",
        "[qc.gap]\nflag_after_gap = 2",
    ],
)
def test_one_wrong_value_is_one_problem(load: Any, wrong: str) -> None:
    (found,) = problems(load, ARRAY + mooring() + wrong + "\n")
    table = wrong.partition("]")[0].removeprefix("[")
    assert found.startswith(table)


@pytest.mark.parametrize(
    ("changed", "place"),
    [
        ({"latitude": "95.0"}, "moorings #1.latitude"),
        ({"latitude": '"0"'}, "moorings #1.latitude"),
        ({"longitude": "-165.0"}, "moorings #1.longitude"),
        ({"longitude": "360.0"}, "moorings #1.longitude"),
        ({"id": "../B"}, "moorings #1.id"),
        ({"id": ""}, "moorings #1.id"),
        ({"deliveries": '{ path = "a.csv" }'}, "moorings #1.deliveries #1.layout"),
        ({"deliveries": "3"}, "moorings #1.deliveries #1"),
    ],
)
def test_a_wrong_mooring_is_one_problem_at_its_place(load: Any, changed: dict[str, str], place: str) -> None:
    (found,) = problems(load, ARRAY + mooring(**changed))
    assert found.startswith(f"{place}: ")


@pytest.mark.parametrize(
    "moorings", ["moorings = [1, 2]\n", "moorings = 3\n", "moorings = []\n", "[moorings]\nid = 'B-1'\n"]
)
def test_moorings_that_are_no_tables_are_refused(load: Any, moorings: str) -> None:
    found = problems(load, moorings + ARRAY) if not moorings.startswith("[") else problems(load, ARRAY + moorings)
    assert found
    assert all(problem.startswith("moorings") for problem in found)


def test_ids_that_differ_in_case_alone_are_the_same(load: Any) -> None:
    # Their files would overwrite each other where the file system does not tell the cases apart.
    found = problems(load, ARRAY + mooring(id="B-1") + mooring(id="b-1"))
    assert [problem.partition("; found ")[2][:3] for problem in found] == ["B-1", "b-1"]


def test_the_file_may_not_say_where_it_is(load: Any) -> None:
    (found,) = problems(load, 'file = "other.toml"\n' + ARRAY + mooring())
    assert found == "file: this key is not known; remove it"


def test_an_empty_file_lacks_array_and_moorings(load: Any) -> None:
    assert problems(load, "") == ["array: this key is missing; add it", "moorings: this key is missing; add it"]


def test_text_that_is_no_toml_names_line_and_column(load: Any) -> None:
    (found,) = problems(load, ARRAY + "isotherm 20\n")
    assert found.startswith("not TOML; found ")
    assert "line 3, column 10" in found


def test_a_file_that_is_not_utf8_names_the_byte(tmp_path: Path) -> None:
    file = tmp_path / "array.toml"
    file.write_bytes('[array]\nname = "Señor"\n'.encode("latin-1"))
    # The eight bytes of "[array]\n", then nine of 'name = "Se' less one for counting from 0: byte 18 is the n.
    with pytest.raises(RequestError, match="is no UTF-8 text; expected a TOML file; found byte 18 is not UTF-8"):
        load_config(file)


def test_a_folder_names_the_file_in_it(tmp_path: Path) -> None:
    with pytest.raises(RequestError, match="is a folder; expected a TOML file; name the file in it"):
        load_config(tmp_path)
    (tmp_path / "array.toml").touch()
    with pytest.raises(RequestError, match=r"did you mean .*array\.toml\?"):
        load_config(tmp_path)


def test_a_missing_file_names_the_near_miss(tmp_path: Path) -> None:
    (tmp_path / "tropicbird.toml").touch()
    with pytest.raises(RequestError, match=r"no such file; expected a TOML file; did you mean .*tropicbird\.toml\?"):
        load_config(tmp_path / "tropicbirt.toml")
    with pytest.raises(RequestError, match="no such file; expected a TOML file; check the path"):
        load_config(tmp_path / "another" / "quite_different.toml")


def test_a_path_below_a_file_cannot_be_read(tmp_path: Path) -> None:
    (tmp_path / "array.toml").touch()
    with pytest.raises(RequestError, match="cannot be read; found Not a directory"):
        load_config(tmp_path / "array.toml" / "inner.toml")


def test_a_file_without_permission_cannot_be_read(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def refuse(self: Path) -> bytes:
        raise PermissionError(13, "Permission denied", str(self))

    monkeypatch.setattr(Path, "read_bytes", refuse)  # the tests may run as a user whom no permission stops
    with pytest.raises(RequestError, match="cannot be read; found Permission denied"):
        load_config(tmp_path / "array.toml")


def test_a_configuration_is_frozen(load: Any) -> None:
    config = load(ARRAY + mooring())
    with pytest.raises(pydantic.ValidationError, match="frozen"):
        config.column.isotherm = 18.0
    with pytest.raises(pydantic.ValidationError, match="frozen"):
        config.moorings[0].latitude = 1.0


def test_the_file_of_the_defaults_is_the_models_written_out() -> None:
    # Where a default changed: python -c "from profiles.config import *; print(defaults_text(), end='')"
    assert DEFAULTS.read_text(encoding="utf-8") == defaults_text()


def test_the_file_of_the_defaults_read_back_is_the_defaults() -> None:
    content = tomllib.loads(DEFAULTS.read_text(encoding="utf-8"))
    assert set(content) == {"qc", "column", "section", "validation", "precursor"}
    for name, model in MODELS.items():
        assert model.model_validate(content[name]) == model()
        assert keys_of(content[name]) == keys_of(model().model_dump())


def keys_of(table: dict[str, Any], prefix: str = "") -> set[str]:
    inner = [keys_of(value, f"{prefix}{key}.") for key, value in table.items() if isinstance(value, dict)]
    return {prefix + key for key in table}.union(*inner)


def test_the_file_of_the_defaults_is_a_valid_end_of_a_configuration(load: Any) -> None:
    assert load(ARRAY + mooring() + DEFAULTS.read_text(encoding="utf-8")) == load(ARRAY + mooring())


def test_every_default_has_a_comment_above_it() -> None:
    lines = DEFAULTS.read_text(encoding="utf-8").splitlines()
    keys = [place for place, line in enumerate(lines) if " = " in line and not line.startswith("#")]
    assert len(keys) == sum(1 for key in all_fields(*MODELS.values()) if key)
    assert [lines[place] for place in keys if len(lines[place - 1]) < 4 or not lines[place - 1].startswith("# ")] == []


def all_fields(*models: type[Settings]) -> list[str]:
    """Return the keys of the models and of the models in them that are no tables themselves."""
    names: list[str] = []
    for model in models:
        for name, info in model.model_fields.items():
            inner = info.annotation
            is_table = isinstance(inner, type) and issubclass(inner, Settings)
            names += all_fields(inner) if is_table else [name]
    return names


def test_every_setting_with_a_unit_or_a_choice_says_whose_it_is() -> None:
    # A threshold without a source or the word "ours" would be a number nobody can question.
    sources = (
        "(ours",
        " ours)",
        "from memory",
        "QARTOD",
        "EuroGOOS",
        "et al.",
        "two atlases",
        "published",
        "WWV",
        "T300",
        "common",
    )
    silent = [
        name
        for model in MODELS.values()
        for table in [model, *(info.annotation for info in model.model_fields.values())]
        if isinstance(table, type) and issubclass(table, Settings)
        for name, info in table.model_fields.items()
        if isinstance(info.default, float | tuple) and not any(source in (info.description or "") for source in sources)
    ]
    assert silent == []


# --------------------------------------------------------------------------------------------------------------
# Series from elsewhere

SERIES = '[[series]]\npath = "z20.csv"\nlayout = "z20.toml"\n'


def test_a_mooring_may_have_a_series_in_place_of_deliveries(load: Any) -> None:
    config = load(ARRAY + mooring(deliveries="") + SERIES)
    assert config.moorings[0].deliveries == ()
    assert config.series[0].layout == Path("z20.toml")


def test_a_series_of_one_mooring_names_one_that_there_is(load: Any) -> None:
    assert load(ARRAY + mooring() + SERIES + 'mooring = "B-1"\n').series[0].mooring == "B-1"
    found = problems(load, ARRAY + mooring() + SERIES + 'mooring = "B-11"\n')
    assert [line for line in found if "series #1.mooring: no such mooring" in line and "did you mean 'B-1'?" in line]
