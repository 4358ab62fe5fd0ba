"""Predictions against a sensor that is simulated independently, over random lights and cameras."""

import numpy as np
import pytest
from sensor_simulation import Wave, contrast, frame_means, harmonics, rectangle, worst_frame

from flicker.camera import Camera, predict_bands
from flicker.light import ChannelLight, Light, pwm_light

POINTS = 0.1  # of contrast


def random_camera(rng):
    lines = int(rng.integers(40, 500))
    frame_rate = float(rng.uniform(20, 120))
    return Camera(lines=lines, line_time=float(rng.uniform(0.2, 1.0)) / frame_rate / lines, frame_rate=frame_rate)


@pytest.mark.parametrize("seed", range(40))
def test_rectangles(seed):
    rng = np.random.default_rng(seed)
    for _ in range(4):
        camera = random_camera(rng)
        frequency = float(np.exp(rng.uniform(np.log(15), np.log(60_000))))
        duty, low = float(rng.uniform(0.02, 0.98)), float(rng.choice([0.0, rng.uniform(0, 0.8)]))
        exposure = float(np.exp(rng.uniform(np.log(1 / 8000), np.log(1 / camera.frame_rate))))
        bands = predict_bands(pwm_light(frequency, duty, low), camera, exposure=exposure)
        wave = Wave(rectangle(duty, low), frequency)
        expected = worst_frame(wave, exposure, camera.line_time, camera.lines)
        assert bands.contrast_percent["all"] == pytest.approx(expected, abs=POINTS), (
            frequency,
            duty,
            low,
            exposure,
            camera,
        )


@pytest.mark.parametrize("seed", range(12))
def test_slow_emitters(seed):
    rng = np.random.default_rng(1000 + seed)
    camera = random_camera(rng)
    frequency = float(np.exp(rng.uniform(np.log(15), np.log(5_000))))
    duty, decay = float(rng.uniform(0.05, 0.95)), float(np.exp(rng.uniform(np.log(1e-4), np.log(1e-2))))
    exposure = float(np.exp(rng.uniform(np.log(1 / 4000), np.log(1 / camera.frame_rate))))
    bands = predict_bands(pwm_light(frequency, duty, 0.0, decay), camera, exposure=exposure)
    wave = Wave(rectangle(duty, 0.0, 1 / (frequency * decay)), frequency)
    expected = worst_frame(wave, exposure, camera.line_time, camera.lines)
    assert bands.contrast_percent["all"] == pytest.approx(expected, abs=POINTS), (
        frequency,
        duty,
        decay,
        exposure,
        camera,
    )


@pytest.mark.parametrize("seed", range(30))
def test_line_spectra(seed):
    rng = np.random.default_rng(2000 + seed)
    camera = random_camera(rng)
    frequency = float(np.exp(rng.uniform(np.log(15), np.log(20_000))))
    count = int(rng.integers(1, 8))
    amplitudes = rng.normal(size=count) + 1j * rng.normal(size=count)
    amplitudes *= rng.uniform(0.05, 0.95) / np.abs(amplitudes).sum()
    exposure = float(np.exp(rng.uniform(np.log(1 / 4000), np.log(1 / camera.frame_rate))))
    channel = ChannelLight("all", frequency * np.arange(1, count + 1), amplitudes, fundamentals=(frequency,))
    bands = predict_bands(Light((channel,)), camera, exposure=exposure)
    expected = worst_frame(Wave(harmonics(amplitudes), frequency), exposure, camera.line_time, camera.lines)
    assert bands.contrast_percent["all"] == pytest.approx(expected, abs=POINTS), (frequency, exposure, camera)


@pytest.mark.parametrize("seed", range(10))
def test_frame_flicker(seed):
    rng = np.random.default_rng(3000 + seed)
    camera = random_camera(rng)
    frequency = float(np.exp(rng.uniform(np.log(15), np.log(3_000))))
    duty, low = float(rng.uniform(0.02, 0.98)), float(rng.uniform(0, 0.5))
    exposure = float(np.exp(rng.uniform(np.log(1 / 2000), np.log(1 / camera.frame_rate))))
    wave = Wave(rectangle(duty, low), frequency)
    light = pwm_light(frequency, duty, low)
    for shutter, line_time in (("rolling", camera.line_time), ("global", 0.0)):
        seen = camera.changed(shutter=shutter)
        means = frame_means(wave, exposure, line_time, camera.lines if line_time else 1, camera.frame_rate, 2000)
        bands = predict_bands(light, seen, exposure=exposure)
        assert bands.frame_flicker_percent["all"] == pytest.approx(contrast(means), abs=POINTS), (shutter, frequency)
        if shutter == "global":
            assert bands.contrast_percent["all"] == 0


@pytest.mark.parametrize("seed", range(30))
def test_drift_and_period_are_those_of_the_simulated_picture(seed):
    rng = np.random.default_rng(4000 + seed)
    camera = random_camera(rng)
    lines = camera.lines
    frequency = float(rng.uniform(2.5 / camera.readout_time, 3 / camera.line_time))
    exposure = 0.3 / frequency
    light = Light((ChannelLight("all", [frequency], [0.5 + 0j], fundamentals=(frequency,)),))
    bands = predict_bands(light, camera, exposure=exposure)
    turns = frequency * camera.line_time
    if abs(turns - round(2 * turns) / 2) < 2 / lines or abs(bands.beat_frequency_hz) > 0.45 * camera.frame_rate:
        return  # no band, or no direction, to be seen
    wave = Wave(harmonics([0.5]), frequency)
    start = rng.uniform(0, 1)
    times = start + np.arange(2)[:, None] / camera.frame_rate + np.arange(lines) * camera.line_time
    rows = wave.exposed(times, exposure) - 1
    trial = np.linspace(0.5 / lines, 0.5, 40_000)  # cycles a line
    spectrum = np.abs(np.exp(-2j * np.pi * trial[:, None] * np.arange(lines)) @ (rows[0] * np.hanning(lines)))
    period = 1 / trial[int(spectrum.argmax())]
    assert bands.band_period_lines == pytest.approx(period, rel=0.02)
    assert bands.aliased == (turns > 0.5)
    assert bands.bands_per_frame == pytest.approx(lines / period, rel=0.02)
    tone = np.exp(-2j * np.pi * np.arange(lines) / bands.band_period_lines) * np.hanning(lines)
    first, second = rows @ tone
    moved = -np.angle(second / first) / (2 * np.pi) * bands.band_period_lines  # lines, towards higher numbers
    assert bands.drift_lines_per_frame == pytest.approx(moved, abs=0.03 * bands.band_period_lines)
