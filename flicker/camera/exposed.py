"""What an exposure makes of a light: each family, blurred, against the phase at which the exposure starts."""

from __future__ import annotations

from abc import ABC, abstractmethod
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from flicker.errors import InputError
from flicker.light import ChannelLight, ComplexArray, Light, Pulse
from flicker.trace import FloatArray

GRID = 1024  # phases of a cycle that are looked at, besides those where the blurred light has a corner
COARSE = 256
NEAR_HARMONIC = 2e-3  # of the fundamental: how far off a line may lie and still be its harmonic


@dataclass(frozen=True, slots=True)
class Windows:
    """
    When a line collects light, counted from the start of its exposure.

    One window as a rule; staggered exposures that the camera adds up are several, each beginning where the one
    before it ends. Binned lines collect the same windows again, `binning_step` later each.
    """

    lengths: tuple[float, ...]  # [s]
    binning: int = 1
    binning_step: float = 0.0  # [s]

    @property
    def starts(self) -> tuple[float, ...]:
        """Start of each window. [s]"""
        return tuple(sum(self.lengths[:number]) for number in range(len(self.lengths)))

    @property
    def simple(self) -> bool:
        """Tell whether it is one window and nothing else."""
        return len(self.lengths) == 1 and self.binning == 1

    def transfer(self, frequencies: FloatArray) -> ComplexArray:
        """Factor that each line of the spectrum keeps, shape as given; the sinc of the exposure, with its sign."""
        total = np.zeros(frequencies.shape, dtype=complex)
        for start, length in zip(self.starts, self.lengths, strict=True):
            total += length * np.sinc(frequencies * length) * np.exp(2j * np.pi * frequencies * (start + length / 2))
        total /= sum(self.lengths)
        if self.binning > 1:
            steps = np.arange(self.binning) * self.binning_step
            total *= np.exp(2j * np.pi * frequencies[..., None] * steps).mean(axis=-1)
        return total


def windows(exposure: float | Sequence[float], *, binning: int = 1, line_time: float | None = None) -> Windows:
    """Make the windows of an exposure [s], or of staggered exposures that are added up; `InputError` if not above 0."""
    lengths = (float(exposure),) if isinstance(exposure, int | float) else tuple(float(one) for one in exposure)
    if not lengths or not all(np.isfinite(length) and length > 0 for length in lengths):
        raise InputError(f"an exposure must be above 0, not {exposure} s")
    if binning > 1 and line_time is None:
        raise InputError("lines that are binned need a line time: give --line-time")
    return Windows(lengths, binning, (line_time or 0.0) / binning if binning > 1 else 0.0)


@dataclass(frozen=True, slots=True, eq=False)
class Family:
    """Lines that keep step with one fundamental [Hz]; a rectangular PWM keeps its exact pulse as well."""

    frequency: float
    harmonics: FloatArray  # shape (k,)
    amplitudes: ComplexArray  # shape (k,)
    pulse: Pulse | None = None

    @property
    def rectangle(self) -> Pulse | None:
        """The pulse, where it is an ideal rectangle."""
        return self.pulse if self.pulse is not None and self.pulse.decay == 0.0 else None

    def blurred(self, seen: Windows, scale: float = 1.0) -> Blurred:
        """Give the light that an exposure collects, with the family's frequency times `scale`."""
        frequency = self.frequency * scale
        if self.pulse is not None:
            pulse = Pulse(frequency, self.pulse.duty, self.pulse.low_level, self.pulse.decay)
            return BlurredPulse(pulse, seen)
        return BlurredLines(self.harmonics, self.amplitudes * seen.transfer(self.harmonics * frequency))

    def averaged(self, seen: Windows, line_time: float, lines: int, scale: float = 1.0) -> BlurredLines:
        """Give the mean of all lines of a frame, against the phase at which the first exposure starts."""
        frequency = self.frequency * scale
        harmonics = self.harmonics if self.pulse is None else np.arange(1.0, 2049.0)
        amplitudes = self.amplitudes
        if self.pulse is not None:
            scaled = Pulse(frequency, self.pulse.duty, self.pulse.low_level, self.pulse.decay)
            amplitudes = scaled.amplitudes(harmonics)
        turns = harmonics * frequency * line_time
        divisor = np.sin(np.pi * turns)
        near = np.abs(divisor) < 1e-9
        mean = np.sin(np.pi * lines * turns) / (lines * np.where(near, 1.0, divisor))
        mean = np.where(near, np.cos(np.pi * (lines - 1) * np.round(turns)), mean)
        mean = mean * np.exp(1j * np.pi * (lines - 1) * turns)
        return BlurredLines(harmonics, amplitudes * seen.transfer(harmonics * frequency) * mean)


