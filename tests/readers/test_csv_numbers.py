"""
Numbers from text equal Python's `float()`, whose rounding is correct (David Gay's algorithm), to the last bit.

A few thousand in the default run; `FLICKER_NUMBERS=200000 pytest tests/readers/test_csv_numbers.py` for many.
"""

import os

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from flicker.readers import read
from flicker.readers._csv_numbers import is_number, number, numbers

COUNT = int(os.environ.get("FLICKER_NUMBERS", "4000"))


def random_numbers(count, seed=1):
    rng = np.random.default_rng(seed)
    return (rng.normal(size=count) * 10.0 ** rng.integers(-8, 8, count)).tolist()


def any_doubles(count, seed=2):
    doubles = np.random.default_rng(seed).integers(0, 2**64, count, dtype=np.uint64).view(np.float64)
    return np.where(np.isfinite(doubles), doubles, 0.5).tolist()


SPELLINGS = {
    "shortest": repr,
    "fixed": "{:.9f}".format,
    "signed and padded": "{:+22.5f}".format,
    "exponent": "{:.6e}".format,
    "seventeen digits": "{:.16E}".format,
    "nineteen digits": "{:.18e}".format,
    "Fortran": lambda value: f"{value:.10E}".replace("E", "D"),
    "general": "{:.12g}".format,
}


def read_cells(words, decimal):
    text = np.frombuffer("\n".join(words).encode(), dtype=np.uint8)
    lengths = np.array([len(word) for word in words])
    stops = np.cumsum(lengths + 1) - 1
    return numbers(text, stops - lengths, stops, decimal.encode())


def assert_equal_bits(got, words, decimal="."):
    expected = np.array([float(word.replace("D", "E").replace(decimal, ".")) for word in words])
    wrong = np.flatnonzero(np.asarray(got).view(np.int64) != expected.view(np.int64))
    assert not wrong.size, [(words[i], got[i], expected[i]) for i in wrong[:5]]


@pytest.mark.parametrize("decimal", [".", ","])
@pytest.mark.parametrize("spelling", SPELLINGS)
def test_cells_equal_float(spelling, decimal):
    words = [SPELLINGS[spelling](value).replace(".", decimal) for value in random_numbers(COUNT)]
    values, unreadable = read_cells(words, decimal)
    assert not unreadable.any()
    assert_equal_bits(values, words, decimal)


@pytest.mark.parametrize("spelling", ["shortest", "seventeen digits", "nineteen digits"])
def test_numbers_of_every_size_equal_float(spelling):
    words = [SPELLINGS[spelling](value) for value in any_doubles(COUNT)]
    assert_equal_bits(read_cells(words, ".")[0], words)


def test_halfway_cases_round_to_even():
    """Decimal expansions of the exact middle between two doubles, and their neighbours in the last digit."""
    middles = [9007199254740993, 9007199254740995, 4503599627370497 * 2 + 1, 18014398509481986, 36028797018963972]
    words = [str(middle + off) for middle in middles for off in (-1, 0, 1)]
    words += (
        [f"{word[:3]}.{word[3:]}" for word in words]
        + [f"{word}e-22" for word in words]
        + [f"{word}e22" for word in words]
    )
    for word in words:
        assert_equal_bits(read_cells([word] * 3, ".")[0], [word] * 3)


@pytest.mark.parametrize("spelling", SPELLINGS)
@pytest.mark.parametrize("path", ["lines of one length", "lines of any length", "quotes", "wide characters"])
def test_every_way_through_a_file_equals_float(tmp_path, spelling, path):
    words = [SPELLINGS[spelling](value) for value in random_numbers(COUNT, seed=3)]
    if path == "lines of one length":
        width = max(map(len, words))
        words = [word.rjust(width) for word in words]
    quote = '"' if path == "quotes" else ""
    content = "".join(f"{quote}{i:06d}{quote},{quote}{word}{quote}\n" for i, word in enumerate(words))
    file = tmp_path / "capture.csv"
    file.write_text("Time (us),light (V)\n" + content, encoding="utf-16" if path == "wide characters" else "utf-8")
    (trace,) = read(file).traces
    assert_equal_bits(trace.light, words)


MARKS = [
    ("OL", np.inf),
    ("-OL", -np.inf),
    ("Inf", np.inf),
    ("-inf", -np.inf),
    ("1.#INF", np.inf),
    ("over", np.inf),
    ("under", -np.inf),
    (">>>", np.inf),
    ("<<<", -np.inf),
    ("---", np.nan),
    ("****", np.nan),
    ("", np.nan),
    ("NaN", np.nan),
    ("n/a", np.nan),
    ("-1.#IND", np.nan),
    ("volt", None),
    ("1 2", None),
    ("1.2.3", None),
    ("0x10", None),
    ("1_000", None),
    ("12:30:00", None),
]


@pytest.mark.parametrize(("cell", "expected"), MARKS)
def test_marks_and_other_text(cell, expected):
    got = number(cell.encode(), b".")
    assert (got is None) == (expected is None)
    if expected is not None:
        assert got == expected or (np.isnan(got) and np.isnan(expected))
    assert not is_number(cell.encode(), b".")


@given(st.lists(st.text(alphabet="0123456789+-.eED OL", max_size=12), min_size=1, max_size=40))
def test_many_cells_read_as_single_ones_do(words):
    values, unreadable = read_cells(words, ".")
    single = [number(word.encode(), b".") for word in words]
    assert unreadable.tolist() == [value is None for value in single]
    np.testing.assert_array_equal(values, [np.nan if value is None else value for value in single])
