"""The largest and the smallest level of a cycle, without what noise adds to a maximum."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

import numpy as np
import scipy.fft

from flicker.light import ComplexArray
from flicker.signal.cycle import Cycle
from flicker.signal.intervals import student_quantile
from flicker.trace import FloatArray

_CONTRADICTION = 2.5  # standard errors by which a wide window may differ from a narrower one
_STEPS_BACK = (
    2  # from the widest window not contradicted: its bias is of the size of its error, that of a narrower is not
)
_KINDS = ((0, "right"), (0, "left"), (0, "about"), (1, "right"), (1, "left"), (2, "about"))  # degree, side


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


def extremes(cycle: Cycle) -> Extremes:
    """
    Read the largest and the smallest level of a mean cycle.

    Parameters
    ----------
    cycle : Cycle
        Light above dark.

    Returns
    -------
    Extremes

    Notes
    -----
    The largest of noisy values only ever lies too high. So the cycles are split in two halves: one half says where the
    extreme lies and over how wide a window it may be averaged, the other half what the level is there, and the other
    way round; what selection adds falls away. A window may be as wide as the narrower ones do not contradict
    (intersection of confidence intervals; Goldenshluger and Nemirovski, Math. Methods Statist. 6 (1997) 135), to the
    left, to the right or about the place, so that a plateau is averaged and an edge is not. The interval comes from the
    spread between groups of neighbouring cycles.
    """
    halves = cycle.part(slice(0, None, 2)), cycle.part(slice(1, None, 2))
    places = [_places(half) for half in halves]
    values, scores = [], np.zeros((2, cycle.groups))
    for row, which in zip(scores, ("high", "low"), strict=True):
        here = _Reading(halves[1], places[0][which])
        there = _Reading(halves[0], places[1][which])
        values.append(0.5 * (here.level + there.level))
        row[1::2] += 0.5 * here.scores
        row[0::2] += 0.5 * there.scores
    correction = cycle.groups / max(cycle.groups - 1, 1)
    return Extremes(values[0], values[1], correction * (scores @ scores.T), max(cycle.groups - 2, 1))


class _Reading:
    """Weighted level of some bins in one half of the cycles, and what each group adds to its deviation."""

    def __init__(self, half: Cycle, weights: FloatArray) -> None:
        counts = half.counts.sum(axis=0)
        levels = half.sums.sum(axis=0) / counts
        self.level = float(weights @ levels)
        self.scores = (half.sums - half.counts * levels) @ (weights / counts)


def _places(half: Cycle) -> dict[str, FloatArray]:
    """Weights over the bins that read the largest and the smallest level of one half, each of shape (m,)."""
    m = half.size
    counts = half.counts.sum(axis=0)
    single, single_error = half.sums.sum(axis=0) / counts, half.noise / np.sqrt(counts)
    levels, variances = scipy.fft.rfft(single), scipy.fft.rfft(single_error**2)
    means, errors, kernels = [], [], []
    for degree, side in _KINDS:
        widths = _widths(m, degree, side)
        below, above = single - _CONTRADICTION * single_error, single + _CONTRADICTION * single_error
        alive = np.ones(m, dtype=bool)
        ladder: list[tuple[FloatArray, FloatArray]] = []
        reached = np.zeros(m, dtype=int)
        for step, width in enumerate(widths):
            kernel = _kernel(m, width, degree, side)
            mean = _correlate(levels, kernel)
            error = np.sqrt(np.maximum(_correlate(variances, kernel**2), 0.0))
            below = np.maximum(below, mean - _CONTRADICTION * error)
            above = np.minimum(above, mean + _CONTRADICTION * error)
            alive &= below <= above
            ladder.append((mean, error))
            if not alive.any():
                break
            reached[alive] = step
        chosen = np.maximum(reached - _STEPS_BACK, 0)
        means.append(_pick(ladder, chosen, 0))
        errors.append(_pick(ladder, chosen, 1))
        kernels.append([(widths[step], degree, side) for step in chosen])
    kind = np.argmin(errors, axis=0)
    every = np.arange(m)
    mean, error = np.array(means)[kind, every], np.array(errors)[kind, every]
    readings = {}
    for which, sign in (("high", 1.0), ("low", -1.0)):
        top = int(np.argmax(sign * mean - 2.0 * error))
        readings[which] = np.roll(_kernel(m, *kernels[kind[top]][top]), top)
    return readings


def _pick(ladder: list[tuple[FloatArray, FloatArray]], chosen: np.ndarray, which: int) -> FloatArray:
    return np.asarray(np.array([row[which] for row in ladder])[chosen, np.arange(chosen.size)])


def _correlate(transform: ComplexArray, kernel: FloatArray) -> FloatArray:
    return np.asarray(scipy.fft.irfft(transform * scipy.fft.rfft(kernel).conj(), kernel.size))


@cache
def _kernel(bins: int, width: int, degree: int, side: str) -> FloatArray:
    """Weights of a least-squares polynomial over a window, read at bin 0, shape (bins,)."""
    first = {"right": 0, "left": 1 - width, "about": -(width // 2)}[side]
    offsets = np.arange(first, first + width)
    basis = np.vander(offsets / max(width, 2), degree + 1, increasing=True)
    kernel = np.zeros(bins)
    kernel[offsets % bins] = np.linalg.pinv(basis)[0]
    kernel.flags.writeable = False
    return kernel


def _widths(bins: int, degree: int, side: str) -> list[int]:
    """Widths of the windows, each a quarter more than the one before, up to half a cycle."""
    widths: list[int] = []
    width = 1.0 if degree == 0 else 2.0 * degree + 1.0
    while width <= max(1, bins // 2):
        whole = int(width)
        whole += (whole + 1) % 2 if side == "about" else 0
        if (not widths or whole > widths[-1]) and whole <= bins:
            widths.append(whole)
        width *= 1.25
    return widths or [1]
