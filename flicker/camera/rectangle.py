"""Band contrast of rectangular PWM in closed form, at one frequency and over all frequencies of a tolerance."""

from __future__ import annotations

import itertools
from collections.abc import Callable

import numpy as np
import numpy.typing as npt

from flicker.light import Pulse
from flicker.trace import FloatArray

IN_STEP = 1e-9  # phases that lie no further apart are the same but for rounding [cycles]


def collected(cycles: npt.ArrayLike, duty: float, low_level: float) -> tuple[FloatArray, FloatArray]:
    r"""
    Smallest light that an exposure of so many cycles collects, and how much more the luckiest exposure gets.

    Both in units of the light of one cycle fully on, shape as given.

    Notes
    -----
    With :math:`N` whole cycles and :math:`r` of another, duty :math:`D` and low level :math:`p`, the exposure
    collects, against where in the cycle it starts, a trapezoid with ramps of length :math:`h`:

    .. math:: E_{lo} = p x + (1 - p) (N D + \max(0, r + D - 1)), \quad h = \min(r, 1 - r, D, 1 - D)

    By hand: a sliding window over a rectangle.
    """
    cycles = np.asarray(cycles, dtype=float)
    whole = np.floor(cycles)
    rest = cycles - whole
    lowest = low_level * cycles + (1 - low_level) * (whole * duty + np.maximum(0.0, rest + duty - 1.0))
    rise = np.minimum(np.minimum(rest, 1.0 - rest), min(duty, 1.0 - duty))
    return lowest, np.maximum(rise, 0.0)


def contrast(cycles: npt.ArrayLike, duty: float, low_level: float, reach: npt.ArrayLike = 0.5) -> FloatArray:
    """
    Contrast (max - min)/(max + min) between the luckiest and the unluckiest of the exposures that are compared.

    Parameters
    ----------
    cycles : array_like
        Exposure in cycles of the light.
    duty, low_level : float
        Of the light.
    reach : array_like
        How far apart in phase two of the exposures lie at most, 0 to 0.5 cycles; 0.5 where any phase occurs.

    Returns
    -------
    ndarray
        Contrast 0..1, of the worst start phase.

    Notes
    -----
    The largest ratio between two points of a trapezoid that lie a given distance apart has one of them on the lower
    plateau, at the foot of a ramp; hence only the smaller of ramp and reach counts (by hand).
    """
    lowest, ramp = collected(cycles, duty, low_level)
    reach = np.where(np.asarray(reach) < IN_STEP, 0.0, reach)
    rise = (1.0 - low_level) * np.minimum(ramp, reach)
    total = 2.0 * lowest + rise
    return np.asarray(np.where(total > 0, rise / np.where(total > 0, total, 1.0), 0.0))


def distance_to_whole(phases: npt.ArrayLike) -> FloatArray:
    """Distance of phases to the nearest whole cycle, 0 to 0.5, shape as given."""
    phases = np.asarray(phases, dtype=float)
    return np.asarray(np.abs(phases - np.round(phases)))


def worst_contrast(pulse: Pulse, exposure: float, delays: FloatArray | None, tolerance: float) -> float:
    """
    Largest contrast that any frequency within the tolerance can give, exact.

    Parameters
    ----------
    pulse : Pulse
        The light; its decay must be 0.
    exposure : float
        Exposure. [s]
    delays : ndarray or None
        How much later than a first one the other exposures of the comparison start, shape (d,) [s]; None where
        any phase occurs.
    tolerance : float
        How far the frequency may be off, as a share of it.

    Returns
    -------
    float
        Contrast 0..1.

    Notes
    -----
    Between the frequencies at which a ramp changes its length the contrast is monotone, and so it is for any one
    delay between the frequencies at which the delay meets half a cycle or the length of the ramp: looking at these
    frequencies and at both ends finds the largest, without sampling.
    """
    lowest, highest = pulse.frequency * (1 - tolerance), pulse.frequency * (1 + tolerance)
    edges = _frequencies_of_edges(pulse, exposure, lowest, highest)
    dense = contrast(edges * exposure, pulse.duty, pulse.low_level)
    best = int(np.argmax(dense))
    if delays is None:
        return float(dense[best])
    if delays.size == 0:
        return 0.0
    reach = float(distance_to_whole(delays * edges[best]).max())
    _, ramp = collected(edges[best] * exposure, pulse.duty, pulse.low_level)
    if reach >= ramp:
        return float(dense[best])
    return _worst_with_lines(pulse, exposure, delays, np.unique(edges), float(edges[best]))


