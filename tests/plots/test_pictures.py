"""Pictures are tested by what they say: labels with units, the data of their lines, where marks lie."""

from pathlib import Path

import numpy as np
import pytest

import flicker
from flicker.plots.pictures import PICTURES, picture_names, write_pictures
from flicker.plots.plane import draw_plane
from flicker.plots.spectrum import draw_spectrum
from flicker.plots.style import REGION_WORDS, save_figure
from flicker.plots.waveform import draw_waveform
from flicker.trace import Capture
from flicker.waveforms import pwm, sampled, sine

FIXTURES = Path(__file__).resolve().parents[2] / "fixtures"


@pytest.fixture(scope="module")
def night():
    return flicker.measure(flicker.read(FIXTURES / "bridge-display-night.csv", dark_level=0.012)).captures[0]


@pytest.fixture(scope="module")
def steady():
    return flicker.measure(flicker.read(FIXTURES / "mess-room-lamp.csv", dark_level=0.012)).captures[0]


def channel_of(wave, **how):
    settings = {"sample_rate": 20_000.0, "duration": 0.3, "start": 0.0013, "noise": 0.001, "seed": 1, "unit": "lx"}
    trace = sampled(wave.at, **{**settings, **how})
    return flicker.measure(Capture((trace,))).captures[0].channels[0]


def texts(axes):
    return [text.get_text() for text in axes.texts]


def line_named(axes, label):
    return next(line for line in axes.lines if line.get_label() == label)


def test_the_waveform_shows_readings_in_their_unit_and_the_cycle_over_its_mean(night):
    readings, cycle = draw_waveform(night.channels[0], "title").axes
    assert readings.get_xlabel() == "time since the start (ms)"
    assert readings.get_ylabel() == "reading (V)"
    drawn = readings.lines[0].get_xydata()
    assert drawn[-1, 0] == pytest.approx(5 * 1e3 / 239.7, rel=0.02)
    np.testing.assert_allclose(drawn[:, 1], night.channels[0].trace.light[: len(drawn)])
    assert "dark level" in texts(readings)
    assert cycle.get_ylabel() == "light over its mean"
    assert cycle.get_xlabel().startswith("phase (cycles)")
    shape = cycle.lines[0].get_xydata()
    assert shape[:, 1].max() == pytest.approx(20, rel=0.03), "duty 0.05: twenty times the mean"
    bright = shape[shape[:, 1] > 10, 0]
    assert bright.mean() == pytest.approx(0.5, abs=0.02), "the bright part lies in the middle"
    assert np.ptp(bright) == pytest.approx(0.05, abs=0.01)
    assert "percent flicker 100 %" in cycle.get_title(loc="left")


def test_the_band_about_the_cycle_is_relative_to_the_mean():
    channel = channel_of(sine(100.3, 0.3), mean=50.0, noise=0.02)
    _, cycle = draw_waveform(channel, "title").axes
    (band,) = cycle.collections
    height = np.ptp(band.get_paths()[0].vertices[:, 1])
    assert 0.6 < height < 0.75, "0.6 of the sine, and the noise of the mean cycle on both sides"


def test_steady_light_has_readings_only(steady):
    (readings,) = draw_waveform(steady.channels[0], "title").axes
    assert readings.get_ylabel() == "reading (V)"


def test_a_dark_level_that_was_not_stated_is_called_so():
    channel = flicker.measure(flicker.read(FIXTURES / "corridor-lamp.csv")).captures[0].channels[0]
    readings, _ = draw_waveform(channel, "title").axes
    assert "zero, taken as dark" in texts(readings)


def test_the_spectrum_marks_the_lines_where_they_are():
    """Fourier series of a pulse: 2 |sin(pi k D) / (pi k D)|."""
    (axes,) = draw_spectrum(channel_of(pwm(240.3, 0.25)), "title").axes
    assert axes.get_xlabel() == "frequency (Hz)"
    assert axes.get_ylabel() == "peak amplitude (% of the mean)"
    assert axes.get_xscale() == axes.get_yscale() == "log"
    found = line_named(axes, "lines found").get_xydata()
    first = found[np.argmin(abs(found[:, 0] - 240.3))]
    np.testing.assert_allclose(first, [240.3, 200 * np.sin(np.pi / 4) / (np.pi / 4)], rtol=0.01)
    whole = line_named(axes, "spectrum").get_xydata()
    near = whole[abs(whole[:, 0] - 240.3) < 10, 1]
    assert near.max() == pytest.approx(first[1], rel=0.2)
    assert any(text.startswith("240.3 Hz") for text in texts(axes))
    assert "half the sample rate" in texts(axes)


