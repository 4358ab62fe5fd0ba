"""Every note that can be raised: a capture that provokes it, a clean one that does not, and an explanation."""

import ast
import dataclasses
import functools
import re
from pathlib import Path

import numpy as np
import pytest
import soundfile

import flicker
from flicker.camera.render import HarmonicLight, Lit, Shot, render, write_clip
from flicker.camera.stripes import read_stripes
from flicker.filmed import find_line_time, map_video
from flicker.footage import Footage
from flicker.light import Pulse
from flicker.readers import _long, video, wav
from flicker.readers.video import read_footage
from flicker.waveforms import rectified_sine

PACKAGE = Path(flicker.__file__).parent
PAGE = PACKAGE.parent / "docs" / "captures.md"

RATE = 20_000.0
TIMES = np.arange(3000) / RATE
SINE = 1 + 0.6 * np.sin(2 * np.pi * 239.7 * TIMES)
ORDER = np.random.default_rng(5).permutation(3000)


def seconds(length, rate=RATE):
    return np.arange(int(length * rate)) / rate


def pulses(times, frequency=240.3, duty=0.4):
    return 0.1 + 0.9 * (times * frequency % 1 < duty)


def noisy(light, size=0.005):
    return light + np.random.default_rng(1).normal(0, size, light.size)


# captures of a photodiode


def measured(path, **how):
    """Codes of the notes on every channel."""
    report = flicker.measure(flicker.read(path, **({"dark_level": 0.0} | how)))
    return {note.code for channel in report.captures[0].channels for note in channel.notes}


def table(light=SINE, times=TIMES, head="Time (s),light (V)\n", line="{t:.8f},{y:.6f}\n", **how):
    """Give a test that writes a table and measures it."""
    content = head + "".join(line.format(t=t, y=y) for t, y in zip(times, light, strict=True))
    return text(content, **how)


def text(content, **how):
    def codes(tmp_path, _):
        (tmp_path / "lamp.csv").write_text(content)
        return measured(tmp_path / "lamp.csv", **how)

    return codes


def lines(change):
    """Give a test that measures a table whose rows were changed."""
    rows = [f"{t:.6f},{y:.6f}" for t, y in zip(TIMES, SINE, strict=True)]
    return text("\n".join(["Time (s),light (V)", *change(rows)]) + "\n")


def sound(light=0.25 * SINE, bytes_lost=0, **how):
    def codes(tmp_path, _):
        path = tmp_path / "lamp.wav"
        soundfile.write(path, light, int(RATE), "FLOAT")
        content = path.read_bytes()
        path.write_bytes(content[: len(content) - bytes_lost])
        return measured(path, **how)

    return codes


def long_sound(*, louder):
    """Give a test that calls a recording long although it is handy."""

    def codes(tmp_path, monkeypatch):
        monkeypatch.setattr(wav, "_MOST_KEPT", 1 << 15)
        monkeypatch.setattr(_long, "EXCERPT", 1 << 14)
        monkeypatch.setattr(_long, "_FRAMES", 10_000)
        times = seconds(10.0)
        light = 0.25 * (1 + 0.6 * np.sin(2 * np.pi * 239.7 * times)) * np.where(times < 2.0, louder, 1.0)
        soundfile.write(tmp_path / "lamp.wav", light, int(RATE), "FLOAT")
        return measured(tmp_path / "lamp.wav", dc_coupled=True)

    return codes


def without_some_pulses(times, missing):
    light = pulses(times)
    light[np.isin(np.floor(times * 240.3), missing)] = 0.1
    return light


# videos

LINES, LINE_TIME, FRAME_RATE, EXPOSURE = 240, 60e-6, 29.97, 1 / 2000
SCENE = 0.14 + 0.04 * np.sin(np.arange(LINES)[:, None] / 23) + 0.02 * np.cos(np.arange(32) / 5)
BACKLIGHT = Pulse(463.21, 0.35, 0.3)
SHOT = Shot(LINE_TIME, FRAME_RATE, EXPOSURE, 40, [Lit(SCENE, [BACKLIGHT])], noise=0.01, pixel_format="yuv444p")


