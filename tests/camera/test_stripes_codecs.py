"""The same light out of what phones and cameras write: codecs, variable rate, rotation, a clip that was cut."""

import subprocess
import sys
import textwrap

import av
import numpy as np
import pytest

from flicker.camera.render import Lit, Shot, write_clip
from flicker.camera.stripes import read_stripes
from flicker.light import Pulse
from flicker.readers.video import read_footage

LINES, LINE_TIME, EXPOSURE = 240, 60e-6, 1 / 2000
SCENE = 0.14 + 0.04 * np.sin(np.arange(LINES)[:, None] / 23) + 0.02 * np.cos(np.arange(64) / 5)
LIGHT = Pulse(463.2, 0.35, 0.1)
TIMES = np.cumsum(np.random.default_rng(4).uniform(0.028, 0.041, 40))
QUIET = {"x265-params": "log-level=none", "crf": "14"}


@pytest.mark.parametrize(
    ("name", "codec", "changes"),
    [
        (
            "hlg.mp4",
            "libx265",
            {"transfer": "hlg", "matrix": "bt2020", "pixel_format": "yuv420p10le", "options": QUIET},
        ),
        ("variable.mp4", "libx264", {"times": TIMES, "options": {"crf": "14"}}),
        ("av1.mp4", "libsvtav1", {"options": {"crf": "12", "preset": "10"}}),
        ("portrait.mov", "libx264", {"rotation": 90, "options": {"crf": "14"}}),
    ],
)
def test_frequency_and_depth_come_out_of(tmp_path, name, codec, changes):
    shot = Shot(LINE_TIME, 29.97, EXPOSURE, 40, [Lit(SCENE, [LIGHT])], noise=0.01, **changes)
    write_clip(tmp_path / name, shot, codec)
    found = read_stripes(read_footage(tmp_path / name), line_time=LINE_TIME, exposure=EXPOSURE)
    assert found.frequency.value == pytest.approx(463.2, rel=20e-6)
    for channel in found.channels:
        depth = channel.measures["percent_flicker"]
        assert depth.value == pytest.approx(LIGHT.percent_flicker, abs=3)
        assert depth.low - 0.5 <= LIGHT.percent_flicker <= depth.high + 0.5


def test_a_cut_clip_says_so_and_is_read_as_far_as_it_goes(tmp_path):
    shot = Shot(LINE_TIME, 29.97, EXPOSURE, 60, [Lit(SCENE, [LIGHT])], noise=0.03, options={"crf": "14"})
    write_clip(tmp_path / "whole.mp4", shot)
    with (
        av.open(str(tmp_path / "whole.mp4")) as whole,
        av.open(str(tmp_path / "cut.mp4"), "w", options={"movflags": "faststart"}) as cut,
    ):
        stream = cut.add_stream_from_template(whole.streams.video[0])
        for packet in whole.demux(video=0):
            if packet.dts is not None:
                packet.stream = stream
                cut.mux(packet)
    data = (tmp_path / "cut.mp4").read_bytes()
    (tmp_path / "cut.mp4").write_bytes(data[: int(0.6 * len(data))])
    footage = read_footage(tmp_path / "cut.mp4")
    assert 10 < footage.frames < 50
    found = read_stripes(footage, line_time=LINE_TIME, exposure=EXPOSURE)
    assert {"truncated", "damaged"} & {note.code for note in found.notes}
    assert found.frequency.value == pytest.approx(463.2, rel=50e-6)


def _film(path, frames):
    """A long clip of one still, quick to code."""
    with av.open(str(path), "w") as container:
        stream = container.add_stream("libx264", rate=30)
        stream.width, stream.height, stream.pix_fmt = 320, 480, "yuv420p"
        stream.options = {"preset": "ultrafast"}
        frame = av.VideoFrame(320, 480, "yuv420p")
        for plane in frame.planes:
            plane.update(np.full((plane.height, plane.line_size), 100, np.uint8))
        for number in range(frames):
            frame.pts = number
            container.mux(stream.encode(frame))
        container.mux(stream.encode(None))


def test_memory_does_not_grow_with_the_length(tmp_path):
    """Decoded frames of the longer clip alone would fill 330 MB."""
    script = textwrap.dedent("""
        import resource, sys
        from flicker.readers import read
        from flicker.readers import video
        video._MOST_VALUES = 480 * 4 * 100
        if sys.argv[2] == "traces":
            read(sys.argv[1])
        else:
            assert video.read_footage(sys.argv[1]).frames <= 100
        print(resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024)
    """)
    for how in ("traces", "lines"):
        peaks = []
        for frames in (120, 1560):
            path = tmp_path / f"{frames}.mp4"
            if not path.exists():
                _film(path, frames)
            done = subprocess.run(
                [sys.executable, "-c", script, str(path), how], capture_output=True, text=True, check=True
            )
            peaks.append(float(done.stdout))
        assert peaks[1] < peaks[0] + 15, how


def test_of_a_long_video_the_beginning_is_used_and_said(tmp_path, monkeypatch):
    _film(tmp_path / "long.mp4", 200)
    monkeypatch.setattr("flicker.readers.video._MOST_VALUES", 480 * 4 * 100)
    footage = read_footage(tmp_path / "long.mp4")
    assert footage.frames == 100
    assert "part-used" in {note.code for note in footage.notes}
