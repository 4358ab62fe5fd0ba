"""Measures along a capture: truths from closed forms, windows that respect gaps, light that changes."""

import numpy as np
import pytest

from flicker.along import Window, throughout, windows_of
from flicker.analysis import measure
from flicker.errors import InputError
from flicker.plots.along import draw_along
from flicker.report.along import along_words
from flicker.results import Measure
from flicker.trace import Capture, Segment, Trace
from flicker.waveforms import pwm, sampled, sine

RATE = 20_000.0


def channel_of(trace, window=0.25):
    return measure(Capture((trace,)), window=window).captures[0].channels[0]


def joined(*lights, seconds=0.5, noise=0.003):
    return sampled(
        lambda times: np.select([times < (n + 1) * seconds for n in range(len(lights))], [at(times) for at in lights]),
        sample_rate=RATE,
        duration=seconds * len(lights),
        noise=noise,
        seed=4,
    )


@pytest.mark.parametrize("light", [sine(101.3, 0.3), pwm(243.7, 0.3, 0.2)])
def test_the_same_light_in_every_window(light):
    along = channel_of(sampled(light.at, sample_rate=RATE, duration=1.0, noise=0.01, seed=2)).along
    assert along.same is True
    assert [window.start for window in along.windows] == pytest.approx([0.0, 0.25, 0.5, 0.75])
    for window in along.windows:
        assert window.measures["percent_flicker"].value == pytest.approx(light.percent_flicker, abs=0.5)
        assert window.measures["fundamental_frequency"].value == pytest.approx(light.frequency, rel=1e-3)
        assert "1 s" in window.measures["svm"].reason
    data = along.to_dict()
    assert data["windows"][1]["start_s"] == pytest.approx(0.25)
    assert data["throughout"]["percent_flicker"]["windows"] == 4


def test_a_depth_that_changes_is_told_with_its_times():
    channel = channel_of(joined(sine(101.3, 0.3).at, sine(101.3, 0.36).at))
    depth = channel.along.throughout["percent_flicker"]
    assert depth.same is False
    assert channel.along.throughout["fundamental_frequency"].same is True
    assert depth.smallest == pytest.approx(30, abs=0.5)
    assert depth.largest == pytest.approx(36, abs=0.5)
    assert depth.smallest_at in (0.0, 0.25)
    assert depth.largest_at in (0.5, 0.75)
    words = list(along_words(channel.along))
    assert "NOT the same throughout" in words[0]
    assert "percent flicker" in words[0]


def test_a_flicker_that_stops_is_not_the_same_light():
    along = channel_of(joined(sine(101.3, 0.3).at, lambda times: np.ones_like(times))).along
    assert along.throughout["fundamental_frequency"].same is False
    assert along.throughout["fundamental_frequency"].windows == 2
    assert along.windows[3].measures["fundamental_frequency"].reason


def test_no_window_reaches_over_a_gap():
    trace = Trace(np.arange(2500.0), 1000.0, segments=(Segment(0, 0.0), Segment(900, 5.0)))
    parts = windows_of(trace, 0.4)
    assert [part.start for part in parts] == pytest.approx([0.0, 0.4, 5.0, 5.4, 5.8, 6.2])
    assert [part.light[0] for part in parts] == [0, 400, 900, 1300, 1700, 2100]
    assert {part.samples for part in parts} == {400}


@pytest.mark.parametrize(("length", "words"), [(1e-3, "holds 1 samples"), (3.0, "1.6 s were recorded without a gap")])
def test_says_which_window_cannot_be(length, words):
    with pytest.raises(InputError, match=words):
        windows_of(Trace(np.arange(2500.0), 1000.0, segments=(Segment(0, 0.0), Segment(900, 5.0))), length)


def windows_with(values, half):
    return tuple(
        Window(float(n), 1.0, 1e4, {"svm": Measure(v, "1", v - half, v + half), "fundamental_frequency": STEADY})
        for n, v in enumerate(values)
    )


STEADY = Measure.missing("Hz", "steady")


def test_the_test_holds_its_level_and_sees_a_step():
    """Chi-square at 1 in 1,000: values drawn by their own intervals; a step of 6 standard errors."""
    random = np.random.default_rng(7)
    false = [throughout("svm", windows_with(random.normal(1, 0.01, 10), 0.0196)).same for _ in range(400)]
    assert false.count(False) <= 1
    seen = [
        throughout("svm", windows_with(random.normal(1, 0.01, 10) + 0.06 * (np.arange(10) > 4), 0.0196)).same
        for _ in range(50)
    ]
    assert not any(seen)


def test_the_picture_says_what_it_shows():
    figure = draw_along(channel_of(joined(sine(101.3, 0.3).at, sine(101.3, 0.36).at)), "lamp")
    labels = [axes.get_ylabel() for axes in figure.axes]
    assert labels[:2] == ["frequency (Hz)", "percent flicker (%)"]
    assert [text.get_text() for text in figure.axes[1].texts] == ["changes by more than the intervals allow"]
