"""The main job over random lights: frequency, depth, index and region of two hundred captures with noise."""

import numpy as np
import pytest

import flicker
from flicker import waveforms
from flicker.trace import Capture

CASES, PARTS = 200, 8


def bounds(frequency):
    """IEEE 1789-2015, low risk and no observable effect [%] (from memory)."""
    low, none = (0.025, 0.01) if frequency < 90 else (0.08, 1 / 30)
    free = 1e9
    return (low * frequency if frequency <= 1250 else free), (none * frequency if frequency <= 3000 else free)


def true_region(waveform, sample_rate):
    """Region of the worst of the whole depth and each line below the Nyquist frequency; None where it is too close."""
    count = max(1, int(np.ceil(sample_rate / 2 / waveform.frequency)) - 1)
    places = [(waveform.frequency, waveform.percent_flicker)]
    heights = 100 * np.abs(waveform.amplitudes(count))
    places += [((k + 1) * waveform.frequency, height) for k, height in enumerate(heights)]
    worst = 0
    for frequency, depth in places:
        for rank, bound in enumerate(reversed(bounds(frequency)), start=1):
            if abs(depth / bound - 1) < 0.03:
                return None
            worst = max(worst, rank if depth > bound else 0)
    return ("no-observable-effect", "low-risk", "above-low-risk")[worst]


def random_light(random):
    frequency = np.exp(random.uniform(np.log(40), np.log(6000)))
    low_level = random.uniform(0, 0.8)
    if random.random() < 0.4:
        return waveforms.sine(frequency, 1 - low_level)
    return waveforms.pwm(frequency, random.uniform(0.05, 0.95), low_level)


@pytest.mark.parametrize("part", range(PARTS))
def test_random_lights_read_as_they_are(part):
    random = np.random.default_rng(1000 + part)
    for case in range(CASES // PARTS):
        light, duration = random_light(random), random.uniform(0.2, 1.2)
        noise = 10 ** -(random.uniform(40, 60) / 20)
        frequency, shift = light.frequency, random.random()
        sample_rate = float(random.choice([50e3, 96e3, 100e3, 192e3]))
        trace = waveforms.sampled(
            lambda t, light=light, shift=shift: light.at(t + shift / light.frequency),
            sample_rate=sample_rate,
            duration=duration,
            noise=noise,
            seed=case,
        )
        channel = flicker.measure(Capture((trace,))).captures[0].channels[0]
        lines = np.abs(light.amplitudes(max(1, int(sample_rate / 2 / frequency))))
        pooled = np.sqrt(np.sum((np.arange(1, lines.size + 1) * lines) ** 2))
        cramer_rao = np.sqrt(6) / np.pi * noise / pooled / (duration * np.sqrt(trace.samples))
        told = (light.name, frequency, light.percent_flicker, light.duty_cycle, sample_rate, duration, noise)
        error = abs(channel.measures["fundamental_frequency"].value - frequency)
        assert error <= max(50e-6 * frequency, 4 * cramer_rao), told
        assert channel.measures["percent_flicker"].value == pytest.approx(light.percent_flicker, abs=0.5), told
        assert channel.measures["flicker_index"].value == pytest.approx(light.flicker_index, abs=0.005), told
        region = true_region(light, sample_rate)
        assert region in (None, channel.risk_region.region), told
