"""The light read back from stripes: clips of the exact renderer go in, the numbers of the light must come out."""

import json

import numpy as np
import pytest
from click.testing import CliRunner

from flicker.camera.render import HarmonicLight, Lit, Shot, render, write_clip
from flicker.camera.stripes import read_stripes
from flicker.cli import program
from flicker.errors import NotMeasurable
from flicker.footage import Footage
from flicker.light import Pulse
from flicker.readers.video import read_footage
from flicker.waveforms import pwm, rectified_sine

LINES = 240
LINE_TIME = 60e-6
ROWS = np.arange(LINES)[:, None]
TEXTURE = 0.14 + 0.04 * np.sin(ROWS / 23) + 0.02 * np.cos(np.arange(64) / 5)


def film(path, *lights, codec="libx264", exposure=1 / 2000, frames=40, frame_rate=29.97, **changes):
    coding = {"options": {"crf": "12"}} if codec == "libx264" else {}
    shot = Shot(LINE_TIME, frame_rate, exposure, frames, [Lit(TEXTURE, lights)], noise=0.01, **(coding | changes))
    write_clip(path, shot, codec)
    return path


def test_frequency_depth_and_decay_come_back(tmp_path):
    fast, slow = Pulse(463.21, 0.35, 0.1), Pulse(463.21, 0.35, 0.1, 8.5e-3)
    clip = film(tmp_path / "clip.mp4", slow, fast, fast)
    found = read_stripes(read_footage(clip), line_time=LINE_TIME, exposure=1 / 2000)
    assert found.frequency.value == pytest.approx(463.21, rel=20e-6)
    red, green, blue, _ = found.channels
    truth = pwm(463.21, 0.35, 0.1)
    for channel in (green, blue):
        assert channel.measures["percent_flicker"].value == pytest.approx(truth.percent_flicker, abs=3)
        assert channel.measures["flicker_index"].value == pytest.approx(truth.flicker_index, abs=0.02)
        assert channel.measures["duty_cycle"].value == pytest.approx(0.35, abs=0.02)
    assert red.measures["percent_flicker"].value == pytest.approx(slow.percent_flicker, abs=1.5)
    decay = red.measures["decay_time"]
    assert decay.value == pytest.approx(8.5e-3, rel=0.08)
    assert decay.low < 8.5e-3 < decay.high
    assert green.measures["decay_time"].value is None


def test_light_that_is_no_rectangle_keeps_its_harmonics(tmp_path):
    wave = rectified_sine(50.0)
    light = HarmonicLight(100.0, wave.amplitudes(200))
    clip = film(tmp_path / "clip.mkv", light, codec="ffv1", frame_rate=23.976, pixel_format="gray10le", frames=60)
    found = read_stripes(read_footage(clip), line_time=LINE_TIME, exposure=1 / 2000)
    measures = found.channels[-1].measures
    assert found.frequency.value == pytest.approx(100.0, rel=20e-6)
    # the cusp needs harmonics without end: the interval must reach it
    assert measures["percent_flicker"].value == pytest.approx(100.0, abs=10)
    assert measures["percent_flicker"].high >= 99.9
    assert measures["flicker_index"].value == pytest.approx(wave.flicker_index, abs=0.01)


def test_lines_of_the_light_keep_their_phases(tmp_path):
    light = Pulse(463.21, 0.35)
    clip = film(tmp_path / "clip.mkv", light, codec="ffv1", pixel_format="gray10le")
    found = read_stripes(read_footage(clip), line_time=LINE_TIME, exposure=1 / 2000)
    first = min(found.channels[-1].components, key=lambda line: line.frequency)
    assert first.amplitude == pytest.approx(complex(light.amplitudes([1.0])[0]), abs=0.02)


def test_the_exposure_undone_is_the_light_not_the_bands(tmp_path):
    clip = film(tmp_path / "clip.mkv", Pulse(463.21, 0.5, 0.5), codec="ffv1", exposure=1 / 600, pixel_format="gray10le")
    channel = read_stripes(read_footage(clip), line_time=LINE_TIME, exposure=1 / 600).channels[-1]
    assert 100 * channel.bands.contrast < 20
    depth = channel.measures["percent_flicker"]
    assert depth.value == pytest.approx(100 / 3, abs=1.5)
    assert depth.low <= 100 / 3 <= depth.high


def test_without_a_line_time_the_pairs_are_listed(tmp_path):
    clip = film(tmp_path / "clip.mp4", Pulse(463.21, 0.35))
    found = read_stripes(read_footage(clip))
    assert found.frequency.value is None
    assert "line-time" in found.frequency.reason
    assert min(abs(pair["frequency_hz"] - 463.21) for pair in found.alternatives) < 0.01
    near = min(found.alternatives, key=lambda pair: abs(pair["frequency_hz"] - 463.21))
    assert near["line_time_s"] == pytest.approx(LINE_TIME, rel=1e-3)


