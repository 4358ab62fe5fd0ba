"""Pages of large captures are small and ready at once; a report with its page costs little more than empty panels."""

import shutil
import subprocess
import sys
import time

import numpy as np
import pytest

import flicker
from flicker.report.page import page
from flicker.report.pages import title_of
from flicker.report.sheets import capture_article
from flicker.trace import Capture, Trace

SAMPLES = 10_000_000
SMALL = 8_000
LARGEST = 1_500_000  # bytes of a page
READY = 1.0  # until the page has loaded [s]
PANELS = 5  # figures on the page of a small capture
RATIO = 1.6  # of the time that matplotlib takes for as many empty panels

EMPTY_PANELS = f"""
import io
from matplotlib.figure import Figure
figure = Figure(figsize=(8, 22))
figure.subplots({PANELS}, 1)
figure.savefig(io.BytesIO(), format="svg")
"""


def traced(samples):
    times = np.arange(samples) / 1e5
    light = 0.1 + 0.5 * (times * 240.3 % 1 < 0.3) + np.random.default_rng(2).normal(0, 0.003, samples)
    return Capture((Trace(light, sample_rate=1e5, dark_level=0.1),))


@pytest.fixture(scope="module")
def large(tmp_path_factory):
    (found,) = flicker.measure(traced(SAMPLES)).captures
    began = time.perf_counter()
    text = page(title_of(["large.wav"]), [capture_article(found)])
    print(f"\npage of {SAMPLES} samples: {len(text.encode()) / 1e3:.0f} kB in {time.perf_counter() - began:.2f} s")
    path = tmp_path_factory.mktemp("page") / "large.html"
    path.write_text(text, encoding="utf-8")
    return path


def test_the_page_of_a_large_capture_is_small(large):
    assert large.stat().st_size < LARGEST


def test_the_page_of_a_large_capture_is_ready_at_once(large):
    sync_api = pytest.importorskip("playwright.sync_api")
    with sync_api.sync_playwright() as playwright:
        browser = playwright.chromium.launch(executable_path=shutil.which("chromium"), args=["--no-sandbox"])
        tab = browser.new_page()
        tab.goto("about:blank")
        began = time.perf_counter()
        tab.goto(large.as_uri())
        tab.screenshot()
        took = time.perf_counter() - began
        browser.close()
    print(f"\nloaded and painted in {took:.2f} s")
    assert took < READY


def test_a_report_with_its_page_takes_about_as_long_as_empty_panels(tmp_path):
    times = np.arange(SMALL) / 20_000
    light = 0.01 + (times * 239.7 % 1 < 0.05) + np.random.default_rng(3).normal(0, 0.002, SMALL)
    capture = tmp_path / "small.csv"
    np.savetxt(capture, np.c_[times, light], delimiter=",", header="time (s),light (V)", comments="", fmt="%.6f")
    target = tmp_path / "small.html"
    words = [sys.executable, "-m", "flicker", "measure", str(capture), "--dark-level", "0.01", "--html", str(target)]
    ours = shortest(words)
    drawn_by_the_page = 2  # of the camera bench: the frame and the curve, empty until a browser runs them
    assert target.read_text(encoding="utf-8").count("<figure") == PANELS + drawn_by_the_page
    theirs = shortest([sys.executable, "-c", EMPTY_PANELS])
    print(f"\nreport with its page {ours:.2f} s, {PANELS} empty panels {theirs:.2f} s: {ours / theirs:.2f} times")
    assert ours <= RATIO * theirs


def shortest(words, rounds=4):
    """Shortest time of a command from start to end. [s]"""
    found = []
    for _ in range(rounds):
        began = time.perf_counter()
        subprocess.run(words, check=True, stdout=subprocess.DEVNULL)
        found.append(time.perf_counter() - began)
    return min(found)
