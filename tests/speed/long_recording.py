"""
How long, and in how much memory, `flicker measure` takes a recording that is larger than memory need be.

`python tests/speed/long_recording.py [MINUTES]` writes a stereo 24-bit WAV at 192 kHz into a folder of its own (60
minutes are 4 GB), reads it once with `soundfile.blocks` as float32, runs `flicker measure`, and prints ratio of time,
memory over an interpreter that loaded the same libraries, and figures against the truth. Bounds: 1.5 and 400 MiB.
"""

from __future__ import annotations

import json
import subprocess
import sys
import tempfile
import time
from pathlib import Path

import numpy as np
import soundfile

RATE = 192_000
FREQUENCY, DUTY, LOW = 1003.37, 0.4, 0.25
DEPTH = 100 * (1 - LOW) / (1 + LOW)
READING = """
import soundfile, sys
for block in soundfile.blocks(sys.argv[1], 1 << 18, dtype="float32", always_2d=True):
    pass
"""
LIBRARIES = "import numpy, scipy.fft, scipy.linalg, scipy.optimize, scipy.signal, scipy.interpolate, soundfile, click"


def write(path: Path, minutes: float) -> None:
    """Write a PWM light with noise in the first channel, and a lamp on the mains that slowly warms up in the second."""
    rng = np.random.default_rng(1)
    with soundfile.SoundFile(path, "w", RATE, 2, "PCM_24") as file:
        for second in range(round(60 * minutes)):
            times = second + np.arange(RATE) / RATE
            pulsed = 0.5 * (LOW + (1 - LOW) * (times * FREQUENCY % 1 < DUTY))
            lamp = (0.4 + 0.01 * second / (60 * minutes)) * (1 + 0.2 * np.sin(2 * np.pi * 100.02 * times))
            noise = 0.001 * rng.standard_normal((RATE, 2), dtype=np.float32)
            file.write(noise + np.column_stack([pulsed, lamp]).astype(np.float32))


def run(words: list[str]) -> tuple[float, float, str]:
    """Give seconds, MiB at the peak, and what was printed, of a whole process."""
    watched = (
        "import resource, subprocess, sys; done = subprocess.run(sys.argv[1:], stdout=subprocess.PIPE, check=True)"
    )
    watched += "; print(resource.getrusage(resource.RUSAGE_CHILDREN).ru_maxrss); print(done.stdout.decode())"
    start = time.perf_counter()
    done = subprocess.run([sys.executable, "-c", watched, *words], check=True, capture_output=True, text=True)
    memory, _, printed = done.stdout.partition("\n")
    return time.perf_counter() - start, int(memory) / 1024, printed


def main() -> None:
    """Print the figures."""
    minutes = float(sys.argv[1]) if len(sys.argv) > 1 else 60.0
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "long.wav"
        write(path, minutes)
        print(f"{path.stat().st_size / 1e9:.2f} GB, {minutes:g} min")
        python = sys.executable
        run([python, "-c", READING, str(path)])  # the file is in the cache for both, or for neither
        plain, _, _ = run([python, "-c", READING, str(path)])
        _, idle, _ = run([python, "-c", LIBRARIES])
        command = [python, "-m", "flicker", "measure", str(path), "--dc-coupled", "--dark-level", "0", "--json", "-"]
        taken, memory, printed = run(command)
        print(f"measure {taken:.1f} s, soundfile.blocks {plain:.1f} s: {taken / plain:.2f} x (bound 1.5)")
        print(f"memory {memory - idle:.0f} MiB over {idle:.0f} MiB (bound 400)")
        measures = json.loads(printed)["captures"][0]["channels"][0]["measures"]
        print(f"frequency {measures['fundamental_frequency']['value']:.5f} Hz, truth {FREQUENCY}")
        print(f"percent flicker {measures['percent_flicker']['value']:.3f} %, truth {DEPTH:.3f}")
        print(f"Pst LM of the lamp: {json.loads(printed)['captures'][0]['channels'][1]['measures']['pst_lm']}"[:300])


if __name__ == "__main__":
    main()
