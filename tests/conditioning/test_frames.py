"""Light in the frames of a video: the exposure given back, and the frequencies that look alike."""

import numpy as np
import pytest

import flicker
from flicker.camera.render import Lit, Shot, write_clip
from flicker.conditioning.frames import exposure_undone, possible_frequencies
from flicker.light import Pulse


@pytest.mark.parametrize(("duty", "low", "turns"), [(0.4, 0.5, 0.2), (0.2, 0.0, 0.6), (0.7, 0.3, 0.9), (0.5, 0.8, 1.4)])
def test_the_exposure_is_given_back(duty, low, turns):
    light = Pulse(100.0, duty, low)
    numbers = np.arange(1.0, 13.0)
    left = np.sinc(numbers * turns)  # definition: mean over an exposure, by hand
    found = exposure_undone(light.amplitudes(numbers) * left, 1e-4, 100.0, turns / 100.0)
    depth = found["percent_flicker"]
    assert depth.low - 0.5 <= light.percent_flicker <= depth.high + 0.5
    assert depth.value == pytest.approx(light.percent_flicker, abs=3)


@pytest.mark.parametrize("true", [97.3, 142.7, 337.3, 577.3])
def test_lights_that_look_alike_are_listed(true):
    """Sampling theorem: k times the rate plus or minus the frequency look the same."""
    seen = abs((true / 240 + 0.5) % 1.0 - 0.5) * 240
    assert np.abs(possible_frequencies(seen, 240.0) - true).min() < 1e-9
    assert possible_frequencies(seen, 240.0)[0] == pytest.approx(97.3)


def test_a_slow_video_judges_no_fast_light(tmp_path):
    scene = Lit(np.full((480, 64), 0.15), [Pulse(463.2, 0.4)])
    write_clip(tmp_path / "slow.mkv", Shot(30e-6, 29.97, 1 / 500, 60, [scene], noise=0.01), "ffv1")
    report = flicker.check(flicker.measure(flicker.read(tmp_path / "slow.mkv")), ["ieee1789-low-risk"])
    channel = report.captures[0].channels[-1]
    note = next(note for note in channel.notes if note.code == "aliasing-possible")
    assert "13.6" in note.message
    assert channel.risk_region is None
    assert channel.verdicts[0].verdict == "undecided"


def test_a_fast_video_gives_depth_and_index_of_the_light(tmp_path):
    light = Pulse(97.3, 0.4, 0.5)
    shot = Shot(1e-6, 240.0, 1 / 250, 480, [Lit(np.full((16, 16), 0.15), [light])], pixel_format="gray10le", noise=0.01)
    write_clip(tmp_path / "fast.mkv", shot, "ffv1")
    measures = flicker.measure(flicker.read(tmp_path / "fast.mkv", exposure=1 / 250)).captures[0].channels[0].measures
    assert measures["percent_flicker"].value == pytest.approx(light.percent_flicker, abs=1)
    assert measures["duty_cycle"].value == pytest.approx(0.4, abs=0.02)
    blurred = flicker.measure(flicker.read(tmp_path / "fast.mkv")).captures[0].channels[0].measures
    assert blurred["flicker_index"].value < measures["flicker_index"].value
