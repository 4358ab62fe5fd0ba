"""The demonstration captures: the same every time, and as true as they claim."""

import json
from pathlib import Path

import numpy as np
import pytest

from flicker.demo import write_captures
from flicker.demo.scenes import SCENES, softened
from flicker.waveforms import pwm, rectified_sine, sine

FIXTURES = Path(__file__).resolve().parents[2] / "fixtures"
LAMPS = [pytest.param(lamp, id=f"{scene.file}-{lamp.name}") for scene in SCENES for lamp in scene.lamps]
PHASE = (np.arange(400_000) + 0.5) / 400_000  # midpoints, so that an edge costs at most half a step


def test_the_fixtures_are_what_the_script_writes(tmp_path):
    write_captures(tmp_path)
    for made in tmp_path.iterdir():
        assert made.read_bytes() == (FIXTURES / made.name).read_bytes(), f"{made.name}: run fixtures/make.py"
    films = {path.name for path in FIXTURES.glob("*.mp4")} | {"truth-of-films.json"}
    kept = {path.name for path in FIXTURES.iterdir()} - {"make.py", "README.md"} - films
    assert kept == {path.name for path in tmp_path.iterdir()}


def test_the_captures_are_small():
    assert sum(path.stat().st_size for path in FIXTURES.iterdir()) < 1_000_000


@pytest.mark.parametrize("lamp", LAMPS)
def test_the_truth_agrees_with_the_definitions(lamp):
    """Definitions of the IES (percent flicker, flicker index), by numerical integration over one cycle."""
    light = lamp.waveform.at_phase(PHASE)
    above = np.clip(light - light.mean(), 0, None).sum() / light.sum()
    assert light.mean() == pytest.approx(1.0, abs=2e-5)
    assert lamp.waveform.percent_flicker == pytest.approx(100 * np.ptp(light) / (light.max() + light.min()), abs=0.01)
    assert lamp.waveform.flicker_index == pytest.approx(above, abs=2e-5)
    assert lamp.waveform.rms_modulation == pytest.approx(100 * light.std() / light.mean(), abs=0.02)


@pytest.mark.parametrize("lamp", LAMPS)
def test_the_region_is_that_of_the_curves(lamp):
    """IEEE 1789-2015 (figures from memory): low risk 0.08 f to 1250 Hz, no observable effect f / 30 to 3000 Hz."""
    wave = lamp.waveform
    if lamp.region is None or not wave.frequency:
        return
    parts = [(wave.frequency, wave.percent_flicker)]
    parts += [(wave.frequency * number, 100 * abs(line)) for number, line in enumerate(wave.amplitudes(60), 1)]
    low_risk = all(depth <= 0.08 * f or f >= 1250 for f, depth in parts)
    no_effect = all(depth <= f / 30 or f >= 3000 for f, depth in parts)
    assert wave.frequency >= 90
    region = "no-observable-effect" if no_effect else "low-risk" if low_risk else "above-low-risk"
    assert lamp.region == region


@pytest.mark.parametrize("wave", [sine(100.0, 0.4), pwm(240.0, 0.3, 0.1), rectified_sine(50.0)])
@pytest.mark.parametrize("share", [0.1, 0.5, 1.0])
def test_softening_scales_the_modulation_about_the_mean(wave, share):
    soft = softened(wave, share)
    light = soft.at_phase(PHASE)
    lines = 2 * np.fft.rfft(light)[1:6] / light.size * np.exp(-1j * np.pi * np.arange(1, 6) / light.size)
    assert light.mean() == pytest.approx(1.0, abs=1e-5)
    assert soft.percent_flicker == pytest.approx(100 * np.ptp(light) / (light.max() + light.min()), abs=1e-3)
    np.testing.assert_allclose(soft.amplitudes(5), lines, atol=1e-4)


def test_the_truth_file_speaks_of_every_capture():
    truth = json.loads((FIXTURES / "truth.json").read_text(encoding="utf-8"))
    assert list(truth) == [scene.file for scene in SCENES]
    assert len(truth) >= 6
