import csv
import json
import os
import shutil
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest
from click.testing import CliRunner

from flicker.cli import program
from flicker.waveforms import pwm, sampled, sine

FIXTURES = Path(__file__).resolve().parents[2] / "fixtures"
DAY, DUSK, NIGHT = (str(FIXTURES / f"bridge-display-{when}.csv") for when in ("day", "dusk", "night"))
DARK = ("--dark-level", "0.012")
LOW_RISK = ("--limit", "ieee1789-low-risk")


def run(*words):
    return CliRunner().invoke(program, ["check", *map(str, words)])


def write(path, light, *, mean=1.0, sample_rate=20_000.0, duration=0.2, seed=1):
    trace = sampled(light, sample_rate=sample_rate, duration=duration, mean=mean, noise=0.001, seed=seed, start=0.0013)
    rows = [f"{time:.6f},{value:.6f}" for time, value in zip(trace.times(), trace.light, strict=True)]
    path.write_text("\n".join(["time (s),light (V)", *rows]) + "\n", encoding="utf-8")
    return path


@pytest.fixture(scope="module")
def sweep(tmp_path_factory):
    """A display that is dimmed by amplitude down to 60 %, then by PWM at 240 Hz, below 15 % at 480 Hz."""
    folder = tmp_path_factory.mktemp("sweep")
    rows = ["capture,unit,level,supply,dark_level,note"]
    for level in (100, 80, 60, 30, 20, 10):
        light = sine(100.0, 0.0) if level >= 60 else pwm(240.3 if level > 15 else 480.7, level / 60)
        write(folder / f"display-{level}pct.csv", light.at, mean=level / 100, seed=level)
        rows.append(f"display-{level}pct.csv,unit 7,{level} %,24 V DC,0,")
    (folder / "sweep.csv").write_text("\n".join(rows) + "\n", encoding="utf-8")
    return folder


# ---- the exit status is the answer ---------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("capture", "limits", "status", "headline"),
    [
        (DAY, LOW_RISK, 0, "bridge-display-day.csv: PASS, keeps the limit"),
        (DAY, (*LOW_RISK, "--limit", "ieee1789-seizure"), 0, "PASS, keeps all 2 limits"),
        (NIGHT, LOW_RISK, 1, "bridge-display-night.csv: FAIL, breaks the limit"),
        (DAY, ("--limit", "nema-c82-77-6-pst"), 3, "UNDECIDED, cannot be decided for the limit"),
        (DAY, (*LOW_RISK, "--limit", "nema-c82-77-6-pst"), 3, "UNDECIDED, cannot be decided for 1 of 2 limits"),
        (NIGHT, (*LOW_RISK, "--limit", "nema-c82-77-6-pst"), 1, "FAIL, breaks 1 of 2 limits"),
    ],
)
def test_the_exit_status_is_the_answer(capture, limits, status, headline):
    done = run(capture, *DARK, *limits)
    assert done.exit_code == status
    assert headline in done.stdout.splitlines()[0]
    assert done.stderr == ""


def test_the_printed_verdict_names_all_that_it_rests_on():
    lines = " ".join(run(NIGHT, *DARK, *LOW_RISK).stdout.split())
    for part in (
        "To keep ieee1789-low-risk: raise the frequency to 1250 Hz",
        "-fold",
        "dB",
        "≤ 19.18 %",
        "at 239.7 Hz",
    ):
        assert part in lines
    assert "Decision rule, guarded: pass only where the whole 95 % interval keeps the limit" in lines
    assert "simple: the value alone decides" in " ".join(
        run(NIGHT, *DARK, *LOW_RISK, "--decision", "simple").stdout.split()
    )


def test_without_a_limit_all_that_are_in_force_are_judged():
    data = json.loads(run(NIGHT, *DARK, "--json", "-").stdout)
    judged = {one["limit"] for one in data["captures"][0]["channels"][0]["verdicts"]}
    assert {"ieee1789-low-risk", "eu-2019-2020-svm", "gb-40070-depth", "california-ja8-below-200hz"} <= judged


