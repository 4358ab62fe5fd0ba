"""The largest and the smallest level of a cycle, without what noise adds to a maximum."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

import numpy as np
import scipy.fft

from flicker.light import ComplexArray
from flicker.signal.cycle import Cycle
from flicker.signal.harmonics import HarmonicFit
from flicker.signal.intervals import student_quantile
from flicker.signal.summit import find_manner, read
from flicker.trace import FloatArray

_CONTRADICTION = 2.0  # standard errors by which a wide window may differ from a narrower one
# steps back from the widest window that is not contradicted, whose bias is of the size of its error: plateaus on
# either side of the place or about it, and two shapes that bend
_STEPS_BACK = {"right": 2, "left": 2, "about": 2, "parabola": 3, "hinge": 3}
_DOUBT = 0.5  # standard deviation of the bias of a bent reading, over what a lower degree reads otherwise
_TRACKED = 3.0  # standard errors by which cycles of a wandering frequency may lie apart
_QUIETEST = 1e-4  # noise over swing that is assumed at the least, so that wide windows are preferred without noise too
_FEW_HARMONICS = 3  # with more, a corner may hide behind the noise


@dataclass(frozen=True, slots=True)
class Extremes:
    """Largest and smallest level of the mean cycle, with the covariance of the two."""

    high: float
    low: float
    covariance: FloatArray  # shape (2, 2), of (high, low)
    degrees_of_freedom: float

    def interval(self, value: float, gradient: tuple[float, float]) -> tuple[float, float]:
        """95 % interval of a figure with the given derivatives by (high, low)."""
        slope = np.array(gradient)
        error = float(np.sqrt(max(slope @ self.covariance @ slope, 0.0)))
        half = student_quantile(self.degrees_of_freedom) * error
        return value - half, value + half


def extremes(cycle: Cycle, fit: HarmonicFit) -> Extremes:
    """
    Read the largest and the smallest level of a mean cycle.

    Parameters
    ----------
    cycle : Cycle
        Light above dark.
    fit : HarmonicFit
        Its harmonics as far as they rise above the noise; few of them describe the cycle whole.

    Returns
    -------
    Extremes

    Notes
    -----
    The largest of noisy values only ever lies too high.

    A smooth cycle is the sum of its few harmonics; its maximum is too high by half the variance of its slope over its
    curvature (second order, by hand), which is taken off.

    A cycle with edges is split in two halves of its cycles: one says where the extreme lies and how it is to be read
    (`flicker.signal.summit`), the other what the level is there, and the other way round; what selection adds falls
    away. Half of what curves of a lower degree read otherwise is added to the interval where the level bends.

    The interval comes from the spread between groups of neighbouring cycles, and is no narrower than white noise makes
    it.
    """
    if fit.amplitudes.size <= _FEW_HARMONICS and cycle.size > 2 * fit.amplitudes.size:
        return _of_few_harmonics(cycle, fit)
    halves = cycle.part(slice(0, None, 2)), cycle.part(slice(1, None, 2))
    places = [_places(half) for half in halves]
    noise = max(min(cycle.noise, fit.noise), _QUIETEST * float(np.ptp(cycle.levels)))
    blur = 2.0 * fit.frequency_error * cycle.span + 1.0 / cycle.fine_sums.shape[1]
    blur += _TRACKED * fit.track.error if fit.track else 0.0
    values, scores, white, bent = [], np.zeros((2, cycle.groups)), np.zeros((2, 2)), np.zeros((2, 2))
    for end, sign in enumerate((1.0, -1.0)):
        here, there = (
            read(asked, find_manner(told, place[end], noise, sign, blur))
            for told, asked, place in zip(halves, halves[::-1], places, strict=True)
        )
        values.append(0.5 * (here.level + there.level))
        bent[end, end] = (_DOUBT * 0.5) ** 2 * (here.doubt**2 + there.doubt**2)
        white[end, end] = (0.5 * noise) ** 2 * (here.variance + there.variance)
        scores[end, 1::2] = 0.5 * here.scores
        scores[end, 0::2] = 0.5 * there.scores
    freedom = max(cycle.groups - 2, 1)
    correction = cycle.groups / max(cycle.groups - 1, 1)
    spread = correction * (scores @ scores.T)
    shortfall = np.diag(np.maximum(white - spread, 0.0).diagonal())  # few cycles may agree by chance
    return Extremes(values[0], values[1], spread + shortfall + bent, freedom)


def _of_few_harmonics(cycle: Cycle, fit: HarmonicFit) -> Extremes:
    number = np.arange(1, fit.amplitudes.size + 1)
    bins = cycle.phase + cycle.first_phase - fit.centre * fit.frequency  # in the phase of the fit

    def weights(phase: float, derivative: int) -> FloatArray:
        turns = np.exp(2j * np.pi * np.outer(number, phase - bins)) * (2j * np.pi * number[:, None]) ** derivative
        steady = 1.0 if derivative == 0 else 0.0
        return np.asarray((steady + 2 * turns.real.sum(axis=0)) / cycle.size)

    def at(phase: FloatArray | float, derivative: int = 0) -> FloatArray:
        turned = fit.amplitudes * (2j * np.pi * number) ** derivative
        return np.asarray((turned @ np.exp(2j * np.pi * np.multiply.outer(number, phase))).real)

    step = 1 / (64 * number.size)
    fine = np.arange(0, 1, step)
    correction = cycle.groups / max(cycle.groups - 1, 1)
    values, scores = [], np.zeros((2, cycle.groups))
    for end, sign in enumerate((1.0, -1.0)):
        near = fine[int(np.argmax(sign * at(fine)))] + np.linspace(-step, step, 129)
        top = float(near[int(np.argmax(sign * at(near)))])
        scores[end], slopes = (_scores(cycle, weights(top, derivative)) for derivative in (0, 1))
        error = float(np.sqrt(correction * (scores[end] @ scores[end])))
        excess = 0.5 * correction * float(slopes @ slopes) / max(-sign * float(at(top, 2)), 1e-300)
        values.append(fit.mean + float(at(top)) - sign * min(excess, error))
    return Extremes(values[0], values[1], correction * (scores @ scores.T), max(cycle.groups - 1, 1))


def _scores(cycle: Cycle, weights: FloatArray) -> FloatArray:
    """What each group of cycles adds to the deviation of a weighted level, shape (groups,)."""
    return np.asarray((cycle.sums - cycle.counts * cycle.levels) @ (weights / cycle.counts.sum(axis=0)))


def _places(half: Cycle) -> list[float]:
    """Phases near which the largest and the smallest level lie, as one half of the cycles tells it. [cycles]"""
    m = half.size
    counts = half.counts.sum(axis=0)
    single = half.levels
    noise = max(half.noise, _QUIETEST * float(np.ptp(single)))
    single_error = noise / np.sqrt(counts)
    levels, variances = scipy.fft.rfft(single), scipy.fft.rfft(single_error**2)
    means, errors = [], []
    for shape, steps_back in _STEPS_BACK.items():
        widths = _widths(m, shape)
        below, above = single - _CONTRADICTION * single_error, single + _CONTRADICTION * single_error
        alive = np.ones(m, dtype=bool)
        ladder: list[tuple[FloatArray, FloatArray]] = []
        reached = np.zeros(m, dtype=int)
        for step, width in enumerate(widths):
            kernel = _kernel(m, width, shape)
            mean = _correlate(levels, kernel)
            error = np.sqrt(np.maximum(_correlate(variances, kernel**2), 0.0))
            below = np.maximum(below, mean - _CONTRADICTION * error)
            above = np.minimum(above, mean + _CONTRADICTION * error)
            alive &= below <= above
            ladder.append((mean, error))
            if not alive.any():
                break
            reached[alive] = step
        chosen = np.maximum(reached - steps_back, 0)
        means.append(_pick(ladder, chosen, 0))
        errors.append(_pick(ladder, chosen, 1))
    kind = np.argmin(errors, axis=0)
    every = np.arange(m)
    mean, error = np.array(means)[kind, every], np.array(errors)[kind, every]
    tops = (int(np.argmax(sign * mean - 2.0 * error)) for sign in (1.0, -1.0))
    return [top / m for top in tops]


def _pick(ladder: list[tuple[FloatArray, FloatArray]], chosen: np.ndarray, which: int) -> FloatArray:
    return np.asarray(np.array([row[which] for row in ladder])[chosen, np.arange(chosen.size)])


def _correlate(transform: ComplexArray, kernel: FloatArray) -> FloatArray:
    return np.asarray(scipy.fft.irfft(transform * scipy.fft.rfft(kernel).conj(), kernel.size))


@cache
def _kernel(bins: int, width: int, shape: str) -> FloatArray:
    """Weights of a least-squares shape over a window, read at bin 0, shape (bins,)."""
    first = {"right": 0, "left": 1 - width}.get(shape, -(width // 2))
    offsets = np.arange(first, first + width)
    x = offsets / max(width, 2)
    curves = {"parabola": [x, x * x], "hinge": [np.minimum(x, 0), np.maximum(x, 0)]}.get(shape, [])
    kernel = np.zeros(bins)
    kernel[offsets % bins] = np.linalg.pinv(np.column_stack([np.ones(width), *curves]))[0]
    kernel.flags.writeable = False
    return kernel


def _widths(bins: int, shape: str) -> list[int]:
    """Widths of the windows, each a quarter more than the one before, up to half a cycle."""
    widths: list[int] = []
    width = 5.0 if shape in ("parabola", "hinge") else 1.0
    while width <= max(1, bins // 2):
        whole = int(width)
        whole += (whole + 1) % 2 if shape not in ("left", "right") else 0
        if (not widths or whole > widths[-1]) and whole <= bins:
            widths.append(whole)
        width *= 1.25
    return widths or [1]