def clip(name="clip.mkv", codec="ffv1", damage=None, how=None, **changes):
    """Give a test that films a clip and reads it."""

    def codes(tmp_path, _):
        write_clip(tmp_path / name, dataclasses.replace(SHOT, **changes), codec)
        if damage is not None:
            (tmp_path / name).write_bytes(damage((tmp_path / name).read_bytes()))
        return {note.code for note in read_footage(tmp_path / name, **(how or {})).notes}

    return codes


def frames_measured(tmp_path, _):
    write_clip(tmp_path / "clip.mkv", dataclasses.replace(SHOT, frames=24), "ffv1")
    return measured(tmp_path / "clip.mkv", exposure=EXPOSURE)


def part_of_a_clip(tmp_path, monkeypatch):
    monkeypatch.setattr(video, "_MOST_VALUES", 20 * 4 * LINES)
    return clip()(tmp_path, monkeypatch)


def with_bytes_changed(content):
    """Overwrite the middle third: parts of a picture then claim lengths beyond the file, which no decoder takes."""
    third = len(content) // 3
    return content[:third] + b"\xff" * third + content[2 * third :]


def filmed(light=BACKLIGHT, *, shown=None, lossless=True, change=None, **changes):
    """Lines of a shot without a file between."""
    parts = [Lit(SCENE, [light])] if not isinstance(light, list) else light
    shot = dataclasses.replace(SHOT, parts=parts, **changes)
    rows = np.stack([frame[..., 1].mean(axis=1) for frame in render(shot)])
    if change is not None:
        rows = change(rows)
    times = np.arange(len(rows)) / shot.frame_rate if shown is None else shown
    return Footage(
        rows.astype(np.float32)[:, :, None, None], ("all",), times, shot.frame_rate, lines_of_frame=LINES,
        lossless=lossless,
    )  # fmt: skip


def stripes(light=BACKLIGHT, *, line_time=LINE_TIME, exposure=EXPOSURE, **changes):
    """Give a test that reads the light back from its stripes."""

    def codes(_, __):
        how = {"exposure": exposure} if exposure else {}
        footage = filmed(light, **({"exposure": exposure} if exposure else {}), **changes)
        return {note.code for note in read_stripes(footage, line_time=line_time, **how).notes}

    return codes


def held(rows):
    """Frames coded from their neighbours, which do not renew the bands."""
    rows = rows.copy()
    rows[1::2] = 0.7 * rows.mean(axis=0) + 0.3 * rows[:-1:2]
    return rows


def shaken(rows):
    return np.stack([np.roll(row, round(3 * np.sin(number / 3))) for number, row in enumerate(rows)])


def line_time(frequency=1007.0, stated=1007.0):
    """Give a test that measures the line time from a light whose frequency is stated."""

    def codes(tmp_path, _):
        shot = dataclasses.replace(SHOT, frame_rate=25.0, parts=[Lit(SCENE, [Pulse(frequency, 0.5)])])
        write_clip(tmp_path / "clip.mkv", shot, "ffv1")
        return {note.code for note in find_line_time(tmp_path / "clip.mkv", stated).notes}

    return codes


def screen(**how):
    """Give a test that maps the flicker over a picture."""

    def codes(tmp_path, _):
        parts = [Lit(np.full((24, 32), 0.15), [Pulse(117.3, 0.4)])]
        write_clip(tmp_path / "clip.mkv", Shot(8e-6, 960.0, EXPOSURE, 240, parts, noise=0.01), "ffv1")
        return {note.code for note in map_video(tmp_path / "clip.mkv", rows=2, columns=2, **how).notes}

    return codes


# the table

CLEAN_TABLE, CLEAN_SOUND = table(), sound(dc_coupled=True)
CLEAN_CLIP, CLEAN_STRIPES = clip(frames=24), stripes(exposure=1 / 20_000)
LONG = seconds(1.0)
UNEVEN = TIMES + np.random.default_rng(2).uniform(-0.3, 0.3, 3000) / RATE
WOBBLY = np.cumsum(np.random.default_rng(4).uniform(0.028, 0.041, 24))
LAMP = HarmonicLight(100.0, 0.4 * rectified_sine(50.0).amplitudes(40))
H264 = {"name": "clip.mp4", "codec": "libx264", "pixel_format": "yuv420p"}

