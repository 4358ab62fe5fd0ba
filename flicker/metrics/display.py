"""Flicker of panels, as display makers state it; both figures from memory of their documents."""

from __future__ import annotations

import math

import numpy as np

from flicker.errors import NotMeasurable
from flicker.metrics import Observation, metric
from flicker.metrics.modulation import percent_flicker
from flicker.results import Component, Measure

_WEIGHTS = ((0.0, 20.0, 30.0, 40.0, 50.0, 60.0), (0.0, 0.0, -3.0, -6.0, -12.0, -40.0))  # frequency [Hz], weight [dB]


def display_weight(frequency: float) -> float:
    """Weight of a line: 0 dB to 20 Hz, -40 dB from 60 Hz on, straight in dB between. [dB]"""
    return float(np.interp(frequency, *_WEIGHTS))


@metric(unit="dB", source="JEITA ED-2522 and VESA FPDM (weights from memory)", order=120)
def display_flicker_level(observation: Observation) -> Measure:
    r"""
    Level of the strongest weighted line over the mean.

    Parameters
    ----------
    observation : Observation
        Of one trace.

    Returns
    -------
    Measure
        0 dB for a line below 20 Hz as large as the mean, with its 95 % interval. [dB]

    Raises
    ------
    NotMeasurable
        If the mean level is lost, or no line rises above the noise.

    Notes
    -----
    .. math:: \max_m \; 20 \log_{10} C_m + W(f_m)

    with :math:`C_m` the peak amplitude of a line over the mean and :math:`W` 0 dB up to 20 Hz, -3 at 30, -6 at 40,
    -12 at 50 and -40 from 60 Hz on. Some instruments take RMS amplitudes and read 3.01 dB less, some 10 times the
    logarithm of the power ratio, which is the same. A line of 30 Hz under noise can weigh more than a strong one
    above 60 Hz: record some seconds. Light of other lamps and a dark level that was not taken off lower the level.
    """
    _ = observation.level
    if not observation.components:
        floor = 20 * math.log10(max(observation.search.floor / observation.level, 1e-12))
        raise NotMeasurable(f"no line rises above the noise: the unweighted level is below {floor:.0f} dB")
    strongest = max(observation.components, key=_weighted)
    height, error = abs(strongest.amplitude), strongest.standard_error
    by_dark = observation.dark_uncertainty / observation.level
    by_mean = math.hypot(*(fit.mean_error for fit in observation.search.families)) / observation.level
    spread = 1.96 * math.hypot(error / height, by_dark, by_mean)
    if spread >= 1:
        raise NotMeasurable(
            "the error of the strongest line is as large as the line, of noise or of harmonics that the samples cannot "
            "tell from it: record longer, and at a rate that is higher and no multiple of the frequency"
        )
    value = _weighted(strongest)
    low, high = (value + 20 * math.log10(1 + sign * spread) for sign in (-1, 1))
    weight = display_weight(strongest.frequency)
    method = f"line at {strongest.frequency:.5g} Hz, weight {weight:.3g} dB, peak amplitude over mean"
    return Measure(value, "dB", low, high, method)


def _weighted(line: Component) -> float:
    return 20 * math.log10(abs(line.amplitude)) + display_weight(line.frequency)


@metric(unit="%", source="contrast method of display makers, AC over DC (from memory)", order=121)
def display_flicker_contrast(observation: Observation) -> Measure:
    r"""
    Swing of the light over the middle of its two ends.

    Parameters
    ----------
    observation : Observation
        Of one trace.

    Returns
    -------
    Measure
        From 0 to 200, with its 95 % interval. [%]

    Raises
    ------
    NotMeasurable
        As percent flicker.

    Notes
    -----
    .. math:: 100 \, \frac{a - b}{(a + b) / 2}

    with :math:`a` and :math:`b` the largest and the smallest light above dark: twice percent flicker, and fooled by
    the same. It does not weigh frequencies; a panel that switches its backlight fast reads high without flickering to
    the eye.
    """
    depth = percent_flicker(observation)
    value, low, high = (2 * x if x is not None else None for x in (depth.value, depth.low, depth.high))
    return Measure(value, "%", low, high, f"twice percent flicker: {depth.method}")