def test_the_json_stands_alone_and_holds_what_the_interface_promises():
    done = run(NIGHT, *DARK, *LOW_RISK, "--json", "-")
    assert done.exit_code == 1
    data = json.loads(done.stdout)
    assert (data["format"], data["version"]) == ("flicker-report", 1)
    (verdict,) = data["captures"][0]["channels"][0]["verdicts"]
    agreed = "limit measure value low high bound unit margin_percent verdict reason source"
    assert set(agreed.split()) <= set(verdict)
    assert (verdict["verdict"], verdict["unit"]) == ("fail", "%")
    assert verdict["bound"] == pytest.approx(0.08 * 239.7, rel=1e-3)
    assert verdict["to_pass"]["least_frequency_hz"] == pytest.approx(1250.0)
    assert data["decision_rule"]["rule"] == "guarded"
    assert data["command_line"].startswith("flicker check ")


def test_a_day_and_a_sheet_of_ones_own_change_what_is_judged(tmp_path):
    sheet = tmp_path / "house.toml"
    sheet.write_text(
        'title = "House rule"\nsource = "standing order 12"\nbasis = "text seen"\n[[limit]]\nid = "night-depth"\n'
        'measure = "percent_flicker"\nat_most = 12\nclause = "3"\napplies = "bridge displays"\n'
    )
    assert run(DAY, *DARK, "--limits-file", sheet, "--limit", "night-depth").exit_code == 0
    assert run(DUSK, *DARK, "--limits-file", sheet, "--limit", "night-depth").exit_code == 1
    data = json.loads(run(DAY, *DARK, "--limit", "eu-2019-2020-svm", "--on-date", "2024-08-31", "--json", "-").stdout)
    assert data["captures"][0]["channels"][0]["verdicts"][0]["bound"] == 0.9


