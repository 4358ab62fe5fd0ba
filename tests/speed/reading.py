"""
How fast a large table is read, against `numpy.loadtxt` of the same file, and how much memory that takes.

`python tests/speed/reading.py [ROWS]` makes tables of two columns (default 10 million rows, 250 MB) in the temporary
folder, reads and measures them in processes run one after the other, and prints ratios and peak memory. The reference
reads the same numbers with decimal points.
"""

from __future__ import annotations

import json
import os
import statistics
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable
from pathlib import Path

import numpy as np

READ = """
import json, resource, sys, time
began = time.perf_counter()
{code}
print(json.dumps([time.perf_counter() - began, resource.getrusage(resource.RUSAGE_SELF).ru_maxrss * 1024]))
"""
OURS = "from flicker.readers import read; read(sys.argv[1])"
REFERENCE = "import sys, numpy; numpy.loadtxt(sys.argv[1], delimiter=',', skiprows=1)"
MEASURE = ("-m", "flicker", "measure", "--dark-level", "0", "--quiet")
BOUNDS = {"point": 0.8, "comma": 0.9}  # of reading alone, over loadtxt
WHOLE_BOUNDS = {"point": 1.3, "comma": 1.5}  # of `flicker measure` from start to end, over loadtxt from start to end
BASE = 120e6  # the interpreter with its libraries [bytes]
COLUMNS = 3  # peak memory over the two columns

Cost = tuple[float, float]  # time [s], or its ratio to that of the reference, and memory [bytes]


def make_tables(folder: Path, rows: int) -> dict[str, Path]:
    """Write the same light with decimal points and with decimal commas."""
    paths = {name: folder / f"{name}.csv" for name in ("point", "comma")}
    rng = np.random.default_rng(1)
    with paths["point"].open("w") as point, paths["comma"].open("w") as comma:
        point.write("Time (s),light (V)\n")
        comma.write("Time (s);light (V)\n")
        for first in range(0, rows, 500_000):
            times = np.arange(first, min(first + 500_000, rows)) * 1e-6
            light = 0.5 + 0.4 * np.sin(2 * np.pi * 239.7 * times) + rng.normal(0, 0.005, times.size)
            text = "".join(f"{t:.9f},{y:.10f}\n" for t, y in zip(times.tolist(), light.tolist(), strict=True))
            point.write(text)
            comma.write(text.replace(",", ";").replace(".", ","))
    return paths


def run(code: str, path: Path) -> tuple[float, float]:
    """Time and peak memory of one process. [s], [bytes]"""
    done = subprocess.run(
        [sys.executable, "-c", READ.format(code=code), str(path)], check=True, capture_output=True, text=True
    )
    seconds, memory = json.loads(done.stdout)
    return seconds, memory


def run_whole(words: tuple[str, ...], path: Path) -> tuple[float, float]:
    """Time and peak memory of one process from its start to its end. [s], [bytes]"""
    began = time.perf_counter()
    process = subprocess.Popen([sys.executable, *words, str(path)], stdout=subprocess.DEVNULL)
    _, status, usage = os.wait4(process.pid, 0)
    process.returncode = os.waitstatus_to_exitcode(status)
    if process.returncode:
        raise subprocess.CalledProcessError(process.returncode, words)
    return time.perf_counter() - began, usage.ru_maxrss * 1024


def compare(ours: Callable[[], Cost], theirs: Callable[[], Cost], runs: int = 3) -> Cost:
    """Median ratio of paired runs, and the largest peak memory of ours. [1], [bytes]"""
    pairs = [(ours(), theirs()) for _ in range(runs)]
    return statistics.median(mine[0] / other[0] for mine, other in pairs), max(mine[1] for mine, _ in pairs)


def reading(path: Path, reference: Path) -> Cost:
    """Reading alone, without the start of the interpreter."""
    return compare(lambda: run(OURS, path), lambda: run(REFERENCE, reference))


def measuring(path: Path, reference: Path) -> Cost:
    """`flicker measure` as a whole process."""
    return compare(lambda: run_whole(MEASURE, path), lambda: run_whole(("-c", REFERENCE), reference))


if __name__ == "__main__":
    count = int(sys.argv[1]) if len(sys.argv) > 1 else 10_000_000
    with tempfile.TemporaryDirectory() as folder:
        tables = make_tables(Path(folder), count)
        for what, cost, bounds in (("read", reading, BOUNDS), ("flicker measure", measuring, WHOLE_BOUNDS)):
            for name, path in tables.items():
                ratio, memory = cost(path, tables["point"])
                columns = count * 16
                print(f"{what}, decimal {name}: {ratio:.2f} times loadtxt (at most {bounds[name]}),", end=" ")
                print(f"{memory / 2**20:.0f} MiB ({memory / columns:.1f} times the two columns)", flush=True)