def test_a_long_capture_loses_no_line_in_drawing():
    (axes,) = draw_spectrum(channel_of(sine(5000.7, 0.4), duration=10.0), "title").axes
    drawn = line_named(axes, "spectrum").get_xydata()
    assert len(drawn) <= 3000
    assert drawn[np.argmax(drawn[:, 1]), 0] == pytest.approx(5000.7, rel=3e-3)


@pytest.mark.parametrize(
    ("wave", "region"),
    [
        (sine(1000.0, 0.1), "no-observable-effect"),
        (sine(240.0, 0.12), "low-risk"),
        (pwm(240.3, 0.3), "above-low-risk"),
    ],
)
def test_the_plane_points_at_what_decides(wave, region):
    channel = channel_of(wave)
    (axes,) = draw_plane(channel, "title").axes
    assert axes.get_xlabel() == "frequency (Hz)"
    assert axes.get_ylabel() == "modulation (% of the mean)"
    assert set(REGION_WORDS.values()) <= set(texts(axes)), "regions are named, not only shaded"
    mark = line_named(axes, "this light: percent flicker at its fundamental").get_xydata()
    np.testing.assert_allclose(mark, [[wave.frequency, wave.percent_flicker]], rtol=0.01)
    assert any(text.startswith(f"{REGION_WORDS[region]}:\n") for text in texts(axes))


def test_the_plane_draws_the_curves_of_the_standard():
    """IEEE 1789-2015 (figures from memory): 8 % and 3.33 % at 100 Hz, no limit above 1250 and 3000 Hz."""
    (axes,) = draw_plane(channel_of(sine(1000.0, 0.1)), "title").axes
    low_risk, no_effect = (line.get_xydata() for line in axes.lines[:2])
    for curve, at_100, edge in ((low_risk, 8.0, 1250.0), (no_effect, 3.3333, 3000.0)):
        assert np.exp(np.interp(np.log(100), *np.log(curve.T))) == pytest.approx(at_100, rel=2e-3)
        assert curve[curve[:, 0] > edge, 1].min() == axes.get_ylim()[1]
        assert curve[curve[:, 0] < edge, 1].max() <= 100.001


def test_the_plane_makes_room_for_slow_and_fast_light():
    for wave, how in (
        (sine(0.7, 0.2), {"duration": 20.0, "sample_rate": 500.0}),
        (sine(40e3, 0.2), {"sample_rate": 200e3}),
    ):
        (axes,) = draw_plane(channel_of(wave, **how), "title").axes
        low, high = axes.get_xlim()
        assert low < wave.frequency < high


def test_steady_light_is_said_in_the_plane(steady):
    (axes,) = draw_plane(steady.channels[0], "title").axes
    assert "steady light: no modulation was found" in texts(axes)


def test_pictures_are_written_for_every_channel_the_same_every_time(tmp_path):
    capture = flicker.measure(flicker.read(FIXTURES / "chart-table-lamp.csv", dark_level=0.012)).captures[0]
    for folder in (tmp_path / "a", tmp_path / "b"):
        folder.mkdir()
        written = write_pictures(capture, folder, "lamp").written
    names = {path.name for path in written}
    assert names == {f"lamp-{colour}-{kind}.png" for colour in ("red", "green", "blue") for kind in PICTURES}
    for name in names:
        assert (tmp_path / "a" / name).read_bytes() == (tmp_path / "b" / name).read_bytes()
        assert (tmp_path / "a" / name).stat().st_size < 200_000


def test_a_lost_mean_leaves_the_pictures_that_are_true(tmp_path):
    capture = flicker.measure(flicker.read(FIXTURES / "corridor-lamp-recorder.wav")).captures[0]
    pictures = write_pictures(capture, tmp_path, "lamp")
    for path in pictures.written:
        assert path.exists()
    assert set(pictures.missing) | {path.stem for path in pictures.written} == {f"lamp-{kind}" for kind in PICTURES}
    assert "lamp-plane" in pictures.missing


def test_names_of_pictures_never_meet():
    assert picture_names(["a/lamp.csv", "b/lamp.wav", "b/lamp-2.csv", "x y:z.csv"]) == [
        "lamp",
        "lamp-2",
        "lamp-2-2",
        "x-y-z",
    ]


def test_no_window_system_and_no_global_state_is_used(night, tmp_path):
    import sys

    save_figure(draw_plane(night.channels[0], "title"), tmp_path / "plane.svg")
    assert "matplotlib.pyplot" not in sys.modules
    assert (tmp_path / "plane.svg").read_text(encoding="utf-8").startswith("<?xml")
