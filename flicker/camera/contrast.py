"""Contrast between the exposures of one frame, or of many, for any light: at one frequency, and over a tolerance."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from flicker.camera import rectangle
from flicker.camera.exposed import COARSE, Blurred, Family, Windows
from flicker.trace import FloatArray

IndexArray = npt.NDArray[np.intp]

_INDEX = (np.arange(COARSE)[:, None] + np.arange(COARSE)[None, :]) % COARSE  # [lag, phase]
STANDS = 60.0  # a light that takes longer than this to move by one cycle against the frames stands still [s]

_CLOSE = 1e-3  # share of the contrast by which lines may miss the deepest pair of phases without a closer look
_SAME = 1e-4  # the same, where the lines themselves are asked for
_STEP = 1.0 / 64.0  # of the exposure in cycles, between the frequencies that are looked at first
_MOST_STEPS = 257
_GOLDEN = (5.0**0.5 - 1.0) / 2.0


def of_blurred(families: Sequence[Blurred], lags: FloatArray | None) -> float:
    r"""
    Largest contrast between two of the exposures that are compared, over all phases of all families.

    Parameters
    ----------
    families : sequence of Blurred
        Deviation that each family leaves in an exposure.
    lags : ndarray or None
        Phase by which each exposure lags the first, shape (d, families), in cycles; None where any phase occurs.

    Returns
    -------
    float
        Contrast (max - min)/(max + min), 0..1.

    Notes
    -----
    Families drift against each other, so each takes any phase in some frame. For a contrast :math:`c` the best
    pair maximises :math:`(1 - c) a - (1 + c) b`, a sum over families; the next :math:`c` is that pair's, until
    it grows no more (Dinkelbach's method for ratios: W. Dinkelbach, Management Science 13 (1967) 492, from memory).
    """
    if not families:
        return 0.0
    if lags is None:
        extremes = [family.extremes() for family in families]
        return ratio(1.0 + sum(high for _, high in extremes), 1.0 + sum(low for low, _ in extremes))
    if lags.size == 0:
        return 0.0
    lags = np.concatenate([lags, -lags])
    found = _fine(families, lags[_nearest(families, lags)])
    if found >= of_blurred(families, None) * (1 - _SAME):
        return found
    return _fine(families, lags[_promising(families, lags)], found)


def ratio(highest: float, lowest: float) -> float:
    """Contrast of two levels; light below nothing, which cut-off lines can feign, counts as none."""
    lowest = max(lowest, 0.0)
    total = highest + lowest
    return float((highest - lowest) / total) if highest - lowest > rectangle.IN_STEP else 0.0


def _nearest(families: Sequence[Blurred], lags: FloatArray) -> IndexArray:
    """Two rows of `lags` that come nearest to the way from the darkest to the brightest phase of each family."""
    missed = np.zeros(len(lags))
    for number, table in enumerate(family.table() for family in families):
        ideal = (int(np.argmax(table)) - int(np.argmin(table))) / table.size
        missed += rectangle.distance_to_whole(lags[:, number] - ideal)
    return np.argsort(missed, kind="stable")[:2]


def _promising(families: Sequence[Blurred], lags: FloatArray) -> IndexArray:
    """Rows of `lags` that give the deepest contrast on a coarse grid, best first."""
    tables = [table[:: table.size // COARSE] for table in (family.table() for family in families)]
    bins = np.round(lags * COARSE).astype(int) % COARSE
    shifted = [table[_INDEX] for table in tables]
    found = 0.0
    for _ in range(30):
        scores = [(1 - found) * there - (1 + found) * table for table, there in zip(tables, shifted, strict=True)]
        phases = [score.argmax(axis=1) for score in scores]
        deepest = [score[np.arange(COARSE), phase] for score, phase in zip(scores, phases, strict=True)]
        total = sum(best[bins[:, number]] for number, best in enumerate(deepest))
        row = int(np.argmax(total))
        high = low = 1.0
        for number, table in enumerate(tables):
            lag = bins[row, number]
            phase = int(phases[number][lag])
            high += table[(phase + lag) % COARSE]
            low += table[phase]
        better = ratio(high, low)
        if better <= found + 1e-12:
            break
        found = better
    return _different(bins, np.argsort(-np.asarray(total), kind="stable"), 12)


def _different(bins: IndexArray, order: IndexArray, most: int) -> IndexArray:
    """Take the first rows of `order`, but few that share all bins."""
    chosen: list[int] = []
    seen: dict[tuple[int, ...], int] = {}
    for row in order[: 40 * most]:
        key = tuple(bins[row])
        seen[key] = seen.get(key, 0) + 1
        if seen[key] <= 4:
            chosen.append(int(row))
        if len(chosen) == 3 * most:
            break
    return np.array(chosen)


def _fine(families: Sequence[Blurred], lags: FloatArray, found: float = 0.0) -> float:
    """Contrast on a fine grid with corners, for a few lags only; at least `found`."""
    for row in lags:
        pairs = [family.pair(lag) for family, lag in zip(families, row, strict=True)]
        for _ in range(30):
            high = low = 1.0
            for here, there in pairs:
                phase = int(np.argmax((1 - found) * there - (1 + found) * here))
                high, low = high + there[phase], low + here[phase]
            better = ratio(high, low)
            if better <= found + 1e-12:
                break
            found = better
    return found


@dataclass(frozen=True, slots=True, eq=False)
class Bound:
    """Largest contrast over a tolerance if any phase occurs, with the frequencies looked at, over the stated one."""

    scales: FloatArray
    scale: float  # that of the largest
    contrast: float


def bound(families: Sequence[Family], seen: Windows, tolerance: float) -> Bound:
    """Find the largest contrast over a tolerance, whatever the camera's lines; arguments as in `worst`."""
    scales = _scales(families, seen, tolerance)
    depths = np.array([_dense(families, seen, scale) for scale in scales])
    return Bound(scales, *_refined(families, seen, scales, depths))


def is_rectangle(families: Sequence[Family], seen: Windows) -> bool:
    """Tell whether the contrast has a closed form: one ideal rectangle, one window."""
    return len(families) == 1 and families[0].rectangle is not None and seen.simple


def worst(
    families: Sequence[Family],
    seen: Windows,
    delays: FloatArray | None,
    tolerance: float,
    known: Bound | None = None,
) -> float:
    """
    Largest contrast while all frequencies of a light may be off by up to `tolerance`, a share of them.

    Exact for an ideal rectangle. Other light is looked at in steps of 1/64 cycle of the exposure, the deepest
    step is refined, and where the lines of the camera reach the deepest phases this bound is the answer.

    Parameters
    ----------
    families : sequence of Family
        Of one channel.
    seen : Windows
        The exposure.
    delays : ndarray or None
        How much later than a first one the other exposures of the comparison start, shape (d,) [s]; None where
        any phase occurs.
    tolerance : float
        Share of the frequency, 0 for none.
    known : Bound or None
        What `bound` gave for the same light, exposure and tolerance, if it is at hand.
    """
    if not families:
        return 0.0
    if is_rectangle(families, seen) and (pulse := families[0].rectangle):
        return rectangle.worst_contrast(pulse, seen.lengths[0], delays, tolerance)
    if tolerance == 0.0:
        return _limited(families, seen, delays, 1.0)
    most = known or bound(families, seen, tolerance)
    if delays is None:
        return most.contrast
    reached = _limited(families, seen, delays, most.scale)
    if reached >= most.contrast * (1 - _CLOSE):
        return most.contrast
    return max(reached, *(_limited(families, seen, delays, one) for one in most.scales))


def _dense(families: Sequence[Family], seen: Windows, scale: float) -> float:
    return of_blurred([family.blurred(seen, scale) for family in families], None)


def _limited(families: Sequence[Family], seen: Windows, delays: FloatArray | None, scale: float) -> float:
    blurred = [family.blurred(seen, scale) for family in families]
    frequencies = np.array([family.frequency for family in families]) * scale
    return of_blurred(blurred, None if delays is None else delays[:, None] * frequencies)


def _scales(families: Sequence[Family], seen: Windows, tolerance: float) -> FloatArray:
    """Frequencies to look at, over the stated one; a single family repeats itself, fainter, after one more cycle."""
    fastest = max(family.frequency for family in families) * sum(seen.lengths)
    lowest, highest = 1 - tolerance, 1 + tolerance
    if len(families) == 1 and len(seen.lengths) == 1:
        highest = min(highest, lowest + 1.0 / fastest)
    steps = int(np.ceil((highest - lowest) * fastest / _STEP)) + 1
    return np.linspace(lowest, highest, min(max(steps, 3), _MOST_STEPS))


def _refined(families: Sequence[Family], seen: Windows, scales: FloatArray, depths: FloatArray) -> tuple[float, float]:
    """Deepest point between the neighbours of the deepest step, by golden sections."""
    best = int(np.argmax(depths))
    left, right = float(scales[max(best - 1, 0)]), float(scales[min(best + 1, scales.size - 1)])
    points = [right - _GOLDEN * (right - left), left + _GOLDEN * (right - left)]
    found = [_dense(families, seen, scale) for scale in points]
    deepest = max((float(depths[best]), float(scales[best])), *zip(found, points, strict=True))
    for _ in range(10):
        if found[0] > found[1]:
            right = points[1]
            points = [right - _GOLDEN * (right - left), points[0]]
            found = [_dense(families, seen, points[0]), found[0]]
        else:
            left = points[0]
            points = [points[1], left + _GOLDEN * (right - left)]
            found = [found[1], _dense(families, seen, points[1])]
        deepest = max(deepest, *zip(found, points, strict=True))
    return deepest[1], deepest[0]


def moving(families: Sequence[Family], delays: FloatArray) -> FloatArray:
    """Give the delays of frames [s] at an even rate, or none if no family moves against them by a cycle in a minute."""
    rate = 1.0 / delays[0]
    beats = [abs(family.frequency / rate - round(family.frequency / rate)) * rate for family in families]
    return delays if max(beats, default=0.0) * STANDS >= 1.0 else np.zeros(0)


def wandering(families: Sequence[Family], seen: Windows, wander: float) -> float:
    """
    Largest contrast between lines that met the light at different frequencies within +-`wander`, a share of it.

    A bound for a frequency that wanders slowly against the exposure: one line may see the brightest exposure of
    the fastest cycles, another the darkest of the slowest, so a shutter has no null left.
    """
    if not families:
        return 0.0
    fastest = max(family.frequency for family in families) * sum(seen.lengths)
    steps = int(np.ceil(2 * wander * fastest / _STEP)) + 2
    high = low = 1.0
    for family in families:
        rate = family.frequency * (1 - wander), family.frequency * (1 + wander)
        scales = np.linspace(rate[0], rate[1], min(steps, _MOST_STEPS)) / family.frequency
        extremes = [family.blurred(seen, scale).extremes() for scale in scales]
        low += min(one for one, _ in extremes)
        high += max(other for _, other in extremes)
    return ratio(high, low)
