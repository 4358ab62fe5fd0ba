"""Frequency and harmonics of a periodic signal: least squares on every sample at its true time."""

from __future__ import annotations

import dataclasses
from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np
import scipy.fft

from flicker.light import ComplexArray
from flicker.signal.track import Track
from flicker.trace import FloatArray, Segment

_BINS = 1 << 15  # of phase; a harmonic k then loses 1 - sinc(k / bins), under 1e-3 at k = 2048
_MOST_HARMONICS = 2048
_CHUNK = 1 << 18
_BLOCKS = 64  # of time, for the spread of the residuals
_FEWEST_ALLOWED = 192  # harmonics, though they lie above the Nyquist frequency: samples see them as aliases
_FEW = 16  # harmonics that any capture tells
_MANY = 1 << 20  # samples from which on pieces of them share a time
_SURE = 0.05  # cycles of the highest harmonic by which a fit of an excerpt may be off at the ends of the whole
_EXCERPT = 1 << 19  # samples that say how many harmonics there are, before all of them are asked


@dataclass(frozen=True, slots=True, eq=False)
class Series:
    """Readings at their true times: an array, its sample rate and its segments; `centre` is the mid time [s]."""

    values: FloatArray  # shape (n,)
    sample_rate: float  # [Hz]
    segments: Sequence[Segment]
    centre: float  # [s]

    @classmethod
    def of(cls, values: FloatArray, sample_rate: float, segments: Sequence[Segment] = (Segment(0, 0.0),)) -> Series:
        """Make a series; its centre is the mean time of all samples."""
        weighted = 0.0
        for first, last, start in _runs(values.size, segments):
            weighted += (last - first) * (start + 0.5 * (last - first - 1) / sample_rate)
        return cls(values, sample_rate, segments, weighted / values.size)

    def pieces(self, most: int = _CHUNK) -> Iterator[tuple[slice, float]]:
        """Pieces of at most so many samples: where they lie, and the time of their first sample from the centre [s]."""
        for first, last, start in _runs(self.values.size, self.segments):
            for begin in range(first, last, most):
                part = slice(begin, min(begin + most, last))
                yield part, (begin - first) / self.sample_rate + (start - self.centre)

    def chunks(self) -> Iterator[tuple[slice, FloatArray]]:
        """Pieces of at most 2**18 samples: where they lie, and their times from the centre [s]."""
        for part, begin in self.pieces():
            yield part, np.arange(part.stop - part.start) / self.sample_rate + begin

    def coarser(self, sample_rate: float) -> Series:
        """Average neighbouring samples, so that about the given rate is left [Hz]."""
        group = int(self.sample_rate / sample_rate)
        if group < 2:
            return self
        values, segments, first = [], [], 0
        for begin, end, start in _runs(self.values.size, self.segments):
            whole = (end - begin) // group
            if whole:
                values.append(self.values[begin : begin + whole * group].reshape(whole, group).mean(axis=1))
                segments.append(Segment(first, start + 0.5 * (group - 1) / self.sample_rate))
                first += whole
        return Series.of(np.concatenate(values), self.sample_rate / group, segments) if values else self

    def excerpt(self, samples: int) -> Series:
        """At most so many samples in a row, from the middle of the series; segments stay apart."""
        if samples >= self.values.size:
            return self
        begin = (self.values.size - samples) // 2
        runs = [
            (max(first, begin), min(last, begin + samples), start + (max(first, begin) - first) / self.sample_rate)
            for first, last, start in _runs(self.values.size, self.segments)
        ]
        segments = [Segment(first - begin, start) for first, last, start in runs if last > first]
        return Series.of(self.values[begin : begin + samples], self.sample_rate, segments)

    @property
    def span(self) -> float:
        """From the first to the last sample. [s]"""
        *_, (first, last, start) = _runs(self.values.size, self.segments)
        return start + (last - first) / self.sample_rate - self.segments[0].start


def _runs(samples: int, segments: Sequence[Segment]) -> Iterator[tuple[int, int, float]]:
    for here, after in zip(segments, (*segments[1:], None), strict=True):
        yield here.first, after.first if after else samples, here.start


