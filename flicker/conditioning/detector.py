"""What a slow detector took from the light, given back."""

from __future__ import annotations

import math

import numpy as np

from flicker.errors import InputError
from flicker.trace import Trace


def undo_detector(trace: Trace, bandwidth: float) -> Trace:
    r"""
    Undo the first-order low-pass of a photodiode and its amplifier.

    Parameters
    ----------
    trace : Trace
        As recorded.
    bandwidth : float
        -3 dB bandwidth of the detector. [Hz]

    Returns
    -------
    Trace
        One reading shorter in each segment; its noise is that much larger, and every interval with it.

    Raises
    ------
    InputError
        If the bandwidth is not above 0 Hz.

    Notes
    -----
    With :math:`a = \exp(-2 \pi f_c / f_s)` the light between two readings is :math:`(y_{n+1} - a y_n) / (1 - a)`: exact
    for light that is constant between readings (by hand). White noise grows by :math:`\sqrt{1 + a^2} / (1 - a)`.
    """
    if not (math.isfinite(bandwidth) and bandwidth > 0):
        raise InputError(f"the bandwidth of a detector must be above 0 Hz, not {bandwidth}")
    kept = math.exp(-2 * math.pi * bandwidth / trace.sample_rate)
    light = (trace.light[1:] - kept * trace.light[:-1]) / (1 - kept)
    across = np.array([segment.first - 1 for segment in trace.segments[1:]], dtype=int)
    segments = tuple(type(one)(one.first - number, one.start) for number, one in enumerate(trace.segments))
    growth = math.sqrt(1 + kept**2) / (1 - kept)
    done = f"detector of {bandwidth:g} Hz undone; noise of single readings grows {growth:.3g}-fold"
    return trace.replace(light=np.delete(light, across), segments=segments, done=done)
