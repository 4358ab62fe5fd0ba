"""
Damaged files: whatever stands in them, they read or are refused in one sentence, soon, and no reading is NaN.

A few hundred in the default run; `FLICKER_MUTATIONS=20000 pytest tests/readers/test_mutations.py` for many.
"""

import io
import json
import math
import os
import time
from pathlib import Path

import numpy as np
import pytest
import soundfile
from click.testing import CliRunner

from flicker.cli import program
from flicker.conditioning import condition
from flicker.errors import FlickerError
from flicker.readers import read

COUNT = int(os.environ.get("FLICKER_MUTATIONS", "400"))
SHARES = 8
SLOWEST = 5.0  # [s]

TIMES = np.arange(400) / 2000
LIGHT = 1 + 0.6 * np.sin(2 * np.pi * 97 * TIMES)


def table(head, line):
    return head + "".join(line.format(i=i, t=t, y=y) for i, (t, y) in enumerate(zip(TIMES, LIGHT, strict=True)))


def sound(kind, subtype):
    file = io.BytesIO()
    soundfile.write(file, np.column_stack([LIGHT, -LIGHT]) / 2, 2000, format=kind, subtype=subtype)
    return file.getvalue()


ORIGINALS = [
    table("Instrument,scope\nSample interval,5e-4,s\n\nTime (s),light (V)\n", "{t:.4f},{y:.5f}\n").encode(),
    table("Time;light;lamp\nms;V;V\n", "{t:.4f};{y:.5f};{i}\n").replace(".", ",").encode("latin-1"),
    table("# sample_rate_hz: 2000\nlight [V]\n", "{y:.7e}\n").encode(),
    table("Zeit\tLicht µ\n", "{t!r}\t{y!r}\r\n").encode("utf-16"),
    table("time,light\n", "{t:.4f},{y:.3f}\n").replace(".", ",").encode(),
    table('"Time (s)","a","b"\n', '"{t:.4f}","{y:.3f}","OL"\n').encode("utf-8-sig"),
    table("t y\n", "{t:12.4f} {y:12.5f}\n").encode(),
    table("Record Length,400,,0,0,\n", ",,,{t:015.9f},{y:10.4f},\n").encode(),
    table("time,light\n", "{t:.4f} s,{y:.4f} V\n").encode(),
    "".join(
        f"{t * 1e3:.1f} ms;{y:.3f} V\n" if y > 1 else f"{t * 1e6:.0f} us;{y * 1e3:.0f} mV\n"
        for t, y in zip(TIMES, LIGHT, strict=True)
    ).encode(),
    table("", "{t:.4f},s,{y:.4f},V\n").encode(),
    sound("WAV", "PCM_16"),
    sound("WAV", "FLOAT"),
    sound("RF64", "PCM_24"),
    sound("FLAC", "PCM_16"),
    sound("AIFF", "PCM_16"),
    sound("CAF", "PCM_24"),
    sound("W64", "FLOAT"),
    sound("AU", "PCM_16"),
    (Path(__file__).parents[2] / "fixtures" / "generator-1003hz.mp4").read_bytes(),
]


def mutated(rng):
    """One of the originals, damaged in one to four ways."""
    content = bytearray(ORIGINALS[rng.integers(len(ORIGINALS))])
    for _ in range(rng.integers(1, 5)):
        if not content:
            break
        here = int(rng.integers(len(content)))
        # half of all damage strikes the head
        here = here % 200 if rng.random() < 0.5 else here
        length = int(rng.integers(1, 1 + max(1, len(content) // 4)))
        match rng.integers(8):
            case 0:
                del content[here:]
            case 1:
                del content[here : here + length]
            case 2:
                content[here:here] = content[here : here + length]
            case 3:
                for place in rng.integers(0, len(content), rng.integers(1, 30)):
                    content[place] = rng.integers(256)
            case 4:
                content[here : here + 4] = rng.integers(0, 256, 4, dtype=np.uint8).tobytes()
            case 5:
                other = ORIGINALS[rng.integers(len(ORIGINALS))]
                content[here:here] = other[:length]
            case 6:
                content[here:here] = bytes(length)
            case 7:
                odd = [
                    "0.5\n",
                    ",,;;",
                    "1e999",
                    "-",
                    '"',
                    "OL",
                    "nan",
                    "\ufeff",
                    "9" * 60,
                    "\x00\n",
                    "0,0,0\n",
                    "e",
                    "\r",
                ]
                content[here:here] = odd[rng.integers(len(odd))].encode("utf-16-le" if rng.random() < 0.3 else "utf-8")
    return bytes(content)


@pytest.mark.parametrize("share", range(SHARES))
def test_damaged_files_read_or_are_refused_in_a_sentence(tmp_path, share):
    path = tmp_path / "damaged"
    read_well = 0
    for seed in range(share, COUNT, SHARES):
        rng = np.random.default_rng(seed)
        path.write_bytes(mutated(rng))
        began = time.monotonic()
        try:
            options = {"sample_rate": 2000.0} if rng.random() < 0.3 else {}
            capture = condition(read(path, **options))
        except FlickerError as error:
            assert "\n" not in str(error), seed
            assert len(str(error)) < 500, (seed, str(error))
        except Exception as error:
            raise AssertionError(f"seed {seed}: {error!r}") from error
        else:
            read_well += 1
            for trace in capture.traces:
                assert np.isfinite(trace.light).all(), seed
                assert math.isfinite(trace.sample_rate), seed
                assert np.isfinite(trace.times()).all(), seed
                assert all("\n" not in note.message and "nan" not in note.message for note in trace.notes), seed
        assert time.monotonic() - began < SLOWEST, seed
    assert read_well > 0.1 * COUNT / SHARES


def no_number(word):
    raise AssertionError(f"{word} in JSON")


def test_the_command_leaves_status_0_or_2_and_numbers_in_its_json(tmp_path):
    path = tmp_path / "damaged"
    measured = 0
    for seed in range(3, COUNT, max(COUNT // 30, 8)):
        rng = np.random.default_rng(seed)
        path.write_bytes(mutated(rng))
        began = time.monotonic()
        dark = ["--dark-level", "0"] if rng.random() < 0.5 else []
        done = CliRunner().invoke(program, ["measure", str(path), "--json", "-", "--quiet", *dark])
        assert time.monotonic() - began < SLOWEST * 2, seed
        assert done.exit_code in (0, 2), (seed, done.exception)
        assert "Traceback" not in done.stderr, seed
        if done.exit_code == 2:
            assert done.stderr.startswith("flicker: "), seed
            assert done.stderr.count("\n") <= 3, (seed, done.stderr)
            continue
        measured += 1
        json.loads(done.stdout, parse_constant=no_number)
    assert measured > 5
