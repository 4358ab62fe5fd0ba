"""The largest and the smallest level of a cycle, without what noise adds to a maximum."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from flicker.signal.cycle import Cycle
from flicker.signal.intervals import student_quantile
from flicker.trace import FloatArray

_CONTRADICTION = 2.5  # standard errors by which a wide window may differ from a narrower one


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
    windows = [_place(half, sign) for sign in (1.0, -1.0) for half in halves]
    (high_a, high_b), (low_a, low_b) = windows[:2], windows[2:]
    first, second = halves
    pairs = (
        (_Reading(second, high_a), _Reading(first, high_b)),
        (_Reading(second, low_a), _Reading(first, low_b)),
    )
    high, low = (0.5 * (one.level + other.level) for one, other in pairs)
    scores = np.zeros((2, cycle.groups))
    for row, (one, other) in zip(scores, pairs, strict=True):
        row[1::2] += 0.5 * one.scores
        row[0::2] += 0.5 * other.scores
    correction = cycle.groups / max(cycle.groups - 1, 1)
    return Extremes(high, low, correction * (scores @ scores.T), max(cycle.groups - 2, 1))


class _Reading:
    """Mean level of some bins in one half of the cycles, and what each group adds to its deviation."""

    def __init__(self, half: Cycle, bins: FloatArray) -> None:
        counts = half.counts.sum(axis=0)
        levels = half.sums.sum(axis=0) / counts
        self.level = float(levels[bins].mean())
        deviation = (half.sums - half.counts * levels) / counts
        self.scores = deviation[:, bins].mean(axis=1)


def _place(half: Cycle, sign: float) -> FloatArray:
    """Bins over which the largest (`sign` 1) or smallest (-1) level of one half may be averaged."""
    counts = half.counts.sum(axis=0)
    levels = sign * half.sums.sum(axis=0) / counts
    m = levels.size
    variance = half.noise**2 / counts
    total = np.concatenate([[0.0], np.cumsum(np.tile(levels, 3))])
    total_variance = np.concatenate([[0.0], np.cumsum(np.tile(variance, 3))])
    index = np.arange(m) + m
    best = (-np.inf, 0, 1)
    for direction in ("right", "left", "about"):
        low, high = np.full(m, -np.inf), np.full(m, np.inf)
        alive = np.ones(m, dtype=bool)
        bound = np.full(m, -np.inf)
        begin_at, width_at = np.zeros(m, dtype=int), np.ones(m, dtype=int)
        for width in _widths(m, odd=direction == "about"):
            begin = index - {"right": 0, "left": width - 1, "about": width // 2}[direction]
            mean = (total[begin + width] - total[begin]) / width
            error = np.sqrt(total_variance[begin + width] - total_variance[begin]) / width
            low = np.maximum(low, mean - _CONTRADICTION * error)
            high = np.minimum(high, mean + _CONTRADICTION * error)
            alive &= low <= high
            if not alive.any():
                break
            bound = np.where(alive, mean - 2.0 * error, bound)
            begin_at, width_at = np.where(alive, begin, begin_at), np.where(alive, width, width_at)
        top = int(np.argmax(bound))
        best = max(best, (float(bound[top]), int(begin_at[top]), int(width_at[top])))
    return np.arange(best[1], best[1] + best[2]) % m


def _widths(bins: int, odd: bool) -> list[int]:
    widths, width = [], 1.0
    while width <= max(1, bins // 2):
        whole = int(width)
        whole += (whole + 1) % 2 if odd else 0
        if not widths or whole > widths[-1]:
            widths.append(whole)
        width *= 1.25
    return widths
