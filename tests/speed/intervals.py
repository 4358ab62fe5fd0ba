"""
How often the 95 % intervals hold the truth, and how near the frequency comes to the Cramer-Rao bound.

`python tests/speed/intervals.py [CAPTURES] [FIRST_SEED] [--lines]` measures random captures (sine, PWM, triangle,
rectified mains, slow emitter; 20 to 60 dB, ten cycles and more) and prints, for every measure, the share of intervals
that hold the truth, the mean error over the mean width, and the widths. `--lines` takes the measures of lines instead,
of captures of a second and more: SVM and the level of display makers. For the frequency it prints also the deviation
over the bound (Rife and Boorstyn, IEEE Trans. Inf. Theory 20 (1974) 591, all harmonics below the Nyquist frequency
together). The edges of an ideal PWM lie beyond every bound by lines below the Nyquist frequency: samples see them only
to within their spacing.
"""

from __future__ import annotations

import sys
from collections import defaultdict
from concurrent.futures import ProcessPoolExecutor

import numpy as np

from flicker.metrics import METRICS, Observation
from flicker.metrics.display import display_weight
from flicker.signal.stroboscopic import stroboscopic_visibility
from flicker.waveforms import Waveform, pwm, rectified_sine, sampled, sine, triangle

FIGURES = ("fundamental_frequency", "percent_flicker", "flicker_index", "rms_modulation")
OF_LINES = ("svm", "display_flicker_level")
KINDS = ("sine", "pwm", "triangle", "rectified", "emitter")


def random_light(kind: str, rng: np.random.Generator) -> Waveform:
    """One light of a kind, its frequency and shape at random."""
    frequency = float(np.exp(rng.uniform(np.log(40), np.log(4000))))
    if kind == "sine":
        return sine(frequency, float(np.exp(rng.uniform(np.log(0.01), 0.0))))
    if kind == "triangle":
        return triangle(frequency, float(np.exp(rng.uniform(np.log(0.03), 0.0))))
    if kind == "rectified":
        return rectified_sine(float(rng.uniform(45, 65)))
    duty, low = float(rng.uniform(0.05, 0.95)), float(rng.uniform(0, 0.8))
    return pwm(frequency, duty, low, 0.0 if kind == "pwm" else float(rng.uniform(0.02, 0.5)) / frequency)


def measure_one(seed: int) -> dict:
    """Measure one random capture; errors, widths and whether each interval holds the truth."""
    rng = np.random.default_rng(seed)
    kind = KINDS[seed % len(KINDS)]
    light = random_light(kind, rng)
    cycles = float(np.exp(rng.uniform(np.log(10), np.log(300))))
    rate = light.frequency * float(np.exp(rng.uniform(np.log(25), np.log(400))))
    duration, snr = cycles / light.frequency, float(rng.uniform(20, 60))
    noise = light.rms_modulation / 100 * 10 ** (-snr / 20)
    start = float(rng.uniform(0, 1))
    trace = sampled(light.at, sample_rate=rate, duration=duration, noise=noise, seed=seed, start=start)
    observation = Observation(trace)
    truths = (light.frequency, light.percent_flicker, light.flicker_index, light.rms_modulation)
    lines = np.arange(1, max(int(rate / 2 / light.frequency), 1) + 1) * np.abs(
        light.amplitudes(max(int(rate / 2 / light.frequency), 1))
    )
    bound = np.sqrt(6) / np.pi * noise / np.sqrt(np.sum(lines**2)) / (duration * np.sqrt(trace.samples))
    row = {"seed": seed, "kind": kind, "snr": snr, "bound": bound, "families": len(observation.search.families)}
    for name, truth in zip(FIGURES, truths, strict=True):
        found = METRICS[name].of(observation)
        if found.value is None or not np.isfinite(found.low):
            row[name] = None
        else:
            row[name] = (found.value - truth, found.high - found.low, found.low <= truth <= found.high)
    return row


def measure_lines(seed: int) -> dict:
    """The same of a capture of 1 to 2 s, for measures of lines; at a third of the rates a whole number a cycle."""
    rng = np.random.default_rng(seed)
    kind = KINDS[seed % len(KINDS)]
    light = random_light(kind, rng)
    rate = max(float(np.exp(rng.uniform(np.log(5e3), np.log(40e3)))), 8 * light.frequency)
    if seed % 3 == 0:
        rate = light.frequency * np.ceil(rate / light.frequency)
    duration = float(rng.uniform(1, 2))
    noise = light.rms_modulation / 100 * 10 ** (-float(rng.uniform(20, 60)) / 20)
    trace = sampled(light.at, sample_rate=rate, duration=duration, noise=noise, seed=seed, start=float(rng.uniform()))
    observation = Observation(trace)
    number = np.arange(1, 2 + int(2000 / light.frequency))
    heights = np.abs(light.amplitudes(number.size))
    weighted = [20 * np.log10(max(one, 1e-12)) for one in heights] + np.array(
        [display_weight(float(one)) for one in number * light.frequency]
    )
    level = float(max(weighted))
    truths = (stroboscopic_visibility(number * light.frequency, heights), level)
    row: dict = {"seed": seed, "kind": kind}
    for name, truth in zip(OF_LINES, truths, strict=True):
        found = METRICS[name].of(observation)
        row[name] = None if found.value is None else (found.value - truth, found.high - found.low,
                                                      found.low <= truth <= found.high)  # fmt: skip
    return row


def main() -> None:
    """Print one table over all kinds and one for each."""
    numbers = [int(word) for word in sys.argv[1:] if word != "--lines"]
    captures, first = (numbers + [1000, 0][len(numbers) :])[:2]
    measure, figures = (measure_lines, OF_LINES) if "--lines" in sys.argv else (measure_one, FIGURES)
    with ProcessPoolExecutor(2) as pool:
        rows = list(pool.map(measure, range(first, first + captures), chunksize=10))
    groups = defaultdict(list)
    for row in rows:
        groups["all"].append(row)
        groups[row["kind"]].append(row)
    for kind in ("all", *KINDS):
        print(f"{kind}: {len(groups[kind])} captures")
        for name in figures:
            got = [row[name] for row in groups[kind] if row[name] is not None]
            errors, widths, held = (np.array(column, dtype=float) for column in zip(*got, strict=True))
            print(
                f"  {name:22s} holds {100 * held.mean():5.1f} %  "
                f"mean error over mean width {errors.mean() / widths.mean():+.3f}  "
                f"median width {np.median(widths):.3g}  largest error {np.abs(errors).max():.3g}  "
                f"not had: {len(groups[kind]) - len(got)}"
            )
        if figures is OF_LINES:
            continue
        normal = np.array([row["fundamental_frequency"][0] / row["bound"] for row in groups[kind]])
        print(f"  frequency, deviation over the bound: {np.sqrt(np.mean(normal**2)):.2f} (root mean square)")


if __name__ == "__main__":
    main()
