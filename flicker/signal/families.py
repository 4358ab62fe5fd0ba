"""Several periodic lights in one signal, told apart."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from fractions import Fraction

import numpy as np

from flicker.signal.harmonics import HarmonicFit, Series, fit_harmonics
from flicker.signal.spectrum import Spectrum, spectrum
from flicker.signal.switching import sharpen
from flicker.signal.wander import follow, refine
from flicker.trace import FloatArray

_MOST_FAMILIES = 6
_FOLDED = 0.1  # of the spectrum
_ALIASES = 200  # harmonics of a known light that are not taken for another one, beyond the Nyquist frequency too
_MOST_DIVISOR = 8
_EXCERPT = 1 << 19  # samples that settle the octave
_ROUNDS = 2  # in which each family is fitted beside the others
_RULERS = (4, 16, 64)  # harmonics that refine a track, one after the other
_ALIKE = 1.4  # noise that a fundamental may leave, over what its harmonic alone leaves: gaps may allow fewer lines
_CLEARLY = 0.8  # of the noise that a steady frequency leaves
_SLOWEST = 1.5  # cycles of a line that is looked at
_FEWEST_CYCLES = 1.9  # of a light; a single pulse passes for 1.8
_FEWEST_CYCLES_BELOW = 3.0  # of a fundamental below the strongest line: fewer could be drift


@dataclass(frozen=True, slots=True, eq=False)
class Search:
    """What the search found: families of lines, strongest first, and the quietest line that it could have seen."""

    families: tuple[HarmonicFit, ...]
    floor: float  # amplitude that a line must exceed to be found, in the unit of the signal
    spectrum: Spectrum  # of the whole signal

    def without(self, series: Series, families: Sequence[HarmonicFit]) -> Series:
        """Take some families off a series, but for their means."""
        return _without(series, families)


def find_families(series: Series) -> Search:
    """
    Tell apart the periodic lights in a signal.

    Parameters
    ----------
    series : Series
        The signal, mean and all.

    Returns
    -------
    Search
        No families for a signal that is steady to the noise.

    Notes
    -----
    The strongest line of the spectrum is fitted with all its harmonics and taken off; so on with what is left, until no
    line rises above the noise. Two families whose fundamentals stand in a ratio of small whole numbers, to within
    their errors, are one when at least half of the places that the common fundamental offers below the upper one
    are filled: light with every second pulse weaker is one light, a ripple at 100 Hz beside a PWM at 20 kHz is two.
    At the end each family is fitted beside the others, in turns. The rule of one half is this program's own.
    """
    whole = _longest_run(series)
    first = spectrum(whole, series.sample_rate)
    lowest = _SLOWEST * first.resolution
    families: list[HarmonicFit] = []
    left, now = series, first
    for _ in range(_MOST_FAMILIES):
        line = _next_line(now, lowest, series.sample_rate / 2, families)
        if line is None:
            break
        fit = _followed(left, line[0], _settle_octave(left, fit_harmonics(left, line[0]), now), now)
        if fit.frequency * series.span < _FEWEST_CYCLES:
            break
        families.append(fit)
        families = _merge_related(series, families)
        left = _without(series, families)
        now = spectrum(_longest_run(left), series.sample_rate)
    for _ in range(_ROUNDS if len(families) > 1 else 0):
        for place, fit in enumerate(families):
            rest = families[:place] + families[place + 1 :]
            families[place] = fit_harmonics(_without(series, rest), fit.frequency, track=fit.track)
    for place, fit in enumerate(families):
        families[place] = sharpen(_without(series, families[:place] + families[place + 1 :]), fit)
    families.sort(key=lambda fit: -_strength(fit))
    return Search(tuple(families), now.floor, first)


def _followed(series: Series, line: float, steady: HarmonicFit, now: Spectrum) -> HarmonicFit:
    """Fit a line once more along its wandering phase, and keep that where it leaves clearly less."""
    found = follow(series, line)
    if found is None:
        return steady
    fit = _settle_octave(series, fit_harmonics(series, found[0], track=found[1]), now)
    for harmonics in _RULERS:
        fit = fit_harmonics(series, fit.frequency, track=refine(series, fit, harmonics))
    return fit if fit.noise < _CLEARLY * steady.noise else steady


def _longest_run(series: Series) -> FloatArray:
    starts = [segment.first for segment in series.segments] + [series.values.size]
    longest = int(np.argmax(np.diff(starts)))
    return series.values[starts[longest] : starts[longest + 1]]


def _strength(fit: HarmonicFit) -> float:
    return float(np.sqrt(np.square(np.abs(fit.amplitudes)).sum()))


def _without(series: Series, families: Sequence[HarmonicFit]) -> Series:
    """Take the families off, but for their means."""
    if not families:
        return series
    values = series.values.copy()
    for part, times in series.chunks():
        for fit in families:
            values[part] -= fit.at(times + series.centre) - fit.mean
    return replace(series, values=values)


def _next_line(now: Spectrum, lowest: float, highest: float, families: list[HarmonicFit]) -> tuple[float, float] | None:
    """Find the strongest line that is neither left over from a family's harmonics nor lost among their aliases."""
    skip = []
    for fit in families:
        wander = fit.track.deviation if fit.track else 0.0
        seen = int(np.ceil(highest / fit.frequency))
        folded = int(_FOLDED * highest / (6.0 * now.resolution))  # aliases may hide a small part of the spectrum only
        for number in range(1, min(max(seen, folded), _ALIASES) + 1):
            middle = abs(
                (number * fit.frequency + highest) % (2 * highest) - highest
            )  # folded at the Nyquist frequency
            reach = 3.0 * (now.resolution + fit.frequency_error) + 2.0 * number * wander
            skip.append(slice(max(int((middle - reach) / now.spacing), 0), int((middle + reach) / now.spacing) + 2))
    line = now.strongest_line(lowest, highest, skip)
    unmodelled = max((2.0 * fit.unresolved for fit in families), default=0.0)
    return line if line is not None and line[1] > unmodelled else None


