"""
How often the 95 % intervals of SVM, rise time, fall time and decay time hold the truth.

`python tests/speed/edge_intervals.py [CAPTURES] [FIRST_SEED]` measures random captures, 30 to 60 dB, and prints for
every measure how many carry it, the share of intervals that hold the truth, the median width and the largest error.
SVM: at least 1 s at 20 kHz of a sine, PWM, triangle or rectified mains; truth from the closed-form lines (threshold of
IEC TR 63158). Rise and fall time: a trapezoid, truth 0.8 of each ramp (10 to 90 %, by hand). Decay: PWM behind one
pole.
"""

from __future__ import annotations

import sys

import numpy as np

from flicker.metrics import METRICS, Observation
from flicker.signal.stroboscopic import stroboscopic_visibility
from flicker.waveforms import pwm, rectified_sine, sampled, sine, triangle

_BAND = (80.0, 2000.0)  # [Hz]


def true_svm(light) -> float:
    """SVM of the closed-form lines."""
    harmonics = np.arange(1, int(_BAND[1] / light.frequency) + 1)
    frequencies = harmonics * light.frequency
    inside = frequencies >= _BAND[0]
    return float(stroboscopic_visibility(frequencies[inside], np.abs(light.amplitudes(harmonics.size))[inside]))


def trapezoid(frequency, duty, rise, fall):
    """Light with straight edges of those lengths [s], bright for `duty` between their middles."""

    def at(times):
        along = (times * frequency % 1.0) / frequency
        turn = duty / frequency
        return 0.2 + np.clip(np.minimum(along / rise, 1.0 - (along - turn) / fall), 0.0, 1.0)

    return at


def one(seed: int) -> dict[str, tuple[float, float, float, float]]:
    """Truth, value, low and high of what one seed draws."""
    rng = np.random.default_rng(seed)
    noise = 10 ** (-rng.uniform(30, 60) / 20)
    frequency = float(np.exp(rng.uniform(np.log(80), np.log(1500))))
    duty, share = rng.uniform(0.2, 0.7), rng.uniform(0.02, 0.15, 2)
    found = {}

    def add(name, trace, truth):
        measure = METRICS[name].of(Observation(trace))
        found[name] = (truth, measure.value, measure.low, measure.high) if measure.value is not None else None

    lights = (sine(frequency, duty), pwm(frequency, duty, 0.2), triangle(frequency, duty), rectified_sine(50.0))
    light = lights[seed % 4]
    trace = sampled(light.at, sample_rate=20e3, duration=rng.uniform(1, 2), noise=noise, seed=seed)
    add("svm", trace, true_svm(light))
    rate, seconds = frequency * rng.uniform(100, 400), rng.uniform(30, 200) / frequency
    rise, fall = share / frequency
    edges = sampled(trapezoid(frequency, duty, rise, fall), sample_rate=rate, duration=seconds, noise=noise, seed=seed)
    add("rise_time", edges, 0.8 * rise)
    add("fall_time", edges, 0.8 * fall)
    decay = float(rng.uniform(0.05, 0.4)) / frequency
    glow = sampled(pwm(frequency, duty, 0.1, decay).at, sample_rate=rate, duration=seconds, noise=noise, seed=seed)
    add("decay_time", glow, decay)
    return found


def main() -> None:
    """Print one line a measure."""
    captures = int(sys.argv[1]) if len(sys.argv) > 1 else 300
    first = int(sys.argv[2]) if len(sys.argv) > 2 else 0
    rows = [one(seed) for seed in range(first, first + captures)]
    for name in ("svm", "rise_time", "fall_time", "decay_time"):
        got = np.array([row[name] for row in rows if row[name] is not None])
        if not got.size:
            print(f"{name}: none of {captures}")
            continue
        truth, value, low, high = got.T
        holds = np.mean((low <= truth) & (truth <= high))
        error, width = np.abs(value / truth - 1), np.median((high - low) / truth)
        print(
            f"{name:<12} {len(got)} of {captures}: holds {holds:.3f}, width {100 * width:.2f} %, "
            f"error median {100 * np.median(error):.2f} %, largest {100 * error.max():.2f} %"
        )


if __name__ == "__main__":
    main()
