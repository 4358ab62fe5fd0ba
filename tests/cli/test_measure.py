import json
import shutil
from pathlib import Path

import pytest
from click.testing import CliRunner

from flicker.cli import program
from flicker.demo import write_demo
from flicker.plots.pictures import PICTURES

FIXTURES = Path(__file__).resolve().parents[2] / "fixtures"
TRUTH = json.loads((FIXTURES / "truth.json").read_text(encoding="utf-8"))


def run(*words):
    return CliRunner().invoke(program, ["measure", *map(str, words)])


@pytest.fixture
def folder(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    return tmp_path


def refused(done, *parts):
    """Status 2, one sentence on standard error that names the parts, nothing on standard output."""
    assert done.exit_code == 2
    assert done.stdout == ""
    assert len(done.stderr.splitlines()) == 1
    assert "Traceback" not in done.stderr
    for part in parts:
        assert part in done.stderr
    return True


def test_prints_the_answer_then_the_measures():
    done = run(FIXTURES / "bridge-display-night.csv", "--dark-level", 0.012)
    assert done.exit_code == 0
    assert done.stderr == ""
    assert done.stdout.index("Risk") < done.stdout.index("95 % interval")
    assert "above low risk" in done.stdout


def test_the_json_holds_what_the_interface_promises():
    done = run(FIXTURES / "bridge-display-dusk.csv", "--dark-level", 0.012, "--json", "-")
    report = json.loads(done.stdout)
    assert (report["format"], report["version"]) == ("flicker-report", 1)
    (capture,) = report["captures"]
    assert capture["capture"]["kind"] == "csv"
    assert capture["capture"]["samples"] == TRUTH["bridge-display-dusk.csv"]["samples"]
    assert len(capture["capture"]["sha256"]) == 64
    (channel,) = capture["channels"]
    truth = TRUTH["bridge-display-dusk.csv"]["channels"]["light"]
    depth = channel["measures"]["percent_flicker"]
    assert depth["low"] <= depth["value"] <= depth["high"]
    assert depth["value"] == pytest.approx(truth["percent_flicker"], abs=0.5)
    assert channel["risk_region"]["region"] == truth["risk_region"]
    assert channel["risk_region"]["low_risk_bound_percent"] == pytest.approx(0.08 * 239.7, rel=1e-3)
    assert channel["components"][0]["frequency_hz"] == pytest.approx(239.7, rel=1e-4)
    assert channel["families"][0]["percent_flicker"] == pytest.approx(truth["percent_flicker"], abs=0.5)
    assert channel["level"].pop("mean") == pytest.approx(truth["mean"], rel=0.01)
    assert channel["level"] == {"unit": "V", "dark": 0.012, "mean_known": True}


def test_a_number_that_could_not_be_had_is_null_with_a_reason():
    done = run(FIXTURES / "corridor-lamp-recorder.wav", "--json", "-")
    (channel,) = json.loads(done.stdout)["captures"][0]["channels"]
    assert channel["measures"]["percent_flicker"]["value"] is None
    assert "--mean" in channel["measures"]["percent_flicker"]["reason"]
    assert channel["level"]["mean"] is None
    assert channel["risk_region"] is None
    assert "ac-coupled" in {note["code"] for note in channel["notes"]}


def test_the_good_ones_are_measured_when_one_cannot_be_read(folder):
    (folder / "empty.csv").write_text("")
    done = run(FIXTURES / "corridor-lamp.csv", "empty.csv", FIXTURES / "mess-room-lamp.csv", "--json", "all.json")
    assert done.exit_code == 2
    assert len(done.stderr.splitlines()) == 1
    assert "empty.csv" in done.stderr
    assert "corridor-lamp.csv" in done.stdout
    assert "mess-room-lamp.csv" in done.stdout
    captures = json.loads((folder / "all.json").read_text(encoding="utf-8"))["captures"]
    assert [set(capture) for capture in captures] == [
        {"capture", "channels"},
        {"capture", "error"},
        {"capture", "channels"},
    ]
    assert captures[1]["capture"] == {"path": "empty.csv"}


def test_side_by_side_gives_the_same_as_one_by_one(folder):
    captures = [FIXTURES / name for name in ("corridor-lamp.csv", "bridge-display-day.csv", "mess-room-lamp.csv")]
    alone = run(*captures, "--json", "one.json")
    together = run(*captures, "--json", "two.json", "--workers", 2)
    assert alone.stdout == together.stdout
    assert (folder / "one.json").read_bytes() == (folder / "two.json").read_bytes()


def test_a_manifest_names_captures_and_their_dark_levels(folder):
    for name in ("bridge-display-day.csv", "bridge-display-night-new-driver.wav"):
        shutil.copy(FIXTURES / name, folder)
    (folder / "sweep.csv").write_text(
        "capture,unit,level,dark_level\nbridge-display-day.csv,A,100,0.012\nbridge-display-night-new-driver.wav,A,5,0.01\n"
    )
    done = run("--manifest", "sweep.csv", "--dc-coupled", "--json", "-")
    assert done.exit_code == 0, done.stderr
    captures = json.loads(done.stdout)["captures"]
    assert [capture["channels"][0]["level"]["dark"] for capture in captures] == [0.012, 0.01]
    assert captures[0]["conditions"] == {"unit": "A", "level_percent": 100.0}


def test_pictures_are_written_into_a_new_folder(folder):
    done = run(FIXTURES / "bridge-display-day.csv", "--dark-level", 0.012, "--figures", "a/b")
    assert done.exit_code == 0
    names = {path.name for path in (folder / "a" / "b").iterdir()}
    assert names == {f"bridge-display-day-{kind}.png" for kind in PICTURES}


def test_what_cannot_be_drawn_is_said(folder):
    done = run(FIXTURES / "corridor-lamp-recorder.wav", "--figures", "pictures")
    assert done.exit_code == 0
    assert "no picture corridor-lamp-recorder-plane" in done.stderr
    assert "flicker measure" not in done.stderr


@pytest.mark.parametrize(
    ("name", "content", "parts"),
    [
        ("empty.csv", b"", ["empty.csv", "empty"]),
        ("letter.csv", b"Dear colleague,\nthe lamp flickers.\nYours\n", ["letter.csv"]),
        ("names.csv", b"time,light\n", ["names.csv"]),
        ("cut.wav", (FIXTURES / "corridor-lamp-recorder.wav").read_bytes()[:30], ["cut.wav"]),
        ("noise.bin", bytes(range(256)) * 8, ["noise.bin"]),
    ],
)
def test_bad_files_get_one_sentence_and_leave_nothing(folder, name, content, parts):
    (folder / name).write_bytes(content)
    done = run(name, "--json", "answer.json", "--figures", "pictures")
    assert refused(done, *parts)
    assert not (folder / "answer.json").exists()
    assert not list((folder).rglob("*.png"))


@pytest.mark.parametrize(
    ("words", "parts"),
    [
        (["nothing.csv"], ["nothing.csv", "no such file"]),
        (["."], ["folder"]),
        ([], ["no capture", "--manifest"]),
        (["--manifest", "nothing.csv"], ["nothing.csv"]),
        (["--jsonn", "x"], ["--jsonn", "--json"]),
        (["--sample-rate", "fast", "x.csv"], ["--sample-rate", "fast"]),
        (["--workers", "0", "x.csv"], ["--workers"]),
    ],
)
def test_bad_words_get_one_sentence(folder, words, parts):
    assert refused(run(*words), *parts)


def test_a_capture_is_never_written_over(folder):
    shutil.copy(FIXTURES / "mess-room-lamp.csv", folder / "lamp.csv")
    before = (folder / "lamp.csv").read_bytes()
    assert refused(run("lamp.csv", "--json", "./lamp.csv"), "lamp.csv")
    shutil.copy(FIXTURES / "sensor-covered.csv", folder / "dark.csv")
    assert refused(run("lamp.csv", "--dark-capture", "dark.csv", "--json", "dark.csv"), "dark.csv")
    assert (folder / "lamp.csv").read_bytes() == before


def test_verbose_says_more():
    short, long = (run(FIXTURES / "corridor-lamp.csv", *more).stdout for more in ([], ["--verbose"]))
    assert len(long.splitlines()) > len(short.splitlines()) + 5


def test_stated_uncertainties_widen_the_intervals():
    def interval(name, *more):
        done = run(FIXTURES / "bridge-display-dusk.csv", "--dark-level", 0.012, "--json", "-", *more)
        measure = json.loads(done.stdout)["captures"][0]["channels"][0]["measures"][name]
        return measure["high"] - measure["low"]

    assert interval("fundamental_frequency", "--clock-ppm", 50) == pytest.approx(2 * 1.96 * 50e-6 * 239.7, rel=0.1)
    assert interval("percent_flicker", "--dark-uncertainty", 0.01) > 1.5 * interval("percent_flicker")


def test_a_camera_adds_the_predicted_frame(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    write_demo(tmp_path)
    words = ("bridge-display-dusk.csv", "--dark-level", 0.012, "--camera", "dock-camera.toml")
    done = run(*words, "--figures", "pictures")
    assert done.exit_code == 0, done.output
    assert (tmp_path / "pictures" / "bridge-display-dusk-frame.png").stat().st_size > 10_000
    assert len(list((tmp_path / "pictures").iterdir())) == 4
    alone = run(*words)
    assert alone.exit_code == 2
    assert "--figures" in alone.stderr
