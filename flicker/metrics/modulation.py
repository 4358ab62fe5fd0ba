"""How deep the light is modulated: percent flicker, flicker index, RMS modulation."""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np

from flicker.errors import NotMeasurable
from flicker.metrics import Observation, metric
from flicker.metrics._observation import percent_between
from flicker.results import Measure
from flicker.signal.cycle import Cycle
from flicker.trace import FloatArray


@metric(unit="%", source="IES Lighting Handbook, 9th ed., 2000 (from memory)", order=20)
def percent_flicker(observation: Observation) -> Measure:
    r"""
    Depth of the modulation between the brightest and the darkest part of the light.

    Parameters
    ----------
    observation : Observation
        Of one trace; its extremes are those of the mean cycle above dark.

    Returns
    -------
    Measure
        0 for steady light, 100 when the light goes out, with its 95 % interval. [%]

    Raises
    ------
    NotMeasurable
        If the mean level is lost (AC coupling) or nothing is brighter than the dark level.

    Notes
    -----
    With :math:`a` and :math:`b` the largest and the smallest light above dark,

    .. math:: 100 \, \frac{a - b}{a + b}

    The extremes of noisy samples only ever lie too far apart; hence the mean cycle, split in halves of which
    one says where an extreme lies and the other how high it is. An unsubtracted dark level lowers the figure, and so do
    a slow detector and light of other lamps. Light in which no period rises above the noise reads 0, and the upper
    end of its interval is the depth that a sine would have needed to be seen.
    """
    level = observation.level
    if observation.steady:
        return Measure(0.0, "%", 0.0, min(100 * observation.search.floor / level, 100.0), _STEADY)
    return percent_between(observation.extremes, level, observation.dark_uncertainty)


@metric(unit="1", source="IES Lighting Handbook, 9th ed., 2000 (from memory)", order=30)
def flicker_index(observation: Observation) -> Measure:
    r"""
    Share of one cycle's light that lies above the cycle's mean.

    Parameters
    ----------
    observation : Observation
        Of one trace.

    Returns
    -------
    Measure
        0 for steady light, up to 1, with its 95 % interval. [1]

    Raises
    ------
    NotMeasurable
        If the mean level is lost (AC coupling) or nothing is brighter than the dark level.

    Notes
    -----
    With :math:`y` the light above dark over one period,

    .. math:: \frac{\int \max(y - \bar y, 0) \, dt}{\int y \, dt}

    It is taken from the mean cycle of the deepest family. Noise near the mean level adds only what is left of it in the
    mean cycle. An unsubtracted dark level lowers it in proportion.
    """
    level = observation.level
    if observation.steady:
        return Measure(0.0, "1", 0.0, observation.search.floor / level / math.pi, _STEADY)
    return _of_cycle(observation, _index, "1")


@metric(unit="%", source="definition: standard deviation over mean", order=40)
def rms_modulation(observation: Observation) -> Measure:
    r"""
    Standard deviation of the periodic light over its mean.

    Parameters
    ----------
    observation : Observation
        Of one trace.

    Returns
    -------
    Measure
        With its 95 % interval. [%]

    Raises
    ------
    NotMeasurable
        If the mean level is lost (AC coupling) or nothing is brighter than the dark level.

    Notes
    -----
    .. math:: 100 \, \frac{\sqrt{\overline{(y - \bar y)^2}}}{\bar y}

    of the mean cycle, the families added in squares; the variance that noise leaves in the mean cycle is taken
    off. Noise of the samples themselves does not count as modulation.
    """
    level = observation.level
    if observation.steady:
        return Measure(0.0, "%", 0.0, 100 * observation.search.floor / level / math.sqrt(2), _STEADY)
    total, spread = 0.0, 0.0
    for cycle in observation.cycles:
        noise = float(np.mean(cycle.standard_error**2))

        def rms(levels: FloatArray, cycle: Cycle = cycle, noise: float = noise) -> float:
            levels, shares = cycle.distribution(levels)
            mean = _lit(float(shares @ levels))
            return 100 * math.sqrt(max(float(shares @ (levels - mean) ** 2) - noise, 0.0)) / mean

        value, half = cycle.interval(rms)
        total, spread = math.hypot(total, value), math.hypot(spread, half)
    by_dark = 1.96 * total * observation.dark_uncertainty / level
    spread = math.hypot(spread, by_dark)
    return Measure(total, "%", max(total - spread, 0.0), total + spread, "mean cycle, spread between groups of cycles")


_STEADY = "no period rises above the noise; the upper end is the depth a sine would need to be seen"


def _of_cycle(observation: Observation, figure: Callable[[Cycle, FloatArray], float], unit: str) -> Measure:
    cycle = observation.cycle
    value, half = cycle.interval(lambda levels: figure(cycle, levels))
    half = math.hypot(half, 1.96 * value * observation.dark_uncertainty / observation.level)
    return Measure(value, unit, max(value - half, 0.0), value + half, "mean cycle, spread between groups of cycles")


def _lit(mean: float) -> float:
    if not mean > 0:
        raise NotMeasurable("some cycles hold no light above dark: measure a part without them, with --start")
    return mean


def _index(cycle: Cycle, levels: FloatArray) -> float:
    levels, shares = cycle.distribution(levels)
    mean = _lit(float(shares @ levels))
    return float(shares @ np.maximum(levels - mean, 0.0)) / mean
