"""Light whose truth is known: waveforms with closed forms for every figure, and traces sampled from them."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from flicker.errors import InputError
from flicker.light import ComplexArray, Pulse
from flicker.trace import FloatArray, Trace


@dataclass(frozen=True, slots=True, eq=False)
class Waveform:
    """
    A periodic light of mean 1 with its true figures.

    `at_phase` gives the light at phases in cycles, `lines` the complex amplitudes of given harmonics relative
    to the mean. Sources of the closed forms: definition of each figure, by hand, unless the maker says more.
    """

    name: str
    frequency: float  # [Hz]
    at_phase: Callable[[FloatArray], FloatArray]
    lines: Callable[[FloatArray], ComplexArray]
    percent_flicker: float  # [%]
    flicker_index: float
    rms_modulation: float  # [%]
    duty_cycle: float | None = None

    def at(self, times: npt.ArrayLike) -> FloatArray:
        """Light at the given times [s], any shape."""
        return np.asarray(self.at_phase(np.asarray(times, dtype=float) * self.frequency))

    def amplitudes(self, count: int) -> ComplexArray:
        """Complex amplitudes of the first `count` harmonics relative to the mean, shape (count,)."""
        return np.asarray(self.lines(np.arange(1, count + 1, dtype=float)))


def sine(frequency: float, depth: float = 1.0) -> Waveform:
    """Sine of the given depth 0..1: percent flicker 100 m, flicker index m / pi (definitions, by hand)."""

    def lines(harmonics: FloatArray) -> ComplexArray:
        return np.where(harmonics == 1, depth + 0j, 0j)

    def light(phase: FloatArray) -> FloatArray:
        return np.asarray(1.0 + depth * np.cos(2 * np.pi * phase))

    return Waveform("sine", frequency, light, lines, 100 * depth, depth / math.pi, 100 * depth / math.sqrt(2), 0.5)


def pwm(frequency: float, duty: float, low_level: float = 0.0, decay: float = 0.0) -> Waveform:
    """
    Rectangular PWM, on from phase 0 to `duty`; with `decay` as a slow emitter shows it [s].

    Flicker index of the rectangle 2 m D (1 - D) / (1 - m + 2 m D), rms of its two levels; behind one pole the index
    follows from the two times at which the light crosses its mean, the rms from the mean of drive times light (by
    hand).
    """
    pulse = Pulse(frequency, duty, low_level, decay)
    mean = low_level + (1 - low_level) * duty
    share = (1 - low_level) / mean
    if decay == 0.0:
        index = share * duty * (1 - duty)
        rms = share * math.sqrt(duty * (1 - duty))
    else:
        lowest, highest = pulse.at(np.array([0.0, duty]))
        lowest, highest = ((value * mean - low_level) / (1 - low_level) for value in (lowest, highest))
        period = 1 / frequency
        rise = decay * math.log((1 - lowest) / (1 - duty))
        fall = decay * math.log(highest / duty)
        index = share * ((1 - duty) * duty * period - (1 - duty) * rise - duty * fall) / period
        rms = share * math.sqrt(max(duty * (1 - duty) - (highest - lowest) * decay / period, 0.0))
    depth, true_duty = pulse.percent_flicker, duty if decay == 0 else None
    return Waveform("pwm", frequency, pulse.at, pulse.amplitudes, depth, index, 100 * rms, true_duty)


def triangle(frequency: float, depth: float = 1.0) -> Waveform:
    """Symmetric triangle: flicker index m / 4, odd lines 8 m / (pi k)^2 (Fourier series, by hand)."""

    def light(phase: FloatArray) -> FloatArray:
        return np.asarray(1.0 + depth * (4 * np.abs((phase + 0.5) % 1.0 - 0.5) - 1.0))

    def lines(harmonics: FloatArray) -> ComplexArray:
        return np.where(harmonics % 2 == 1, -8 * depth / (np.pi * harmonics) ** 2 + 0j, 0j)

    return Waveform("triangle", frequency, light, lines, 100 * depth, depth / 4, 100 * depth / math.sqrt(3), 0.5)


def rectified_sine(mains_frequency: float) -> Waveform:
    """
    Light that follows |sin| of the mains: fundamental at twice the mains frequency.

    Percent flicker 100; flicker index cos t - 1 + 2 t / pi with t = asin(2 / pi); lines 2 / (4 k^2 - 1) (by hand).
    """
    crossing = math.asin(2 / math.pi)

    def light(phase: FloatArray) -> FloatArray:
        return np.asarray(0.5 * np.pi * np.abs(np.sin(np.pi * phase)))

    def lines(harmonics: FloatArray) -> ComplexArray:
        return np.asarray(-2 / (4 * harmonics**2 - 1) + 0j)

    index = math.cos(crossing) - 1 + 2 * crossing / math.pi
    rms = math.sqrt(math.pi**2 / 8 - 1)
    above_half = 1 - 2 * math.asin(0.5) / math.pi
    return Waveform("rectified sine", 2 * mains_frequency, light, lines, 100.0, index, 100 * rms, above_half)


def sampled(
    light: Callable[[FloatArray], FloatArray],
    *,
    sample_rate: float,
    duration: float,
    mean: float = 1.0,
    dark_level: float = 0.0,
    start: float = 0.0,
    noise: float = 0.0,
    seed: int | None = None,
    bits: int | None = None,
    name: str = "light",
    unit: str = "",
) -> Trace:
    """
    Sample a light as an ideal photodiode would.

    Parameters
    ----------
    light : callable
        Light over its mean at times [s]: `Waveform.at`, a sum of several, or any function of time.
    sample_rate, duration, start : float
        Of the trace; the first sample lies at `start`. [Hz], [s], [s]
    mean, dark_level : float
        Reading of the mean light above dark, and of the dark; the trace states the dark level.
    noise : float
        Standard deviation of white Gaussian noise over the mean; needs a `seed`.
    bits : int, optional
        Resolution of the converter, whose range is 1.25 times the largest reading.

    Returns
    -------
    Trace
        `round(sample_rate * duration)` readings.

    Raises
    ------
    InputError
        If noise is asked for without a seed, for then nobody could repeat it.
    """
    if noise > 0 and seed is None:
        raise InputError("noise needs a seed, or nobody can repeat it")
    times = start + np.arange(max(1, round(sample_rate * duration))) / sample_rate
    readings = light(times)
    if noise > 0:
        readings = readings + np.random.default_rng(seed).normal(0.0, noise, times.size)
    readings = readings * mean + dark_level
    if bits is not None:
        step = 1.25 * float(np.abs(readings).max()) / 2**bits
        readings = np.round(readings / step) * step
    return Trace(readings, sample_rate, name=name, unit=unit, dark_level=dark_level)
