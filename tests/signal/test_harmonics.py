"""Frequency and harmonics against closed forms, the Cramer-Rao bound and scipy's own least squares."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.optimize import least_squares

from flicker import waveforms
from flicker.signal.harmonics import Series, fit_harmonics, longest_gap
from flicker.trace import Segment


def series(light, sample_rate, duration, noise=0.0, seed=0):
    trace = waveforms.sampled(light, sample_rate=sample_rate, duration=duration, noise=noise, seed=seed)
    return Series.of(trace.light, sample_rate)


def cramer_rao(frequency, amplitudes, noise, samples, duration):
    """Rife and Boorstyn 1974, all harmonics pooled: effective amplitude squared sum (k A_k)^2 (from memory)."""
    pooled = np.sqrt(np.sum((np.arange(1, amplitudes.size + 1) * np.abs(amplitudes)) ** 2))
    return np.sqrt(6) / np.pi * noise / pooled / (duration * np.sqrt(samples))


def test_the_error_of_the_frequency_meets_the_cramer_rao_bound():
    frequency, noise, samples = 120.37, 0.1, 4000
    errors, claimed = [], []
    for seed in range(120):
        light = waveforms.sine(frequency)
        found = fit_harmonics(series(light.at, 20e3, samples / 20e3, noise, seed), frequency * 1.001)
        errors.append(found.frequency - frequency)
        claimed.append(found.frequency_error)
    bound = cramer_rao(frequency, np.array([1.0]), noise, samples, samples / 20e3)
    assert np.std(errors) == pytest.approx(bound, rel=0.2), "Rife and Boorstyn 1974"
    assert np.median(claimed) == pytest.approx(bound, rel=0.2)


def test_every_harmonic_sharpens_the_frequency():
    pulse = waveforms.pwm(200.0, 0.1, decay=2e-4)  # the emitter keeps the lines below the Nyquist frequency
    errors = [fit_harmonics(series(pulse.at, 100e3, 0.2, 0.02, seed), 200.05).frequency - 200.0 for seed in range(60)]
    amplitudes = pulse.amplitudes(249)
    bound = cramer_rao(200.0, amplitudes, 0.02, 20_000, 0.2)
    assert np.sqrt(np.mean(np.square(errors))) < 1.35 * bound
    assert bound < 0.3 * cramer_rao(200.0, amplitudes[:1], 0.02, 20_000, 0.2)


@given(
    frequency=st.floats(40, 900),
    cycles=st.floats(3.2, 80),
    depth=st.floats(0.05, 1),
    phase=st.floats(0, 1),
    second=st.floats(0, 0.5),
)
@settings(max_examples=30, deadline=None)
def test_noiseless_harmonics_come_back(frequency, cycles, depth, phase, second):
    def light(times):
        turns = frequency * times + phase
        return 1 + depth * (np.cos(2 * np.pi * turns) + second * np.sin(4 * np.pi * turns))

    found = fit_harmonics(series(light, 10e3, cycles / frequency), frequency * (1 + 0.1 / cycles), harmonics=2)
    assert found.frequency == pytest.approx(frequency, rel=3e-5)
    assert found.mean == pytest.approx(1, abs=1e-3 * depth)
    assert np.abs(found.amplitudes) == pytest.approx([depth, depth * second], abs=2e-3 * depth)


def test_agrees_with_scipy_least_squares():
    noisy = series(waveforms.triangle(333.3, 0.4).at, 20e3, 0.0733, 0.02, 4)
    found = fit_harmonics(noisy, 333.0, harmonics=5)
    times = np.arange(noisy.values.size) / 20e3

    def columns(frequency):
        turns = 2 * np.pi * frequency * np.outer(times, np.arange(1, 6))
        return np.hstack([np.ones((times.size, 1)), np.cos(turns), np.sin(turns)])

    def left(frequency):
        matrix = columns(frequency[0])
        return matrix @ np.linalg.lstsq(matrix, noisy.values, rcond=None)[0] - noisy.values

    reference = least_squares(left, [333.0], x_scale=0.1, xtol=1e-14, ftol=1e-14)
    assert found.frequency == pytest.approx(reference.x[0], abs=0.02 * found.frequency_error)


def test_segments_keep_their_true_times():
    light = waveforms.pwm(241.7, 0.3)
    first, second = np.arange(4000) / 20e3, 0.5137 + np.arange(4000) / 20e3
    values = np.concatenate([light.at(first), light.at(second)])
    gapped = Series.of(values, 20e3, (Segment(0, 0.0), Segment(4000, 0.5137)))
    joined = Series.of(values, 20e3)
    assert fit_harmonics(gapped, 241.7).frequency == pytest.approx(241.7, rel=1e-5)
    assert fit_harmonics(gapped, 241.7).noise < 0.2 * fit_harmonics(joined, 241.7).noise


def test_the_longest_gap_runs_around_the_circle():
    count = np.zeros(100)
    count[[10, 50]] = 1
    assert longest_gap(count) == pytest.approx(0.59)
    assert longest_gap(np.ones(10)) == 0.0
