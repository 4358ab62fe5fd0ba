"""Cycle by cycle: where a periodic light stands still for a while."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from flicker.signal.harmonics import HarmonicFit, Series
from flicker.trace import FloatArray

_FEWEST_SAMPLES = 6.0  # of a cycle, that tell whether it moves
_FEWEST_CYCLES = 10
_STILL = 0.05  # of the usual variance within a cycle
_MOVING = 0.6
_CLEAR = 10.0  # times twice the noise's variance that a cycle must have
_ENOUGH = 1 << 16  # samples that tell the noise
_TABLE = 256
_WINDOW = 24  # of the table, in which the cycle is looked at for its quietest part


@dataclass(frozen=True, slots=True)
class Pauses:
    """Runs of whole cycles in which the light does not move, in order of time."""

    starts: FloatArray  # shape (r,) [s]
    cycles: FloatArray  # length of each, shape (r,)
    seconds: FloatArray  # length of each, shape (r,) [s]
    share: float  # of all cycles


def find_pauses(series: Series, fit: HarmonicFit) -> Pauses | None:
    """
    Look at each cycle of a light for itself.

    Parameters
    ----------
    series : Series
        The light.
    fit : HarmonicFit
        Of its periodic part.

    Returns
    -------
    Pauses or None
        None where all cycles move alike, or where they cannot be told apart: too few samples or cycles, too much
        noise, or a depth that comes and goes smoothly, as where two lights beat.

    Notes
    -----
    A cycle stands still when the variance of its samples, less that of the noise, is below a twentieth of the usual.
    Cycles are parted in the quietest stretch of the mean cycle, so that no pulse is cut in two.
    """
    if fit.frequency * _FEWEST_SAMPLES > series.sample_rate:
        return None
    numbers, counts, variances = _by_cycle(series, fit, _quietest(fit))
    whole = counts > 0.9 * series.sample_rate / fit.frequency
    if np.count_nonzero(whole) < _FEWEST_CYCLES:
        return None
    usual = float(np.quantile(variances[whole], 0.9))
    noise = 2.0 * _noise(series) ** 2
    if usual <= _CLEAR * noise:
        return None
    ratio = (variances - noise) / usual
    still = whole & (ratio < _STILL)
    between = int(np.count_nonzero(whole & (ratio >= _STILL) & (ratio < _MOVING)))
    edges = np.flatnonzero(np.diff(np.concatenate([[0], still.astype(np.int8), [0]])))
    first, last = edges[::2], edges[1::2]
    if first.size == 0 or between > 2 * first.size + 1:
        return None
    starts = (numbers[first] + _quietest(fit)) / fit.frequency + fit.centre
    length = (last - first).astype(float)
    return Pauses(starts, length, length / fit.frequency, float(still.sum()) / float(whole.sum()))


def _noise(series: Series) -> float:
    """Standard deviation of the noise, from neighbouring samples, which light between its edges hardly moves."""
    steps = np.abs(np.diff(series.values[:_ENOUGH]))
    return float(np.median(steps) / (0.6745 * np.sqrt(2.0)))


def _quietest(fit: HarmonicFit) -> float:
    """Phase of the middle of the stretch in which the mean cycle moves least. [cycles]"""
    table = fit.table(_TABLE)
    windows = np.lib.stride_tricks.sliding_window_view(np.concatenate([table, table[: _WINDOW - 1]]), _WINDOW)
    place = int(np.argmin(windows.max(axis=1) - windows.min(axis=1)))
    return (place + 0.5 * _WINDOW) / _TABLE


def _by_cycle(series: Series, fit: HarmonicFit, first: float) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Number of each cycle that holds samples, from the centre, how many, and their variance; all of shape (c,)."""
    numbers, sums = [], []
    for part, times in series.chunks():
        cycle = np.floor(fit.phase(times + series.centre) - first)
        lowest = float(cycle.min())
        place = (cycle - lowest).astype(np.intp)
        values = series.values[part] - fit.mean
        here = np.array([np.bincount(place, weights) for weights in (None, values, values * values)])
        numbers.append(lowest + np.arange(here.shape[1]))
        sums.append(here)
    found, place = np.unique(np.concatenate(numbers), return_inverse=True)
    whole = np.concatenate(sums, axis=1)
    count, value, square = (np.asarray(np.bincount(place, row), dtype=float) for row in whole)
    samples = np.maximum(count, 1.0)
    return np.asarray(found), count, np.maximum(square / samples - (value / samples) ** 2, 0.0)
