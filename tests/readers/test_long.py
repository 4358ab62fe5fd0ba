"""Recordings larger than memory: read in blocks, measured on an excerpt, their slow flicker on all of them."""

import numpy as np
import pytest
import soundfile

import flicker
from flicker.errors import InputError, UnreadableFileError
from flicker.readers import _long, read, wav
from flicker.signal.severity import decimated

RATE = 8_000
SECONDS = 200


def light(seconds=SECONDS, frequency=100.02, seed=2):
    times = np.arange(int(seconds * RATE)) / RATE
    rng = np.random.default_rng(seed)
    slow = 1 + 0.004 * np.sin(2 * np.pi * 8.8 * times)
    return 0.4 * slow * (1 + 0.2 * np.sin(2 * np.pi * frequency * times)) + rng.normal(0, 1e-4, times.size)


@pytest.fixture(scope="module")
def recording(tmp_path_factory):
    path = tmp_path_factory.mktemp("long") / "night.wav"
    soundfile.write(path, np.column_stack([light(), light(frequency=240.3, seed=3)]), RATE, "FLOAT")
    return path


@pytest.fixture
def long(monkeypatch):
    """Call recordings long that are handy for a test."""
    monkeypatch.setattr(wav, "_MOST_KEPT", 1 << 17)
    monkeypatch.setattr(_long, "EXCERPT", 1 << 16)
    monkeypatch.setattr(_long, "_FRAMES", 30_000)


def test_the_excerpt_is_the_middle_to_the_last_bit(recording, long):
    whole = soundfile.read(recording)[0]
    capture = read(recording)
    for number, trace in enumerate(capture.traces):
        first = (whole.shape[0] - (1 << 16)) // 2
        assert np.array_equal(trace.light, whole[first : first + (1 << 16), number])
        assert trace.start == first / RATE
        assert trace.whole.samples == whole.shape[0]


def test_slow_light_is_that_of_the_filter_run_over_all_of_it(recording, long):
    """Held against `scipy.signal.upfirdn` over the whole recording at once."""
    trace = read(recording).traces[0]
    expected, rate = decimated(soundfile.read(recording)[0][:, 0], RATE)
    assert trace.whole.sample_rate == rate
    times = trace.whole.start + np.arange(trace.whole.light.size) / rate
    slow = 0.4 * (1 + 0.004 * np.sin(2 * np.pi * 8.8 * times)) * (1 + 0.2 * np.sin(2 * np.pi * 100.02 * times))
    assert np.abs(trace.whole.light - slow).max() < 5e-4, "at its true times"
    assert abs(trace.whole.light.size - expected.size) < 20
    assert trace.whole.light.std() == pytest.approx(expected.std(), rel=1e-4)


def test_extremes_and_means_of_the_parts(recording, long):
    whole = soundfile.read(recording)[0][:, 0]
    trace = read(recording).traces[0]
    size = _long.block_frames(RATE)
    parts = [whole[first : first + size] for first in range(0, whole.size, size)]
    assert trace.whole.part == size / RATE
    assert np.allclose(trace.whole.lowest, [part.min() for part in parts])
    assert np.allclose(trace.whole.highest, [part.max() for part in parts])
    assert np.allclose(trace.whole.mean, [part.mean() for part in parts], rtol=1e-6)


def test_the_figures_are_those_of_a_reading_into_memory(recording, monkeypatch):
    how = {"dc_coupled": True, "dark_level": 0.0, "channels": [1]}
    plain = flicker.measure(flicker.read(recording, **how))
    monkeypatch.setattr(wav, "_MOST_KEPT", 1 << 17)
    monkeypatch.setattr(_long, "EXCERPT", 1 << 19)
    long = flicker.measure(flicker.read(recording, **how))
    for known, found in zip(plain.captures[0].channels, long.captures[0].channels, strict=True):
        for name, most in (("fundamental_frequency", 2e-3), ("percent_flicker", 0.05), ("svm", 0.002)):
            assert found.measures[name].value == pytest.approx(known.measures[name].value, abs=most)
        assert found.measures["pst_lm"].value == pytest.approx(known.measures["pst_lm"].value, rel=0.002)
        assert known.measures["pst_lm"].value > 0.5, "the slow light is seen"
        assert [note.code for note in found.notes if note.code.startswith("excerpt")] == ["excerpt"]
    said = long.to_dict()["captures"][0]["capture"]
    assert said["duration_s"] == SECONDS
    assert said["excerpt"]["duration_s"] == (1 << 19) / RATE