def _settle_octave(series: Series, fit: HarmonicFit, now: Spectrum) -> HarmonicFit:
    """Where the strongest line is a harmonic, go down to the fundamental that fills the places between."""
    part, track = series.excerpt(_EXCERPT), fit.track
    for divisor in (2, 3, 4, 5):
        fundamental = fit.frequency / divisor
        if fundamental < _FEWEST_CYCLES_BELOW * now.resolution:
            break
        places = [n for n in range(1, 2 * divisor) if n % divisor]
        places = [n for n in places if n * fundamental < series.sample_rate / 2]
        if not _hinted(now, [n * fundamental for n in places]):
            continue
        slower = track.scaled(1 / divisor) if track else None
        lower = fit_harmonics(part, fundamental, harmonics=2 * divisor, track=slower)
        if abs(lower.frequency - fundamental) > 4 * (lower.frequency_error + fit.frequency_error / divisor):
            continue
        if lower.amplitudes.size < 2 * divisor:
            continue
        heights = np.abs(lower.amplitudes[np.array(places) - 1])
        least = max(4.0 * lower.amplitude_error, 3 * fit.unresolved)
        if np.count_nonzero(heights > least) * 2 >= len(places):
            whole = fit_harmonics(series, lower.frequency, track=slower)
            filled = [n for n in places if n <= whole.amplitudes.size]
            if whole.noise < _ALIKE * fit.noise and _locked(series, whole, filled):
                return whole
    return fit


def _hinted(now: Spectrum, frequencies: list[float]) -> bool:
    """Whether the spectrum holds more than noise would leave at a third of some places."""
    bins = np.clip(np.rint(np.array(frequencies) / now.spacing).astype(int), 1, now.amplitudes.size - 2)
    tops = np.max([now.amplitudes[bins + step] for step in (-1, 0, 1)], axis=0)
    return bool(np.count_nonzero(tops**2 > 3 * now.noise_power(bins)) * 3 >= bins.size)


def _locked(series: Series, fit: HarmonicFit, places: list[int]) -> bool:
    """Whether the lines at some harmonics really lie there: a line beside its place leaves a line behind."""
    now = spectrum(_longest_run(_without(series, [fit])), series.sample_rate)
    for number in places:
        middle, reach = number * fit.frequency, 2 * now.resolution
        line = now.strongest_line(middle - reach, middle + reach)
        height = abs(fit.amplitudes[number - 1])
        if line is not None and line[1] > min(max(0.05 * height, 3 * fit.unresolved), 0.5 * height):
            return False
    return True


def _merge_related(series: Series, families: list[HarmonicFit]) -> list[HarmonicFit]:
    """Join the newest family with an earlier one where both are harmonics of one light."""
    *earlier, newest = families
    for place, other in enumerate(earlier):
        ratio = Fraction(newest.frequency / other.frequency).limit_denominator(_MOST_DIVISOR)
        if ratio.numerator == 0 or ratio.numerator > _MOST_DIVISOR:
            continue
        fundamental = other.frequency / ratio.denominator
        if fundamental * series.span < _FEWEST_CYCLES_BELOW:
            continue
        error = np.hypot(newest.frequency_error / ratio.numerator, other.frequency_error / ratio.denominator)
        if abs(newest.frequency / ratio.numerator - fundamental) > 4 * error:
            continue
        rest = earlier[:place] + earlier[place + 1 :]
        track = other.track.scaled(1 / ratio.denominator) if other.track else None
        joined = fit_harmonics(_without(series, rest), fundamental, track=track)
        upper = max(ratio.numerator, ratio.denominator)
        heights = np.abs(joined.amplitudes[: upper - 1])
        if np.count_nonzero(heights > 4 * joined.amplitude_error) * 2 >= upper - 1:
            return [*rest, joined]
    return families