def families_of(channel: ChannelLight) -> tuple[Family, ...]:
    """
    Sort the lines of a channel into families.

    A line that is a harmonic of none of the fundamentals is a family of its own: its phase is taken as independent
    of the others, which can only make a prediction deeper than the truth.
    """
    if channel.pulse is not None:
        if channel.pulse.duty == 1.0 or channel.pulse.low_level == 1.0:
            return ()
        return (Family(channel.pulse.frequency, np.arange(1.0, 2.0), channel.pulse.amplitudes([1.0]), channel.pulse),)
    left = np.abs(channel.amplitudes) > 0
    families = []
    for fundamental in channel.fundamentals:
        numbers = np.round(channel.frequencies / fundamental)
        member = left & (numbers >= 1) & (np.abs(channel.frequencies / fundamental - numbers) < NEAR_HARMONIC)
        if member.any():
            families.append(Family(fundamental, numbers[member], channel.amplitudes[member]))
        left &= ~member
    one = np.ones(1)
    singles = zip(channel.frequencies[left], channel.amplitudes[left], strict=True)
    return (*families, *(Family(float(f), one, np.array([a])) for f, a in singles))


def deciding_channels(light: Light) -> tuple[tuple[Family, ...], ...]:
    """
    Families of the channels that can have the deepest contrast.

    Of channels with the same pulse the fastest emitter is enough: a slower one shows the same pulse averaged over
    many starts, and an average lies between the extremes.
    """
    fastest: dict[object, ChannelLight] = {}
    for number, channel in enumerate(light):
        pulse = channel.pulse
        key = number if pulse is None else (pulse.frequency, pulse.duty, pulse.low_level)
        other = fastest.get(key)
        if other is None or (pulse and other.pulse and pulse.decay < other.pulse.decay):
            fastest[key] = channel
    return tuple(families_of(channel) for channel in fastest.values())


class Blurred(ABC):
    """Deviation from the mean, which is 1, that an exposure collects against the phase at which it starts."""

    @abstractmethod
    def at(self, phases: FloatArray) -> FloatArray:
        """Deviation at any phases, shape as given."""

    @abstractmethod
    def table(self) -> FloatArray:
        """Deviation at evenly spaced phases of a cycle, shape (m,), m a multiple of `COARSE`."""

    @abstractmethod
    def pair(self, lag: float) -> tuple[FloatArray, FloatArray]:
        """Deviation at many phases, and at the same phases plus `lag` cycles, both shape (n,)."""

    def extremes(self) -> tuple[float, float]:
        """Smallest and largest deviation over all phases."""
        here, _ = self.pair(0.0)
        return float(here.min()), float(here.max())


@dataclass(frozen=True, slots=True, eq=False)
class BlurredPulse(Blurred):
    """Exact: differences of the integral of the pulse."""

    pulse: Pulse
    seen: Windows

    def at(self, phases: FloatArray) -> FloatArray:
        """See `Blurred`."""
        frequency, total = self.pulse.frequency, np.zeros(phases.shape)
        for step in range(self.seen.binning):
            later = phases + step * self.seen.binning_step * frequency
            for start, length in zip(self.seen.starts, self.seen.lengths, strict=True):
                total += self.pulse.integral(later + (start + length) * frequency)
                total -= self.pulse.integral(later + start * frequency)
        return np.asarray(total / (self.seen.binning * sum(self.seen.lengths) * frequency) - 1.0)

    def table(self) -> FloatArray:
        """See `Blurred`."""
        return self.at(np.arange(GRID) / GRID)

    def pair(self, lag: float) -> tuple[FloatArray, FloatArray]:
        """See `Blurred`; the corners of the blurred light are among the phases."""
        ends = {0.0, *self.seen.starts, *np.cumsum(self.seen.lengths)}
        moments = np.array([end + step * self.seen.binning_step for end in ends for step in range(self.seen.binning)])
        corners = np.concatenate([edge - moments * self.pulse.frequency for edge in (0.0, self.pulse.duty)])
        phases = np.concatenate([np.arange(GRID) / GRID, corners, corners - lag])
        return self.at(phases), (self.at(phases + lag) if lag else self.at(phases))


@dataclass(frozen=True, slots=True, eq=False)
class BlurredLines(Blurred):
    """Harmonics with the amplitudes that are left of them."""

    harmonics: FloatArray
    amplitudes: ComplexArray

    def at(self, phases: FloatArray) -> FloatArray:
        """See `Blurred`."""
        turns = np.exp(2j * np.pi * phases[..., None] * self.harmonics)
        return np.asarray((turns @ self.amplitudes).real)

    def _at_grid(self, amplitudes: ComplexArray) -> FloatArray:
        highest = int(self.harmonics.max())
        size = max(GRID, 1 << (2 * highest + 1).bit_length())
        spectrum = np.zeros(size // 2 + 1, dtype=complex)
        np.add.at(spectrum, self.harmonics.astype(int), amplitudes * (size / 2))
        return np.fft.irfft(spectrum, size)

    def table(self) -> FloatArray:
        """See `Blurred`."""
        return self._at_grid(self.amplitudes)

    def extremes(self) -> tuple[float, float]:
        """See `Blurred`."""
        table = self.table()
        return float(table.min()), float(table.max())

    def pair(self, lag: float) -> tuple[FloatArray, FloatArray]:
        """See `Blurred`."""
        return self.table(), self._at_grid(self.amplitudes * np.exp(2j * np.pi * self.harmonics * lag))
