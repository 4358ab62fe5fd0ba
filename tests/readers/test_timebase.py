"""Times as files spell them, of any rate, start and number of digits: the rate and the gaps come back."""

import math

import numpy as np
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from flicker.errors import InputError
from flicker.readers._timebase import evenly

RATES = st.floats(1.5, 7.5).map(lambda power: 10.0**power)
COUNTS = st.integers(60, 3000)
STARTS = st.sampled_from([0.0, -0.25, 0.0123, 1.7, 100.0])


def spelled(times, decimals, scientific):
    """Round times as a file does, and say to what. [s]"""
    if scientific:
        words = [f"{time:.{decimals}e}" for time in times.tolist()]
        return np.array(words, dtype=float), 10.0 ** (math.floor(math.log10(np.abs(times).max())) - decimals)
    return np.array([f"{time:.{decimals}f}" for time in times.tolist()], dtype=float), 10.0**-decimals


@given(rate=RATES, count=COUNTS, start=STARTS, extra=st.integers(-1, 4), scientific=st.booleans())
@settings(max_examples=150, deadline=None)
def test_the_rate_comes_back_as_well_as_rounding_allows(rate, count, start, extra, scientific):
    true = start * count / rate + np.arange(count) / rate
    digits = math.ceil(math.log10(rate)) + extra
    if scientific:
        digits += math.floor(math.log10(np.abs(true).max()))
    assume(0 <= digits <= 15)
    times, resolution = spelled(true, digits, scientific)
    assume(resolution * rate < 12 and count / rate > 20 * resolution)
    even = evenly(times, [np.ones(count)], None)
    assert len(even.segments) == 1
    assert {note.code for note in even.notes} <= {"rounded-time"}
    assert abs(even.sample_rate / rate - 1) < max(1e-9, 1.6 * resolution * rate / count)
    assert abs(even.segments[0].start - true[0]) <= 1.1 * resolution + 1e-9 / rate


@given(rate=RATES, parts=st.lists(st.tuples(st.integers(30, 500), st.integers(2, 2000)), min_size=2, max_size=6))
@settings(max_examples=100, deadline=None)
def test_gaps_come_back_at_their_true_times(rate, parts):
    numbers = np.concatenate(
        [
            before + np.arange(count)
            for (count, _), before in zip(parts, np.cumsum([0, *(c + g for c, g in parts)]), strict=False)
        ]
    )
    times = np.round(numbers / rate, math.ceil(math.log10(rate)) + 3)
    even = evenly(times, [numbers.astype(float)], None)
    firsts = np.cumsum([0, *(count for count, _ in parts[:-1])])
    assert [segment.first for segment in even.segments] == firsts.tolist()
    assert [segment.start for segment in even.segments] == pytest.approx(
        (numbers[firsts] / rate).tolist(), abs=0.01 / rate
    )
    assert even.sample_rate == pytest.approx(rate, rel=1e-3)
    assert {note.code for note in even.notes} <= {"gap", "segments"}


@given(seed=st.integers(0, 2**32 - 1), count=st.integers(50, 1000))
@settings(max_examples=30, deadline=None)
def test_any_order_of_the_rows_gives_the_same(seed, count):
    times, light = np.arange(count) / 1000, np.arange(count, dtype=float)
    order = np.random.default_rng(seed).permutation(count)
    even = evenly(times[order], [light[order]], None)
    assert np.array_equal(even.readings[0], light)
    assert even.sample_rate == pytest.approx(1000, rel=1e-9)


@pytest.mark.parametrize(
    ("stated", "used", "codes"),
    [
        (20_000.0, 20_000.0, []),
        (20_001.0, 20_000.0, []),  # the head rounds, the column is fine
        (20_500.0, 20_000.0, ["rate-disagrees"]),
        (40_000.0, 20_000.0, ["rate-disagrees"]),
    ],
)
def test_a_head_that_disagrees_with_fine_times(stated, used, codes):
    even = evenly(np.arange(2000) * 5e-5 + np.tile([0, 1e-9], 1000), [np.ones(2000)], stated)
    assert even.sample_rate == pytest.approx(used, rel=1e-6)
    assert [note.code for note in even.notes] == codes
    assert "Hz" in even.history[-1]


def test_a_rate_stated_by_the_user_stretches_the_times():
    even = evenly(np.r_[0:100, 200:300] / 1000, [np.ones(200)], 2000.0, trusted=True)
    assert even.sample_rate == 2000.0
    assert even.segments[1].start == pytest.approx(0.1)
    assert "rate-disagrees" in [note.code for note in even.notes]


def test_times_that_stand_still_and_leap_are_refused():
    times = np.repeat([0.0, 0.5, 7.0, 9.2], 100)
    with pytest.raises(InputError, match="most rows share their time with others"):
        evenly(times, [np.ones(400)], None)
