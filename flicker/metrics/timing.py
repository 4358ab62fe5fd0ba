"""When the light changes: fundamental frequency, duty cycle."""

from __future__ import annotations

import numpy as np

from flicker.errors import NotMeasurable
from flicker.metrics import metric
from flicker.results import Measure
from flicker.signal.cycle import Cycle
from flicker.signal.extremes import Extremes
from flicker.trace import FloatArray


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
