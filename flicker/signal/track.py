"""The phase of a light whose frequency wanders, against the phase of a steady one."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np

from flicker.signal.spectrum import spectrum
from flicker.trace import FloatArray

_CLEAR = 20.0  # standard errors that the range of the frequency must have, or it is read over a longer step


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

    @cached_property
    def _deviation(self) -> tuple[float, float]:
        for step in range(1, max(self.times.size // 8, 2)):
            over = self.times[step:] - self.times[:-step]
            low, high = np.quantile((self.cycles[step:] - self.cycles[:-step]) / over, [0.005, 0.995])
            error = float(2.0**0.5 * self.error / np.quantile(over, 0.5))
            if _CLEAR * error < high - low:
                break
        return 0.5 * float(high - low), error

    @property
    def deviation(self) -> float:
        """How far the frequency goes from its mean to either side, all but the outermost hundredth. [Hz]"""
        return self._deviation[0]

    @property
    def deviation_error(self) -> float:
        """Standard error of `deviation` from the errors of the entries. [Hz]"""
        return self._deviation[1]

    def rate(self) -> float | None:
        """How often the frequency wanders to and fro; None where that has no steady rate. [Hz]"""
        even = np.linspace(self.times[0], self.times[-1], self.times.size)
        cycles = self.at(even)
        found = spectrum(cycles, 1 / (even[1] - even[0])).strongest_line(1.5 / (even[-1] - even[0]), np.inf)
        if found is None or found[1] ** 2 < float(np.var(cycles)):  # half of the power, or more
            return None
        return found[0]