@dataclass(frozen=True, slots=True, eq=False)
class _Binned:
    """Sums over the samples that fall into each bin of phase, all of shape (bins,)."""

    count: FloatArray
    value: FloatArray
    time: FloatArray
    time_squared: FloatArray
    value_time: FloatArray


def _bin_by_phase(series: Series, frequency: float, offset: float, bins: int, track: Track | None) -> _Binned:
    """Sum by phase; `bins` is a power of two. Many samples are weighted with the time of their piece, not their own."""
    many = series.values.size >= _MANY and track is None
    length = series.values.size // (2 * _BLOCKS) if many else _CHUNK
    ramp = np.arange(min(length, series.values.size), dtype=float)
    turns, seconds = ramp * (frequency * bins / series.sample_rate), ramp / series.sample_rate
    sums = np.zeros((5, bins))
    for part, begin in series.pieces(length):
        size = part.stop - part.start
        place = turns[:size] + (begin * frequency) % 1.0 * bins
        if track is not None:
            place += (track.at(seconds[:size] + (begin + series.centre)) + track.lag) * bins
        index = place.astype(np.intp)
        index &= bins - 1
        values = series.values[part]
        if many:
            time = begin + 0.5 * (size - 1) / series.sample_rate
            count = np.bincount(index, minlength=bins)
            value = np.bincount(index, values, minlength=bins) - offset * count
            for row, added in zip(sums, (count, value, time * count, time**2 * count, time * value), strict=True):
                row += added
        else:
            times, values = seconds[:size] + begin, values - offset
            for row, weights in zip(sums, (None, values, times, times * times, values * times), strict=True):
                row += np.bincount(index, weights, minlength=bins)
    return _Binned(*sums)


def longest_gap(count: FloatArray) -> float:
    """Longest run of empty bins around the circle, as a share of the cycle."""
    filled = np.flatnonzero(count)
    if filled.size == 0:
        return 1.0
    gaps = np.diff(np.concatenate([filled, [filled[0] + count.size]])) - 1
    return float(gaps.max()) / count.size


