"""A frequency that wanders: the cycle stays sharp, the wander itself is measured, and steady lights have none."""

import numpy as np
import pytest

from flicker.metrics import METRICS, Observation
from flicker.signal.track import Track
from flicker.waveforms import pwm, sampled, sine


def wandering(frequency, duty, low_level, deviation, rate, *, duration=1.0, noise=0.005, seed=1):
    """PWM whose frequency goes `deviation` (a share of it) to either side, `rate` times a second."""
    light = pwm(frequency, duty, low_level)

    def at(times):
        ahead = deviation / (2 * np.pi * rate) * np.sin(2 * np.pi * rate * times)  # the integral of the deviation
        return light.at(times + ahead)

    return Observation(sampled(at, sample_rate=50e3, duration=duration, noise=noise, seed=seed)), light


def figure(name, observation):
    return METRICS[name].of(observation)


@pytest.mark.parametrize("seed", range(8))
def test_a_pwm_that_wanders_by_one_percent_reads_as_one_that_does_not(seed):
    random = np.random.default_rng(seed)
    frequency, duty, low_level = random.uniform(150, 900), random.uniform(0.1, 0.9), random.uniform(0, 0.6)
    rate = random.uniform(1.2, 8)
    observation, light = wandering(frequency, duty, low_level, 0.01, rate, seed=seed)
    assert len(observation.search.families) == 1
    assert figure("percent_flicker", observation).value == pytest.approx(light.percent_flicker, abs=0.4)
    assert figure("flicker_index", observation).value == pytest.approx(light.flicker_index, abs=0.005)
    assert figure("duty_cycle", observation).value == pytest.approx(duty, abs=0.005)
    assert figure("frequency_wander", observation).value == pytest.approx(1.0, abs=0.2), "half the range, as made"
    assert figure("wander_rate", observation).value == pytest.approx(rate, abs=0.5)


def test_a_frequency_that_drifts_is_followed_and_has_no_rate():
    light = pwm(300.0, 0.4, 0.2)
    trace = sampled(
        lambda t: light.at(t + 0.5 * 0.01 * t * t), sample_rate=50e3, duration=1.0, noise=0.005, seed=3
    )  # from 300 to 303 Hz
    observation = Observation(trace)
    assert figure("fundamental_frequency", observation).value == pytest.approx(301.5, abs=0.05), "mean of the drift"
    assert figure("frequency_wander", observation).value == pytest.approx(0.5, abs=0.1)
    assert figure("percent_flicker", observation).value == pytest.approx(light.percent_flicker, abs=0.4)
    assert figure("wander_rate", observation).value is None


@pytest.mark.parametrize("seed", range(6))
def test_steady_lights_do_not_wander_alone_or_in_pairs(seed):
    random = np.random.default_rng(seed)
    light, other = pwm(random.uniform(100, 400), random.uniform(0.2, 0.8), 0.3), sine(random.uniform(500, 900), 0.5)
    for mix in (light.at, lambda t: 0.5 * light.at(t) + 0.5 * other.at(t)):
        observation = Observation(sampled(mix, sample_rate=40e3, duration=0.5, noise=0.01, seed=seed))
        assert all(fit.track is None for fit in observation.search.families)
        assert figure("frequency_wander", observation).value == 0.0


def test_a_camera_is_told_what_the_capture_shows_of_the_wander():
    from flicker.camera import Camera, predict_bands
    from flicker.light import Light

    observation, _ = wandering(240.0, 0.3, 0.1, 0.01, 3.0)
    camera = Camera(lines=1080, line_time=14.8e-6, frame_rate=25.0)
    light = Light((observation.light,))
    assert light.wander == pytest.approx(0.01, abs=0.002)
    assert predict_bands(light, camera, exposure=1 / 240).wander_contrast_percent > 0.5
    assert predict_bands(light, camera, exposure=1 / 240, wander=0.0).wander_contrast_percent is None


def test_a_track_passes_through_its_entries_smoothly():
    times = np.linspace(0, 1, 21)
    track = Track(times, np.sin(4 * np.pi * times), 0.0)
    between = np.linspace(0.1, 0.9, 501)
    assert track.at(times) == pytest.approx(track.cycles)
    assert track.at(between) == pytest.approx(np.sin(4 * np.pi * between), abs=5e-3), "the curve it was made from"
    assert track.scaled(0.5).at(times) == pytest.approx(0.5 * track.cycles)
    assert track.rate() == pytest.approx(2.0, abs=0.1)


def test_a_few_cycles_are_too_few_to_follow():
    observation, _ = wandering(240.0, 0.3, 0.1, 0.0, 3.0, duration=0.05)
    for name in ("frequency_wander", "wander_rate"):
        assert "too few to follow" in figure(name, observation).reason
