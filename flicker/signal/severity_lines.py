"""Short-term severity of a light that is known as spectral lines, in its steady state."""

from __future__ import annotations

import math

import numpy as np

from flicker.light import ComplexArray
from flicker.signal.severity import SCALE, sections, severity_of, smoothing, weighted_sensation
from flicker.trace import FloatArray

HIGHEST = 200.0  # above it a line of any depth adds next to nothing [Hz]
_RATE = 2000.0  # of the meter whose filters are used [Hz]
_LEAST_POINTS = 12  # of a cycle, as a power of two
_RECORD = 60.0  # over which light of several families is followed [s]


def severity_of_lines(frequencies: FloatArray, amplitudes: ComplexArray, fundamental: float | None) -> float:
    """
    Give Pst LM of a light in its steady state.

    Parameters
    ----------
    frequencies, amplitudes : ndarray, shape (k,)
        Lines up to `HIGHEST` [Hz], peak amplitudes relative to the mean.
    fundamental : float or None
        Frequency of which all lines are harmonics [Hz]; None where there is none.

    Returns
    -------
    float
        Proportional to the amplitudes. [1]

    Notes
    -----
    Harmonics go through the meter's filters one by one, are summed over one cycle, squared, and their square is
    smoothed harmonic by harmonic: exact, percentiles of one cycle being those of all. Light of several families is
    followed over 60 s instead.
    """
    if not frequencies.size:
        return 0.0
    if fundamental is None:
        times = np.arange(round(_RECORD * _RATE)) / _RATE
        light = np.ones(times.size)
        for frequency, amplitude in zip(frequencies, amplitudes, strict=True):
            light += (amplitude * np.exp(2j * np.pi * frequency * times)).real
        return severity_of(weighted_sensation(light, _RATE))
    harmonics = np.rint(frequencies / fundamental).astype(int)
    points = 1 << max(_LEAST_POINTS, math.ceil(math.log2(8.0 * int(harmonics.max()))))
    response = _response(sections(_RATE), frequencies)
    spectrum = np.zeros(points // 2 + 1, dtype=complex)
    np.add.at(spectrum, harmonics, response * amplitudes * (points / 2))
    squared = np.fft.rfft(np.fft.irfft(spectrum, points) ** 2)
    reached = min(squared.size, math.floor(0.5 * _RATE / fundamental) + 1)
    squared[:reached] *= _response(smoothing(_RATE), np.asarray(np.arange(reached) * fundamental))
    squared[reached:] = 0.0
    return severity_of(SCALE * np.fft.irfft(squared, points))


def _response(filters: FloatArray, frequencies: FloatArray) -> ComplexArray:
    """Frequency response of second-order sections, shape (s, 6), at frequencies of shape (k,) [Hz]."""
    delay = np.exp(-2j * np.pi * frequencies / _RATE)
    powers = np.stack([np.ones_like(delay), delay, delay * delay])
    return np.asarray(np.prod((filters[:, :3] @ powers) / (filters[:, 3:] @ powers), axis=0))
