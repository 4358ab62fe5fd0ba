"""The windowed, padded transform that every search starts from."""

from __future__ import annotations

import itertools
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
import numpy.typing as npt
import scipy.fft

from flicker.signal.intervals import power_threshold
from flicker.trace import FloatArray

_MANY = 1 << 22
_CHUNK = 1 << 18


@dataclass(frozen=True, eq=False)
class Spectrum:
    """
    Amplitude spectrum of an evenly sampled signal under a Hann window.

    `amplitudes` are peak amplitudes: a cosine of amplitude 1 reads 1 on its own frequency.
    """

    amplitudes: FloatArray  # shape (bins,)
    spacing: float  # between bins [Hz]
    resolution: float  # 1 / duration [Hz]

    @property
    def frequencies(self) -> FloatArray:
        """Frequencies of the bins, shape (bins,). [Hz]"""
        return np.arange(self.amplitudes.size, dtype=float) * self.spacing

    @cached_property
    def _noise(self) -> tuple[FloatArray, FloatArray]:
        """Centres of bands of bins, and the noise power in each from its median, which narrow lines hardly move."""
        edges = _band_edges(self.amplitudes.size, least=int(128 * self.resolution / self.spacing))
        levels = [_median(self.amplitudes[a:b]) ** 2 / np.log(2) for a, b in itertools.pairwise(edges)]
        return 0.5 * (edges[:-1] + edges[1:]), np.array(levels)

    def noise_power(self, bins: FloatArray | npt.NDArray[np.intp]) -> FloatArray:
        """
        Expected noise power in some bins: running median over about a fifth of an octave or 64 lines.

        Lines are narrow and few, so that the median hardly sees them; it follows noise that is not white.
        """
        return np.asarray(np.interp(bins, *self._noise))

    @property
    def floor(self) -> float:
        """Amplitude that a line must exceed to stand out of the noise anywhere in the spectrum."""
        noise = self.noise_power(np.linspace(0, self.amplitudes.size - 1, 1001))
        return float(np.sqrt(np.quantile(noise, 0.5) * np.log(self.amplitudes.size * 1e3)))

    def strongest_line(self, above: float, below: float, skip: Sequence[slice] = ()) -> tuple[float, float] | None:
        """
        Find the strongest significant line between two frequencies [Hz], bins in `skip` left out.

        Returns
        -------
        (float, float) or None
            Frequency (parabola through the logarithms) [Hz] and amplitude; None when nothing rises above the noise.
        """
        first, last = int(np.ceil(above / self.spacing)), int(min(below / self.spacing, self.amplitudes.size)) + 1
        first, last = max(first, 1), min(last, self.amplitudes.size - 1)
        if last <= first:
            return None
        part = self.amplitudes[first:last]
        if skip:
            part = part.copy()
            for bins in skip:
                part[max(bins.start - first, 0) : max(bins.stop - first, 0)] = 0.0
        top = first + int(np.argmax(part))
        if not part[top - first] ** 2 > float(self.noise_power(np.array(top))) * power_threshold(last - first):
            return None
        left, centre, right = np.log(np.maximum(self.amplitudes[top - 1 : top + 2], 1e-300))
        curvature = left - 2 * centre + right
        shift = 0.5 * (left - right) / curvature if curvature < 0 else 0.0
        return (top + float(np.clip(shift, -0.5, 0.5))) * self.spacing, float(self.amplitudes[top])


def _median(values: FloatArray) -> float:
    """Median of positive values; of every tenth or so where they are many."""
    return float(np.quantile(values[:: max(values.size >> 16, 1)], 0.5))


def _band_edges(bins: int, least: int) -> FloatArray:
    """Edges of bands that widen with frequency, none narrower than `least` bins."""
    edges = [0]
    while edges[-1] < bins:
        edges.append(min(bins, max(edges[-1] + max(least, 8), int(edges[-1] * 1.15))))
    if len(edges) > 2 and edges[-1] - edges[-2] < least:
        del edges[-2]
    return np.array(edges)


def spectrum(values: FloatArray, sample_rate: float) -> Spectrum:
    """
    Amplitude spectrum of a real signal.

    Parameters
    ----------
    values : ndarray, shape (n,)
        Evenly sampled; their mean is taken off first.
    sample_rate : float
        [Hz]

    Returns
    -------
    Spectrum
        Bins from 0 to the Nyquist frequency.

    Notes
    -----
    Hann window after Harris, Proc. IEEE 66 (1978) 51; the transform is `scipy.fft.rfft`, padded to twice the length,
    so that a line between two bins reads at most 4 % low: figures are never taken from bins, only starting values are.
    Above four million samples it is not padded (15 % low at the most) and taken in single precision, whose rounding
    lies 140 dB below the signal.
    """
    n = values.size
    length = scipy.fft.next_fast_len(2 * n if n < _MANY else n, real=True)
    windowed = np.zeros(length, dtype=np.float64 if n < _MANY else np.float32)
    mean = values.mean()
    for begin in range(0, n, _CHUNK):
        part = slice(begin, min(begin + _CHUNK, n))
        phase = (np.arange(part.start, part.stop) + 0.5) * (2 * np.pi / n)
        windowed[part] = (values[part] - mean) * (0.5 - 0.5 * np.cos(phase))
    lines = scipy.fft.rfft(windowed, overwrite_x=True)
    del windowed
    amplitudes = np.abs(lines)
    amplitudes *= 2.0 / (0.5 * n)
    return Spectrum(amplitudes, sample_rate / length, sample_rate / n)