# ---- wrong words ---------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("words", "said"),
    [
        (["nowhere.csv"], "nowhere.csv"),
        ([NIGHT, "--limit", "ieee1789-lowrisk"], "did you mean 'ieee1789-low-risk'"),
        ([NIGHT, "--decision", "hopeful"], "no decision rule is called 'hopeful'"),
        ([NIGHT, "--on-date", "soon"], "'soon' is no date"),
        ([NIGHT, "--limits-file", "nowhere.toml"], "nowhere.toml: cannot be read"),
        ([NIGHT, "--record", "nowhere.toml"], "nowhere.toml: cannot be read"),
        (["--manifest", "nowhere.csv"], "nowhere.csv: cannot be read"),
        ([], "no capture: name one"),
        ([NIGHT, "--json", NIGHT], "is one of the captures"),
        ([NIGHT, "--csv", NIGHT], "is one of the captures"),
        ([NIGHT, *LOW_RISK, "--json", "no-such-folder/a.json"], "cannot be written"),
    ],
)
def test_wrong_words_are_answered_in_one_sentence_with_status_2(words, said, tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    done = run(*words)
    assert done.exit_code == 2
    assert said in done.stderr
    assert len(done.stderr.splitlines()) == 1
    assert not list(tmp_path.iterdir())


def test_a_capture_that_cannot_be_read_leaves_the_others_judged(tmp_path):
    (tmp_path / "torn.csv").write_text("")
    out = tmp_path / "out.json"
    done = run(DAY, tmp_path / "torn.csv", NIGHT, *DARK, *LOW_RISK, "--json", out, "--csv", tmp_path / "out.csv")
    assert done.exit_code == 2
    assert done.stderr.count("torn.csv") == 1
    first, torn, last = json.loads(out.read_text())["captures"]
    assert first["channels"][0]["verdicts"][0]["verdict"] == "pass"
    assert last["channels"][0]["verdicts"][0]["verdict"] == "fail"
    assert torn["capture"]["path"].endswith("torn.csv")
    assert "torn.csv" in torn["error"]
    rows = list(csv.DictReader((tmp_path / "out.csv").read_text().splitlines()))
    assert [row["verdict"] for row in rows] == ["pass", "", "fail"]
    assert "torn.csv" in rows[1]["error"]


# ---- sweeps --------------------------------------------------------------------------------------------------------


def test_a_sweep_says_what_happens_over_the_dimming_range(sweep, tmp_path):
    done = run(
        "--manifest", sweep / "sweep.csv", *LOW_RISK, "--figures", tmp_path / "pictures", "--json", tmp_path / "a.json"
    )
    assert done.exit_code == 1
    words = " ".join(done.stdout.split())
    assert words.startswith("FAIL: of 6 captures, 3 break a limit, 3 keep every limit")
    for part in (
        "worst step: 20 %",
        "dimmed by amplitude from 100 % to 60 %",
        "dimmed by PWM (pulse width) from 60 % to 10 %",
        "the mode changes at 60 %",
        "the frequency steps from 240.3 Hz to 480.7 Hz between 20 % and 10 %",
        "the mean level falls at every step down",
    ):
        assert part in words
    assert [path.name for path in (tmp_path / "pictures").iterdir()] == ["sweep-unit-7-light.png"]
    data = json.loads((tmp_path / "a.json").read_text())
    (course,) = data["sweep"]["courses"]
    assert course["worst"]["level_percent"] == 20.0
    assert course["mode_changes_percent"] == [60.0]
    assert data["captures"][0]["conditions"] == {"unit": "unit 7", "level_percent": 100.0, "supply": "24 V DC"}


def test_levels_are_taken_from_the_names(sweep):
    done = run(*sorted(sweep.glob("display-*.csv")), "--dark-level", "0", *LOW_RISK)
    assert "the mode changes at 60 %" in done.stdout


def test_a_limit_for_full_load_on_the_mains_does_not_judge_the_rest(sweep):
    data = json.loads(run("--manifest", sweep / "sweep.csv", "--limit", "eu-2019-2020-svm", "--json", "-").stdout)
    found = {one["channels"][0]["verdicts"][0]["verdict"] for one in data["captures"]}
    assert found == {"not-applicable"}
    assert data["verdict"] == "not-applicable"


def test_before_and_after_are_laid_side_by_side(sweep, tmp_path):
    after = ["capture,unit,level"]
    for level in (100, 30, 10):
        write(tmp_path / f"new-{level}.csv", pwm(20_000.0, 0.5).at if level == 5 else sine(100.0, 0.0).at)
        after.append(f"new-{level}.csv,unit 7 new driver,{level}")
    (tmp_path / "after.csv").write_text("\n".join(after))
    done = run("--manifest", tmp_path / "after.csv", "--against", sweep / "sweep.csv", "--dark-level", "0", *LOW_RISK)
    assert done.exit_code == 0
    assert "Before and after, 3 steps in both: 2 better, 0 worse, 1 with the same verdict" in done.stdout


def test_two_workers_give_the_same_bytes_as_one(sweep, tmp_path):
    for workers in (1, 2):
        outputs = ("--json", tmp_path / f"{workers}.json", "--csv", tmp_path / f"{workers}.csv")
        run("--manifest", sweep / "sweep.csv", *LOW_RISK, *outputs, "--workers", workers)
    one, two = (json.loads((tmp_path / f"{workers}.json").read_text()) for workers in (1, 2))
    assert {**one, "command_line": ""} == {**two, "command_line": ""}
    assert (tmp_path / "1.csv").read_bytes() == (tmp_path / "2.csv").read_bytes()


def test_the_same_input_gives_the_same_bytes(tmp_path):
    first, second = (run(DAY, *DARK, *LOW_RISK, "--json", "-").stdout for _ in range(2))
    assert first == second


# ---- stopped and taken up again ------------------------------------------------------------------------------------


def test_only_what_is_missing_is_done_again(sweep, tmp_path, monkeypatch):
    from flicker.sweep import batch

    kept = tmp_path / "kept"
    first = run("--manifest", sweep / "sweep.csv", *LOW_RISK, "--resume", kept, "--json", "-")
    files = sorted(kept.iterdir())
    assert len(files) == 6
    files[2].unlink()
    judged = []
    real = batch.judge_capture
    monkeypatch.setattr(batch, "judge_capture", lambda step, task: judged.append(step.capture) or real(step, task))
    again = run("--manifest", sweep / "sweep.csv", *LOW_RISK, "--resume", kept, "--json", "-")
    assert len(judged) == 1
    assert again.stdout == first.stdout
    run("--manifest", sweep / "sweep.csv", "--limit", "ieee1789-seizure", "--resume", kept, "--json", "-")
    assert len(judged) == 7  # another question, other answers


@pytest.mark.parametrize("how", [signal.SIGTERM, signal.SIGKILL])
def test_a_run_that_is_stopped_leaves_no_half_written_file_and_no_worker(sweep, tmp_path, how):
    rows = ["capture"]
    for number in range(60):
        shutil.copy(sweep / "display-30pct.csv", tmp_path / f"copy-{number}.csv")
        rows.append(f"copy-{number}.csv")
    (tmp_path / "many.csv").write_text("\n".join(rows))
    kept, out = tmp_path / "kept", tmp_path / "out"
    out.mkdir()
    words = [sys.executable, "-m", "flicker", "check", "--manifest", str(tmp_path / "many.csv"), "--dark-level", "0"]
    words += [
        *LOW_RISK,
        "--workers",
        "2",
        "--resume",
        str(kept),
        "--json",
        str(out / "a.json"),
        "--csv",
        str(out / "a.csv"),
    ]
    until = time.monotonic() + 60
    with subprocess.Popen(
        words, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL, start_new_session=True
    ) as process:
        try:
            while time.monotonic() < until and (not kept.exists() or len(list(kept.glob("*.json"))) < 3):
                time.sleep(0.02)
            process.send_signal(how)
            assert process.wait(30) == (128 + how if how == signal.SIGTERM else -how)
        finally:
            process.kill()
    assert list(out.iterdir()) == []
    while time.monotonic() < until and alive_in(process.pid):
        time.sleep(0.05)
    assert not alive_in(process.pid)
    done = [path for path in kept.iterdir() if not path.name.startswith(".")]
    assert 3 <= len(done) < 60
    assert all(json.loads(path.read_text())["channels"] for path in done)


def alive_in(session):
    """Processes of a session that still run."""
    found = []
    for entry in Path("/proc").glob("[0-9]*/stat"):
        try:
            fields = entry.read_text().rpartition(")")[2].split()
        except OSError:
            continue
        if int(fields[3]) == session and fields[0] != "Z" and int(entry.parent.name) != os.getpid():
            found.append(entry.parent.name)
    return found


# ---- the record ----------------------------------------------------------------------------------------------------


def test_a_record_stands_on_the_result(tmp_path):
    (tmp_path / "record.toml").write_text(
        'report_id = "PS-12"\nlaboratory = "pilot station workshop"\noperator = "deck officer"\ntested = 2026-05-04\n'
        'detector = "photodiode 3"\ncalibration_due = 2027-01-31\nsupply = "24 V DC"\n'
    )
    out = tmp_path / "out.json"
    done = run(DAY, *DARK, *LOW_RISK, "--record", tmp_path / "record.toml", "--json", out)
    words = " ".join(done.stdout.split())
    data = json.loads(out.read_text())
    for part in (
        "Record of report PS-12",
        "laboratory pilot station workshop",
        "tested on 2026-05-04",
        "calibration due 2027-01-31",
        "decision rule",
        "pass only where the whole 95 % interval",
        data["captures"][0]["capture"]["sha256"],
        "IEEE Std 1789-2015",
        "relate only to the items tested",
        "End of report PS-12",
        "flicker check",
    ):
        assert part in words, part
    assert data["record"]["detector"] == "photodiode 3"
    assert data["limits"][0]["limit"] == "ieee1789-low-risk"
