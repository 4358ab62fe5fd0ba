"""SVM against exact lines of known waveforms, by the formula of IEC TR 63158 (threshold from memory)."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from flicker.errors import NotMeasurable
from flicker.metrics import Observation
from flicker.metrics.stroboscopic import svm
from flicker.signal.stroboscopic import power_law_threshold, sine_threshold, stroboscopic_visibility
from flicker.waveforms import pwm, rectified_sine, sampled, sine, triangle


def measured(light, *, duration=1.0, sample_rate=20_000.0, noise=1e-3, seed=1, **how):
    trace = sampled(light, sample_rate=sample_rate, duration=duration, noise=noise, seed=seed, **how)
    return svm(trace, Observation(trace))


def exact(waveform):
    harmonics = np.arange(1, max(int(2000 / waveform.frequency), 1) + 1)
    return stroboscopic_visibility(harmonics * waveform.frequency, waveform.amplitudes(harmonics.size))


@pytest.mark.parametrize("samples", [58, 70, 112, 200])
def test_a_whole_number_of_samples_a_cycle_folds_harmonics_and_the_interval_holds_that(samples):
    """Samples of |sin| at so few phases cannot tell its low harmonics from those near a multiple of their number."""
    light = rectified_sine(52.6)
    found = measured(light.at, sample_rate=light.frequency * samples, duration=1.5, noise=1e-5)
    truth = exact(light)
    assert found.low < truth < found.high
    assert found.high - found.low < 0.01 * truth
    assert abs(found.value - truth) > 1e-6, "it folds"


THRESHOLDS = [  # frequency [Hz], threshold of IEC TR 63158, threshold of Perz et al. 2018; computed from the formulas
    (80.0, 0.24288, 0.24975),
    (100.0, 0.25628, 0.25992),
    (240.0, 0.41460, 0.35983),
    (306.6, 0.50000, 0.42175),
    (1000.0, 0.97319, 1.44434),
    (2000.0, 0.99984, 3.77815),
]


@pytest.mark.parametrize(("frequency", "first", "later"), THRESHOLDS)
def test_thresholds(frequency, first, later):
    assert float(sine_threshold(frequency)) == pytest.approx(first, abs=6e-6)
    assert float(power_law_threshold(frequency)) == pytest.approx(later, abs=6e-6)


TABLE = [  # waveform, figure by the threshold of IEC TR 63158 and by the later one; exact lines up to 2 kHz
    (pwm(100.0, 0.5), 4.9704, 4.9026),
    (pwm(120.0, 0.25), 6.6396, 6.8106),
    (pwm(240.0, 0.1), 4.9589, 5.6530),
    (pwm(1000.0, 0.25), 1.9657, 1.2493),
    (pwm(2000.0, 0.5), 1.2734, 0.3370),
    (rectified_sine(50.0), 2.6019, 2.5656),
    (rectified_sine(60.0), 2.4186, 2.4582),
]


@pytest.mark.parametrize(("waveform", "first", "later"), TABLE)
def test_exact_lines(waveform, first, later):
    harmonics = np.arange(1, int(2000 / waveform.frequency) + 1)
    lines = (harmonics * waveform.frequency, waveform.amplitudes(harmonics.size))
    assert stroboscopic_visibility(*lines) == pytest.approx(first, abs=6e-5)
    assert stroboscopic_visibility(*lines, power_law_threshold) == pytest.approx(later, abs=6e-5)


@pytest.mark.parametrize("frequency", [100.0, 100.25, 100.5, 80.3, 1999.3])
def test_a_sine_between_two_bins_loses_nothing(frequency):
    """By hand: a sine of full depth reads 1 / T; bins of 1 s alone would read up to 23 % less."""
    got = measured(sine(frequency).at)
    assert got.value == pytest.approx(1 / float(sine_threshold(frequency)), abs=0.002)


@given(
    kind=st.sampled_from(["sine", "triangle", "rectified", "pwm"]),
    frequency=st.floats(30.0, 3000.0),
    depth=st.floats(0.02, 1.0),
    duty=st.floats(0.05, 0.9),
    duration=st.floats(1.0, 1.6),
    seed=st.integers(0, 10_000),
)
@settings(max_examples=25, deadline=None)
def test_any_frequency_and_any_duration_from_a_second_on(kind, frequency, depth, duty, duration, seed):
    frequency *= 1.000271  # else samples of a few phases fold lines from above onto the lines below
    waveform = {
        "sine": lambda: sine(frequency, depth),
        "triangle": lambda: triangle(frequency, depth),
        "rectified": lambda: rectified_sine(frequency / 2),
        "pwm": lambda: pwm(frequency, duty, 1 - depth),
    }[kind]()
    if min(abs(k * frequency / edge - 1) for k in range(1, 70) for edge in (80.0, 2000.0)) < 1e-4:
        return  # on the end of the band, where the figure jumps
    got = measured(waveform.at, duration=duration, seed=seed, sample_rate=20_000.0 if kind == "sine" else 50_000.0)
    expected = exact(waveform)
    assert abs(got.value - expected) <= 0.005 + 0.002 * expected


@given(mean=st.floats(1e-3, 1e3), start=st.floats(0.0, 1.0))
@settings(max_examples=10, deadline=None)
def test_is_blind_to_gain_and_to_when_the_capture_starts(mean, start):
    waveform = triangle(123.4, 0.3)
    assert measured(waveform.at, mean=mean, start=start).value == pytest.approx(exact(waveform), abs=1e-3)


def test_intervals_hold_the_truth():
    """A 95 % interval: of 80 independent captures at least 70 hold it (binomial, 99.9 %)."""
    random = np.random.default_rng(5)
    held = 0
    for seed in range(80):
        waveform = sine(float(random.uniform(90, 900)), float(random.uniform(0.05, 0.8)))
        got = measured(waveform.at, noise=float(random.uniform(0.002, 0.05)), seed=seed)
        held += got.low <= exact(waveform) <= got.high
    assert held >= 70


@pytest.mark.parametrize("noise", [0.01, 0.1])
def test_noise_alone_adds_nothing(noise):
    got = measured(lambda times: np.ones(times.shape), noise=noise)
    assert got.value == 0.0
    assert 0 < got.high < noise


def test_light_above_the_band_does_not_count():
    got = measured(pwm(3217.0, 0.4).at)
    assert got.value == 0.0


def test_two_lights_pool_by_the_power_of_3_7():
    one, other = sine(100.13, 0.2), sine(731.7, 0.4)
    ratios = [0.2 / sine_threshold(100.13), 0.4 / sine_threshold(731.7)]
    expected = float(np.sum(np.power(ratios, 3.7)) ** (1 / 3.7))
    got = measured(lambda times: one.at(times) + other.at(times) - 1.0)
    assert got.value == pytest.approx(expected, abs=1e-3)


def test_more_lines_than_the_search_takes_at_once():
    tones = np.array([101.3, 157.9, 233.1, 377.7, 511.3, 703.9, 997.1, 1301.7])
    expected = stroboscopic_visibility(tones, np.full(tones.size, 0.05))
    got = measured(lambda times: 1 + 0.05 * np.cos(2 * np.pi * np.outer(tones, times)).sum(axis=0))
    assert got.value == pytest.approx(expected, rel=2e-3)


def test_a_line_on_the_end_of_the_band_counts_and_is_doubted():
    """By hand: 2000 Hz is included; without that line nothing is left."""
    got = measured(sine(2000.0, 0.5).at, noise=0.01)
    assert got.value == pytest.approx(0.5 / float(sine_threshold(2000.0)), abs=0.002)
    assert got.low < 0.01
    assert "with and without" in got.method


@pytest.mark.parametrize(
    ("how", "words"),
    [
        ({"duration": 0.5}, "at least 1 s is needed, and the capture has 0.5 s"),
        ({"sample_rate": 4000.0}, "record above 4 kHz"),
    ],
)
def test_says_what_is_missing(how, words):
    with pytest.raises(NotMeasurable, match=words):
        measured(sine(100.0, 0.5).at, **how)


def test_a_lost_mean_is_no_figure():
    trace = sampled(sine(100.0, 0.5).at, sample_rate=20_000.0, duration=1.0, noise=0.01, seed=1).replace(
        mean_known=False
    )
    with pytest.raises(NotMeasurable, match="lost the mean"):
        svm(trace, Observation(trace))


def test_the_dark_levels_uncertainty_widens_the_interval():
    trace = sampled(sine(100.0, 0.5).at, sample_rate=20_000.0, duration=1.0, noise=0.001, seed=1)
    sure, doubtful = (svm(trace, Observation(trace, dark_uncertainty=error)) for error in (0.0, 0.01))
    assert doubtful.high - doubtful.value == pytest.approx(1.96 * 0.01 * sure.value, rel=0.05), "by hand: in proportion"
