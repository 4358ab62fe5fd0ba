"""The light behind blurred harmonics that are those of no rectangle: as many harmonics as the exposure left."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.fft

from flicker.light import ComplexArray
from flicker.signal.stripes_shape import Harmonics, PulseShape, fit_pulse, is_rectangle
from flicker.trace import FloatArray

BLIND = 0.08  # what the exposure leaves of a harmonic: below this it is blind
_GRID = 4096


@dataclass(frozen=True, slots=True, eq=False)
class FreeShape:
    """Harmonics with the exposure undone; the blind ones, which it left too little of, are named."""

    numbers: FloatArray  # shape (k,)
    amplitudes: ComplexArray  # shape (k,)
    errors: FloatArray  # of the real part, shape (k,)
    blind: FloatArray  # numbers
    blind_bound: float  # largest amplitude that the blind ones may have together
    frequency: float  # [Hz]

    def behind(self, decay: float, error: float) -> FreeShape:
        """The same light behind an emitter with a decay time and its standard error. [s]"""
        turns = 2j * np.pi * self.numbers * self.frequency
        response = 1 / (1 + turns * decay)
        spread = np.abs(response - 1 / (1 + turns * (decay + error))) * np.abs(self.amplitudes)
        errors = np.hypot(self.errors * np.abs(response), spread)
        bound = self.blind_bound * float(np.abs(response[0]))
        return FreeShape(self.numbers, self.amplitudes * response, errors, self.blind, bound, self.frequency)


def undo_exposure(seen: Harmonics, exposure: float) -> FreeShape:
    """
    Divide the harmonics by what the exposure left of them, as far up as they stand out of the noise.

    Parameters
    ----------
    seen : Harmonics
        Of one channel, at the start of the exposure.
    exposure : float
        [s]

    Returns
    -------
    FreeShape
        Harmonics of the light about the middle of the exposure.
    """
    left = seen.left_by(exposure)
    blind = np.abs(left) < BLIND
    clear = (np.abs(seen.amplitudes) > 3.0 * np.sqrt(seen.variances)) & ~blind
    highest = float(seen.numbers[clear].max()) if clear.any() else 0.0
    used = (seen.numbers <= highest) & ~blind
    amplitudes = seen.amplitudes[used] / left[used]
    errors = np.sqrt(seen.variances[used]) / np.abs(left[used])
    numbers = seen.numbers[used]
    unseen = np.setdiff1d(np.arange(1.0, highest + 1), numbers)
    bound = 0.0
    for number in unseen:
        beside = np.abs(amplitudes[np.abs(numbers - number) == 1.0])
        bound += float(beside.max()) if beside.size else 0.0
    if numbers.size:  # harmonics above the last one seen, if they fall as those of a cusp do: 1 / h^2
        bound += float(np.abs(amplitudes[-1])) * highest
    return FreeShape(numbers, amplitudes, errors, unseen, bound, seen.frequency)


def shape_of(seen: Harmonics, exposure: float) -> PulseShape | FreeShape | None:
    """Give a rectangular pulse where one fits, else what harmonics the exposure [s] left; None without any."""
    if not seen.clear.any():
        return None
    pulse = fit_pulse(seen, exposure)
    if is_rectangle(pulse):
        return pulse
    free = undo_exposure(seen, exposure)
    return free if free.numbers.size else None


def extremes(numbers: FloatArray, amplitudes: ComplexArray) -> tuple[float, float, FloatArray]:
    """Smallest and largest light of a wave given by its harmonics, and the wave; light below zero is taken as zero."""
    spectrum = np.zeros(_GRID // 2 + 1, dtype=complex)
    spectrum[0] = _GRID
    spectrum[numbers.astype(int)] = amplitudes * (_GRID / 2)
    wave = np.maximum(scipy.fft.irfft(spectrum, _GRID), 0.0)
    return float(wave.min()), float(wave.max()), wave
