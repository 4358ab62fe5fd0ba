"""
Time a sweep of many captures with one worker and with two, and follow the memory of the program.

`python tests/speed/sweep.py [CAPTURES]`: captures of 100,000 samples each, 1,000 if no number is given.
"""

from __future__ import annotations

import os
import resource
import subprocess
import sys
import tempfile
import time
from pathlib import Path

import numpy as np
import soundfile

from flicker.waveforms import pwm, sampled

SAMPLES = 100_000
LIMITS = ("--limit", "ieee1789-low-risk", "--limit", "ieee1789-no-effect")


def write_sweep(folder: Path, captures: int) -> Path:
    """Write captures of a display dimmed by PWM, ten different ones and links to them, and their manifest."""
    rows = ["capture,level"]
    for number in range(captures):
        path = folder / f"display-{number}.wav"
        if number < 10:
            light = pwm(240.3, 0.08 + 0.09 * number)
            trace = sampled(light.at, sample_rate=20_000.0, duration=SAMPLES / 20_000.0, noise=0.002, seed=number)
            soundfile.write(path, 0.05 * trace.light.astype(np.float32), 20_000, subtype="FLOAT")
        else:
            os.link(folder / f"display-{number % 10}.wav", path)
        rows.append(f"{path.name},{100 * (number % 10 + 1) / 10:g}")
    manifest = folder / "sweep.csv"
    manifest.write_text("\n".join(rows) + "\n", encoding="utf-8")
    return manifest


def timed(manifest: Path, workers: int) -> tuple[float, float]:
    """Seconds that a check takes, and the largest memory of one of its processes so far [MB]."""
    words = [sys.executable, "-m", "flicker", "check", "--manifest", str(manifest), *LIMITS, "--dc-coupled"]
    words += ["--dark-level", "0", "--workers", str(workers), "--json", str(manifest.with_suffix(f".{workers}.json"))]
    start = time.perf_counter()
    done = subprocess.run(words, stdout=subprocess.DEVNULL, stderr=subprocess.PIPE, check=False)
    if done.returncode not in (0, 1):
        raise SystemExit(done.stderr.decode())
    return time.perf_counter() - start, resource.getrusage(resource.RUSAGE_CHILDREN).ru_maxrss / 1024


def main() -> None:
    captures = int(sys.argv[1]) if len(sys.argv) > 1 else 1000
    with tempfile.TemporaryDirectory() as folder:
        few, many = Path(folder) / "few", Path(folder) / "many"
        for place, count in ((few, max(captures // 10, 2)), (many, captures)):
            place.mkdir()
            write_sweep(place, count)
        _, small = timed(few / "sweep.csv", 1)
        one, large = timed(many / "sweep.csv", 1)
        two, _ = timed(many / "sweep.csv", 2)
    print(f"{captures} captures of {SAMPLES} samples: {one:.1f} s with one worker, {two:.1f} s with two")
    print(f"{one / two:.2f} times as fast; largest process {small:.0f} MB at a tenth, {large:.0f} MB at all of them")


if __name__ == "__main__":
    main()
