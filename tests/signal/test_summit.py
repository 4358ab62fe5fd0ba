"""Levels at extremes: plateaus beside edges, corners, rounded tops, each against its closed form."""

import numpy as np
import pytest

from flicker.metrics import METRICS, Observation
from flicker.signal.summit import find_manner, read
from flicker.waveforms import pwm, rectified_sine, sampled, sine, triangle

LIGHTS = [
    pytest.param(pwm(240.3, 0.3, 0.1), 0.15, id="plateaus"),
    pytest.param(pwm(240.3, 0.04, 0.1), 0.3, id="narrow pulse"),
    pytest.param(triangle(240.3, 0.6), 0.15, id="corners"),
    pytest.param(rectified_sine(50.0), 0.4, id="cusp at zero"),
    pytest.param(pwm(240.3, 0.4, 0.2, decay=5e-4), 0.3, id="slow emitter"),
    pytest.param(pwm(240.3, 0.4, 0.2, decay=1e-4), 0.5, id="quick emitter"),
]


@pytest.mark.parametrize(("light", "tolerance"), LIGHTS)
@pytest.mark.parametrize("noise", [0.001, 0.03])
def test_percent_flicker_is_unbiased_whatever_stands_at_the_extremes(light, tolerance, noise):
    errors, held = [], []
    for seed in range(8):
        trace = sampled(light.at, sample_rate=23_456.0, duration=0.5, start=0.1 * seed, noise=noise, seed=seed)
        found = METRICS["percent_flicker"].of(Observation(trace))
        errors.append(found.value - light.percent_flicker)
        held.append(found.low <= light.percent_flicker <= found.high)
    assert abs(np.mean(errors)) < tolerance * (1 if noise < 0.01 else 3), "closed form of the waveform"
    assert np.mean(held) >= 0.6


def test_a_corner_is_read_where_two_curves_cross():
    observation = Observation(sampled(triangle(100.0, 0.5).at, sample_rate=13_331.0, duration=0.6, noise=0.005, seed=2))
    cycle = observation.cycle
    halves = cycle.part(slice(0, None, 2)), cycle.part(slice(1, None, 2))
    top = float(np.argmax(halves[0].levels)) / cycle.size
    manner = find_manner(halves[0], top, 0.005, 1.0, 1e-4)
    assert manner.shape == "corner"
    assert read(halves[1], manner).level == pytest.approx(1.5, abs=0.004), "top of the triangle"


def test_an_edge_is_not_crossed():
    observation = Observation(sampled(pwm(100.0, 0.2, 0.25).at, sample_rate=13_331.0, duration=0.6, noise=0.01, seed=2))
    cycle, mean = observation.cycle, 0.25 + 0.75 * 0.2
    after = float(np.flatnonzero(np.diff(cycle.levels) > 0.8)[0] + 1.5) / cycle.size
    manner = find_manner(cycle, after, 0.01, 1.0, 1e-4)
    assert manner.shape in ("right", "about")
    assert read(cycle, manner).level == pytest.approx(1 / mean, abs=0.01), "on level over mean"


def test_the_top_of_a_sine_beside_another_light_is_not_raised_by_noise():
    both = sampled(
        lambda t: 0.5 * sine(120.0, 0.2).at(t) + 0.5 * pwm(1730.0, 0.5, 0.6).at(t),
        sample_rate=50e3, duration=1.0, noise=0.02, seed=4,
    )  # fmt: skip
    families = Observation(both).families
    depths = {round(one.fundamental.value): one.percent_flicker.value for one in families}
    assert depths[120] == pytest.approx(10.0, abs=0.15), "half of a sine of 20 %"
    assert depths[1730] == pytest.approx(12.5, abs=0.15), "half of (1 - 0.6) / (1 + 0.6)"
