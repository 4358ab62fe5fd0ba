"""A sensor simulated by summing a finely sampled light, line by line and frame by frame.

Knows nothing of the package: waveforms, integration and movement are made anew here, from the definition that a line
averages the light from the moment its exposure starts to the moment it ends.
"""

import numpy as np


def rectangle(duty, low_level=0.0, per_decay=None, samples=100_000):
    """One cycle of a PWM at the middles of equal steps; `per_decay` is the period over the decay time."""
    phase = (np.arange(samples) + 0.5) / samples
    drive = np.where(phase < duty, 1.0, low_level)
    if per_decay is None:
        return drive
    keep = np.exp(-per_decay / samples)  # of a one-pole section, step by step, until its cycle repeats
    weights = keep ** np.arange(samples)[::-1]
    state = (1 - keep) * np.sum(weights * drive) / (1 - keep**samples)
    light = np.empty(samples)
    for number in range(samples):
        after = keep * state + (1 - keep) * drive[number]
        light[number] = 0.5 * (state + after)
        state = after
    return light


def harmonics(amplitudes, samples=100_000):
    """One cycle of `1 + sum Re(a_h exp(2j pi h phase))` at the middles of equal steps."""
    phase = (np.arange(samples) + 0.5) / samples
    return 1.0 + sum((a * np.exp(2j * np.pi * h * phase)).real for h, a in enumerate(amplitudes, 1))


class Wave:
    """A periodic light given by one sampled cycle, and its running sum."""

    def __init__(self, cycle, frequency):
        self.frequency = frequency
        self.mean = float(np.mean(cycle))
        self.sum = np.concatenate([[0.0], np.cumsum(cycle)]) / cycle.size
        self.grid = np.arange(cycle.size + 1) / cycle.size

    def light_until(self, time):
        turns = np.asarray(time) * self.frequency
        whole = np.floor(turns)
        return (whole * self.sum[-1] + np.interp(turns - whole, self.grid, self.sum)) / self.frequency

    def exposed(self, start, exposure):
        return (self.light_until(start + exposure) - self.light_until(start)) / (exposure * self.mean)


def contrast(values, axis=-1):
    high, low = values.max(axis=axis), np.maximum(values.min(axis=axis), 0.0)
    dark = high < 1e-9  # no line saw any light
    return np.where(dark, 0.0, 100.0 * (high - low) / np.where(dark, 1.0, high + low))


def worst_frame(wave, exposure, line_time, lines, phases=250, zooms=4):
    """Largest contrast of the line means of a frame, over the phase of the light at the frame's start. [%]"""
    times = np.arange(lines) * line_time
    centre, width = 0.5, 1.0
    best = 0.0
    for _ in range(zooms):
        starts = (centre + width * np.linspace(-0.5, 0.5, phases)) / wave.frequency
        found = contrast(wave.exposed(starts[:, None] + times, exposure))
        centre = float(starts[int(found.argmax())]) * wave.frequency
        best, width = max(best, float(found.max())), width * 8 / phases
    return best


def frame_means(wave, exposure, line_time, lines, frame_rate, frames, start=0.0):
    """Mean of each frame, shape (frames,)."""
    times = start + np.arange(frames)[:, None] / frame_rate + np.arange(lines) * line_time
    return wave.exposed(times, exposure).mean(axis=1)
