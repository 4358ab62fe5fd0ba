"""The phase of a light whose frequency wanders, against the phase of a steady one."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np

from flicker.trace import FloatArray


@dataclass(frozen=True, eq=False)
class Track:
    """How far a light is ahead of one of steady frequency, at some times; in between on smooth curves."""

    times: FloatArray  # increasing, shape (j,) [s]
    cycles: FloatArray  # shape (j,)
    error: float  # standard error of one entry [cycles]

    def at(self, times: FloatArray) -> FloatArray:
        """Cycles ahead at the given times [s], shape (n,)."""
        return np.asarray(self._curve(np.clip(times, self.times[0], self.times[-1])))

    @cached_property
    def _curve(self) -> Callable[[FloatArray], FloatArray]:
        from scipy.interpolate import CubicSpline

        return CubicSpline(self.times, self.cycles)  # type: ignore[no-any-return]

    def scaled(self, factor: float) -> Track:
        """Give the track of a multiple of the frequency, or of a part of it."""
        return replace(self, cycles=self.cycles * factor, error=self.error * abs(factor))

    @property
    def lag(self) -> float:
        """Whole number of cycles that makes every entry positive."""
        return float(np.ceil(np.abs(self.cycles).max()))

    @property
    def deviations(self) -> FloatArray:
        """How far the frequency is above its mean between neighbouring entries, shape (j - 1,). [Hz]"""
        return np.asarray(np.diff(self.cycles) / np.diff(self.times))

    @property
    def deviation(self) -> float:
        """How far the frequency goes from its mean to either side, all but the outermost hundredth. [Hz]"""
        low, high = np.quantile(self.deviations, [0.005, 0.995])
        return 0.5 * float(high - low)

    @property
    def deviation_error(self) -> float:
        """Standard error of `deviation` from the errors of the entries. [Hz]"""
        return self.error / float(np.quantile(np.diff(self.times), 0.5))
