import re
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

import flicker
from flicker.camera import Camera
from flicker.camera.answer import predict_all
from flicker.conditioning import condition
from flicker.light import ChannelLight, Light
from flicker.limits.region import REGIONS
from flicker.plots.style import REGION_MARKERS
from flicker.report.answer import REGION_MARKS, REGION_WORDS
from flicker.report.bands import bands_words
from flicker.report.words import report_words
from flicker.trace import Capture
from flicker.waveforms import pwm, rectified_sine, sampled, sine

FIXTURES = Path(__file__).resolve().parents[2] / "fixtures"


def report_of(*waves, **how):
    settings = {"sample_rate": 20_000.0, "duration": 0.3, "start": 0.0013, "noise": 0.001, "seed": 1, "unit": "V"}
    traces = [sampled(wave.at, **{**settings, **how}) for wave in waves]
    return flicker.measure(*(Capture((trace,), path=Path(f"light-{n}.csv")) for n, trace in enumerate(traces, 1)))


def answers(text):
    """The four lines of the answer, by their label."""
    joined = re.sub(r"\n {9}(?=\S)", " ", text)
    return dict(re.findall(r"^  (What|Depth|Risk|Next) +(.+)$", joined, re.M))


def test_the_answer_stands_at_the_top():
    words = report_words(report_of(pwm(240.3, 0.1)))
    assert [line.split()[0] for line in words.splitlines()[3:8] if line[2] != " "] == ["What", "Depth", "Risk", "Next"]
    answer = answers(words)
    assert answer["What"].startswith(("240.3 Hz, PWM", "240.30"))
    assert answer["Depth"] == "percent flicker 100 %: the light goes out in every cycle"
    assert answer["Risk"] == (
        "▲ above low risk: percent flicker 100 %, strongest line 197 % at 240.3 Hz, low risk ends at 19.2 % "
        "(IEEE 1789-2015)"
    )
    assert answer["Next"] == "for low risk, shrink the modulation 22.1-fold or raise the frequency to 1250 Hz"


@pytest.mark.parametrize(
    ("wave", "mark", "depth", "next_step"),
    [
        (sine(1000.0, 0.1), "●", "the darkest moment keeps 81.8 % of the brightest", "nothing"),
        (sine(240.0, 0.12), "◆", "keeps 78.6 %", "for no observable effect, shrink the modulation 1.5"),
        (sine(240.0, 0.5), "▲", "keeps 33", "or raise the frequency to 62"),
        (rectified_sine(50.02), "▲", "goes out", "for low risk, shrink the modulation 10"),
    ],
)
def test_says_how_deep_how_risky_and_what_to_do(wave, mark, depth, next_step):
    """Bounds of IEEE 1789-2015 (figures from memory): 0.08 f for low risk, f / 30 for no observable effect."""
    answer = answers(report_words(report_of(wave)))
    assert answer["Risk"].startswith(f"{mark} ")
    assert depth in answer["Depth"]
    assert next_step in answer["Next"]
    assert ("raise" in answer["Next"]) is (wave.name == "sine" and mark != "●"), (
        "mains ripple has no frequency to raise"
    )


def test_what_is_advised_is_enough_and_hardly_more():
    """By hand: 50 % of a sine needs 50 / 0.08 = 625 Hz; a PWM of full depth needs the end of the curve, 1250 Hz."""
    advice = answers(report_words(report_of(sine(240.0, 0.5))))["Next"]
    fold, frequency = map(float, re.search(r"modulation (.+)-fold .* to (.+) Hz", advice).groups())
    assert fold == pytest.approx(50 / 19.2, rel=1e-2)
    assert frequency == pytest.approx(625.0, rel=1e-2)
    assert "raise the frequency to 1250 Hz" in answers(report_words(report_of(pwm(110.0, 0.3))))["Next"]


def test_steady_light_is_called_steady():
    steady = sine(100.0, 0.0)
    words = report_words(report_of(steady))
    answer = answers(words)
    assert answer["What"].startswith("no frequency: ")
    assert re.fullmatch(r"percent flicker 0 %: steady within 0\.0\d+ %", answer["Depth"])
    assert "no modulation was found" in answer["Risk"]
    assert "flicker bands" not in words


def test_a_lost_mean_is_told_once_with_its_cure():
    report = flicker.measure(flicker.read(FIXTURES / "corridor-lamp-recorder.wav"))
    words = report_words(report)
    answer = answers(words)
    assert answer["What"].startswith("99.96 Hz")
    assert answer["Depth"] == "not known: see ac-coupled below"
    assert answer["Next"] == "cure ac-coupled, then measure again"
    assert words.count("--mean") == 1
    assert " ".join(words.split()).count("see ac-coupled below") == 2, (
        "once beside the depth, once for all measures that need the mean"
    )
    assert "percent flicker, flicker index, RMS modulation, SVM" in words