def test_without_an_exposure_it_is_fitted(tmp_path):
    clip = film(tmp_path / "clip.mkv", Pulse(463.21, 0.3), codec="ffv1", pixel_format="gray10le")
    found = read_stripes(read_footage(clip), line_time=LINE_TIME)
    depth = found.channels[-1].measures["percent_flicker"]
    assert depth.low <= 100 <= depth.high
    assert "exposure-fitted" in {note.code for note in found.notes}


@pytest.mark.parametrize("frequency", [30 * 16.0, 1500.0])
def test_standing_bands_are_refused_with_the_cure(tmp_path, frequency):
    clip = film(tmp_path / "clip.mp4", Pulse(frequency, 0.35), frame_rate=30.0)
    with pytest.raises(NotMeasurable, match=r"(stand|stands) still.*frame rate other than 30 Hz"):
        read_stripes(read_footage(clip), line_time=LINE_TIME)


def test_steady_light_is_no_flicker(tmp_path):
    clip = film(tmp_path / "clip.mkv", Pulse(463.21, 1.0), codec="ffv1", pixel_format="gray10le")
    with pytest.raises(NotMeasurable, match=r"no light was found that changes|no band moves"):
        read_stripes(read_footage(clip), line_time=LINE_TIME)


def test_a_camera_that_hunts_for_its_exposure_is_noted(tmp_path):
    gain = 1 + 0.1 * np.sin(np.arange(40) / 3)
    clip = film(tmp_path / "clip.mp4", Pulse(463.21, 0.35), gain=gain)
    codes = {note.code for note in read_stripes(read_footage(clip), line_time=LINE_TIME, exposure=1 / 2000).notes}
    assert "exposure-hunting" in codes
    steady = film(tmp_path / "steady.mp4", Pulse(463.21, 0.35))
    codes = {note.code for note in read_stripes(read_footage(steady), line_time=LINE_TIME, exposure=1 / 2000).notes}
    assert not {"exposure-hunting", "repeated-frames"} & codes


def test_repeated_frames_are_noted():
    times = np.arange(40) // 2 * 2 / 29.97  # what is filmed stands for two frames
    light, shown = Pulse(463.21, 0.35), np.arange(40) / 29.97
    shot = Shot(LINE_TIME, 29.97, 1 / 2000, 40, [Lit(TEXTURE, [light])], times=times, pixel_format="gray10le")
    frames = render(shot)
    light_of = np.stack([frame[..., 1].mean(axis=1) for frame in frames])[:, :, None, None].astype(np.float32)
    footage = Footage(light_of, ("all",), shown, 29.97, lines_of_frame=LINES)
    notes = read_stripes(footage, line_time=LINE_TIME, exposure=1 / 2000).notes
    assert "repeated-frames" in {note.code for note in notes}


def test_the_command_writes_a_report(tmp_path):
    clip = film(tmp_path / "clip.mp4", Pulse(463.21, 0.35), frames=24)
    options = ["--line-time", "60us", "--exposure", "1/2000"]
    done = CliRunner().invoke(program, ["stripes", str(clip), *options, "--json", "-"])
    assert done.exit_code == 0, done.output
    capture = json.loads(done.stdout)["captures"][0]
    assert capture["capture"]["kind"] == "video"
    assert capture["capture"]["line_time_s"] == 60e-6
    assert [channel["name"] for channel in capture["channels"]] == ["red", "green", "blue", "all"]
    assert capture["alternatives"]
    words = CliRunner().invoke(program, ["stripes", str(clip), *options]).output
    assert "463.2" in words
    assert "percent flicker" in words


@pytest.mark.parametrize("frequency", [463.2, 993.0, 1003.0, 2400.7])
def test_a_short_readout_does_not_take_the_neighbour_a_frame_rate_away(tmp_path, frequency):
    texture = TEXTURE[:120]
    shot = Shot(30e-6, 25.0, 1 / 2000, 40, [Lit(texture, (Pulse(frequency, 0.35, 0.1),) * 3)], noise=0.01)
    write_clip(tmp_path / "clip.mp4", shot)
    found = read_stripes(read_footage(tmp_path / "clip.mp4"), line_time=30e-6, exposure=1 / 2000)
    assert found.frequency.value == pytest.approx(frequency, rel=20e-6)
    assert min(abs(one["frequency_hz"] - frequency) for one in found.alternatives) == pytest.approx(25.0, abs=0.1)
    assert not {"moving-scene", "exposure-hunting", "line-time-off"} & {note.code for note in found.notes}
