"""Video as linear light: formats, ranges, matrices, time stamps, damage. Truth: the exact renderer."""

import dataclasses

import numpy as np
import pytest

from flicker.camera.render import Lit, Shot, exposed, frame_times, write_clip
from flicker.errors import FlickerError, InputError, UnreadableFileError
from flicker.light import Pulse
from flicker.readers import read
from flicker.readers.video import read_footage
from flicker.signal.transfer import TRANSFERS, to_code, to_light

LIGHT = Pulse(1003.0, 0.4)
SCENE = np.full((120, 64), 0.16)
SHOT = Shot(20e-6, 29.97, 1 / 2000, 24, [Lit(SCENE, [LIGHT])], pixel_format="yuv444p")


def truth(shot, light=LIGHT):
    lines = np.arange(len(SCENE)) * shot.line_time
    return 0.16 * exposed(light, frame_times(shot)[:, None] + lines, shot.exposure)


@pytest.fixture
def film(tmp_path):
    def make(name="clip.mkv", codec="ffv1", **changes):
        path = tmp_path / name
        write_clip(path, dataclasses.replace(SHOT, **changes), codec)
        return path

    return make


@pytest.mark.parametrize("transfer", [*TRANSFERS, "2.2", "1.8"])
def test_transfer_functions_undo_each_other(transfer):
    light = np.linspace(0, 1, 400)
    np.testing.assert_allclose(to_light(to_code(light, transfer), transfer), light, atol=2e-6)


@pytest.mark.parametrize(
    ("light", "transfer", "code", "source"),
    [
        (0.18, "bt709", 0.409, "ITU-R BT.709-6, 18 % grey: 1.099 x 0.18^0.45 - 0.099, by hand"),
        (1 / 12, "hlg", 0.5, "ITU-R BT.2100-2: the two branches meet at 1/2"),
        (0.01, "pq", 0.508, "ITU-R BT.2100-2: 100 cd/m2 at a signal of 0.508 (from memory)"),
        (0.2140, "srgb", 0.5, "IEC 61966-2-1: half signal is 21.4 % light (from memory)"),
    ],
)
def test_transfer_functions_agree_with_their_standards(light, transfer, code, source):
    assert to_code(light, transfer) == pytest.approx(code, abs=6e-4), source


@pytest.mark.parametrize(
    "changes",
    [
        {},
        {"full_range": True},
        {"matrix": "bt601"},
        {"matrix": "bt2020", "pixel_format": "yuv444p10le"},
        {"transfer": "srgb"},
        {"transfer": "hlg", "pixel_format": "yuv444p10le"},
        {"transfer": "pq", "pixel_format": "yuv444p10le"},
    ],
)
def test_lines_are_the_light_that_was_filmed(film, changes):
    stated = changes.get("transfer", "bt709")
    footage = read_footage(film(**changes), transfer=stated)
    assert footage.channels == ("red", "green", "blue", "all")
    for channel in footage.channels:
        np.testing.assert_allclose(footage.lines_of(channel), truth(SHOT), atol=0.006)


def test_grey_video_has_the_one_channel_all(film):
    assert read_footage(film(pixel_format="gray")).channels == ("all",)


def test_a_region_and_a_part_are_cut_out(film):
    footage = read_footage(film(), region=(10, 40, 20, 30), start=0.2, duration=0.4)
    assert footage.lines == 30
    assert footage.first_line == 40
    assert footage.times[0] >= 0.2
    np.testing.assert_allclose(footage.lines_of("all"), truth(SHOT)[6:18, 40:70], atol=0.006)


@pytest.mark.parametrize("direction", ["down", "up", "left", "right"])
def test_lines_are_numbered_as_they_are_read(tmp_path, direction):
    path = tmp_path / "clip.mkv"
    scene = SCENE if direction in ("down", "up") else SCENE.T
    shot = dataclasses.replace(SHOT, parts=[Lit(scene, [LIGHT])], read_direction=direction)
    write_clip(path, shot, "ffv1")
    np.testing.assert_allclose(read_footage(path, read_direction=direction).lines_of("green"), truth(SHOT), atol=0.006)


def test_hevc_of_ten_bits_in_hlg(film):
    path = film("clip.mp4", "libx265", transfer="hlg", matrix="bt2020", pixel_format="yuv420p10le",
                options={"x265-params": "log-level=none", "crf": "12"})  # fmt: skip
    footage = read_footage(path)
    assert footage.transfer == "hlg"
    assert np.abs(footage.lines_of("all") - truth(SHOT)).mean() < 0.01


