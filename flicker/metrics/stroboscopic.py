"""What moving things look like under the light: the stroboscopic visibility measure."""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import partial

import numpy as np
import numpy.typing as npt

from flicker.errors import NotMeasurable
from flicker.metrics import Observation, metric
from flicker.results import Measure
from flicker.signal.families import find_families
from flicker.signal.harmonics import HarmonicFit
from flicker.signal.stroboscopic import BAND, EXPONENT, sine_threshold, stroboscopic_visibility
from flicker.trace import FloatArray, Trace

BoolArray = npt.NDArray[np.bool_]

_SHORTEST = 1.0  # [s]
_ALMOST = 0.995  # a rate read from time stamps may miss the second by so much
_FULL = 6  # families after which the search stops, whether or not lines are left
_ROUNDS = 3
_NEGLIGIBLE = 1e-3  # amplitude over the mean, below which lines that were left do not move the figure
_FEWEST_GROUPS = 8


@metric(unit="1", source="IEC TR 63158:2018 (from public summaries; the threshold from memory)", order=80)
def svm(trace: Trace, observation: Observation) -> Measure:
    r"""
    Stroboscopic visibility measure.

    Parameters
    ----------
    trace : Trace
        At least 1 s, sampled above 4 kHz.
    observation : Observation
        Of that trace.

    Returns
    -------
    Measure
        1 where the average observer sees the effect half of the time, with its 95 % interval. [1]

    Raises
    ------
    NotMeasurable
        If the trace is too short or too slow, or its mean level is lost.

    Notes
    -----
    With :math:`C_m` the peak amplitudes of the lines over the mean and :math:`T` the threshold of a sine
    (`flicker.signal.stroboscopic.sine_threshold`),

    .. math:: M = \Big( \sum_m \big( C_m / T(f_m) \big)^{3.7} \Big)^{1 / 3.7}

    over the lines from 80 Hz to 2 kHz, both included. Lines are fitted to the samples, never read from the bins of a
    transform, which read a line between two bins up to 23 % low. Every harmonic of every family that was found
    counts, weak ones too; what noise adds to their moduli is taken off (half the variance times the Laplacian of
    :math:`M`, by hand).

    A line that lies on an end of the band to within its uncertainty counts, and the interval then reaches from the
    figure without it to the one with it. A dark level that was not taken off lowers the figure in proportion, and so
    does light of other lamps.
    """
    _refuse(trace)
    level = observation.level
    lines = _lines(observation)
    value = max(lines.visibility - lines.bias, 0.0)
    if value == 0.0:
        unseen = observation.search.floor / level / float(sine_threshold(BAND[0]))
        return Measure(0.0, "1", 0.0, unseen, "no line from 80 Hz to 2 kHz rises above the noise")
    by_dark = 1.96 * value * observation.dark_uncertainty / level
    by_mean = 1.96 * value * math.hypot(*(fit.mean_error for fit in observation.search.families)) / level
    half = math.hypot(_half_width(observation, lines), lines.fold, by_dark, by_mean)
    low = min(lines.only(~lines.doubtful).visibility, value) if lines.doubtful.any() else value
    method = f"{lines.frequencies.size} fitted lines from 80 Hz to 2 kHz, threshold of IEC TR 63158"
    if lines.doubtful.any():
        method += "; a line lies on the end of that band, the interval holds the figure with and without it"
    return Measure(value, "1", max(low - half, 0.0), value + half, method)


def _refuse(trace: Trace) -> None:
    if trace.sample_rate <= 2 * BAND[1]:
        raise NotMeasurable(
            f"lines up to 2 kHz count, and at {trace.sample_rate:.6g} Hz only those below "
            f"{trace.sample_rate / 2:.6g} Hz are seen: record above 4 kHz, better at 20 kHz"
        )
    if trace.duration < _ALMOST * _SHORTEST:
        raise NotMeasurable(f"at least 1 s is needed, and the capture has {trace.duration:.3g} s: record longer")
    if trace.exposure * BAND[1] > 0.5:
        raise NotMeasurable(
            f"each sample averages over {trace.exposure:.3g} s, which hides lines up to 2 kHz: expose for at most "
            "0.25 ms"
        )


