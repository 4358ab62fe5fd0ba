"""
How fast a large table is read, against `numpy.loadtxt` of the same file, and how much memory that takes.

`python tests/speed/reading.py [ROWS]` makes tables of two columns (default 10 million rows, 250 MB) in the temporary
folder, reads them in whole processes run one after the other, and prints ratios and peak memory.
"""

from __future__ import annotations

import json
import statistics
import subprocess
import sys
import tempfile
from pathlib import Path

import numpy as np

READ = """
import json, resource, sys, time
began = time.perf_counter()
{code}
print(json.dumps([time.perf_counter() - began, resource.getrusage(resource.RUSAGE_SELF).ru_maxrss * 1024]))
"""
OURS = "from flicker.readers import read; read(sys.argv[1])"
MEASURE = "import flicker; flicker.measure(flicker.read(sys.argv[1], dark_level=0.0))"
REFERENCE = "import numpy; numpy.loadtxt(sys.argv[1], delimiter=',', skiprows=1)"
BOUNDS = {"point": 0.8, "comma": 0.9}  # of reading alone, over loadtxt
BASE = 120e6  # the interpreter with its libraries [bytes]


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


def compare(code: str, path: Path, reference: Path, runs: int = 3) -> tuple[float, float]:
    """Median ratio of paired runs, and the largest peak memory. [1], [bytes]"""
    pairs = [(run(code, path), run(REFERENCE, reference)) for _ in range(runs)]
    return statistics.median(ours[0] / theirs[0] for ours, theirs in pairs), max(ours[1] for ours, _ in pairs)


if __name__ == "__main__":
    count = int(sys.argv[1]) if len(sys.argv) > 1 else 10_000_000
    with tempfile.TemporaryDirectory() as folder:
        tables = make_tables(Path(folder), count)
        for what, code in (("read", OURS), ("read and measure", MEASURE)):
            for name, path in tables.items():
                ratio, memory = compare(code, path, tables["point"])
                columns = count * 16
                print(f"{what}, decimal {name}: {ratio:.2f} times loadtxt, {memory / 2**20:.0f} MiB", end=" ")
                print(f"({memory / columns:.1f} times the two columns)")