def _worst_with_lines(pulse: Pulse, exposure: float, delays: FloatArray, edges: FloatArray, likely: float) -> float:
    """Search the frequencies between `edges` where phases could lie far enough apart; `likely` is a good start."""

    def dense(frequency: float) -> float:
        return float(contrast(frequency * exposure, pulse.duty, pulse.low_level))

    near = likely + np.linspace(-1.0, 1.0, 33) / delays.max()
    tried = np.concatenate([edges, near[(near > edges[0]) & (near < edges[-1])]])
    reaches = distance_to_whole(delays[:, None] * tried).max(axis=0)
    largest = float(contrast(tried * exposure, pulse.duty, pulse.low_level, reaches).max())
    pieces = [(max(dense(low), dense(high)), low, high) for low, high in itertools.pairwise(edges)]
    for most, low, high in sorted(pieces, reverse=True):
        if most <= largest:
            break
        low, high = _part_above(largest, dense, float(low), float(high))
        frequencies, reaches = _frequencies_of_delays(pulse, exposure, delays, low, high)
        if frequencies.size:
            found = contrast(frequencies * exposure, pulse.duty, pulse.low_level, reaches)
            largest = max(largest, float(found.max()))
    return largest


def _part_above(level: float, dense: Callable[[float], float], low: float, high: float) -> tuple[float, float]:
    """Part of a piece on which the contrast, monotone there, lies above `level`."""
    rising = dense(high) > dense(low)
    if min(dense(low), dense(high)) > level:
        return low, high
    left, right = low, high
    for _ in range(40):
        middle = 0.5 * (left + right)
        left, right = (left, middle) if (dense(middle) > level) == rising else (middle, right)
    return (left, high) if rising else (low, right)


def _frequencies_of_edges(pulse: Pulse, exposure: float, lowest: float, highest: float) -> FloatArray:
    """Ends of the tolerance, and the frequencies between them at which the trapezoid changes its kind."""
    wholes = np.arange(np.floor(lowest * exposure), np.floor(highest * exposure) + 1)
    corners = (wholes[:, None] + np.array([0.0, pulse.duty, 0.5, 1.0 - pulse.duty])).ravel() / exposure
    return np.concatenate([[lowest, highest], corners[(corners > lowest) & (corners < highest)]])


def _frequencies_of_delays(
    pulse: Pulse, exposure: float, delays: FloatArray, lowest: float, highest: float
) -> tuple[FloatArray, FloatArray]:
    """Frequencies at which some delay is half a cycle or just as long as the ramp, with the reach of that delay."""
    most = int(np.ceil(delays.max() * (highest - lowest))) + 2
    turns = np.floor(delays * lowest)[:, None] + np.arange(most)
    delay = np.broadcast_to(delays[:, None], turns.shape)
    found = [(turns + 0.5) / delay]
    wholes = np.arange(np.floor(lowest * exposure), np.floor(highest * exposure) + 1)
    ramps = [(0.0, pulse.duty), (0.0, 1.0 - pulse.duty)]
    ramps += [ramp for whole in wholes for ramp in ((1.0, -whole), (-1.0, whole + 1.0))]
    for slope, offset in ramps:  # the ramp is slope * cycles + offset
        for sign in (1.0, -1.0):
            divisor = sign * delay - slope * exposure
            found.append((offset + sign * turns) / np.where(divisor == 0, np.inf, divisor))
    frequencies = np.stack(found)
    inside = (frequencies > lowest) & (frequencies < highest)
    reaches = distance_to_whole(np.broadcast_to(delay, frequencies.shape)[inside] * frequencies[inside])
    return frequencies[inside], reaches
