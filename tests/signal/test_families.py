"""Several lights in one signal, told apart; octaves; nothing found where nothing is."""

import numpy as np
import pytest

from flicker import waveforms
from flicker.signal.families import find_families
from flicker.signal.harmonics import Series


def found(light, sample_rate=50e3, duration=0.6, noise=0.005, seed=1):
    trace = waveforms.sampled(light, sample_rate=sample_rate, duration=duration, noise=noise, seed=seed)
    return find_families(Series.of(trace.light, sample_rate)).families


@pytest.mark.parametrize("seed", range(10))
def test_white_noise_has_no_family(seed):
    assert found(np.ones_like, noise=0.01, seed=seed) == ()


@pytest.mark.parametrize("duty", [0.03, 0.1, 0.25, 1 / 3, 0.5, 0.9])
def test_a_pulse_is_one_family_at_its_own_frequency(duty):
    (only,) = found(waveforms.pwm(317.3, duty).at)
    assert only.frequency == pytest.approx(317.3, rel=1e-5)


def test_every_second_pulse_weaker_is_one_light_at_half_the_frequency():
    full, half = waveforms.pwm(600.0, 0.2), waveforms.pwm(300.0, 0.1)
    (only,) = found(lambda t: 0.8 * full.at(t) + 0.2 * half.at(t))
    assert only.frequency == pytest.approx(300.0, rel=1e-5)


def test_a_missing_fundamental_is_found():
    def light(times):
        return 1 + sum(0.2 * np.cos(2 * np.pi * 110.3 * k * times + k) for k in (2, 3, 4))

    (only,) = found(light)
    assert only.frequency == pytest.approx(110.3, rel=1e-5)


@pytest.mark.parametrize(("ripple", "pulse"), [(100.0, 20_000.0), (100.0, 1000.0), (119.9, 960.3), (100.02, 2400.0)])
def test_ripple_beside_a_pwm_is_two_families(ripple, pulse):
    wave, switched = waveforms.sine(ripple, 0.08), waveforms.pwm(pulse, 0.5)
    families = found(lambda t: 0.5 * wave.at(t) + 0.5 * switched.at(t + 3.1e-6), sample_rate=100e3)
    assert sorted(fit.frequency for fit in families) == pytest.approx([ripple, pulse], rel=6e-5)
    for fit, truth in zip(sorted(families, key=lambda fit: fit.frequency), (ripple, pulse), strict=True):
        assert abs(fit.frequency - truth) < 5 * fit.frequency_error


def test_nearly_equal_lights_are_kept_apart():
    families = found(lambda t: waveforms.sine(100.0, 0.2).at(t) + waveforms.sine(107.0, 0.1).at(t) - 1, duration=1.3)
    assert [fit.frequency for fit in families] == pytest.approx([100.0, 107.0], abs=2e-3)


def test_no_octave_errors_over_random_pulses():
    random = np.random.default_rng(11)
    for seed in range(60):
        frequency, duty = np.exp(random.uniform(np.log(45), np.log(5000))), random.uniform(0.04, 0.96)
        light = waveforms.pwm(frequency, duty, random.uniform(0, 0.8))
        families = found(light.at, duration=random.uniform(0.2, 0.5), noise=10 ** -random.uniform(1.5, 3), seed=seed)
        assert families[0].frequency == pytest.approx(frequency, rel=2e-4), (frequency, duty, seed)
