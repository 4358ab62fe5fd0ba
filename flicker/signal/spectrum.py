"""The windowed, padded transform that every search starts from."""

from __future__ import annotations

import itertools
from dataclasses import dataclass

import numpy as np
import scipy.fft

from flicker.signal.intervals import power_threshold
from flicker.trace import FloatArray


@dataclass(frozen=True, slots=True, eq=False)
class Spectrum:
    """
    Amplitude spectrum of an evenly sampled signal, Hann window, padded to at least twice its length.

    `amplitudes` are peak amplitudes: a cosine of amplitude 1 reads 1 on its own frequency.
    """

    amplitudes: FloatArray  # shape (bins,)
    spacing: float  # between bins [Hz]
    resolution: float  # 1 / duration [Hz]

    @property
    def frequencies(self) -> FloatArray:
        """Frequencies of the bins, shape (bins,). [Hz]"""
        return np.arange(self.amplitudes.size, dtype=float) * self.spacing

    def noise_power(self) -> FloatArray:
        """
        Expected noise power in every bin, shape (bins,): running median over about a fifth of an octave or 64 lines.

        Lines are narrow and few, so that the median hardly sees them; it follows noise that is not white.
        """
        power = self.amplitudes**2
        edges = _band_edges(power.size, least=int(128 * self.resolution / self.spacing))
        centres = 0.5 * (edges[:-1] + edges[1:])
        levels = np.array([np.quantile(power[a:b], 0.5) for a, b in itertools.pairwise(edges)]) / np.log(2)
        return np.asarray(np.interp(np.arange(power.size), centres, levels))

    def strongest_line(self, above: float, below: float, noise: FloatArray | None = None) -> tuple[float, float] | None:
        """
        Find the strongest significant line between two frequencies [Hz].

        Returns
        -------
        (float, float) or None
            Frequency (parabola through the logarithms) [Hz] and amplitude; None when nothing rises above the noise.
        """
        noise = self.noise_power() if noise is None else noise
        first, last = int(np.ceil(above / self.spacing)), int(np.floor(below / self.spacing)) + 1
        first, last = max(first, 1), min(last, self.amplitudes.size - 1)
        if last <= first:
            return None
        part = self.amplitudes[first:last]
        top = first + int(np.argmax(part))
        power = self.amplitudes[top] ** 2
        if not power > noise[top] * power_threshold(last - first):
            return None
        left, centre, right = np.log(np.maximum(self.amplitudes[top - 1 : top + 2], 1e-300))
        curvature = left - 2 * centre + right
        shift = 0.5 * (left - right) / curvature if curvature < 0 else 0.0
        return (top + float(np.clip(shift, -0.5, 0.5))) * self.spacing, float(self.amplitudes[top])


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
    Hann window after Harris, Proc. IEEE 66 (1978) 51; the transform is `scipy.fft.rfft`. A line between two bins reads
    at most 4 % low at this padding: figures are never taken from bins, only starting values are.
    """
    n = values.size
    window = 0.5 - 0.5 * np.cos(2 * np.pi * (np.arange(n) + 0.5) / n)
    centred = values - values.mean()
    centred *= window
    length = scipy.fft.next_fast_len(2 * n, real=True)
    amplitudes = np.abs(scipy.fft.rfft(centred, length)) * (2.0 / window.sum())
    return Spectrum(amplitudes, sample_rate / length, sample_rate / n)
