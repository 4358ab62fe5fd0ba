"""What spoils a clip is noted, and two lights in one clip are told apart: truths from the exact renderer."""

import numpy as np
import pytest

from flicker.camera.render import HarmonicLight, Lit, Shot, render, write_clip
from flicker.camera.stripes import read_stripes
from flicker.errors import NotMeasurable
from flicker.filmed import FilmReport
from flicker.footage import Footage
from flicker.light import Pulse
from flicker.readers.video import read_footage
from flicker.report.video import stripes_words
from flicker.waveforms import rectified_sine

LINES, LINE_TIME, RATE, EXPOSURE = 480, 30e-6, 29.97, 1 / 2000
ROWS = np.arange(LINES)[:, None]
SCENE = 0.14 + 0.04 * np.sin(ROWS / 23) + 0.02 * np.cos(np.arange(64) / 5)
BACKLIGHT = Pulse(463.2, 0.35)


def codes(found):
    return {note.code for note in found.notes}


def moved(shifts, light=BACKLIGHT):
    """Footage of a scene that is shifted by some lines in each frame."""
    rows = np.arange(LINES + 60)[:, None]
    scene = 0.14 + 0.04 * np.sin(rows / 23) + 0.03 * np.cos(rows / 7) * np.ones((1, 16))
    lines = []
    for number, shift in enumerate(np.rint(shifts).astype(int) + 30):
        part = Lit(scene[shift : shift + LINES], [light])
        shot = Shot(LINE_TIME, RATE, EXPOSURE, 1, [part], start=number / RATE, noise=0.01, seed=number)
        lines.append(next(render(shot))[..., 1].mean(axis=1))
    light_of = np.array(lines, np.float32)[:, :, None, None]
    return Footage(light_of, ("all",), np.arange(len(lines)) / RATE, RATE, lines_of_frame=LINES)


@pytest.mark.parametrize("shifts", [2 * np.sin(np.arange(40) / 3), 0.5 * np.arange(40)])
def test_a_moving_camera_is_noted_and_the_frequency_stands(shifts):
    found = read_stripes(moved(shifts), line_time=LINE_TIME, exposure=EXPOSURE)
    assert "moving-scene" in codes(found)
    assert not found.others
    assert found.frequency.value == pytest.approx(463.2, rel=20e-6)
    still = read_stripes(moved(np.zeros(40)), line_time=LINE_TIME, exposure=EXPOSURE)
    assert "moving-scene" not in codes(still)


@pytest.mark.parametrize(("codec", "name", "coding"), [("ffv1", "a.mkv", {}), ("libx264", "a.mp4", {"crf": "14"})])
def test_a_mains_lamp_and_a_backlight_are_told_apart(tmp_path, codec, name, coding):
    lamp = HarmonicLight(100.0, 0.4 * rectified_sine(50.0).amplitudes(40))
    parts = [Lit(0.5 * SCENE, [BACKLIGHT]), Lit(0.5 * SCENE, [lamp])]
    write_clip(tmp_path / name, Shot(LINE_TIME, RATE, EXPOSURE, 60, parts, noise=0.01, options=coding), codec)
    found = read_stripes(read_footage(tmp_path / name), line_time=LINE_TIME, exposure=EXPOSURE)
    assert "several-lights" in codes(found)
    assert "moving-scene" not in codes(found)
    report = FilmReport(str(tmp_path / name), found)
    first, second = report.families(found.channels[-1])
    assert first.fundamental.value == pytest.approx(463.2, rel=20e-6)
    assert second.fundamental.value == pytest.approx(100.0, rel=50e-6)
    # by hand: about the mean of both, the backlight swings between 1 - 0.5 and 1 - 0.5 + 0.5 / 0.35
    assert first.percent_flicker.value == pytest.approx(100 * (1.929 - 0.5) / (1.929 + 0.5), abs=3)
    # the lamp between 1 - 0.2 and 1 + 0.2 (pi / 2 - 1)
    assert second.percent_flicker.value == pytest.approx(100 * (1.114 - 0.8) / (1.114 + 0.8), abs=3)
    whole = found.channels[-1].measures["percent_flicker"].value
    assert whole == pytest.approx(100 * (2.043 - 0.3) / (2.043 + 0.3), abs=4)
    assert found.channels[-1].measures["duty_cycle"].value is None
    assert len(found.light.channels[0].fundamentals) == 2
    words = stripes_words(report)
    assert "463.2" in words
    assert "two lights show" in words


def test_frames_that_keep_the_bands_of_others_are_left_out(tmp_path):
    """Frames coded from neighbours that do not renew a faint band would give it another frequency."""
    lines = np.stack([frame[..., 1].mean(axis=1) for frame in render(_shot(60))])
    held = lines.copy()
    held[1::2] = 0.7 * lines.mean(axis=0) + 0.3 * held[:-1:2]
    footage = Footage(
        held[:, :, None, None].astype(np.float32),
        ("all",),
        np.arange(60) / RATE,
        RATE,
        lines_of_frame=LINES,
        lossless=False,
    )
    found = read_stripes(footage, line_time=LINE_TIME, exposure=EXPOSURE)
    assert "bands-held" in codes(found)
    assert found.frequency.value == pytest.approx(463.2, rel=20e-6)


def _shot(frames):
    return Shot(LINE_TIME, RATE, EXPOSURE, frames, [Lit(SCENE, [BACKLIGHT])], noise=0.01)


def faint(path, cycles):
    """A lamp seen through an exposure of several cycles, in a clip that was compressed hard."""
    shot = Shot(
        LINE_TIME, RATE, cycles / 463.2, 60, [Lit(SCENE, [Pulse(463.2, 0.92)])], noise=0.01, options={"crf": "26"}
    )
    write_clip(path, shot)
    return read_stripes(read_footage(path), line_time=LINE_TIME, exposure=cycles / 463.2)


def test_bands_that_compression_renewed_in_some_frames_only_are_refused(tmp_path):
    with pytest.raises(NotMeasurable, match=r"in some frames only.*film with a shorter exposure"):
        faint(tmp_path / "faint.mp4", 2.4)


def test_a_depth_that_the_clip_cannot_carry_is_not_given(tmp_path):
    found = faint(tmp_path / "faint.mp4", 1.4)
    assert found.frequency.value == pytest.approx(463.2, rel=50e-6)
    depths = [channel.measures["percent_flicker"] for channel in found.channels]
    assert any(depth.value is None for depth in depths)
    for depth in depths:
        if depth.value is None:
            assert "film" in depth.reason
        else:
            assert depth.low <= 100 <= depth.high


def test_a_deep_light_with_a_strong_harmonic_that_stands_still_is_refused(tmp_path):
    """At 2 f = 37 x 25 Hz + 0.1 Hz every line meets two phases of the light only."""
    light = Pulse(462.55, 0.33)
    write_clip(tmp_path / "still.mkv", Shot(LINE_TIME, 25.0, EXPOSURE, 50, [Lit(SCENE, [light])], noise=0.01), "ffv1")
    with pytest.raises(NotMeasurable, match=r"stands all but still.*another frame rate"):
        read_stripes(read_footage(tmp_path / "still.mkv"), line_time=LINE_TIME, exposure=EXPOSURE)
