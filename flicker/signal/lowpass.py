"""Light with everything above a frequency taken out, without the noise that would swell its extremes."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import scipy.fft

from flicker.light import ComplexArray
from flicker.signal.harmonics import HarmonicFit, Series
from flicker.signal.intervals import power_threshold
from flicker.trace import FloatArray

_POINTS = 61.8  # a cycle of the cut-off frequency; no whole number, so that periodic light is met in every phase
_MOST_POINTS = 1 << 21
_FAST_ENOUGH = 100e3  # rate at which light below 1 kHz is kept [Hz]


@dataclass(frozen=True, slots=True, eq=False)
class LeftOver:
    """
    What the families leave of a signal, as a cosine series over the record.

    `coefficients[k]` is the peak amplitude of the cosine of k half cycles a record.
    """

    coefficients: FloatArray  # shape (n,)
    duration: float  # [s]

    @classmethod
    def of(cls, series: Series) -> LeftOver:
        """
        Transform a signal from which all families were taken off; it must have no gap.

        A cosine transform goes on mirrored at both ends, so that a drift does not ring where the end meets the start.
        Samples far faster than any cut are averaged in groups first: a line at 1 kHz loses at most 0.02 %.
        """
        group = max(int(series.sample_rate / _FAST_ENOUGH), 1)
        values = series.values[: series.values.size // group * group].reshape(-1, group).mean(axis=1)
        values -= values.mean()
        return cls(scipy.fft.dct(values, type=2) / values.size, values.size * group / series.sample_rate)

    def below(self, cut: float, least: float = 0.0) -> tuple[FloatArray, float]:
        """
        Coefficients below a frequency [Hz] that rise above the noise and `least`, the others zero, and the noise of
        one.

        The noise is read above the cut, from the median, which lines do not move; where there is nothing above, below
        it.
        """
        first = min(int(2.0 * cut * self.duration) + 1, self.coefficients.size)
        inside, above = self.coefficients[:first].copy(), self.coefficients[first : 10 * first]
        power = np.square(above if above.size > first // 2 else inside[1:])
        noise = math.sqrt(float(np.median(power)) / 0.4549) if power.size else 0.0  # median of chi-squared, 1 degree
        inside[np.square(inside) < max(2.0 * noise**2 * power_threshold(inside.size), least**2)] = 0.0
        return inside, noise


def harmonics_below(fit: HarmonicFit, cut: float, doubt: float = 1.0) -> ComplexArray:
    """
    Amplitudes of a family's harmonics up to a frequency [Hz], shape (k,), without what noise adds.

    A harmonic that lies on the cut to within `doubt` times its uncertainty counts. Each modulus is shrunk by 1 -
    variance / modulus squared, to nothing where that is negative (after James and Stein 1961): strong lines stay,
    lines of noise vanish.
    """
    reach = doubt * (1.96 * fit.frequency_error + 1e-9 * fit.frequency)
    amplitudes = fit.amplitudes[: int(cut / max(fit.frequency - reach, 1e-300))]
    power = np.square(np.abs(amplitudes))
    return np.asarray(amplitudes * np.maximum(1.0 - 2.0 * fit.amplitude_error**2 / np.maximum(power, 1e-300), 0.0))


def swing(amplitudes: ComplexArray) -> tuple[float, float]:
    """How far a sum of harmonics rises above its mean, and how far it falls below (negative)."""
    light = _table(amplitudes)
    return float(light.max()), float(light.min())


def _table(amplitudes: ComplexArray) -> FloatArray:
    size = 1 << max(12, math.ceil(math.log2(256.0 * (amplitudes.size + 1))))
    return np.asarray(scipy.fft.irfft(np.concatenate([[0.0], amplitudes]) * (0.5 * size), size))


def ends_below(
    families: Sequence[HarmonicFit], left: LeftOver | None, cut: float, series: Series, doubt: float = 1.0
) -> tuple[float, float]:
    """
    How far a record with all that lies above a frequency taken out rises above its mean, and how far it falls below.

    Parameters
    ----------
    families : sequence of HarmonicFit
        Lines of the signal.
    left : LeftOver, optional
        What they leave.
    cut : float
        [Hz]
    series : Series
        The signal, for its length.
    doubt : float
        1 counts a line that lies on the cut to within its uncertainty, -1 does not.

    Returns
    -------
    (float, float)
        Largest and smallest deviation, in the unit of the signal.

    Notes
    -----
    Lines are those of the fits and so need no whole number of periods in the record; the rest is transformed, set to
    zero above the cut and transformed back. What the harmonics beyond the fitted ones may leave as aliases does not
    count.
    """
    lines = [(fit, harmonics_below(fit, cut, doubt)) for fit in families]
    lines = [(fit, amplitudes) for fit, amplitudes in lines if amplitudes.any()]
    inside, _ = left.below(cut, max(map(unfitted, families), default=0.0)) if left is not None else (np.zeros(1), 0.0)
    if len(lines) <= 1 and not inside.any():
        return swing(lines[0][1]) if lines else (0.0, 0.0)
    points = int(min(max(_POINTS * cut * series.span, 64), _MOST_POINTS))
    times = series.segments[0].start - series.centre + np.arange(points) * (series.span / points)
    light = np.zeros(points)
    for fit, amplitudes in lines:
        table = _table(amplitudes)
        light += table[np.rint(times * (fit.frequency * table.size)).astype(np.intp) % table.size]
    if inside.any():
        padded = np.zeros(points)
        padded[: inside.size] = inside[:points]
        light += scipy.fft.idct(padded * points, type=2)
    return float(light.max()), float(light.min())


def unfitted(fit: HarmonicFit) -> float:
    """Amplitude that harmonics beyond the fitted ones may have: thrice the root mean square of the last quarter."""
    if fit.amplitudes.size < 16:
        return 0.0
    return 3.0 * float(np.sqrt(np.mean(np.abs(fit.amplitudes[-(fit.amplitudes.size // 4) :]) ** 2)))
