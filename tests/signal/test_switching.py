"""Edges faster than the samples: the frequency from which side of an edge each sample lies on."""

import numpy as np

from flicker.signal.families import find_families
from flicker.signal.harmonics import Series, fit_harmonics
from flicker.signal.switching import sharpen
from flicker.waveforms import pwm, sampled, sine


def series(light, sample_rate, duration, noise, seed):
    return Series.of(
        sampled(light, sample_rate=sample_rate, duration=duration, noise=noise, seed=seed).light, sample_rate
    )


def test_the_interval_holds_the_frequency_of_ideal_edges_and_is_near_what_samples_can_tell():
    random, held, ratios = np.random.default_rng(5), [], []
    for seed in range(60):
        frequency, cycles = random.uniform(100, 1000), random.uniform(12, 60)
        rate, duration = frequency * random.uniform(25, 200), cycles / frequency
        light = pwm(frequency, random.uniform(0.1, 0.9), random.uniform(0, 0.6))
        start = random.uniform(0, 1)
        found = find_families(series(lambda t, a=light.at, s=start: a(t + s), rate, duration, 0.01, seed)).families[0]
        held.append(abs(found.frequency - frequency) < 1.96 * found.frequency_error)
        ratios.append(abs(found.frequency - frequency) * duration * rate / frequency)
    assert np.mean(held) > 0.9
    assert np.median(ratios) < 0.6, "samples lie 1 / rate apart: edges at both ends cannot be told better than that"


def test_light_that_does_not_jump_keeps_its_fit():
    for light in (sine(333.3, 0.8), pwm(333.3, 0.4, 0.1, decay=2e-4)):
        smooth = series(light.at, 50e3, 0.3, 0.01, 1)
        fit = fit_harmonics(smooth, 333.3)
        assert sharpen(smooth, fit) is fit
