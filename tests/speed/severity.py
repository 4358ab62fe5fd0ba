"""
How long Pst LM of 180 s at 20 kHz takes, against one `sosfilt` of equal sections over the same samples.

`python tests/speed/severity.py` prints the median of paired ratios; `pytest tests/speed` holds it against the bound.
"""

from __future__ import annotations

import statistics
import time

import numpy as np
from scipy.signal import sosfilt

from flicker.signal.severity import decimated, sections, severity_of, smoothing, weighted_sensation

RATE, SECONDS = 20_000.0, 180.0
BOUND = 3.0


def ratio(runs: int = 9) -> float:
    """Median of the paired ratios, after one pair that fills the caches."""
    light = np.random.default_rng(1).normal(1.0, 0.01, int(RATE * SECONDS))
    equal = np.concatenate([sections(RATE), smoothing(RATE)])
    ratios = []
    for _ in range(runs + 1):
        begin = time.perf_counter()
        reduced, rate = decimated(light, RATE)
        severity_of(weighted_sensation(reduced / reduced.mean(), rate))
        middle = time.perf_counter()
        sosfilt(equal, light)
        ratios.append((middle - begin) / (time.perf_counter() - middle))
    return statistics.median(ratios[1:])


if __name__ == "__main__":
    print(f"Pst LM of {SECONDS:.0f} s at {RATE:.0f} Hz: {ratio():.2f} times one sosfilt, at most {BOUND:g}")