def test_av1(film):
    path = film("clip.mp4", "libsvtav1", pixel_format="yuv420p", options={"crf": "10", "preset": "10"})
    footage = read_footage(path)
    assert footage.frames == 24
    assert np.abs(footage.lines_of("all") - truth(SHOT)).mean() < 0.01


def test_a_variable_rate_keeps_the_time_of_every_frame(film):
    times = np.cumsum(np.random.default_rng(4).uniform(0.028, 0.041, 24))
    path = film("clip.mp4", "libx264", times=times, pixel_format="yuv420p")
    footage = read_footage(path)
    np.testing.assert_allclose(footage.times, times - times[0], atol=2e-5)
    assert "variable-frame-rate" in {note.code for note in footage.notes}


def test_rounded_stamps_of_a_constant_rate_are_made_exact(film):
    footage = read_footage(film("clip.mkv"))  # Matroska stamps are whole milliseconds
    np.testing.assert_allclose(footage.times, np.arange(24) / 29.97, rtol=1e-6, atol=1e-9)


def test_stamps_hardly_finer_than_the_frames_do_no_harm(film):
    footage = read_footage(film("clip.mkv", frame_rate=960.0, times=None, frames=60))
    np.testing.assert_allclose(footage.times, np.arange(60) / 960.0, rtol=1e-5, atol=1e-9)
    assert "dropped-frames" not in {note.code for note in footage.notes}


def test_slow_motion_is_taken_at_the_rate_that_is_told(film):
    footage = read_footage(film(), frame_rate=240.0)
    np.testing.assert_allclose(footage.times, np.arange(24) / 240.0, atol=1e-9)
    assert "frame-rate-told" in {note.code for note in footage.notes}


def test_rotation_is_kept_apart_from_the_order_of_the_lines(film):
    footage = read_footage(film("clip.mov", "libx264", rotation=90, pixel_format="yuv420p"))
    assert footage.details["rotation_deg"] == 90
    assert footage.lines == 120


@pytest.mark.parametrize(("name", "codec"), [("clip.mkv", "ffv1"), ("clip.avi", "mjpeg"), ("clip.ts", "libx264")])
def test_a_clip_cut_at_sixty_per_cent_is_never_silently_short(film, name, codec):
    changes = {"pixel_format": "yuvj420p", "full_range": True} if codec == "mjpeg" else {"pixel_format": "yuv420p"}
    path = film(name, codec, noise=0.05, **changes)
    whole = path.read_bytes()
    path.write_bytes(whole[: int(0.6 * len(whole))])
    if name.endswith(".ts"):  # a transport stream promises no length: the frames that are there count
        assert read_footage(path).frames < 24
        return
    footage = read_footage(path)
    assert footage.frames < 20
    assert {"truncated", "damaged"} & {note.code for note in footage.notes}


def test_a_clip_without_its_index_is_refused_in_one_sentence(film):
    path = film("clip.mp4", "libx264", pixel_format="yuv420p")
    path.write_bytes(path.read_bytes()[:-400])
    with pytest.raises(UnreadableFileError, match=r"clip\.mp4"):
        read_footage(path)


def test_overexposed_parts_are_left_out_and_noted(film):
    scene = SCENE.copy()
    scene[:, :16] = 0.9
    footage = read_footage(film(parts=[Lit(scene, [LIGHT])]))
    np.testing.assert_allclose(footage.lines_of("green"), truth(SHOT), atol=0.006)
    assert "clipped" in {note.code for note in footage.notes}


def test_untagged_video_says_what_is_assumed(film):
    assert "transfer-assumed" in {note.code for note in read_footage(film(tagged=False)).notes}


def test_traces_are_the_mean_of_each_frame(film):
    capture = read(film(), exposure=1 / 2000)
    assert [trace.name for trace in capture.traces] == ["red", "green", "blue", "all"]
    for trace in capture.traces:
        assert trace.exposure == 1 / 2000
        np.testing.assert_allclose(trace.light, truth(SHOT).mean(axis=1), atol=0.003)
        assert "aliasing-possible" in {note.code for note in trace.notes}


@pytest.mark.parametrize(
    ("how", "words"),
    [
        ({"region": (0, 0, 500, 10)}, "region"),
        ({"transfer": "film"}, "transfer"),
        ({"read_direction": "sideways"}, "read direction"),
        ({"start": 5.0}, "frames are left"),
    ],
)
def test_what_does_not_fit_is_said_in_one_sentence(film, how, words):
    with pytest.raises(InputError, match=words):
        read_footage(film(), **how)


def test_a_missing_file_is_named():
    with pytest.raises(FlickerError, match=r"nowhere\.mp4"):
        read_footage("nowhere.mp4")
