"""The exception tree: what an error says, the exit code it stands for, and its way through a process border."""

from __future__ import annotations

import pickle
from concurrent.futures import ProcessPoolExecutor
from multiprocessing import get_context

import pytest

from profiles import errors
from profiles.errors import ConfigError, DataError, MachineError, RequestError, ThermotiltError

PARTS = {
    "where": "chain.csv, line 7",
    "expected": "a number",
    "found": "'warm'",
    "advice": "correct the row",
}
CONFIG = ConfigError("array.toml", [RequestError("this key is missing", where="array"), RequestError("not known")])


def raise_in_the_worker(kind: type[ThermotiltError]) -> None:
    raise kind("no temperature", **PARTS)


def raise_config_error_in_the_worker() -> None:
    raise CONFIG


def test_the_exit_codes_are_those_of_the_design() -> None:
    # What scripts rely on. 130 is 128 + 2, SIGINT, the custom of the shells.
    codes = {name: getattr(errors, name) for name in dir(errors) if name.startswith("EXIT_")}
    assert codes == {
        "EXIT_DONE": 0,
        "EXIT_REQUEST": 2,
        "EXIT_DATA": 3,
        "EXIT_MACHINE": 4,
        "EXIT_PARTIAL": 5,
        "EXIT_FAULT": 70,
        "EXIT_INTERRUPTED": 130,
    }


@pytest.mark.parametrize(
    ("kind", "parent", "exit_code"),
    [
        (ThermotiltError, Exception, 70),
        (RequestError, ThermotiltError, 2),
        (ConfigError, RequestError, 2),
        (DataError, ThermotiltError, 3),
        (MachineError, ThermotiltError, 4),
    ],
)
def test_the_tree_is_as_it_is_drawn(kind: type[ThermotiltError], parent: type[Exception], exit_code: int) -> None:
    assert kind.__base__ is parent
    assert kind.exit_code == exit_code
    assert kind.__name__ in (errors.__doc__ or "")


def test_there_is_no_error_outside_the_drawn_tree() -> None:
    def below(kind: type[Exception]) -> set[str]:
        return {kind.__name__}.union(*(below(child) for child in kind.__subclasses__()))

    assert below(ThermotiltError) == {"ThermotiltError", "RequestError", "ConfigError", "DataError", "MachineError"}


@pytest.mark.parametrize(
    ("given", "said"),
    [
        ((), "no temperature"),
        (("where",), "chain.csv, line 7: no temperature"),
        (("expected",), "no temperature; expected a number"),
        (("found",), "no temperature; found 'warm'"),
        (("advice",), "no temperature; correct the row"),
        (tuple(PARTS), "chain.csv, line 7: no temperature; expected a number; found 'warm'; correct the row"),
    ],
)
def test_a_message_says_what_is_known_in_one_order(given: tuple[str, ...], said: str) -> None:
    assert str(DataError("no temperature", **{name: PARTS[name] for name in given})) == said


def test_an_empty_finding_is_still_said() -> None:
    assert str(DataError("no units", found="")) == "no units; found "


def test_a_config_error_lists_its_problems_under_the_file() -> None:
    assert str(CONFIG) == "array.toml: 2 problems in this file\n  - array: this key is missing\n  - not known"
    assert str(ConfigError("a.toml", [RequestError("bad")])) == "a.toml: 1 problem in this file\n  - bad"


@pytest.mark.parametrize("kind", [ThermotiltError, RequestError, DataError, MachineError])
@pytest.mark.parametrize("protocol", range(pickle.HIGHEST_PROTOCOL + 1))
def test_an_error_survives_pickling_whole(kind: type[ThermotiltError], protocol: int) -> None:
    error = kind("no temperature", **PARTS)
    back = pickle.loads(pickle.dumps(error, protocol))
    assert type(back) is kind
    assert vars(back) == vars(error)
    assert str(back) == str(error)


def test_a_config_error_survives_pickling_with_its_problems() -> None:
    back = pickle.loads(pickle.dumps(CONFIG))
    assert type(back) is ConfigError
    assert str(back) == str(CONFIG)
    assert [type(problem) for problem in back.problems] == [RequestError, RequestError]


def test_errors_cross_the_border_of_a_spawned_process() -> None:
    with ProcessPoolExecutor(1, mp_context=get_context("spawn")) as pool:
        for kind in (RequestError, DataError, MachineError):
            with pytest.raises(
                kind, match=r"^chain\.csv, line 7: no temperature; expected a number; found 'warm'; correct"
            ):
                pool.submit(raise_in_the_worker, kind).result()
        with pytest.raises(ConfigError, match="2 problems in this file\n  - array: this key is missing"):
            pool.submit(raise_config_error_in_the_worker).result()
