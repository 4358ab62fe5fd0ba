"""Commands that take a video: what they say it was read from, and what cannot be."""

import json

import numpy as np
import pytest
from click.testing import CliRunner

from flicker.camera.render import Lit, Shot, write_clip
from flicker.cli import program
from flicker.light import Pulse


@pytest.fixture(scope="module")
def clip(tmp_path_factory):
    path = tmp_path_factory.mktemp("films") / "lamp.mkv"
    scene = np.full((240, 64), 0.14)
    write_clip(path, Shot(60e-6, 29.97, 1 / 2000, 60, [Lit(scene, [Pulse(453.2, 0.35)])], noise=0.01), "ffv1")
    return str(path)


def run(*words):
    return CliRunner().invoke(program, words)


CAMERA = ("--lines", "1080", "--line-time", "14.8us", "--frame-rate", "25", "--exposure", "1/250")


def test_bands_of_a_video_come_from_its_stripes(clip):
    filmed = ("--filmed-line-time", "60us", "--filmed-exposure", "1/2000")
    done = run("bands", clip, *filmed, *CAMERA, "--json", "-")
    assert done.exit_code == 0
    found = json.loads(done.stdout)
    assert "its stripes" in found["light_from"]
    assert found["light"]["frequency_hz"] == pytest.approx(453.2, rel=1e-4)
    typed = json.loads(run("bands", "--frequency", "453.2", "--duty", "0.35", *CAMERA, "--json", "-").stdout)
    contrast = typed["predictions"][0]["contrast_percent"]["all"]
    assert found["predictions"][0]["contrast_percent"]["green"] == pytest.approx(contrast, abs=1)


def test_bands_of_a_video_without_its_camera_say_what_they_rest_on(clip):
    done = run("bands", clip, *CAMERA)
    assert done.exit_code == 0
    assert "the means of its frames" in done.stdout
    assert "--filmed-with" in done.stdout


def test_a_table_was_not_filmed(tmp_path):
    path = tmp_path / "light.csv"
    path.write_text("time,light\n" + "".join(f"{k / 1e4},{1 + (k % 20 < 5)}\n" for k in range(2000)))
    done = run("bands", str(path), "--filmed-line-time", "60us", *CAMERA)
    assert done.exit_code == 2
    assert "is no video" in done.stderr
