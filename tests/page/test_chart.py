"""Figures are held against what they were given."""

import re

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from flicker.report.sections._chart import Chart, Scale, extent


@given(
    low=st.floats(-1e6, 1e6),
    span=st.floats(1e-3, 1e6),
    share=st.floats(0.0, 1.0),
)
def test_a_scale_puts_values_where_they_belong(low, span, share):
    scale = Scale(low, low + span, 40.0, 440.0)
    assert float(scale(low + share * span)) == pytest.approx(40.0 + 400.0 * share, abs=1e-3)
    ticks = scale.ticks()
    assert all(abs(scale(tick) - 240.0) < 200.01 for tick in ticks)
    assert 2 <= len(ticks) <= 6


@given(low=st.floats(-5.0, 3.0), decades=st.floats(0.6, 9.0), share=st.floats(0.0, 1.0))
def test_a_logarithmic_scale_is_even_in_decades(low, decades, share):
    scale = Scale(10.0**low, 10.0 ** (low + decades), 300.0, 20.0, logarithmic=True)
    assert float(scale(10.0 ** (low + share * decades))) == pytest.approx(300.0 - 280.0 * share, abs=1e-6)
    assert 1 <= len(scale.ticks()) <= 10


@given(size=st.integers(2, 5000), columns=st.integers(1, 400), seed=st.integers(0, 99))
def test_no_extreme_is_lost_where_samples_are_many(size, columns, seed):
    columns = min(columns, size)
    light = np.random.default_rng(seed).normal(size=size)
    places, low, high = extent(np.arange(size), light, columns)
    assert places.size == low.size == high.size == columns
    assert low.min() == light.min()
    assert high.max() == light.max()
    holds = np.searchsorted(places, np.arange(size), side="right") - 1
    assert (low[holds] <= light).all()
    assert (light <= high[holds]).all()


def test_lines_marks_and_words_stand_where_they_were_put():
    chart = Chart((0.0, 10.0), (0.0, 100.0), "time (s)", "light (%)")
    chart.line(np.array([0.0, 10.0]), np.array([0.0, 100.0]), "light")
    chart.marks([(5.0, 50.0, "half way"), (11.0, 50.0, "beyond the axis")], "circle", "light")
    drawn = chart.figure("A line", "From 0 to 100 %.")
    ends = [
        tuple(map(float, pair))
        for pair in re.findall(r"([\d.]+) ([\d.]+)", re.search(r'd="(M58[^"]+)" class="line', drawn)[1])
    ]
    middle = tuple(map(float, re.search(r"translate\(([\d.]+) ([\d.]+)\)[^>]*><title>half way", drawn).groups()))
    assert middle == pytest.approx(np.mean(ends, axis=0), abs=0.1)
    assert ends[0][1] > ends[1][1], "more is higher"
    assert "beyond the axis" not in drawn
    assert 'aria-label="A line. From 0 to 100 %."' in drawn
    assert "time (s)" in drawn
    assert "light (%)" in drawn


def test_equal_values_do_not_upset_the_axes():
    chart = Chart((0.0, 0.0), (3.0, 3.0), "x", "y")
    chart.line(np.array([0.0, 0.0]), np.array([3.0, 3.0]), "light")
    assert "nan" not in chart.figure("Flat", "Nothing moves.")
