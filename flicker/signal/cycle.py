"""The mean cycle: every sample folded on the period, with what one cycle differs from the next."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator
from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt

from flicker.errors import NotMeasurable
from flicker.signal.harmonics import Series, longest_gap
from flicker.signal.intervals import student_quantile
from flicker.signal.track import Track
from flicker.trace import FloatArray

_MOST_BINS = 2048
_MOST_GROUPS = 24
_FINE = 1 << 14
_JUMP = 0.15  # of the swing, from one phase to the next: an edge
_MOST_JUMPS = 64


@dataclass(frozen=True, slots=True, eq=False)
class Cycle:
    """
    The mean cycle of a periodic light in equal bins of phase, kept apart in groups of neighbouring cycles.

    Rows of `sums` and `counts` are the groups, columns the bins; the spread between groups is what intervals rest on.
    Each bin is kept in finer parts too, which may be empty.
    """

    frequency: float  # [Hz]
    fine_sums: FloatArray  # shape (groups, m * parts)
    fine_counts: FloatArray  # shape (groups, m * parts)
    sums: FloatArray  # shape (groups, m)
    counts: FloatArray  # shape (groups, m)
    noise: float  # standard deviation of single samples about the mean cycle, away from edges
    span: float  # from the first to the last sample [s]
    first_phase: float  # phase of the first bin's centre at time 0 [cycles]
    edges: npt.NDArray[np.bool_]  # bins inside which the light jumps, shape (m,)

    @property
    def groups(self) -> int:
        """How many groups of cycles."""
        return int(self.sums.shape[0])

    @property
    def size(self) -> int:
        """Number of bins m."""
        return int(self.sums.shape[1])

    @property
    def phase(self) -> FloatArray:
        """Phases of the bins' centres, from 0, shape (m,). [cycles]"""
        return np.arange(self.size) / self.size

    @property
    def levels(self) -> FloatArray:
        """Mean cycle in the unit of the trace, shape (m,)."""
        return np.asarray(self.sums.sum(axis=0) / self.counts.sum(axis=0))

    @property
    def mean(self) -> float:
        """Mean level over whole cycles, in the unit of the trace."""
        return float(self.levels.mean())

    @property
    def light(self) -> FloatArray:
        """Mean cycle over its mean level, shape (m,); `NotMeasurable` where nothing is above dark."""
        if not self.mean > 0:
            raise NotMeasurable("the mean level is not above dark: check --dark-level and --inverted")
        return np.asarray(self.levels / self.mean)

    @property
    def standard_error(self) -> FloatArray:
        """Standard error of `levels` for white noise, shape (m,)."""
        return np.asarray(self.noise / np.sqrt(self.counts.sum(axis=0)))

    def distribution(self, levels: FloatArray) -> tuple[FloatArray, FloatArray]:
        """
        Levels and the shares of the period that the light spends on them.

        A bin with an edge inside is no level of its own: its mean tells how its neighbours' levels share it.

        Parameters
        ----------
        levels : ndarray, shape (m,)
            As `levels`, or without one group.

        Returns
        -------
        (ndarray, ndarray), shapes (m,)
            Levels and shares; the shares add up to 1.
        """
        shares = np.full(self.size, 1.0 / self.size)
        for place in np.flatnonzero(self.edges):
            before, after = place - 1, (place + 1) % self.size
            step = levels[after] - levels[before]
            if self.edges[before] or self.edges[after] or step == 0.0:
                continue
            late = float(np.clip((levels[place] - levels[before]) / step, 0.0, 1.0))
            shares[after] += late / self.size
            shares[before] += (1 - late) / self.size
            shares[place] = 0.0
        return levels, shares

    def part(self, groups: slice) -> Cycle:
        """Cycle of some of the groups; every second one, say. A bin that they did not see borrows one mean sample."""
        sums, counts = self.sums[groups], self.counts[groups]
        unseen = counts.sum(axis=0) == 0
        if unseen.any():
            sums, counts = sums.copy(), counts.copy()
            sums[0, unseen], counts[0, unseen] = self.levels[unseen], 1.0
        fine_sums, fine_counts = self.fine_sums[groups], self.fine_counts[groups]
        return replace(self, fine_sums=fine_sums, fine_counts=fine_counts, sums=sums, counts=counts)

    def interval(self, figure: Callable[[FloatArray], float]) -> tuple[float, float]:
        """
        Value of a smooth figure of the mean cycle, and its standard error times Student's t for 95 %.

        Parameters
        ----------
        figure : callable
            Maps levels, shape (m,), to a number.

        Returns
        -------
        (float, float)
            The value and half the width of its 95 % interval.

        Notes
        -----
        Jackknife over groups of neighbouring cycles (Tukey 1958): each group is left out once. A group's bin that no
        sample fell into keeps the mean of the others. An edge may lie anywhere between the last phase seen before it
        and the first one after: its place is uniform there, independent of all others.
        """
        total, number = self.sums.sum(axis=0), self.counts.sum(axis=0)
        value = figure(total / number)
        if self.groups < 2:
            return value, float("nan")
        left = []
        for sums, counts in zip(self.sums, self.counts, strict=True):
            alone = counts >= number  # only this group saw the bin: leave it in
            left.append(figure(np.where(alone, total, total - sums) / np.where(alone, number, number - counts)))
        spread = (self.groups - 1) / self.groups * float(np.sum((np.array(left) - np.mean(left)) ** 2))
        by_edges = sum((figure(moved) - value) ** 2 for moved in self._moved_edges(total / number))
        return value, math.hypot(student_quantile(self.groups - 1) * spread**0.5, 1.96 * by_edges**0.5)

    def _moved_edges(self, levels: FloatArray) -> Iterator[FloatArray]:
        """Levels with one edge after the other moved by the standard deviation of its place."""
        cells = self.fine_sums.shape[1]
        counts = self.fine_counts.sum(axis=0)
        seen = np.flatnonzero(counts)
        means, counts = self.fine_sums.sum(axis=0)[seen] / counts[seen], counts[seen]
        step = np.roll(means, -1) - means
        error = self.noise * np.sqrt(1 / counts + 1 / np.roll(counts, -1))
        jumps = np.flatnonzero(np.abs(step) > np.maximum(8 * error, _JUMP * np.ptp(levels)))
        for place in jumps[:_MOST_JUMPS].tolist():
            after = seen[(place + 1) % seen.size]
            gap = (after - seen[place]) % cells / cells
            moved = levels.copy()
            moved[after * self.size // cells] -= step[place] * gap * self.size / math.sqrt(12)
            yield moved


def fold(series: Series, frequency: float, *, track: Track | None = None, most_bins: int = _MOST_BINS) -> Cycle:
    """
    Fold a signal on its period.

    Parameters
    ----------
    series : Series
        Readings above dark.
    frequency : float
        Of the cycle. [Hz]
    track : Track, optional
        Of the phase, where the frequency wanders.
    most_bins : int
        Bins of phase at the most; fewer where samples are few, or where a sample rate that is nearly a multiple
        of the frequency leaves phases that no sample has seen.

    Returns
    -------
    Cycle
        No bin is empty in either half of the groups.

    Raises
    ------
    NotMeasurable
        If less than one and a half cycles are there.
    """
    cycles = series.span * frequency
    if cycles < 1.5:
        raise NotMeasurable(f"the capture holds {cycles:.2g} cycles: record at least two, better ten")
    groups = max(2, min(_MOST_GROUPS, int(cycles)))
    fine = np.zeros(_FINE)
    for _, times in series.chunks():
        fine += np.bincount(_index(_phase(series, times, frequency, track), _FINE), minlength=_FINE)
    bins = int(min(most_bins, max(2, series.values.size // 8), _phases_seen(fine)))
    first = float((series.segments[0].start - series.centre) * frequency) - 0.5 / bins
    while True:
        parts = max(_FINE // bins, 1)
        fine_sums, fine_counts, square = _group_sums(series, frequency, track, first, groups, bins, parts)
        sums, counts = (fine.reshape(groups, bins, parts).sum(axis=2) for fine in (fine_sums, fine_counts))
        if bins <= 2 or (counts[::2].sum(axis=0).min() > 0 and counts[1::2].sum(axis=0).min() > 0):
            break
        bins = max(2, min(bins - 1, int(bins * 0.93)))
        first = float((series.segments[0].start - series.centre) * frequency) - 0.5 / bins
    levels = sums.sum(axis=0) / np.maximum(counts.sum(axis=0), 1)
    squares = np.maximum(square - levels * sums.sum(axis=0), 0.0)
    noise = _noise(squares, counts.sum(axis=0))
    edges = _edges(levels, squares, counts.sum(axis=0), noise)
    offset = (0.5 / bins + first + series.centre * frequency) % 1.0
    return Cycle(frequency, fine_sums, fine_counts, sums, counts, noise, series.span, offset, edges)


def _phases_seen(counts: FloatArray) -> float:
    """Number of phases that samples tell apart: those they fall on, where these are few, else one a longest gap."""
    filled = counts > 0
    groups = int(np.count_nonzero(filled & ~np.roll(filled, 1)))
    gap = longest_gap(counts)
    return groups if 0.8 < groups * gap < 1.1 else 1.0 / max(gap, 1.0 / counts.size)


def _noise(squares: FloatArray, counts: FloatArray) -> float:
    """
    Noise of single samples from the spread inside bins: a median, which the few bins that hold an edge do not move.

    The median of a chi-squared variance of k degrees of freedom is about (1 - 2 / (9 k))**3 (Wilson, Hilferty 1931).
    """
    freedom = counts - 1
    if not (freedom > 0).any():
        return 0.0
    variances = squares[freedom > 0] / freedom[freedom > 0]
    typical = float(np.quantile(freedom[freedom > 0], 0.5))
    return float(np.sqrt(np.quantile(variances, 0.5) / (1 - 2 / (9 * typical)) ** 3))


def _edges(levels: FloatArray, squares: FloatArray, counts: FloatArray, noise: float) -> npt.NDArray[np.bool_]:
    """Find the bins whose samples differ by more than noise and whose neighbours lie on either side of them."""
    freedom = np.maximum(counts - 1, 1)
    restless = squares / freedom > noise**2 * (1 + 5 * np.sqrt(2 / freedom))
    before, after = np.roll(levels, 1), np.roll(levels, -1)
    between = (levels - before) * (after - levels) > 0
    return np.asarray(restless & between & (np.abs(after - before) > 8 * noise / np.sqrt(counts)))


def _phase(series: Series, times: FloatArray, frequency: float, track: Track | None) -> FloatArray:
    steady = times * frequency
    return steady if track is None else steady + track.at(times + series.centre)


def _index(phase: FloatArray, bins: int) -> np.ndarray:
    return np.minimum(((phase - np.floor(phase)) * bins).astype(np.intp), bins - 1)


def _group_sums(
    series: Series, frequency: float, track: Track | None, first: float, groups: int, bins: int, parts: int
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Sums and counts by group and part of a bin, shape (groups, bins * parts); sums of squares by bin, (bins,)."""
    cells = bins * parts
    sums, counts, square = np.zeros(groups * cells), np.zeros(groups * cells), np.zeros(bins)
    begin = series.segments[0].start - series.centre
    per_second = groups / series.span
    for part, times in series.chunks():
        values = series.values[part]
        group = np.minimum(((times - begin) * per_second).astype(np.intp), groups - 1)
        index = _index(_phase(series, times, frequency, track) - first, cells)
        cell = group * cells + index
        sums += np.bincount(cell, values, minlength=groups * cells)
        counts += np.bincount(cell, minlength=groups * cells)
        square += np.bincount(index // parts, values * values, minlength=bins)
    return sums.reshape(groups, cells), counts.reshape(groups, cells), square