@pytest.mark.parametrize("what", ["dimmed", "deeper", "dark"])
def test_a_part_with_other_light_is_named(tmp_path, long, what):
    levels = light(60)
    part = slice(45 * RATE, 50 * RATE)
    if what == "dimmed":
        levels[part] *= 0.9
    elif what == "deeper":
        levels[part] = 0.4 + 1.5 * (levels[part] - 0.4)
    else:
        levels[part] = 0.0
    path = tmp_path / "changed.wav"
    soundfile.write(path, levels, RATE, "FLOAT")
    trace = flicker.read(path, dc_coupled=True).traces[0]
    note = next(note for note in trace.notes if note.code == "excerpt-differs")
    assert note.severity == "warning"
    begin = float(note.message.split("--start ")[1].split()[0])
    assert 43 < begin < 51
    again = flicker.read(path, dc_coupled=True, start=45.0, duration=5.0).traces[0]
    assert np.array_equal(again.light, soundfile.read(path)[0][part])


@pytest.mark.parametrize("frequency", [0.31, 2.2, 100.0])
def test_steady_and_slow_light_raise_no_alarm(tmp_path, long, frequency):
    path = tmp_path / "same.wav"
    times = np.arange(120 * RATE) / RATE
    levels = 0.4 + 0.1 * np.sin(2 * np.pi * frequency * times) + np.random.default_rng(4).normal(0, 0.01, times.size)
    soundfile.write(path, levels, RATE, "FLOAT")
    trace = flicker.read(path, dc_coupled=True).traces[0]
    assert "excerpt-differs" not in {note.code for note in trace.notes}


def test_a_part_is_cut_to_the_same_samples_as_from_memory(recording, long):
    whole = soundfile.read(recording)[0][:, 0]
    rng = np.random.default_rng(6)
    for _ in range(20):
        start, duration = float(rng.uniform(0, 190)), float(rng.uniform(0.001, 2.9))
        trace = flicker.read(recording, channels=[1], start=start, duration=duration).traces[0]
        first = round(trace.start * RATE)
        assert trace.whole is None
        assert first - 1 < start * RATE <= first + 1e-6
        assert np.array_equal(trace.light, whole[first : first + trace.samples])
        assert abs(trace.samples - duration * RATE) < 1
    with pytest.raises(InputError, match="no sample lies in the part"):
        flicker.read(recording, start=900.0)


def test_a_long_part_of_a_long_recording_is_an_excerpt_of_the_part(recording, long):
    trace = flicker.read(recording, start=100.0, duration=60.0).traces[0]
    assert trace.whole.duration == 60.0
    assert trace.start == pytest.approx(130.0 - (1 << 15) / RATE, abs=1 / RATE)
    assert trace.whole.first_part == 100.0


def test_sign_and_mean_reach_the_whole(recording, long):
    plain = flicker.read(recording, dc_coupled=True).traces[0]
    turned = flicker.read(recording, dc_coupled=True, inverted=True).traces[0]
    assert np.array_equal(turned.whole.light, -plain.whole.light)
    assert np.array_equal(turned.whole.lowest, -plain.whole.highest)
    raised = flicker.read(recording, mean=1.0).traces[0]
    assert raised.whole.light.mean() == pytest.approx(1.0, abs=1e-3)
    assert raised.whole.mean == pytest.approx(raised.whole.light.mean(), abs=2e-3)


def test_a_sample_that_is_no_number_is_refused(tmp_path, long):
    levels = light(30)
    levels[-5] = np.nan
    path = tmp_path / "nan.wav"
    soundfile.write(path, levels, RATE, "FLOAT")
    with pytest.raises(UnreadableFileError, match="no numbers"):
        read(path)


def test_an_error_of_the_reading_thread_comes_through():
    def blocks():
        yield np.zeros((10, 1), dtype=np.float32)
        raise UnreadableFileError("ends early")

    with pytest.raises(UnreadableFileError, match="ends early"):
        _long.read_long(blocks(), 100, 1, RATE, 0.0)
