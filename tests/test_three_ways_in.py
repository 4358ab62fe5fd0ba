"""One light through a photodiode's table, a fast video and the stripes of a rolling shutter: the three must agree."""

import numpy as np

import flicker
from flicker.camera.render import Lit, Shot, write_clip
from flicker.filmed import read_back
from flicker.light import Pulse
from flicker.waveforms import sampled

LIGHT = Pulse(97.3, 0.4, 0.5)
SCENE = np.full((240, 64), 0.15)


CODING = 0.1  # points of percent flicker that code values of ten bits may move


def overlap(one, other):
    return one.low <= other.high + CODING and other.low <= one.high + CODING


def test_photodiode_fast_video_and_stripes_agree(tmp_path):
    trace = sampled(lambda t: LIGHT.at(LIGHT.frequency * t), sample_rate=50e3, duration=1.0, noise=0.005, seed=3)
    table = tmp_path / "photodiode.csv"
    rows = (f"{t:.7f},{v:.6f}" for t, v in zip(trace.times(), trace.light, strict=True))
    table.write_text("time (s),light (V)\n" + "\n".join(rows) + "\n")
    small = Lit(SCENE[:16, :16], [LIGHT])
    fast = Shot(1e-6, 960.0, 1 / 8000, 480, [small], noise=0.003, pixel_format="gray10le")
    write_clip(tmp_path / "fast.mkv", fast, "ffv1")
    rolling = Shot(60e-6, 29.97, 1 / 2000, 60, [Lit(SCENE, [LIGHT])], noise=0.01, pixel_format="gray10le")
    write_clip(tmp_path / "rolling.mkv", rolling, "ffv1")

    by_photodiode = flicker.measure(flicker.read(table, dark_level=0.0)).captures[0].channels[0].measures
    by_frames = flicker.measure(flicker.read(tmp_path / "fast.mkv")).captures[0].channels[0].measures
    by_lines = read_back(tmp_path / "rolling.mkv", line_time=60e-6, exposure=1 / 2000).stripes.channels[0].measures

    for found in (by_photodiode, by_frames, by_lines):
        assert abs(found["fundamental_frequency"].value / LIGHT.frequency - 1) < 1e-4
        assert abs(found["percent_flicker"].value - LIGHT.percent_flicker) < 1.5
    for one, other in ((by_photodiode, by_frames), (by_photodiode, by_lines), (by_frames, by_lines)):
        assert overlap(one["percent_flicker"], other["percent_flicker"])
        assert abs(one["flicker_index"].value - other["flicker_index"].value) < 0.01
