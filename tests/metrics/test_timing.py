"""Frequency and duty cycle, with the clock's uncertainty."""

import pytest

import flicker
from flicker import waveforms
from flicker.trace import Capture


def measures_of(light, *, clock_ppm=0.0, noise=0.002, duration=0.4):
    trace = waveforms.sampled(light, sample_rate=50e3, duration=duration, noise=noise, seed=7)
    return flicker.measure(Capture((trace,)), clock_ppm=clock_ppm).captures[0].channels[0].measures


@pytest.mark.parametrize("duty", [0.06, 0.25, 0.5, 0.81])
@pytest.mark.parametrize("low_level", [0.0, 0.6])
def test_the_duty_cycle_of_a_pulse(duty, low_level):
    measure = measures_of(waveforms.pwm(433.1, duty, low_level).at)["duty_cycle"]
    assert measure.value == pytest.approx(duty, abs=1e-3), "definition"
    assert measure.low <= duty <= measure.high


def test_the_clock_is_added_to_the_interval_and_told():
    blind, told = (
        measures_of(waveforms.sine(120.0, 0.4).at, clock_ppm=ppm)["fundamental_frequency"] for ppm in (0.0, 50.0)
    )
    assert "clock taken as exact" in blind.method
    assert told.high - told.low == pytest.approx(2 * 1.96 * 50e-6 * 120, rel=0.2), "50 ppm of 120 Hz is 6 mHz, by hand"


def test_too_short_a_capture_says_so():
    measures = measures_of(waveforms.sine(20.0, 0.4).at, duration=0.03)
    assert "record longer" in measures["fundamental_frequency"].reason
    assert "record at least two cycles" in measures["percent_flicker"].reason
