import numpy as np
import pytest

from flicker.light import Pulse
from flicker.signal.severity import severity_of, weighted_sensation
from flicker.signal.severity_lines import HIGHEST, severity_of_lines

# depth of a sine for Pst LM = 1, computed from the meter of IEC TR 61547-1 in its steady state (constants from memory)
SINES = [(0.5, 6.002), (1.0, 3.5395), (5.0, 0.8389), (8.8, 0.4175), (10.0, 0.4037), (20.0, 0.6406), (35.0, 1.4134)]
# the same for a rectangle of 50 % duty cycle: percent flicker [%]
RECTANGLES = [(0.325, 1.1969), (0.91667, 0.9655), (8.8, 0.3222), (13.5, 0.3667), (20.0, 0.5032), (33.333, 0.9416)]


@pytest.mark.parametrize(("frequency", "depth"), SINES)
def test_a_sine_of_the_known_depth_reads_one(frequency, depth):
    assert severity_of_lines(np.array([frequency]), np.array([depth / 100 + 0j]), frequency) == pytest.approx(
        1.0, rel=4e-3
    )


@pytest.mark.parametrize(("frequency", "depth"), RECTANGLES)
def test_a_rectangle_of_the_known_depth_reads_one(frequency, depth):
    level = (100 - depth) / (100 + depth)
    harmonics = np.arange(1, int(HIGHEST / frequency) + 1)
    amplitudes = Pulse(frequency, 0.5, level).amplitudes(harmonics)
    assert severity_of_lines(harmonics * frequency, amplitudes, frequency) == pytest.approx(1.0, rel=5e-3)


@pytest.mark.parametrize("frequency", [0.8, 3.1, 8.8, 21.0])
def test_agrees_with_the_meter_followed_over_time(frequency):
    pulse = Pulse(frequency, 0.3, 0.97)
    harmonics = np.arange(1, int(60.0 / frequency) + 1)
    lines, amplitudes = harmonics * frequency, pulse.amplitudes(harmonics)
    times = np.arange(120_000) / 2000.0
    light = 1.0 + (amplitudes[:, None] * np.exp(2j * np.pi * np.outer(lines, times))).real.sum(axis=0)
    felt = weighted_sensation(light, 2000.0)
    assert severity_of_lines(lines, amplitudes, frequency) == pytest.approx(severity_of(felt), rel=2e-3)
    assert severity_of_lines(lines, amplitudes, None) == pytest.approx(severity_of(felt), rel=5e-3)


def test_no_lines_read_nothing_and_twice_the_depth_reads_twice():
    assert severity_of_lines(np.zeros(0), np.zeros(0, dtype=complex), None) == 0.0
    once, twice = (severity_of_lines(np.array([8.8]), np.array([a + 0j]), 8.8) for a in (0.01, 0.02))
    assert twice == pytest.approx(2 * once)
