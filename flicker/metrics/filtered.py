"""How deep the slow part of the modulation is: percent flicker with everything above a frequency taken out."""

from __future__ import annotations

import math
import weakref
from functools import partial

import numpy as np

from flicker.errors import NotMeasurable
from flicker.metrics import Observation, metric
from flicker.results import Measure
from flicker.signal.lowpass import LeftOver, ends_below, harmonics_below, swing, unfitted
from flicker.trace import FloatArray, Trace

_SOURCE = "California Title 24, Joint Appendix JA10.6 (from public summaries)"
_SHORTEST = 1.0  # JA10.5 [s]
_ALMOST = 0.995  # a rate read from time stamps may miss the second by so much
_FEWEST_GROUPS = 8  # of cycles, for a spread
_left_over: weakref.WeakKeyDictionary[Observation, LeftOver | None] = weakref.WeakKeyDictionary()


@metric(unit="%", source=_SOURCE, order=100)
def percent_flicker_below_40hz(trace: Trace, observation: Observation) -> Measure:
    """
    Percent flicker of the light with everything above 40 Hz taken out.

    Parameters
    ----------
    trace : Trace
        At least 1 s.
    observation : Observation
        Of that trace.

    Returns
    -------
    Measure
        With its 95 % interval; it may exceed 100. [%]

    Raises
    ------
    NotMeasurable
        If the trace is too short or too slow, or its mean level is lost.

    Notes
    -----
    See `filtered_depth`, for this and its siblings.
    """
    return filtered_depth(trace, observation, 40.0)


@metric(unit="%", source=_SOURCE, order=101)
def percent_flicker_below_90hz(trace: Trace, observation: Observation) -> Measure:
    """Percent flicker with everything above 90 Hz taken out; as `percent_flicker_below_40hz`. [%]"""
    return filtered_depth(trace, observation, 90.0)


@metric(unit="%", source=_SOURCE, order=102)
def percent_flicker_below_200hz(trace: Trace, observation: Observation) -> Measure:
    """Percent flicker with everything above 200 Hz taken out; as `percent_flicker_below_40hz`. [%]"""
    return filtered_depth(trace, observation, 200.0)


@metric(unit="%", source=_SOURCE, order=103)
def percent_flicker_below_400hz(trace: Trace, observation: Observation) -> Measure:
    """Percent flicker with everything above 400 Hz taken out; as `percent_flicker_below_40hz`. [%]"""
    return filtered_depth(trace, observation, 400.0)


@metric(unit="%", source=_SOURCE, order=104)
def percent_flicker_below_1000hz(trace: Trace, observation: Observation) -> Measure:
    """Percent flicker with everything above 1000 Hz taken out; as `percent_flicker_below_40hz`. [%]"""
    return filtered_depth(trace, observation, 1000.0)


def filtered_depth(trace: Trace, observation: Observation, cut: float) -> Measure:
    r"""
    Percent flicker of the light with everything above a frequency taken out.

    Parameters
    ----------
    trace : Trace
        At least 1 s, sampled above twice the cut.
    observation : Observation
        Of that trace.
    cut : float
        [Hz]

    Returns
    -------
    Measure
        With its 95 % interval; it may exceed 100. [%]

    Raises
    ------
    NotMeasurable
        If the trace is too short or too slow, or its mean level is lost.

    Notes
    -----
    With :math:`a` and :math:`b` the largest and the smallest value that is left over the whole record,

    .. math:: 100 \, \frac{a - b}{a + b}

    The cut is a brick wall, as the method asks for: transform, zero, back. It rings on edges, and what is left of a
    short pulse swings below zero: a PWM of 120 Hz and 10 % duty reads 197 % below 200 Hz. The figure is given as it
    is, not clipped at 100.

    The extremes of noise only ever lie too far apart. Hence lines are taken from the fit to all samples, and of what
    lies between them only that counts which rises above the noise; drifts and single events do. A line that lies on
    the cut to within its uncertainty counts, and the interval then holds the figure with and without it.
    """
    _refuse(trace, cut)
    level, families, series = observation.level, observation.search.families, observation.series
    level = families[0].mean if families else level
    left = _left(observation)
    value, rings = _depth(ends_below(families, left, cut, series), level, cut)
    if value == 0.0:
        unseen = 100 * observation.search.floor / level
        return Measure(0.0, "%", 0.0, unseen, f"nothing up to {cut:.0f} Hz rises above the noise")
    without, _ = _depth(ends_below(families, left, cut, series, doubt=-1.0), level, cut)
    half = math.hypot(_half_width(observation, left, level, cut), 1.96 * value * observation.dark_uncertainty / level)
    method = f"lines and drifts up to {cut:.0f} Hz, brick wall, over {trace.duration:.3g} s"
    method += "; the cut makes it swing below dark, where no light goes" if rings else ""
    method += "; a line lies on the cut, the interval holds the figure with and without it" if without != value else ""
    return Measure(value, "%", max(min(value, without) - half, 0.0), max(value, without) + half, method)


def _depth(ends: tuple[float, float], level: float, cut: float) -> tuple[float, bool]:
    """Percent flicker between two deviations from the level, and whether the lower one goes below dark."""
    high, low = 1.0 + ends[0] / level, 1.0 + ends[1] / level
    if not high + low > 0:
        raise NotMeasurable(f"with all above {cut:.0f} Hz taken out the light swings further below zero than above")
    return 100 * (high - low) / (high + low), low < 0


def _refuse(trace: Trace, cut: float) -> None:
    if trace.duration < _ALMOST * _SHORTEST:
        raise NotMeasurable(f"at least 1 s is needed, and the capture has {trace.duration:.3g} s: record longer")
    if trace.sample_rate <= 2 * cut:
        raise NotMeasurable(
            f"at {trace.sample_rate:.6g} Hz lines are seen below {trace.sample_rate / 2:.6g} Hz only: record above "
            f"{2 * cut:.0f} Hz; the method asks for 20 kHz"
        )


def _left(observation: Observation) -> LeftOver | None:
    """What the families leave, worked out once for all cuts; None for a capture with gaps, which has no transform."""
    if observation not in _left_over:
        series = observation.series
        whole = len(series.segments) == 1
        left = LeftOver.of(observation.search.without(series, observation.search.families)) if whole else None
        _left_over[observation] = left
    return _left_over[observation]


def _half_width(observation: Observation, left: LeftOver | None, level: float, cut: float) -> float:
    """
    Half of the 95 % interval.

    Of the families from the spread between groups of cycles, and no less than what the errors of the lines make; of the
    rest from its noise. An extreme is a sum of lines, and the depth half the difference of two of them.
    """
    jackknife, variance, families = 0.0, 0.0, observation.search.families
    for fit, cycle in zip(families, observation.cycles, strict=True):
        count = min(harmonics_below(fit, cut).size, (cycle.size - 1) // 2)
        variance += 0.5 * count * fit.amplitude_error**2
        if count and cycle.groups >= _FEWEST_GROUPS:
            jackknife = math.hypot(jackknife, cycle.interval(partial(_of_levels, count=count))[1])
    if left is not None:
        inside, noise = left.below(cut, max(map(unfitted, families), default=0.0))
        variance += 0.25 * np.count_nonzero(inside) * noise**2
    return max(jackknife, 196.0 * math.sqrt(variance) / level)


def _of_levels(levels: FloatArray, count: int) -> float:
    """Percent flicker of a cycle of which only the first harmonics are left."""
    lines = np.fft.rfft(levels)[1 : count + 1] * (2 / levels.size)
    high, low = swing(lines)
    mean = float(levels.mean())
    return 100 * (high - low) / (2 * mean + high + low)