@dataclass(frozen=True, slots=True, eq=False)
class HarmonicFit:
    """
    A periodic signal: frequency and complex amplitudes of its harmonics, as least squares finds them.

    The signal is `mean + sum Re(amplitudes[k - 1] * exp(2j pi k frequency (t - centre)))`.
    """

    frequency: float  # [Hz]
    frequency_error: float  # standard error [Hz]
    mean: float
    amplitudes: ComplexArray  # peak, shape (k,)
    noise: float  # standard deviation of what the harmonics leave
    samples: int
    centre: float  # [s]
    longest_gap: float  # longest stretch of phase that no sample has seen [cycles]
    track: Track | None = None  # of the phase, where the frequency wanders

    @property
    def amplitude_error(self) -> float:
        """Standard error of the modulus of one amplitude, sqrt(2 / n) times the noise (Kay 1993, example 3.14)."""
        return float(self.noise * (2.0 / self.samples) ** 0.5)

    @property
    def unresolved(self) -> float:
        """Typical amplitude of the last quarter of the harmonics; those beyond, not fitted, may be as high."""
        if self.amplitudes.size < 16:
            return 0.0
        return float(np.sqrt(np.mean(np.abs(self.amplitudes[-(self.amplitudes.size // 4) :]) ** 2)))

    @property
    def folded(self) -> float:
        """
        Amplitude that harmonics too high to be told apart may add to a low one, a bound.

        Where samples fall on few phases of the cycle, those of the n-th harmonic are those of a low one when n is near
        the number of phases. How high it is follows from how the harmonics below it decay, octave by octave.
        """
        told = 1.0 / max(self.longest_gap, 1.0 / _BINS)
        highest = min(self.amplitudes.size, int(told / 2))
        if highest < 8 and (highest < 2 or self.amplitudes.size < int(told / 2) - 1):
            return 0.0  # so few of them because no more rise above the noise
        power = np.maximum(np.abs(self.amplitudes[:highest]) ** 2 - 2 * self.amplitude_error**2, 0.0)
        upper = float(np.mean(power[highest // 2 :])) ** 0.5
        lower = float(np.mean(power[highest // 4 : highest // 2])) ** 0.5 if highest >= 4 else upper
        slope = float(np.clip(np.log2(max(lower, 1e-300) / max(upper, 1e-300)), 1.0, 4.0))
        summed = sum(number**-slope for number in (1, 2, 3))
        return float(2.0 * upper * (0.75 * highest / told) ** slope * summed)

    @property
    def mean_error(self) -> float:
        """Standard error of the mean, of noise and of folded harmonics."""
        return float(np.hypot(self.noise / np.sqrt(self.samples), 0.5 * self.folded))

    def at(self, times: FloatArray) -> FloatArray:
        """Evaluate the fit at times, shape (n,), through a table of its cycle."""
        table = self.table(_BINS)
        phase = self.phase(times)
        return table[np.minimum(((phase - np.floor(phase)) * _BINS).astype(np.intp), _BINS - 1)]

    def phase(self, times: FloatArray) -> FloatArray:
        """Phase at times, shape (n,). [cycles]"""
        steady = (times - self.centre) * self.frequency
        return steady if self.track is None else steady + self.track.at(times)

    def table(self, size: int) -> FloatArray:
        """One cycle of the fit at phases (b + 0.5) / size from the centre, shape (size,)."""
        return _evaluate(np.concatenate([[self.mean + 0j], 0.5 * self.amplitudes]), size)


def _evaluate(coefficients: ComplexArray, bins: int) -> FloatArray:
    """Signal at bin centres from its coefficients of harmonics 0..k, shape (bins,)."""
    number = np.arange(coefficients.size)
    return np.asarray(scipy.fft.irfft(coefficients * np.exp(1j * np.pi * number / bins) * bins, bins))


def _project(sums: FloatArray, harmonics: int) -> ComplexArray:
    """Sums of bins times exp(-2j pi k phase) for k = 0..harmonics, shape (harmonics + 1,)."""
    number = np.arange(harmonics + 1)
    return np.asarray(scipy.fft.rfft(sums)[: harmonics + 1] * np.exp(-1j * np.pi * number / sums.size))


def _solve(count: FloatArray, sums: FloatArray, harmonics: int, tolerance: float = 1e-10) -> ComplexArray:
    """
    Least-squares coefficients 0..harmonics of binned data, by conjugate gradients on the normal equations.

    The normal matrix is Toeplitz (it holds the transform of the counts), so that a product costs two transforms; it is
    close to a multiple of the identity where the phases are spread evenly, and few steps are enough.
    """
    bins, total = count.size, float(count.sum())

    def product(coefficients: ComplexArray) -> ComplexArray:
        return np.asarray(_project(count * _evaluate(coefficients, bins), harmonics) / total)

    def dot(a: ComplexArray, b: ComplexArray) -> float:
        return float(2.0 * np.vdot(a, b).real - (a[0].conjugate() * b[0]).real)

    right = np.asarray(_project(sums, harmonics) / total)
    solution = right.copy()
    residual = right - product(solution)
    direction = residual
    power, goal = dot(residual, residual), tolerance**2 * max(dot(right, right), 1e-300)
    for _ in range(60):
        if power <= goal:
            break
        image = product(direction)
        step = power / dot(direction, image)
        solution = solution + step * direction
        residual = residual - step * image
        power, before = dot(residual, residual), power
        direction = residual + (power / before) * direction
    return solution


def fit_harmonics(
    series: Series,
    frequency: float,
    *,
    harmonics: int | None = None,
    most: int = _MOST_HARMONICS,
    track: Track | None = None,
) -> HarmonicFit:
    """
    Refine the frequency of a periodic signal, using every harmonic that rises above the noise and every sample.

    Parameters
    ----------
    series : Series
        The signal.
    frequency : float
        Starting value, within a third of 1 / span of the truth. [Hz]
    harmonics : int, optional
        Fit just so many; otherwise their number doubles as long as the added ones carry significant energy.
    track : Track, optional
        Of the phase, where the frequency wanders.
    most : int
        Never more than so many, nor than reach the Nyquist frequency or 192.

    Returns
    -------
    HarmonicFit

    Notes
    -----
    Gauss-Newton on the frequency with the amplitudes solved for at each step (variable projection, Golub and Pereyra,
    SIAM J. Numer. Anal. 10 (1973) 413): the residual is regressed on the model's own time derivative times centred
    time. For white noise this is the maximum-likelihood estimate, whose variance meets the bound of Rife and Boorstyn
    (IEEE Trans. Inf. Theory 20 (1974) 591). Harmonics above the Nyquist frequency count too: sampled light holds them
    as aliases, at places that the phase of each sample tells.
    """
    most = min(most, max(_FEWEST_ALLOWED, int(series.sample_rate / (2 * frequency))))
    if harmonics is not None:
        return _with_robust_error(series, _Fitting(series, track).fit(frequency, harmonics, _BINS))
    part = series.excerpt(_EXCERPT)
    best = _climb(_Fitting(part, track), frequency, (1, 3), most)
    whole = _Fitting(series, track)
    if part is not series:
        first = 1 if best.frequency_error * series.span * best.amplitudes.size > _SURE else best.amplitudes.size
        best = _climb(whole, frequency if first == 1 else best.frequency, (first, best.amplitudes.size), most)
    return _with_robust_error(series, _sharpest(whole, best.frequency, best.amplitudes.size))


def refit(series: Series, frequency: float, harmonics: int, track: Track | None = None) -> HarmonicFit:
    """Fit the amplitudes at a known frequency [Hz]."""
    return dataclasses.replace(_Fitting(series, track).fit(frequency, harmonics, _BINS, steps=1), frequency=frequency)


def _sharpest(fitting: _Fitting, frequency: float, harmonics: int) -> HarmonicFit:
    """Fit the harmonics at the frequency that all of them tell, or half of them where that is sharper."""
    fit = fitting.fit(frequency, harmonics, _BINS)
    if harmonics < 2 * _FEW or fitting.series.values.size >= _MANY:
        return fit
    half = fitting.fit(frequency, harmonics // 2, _BINS)  # few samples cannot tell many harmonics from a frequency
    if half.frequency_error > 0.7 * fit.frequency_error:
        return fit
    fit = refit(fitting.series, half.frequency, harmonics, fitting.track)
    return dataclasses.replace(fit, frequency_error=half.frequency_error)


def _climb(fitting: _Fitting, frequency: float, first: tuple[int, int], most: int) -> HarmonicFit:
    """Double the number of harmonics as long as those added carry significant energy, or the next ones do."""
    best = latest = fitting.fit(frequency, first[0], _bins(first[0]))
    wanted, idle = first[1] * (2 if first[0] == first[1] else 1), 0
    while idle < 2:
        latest = fitting.fit(latest.frequency, min(wanted, most), _bins(wanted))
        if latest.amplitudes.size <= best.amplitudes.size:
            break
        if _worth_it(best, latest):
            best, idle = latest, 0
        else:
            idle += 1
        if latest.amplitudes.size < wanted:
            break
        wanted *= 2
    return best


def _bins(harmonics: int) -> int:
    """Bins of phase that are enough for some harmonics while their number is sought."""
    return int(min(_BINS, max(1 << 12, 1 << int(np.ceil(np.log2(64 * harmonics))))))


class _Fitting:
    """A series about to be fitted; its mean and power are taken once."""

    def __init__(self, series: Series, track: Track | None) -> None:
        self.series, self.track = series, track
        self.offset = float(series.values.mean())
        self.power = float(sum(np.square(series.values[part] - self.offset).sum() for part, _ in series.chunks()))

    def fit(self, frequency: float, harmonics: int, bins: int, steps: int = 6) -> HarmonicFit:
        """Gauss-Newton with a fixed number of harmonics, fewer where the phases that were seen cannot tell so many."""
        series = self.series
        for _ in range(steps if harmonics < 3 else min(steps, 4)):
            binned = _bin_by_phase(series, frequency, self.offset, bins, self.track)
            gap = longest_gap(binned.count)
            allowed = max(1, min(harmonics, int(0.45 / gap) if gap > 0 else harmonics, series.values.size // 4))
            coefficients = _solve(binned.count, binned.value, allowed)
            step, error, left = _newton_step(binned, coefficients, self.power)
            noise = (max(left, 0.0) / max(series.values.size - 2 * allowed - 2, 1)) ** 0.5
            frequency += float(np.clip(step, -0.5 / series.span, 0.5 / series.span) / max(1.0, allowed / 32))
            if abs(step) < 0.02 * error * noise or abs(step) * series.span < 1e-9:
                break
        return HarmonicFit(
            frequency,
            error * noise,
            self.offset + float(coefficients[0].real),
            2.0 * coefficients[1:] / np.sinc(np.arange(1, allowed + 1) / bins),
            noise,
            series.values.size,
            series.centre,
            gap,
            self.track,
        )


def _with_robust_error(series: Series, fit: HarmonicFit) -> HarmonicFit:
    """
    Let the standard error of the frequency be no smaller than what the residuals show, block of time by block.

    White residuals give the error of the fit; steps between samples, wander and other lights leave residuals that hang
    together, and the spread of the blocks' scores says how much that costs (cluster-robust variance, White 1984).
    Edges faster than the samples are known only to within the phases that no sample has seen.
    """
    blocks = int(min(_BLOCKS, series.span * fit.frequency))
    unresolved = 0.4 * fit.longest_gap / series.span if fit.unresolved > 4 * fit.amplitude_error else 0.0
    if blocks < 8:
        return dataclasses.replace(fit, frequency_error=float(np.hypot(fit.frequency_error, unresolved)))
    table = fit.table(_BINS)
    number = np.arange(fit.amplitudes.size + 1)
    slope = _evaluate(np.concatenate([[0j], 0.5 * fit.amplitudes]) * 2j * np.pi * number, _BINS)
    scores, information = np.zeros(blocks), 0.0
    first = series.segments[0].start - series.centre
    for part, times in series.chunks():
        phase = fit.phase(times + series.centre)
        index = np.minimum(((phase - np.floor(phase)) * _BINS).astype(np.intp), _BINS - 1)
        along = slope[index] * times
        information += float(np.dot(along, along))
        block = np.minimum(((times - first) * (blocks / series.span)).astype(np.intp), blocks - 1)
        scores += np.bincount(block, along * (series.values[part] - table[index]), minlength=blocks)
    robust = float(np.sqrt(np.square(scores).sum() * blocks / (blocks - 1))) / max(information, 1e-300)
    error = float(np.hypot(max(fit.frequency_error, robust), unresolved))
    return dataclasses.replace(fit, frequency_error=error)


def _worth_it(before: HarmonicFit, after: HarmonicFit) -> bool:
    """Whether the added harmonics carry more energy than noise would give them (mean plus five deviations)."""
    added = after.amplitudes.size - before.amplitudes.size
    energy = float(np.square(np.abs(after.amplitudes[-added:])).sum()) if added > 0 else 0.0
    return bool(energy > after.amplitude_error**2 * (2 * added + 10 * (2 * added) ** 0.5))


def _newton_step(binned: _Binned, coefficients: ComplexArray, total_power: float) -> tuple[float, float, float]:
    """Step of the frequency [Hz], its standard error for unit noise [Hz], and the residual sum of squares."""
    bins = binned.count.size
    harmonics = coefficients.size - 1
    model = _evaluate(coefficients, bins)
    slope = _evaluate(coefficients * 2j * np.pi * np.arange(harmonics + 1), bins)
    gradient = float(np.sum(slope * (binned.value_time - model * binned.time)))
    explained = _solve(binned.count, slope * binned.time, harmonics, 1e-4)
    along = float(np.sum(slope * binned.time * _evaluate(explained, bins)))
    information = max(float(np.sum(slope**2 * binned.time_squared)) - along, 1e-300)
    left = total_power - 2 * float(np.sum(model * binned.value)) + float(np.sum(model**2 * binned.count))
    return gradient / information, information**-0.5, left