@dataclass(frozen=True, slots=True, eq=False)
class _Lines:
    """Lines within the band; amplitudes are moduli over the mean, errors the standard errors of one quadrature."""

    frequencies: FloatArray
    amplitudes: FloatArray
    errors: FloatArray
    folded: FloatArray  # what harmonics beyond the samples may add
    doubtful: BoolArray  # on an end of the band to within the uncertainty

    def only(self, which: BoolArray) -> _Lines:
        return _Lines(
            self.frequencies[which],
            self.amplitudes[which],
            self.errors[which],
            self.folded[which],
            self.doubtful[which],
        )

    @property
    def visibility(self) -> float:
        return stroboscopic_visibility(np.clip(self.frequencies, *BAND), self.amplitudes)

    @property
    def shares(self) -> FloatArray:
        """Share of each line in the sum."""
        powers = (self.amplitudes / sine_threshold(self.frequencies)) ** EXPONENT
        return np.asarray(powers / max(float(powers.sum()), 1e-300))

    @property
    def bias(self) -> float:
        """What noise adds to the figure: half of the variance of each quadrature times the Laplacian."""
        shares = self.shares
        relative = (self.errors / np.maximum(self.amplitudes, 1e-300)) ** 2
        return 0.5 * self.visibility * float(np.sum(relative * shares * (1 + (EXPONENT - 1) * (1 - shares))))

    @property
    def error(self) -> float:
        """Standard error of the figure for the errors of the lines."""
        relative = self.errors / np.maximum(self.amplitudes, 1e-300)
        return self.visibility * float(np.sqrt(np.sum((relative * self.shares) ** 2)))

    @property
    def fold(self) -> float:
        """What folded harmonics may change of the figure, a bound."""
        return self.visibility * float(np.sum(self.folded * self.shares / np.maximum(self.amplitudes, 1e-300)))


def _lines(observation: Observation) -> _Lines:
    found = []
    for fit in _all_families(observation):
        number = np.arange(1, fit.amplitudes.size + 1)
        frequencies = number * fit.frequency
        reach = 1.96 * number * math.hypot(fit.frequency_error, observation.clock * fit.frequency) + 1e-9 * frequencies
        inside = (frequencies >= BAND[0] - reach) & (frequencies <= BAND[1] + reach)
        doubtful = np.minimum(np.abs(frequencies - BAND[0]), np.abs(frequencies - BAND[1])) <= reach
        kept = np.sinc(frequencies * observation.trace.exposure) * fit.mean
        error = np.full(number.size, fit.amplitude_error)
        folded = np.full(number.size, fit.folded)
        heights = np.abs(fit.amplitudes)
        found.append((frequencies, heights / kept, error / kept, folded / kept, doubtful, inside))
    if not found:
        return _Lines(np.zeros(0), np.zeros(0), np.zeros(0), np.zeros(0), np.zeros(0, dtype=bool))
    *columns, inside = (np.concatenate(column) for column in zip(*found, strict=True))
    return _Lines(*columns).only(inside)


def _all_families(observation: Observation) -> tuple[HarmonicFit, ...]:
    """Families of lines; where the search stopped because it had found enough of them, what it left is searched too."""
    families, newest = observation.search.families, observation.search.families
    for _ in range(_ROUNDS):
        if len(newest) < _FULL or np.abs(newest[-1].amplitudes).max() < _NEGLIGIBLE * observation.level:
            break
        newest = find_families(observation.search.without(observation.series, families)).families
        families += newest
    return families


def _half_width(observation: Observation, lines: _Lines) -> float:
    """Half of the 95 % interval: from the spread between groups of cycles, and no less than the lines' errors make."""
    half = 0.0
    for fit, cycle in zip(observation.search.families, observation.cycles, strict=True):
        number = np.arange(1, min(fit.amplitudes.size, (cycle.size - 1) // 2) + 1)
        if cycle.groups < _FEWEST_GROUPS or not number.size:
            return 1.96 * lines.error  # too few for a spread
        frequencies = np.asarray(number * fit.frequency)
        rest = lines.only(~np.isin(lines.frequencies, frequencies))
        half = math.hypot(half, cycle.interval(partial(_of_levels, frequencies=frequencies, rest=rest))[1])
    return max(half, 1.96 * lines.error)


def _of_levels(levels: FloatArray, frequencies: FloatArray, rest: _Lines) -> float:
    """Visibility of a cycle whose harmonics lie at the given frequencies, beside the lines of other families."""
    heights = np.abs(np.fft.rfft(levels)[1 : frequencies.size + 1]) * 2 / (levels.size * levels.mean())
    every = np.append(frequencies, np.clip(rest.frequencies, *BAND))
    return stroboscopic_visibility(every, np.append(heights, rest.amplitudes))
