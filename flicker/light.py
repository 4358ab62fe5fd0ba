"""Light: the mean level and the spectral lines of each channel, all that prediction needs."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from flicker.errors import InputError
from flicker.trace import FloatArray

ComplexArray = npt.NDArray[np.complex128]


@dataclass(frozen=True, slots=True)
class Pulse:
    r"""
    Rectangular PWM, seen through an emitter that decays exponentially; its mean is 1.

    The drive is on from phase 0 to `duty`, at `low_level` (off over on) for the rest of the period.

    Raises
    ------
    InputError
        If a value lies outside its range.

    Notes
    -----
    With :math:`z` the response of one pole of time :math:`\tau` to a drive of 0 and 1 in its periodic state
    (an ordinary RC section), the light is :math:`(p + (1 - p) z) / (p + (1 - p) D)`; the pole leaves the mean
    as it is. Closed forms of light, integral and lines: by hand, checked against numerical integration.
    """

    frequency: float  # [Hz]
    duty: float  # 0 < duty <= 1
    low_level: float = 0.0  # 0 <= low_level < 1
    decay: float = 0.0  # 1/e time of the emitter [s]

    def __post_init__(self) -> None:
        if not (math.isfinite(self.frequency) and self.frequency > 0):
            raise InputError(f"the frequency of a light must be above 0 Hz, not {self.frequency}")
        if not 0 < self.duty <= 1:
            raise InputError(f"a duty cycle lies above 0 and is at most 1, not {self.duty}")
        if not 0 <= self.low_level <= 1:
            raise InputError(f"the off level lies between 0 and 1 (times the on level), not {self.low_level}")
        if not (math.isfinite(self.decay) and self.decay >= 0):
            raise InputError(f"a decay time cannot be {self.decay} s")

    @property
    def _mean(self) -> float:
        return self.low_level + (1.0 - self.low_level) * self.duty

    def _extremes(self) -> tuple[float, float]:
        """Smallest and largest response z of the emitter."""
        if self.decay == 0.0 or self.duty == 1.0:
            return (0.0 if self.duty < 1.0 else 1.0), 1.0
        per_decay = 1.0 / (self.frequency * self.decay)
        highest = math.expm1(-self.duty * per_decay) / math.expm1(-per_decay)
        return highest * math.exp(-(1.0 - self.duty) * per_decay), highest

    def at(self, phase: npt.ArrayLike) -> FloatArray:
        """Light at phases in cycles, any shape; mean 1."""
        inside = np.asarray(phase, dtype=float) % 1.0
        on = inside < self.duty
        if self.decay == 0.0:
            response = on.astype(float)
        else:
            lowest, highest = self._extremes()
            per_decay = 1.0 / (self.frequency * self.decay)
            rising = 1.0 - (1.0 - lowest) * np.exp(-np.where(on, inside, 0.0) * per_decay)
            response = np.where(on, rising, highest * np.exp(-np.where(on, 0.0, inside - self.duty) * per_decay))
        return np.asarray((self.low_level + (1.0 - self.low_level) * response) / self._mean)

    def integral(self, phase: npt.ArrayLike) -> FloatArray:
        """Integral of the light over the phase, from phase 0, any shape; it grows by 1 a cycle. [cycles]"""
        phase = np.asarray(phase, dtype=float)
        whole = np.floor(phase)
        inside = phase - whole
        if self.decay == 0.0:
            response = np.minimum(inside, self.duty)
        else:
            lowest, highest = self._extremes()
            decay = self.frequency * self.decay  # in cycles
            on = inside < self.duty
            grown = decay * np.expm1(np.where(on, inside, inside - self.duty) / -decay)
            whole_pulse = self.duty + (1.0 - lowest) * decay * math.expm1(-self.duty / decay)
            response = np.where(on, inside + (1.0 - lowest) * grown, whole_pulse - highest * grown)
        return np.asarray(whole + (self.low_level * inside + (1.0 - self.low_level) * response) / self._mean)

    def amplitudes(self, harmonics: npt.ArrayLike) -> ComplexArray:
        """Complex peak amplitudes of the given harmonics relative to the mean, shape as given."""
        number = np.asarray(harmonics, dtype=float)
        drive = 2.0 * self.duty * np.sinc(number * self.duty) * np.exp(-1j * np.pi * number * self.duty)
        drive *= (1.0 - self.low_level) / self._mean
        return np.asarray(drive / (1.0 + 2j * np.pi * number * self.frequency * self.decay))

    @property
    def percent_flicker(self) -> float:
        """Depth between the largest and the smallest light. [%]"""
        lowest, highest = self._extremes()
        share = 1.0 - self.low_level
        return 100.0 * share * (highest - lowest) / (share * (highest + lowest) + 2.0 * self.low_level)


@dataclass(frozen=True, slots=True, eq=False)
class ChannelLight:
    """
    Light of one channel: `1 + sum Re(amplitudes * exp(2j pi frequencies t))` times its mean.

    Where the light is known to be a rectangular PWM, `pulse` holds it exactly and the lines are its first ones.
    """

    name: str
    frequencies: FloatArray  # shape (k,), ascending [Hz]
    amplitudes: ComplexArray  # relative to the mean, shape (k,)
    fundamentals: tuple[float, ...] = ()  # of the families that the lines belong to, deepest first [Hz]
    pulse: Pulse | None = None
    mean: float = 1.0  # level above dark, any unit
    wander: float = 0.0  # how far the deepest family's frequency goes from its mean to either side, a share of it

    def __post_init__(self) -> None:
        order = np.argsort(np.asarray(self.frequencies, dtype=float), kind="stable")
        frequencies = np.asarray(self.frequencies, dtype=float)[order]
        amplitudes = np.asarray(self.amplitudes, dtype=complex)[order]
        if frequencies.shape != amplitudes.shape or frequencies.ndim != 1:
            raise InputError("lines need as many frequencies as amplitudes")
        if not (np.isfinite(frequencies).all() and np.isfinite(amplitudes).all() and (frequencies > 0).all()):
            raise InputError("lines need finite amplitudes at frequencies above 0 Hz")
        frequencies.flags.writeable = amplitudes.flags.writeable = False
        object.__setattr__(self, "frequencies", frequencies)
        object.__setattr__(self, "amplitudes", amplitudes)

    def at(self, times: npt.ArrayLike) -> FloatArray:
        """Light over its mean at the given times, shape (n,)."""
        times = np.asarray(times, dtype=float)
        if self.pulse is not None:
            return self.pulse.at(times * self.pulse.frequency)
        light = np.ones(times.shape)
        for frequency, amplitude in zip(self.frequencies, self.amplitudes, strict=True):
            light += (amplitude * np.exp(2j * np.pi * frequency * times)).real
        return light

    @property
    def frequency(self) -> float | None:
        """Fundamental of the deepest family; None for steady light. [Hz]"""
        return self.fundamentals[0] if self.fundamentals else None


@dataclass(frozen=True, slots=True, eq=False)
class Light:
    """What a trace, a video or a typed-in PWM is reduced to for prediction: its channels."""

    channels: tuple[ChannelLight, ...]

    def __post_init__(self) -> None:
        if not self.channels:
            raise InputError("a light needs at least one channel")

    def __iter__(self) -> Iterator[ChannelLight]:
        return iter(self.channels)

    def __getitem__(self, name: str) -> ChannelLight:
        for channel in self.channels:
            if channel.name == name:
                return channel
        raise InputError(f"no channel is called '{name}'; known: {', '.join(c.name for c in self.channels)}")

    @property
    def frequency(self) -> float | None:
        """Fundamental of the first channel that has one. [Hz]"""
        return next((channel.frequency for channel in self.channels if channel.frequency), None)

    @property
    def wander(self) -> float:
        """How far the frequency of the worst channel wanders to either side, as a share of it."""
        return max(channel.wander for channel in self.channels)


def pwm_light(
    frequency: float,
    duty: float,
    low_level: float = 0.0,
    decay: float | Sequence[float] = 0.0,
    *,
    lines: int = 200,
) -> Light:
    """
    Light of a rectangular PWM, typed in.

    Parameters
    ----------
    frequency : float
        PWM frequency. [Hz]
    duty : float
        Share of the period that the light is on, above 0 and at most 1.
    low_level : float
        Off level over on level, 0 for light that goes out.
    decay : float or three floats
        1/e decay time of the emitter: one for all light, or those of red, green and blue. [s]
    lines : int
        How many spectral lines a channel lists; predictions use the exact pulse.

    Returns
    -------
    Light
        One channel `all`, or the channels `red`, `green` and `blue`.

    Raises
    ------
    InputError
        If a value lies outside its range, or `decay` is neither one time nor three.

    Examples
    --------
    >>> light = pwm_light(frequency=240.0, duty=0.3, decay=(8.5e-3, 0.0, 0.0))
    >>> [channel.name for channel in light]
    ['red', 'green', 'blue']
    >>> round(light["green"].pulse.percent_flicker, 1)
    100.0
    """
    decays = [float(decay)] if isinstance(decay, int | float) else [float(one) for one in decay]
    if len(decays) not in (1, 3):
        raise InputError(f"give one decay time, or three for red, green and blue, not {len(decays)}")
    names = ("all",) if len(decays) == 1 else ("red", "green", "blue")
    channels = []
    for name, time in zip(names, decays, strict=True):
        pulse = Pulse(frequency, duty, low_level, time)
        harmonics = np.arange(1, lines + 1)
        steady = duty == 1.0 or low_level == 1.0
        channels.append(
            ChannelLight(
                name,
                np.asarray(harmonics[: 0 if steady else None] * frequency, dtype=float),
                pulse.amplitudes(harmonics)[: 0 if steady else None],
                fundamentals=() if steady else (frequency,),
                pulse=pulse,
            )
        )
    return Light(tuple(channels))
