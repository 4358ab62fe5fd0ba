"""How fast the light switches: rise and fall time, decay of the emitter."""

from __future__ import annotations

import math

import numpy as np

from flicker.errors import NotMeasurable
from flicker.metrics import metric
from flicker.results import Measure
from flicker.signal.cycle import Cycle
from flicker.signal.edges import between, decay_tail, smoothed_rise
from flicker.trace import FloatArray

_MOST_BETWEEN = 0.45  # of the cycle that light with edges may spend between its ends; a sine spends 0.57
_VAGUE = 0.25  # half of the interval of a decay time, over the time
_FEWEST_BINS = 3.0  # that an edge must fill
_READING = 0.1  # bins to which a crossing is read between its neighbours
_NOISIEST = 0.033  # standard error of a bin, over the swing


@metric(unit="s", source="transition duration, IEC 60469:2013 (from memory)", order=60)
def rise_time(cycle: Cycle) -> Measure:
    """
    Time that the light takes from 10 to 90 % of its swing.

    Parameters
    ----------
    cycle : Cycle
        Mean cycle of the deepest family.

    Returns
    -------
    Measure
        With its 95 % interval. [s]

    Raises
    ------
    NotMeasurable
        If the light is steady, has no edges, or has faster ones than the samples resolve.

    Notes
    -----
    The ends are outer quantiles of what lies above and below the middle of the swing; of several rises the steepest
    counts. Cycles are laid over each other, so that edges may be shorter than the sample interval where the rate is
    no multiple of the frequency. A frequency that wanders smears the edge, and the sensor adds its own rise time of
    0.35 over its bandwidth, in squares.
    """
    return _edge(cycle, 1)


@metric(unit="s", source="transition duration, IEC 60469:2013 (from memory)", order=61)
def fall_time(cycle: Cycle) -> Measure:
    """Time that the light takes from 90 to 10 % of its swing; parameters, errors and notes as `rise_time`. [s]"""
    return _edge(cycle, -1)


@metric(unit="s", source="definition: 1/e time of an exponential tail", order=70)
def decay_time(cycle: Cycle) -> Measure:
    r"""
    1/e time of the light's exponential tail after it was switched off.

    Parameters
    ----------
    cycle : Cycle
        Mean cycle of the deepest family.

    Returns
    -------
    Measure
        With its 95 % interval. [s]

    Raises
    ------
    NotMeasurable
        If the light is steady, or nothing falls exponentially within the cycle.

    Notes
    -----
    :math:`a + b \, e^{-t / \tau}` is fitted to the fall, or to its last part where a fast emitter goes out first; the
    asymptote is fitted too, since the drive may not go down to nothing. A phosphor that outlasts the pause shows a
    short piece of its tail only, and the interval is wide then. The sensor's own pole looks the same: its time is
    0.16 over its bandwidth. Times to 10 %, which some data sheets call persistence, are 2.303 times as long.
    """
    tail = decay_tail(cycle.levels, float(np.quantile(cycle.standard_error, 0.5)))
    if tail is None:
        raise NotMeasurable(
            "no edge with an exponential tail behind it in this cycle: a decay time needs light that is switched off"
        )
    value, half = cycle.interval(tail.time_of)
    if not half < _VAGUE * value:
        raise NotMeasurable("the tail is too short or too noisy for a decay time: record longer, or at a longer pause")
    scale = 1.0 / (cycle.frequency * cycle.size)
    method = f"exponential fitted to the fall of the mean cycle, {cycle.size} bins"
    return Measure(value * scale, "s", max(value - half, 0.0) * scale, (value + half) * scale, method)


def _edge(cycle: Cycle, sign: int) -> Measure:
    levels = cycle.levels
    share = between(levels)
    if share > _MOST_BETWEEN:
        raise NotMeasurable(f"the light has no edges: it spends {100 * share:.0f} % of the cycle between its two ends")
    if float(np.quantile(cycle.standard_error, 0.5)) > _NOISIEST * float(np.ptp(levels)):
        raise NotMeasurable("the mean cycle is too noisy for its edges: record longer, or with more light")

    def width(values: FloatArray) -> float:
        edge = smoothed_rise(values if sign > 0 else values[::-1])
        return edge.width if edge is not None else math.nan

    value, half = cycle.interval(width)
    scale = 1.0 / (cycle.frequency * cycle.size)
    if not math.isfinite(value) or not math.isfinite(half):
        raise NotMeasurable("the light does not go the whole way between its two ends in one edge")
    if value < _FEWEST_BINS:
        raise NotMeasurable(
            f"the edges are faster than the samples resolve, below {_FEWEST_BINS * scale:.2g} s: record at a higher "
            "rate, or at one that is no multiple of the frequency"
        )
    half = math.hypot(half, _READING)
    method = f"10 to 90 % on the mean cycle, {cycle.size} bins"
    return Measure(value * scale, "s", max(value - half, 0.0) * scale, (value + half) * scale, method)
