"""How visible the stroboscopic effect of a light is, from its spectral lines."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import numpy.typing as npt

from flicker.trace import FloatArray

BAND = (80.0, 2000.0)  # lines that count, both ends included [Hz]; IEC TR 63158:2018 (from memory)
EXPONENT = 3.7  # of the Minkowski sum; IEC TR 63158:2018 (from a public summary)


def sine_threshold(frequency: npt.ArrayLike) -> FloatArray:
    r"""
    Depth of a sine whose stroboscopic effect an average observer sees half of the time.

    Parameters
    ----------
    frequency : array_like
        Any shape. [Hz]

    Returns
    -------
    ndarray
        Peak amplitude over the mean, shape as given.

    Notes
    -----
    .. math:: T(f) = \frac{1}{1 + e^{-a (f - b)}} + 20 \, e^{-f / 10}

    with :math:`a` = 0.00518 s and :math:`b` = 306.6 Hz: the form of IEC TR 63158:2018 and CIE TN 006:2016 (from
    memory), which regulations mean.

    Examples
    --------
    >>> round(float(sine_threshold(100.0)), 5)
    0.25628
    """
    frequency = np.asarray(frequency, dtype=float)
    return np.asarray(1.0 / (1.0 + np.exp(-0.00518 * (frequency - 306.6))) + 20.0 * np.exp(-frequency / 10.0))


def power_law_threshold(frequency: npt.ArrayLike) -> FloatArray:
    r"""
    Give the later threshold of Perz et al., for comparison; regulations do not mean this one.

    Parameters
    ----------
    frequency : array_like
        Any shape. [Hz]

    Returns
    -------
    ndarray
        Peak amplitude over the mean, shape as given.

    Notes
    -----
    :math:`2.865 \cdot 10^{-5} (f / \mathrm{Hz})^{1.543} + 0.225`, J. Opt. Soc. Am. A 35 (2018) 309 (from a public
    summary). It differs from the form of IEC TR 63158 by 1.4 % at 100 Hz, and by a factor of 3.8 at 2 kHz.
    """
    return np.asarray(2.865e-5 * np.asarray(frequency, dtype=float) ** 1.543 + 0.225)


def stroboscopic_visibility(
    frequencies: npt.ArrayLike,
    amplitudes: npt.ArrayLike,
    threshold: Callable[[FloatArray], FloatArray] = sine_threshold,
) -> float:
    r"""
    Stroboscopic visibility measure of a set of lines.

    Parameters
    ----------
    frequencies : array_like, shape (k,)
        [Hz]
    amplitudes : array_like, shape (k,)
        Peak amplitudes relative to the mean.
    threshold : callable
        `sine_threshold`, or `power_law_threshold` for comparison.

    Returns
    -------
    float
        1 where the average observer sees the effect half of the time. [1]

    Notes
    -----
    .. math:: \Big( \sum_m \big( C_m / T(f_m) \big)^{3.7} \Big)^{1 / 3.7}

    over the lines from 80 Hz to 2 kHz, both included.

    Examples
    --------
    >>> round(stroboscopic_visibility(np.array([100.0]), np.array([1.0])), 4)
    3.902
    """
    places, heights = np.asarray(frequencies, dtype=float), np.abs(np.asarray(amplitudes))
    inside = (places >= BAND[0]) & (places <= BAND[1])
    ratios = heights[inside] / threshold(places[inside])
    return float(np.sum(ratios**EXPONENT) ** (1.0 / EXPONENT))
