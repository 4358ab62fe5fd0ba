"""The mean cycle: what is folded, what is empty, what an edge inside a bin does."""

import numpy as np
import pytest

from flicker import waveforms
from flicker.errors import NotMeasurable
from flicker.signal.cycle import fold
from flicker.signal.harmonics import Series


def cycle_of(light, frequency, sample_rate=50e3, duration=0.4, noise=0.0, seed=0):
    trace = waveforms.sampled(light, sample_rate=sample_rate, duration=duration, noise=noise, seed=seed)
    return fold(Series.of(trace.light, sample_rate), frequency)


def test_the_cycle_lies_where_the_light_lies():
    light = waveforms.triangle(123.4, 0.6)
    cycle = cycle_of(light.at, 123.4)
    assert cycle.levels == pytest.approx(light.at_phase(cycle.phase + cycle.first_phase), abs=0.01)
    assert cycle.mean == pytest.approx(1, abs=1e-3)


@pytest.mark.parametrize("phases", [8, 16, 20, 53])
def test_a_commensurate_rate_gives_no_empty_bin(phases):
    cycle = cycle_of(waveforms.sine(50e3 / phases, 0.5).at, 50e3 / phases)
    assert cycle.size <= phases
    assert (cycle.counts.sum(axis=0) > 0).all()


def test_half_a_cycle_is_refused_with_the_cure():
    with pytest.raises(NotMeasurable, match="record at least two"):
        cycle_of(waveforms.sine(10.0, 0.5).at, 10.0, duration=0.05)


def test_the_standard_error_is_that_of_the_noise():
    light = waveforms.sine(200.0, 0.3)
    cycle = cycle_of(light.at, 200.0, noise=0.02, seed=3)
    off = cycle.levels - light.at_phase(cycle.phase + cycle.first_phase)
    assert cycle.noise == pytest.approx(0.02, rel=0.05)
    assert np.std(off / cycle.standard_error) == pytest.approx(1, abs=0.15)


def test_an_edge_inside_a_bin_is_shared_between_its_neighbours():
    light = waveforms.pwm(487.3, 0.271)
    cycle = cycle_of(light.at, 487.3, noise=0.002, seed=1)
    levels, shares = cycle.distribution(cycle.levels)
    assert shares.sum() == pytest.approx(1)
    variance = shares @ (levels - shares @ levels) ** 2 - np.mean(cycle.standard_error**2)
    assert 100 * np.sqrt(variance) == pytest.approx(light.rms_modulation, rel=2e-4), "rms of two levels, by hand"
    assert 100 * cycle.levels.std() < light.rms_modulation * 0.9995, "edges smeared over their bins read low"
