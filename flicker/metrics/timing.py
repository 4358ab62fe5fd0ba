"""When the light changes: fundamental frequency, duty cycle."""

from __future__ import annotations

import numpy as np

from flicker.errors import NotMeasurable
from flicker.metrics import Observation, metric
from flicker.results import Measure
from flicker.signal.cycle import Cycle
from flicker.signal.extremes import Extremes
from flicker.signal.harmonics import HarmonicFit
from flicker.signal.wander import UNSEEN as UNSEEN_WANDER
from flicker.trace import FloatArray

_FEWEST_TO_FOLLOW = 24.0  # cycles


@metric(unit="Hz", source="least squares after Rife and Boorstyn, IEEE Trans. Inf. Theory 20 (1974) 591", order=10)
def fundamental_frequency(fundamental: Measure) -> Measure:
    """
    Frequency of the deepest family of lines.

    Parameters
    ----------
    fundamental : Measure
        Of the harmonic fit.

    Returns
    -------
    Measure
        With its 95 % interval. [Hz]

    Raises
    ------
    NotMeasurable
        If no periodic modulation rises above the noise, or less than one and a half cycles were recorded.

    Notes
    -----
    All harmonics that rise above the noise are fitted to all samples at their true times. The interval holds what the
    samples show; the error of the sample clock (20 to 100 ppm for sound cards: common practice, no source) is added
    only when stated. Light faster than half the sample rate shows under a false, lower frequency.
    """
    return fundamental


@metric(unit="%", source="definition: half the range of the tracked frequency, over its mean", order=12)
def frequency_wander(fit: HarmonicFit, observation: Observation) -> Measure:
    r"""
    How far the frequency goes from its mean to either side.

    Parameters
    ----------
    fit : HarmonicFit
        Of the deepest family, with the track of its phase where that moves.
    observation : Observation
        Of the trace.

    Returns
    -------
    Measure
        0 for a frequency that keeps still, with its 95 % interval. [%]

    Raises
    ------
    NotMeasurable
        If the light is steady, or too few cycles were recorded to follow their phase.

    Notes
    -----
    With the phase followed in blocks of two cycles or more, :math:`\\phi(t)` in cycles against a steady frequency
    :math:`f`, half the range of

    .. math:: 100 \, \dot\phi / f

    but for its outermost hundredth. An RC oscillator drifts, a spread spectrum sweeps, the mains wander slowly. While a
    camera exposes, light that wanders has no exposure that hides it whole. Wander faster than an eighth of the
    frequency is not seen.
    """
    _need_cycles(observation, fit)
    if fit.track is None:
        return Measure(0.0, "%", 0.0, 100 * UNSEEN_WANDER, "phase in blocks of cycles; it keeps still to within noise")
    value, half = (100 * one / fit.frequency for one in (fit.track.deviation, 1.96 * fit.track.deviation_error))
    method = f"phase followed in {fit.track.times.size} blocks of cycles; half the range of its slope"
    return Measure(value, "%", max(value - half, 0.0), value + half, method)


@metric(unit="Hz", source="definition: strongest line of the tracked phase", order=14)
def wander_rate(fit: HarmonicFit, observation: Observation) -> Measure:
    """
    How often the frequency wanders to and fro.

    Parameters
    ----------
    fit : HarmonicFit
        Of the deepest family, with the track of its phase where that moves.
    observation : Observation
        Of the trace.

    Returns
    -------
    Measure
        Its interval is one line width of the record to either side. [Hz]

    Raises
    ------
    NotMeasurable
        If the frequency keeps still, or wanders without a steady rate, or too few cycles were recorded.

    Notes
    -----
    The strongest line of the tracked phase, where it holds half of what the phase moves or more.
    """
    _need_cycles(observation, fit)
    if fit.track is None:
        raise NotMeasurable("the frequency does not wander")
    rate = fit.track.rate()
    if rate is None:
        raise NotMeasurable("the frequency wanders without a steady rate")
    width = 1.0 / float(fit.track.times[-1] - fit.track.times[0])
    return Measure(rate, "Hz", max(rate - width, 0.0), rate + width, "strongest line of the tracked phase")


def _need_cycles(observation: Observation, fit: HarmonicFit) -> None:
    cycles = observation.series.span * fit.frequency
    if cycles < _FEWEST_TO_FOLLOW:
        raise NotMeasurable(
            f"{cycles:.3g} cycles are too few to follow their phase: record at least {_FEWEST_TO_FOLLOW:.0f}"
        )


@metric(unit="1", source="definition: share of the period above half level", order=50)
def duty_cycle(cycle: Cycle, cycle_extremes: Extremes) -> Measure:
    """
    Share of the period in which the light lies above the middle of its two ends.

    Parameters
    ----------
    cycle : Cycle
        Mean cycle of the deepest family.
    cycle_extremes : Extremes
        Its largest and smallest level.

    Returns
    -------
    Measure
        With its 95 % interval. [1]

    Raises
    ------
    NotMeasurable
        If the light is steady.

    Notes
    -----
    Works on AC-coupled captures too, as long as the coupling's droop is small over one period. For a sine it is 0.5 by
    this definition. Ringing moves the middle, but hardly the time at which a steep edge crosses it.
    """

    middle = 0.5 * (cycle_extremes.high + cycle_extremes.low)
    value, half = cycle.interval(lambda levels: _share_above(levels, middle))
    if not np.isfinite(half):
        raise NotMeasurable("too few cycles for a duty cycle: record at least two")
    half = max(half, 0.29 / cycle.size)
    method = "mean cycle, crossings of the middle level"
    return Measure(value, "1", max(value - half, 0.0), min(value + half, 1.0), method)


def _share_above(levels: FloatArray, threshold: float) -> float:
    """Share of a circle of levels above a threshold, edges interpolated between neighbouring bins."""
    here, after = levels, np.roll(levels, -1)
    step = np.where(after == here, 1.0, after - here)
    crossing = np.clip((threshold - here) / step, 0.0, 1.0)
    rising, falling = (here <= threshold) & (after > threshold), (here > threshold) & (after <= threshold)
    share = np.where((here > threshold) & (after > threshold), 1.0, 0.0)
    share = np.where(rising, 1.0 - crossing, np.where(falling, crossing, share))
    return float(share.mean())
