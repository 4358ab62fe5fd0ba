"""
How long the program takes to start, against what its libraries alone take.

`python tests/speed/startup.py` prints the median over pairs of whole processes, run one after the other, so that
both of a pair see the same machine. `pytest tests/speed/test_startup.py` holds them against the bounds.
"""

from __future__ import annotations

import os
import statistics
import subprocess
import sys
import tempfile
import time
from collections.abc import Sequence
from pathlib import Path

CAPTURE = Path(__file__).resolve().parents[2] / "fixtures" / "corridor-lamp.csv"  # 0.5 s
FLICKER = [sys.executable, "-m", "flicker"]
PAIRS = {
    "flicker --help": ([*FLICKER, "--help"], [sys.executable, "-c", "import click"], 1.5),
    "flicker measure, a capture of 0.5 s": (
        [*FLICKER, "measure", str(CAPTURE), "--dark-level", "0.012"],
        [sys.executable, "-c", "import click, numpy, scipy.fft"],
        2.0,
    ),
}


def seconds(command: Sequence[str], compiled: str) -> float:
    """Run a process to its end, its compiled modules in a folder, and give the time it took. [s]"""
    environment = {name: value for name, value in os.environ.items() if name != "PYTHONDONTWRITEBYTECODE"}
    environment["PYTHONPYCACHEPREFIX"] = compiled
    begin = time.perf_counter()
    subprocess.run(command, check=True, stdout=subprocess.DEVNULL, env=environment)
    return time.perf_counter() - begin


def ratio(command: Sequence[str], reference: Sequence[str], runs: int = 15) -> float:
    """Median of the paired ratios, after one pair that compiles the modules and warms the disk."""
    with tempfile.TemporaryDirectory() as compiled:
        pairs = [(seconds(command, compiled), seconds(reference, compiled)) for _ in range(runs + 1)][1:]
    return statistics.median(ours / theirs for ours, theirs in pairs)


if __name__ == "__main__":
    for name, (command, reference, bound) in PAIRS.items():
        print(f"{name}: {ratio(command, reference):.2f} times `{reference[-1]}`, at most {bound}")
