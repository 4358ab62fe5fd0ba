"""Depth, index and RMS against closed forms, and against what noise, ambient light and a lost mean do to them."""

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import flicker
from flicker import waveforms
from flicker.trace import Capture, Trace


def measured(light, *, sample_rate=50e3, duration=0.317, noise=0.001, seed=0, **conditions):
    trace = waveforms.sampled(light, sample_rate=sample_rate, duration=duration, noise=noise, seed=seed, **conditions)
    return flicker.measure(Capture((trace,))).captures[0].channels[0]


REFERENCE = [
    # waveform                                   percent flicker, index, source
    (waveforms.sine(131.7, 0.3), 30.0, 0.3 / math.pi, "definition; flicker index m / pi of a sine, by hand"),
    (waveforms.pwm(311.3, 0.3), 100.0, 0.7, "definition; flicker index 1 - D of a pulse, by hand"),
    (waveforms.pwm(311.3, 0.3, 1 / 3), 50.0, 0.2625, "2 m D (1 - D) / (1 - m + 2 m D) at m = 0.5, by hand"),
    (waveforms.triangle(97.1, 0.8), 80.0, 0.2, "flicker index m / 4 of a triangle, by hand"),
    (waveforms.rectified_sine(50.0), 100.0, 0.210514, "cos t - 1 + 2 t / pi, t = asin(2 / pi), by hand"),
    (waveforms.pwm(240.0, 0.5, decay=8.5e-3), 12.1939, 0.030561, "tanh((1 - D) T / 2 tau): one-pole emitter, by hand"),
    (waveforms.pwm(120.0, 0.1, decay=1e-3), 99.8894, 0.578636, "one-pole emitter, by hand"),
]


@pytest.mark.parametrize(("waveform", "depth", "index", "source"), REFERENCE)
def test_agrees_with_its_reference(waveform, depth, index, source):
    measures = measured(waveform.at).measures
    assert measures["percent_flicker"].value == pytest.approx(depth, abs=0.15), source
    assert measures["flicker_index"].value == pytest.approx(index, abs=5e-4), source
    assert measures["rms_modulation"].value == pytest.approx(waveform.rms_modulation, rel=2e-3), source


def test_noise_is_not_flicker():
    measure = measured(np.ones_like, sample_rate=100e3, duration=1.0, noise=0.002).measures["percent_flicker"]
    assert measure.value < 0.1, "half peak to peak of 100,000 samples would read 0.9"
    assert measure.low == 0.0
    assert measure.high < 0.1


def test_shallow_ripple_under_noise_is_not_read_too_deep():
    values = [
        measured(waveforms.sine(100.0, 0.01).at, sample_rate=10e3, noise=0.03, seed=seed)
        .measures["percent_flicker"]
        .value
        for seed in range(40)
    ]
    assert np.mean(values) == pytest.approx(1.0, abs=0.04), "the naive figure is above 10"


def test_ambient_light_dilutes_as_it_must():
    light = waveforms.sine(120.3, 0.08)
    measure = measured(lambda t: light.at(t) + 0.05, noise=0.0005).measures["percent_flicker"]
    assert measure.value == pytest.approx(7.619, abs=0.02), "m / (1 + r), by hand"


@given(gain=st.floats(1e-3, 1e3), shift=st.floats(0, 1), dark=st.floats(-2, 2))
@settings(max_examples=15, deadline=None)
def test_is_blind_to_gain_dark_level_and_where_the_cycle_starts(gain, shift, dark):
    light = waveforms.pwm(211.1, 0.37, 0.2)
    trace = waveforms.sampled(light.at, sample_rate=20e3, duration=0.2, start=shift / 211.1, mean=gain, dark_level=dark)
    measures = flicker.measure(Capture((trace,))).captures[0].channels[0].measures
    assert measures["percent_flicker"].value == pytest.approx(light.percent_flicker, abs=0.02)
    assert measures["flicker_index"].value == pytest.approx(light.flicker_index, abs=1e-3)


def test_turning_time_round_changes_nothing():
    trace = waveforms.sampled(
        waveforms.pwm(300.7, 0.2, decay=3e-4).at, sample_rate=50e3, duration=0.3, noise=0.002, seed=5
    )
    forward, backward = (
        flicker.measure(Capture((Trace(light, 50e3),))).captures[0].channels[0].measures
        for light in (trace.light, trace.light[::-1].copy())
    )
    for name in ("percent_flicker", "flicker_index", "rms_modulation"):
        assert forward[name].value == pytest.approx(backward[name].value, rel=2e-3)


@pytest.mark.parametrize("phases", [10, 20, 25])
def test_a_rate_that_is_a_multiple_of_the_frequency_does_no_harm(phases):
    light = waveforms.sine(20e3 / phases, 0.8)
    measure = measured(light.at, sample_rate=20e3, duration=0.1, noise=0.005, seed=2).measures["percent_flicker"]
    assert measure.value == pytest.approx(80.0, abs=0.15)


def test_two_lights_add_their_swings():
    ripple, switched = waveforms.sine(100.0, 0.1), waveforms.pwm(4003.0, 0.5, 0.5)
    channel = measured(lambda t: 0.5 * ripple.at(t) + 0.5 * switched.at(t), sample_rate=100e3)
    high, low = 0.5 * 1.1 + 0.5 * 4 / 3, 0.5 * 0.9 + 0.5 * 2 / 3
    assert channel.measures["percent_flicker"].value == pytest.approx(100 * (high - low) / (high + low), abs=0.3)
    assert [family.percent_flicker.value for family in channel.families] == pytest.approx([16.667, 5.0], abs=0.15)


def test_without_a_mean_level_there_is_no_depth():
    light = waveforms.sine(100.0, 0.5)
    trace = Trace(light.at(np.arange(4000) / 10e3) - 1, 10e3, mean_known=False)
    channel = flicker.measure(Capture((trace,))).captures[0].channels[0]
    for name in ("percent_flicker", "flicker_index", "rms_modulation"):
        assert channel.measures[name].value is None
        assert "--mean" in channel.measures[name].reason
    assert channel.measures["fundamental_frequency"].value == pytest.approx(100.0, abs=1e-3)
    assert channel.risk_region is None


def test_the_uncertainty_of_the_dark_level_widens_the_interval():
    trace = waveforms.sampled(waveforms.sine(100.0, 0.3).at, sample_rate=10e3, duration=0.5, noise=0.001, seed=1)
    sure, unsure = (
        flicker.measure(Capture((trace,)), dark_uncertainty=u).captures[0].channels[0].measures["percent_flicker"]
        for u in (0.0, 0.01)
    )
    assert unsure.high - unsure.low == pytest.approx(2 * 1.96 * 30 * 0.01, rel=0.1), "d(PF) / PF = dark / mean, by hand"
    assert sure.high - sure.low < 0.2
