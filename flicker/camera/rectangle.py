"""Band contrast of rectangular PWM in closed form, at one frequency and over all frequencies of a tolerance."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from flicker.light import Pulse
from flicker.trace import FloatArray


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
    largest = max(
        float(contrast(f * exposure, pulse.duty, pulse.low_level, distance_to_whole(delays * f).max())) for f in edges
    )
    frequencies, reaches = _frequencies_of_delays(pulse, exposure, delays, lowest, highest)
    if frequencies.size:
        largest = max(largest, float(contrast(frequencies * exposure, pulse.duty, pulse.low_level, reaches).max()))
    return largest


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