# code: what provokes it, what does not
CODES = {
    "ac-coupled": (table(SINE - SINE.mean(), dark_level=None), CLEAN_TABLE),
    "aliasing-possible": (frames_measured, CLEAN_TABLE),
    "bands-held": (stripes(lossless=False, change=held, frames=60), CLEAN_STRIPES),
    "blind-harmonics": (stripes(exposure=EXPOSURE), CLEAN_STRIPES),
    "burst": (table(np.where(LONG > 0.25, pulses(LONG), 0.1), LONG), CLEAN_TABLE),
    "clipped": (table(np.where(SINE > 1.55, 9.9e37, SINE)), CLEAN_TABLE),
    "clock-off": (line_time(stated=1007.4), line_time()),
    "coupling-assumed": (sound(), CLEAN_SOUND),
    "cut-short": (sound(bytes_lost=4000, dc_coupled=True), CLEAN_SOUND),
    "damaged": (clip(damage=with_bytes_changed, **H264), clip(**H264)),
    "dark-assumed": (table(dark_level=None), CLEAN_TABLE),
    "direction-uncertain": (line_time(1000.2, 1000.2), line_time()),
    "drift": (table((1 + 0.1 * LONG) * (1 + 0.3 * np.sin(2 * np.pi * 239.7 * LONG)), LONG), CLEAN_TABLE),
    "dropped-frames": (clip(times=np.delete(np.arange(24) / 25, [7, 8]), frame_rate=25.0, **H264), clip(**H264)),
    "excerpt": (long_sound(louder=1.0), CLEAN_SOUND),
    "excerpt-differs": (long_sound(louder=1.5), long_sound(louder=1.0)),
    "exposure-fitted": (stripes(exposure=None), CLEAN_STRIPES),
    "exposure-hunting": (stripes(gain=1 + 0.1 * np.sin(np.arange(40) / 3)), CLEAN_STRIPES),
    "exposure-unknown": (stripes(HarmonicLight(463.21, np.array([0.1])), exposure=None), CLEAN_STRIPES),
    "faint-bands": (stripes(Pulse(463.21, 0.35, 0.99), lossless=False, noise=0.003), stripes(lossless=False)),
    "few-cycles": (table(1 + 0.6 * np.sin(2 * np.pi * 30 * TIMES)), CLEAN_TABLE),
    "frame-rate-told": (clip(how={"frame_rate": 240.0}), CLEAN_CLIP),
    "frequency-ambiguous": (stripes(Pulse(9003.0, 0.35), frame_rate=25.0, exposure=1 / 20_000), CLEAN_STRIPES),
    "gap": (lines(lambda rows: rows[:1000] + rows[1300:]), CLEAN_TABLE),
    "interlaced": (clip(options={"x264-params": "tff=1"}, **H264), clip(**H264)),
    "line-time-off": (stripes(line_time=61e-6), CLEAN_STRIPES),
    "line-time-unknown": (stripes(line_time=None), CLEAN_STRIPES),
    "low-resolution": (table(np.round(20 * noisy(SINE, 0.02)) / 20), CLEAN_TABLE),
    "matrix-assumed": (clip(tagged=False), CLEAN_CLIP),
    "mean-replaced": (table(mean=1.0, dark_level=None), table(SINE - SINE.mean(), mean=1.0, dark_level=None)),
    "mended-times": (lines(lambda rows: [*rows[:1200], f"0{rows[1200][8:]}", *rows[1201:]]), CLEAN_TABLE),
    "min-max-pairs": (lines(lambda rows: [part for row in rows for part in (row, f"{row}1")]), CLEAN_TABLE),
    "missing-pulses": (table(without_some_pulses(LONG, [50, 131, 200]), LONG), table(pulses(LONG), LONG)),
    "moving-scene": (stripes(change=shaken), CLEAN_STRIPES),
    "negative-light": (table(-SINE), CLEAN_TABLE),
    "no-time": (lines(lambda rows: [*rows[:1200], rows[1200][8:], *rows[1201:]]), CLEAN_TABLE),
    "noise-dominated": (table(noisy(1 + 0.02 * np.sin(2 * np.pi * 100 * LONG), 0.05), LONG), table(noisy(SINE))),
    "part-used": (part_of_a_clip, CLEAN_CLIP),
    "rate-disagrees": (table(head="Sample rate,40000,Hz\nTime (s),light (V)\n"), CLEAN_TABLE),
    "reordered": (lines(lambda rows: [rows[place] for place in ORDER]), CLEAN_TABLE),
    "repeated-frames": (
        stripes(noise=0.0, times=np.arange(40) // 2 * 2 / FRAME_RATE, shown=np.arange(40) / FRAME_RATE),
        CLEAN_STRIPES,
    ),
    "rounded-time": (table(line="{t:.3f},{y:.6f}\n"), CLEAN_TABLE),
    "segments": (lines(lambda rows: [*rows, "Segment", "Time,light", *rows[:700]]), CLEAN_TABLE),
    "several-lights": (stripes([Lit(0.5 * SCENE, [BACKLIGHT]), Lit(0.5 * SCENE, [LAMP])], frames=60), CLEAN_STRIPES),
    "slow-pulsing": (
        table((1 + 0.03 * np.sin(2 * np.pi * 8.8 * LONG)) * pulses(LONG), LONG),
        table(pulses(LONG), LONG),
    ),
    "standing-harmonics": (stripes(Pulse(30 * 15.5, 0.35, 0.3), frame_rate=30.0), CLEAN_STRIPES),
    "time-unit-assumed": (table(head="time,light\n"), CLEAN_TABLE),
    "transfer-assumed": (clip(tagged=False), CLEAN_CLIP),
    "truncated": (clip(damage=lambda content: content[: int(0.6 * len(content))]), CLEAN_CLIP),
    "undersampled": (table(noisy(1 + 0.5 * np.sin(2 * np.pi * 7003 * TIMES)), TIMES), CLEAN_TABLE),
    "uneven-time": (table(1 + 0.6 * np.sin(2 * np.pi * 239.7 * UNEVEN), UNEVEN), CLEAN_TABLE),
    "variable-frame-rate": (clip(times=WOBBLY, **H264), clip(**H264)),
}


@pytest.fixture(scope="module")
def clean(tmp_path_factory):
    """Run each clean capture once."""

    @functools.cache
    def codes(make):
        with pytest.MonkeyPatch.context() as monkeypatch:
            return make(tmp_path_factory.mktemp("clean"), monkeypatch)

    return codes


@pytest.mark.parametrize("code", CODES)
def test_every_note_is_raised_where_it_is_due_and_only_there(code, tmp_path, monkeypatch, clean):
    provoking, harmless = CODES[code]
    assert code in provoking(tmp_path, monkeypatch)
    assert code not in clean(harmless)


@pytest.mark.parametrize("make", [CLEAN_TABLE, CLEAN_SOUND, CLEAN_CLIP])
def test_clean_captures_raise_no_note_at_all(make, clean):
    assert clean(make) == set()


def test_also_the_light_from_the_stripes_of_a_screen_is_clean(clean, tmp_path, monkeypatch):
    assert clean(CLEAN_STRIPES) == {"dark-assumed"}  # a film never states what black is
    assert screen(line_time=8e-6, exposure=EXPOSURE)(tmp_path, monkeypatch) == set()


def test_a_map_without_exposure_and_line_time_says_so(tmp_path, monkeypatch):
    assert screen()(tmp_path, monkeypatch) == {"exposure-fitted", "aliasing-possible"}


def codes_in(file):
    for node in ast.walk(ast.parse(file.read_text(encoding="utf-8"))):
        if isinstance(node, ast.Call) and getattr(node.func, "id", getattr(node.func, "attr", "")) == "Note":
            code = node.args[0] if node.args else next(word.value for word in node.keywords if word.arg == "code")
            assert isinstance(code, ast.Constant), f"{file}, line {node.lineno}: the code of a note must be a literal"
            yield code.value


def test_every_code_has_a_test_and_an_explanation():
    in_code = {code for file in PACKAGE.rglob("*.py") for code in codes_in(file)}
    explained = re.findall(r"^\| `([a-z-]+)` \|", PAGE.read_text(encoding="utf-8"), re.MULTILINE)
    assert set(CODES) == in_code
    assert sorted(explained) == sorted(in_code), "each once"
