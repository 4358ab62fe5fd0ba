"""Edges of a cycle: how long they take, and the exponential tail behind them."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from flicker.trace import FloatArray

_GRID = 60  # times tried for a tail
_PIECES = 24  # in which a fit is judged
_FEWEST = 8  # bins of a tail
_FASTEST = 1.5  # 1/e time of a tail [bins]
_SLOWEST = 8.0  # 1/e time of a tail over the stretch that is seen of it
_CLEAR = 15.0  # fall of a tail over the standard error of a bin
_ROUNDED = 0.2  # of the swing: so far the sensor may round the edge before a tail
_LARGEST = 50.0  # exponent
_STARTS = (0.9, 0.6, 0.4, 0.25, 0.15, 0.1)  # of the swing, from which a tail may begin


@dataclass(frozen=True, slots=True)
class Edge:
    """A rise or a fall between the two ends of a cycle, in bins; `low` and `high` are the levels of the ends."""

    middle: float  # crossing of the middle level
    width: float  # from 10 to 90 % of the swing
    low: float
    high: float


def plateaus(levels: FloatArray) -> tuple[float, float]:
    """
    Typical level of the lower and the upper end of the swing.

    The outer quantiles of what lies below and above the middle: where a slow tail has come to rest, but not the short
    swing beyond it of an edge that rings.
    """
    middle = 0.5 * (float(levels.max()) + float(levels.min()))
    return float(np.quantile(levels[levels <= middle], 0.15)), float(np.quantile(levels[levels >= middle], 0.85))


def between(levels: FloatArray) -> float:
    """Share of the cycle between 10 and 90 % of the swing from end to end."""
    low, high = plateaus(levels)
    tenth = 0.1 * (high - low)
    return float(np.mean((levels > low + tenth) & (levels < high - tenth)))


def steepest_rise(levels: FloatArray) -> Edge | None:
    """
    Find the steepest rise of a cycle from 10 to 90 % of its swing.

    Parameters
    ----------
    levels : ndarray, shape (m,)
        One cycle.

    Returns
    -------
    Edge or None
        None where the light never goes the whole way.

    Notes
    -----
    A rise runs from the last crossing of 10 % to the first crossing of 90 % after it (transition duration, IEC
    60469:2013, from memory), between neighbouring bins on a straight line.
    """
    low, high = plateaus(levels)
    if not high > low:
        return None
    shift = int(np.argmin(levels))
    share = (np.roll(levels, -shift) - low) / (high - low)
    share = np.append(share, share[0])
    best: Edge | None = None
    begin = None
    for at in range(1, share.size):
        if share[at - 1] <= 0.1 < share[at]:
            begin = at - 1 + (0.1 - share[at - 1]) / (share[at] - share[at - 1])
        if begin is not None and share[at - 1] < 0.9 <= share[at]:
            end = at - 1 + (0.9 - share[at - 1]) / (share[at] - share[at - 1])
            if best is None or end - begin < best.width:
                best = Edge((shift + 0.5 * (begin + end)) % levels.size, end - begin, low, high)
            begin = None
    return best


def smoothed_rise(levels: FloatArray) -> Edge | None:
    """Steepest rise, read once more after averaging over an eighth of it, so that noise does not cross first."""
    rough = steepest_rise(levels)
    if rough is None or rough.width < 16:
        return rough
    half = int(rough.width / 16)
    wide = np.concatenate([levels[-half:], levels, levels[:half]])
    return steepest_rise(np.convolve(wide, np.full(2 * half + 1, 1.0 / (2 * half + 1)), "valid"))


@dataclass(frozen=True, slots=True)
class Tail:
    """Where a cycle falls exponentially: bins `first` to `last`, counted from `turn` on, and the 1/e time in bins."""

    turn: int
    first: int
    last: int
    time: float

    def time_of(self, levels: FloatArray) -> float:
        """1/e time of the same stretch of a cycle that differs little. [bins]"""
        part = np.roll(levels, -self.turn)[self.first : self.last]
        return _fit_tail(part, np.geomspace(0.1 * self.time, 10.0 * self.time, 25)).time


def decay_tail(levels: FloatArray, noise: float) -> Tail | None:
    """
    Find the exponential tail behind the fall of a cycle.

    Parameters
    ----------
    levels : ndarray, shape (m,)
        One cycle.
    noise : float
        Standard error of a bin.

    Returns
    -------
    Tail or None
        The longest stretch before the next rise that an exponential describes to within the noise or 0.7 % of its
        fall; None where there is none that bends, or where the light went down to it more slowly than the exponential
        itself would have: the foot of a slow sine is no tail.

    Notes
    -----
    Least squares; asymptote and swing are solved for at each trial time (variable projection, Golub and Pereyra, SIAM
    J. Numer. Anal. 10 (1973) 413).
    """
    low, high = float(levels.min()), float(levels.max())
    turn = _onset_of_rise(levels, noise)
    fall = np.roll(levels, -turn)
    peak = int(np.argmax(fall))
    for start in _STARTS:
        below = np.flatnonzero(fall[peak:] <= low + start * (high - low))
        first = peak + int(below[0]) + 1 if below.size else fall.size
        part = fall[first : fall.size - 1]
        if part.size < _FEWEST:
            continue
        fit = _fit_tail(part, np.geomspace(0.5, 20.0 * part.size, _GRID))
        drop = abs(fit.swing) * -math.expm1(-part.size / fit.time)
        bends = _FASTEST <= fit.time <= _SLOWEST * part.size and fit.swing > 0
        bent = fit.left[: max(_FEWEST, int(4.0 * fit.time))]
        quiet = 1.3 * noise * min(1.0, (_PIECES / bent.size) ** 0.5)
        follows = bends and _follows_an_edge(fall, fit, first, peak, low + _STARTS[0] * (high - low))
        if follows and drop > _CLEAR * noise and _misfit(bent) < max(quiet, 0.007 * drop):
            return Tail(turn, first, fall.size - 1, fit.time)
    return None


def _follows_an_edge(fall: FloatArray, fit: _Exponential, first: int, peak: int, top: float) -> bool:
    """Whether the light fell from `top` to the start of the stretch at least as fast as the exponential would have."""
    begin = peak + int(np.argmax(fall[peak:] <= top))
    earlier = fit.swing * math.expm1(min((first - begin) / fit.time, _LARGEST))
    return float(fall[first]) + earlier <= top + _ROUNDED * float(np.ptp(fall))


def _onset_of_rise(levels: FloatArray, noise: float) -> int:
    """Bin of the darkest moment before the light rises most steeply, the last one within the noise."""
    step = max(1, levels.size // 200)
    steepest = int(np.argmax(np.roll(levels, -step) - levels))
    before = np.roll(levels, levels.size - 1 - steepest)  # the last bin is where the rise is steepest
    half = before[before.size // 2 :]
    darkest = np.flatnonzero(half <= half.min() + 2.0 * noise)
    return (steepest + 1 - (half.size - int(darkest[-1]))) % levels.size


@dataclass(frozen=True, slots=True, eq=False)
class _Exponential:
    time: float  # [bins]
    swing: float
    left: FloatArray  # deviations

    @property
    def misfit(self) -> float:
        return float(self.left @ self.left)


def _misfit(left: FloatArray) -> float:
    """Root mean square of deviations averaged in a few pieces: noise has mostly gone, a wrong shape has not."""
    edges = np.linspace(0, left.size, min(_PIECES, left.size) + 1).astype(int)
    pieces = np.add.reduceat(left, edges[:-1]) / np.diff(edges)
    return float(np.sqrt(np.mean(pieces**2)))


def _fit_tail(part: FloatArray, tried: FloatArray) -> _Exponential:
    times = np.arange(part.size, dtype=float)
    deviation = part - part.mean()

    def fitted(time: float) -> _Exponential:
        curve = np.exp(-times / time)
        curve -= curve.mean()
        swing = float(curve @ deviation / max(curve @ curve, 1e-300))
        return _Exponential(time, swing, deviation - swing * curve)

    for _ in range(5):
        fits = [fitted(time) for time in tried.tolist()]
        best = min(range(len(fits)), key=lambda place: fits[place].misfit)
        tried = np.geomspace(tried[max(best - 1, 0)], tried[min(best + 1, tried.size - 1)], 13)
    return fits[best]
