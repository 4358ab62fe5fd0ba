"""Depth below a frequency: exact partial sums of Fourier series, by hand."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from flicker.errors import NotMeasurable
from flicker.metrics import METRICS, Observation
from flicker.metrics.filtered import filtered_depth
from flicker.waveforms import pwm, rectified_sine, sampled, sine, triangle

RATE = 20_000.0


def observed(light, *, noise=1e-3, duration=1.0, seed=1, sample_rate=RATE, **how):
    return Observation(sampled(light, sample_rate=sample_rate, duration=duration, noise=noise, seed=seed, **how))


def below(observation, cut):
    return filtered_depth(observation.trace, observation, cut)


def partial_sum(waveform, cut):
    """Depth of the waveform's lines up to the cut, over one period."""
    count = int(cut / waveform.frequency)
    phase = np.arange(40_000) / 40_000
    lines = waveform.amplitudes(max(count, 1))[:count]
    light = 1 + (lines @ np.exp(2j * np.pi * np.outer(np.arange(1, count + 1), phase))).real if count else np.ones(1)
    return 100 * float((light.max() - light.min()) / (light.max() + light.min()))


def test_the_trap_of_short_pulses_is_not_clipped():
    """By hand: one line of 2 sin(0.1 pi) / (0.1 pi) is left, 196.7 %."""
    got = below(observed(pwm(120.137, 0.1).at), 200.0)
    assert got.value == pytest.approx(196.73, abs=0.3)
    assert "below dark" in got.method


CASES = [
    (rectified_sine(50.013), 400.0),
    (rectified_sine(60.01), 1000.0),
    (triangle(61.3, 0.4), 200.0),
    (triangle(23.7, 0.4), 90.0),
    (sine(99.7, 0.3), 200.0),
    (pwm(97.3, 0.4, 0.5), 1000.0),
]


@pytest.mark.parametrize(("waveform", "cut"), CASES, ids=lambda value: str(getattr(value, "name", value)))
def test_partial_sums(waveform, cut):
    assert below(observed(waveform.at), cut).value == pytest.approx(partial_sum(waveform, cut), rel=5e-3)


@given(
    frequency=st.floats(20.0, 190.0),
    depth=st.floats(0.02, 0.9),
    start=st.floats(0.0, 0.1),
    seed=st.integers(0, 1000),
    duration=st.floats(1.0, 1.5),
)
@settings(max_examples=15, deadline=None)
def test_a_sine_below_the_cut_keeps_its_depth(frequency, depth, start, seed, duration):
    got = below(observed(sine(frequency, depth).at, start=start, seed=seed, duration=duration), 200.0)
    assert got.value == pytest.approx(100 * depth, abs=0.15)


@given(frequency=st.floats(210.0, 5000.0), seed=st.integers(0, 1000))
@settings(max_examples=10, deadline=None)
def test_a_fundamental_above_the_cut_leaves_nothing(frequency, seed):
    got = below(observed(sine(frequency, 0.9).at, seed=seed), 200.0)
    assert got.value < 0.02
    assert got.high < 0.1


@pytest.mark.parametrize("noise", [0.01, 0.05])
def test_noise_does_not_swell_the_extremes(noise):
    """The extremes of raw samples behind the same cut lie several times as far apart."""
    seen = observed(sine(100.13, 0.04).at, noise=noise)
    spectrum = np.fft.rfft(seen.trace.light)
    spectrum[1001:] = 0
    raw = np.fft.irfft(spectrum)
    got = below(seen, 1000.0)
    assert got.value == pytest.approx(4.0, abs=4 * 100 * noise * (2 / RATE) ** 0.5)
    assert 100 * np.ptp(raw) / (raw.max() + raw.min()) > 4 * (1 + 20 * noise)
    assert below(observed(lambda times: np.ones(times.shape), noise=noise), 1000.0).value == 0.0


def test_intervals_hold_the_truth():
    """A 95 % interval: of 60 independent captures at least 51 hold it (binomial, 99.9 %)."""
    random = np.random.default_rng(8)
    held = 0
    for seed in range(60):
        depth = float(random.uniform(0.05, 0.8))
        got = below(observed(sine(float(random.uniform(30, 190)), depth).at, noise=0.02, seed=seed), 200.0)
        held += got.low <= 100 * depth <= got.high
    assert held >= 51


def test_drifts_and_single_events_count():
    """By hand: light that falls by 30 % for a fifth of a second, below 40 Hz nearly whole: (1 - 0.7) / (1 + 0.7)."""
    seen = observed(lambda times: np.where((times > 1.0) & (times < 1.2), 0.7, 1.0), noise=0.005, duration=3.0)
    spectrum = np.fft.rfft(seen.trace.light)
    spectrum[121:] = 0
    raw = np.fft.irfft(spectrum)
    expected = 100 * np.ptp(raw) / (raw.max() + raw.min())
    assert expected > 17.6
    assert below(seen, 40.0).value == pytest.approx(expected, rel=0.06)


def test_a_line_on_the_cut_counts_and_is_doubted():
    """By hand: |sin| of exactly 50 Hz has its second line at 200 Hz; with it 4/3 over 26/15, without it 2/3."""
    got = below(observed(rectified_sine(50.0).at, noise=0.01), 200.0)
    assert got.value == pytest.approx(100 * (4 / 3) / (26 / 15), abs=0.3)
    assert got.low == pytest.approx(200 / 3, abs=0.3)
    assert "with and without" in got.method


def test_five_cuts_are_registered():
    """California JA10.6 (from public summaries): 40, 90, 200, 400 and 1000 Hz."""
    names = [name for name in METRICS if name.startswith("percent_flicker_below_")]
    assert sorted(int(name.split("_")[-1].removesuffix("hz")) for name in names) == [40, 90, 200, 400, 1000]
    seen = observed(sine(60.0, 0.2).at)
    values = {name: METRICS[name].of(seen).value for name in names}
    assert values["percent_flicker_below_40hz"] < 0.02
    assert values["percent_flicker_below_90hz"] == pytest.approx(20.0, abs=0.1)


@pytest.mark.parametrize(
    ("how", "words"),
    [({"duration": 0.5}, "at least 1 s is needed"), ({"sample_rate": 1500.0}, "record above 2000 Hz")],
)
def test_says_what_is_missing(how, words):
    with pytest.raises(NotMeasurable, match=words):
        below(observed(sine(100.0, 0.2).at, **how), 1000.0)
