"""
Whether the fundamental is ever taken an octave, or another whole ratio, too high or too low.

`python tests/speed/octaves.py [CAPTURES] [FIRST_SEED]` looks for the fundamental of random captures (those of
`intervals.py`, and PWM whose second pulse is weaker, whose fundamental is faint) and lists every one that is off by
more than a thousandth.
"""

from __future__ import annotations

import sys
from collections.abc import Callable
from concurrent.futures import ProcessPoolExecutor

import numpy as np
from intervals import KINDS, random_light

from flicker.signal.families import find_families
from flicker.signal.harmonics import Series
from flicker.trace import FloatArray
from flicker.waveforms import pwm, sampled


def limping(frequency: float, duty: float, weaker: float) -> Callable[[FloatArray], FloatArray]:
    """PWM of twice the frequency whose second pulse is weaker: the fundamental is faint."""
    pulses = pwm(2 * frequency, duty)
    return lambda times: pulses.at(times) * np.where((times * frequency) % 1.0 < 0.5, 1.0, weaker)


def look(seed: int) -> tuple[int, str, float, list[float]]:
    """Seed, kind, true fundamental and those found, strongest first. [Hz]"""
    rng = np.random.default_rng(seed)
    kind = (*KINDS, "limping")[seed % (len(KINDS) + 1)]
    if kind == "limping":
        frequency = float(np.exp(rng.uniform(np.log(40), np.log(2000))))
        light, rms = limping(frequency, rng.uniform(0.1, 0.7), rng.uniform(0.3, 0.95)), 1.0
    else:
        waveform = random_light(kind, rng)
        frequency, light, rms = waveform.frequency, waveform.at, waveform.rms_modulation / 100
    cycles, samples = np.exp(rng.uniform(np.log([10, 25]), np.log([300, 400])))
    noise = rms * 10 ** (-rng.uniform(20, 60) / 20)
    start = rng.uniform(0, 1)
    trace = sampled(
        light, sample_rate=frequency * samples, duration=cycles / frequency, noise=noise, seed=seed, start=start
    )
    families = find_families(Series.of(trace.light, trace.sample_rate)).families
    return seed, kind, frequency, [fit.frequency for fit in families]


def main() -> None:
    """Print what is off, and how many."""
    captures = int(sys.argv[1]) if len(sys.argv) > 1 else 2000
    first = int(sys.argv[2]) if len(sys.argv) > 2 else 0
    with ProcessPoolExecutor(2) as pool:
        rows = list(pool.map(look, range(first, first + captures), chunksize=20))
    wrong = [row for row in rows if not row[3] or abs(row[3][0] / row[2] - 1) > 1e-3]
    for seed, kind, frequency, found in wrong:
        print(f"seed {seed}, {kind}: {frequency:.6g} Hz, found {[round(one / frequency, 4) for one in found]} times it")
    print(f"{len(wrong)} of {captures} off; {sum(len(row[3]) > 1 for row in rows)} with a family too many")


if __name__ == "__main__":
    main()
