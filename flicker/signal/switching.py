"""The frequency of a light that is switched: every sample beside an edge says on which side of it it lies."""

from __future__ import annotations

import dataclasses
from collections.abc import Callable

import numpy as np

from flicker.signal.harmonics import HarmonicFit, Series, refit
from flicker.trace import FloatArray

_TABLE = 1 << 14
_MOST_EDGES = 16
_FEWEST_HARMONICS = 8  # that a light which jumps shows
_EMPTY = 0.25  # of the swing, about its middle: no sample of a light that jumps lies there
_WIDEST = 0.4  # of the way to the next edge
_BISECTIONS = 60
_FEWEST = 3  # samples beside one edge


def sharpen(series: Series, fit: HarmonicFit) -> HarmonicFit:
    """
    Refine the frequency of a light that jumps between two levels.

    Parameters
    ----------
    series : Series
        The signal, other families taken off.
    fit : HarmonicFit
        Its harmonics, the frequency near enough to tell the edges of neighbouring cycles apart.

    Returns
    -------
    HarmonicFit
        The fit as it was where the light does not jump, or where edges jitter by more than samples show.

    Notes
    -----
    Lines beyond the fitted ones make harmonics a poor ruler for edges faster than the samples. What samples do say is
    exact: this one was before the edge, that one after it. With time `t` and phase `d` from where the edge is expected,
    every sample after an edge keeps `d + t df > de`, every one before it `d + t df < de`; all pairs (df, de) that keep
    all of them are equally likely. The frequency is the middle of what is possible, and its interval all of it (linear
    inequalities, by hand).
    """
    if fit.amplitudes.size < _FEWEST_HARMONICS:
        return fit
    table = fit.table(_TABLE)
    low, high = np.quantile(table, [0.03, 0.97])
    middle = 0.5 * (low + high)
    above = table > middle
    edges = np.flatnonzero(above != np.roll(above, 1))
    if not 2 <= edges.size <= _MOST_EDGES:
        return fit
    apart = np.diff(np.append(edges, edges[0] + _TABLE)) / _TABLE
    reach = min(_WIDEST * float(apart.min()), 8.0 * fit.frequency_error * series.span + 4.0 / fit.amplitudes.size)
    places = edges / _TABLE  # boundaries between two entries of the table, whose centres lie half an entry off
    constraints = []
    for (offsets, times, values), up in zip(_beside(series, fit, places, reach), above[edges].tolist(), strict=True):
        if (np.abs(values - middle) < _EMPTY * (high - low)).any():
            return fit  # the light passes through the middle: it does not jump
        after = (values > middle) == up
        if min(np.count_nonzero(after), np.count_nonzero(~after)) < _FEWEST:
            return fit
        constraints.append(((offsets[after], times[after]), (offsets[~after], times[~after])))

    def room(change: float) -> float:
        return min(
            float(np.min(late + change * t_late) - np.max(early + change * t_early))
            for (late, t_late), (early, t_early) in constraints
        )

    most = reach / series.span
    best = _peak(room, -most, most)
    if not room(best) > 0:
        return fit
    ends = [_end(room, best, limit) for limit in (-most, most)]
    frequency = fit.frequency + 0.5 * (ends[0] + ends[1])
    error = 0.25 * (ends[1] - ends[0])
    return dataclasses.replace(refit(series, frequency, fit.amplitudes.size, fit.track), frequency_error=error)


def _beside(
    series: Series, fit: HarmonicFit, places: FloatArray, reach: float
) -> list[tuple[FloatArray, FloatArray, FloatArray]]:
    """Phases from an edge [cycles], times from the centre [s] and values of the samples beside each edge."""
    found: list[list[tuple[FloatArray, FloatArray, FloatArray]]] = [[] for _ in places]
    for part, times in series.chunks():
        phase = fit.phase(times + series.centre)
        phase -= np.floor(phase)
        for rows, place in zip(found, places.tolist(), strict=True):
            near = np.flatnonzero(np.abs(np.abs(phase - place) - 0.5) > 0.5 - reach)
            rows.append(((phase[near] - place + 0.5) % 1.0 - 0.5, times[near], series.values[part][near]))
    columns = [[np.concatenate(column) for column in zip(*rows, strict=True)] for rows in found]
    return [(offsets, times, values) for offsets, times, values in columns]


def _peak(function: Callable[[float], float], low: float, high: float) -> float:
    """Place of the largest value of a concave function: golden section."""
    share = 0.5 * (5**0.5 - 1)
    inner = [high - share * (high - low), low + share * (high - low)]
    values = [function(place) for place in inner]
    for _ in range(_BISECTIONS):
        if values[0] > values[1]:
            high = inner[1]
            inner, values = [high - share * (high - low), inner[0]], [0.0, values[0]]
            values[0] = function(inner[0])
        else:
            low = inner[0]
            inner, values = [inner[1], low + share * (high - low)], [values[1], 0.0]
            values[1] = function(inner[1])
    return 0.5 * (low + high)


def _end(function: Callable[[float], float], inside: float, outside: float) -> float:
    """Where a concave function that is positive inside comes down to zero; the limit where it does not."""
    if function(outside) > 0:
        return outside
    for _ in range(_BISECTIONS):
        between = 0.5 * (inside + outside)
        inside, outside = (between, outside) if function(between) > 0 else (inside, between)
    return inside
