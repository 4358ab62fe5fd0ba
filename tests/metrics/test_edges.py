"""Edges of known shape: straight ramps and exponentials, by hand."""

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from flicker.errors import NotMeasurable
from flicker.metrics import Observation
from flicker.metrics.edges import decay_time, fall_time, rise_time
from flicker.signal.edges import decay_tail
from flicker.waveforms import pwm, rectified_sine, sampled, sine, triangle


def cycle_of(light, *, noise=0.002, sample_rate=50_000.0, duration=0.5, seed=1):
    return Observation(sampled(light, sample_rate=sample_rate, duration=duration, noise=noise, seed=seed)).cycle


def ramps(frequency, duty, rise, fall):
    """Light with straight edges that take `rise` and `fall` from 10 to 90 %."""

    def at(times):
        phase = (times * frequency) % 1.0
        up, down = rise * frequency / 0.8, fall * frequency / 0.8
        return 2 * np.clip(np.minimum(phase / up, 1 - (phase - duty) / down), 0.0, 1.0)

    return at


@given(
    frequency=st.floats(80.0, 400.0),
    duty=st.floats(0.3, 0.6),
    rise=st.floats(0.02, 0.1),
    fall=st.floats(0.02, 0.1),
    seed=st.integers(0, 1000),
)
@settings(max_examples=12, deadline=None)
def test_straight_edges(frequency, duty, rise, fall, seed):
    cycle = cycle_of(ramps(frequency, duty, rise / frequency, fall / frequency), seed=seed)
    assert rise_time(cycle).value == pytest.approx(rise / frequency, rel=0.03, abs=20e-6)
    assert fall_time(cycle).value == pytest.approx(fall / frequency, rel=0.03, abs=20e-6)


@given(
    frequency=st.floats(50.0, 200.0),
    share=st.floats(0.02, 0.12),
    low_level=st.floats(0.0, 0.6),
    seed=st.integers(0, 1000),
)
@settings(max_examples=12, deadline=None)
def test_the_decay_of_a_slow_emitter(frequency, share, low_level, seed):
    decay = share / frequency
    got = decay_time(cycle_of(pwm(frequency, 0.4, low_level, decay).at, seed=seed))
    assert got.value == pytest.approx(decay, rel=0.02)
    assert got.high - got.low < 0.1 * decay


def test_the_fall_of_an_exponential():
    """ln 9 = 2.197 decay times from 90 to 10 % of the way to a pause that is long."""
    assert fall_time(cycle_of(pwm(61.3, 0.4, decay=1e-3).at)).value == pytest.approx(math.log(9) * 1e-3, rel=0.01)


def test_the_tail_of_one_emitter_beside_another():
    def mixed(times):
        return 0.6 * pwm(120.7, 0.3).at(times) + 0.4 * pwm(120.7, 0.3, decay=3e-3).at(times)

    assert decay_time(cycle_of(mixed)).value == pytest.approx(3e-3, rel=0.02)


def test_a_phosphor_that_outlasts_the_pause():
    """8.5 ms at 240 Hz: a quarter of a decay time is seen."""
    got = decay_time(cycle_of(pwm(240.3, 0.5, decay=8.5e-3).at, noise=0.001))
    assert got.low <= 8.5e-3 <= got.high
    assert got.value == pytest.approx(8.5e-3, rel=0.05)


@pytest.mark.parametrize("noise", [0.0005, 0.01, 0.05])
@pytest.mark.parametrize("light", [sine(100.3, 0.5), triangle(100.3, 0.5), rectified_sine(50.1), pwm(240.3, 0.3)])
def test_no_tail_is_invented(light, noise):
    with pytest.raises(NotMeasurable):
        decay_time(cycle_of(light.at, noise=noise))


@pytest.mark.parametrize("noise", [0.0005, 0.01, 0.05])
def test_straight_edges_have_no_tail(noise):
    with pytest.raises(NotMeasurable):
        decay_time(cycle_of(ramps(123.4, 0.4, 300e-6, 500e-6), noise=noise))


@pytest.mark.parametrize("light", [sine(100.3, 0.5), triangle(100.3, 0.5), rectified_sine(50.1)])
def test_light_without_edges_says_so(light):
    for measure in (rise_time, fall_time):
        with pytest.raises(NotMeasurable, match="no edges"):
            measure(cycle_of(light.at))


def test_edges_that_the_samples_do_not_resolve():
    with pytest.raises(NotMeasurable, match="faster than the samples resolve"):
        rise_time(cycle_of(pwm(240.3, 0.3).at))


@pytest.mark.parametrize("noise", [0.0, 0.005, 0.02])
@pytest.mark.parametrize("bins", [100, 400, 1000])
@pytest.mark.parametrize("second", [0.0, 0.1, 0.2])
def test_the_foot_of_a_slow_sine_is_no_tail(bins, second, noise):
    """Definition: a tail is what follows a switched edge; a sine has none."""
    phase = np.arange(bins) / bins
    light = 1 + 0.5 * np.sin(2 * np.pi * phase) + 0.5 * second * np.sin(4 * np.pi * phase + 1)
    for seed in range(10):
        assert decay_tail(light + np.random.default_rng(seed).normal(0, 0.5 * noise, bins), 0.5 * noise) is None
