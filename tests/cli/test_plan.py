"""`flicker plan` as it is typed."""

import json

import pytest
from click.testing import CliRunner

from flicker.cli import program
from flicker.demo import write_demo

PLAN = """
tolerance_percent = 0.1
contrast_limit_percent = 2.0

[[light]]
name = "bridge display, night"
capture = "bridge-display-night.csv"
dark_level = 0.012

[[light]]
name = "chart table"
frequency_hz = 1200
duty = 0.3

[[camera]]
file = "dock-camera.toml"
frame_rates_hz = [24.0, 25.0]
exposures_s = ["1/48", "1/50", "1/60"]
"""


@pytest.fixture
def folder(tmp_path):
    write_demo(tmp_path)
    (tmp_path / "plan.toml").write_text(PLAN, encoding="utf-8")
    return tmp_path


def run(*words):
    return CliRunner().invoke(program, ["plan", *map(str, words)])


def test_it_names_the_best_setting_and_what_spoils_the_others(folder):
    done = run(folder / "plan.toml")
    assert done.exit_code == 0, done.output
    said = " ".join(done.output.split())
    assert "2 lights, 1 camera, 6 settings; clean up to 2 %" in said
    assert "bridge display, night: the worst in" in said
    assert len(done.output.splitlines()) < 60, "one page"
    assert all(len(line) <= 100 for line in done.output.splitlines())


def test_json(folder):
    done = run(folder / "plan.toml", "--json", "-")
    data = json.loads(done.stdout)
    keys = {"camera", "frame_rate_hz", "exposure_s", "worst_contrast_percent", "worst_light", "clean"}
    assert keys <= set(data["settings"][0])
    assert keys <= set(data["best"])
    assert len(data["settings"]) == 6
    assert data["best"]["worst_contrast_percent"] == min(one["worst_contrast_percent"] for one in data["settings"])


def test_a_plan_that_cannot_be_read(folder):
    for words, said in (
        ([folder / "none.toml"], "none.toml: no plan file can be read there"),
        ([folder / "truth.json"], "is no plan file in TOML"),
        ([folder / "plan.toml", "--json", folder / "plan.toml"], "name another file"),
    ):
        done = run(*words)
        assert done.exit_code == 2
        assert said in done.stderr
        assert len(done.stderr.strip().splitlines()) == 1
    (folder / "plan.toml").write_text(PLAN.replace("bridge-display-night.csv", "gone.csv"), encoding="utf-8")
    done = run(folder / "plan.toml")
    assert (done.exit_code, "plan.toml, light 1: " in done.stderr, "gone.csv" in done.stderr) == (2, True, True)