def test_slow_deep_flicker_comes_with_a_caution():
    """Guidance on photosensitivity (from public summaries): 3 to 70 Hz; IEEE 1789-2015, practice 3: 5 % below 90 Hz."""
    assert "seizures" in report_words(report_of(sine(15.0, 0.4), duration=2.0))
    for harmless in (sine(15.0, 0.03), sine(90.0, 0.4), sine(1.5, 0.4)):
        assert "seizures" not in report_words(report_of(harmless, duration=4.0, sample_rate=2000.0))


def test_a_second_light_is_named():
    trace = sampled(
        lambda times: sine(100.02, 0.1).at(times) + sine(733.3, 0.3).at(times) - 1,
        sample_rate=20_000.0, duration=0.5, noise=0.001, seed=3,
    )  # fmt: skip
    words = report_words(flicker.measure(Capture((trace,))))
    assert answers(words)["What"].startswith("733.3 Hz")
    assert re.search(r"^  also   100\.02 Hz, 10 % deep, twice the mains", words, re.M)


def test_a_broken_capture_is_to_be_mended_first():
    trace = sampled(sine(100.0, 0.2).at, sample_rate=20_000.0, duration=0.3, noise=0.001, seed=1, mean=-1.0)
    report = flicker.measure(condition(Capture((trace,))))
    words = report_words(report)
    assert answers(words)["Next"] == "mend the capture first: see negative-light below"
    assert words.count("--inverted") == 1


def test_every_measure_is_printed_or_excused():
    report = report_of(pwm(240.3, 0.3))
    words = report_words(report)
    for name in report.captures[0].channels[0].measures.keys() - {"wander_rate"}:  # of a frequency that keeps still
        spelled = name.replace("_", " ").replace("rms", "RMS").replace("svm", "SVM").replace("pst lm", "Pst LM")
        assert re.sub(r" (\d+)hz$", r" \1 Hz", spelled) in words, name


@pytest.mark.parametrize("width", [40, 60, 80, 132])
def test_no_line_is_wider_than_the_terminal(width):
    report = report_of(pwm(240.3, 0.3), rectified_sine(50.0), sine(100.0, 0.0))
    words = report_words(report, width=width, verbose=True)
    assert max(map(len, words.splitlines())) <= max(width, 60)  # the tables do not shrink below 60


def test_colour_only_adds_to_the_words():
    report = report_of(pwm(240.3, 0.3), sine(240.0, 0.12))
    plain = report_words(report)
    coloured = report_words(report, colour=True)
    assert "\x1b[" in coloured
    assert "\x1b" not in plain
    assert re.sub(r"\x1b\[[\d;]*m", "", coloured) == plain


def test_several_captures_are_laid_side_by_side_and_the_riskiest_is_named():
    words = report_words(report_of(sine(1000.0, 0.1), pwm(240.3, 0.3), sine(240.0, 0.12)))
    table = words[words.rindex("  capture ") :]
    rows = table.splitlines()
    assert [row.split()[0] for row in rows[1:4]] == ["light-1.csv", "light-2.csv", "light-3.csv"]
    assert "riskiest: light-2.csv" in table
    for row, mark in zip(rows[1:4], "●▲◆", strict=True):
        assert mark in row


def test_verbose_adds_methods_lines_and_history():
    report = flicker.measure(flicker.read(FIXTURES / "bridge-display-night.csv", dark_level=0.012))
    short, long = (report_words(report, verbose=verbose) for verbose in (False, True))
    assert len(long.splitlines()) > len(short.splitlines()) + 20
    for more in ("least squares", "spectral lines, strongest first", "dark level 0.012 V"):
        assert more in long
    assert "least squares" not in short


def test_notes_are_sorted_by_weight():
    report = flicker.measure(flicker.read(FIXTURES / "bridge-display-night.csv"))
    words = report_words(report)
    assert re.search(r"^  i  dark-assumed: ", words, re.M)


def test_every_region_has_its_mark_and_its_words():
    assert set(REGION_MARKS) == set(REGION_WORDS) == set(REGION_MARKERS) == set(REGIONS)
    assert len(set(REGION_MARKS.values())) == len(REGIONS)


def test_an_exposure_that_was_tried_is_not_offered_as_a_cure():
    """Two lights at once: a whole cycle of the slow one still bands by the fast one."""
    frequencies = np.array([31.0, 1203.7])
    light = Light((ChannelLight("light", frequencies, np.array([0.5, 0.4 + 0j]), (31.0, 1203.7)),))
    camera = Camera(lines=1080, line_time=15e-6, frame_rate=25.0)
    words = " ".join(bands_words(predict_all(light, camera, exposures=[0.01], limit=0.001)).split())
    assert "Nothing that can be dialled in keeps the bands" in words
    assert "a shutter that can be set freely" not in words
    offered = replace(camera, exposures=(0.01, 0.02))
    words = " ".join(bands_words(predict_all(light, offered, limit=0.001)).split())
    assert "a shutter that can be set freely: 1/31 s, 290.32° lets in 1 whole cycle;" in words
