"""What readings look like at a glance: level, extremes, noise."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from flicker.trace import FloatArray, Trace

ENOUGH = 1 << 17  # samples that settle a statistic


def smooth_mean(light: FloatArray) -> float:
    """Mean under a Hann window, which hardly depends on where in its cycle the record begins and ends."""
    if light.size > ENOUGH:  # short blocks share one weight
        length = light.size // (ENOUGH // 2)
        light = light[: light.size // length * length].reshape(-1, length).mean(axis=1)
    weights = np.hanning(light.size + 2)[1:-1]
    return float(np.dot(light, weights) / weights.sum())


def with_unit(value: float, trace: Trace) -> str:
    """Write a level with its unit."""
    return f"{value:.4g} {trace.unit}".rstrip()


@dataclass(frozen=True, slots=True)
class Shape:
    """Level, robust extremes and noise of the readings above dark."""

    mean: float
    low: float  # all but half a percent of the readings are above
    high: float  # all but half a percent of the readings are below
    noise: float  # standard deviation of what changes from sample to sample

    @classmethod
    def of(cls, trace: Trace) -> Shape:
        """Look at the readings of a trace."""
        light = trace.above_dark
        some = light[:: max(1, light.size // ENOUGH)]
        low, high = np.quantile(some, [0.005, 0.995])
        steps = np.diff(light[:ENOUGH])
        noise = 0.0 if steps.size == 0 else float(np.quantile(np.abs(steps), 0.5)) / (0.6745 * math.sqrt(2))
        return cls(smooth_mean(light), float(low), float(high), noise)

    @property
    def about_zero(self) -> bool:
        """Whether the readings go both ways and their mean is near zero, as behind a capacitor."""
        return self.low < 0 < self.high and abs(self.mean) < 0.3 * min(-self.low, self.high)

    @property
    def below_dark(self) -> bool:
        """Whether readings lie below dark by more than noise and a small offset explain."""
        return self.low < -(5 * self.noise + 0.02 * max(abs(self.mean), 0.05 * self.high))
