"""A slow detector undone: one pole on a pulse, read as the pulse again."""

import numpy as np
import pytest

import flicker
from flicker import waveforms
from flicker.conditioning.detector import undo_detector
from flicker.errors import InputError
from flicker.trace import Capture, Segment, Trace


def percent(trace):
    return flicker.measure(Capture((trace,))).captures[0].channels[0].measures["percent_flicker"]


def test_a_pulse_behind_one_pole_reads_as_the_pulse():
    """A pole of 1 kHz lets a PWM of 4 kHz, 10 % duty, read 60.9 % (derived); the truth is 100 %."""
    behind = waveforms.pwm(4003.7, 0.1, decay=1 / (2 * np.pi * 1000.0))
    slow = waveforms.sampled(behind.at, sample_rate=200e3, duration=0.2, noise=0.001, seed=1)
    assert percent(slow).value == pytest.approx(60.9, abs=0.5)
    undone = percent(undo_detector(slow, 1000.0))
    assert undone.value == pytest.approx(100.0, abs=1.0)
    assert undone.high - undone.low > percent(slow).high - percent(slow).low or undone.high == 100.0


def test_segments_are_not_joined():
    trace = Trace(np.concatenate([np.ones(10), 5 * np.ones(10)]), 1000.0, segments=(Segment(0, 0.0), Segment(10, 1.0)))
    undone = undo_detector(trace, 100.0)
    assert undone.samples == 18
    assert undone.segments == (Segment(0, 0.0), Segment(9, 1.0))
    assert set(np.round(undone.light, 9)) == {1.0, 5.0}


def test_a_bandwidth_of_nothing_is_refused():
    with pytest.raises(InputError, match="above 0 Hz"):
        undo_detector(Trace(np.ones(10), 1000.0), 0.0)
