import json
from pathlib import Path

import pytest
from click.testing import CliRunner

from flicker.cli import program

FIXTURES = Path(__file__).resolve().parents[2] / "fixtures"
TYPED = ("--frequency", "240", "--duty", "0.3")
LOW_RISK = ("--limit", "ieee1789-low-risk")
CAMERA = 'name = "{name}"\nlines = 1080\nline_time_s = 14.8e-6\nframe_rate_hz = 25.0\nexposures_s = {exposures}\n'


def run(*words):
    return CliRunner().invoke(program, ["margin", *map(str, words)])


def test_a_typed_light_is_told_what_to_become():
    done = run(*TYPED, *LOW_RISK)
    assert done.exit_code == 0
    lines = done.stdout.splitlines()
    assert lines[0] == "light typed in: 240 Hz, percent flicker 100 %"
    assert "raise the frequency to 1250 Hz or shrink the modulation" in " ".join(done.stdout.split())


def test_the_json_holds_what_the_interface_promises():
    data = json.loads(run(*TYPED, *LOW_RISK, "--limit", "ieee1789-seizure", "--json", "-").stdout)
    assert set(data) == {"light", "limits"}
    assert data["light"]["frequency_hz"] == 240.0
    broken, kept = data["limits"]
    assert broken["limit"] == "ieee1789-low-risk"
    assert broken["verdict"] == "fail"
    assert broken["least_frequency_hz"] == pytest.approx(1250.0)
    assert 0 < broken["most_percent_flicker"] < 19.2
    assert broken["ripple_factor"] > 1
    assert (kept["verdict"], kept["ripple_factor"], kept["most_percent_flicker"]) == ("pass", 1.0, 100.0)


def test_an_answer_typed_back_in_passes():
    (found,) = json.loads(run(*TYPED, *LOW_RISK, "--json", "-").stdout)["limits"]
    frequency = found["least_frequency_hz"]
    for factor, verdict in ((1 + 1e-6, "pass"), (1 - 1e-6, "fail")):
        words = ("--frequency", repr(frequency * factor), "--duty", "0.3", *LOW_RISK, "--json", "-")
        assert json.loads(run(*words).stdout)["limits"][0]["verdict"] == verdict


def test_a_capture_is_told_the_same_as_its_light_typed_in():
    capture = FIXTURES / "bridge-display-night.csv"
    measured = json.loads(run(capture, "--dark-level", "0.012", *LOW_RISK, "--json", "-").stdout)["limits"][0]
    typed = json.loads(run("--frequency", "239.7", "--duty", "0.05", *LOW_RISK, "--json", "-").stdout)["limits"][0]
    assert measured["verdict"] == typed["verdict"] == "fail"
    assert measured["least_frequency_hz"] == pytest.approx(typed["least_frequency_hz"], rel=1e-3)
    assert measured["most_percent_flicker"] == pytest.approx(typed["most_percent_flicker"], rel=0.02)
    assert measured["ripple_factor"] == pytest.approx(typed["ripple_factor"], rel=0.05)


def test_colours_are_told_apart():
    data = json.loads(run(*TYPED, "--decay", "8.5ms,0,0", *LOW_RISK, "--json", "-").stdout)
    assert [(one["channel"], one["verdict"]) for one in data["limits"]] == [
        ("red", "pass"),
        ("green", "fail"),
        ("blue", "fail"),
    ]


def test_cameras_are_limits_too(tmp_path):
    for name, exposures in (("dock", '["1/48", "1/60"]'), ("bridge", '["1/50", "1/120"]')):
        (tmp_path / f"{name}.toml").write_text(CAMERA.format(name=name, exposures=exposures))
    words = [*TYPED, *LOW_RISK, "--camera", tmp_path / "dock.toml", "--camera", tmp_path / "bridge.toml"]
    words += ["--contrast", "2", "--duty-range", "0.05,0.95", "--tolerance", "0"]
    found = json.loads(run(*words, "--json", "-").stdout)["cameras"]
    # the common multiple of 48, 50, 60 and 120 (by hand), where every exposure holds whole cycles
    assert found["frequencies"][0]["frequency_hz"] == pytest.approx(1200.0)
    assert found["frequencies"][0]["worst_contrast_percent"] == pytest.approx(0.0, abs=1e-9)
    # 1 / (2 N + 1) is 2 % at N = 24.5: 25 cycles of 1/120 s (by hand)
    assert found["all_from_hz"] == pytest.approx(3000.0)
    words_for_people = run(*words).stdout
    assert "PWM frequencies whose bands stay within 2 % at all 4 camera settings" in words_for_people
    assert "1200 Hz" in words_for_people


@pytest.mark.parametrize(
    ("words", "said"),
    [
        ([], "--frequency is missing"),
        (["--frequency", "240"], "--duty is missing"),
        ([FIXTURES / "corridor-lamp.csv", *TYPED], "types a light in"),
        ([*TYPED, "--limit", "ieee1789"], "did you mean"),
        ([*TYPED, "--contrast", "2"], "cameras as limits need"),
        ([*TYPED, "--camera", "nowhere.toml", "--contrast", "2"], "nowhere.toml"),
        (["nowhere.csv"], "nowhere.csv"),
    ],
)
def test_wrong_words_are_answered_in_one_sentence(words, said):
    done = run(*words)
    assert done.exit_code == 2
    assert said in done.stderr
    assert len(done.stderr.splitlines()) == 1
    assert done.stdout == ""


@pytest.mark.parametrize(
    ("extra", "said"),
    [
        ((), "need --contrast"),
        (("--contrast", "2"), "need --duty-range"),
        (("--contrast", "2", "--duty-range", "0.1,0.9"), "need --tolerance"),
        (("--contrast", "2", "--duty-range", "0.9", "--tolerance", "0"), "is no duty range"),
        (("--contrast", "2", "--duty-range", "0.9,0.1", "--tolerance", "0"), "a duty range runs upward"),
        (("--contrast", "0", "--duty-range", "0.1,0.9", "--tolerance", "0"), "a contrast limit lies between"),
    ],
)
def test_nothing_is_taken_for_granted_about_cameras_and_driver(tmp_path, extra, said):
    (tmp_path / "dock.toml").write_text(CAMERA.format(name="dock", exposures='["1/50"]'))
    done = run(*TYPED, *LOW_RISK, "--camera", tmp_path / "dock.toml", *extra)
    assert (done.exit_code, done.stdout) == (2, "")
    assert said in done.stderr
