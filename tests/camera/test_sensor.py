"""Cameras: what belongs together, files, and what is refused."""

import pytest

import flicker
from flicker.camera import Camera

FILE = """
name = "dock"
lines = 1080
line_time_s = "14.8us"
frame_rate_hz = "24000/1001"
read_direction = "up"
exposures_s = ["1/25", 0.02]
"""


def test_times_follow_from_each_other():
    assert Camera(lines=1000, line_time=2e-5).readout_time == pytest.approx(0.02)
    assert Camera(lines=1000, readout_time=0.02).line_time == pytest.approx(2e-5)
    assert Camera(line_time=2e-5).readout_time is None
    assert Camera(readout_time=0.02).line_time is None


def test_a_camera_file(tmp_path):
    (tmp_path / "dock.toml").write_text(FILE, encoding="utf-8")
    camera = Camera.load(tmp_path / "dock.toml")
    assert camera == Camera(
        lines=1080,
        line_time=14.8e-6,
        frame_rate=24000 / 1001,
        read_direction="up",
        exposures=(1 / 25, 1 / 50),
        name="dock",
    )
    assert camera.to_dict()["line_time_s"] == pytest.approx(14.8e-6)
    assert camera.to_dict()["exposures_s"] == [1 / 25, 1 / 50]


@pytest.mark.parametrize(
    ("given", "line_time"),
    [("line_rate_hz = 50000", 2e-5), ("readout_time_s = 0.0216", 2e-5), ("line_time_s = '20us'", 2e-5)],
)
def test_every_way_to_say_the_line_time(tmp_path, given, line_time):
    (tmp_path / "dock.toml").write_text(f"lines = 1080\n{given}\n", encoding="utf-8")
    assert Camera.load(tmp_path / "dock.toml").line_time == pytest.approx(line_time)


def test_options_override_the_file():
    camera = Camera(lines=1080, line_time=14.8e-6, frame_rate=25.0)
    assert camera.changed(readout_time=10.8e-3).line_time == pytest.approx(1e-5)
    assert camera.changed(line_rate=1e5).readout_time == pytest.approx(10.8e-3)
    assert camera.changed(lines=540).line_time == pytest.approx(14.8e-6)
    assert camera.changed(frame_rate=50.0, shutter=None).line_time == camera.line_time
    with pytest.raises(flicker.InputError, match="give one of"):
        camera.changed(line_time=1e-5, line_rate=1e5)


@pytest.mark.parametrize(
    ("values", "said"),
    [
        ({"lines": 0}, "at least 1, not 0"),
        ({"line_time": -1e-6}, "above 0, not -1e-06 s"),
        ({"frame_rate": float("nan")}, "above 0, not nan Hz"),
        ({"shutter": "globl"}, "did you mean 'global'"),
        ({"read_direction": "dwon"}, "did you mean 'down'"),
        ({"exposures": (0.02, 0.0)}, "exposure must be above 0"),
        ({"lines": 1000, "line_time": 1e-5, "readout_time": 0.02}, "leave one of the three out"),
    ],
)
def test_what_can_never_be_right(values, said):
    with pytest.raises(flicker.InputError, match=said):
        Camera(**values)


@pytest.mark.parametrize(
    ("text", "said"),
    [
        (
            "lines = 10\nline_time = 1",
            "dock.toml: no key of a camera is called 'line_time'; did you mean 'line_time_s'?",
        ),
        ("line_time_s = 'fast'", "dock.toml: line_time_s: 'fast' is no time"),
        ("exposures_s = '1/50'", "dock.toml: exposures_s must be a list"),
        ("lines = true", "dock.toml: lines = True is no count"),
        ("lines = = 3", "is no camera file in TOML"),
        ("line_time_s = 1e-5\nline_rate_hz = 1e5", "dock.toml: give one of line time, line rate and readout time"),
    ],
)
def test_a_wrong_camera_file_says_where(tmp_path, text, said):
    (tmp_path / "dock.toml").write_text(text, encoding="utf-8")
    with pytest.raises(flicker.FlickerError) as found:
        Camera.load(tmp_path / "dock.toml")
    assert said in str(found.value)
    assert "\n" not in str(found.value)
