"""The line time from a light of known frequency, whichever way the lines run."""

import dataclasses
import json

import numpy as np
import pytest
from click.testing import CliRunner

from flicker.camera import Camera
from flicker.camera.render import Lit, Shot, write_clip
from flicker.cli import program
from flicker.errors import NotMeasurable
from flicker.filmed import find_line_time
from flicker.light import Pulse

SCENE = 0.14 + 0.04 * np.sin(np.arange(240)[:, None] / 23) + 0.02 * np.cos(np.arange(64) / 5)
SHOT = Shot(60e-6, 25.0, 1 / 2000, 40, [Lit(SCENE, [Pulse(1007.0, 0.5)])], noise=0.01, options={"crf": "14"})


@pytest.mark.parametrize("direction", ["down", "up", "left", "right"])
def test_line_time_and_read_direction_are_found(tmp_path, direction):
    scene = SCENE if direction in ("down", "up") else SCENE.T
    shot = dataclasses.replace(SHOT, parts=[Lit(scene, SHOT.parts[0].lights)], read_direction=direction)
    write_clip(tmp_path / "clip.mp4", shot)
    found = find_line_time(tmp_path / "clip.mp4", 1007.0)
    assert found.footage.read_direction == direction
    assert found.line_time.value == pytest.approx(60e-6, rel=2e-4)
    assert found.line_time.low - 1e-11 <= 60e-6 <= found.line_time.high + 1e-11
    assert found.readout_time.value == pytest.approx(240 * found.line_time.value)


def test_a_frequency_that_cannot_be_is_refused(tmp_path):
    write_clip(tmp_path / "clip.mp4", SHOT)
    with pytest.raises(NotMeasurable, match="do not move as a light of 1015 Hz must"):
        find_line_time(tmp_path / "clip.mp4", 1015.0)


def test_the_command_writes_a_camera_file(tmp_path):
    write_clip(tmp_path / "clip.mp4", SHOT)
    camera_file = tmp_path / "camera.toml"
    words = ["line-time", str(tmp_path / "clip.mp4"), "--light-frequency", "1007", "--camera-out", str(camera_file)]
    done = CliRunner().invoke(program, [*words, "--json", "-"])
    assert done.exit_code == 0, done.output
    found = json.loads(done.stdout)
    assert found["lines"] == 240
    assert found["line_rate_hz"]["value"] == pytest.approx(1 / 60e-6, rel=2e-4)
    camera = Camera.load(camera_file)
    assert camera.line_time == pytest.approx(60e-6, rel=2e-4)
    assert camera.frame_rate == pytest.approx(25.0)
