import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from profiles.ingest.numerals import _POWERS, Numerals, Problem, _plain_numbers


def parsed(*cells, decimal=".", missing=("",)):
    encoded = [cell.encode() for cell in cells]
    edges = np.cumsum([0, *(len(cell) for cell in encoded)]).astype(np.int32)
    buffer = np.frombuffer(b"".join(encoded), np.uint8)
    values, problems = Numerals(decimal, missing).read(buffer, edges[None, :-1], edges[None, 1:])
    return values[0], problems[0]


@pytest.mark.parametrize("cell", ["1", "+1.", "1.0", "01.00", "10e-1", ".1E1"])
def test_every_way_of_writing_one_is_read(cell):
    values, problems = parsed(cell)
    assert (values[0], problems[0]) == (1.0, Problem.NONE)


@pytest.mark.parametrize("cell", ["nan", "inf", "1_0", "0x10", "1,5", "1.2.3", "--1", "1 2", "٣", "e5", ".", "True"])
def test_what_is_no_number_is_told(cell):
    values, problems = parsed(cell)
    assert np.isnan(values[0])
    assert problems[0] == Problem.NOT_A_NUMBER


@pytest.mark.parametrize("cell", ["1e999", "-1e999", "1e39"])
def test_numbers_beyond_float32_are_told(cell):
    # the largest float32 is 3.4e38
    values, problems = parsed(cell)
    assert np.isnan(values[0])
    assert problems[0] == Problem.NOT_FINITE


def test_missing_tokens_are_compared_as_text_and_as_number():
    values, problems = parsed("-9.999", "-9.9990", "-9999e-3", "NA", "-9.998", missing=("-9.999", "NA"))
    np.testing.assert_array_equal(values, [np.nan, np.nan, np.nan, np.nan, -9.998])
    assert not problems.any()


def test_a_token_beyond_any_number_is_missing_all_the_same():
    assert parsed("1e999", missing=("1e999",))[1][0] == Problem.NONE


def test_an_empty_cell_is_missing_only_where_the_layout_says_so():
    assert parsed("", missing=("",))[1][0] == Problem.NONE
    assert parsed("", missing=("NA",))[1][0] == Problem.NOT_A_NUMBER


def test_decimal_commas_are_read_with_decimal_commas_only():
    values, problems = parsed("1,5", "1.5", "-9,9990", decimal=",", missing=("-9.999",))
    np.testing.assert_array_equal(values, [1.5, np.nan, np.nan])
    np.testing.assert_array_equal(problems, [Problem.NONE, Problem.NOT_A_NUMBER, Problem.NONE])


def test_numbers_of_many_digits_are_rounded_as_python_rounds_them():
    random = np.random.default_rng(1)
    readings = random.normal(20.0, 9.0, 4_000)
    cells = [form.format(value) for form in ("{!r}", "{:.17g}", "{:.18e}") for value in readings.tolist()]
    # whole numbers halfway between two that a float64 can be, and their neighbours
    halves = [(2 * int(odd) + 1) << shift for odd in random.integers(2**52, 2**53, 500) for shift in range(6)]
    cells += [f"{half + step}{end}" for half in halves for step in (-1, 0, 1) for end in ("", ".0", "e-3")]
    values, problems = parsed(*cells)
    assert not problems.any()
    np.testing.assert_array_equal(values, [float(cell) for cell in cells])


def test_the_kernel_decides_the_digits_that_a_float64_is_written_with():
    cells = [repr(value) for value in np.random.default_rng(2).normal(20.0, 9.0, 1_000).tolist()]
    edges = np.cumsum([0, *map(len, cells)]).astype(np.int32)
    buffer = np.frombuffer("".join(cells).encode(), np.uint8)
    values, problems = _plain_numbers(buffer, edges[None, :-1], edges[None, 1:], ord("."), _POWERS)
    assert not problems.any()
    np.testing.assert_array_equal(values[0], [float(cell) for cell in cells])


@settings(max_examples=500)
@given(
    st.one_of(
        st.floats(allow_nan=False, allow_infinity=False).map(repr),
        st.from_regex(r"[+-]?[0-9]{1,25}(\.[0-9]{0,25})?([eE][+-]?[0-9]{1,3})?", fullmatch=True),
    )
)
def test_numbers_are_rounded_as_python_rounds_them(cell):
    value, problem = (found[0] for found in parsed(cell))
    expected = float(cell)
    if abs(expected) > float(np.finfo(np.float32).max):
        assert problem == Problem.NOT_FINITE
    else:
        assert (value, problem) == (expected, Problem.NONE)
